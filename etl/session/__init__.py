"""The map over readers: from a study and its folder to finished tables."""

from __future__ import annotations

from typing import TYPE_CHECKING

from etl.lazily import loader

if TYPE_CHECKING:
    from etl.session.crew import PUBLISHED
    from etl.session.line_file import write_lines
    from etl.session.loading import load_study
    from etl.session.one_trial import Wanted, explained, trace, write_picture
    from etl.session.result import Result
    from etl.session.run import build, check
    from etl.session.varied import Varied
    from etl.session.varying import vary

__all__ = [
    "PUBLISHED",
    "Result",
    "Varied",
    "Wanted",
    "build",
    "check",
    "explained",
    "load_study",
    "trace",
    "vary",
    "write_lines",
    "write_picture",
]

_HOMES = {
    **dict.fromkeys(("build", "check"), "etl.session.run"),
    **dict.fromkeys(("Wanted", "explained", "trace", "write_picture"), "etl.session.one_trial"),
    "Varied": "etl.session.varied",
    "vary": "etl.session.varying",
    "PUBLISHED": "etl.session.crew",
    "Result": "etl.session.result",
    "load_study": "etl.session.loading",
    "write_lines": "etl.session.line_file",
}
__getattr__ = loader(__name__, _HOMES)
