"""trialwright: from a session folder of fixation logs to trial-level reading outcomes.

Examples
--------
>>> import etl
>>> sorted(name for name in etl.__all__ if name[0].islower())
['build', 'check', 'draft', 'load_study', 'trace', 'vary']
"""

from typing import TYPE_CHECKING

from etl.lazily import loader

if TYPE_CHECKING:
    from etl.drafting import Draft, draft
    from etl.errors import (
        ClusterError,
        DataError,
        FaultError,
        Finding,
        Findings,
        InputError,
        StudyError,
    )
    from etl.session import Result, Varied, build, check, load_study, trace, vary
    from etl.study import Study

__all__ = [
    "ClusterError",
    "DataError",
    "Draft",
    "FaultError",
    "Finding",
    "Findings",
    "InputError",
    "Result",
    "Study",
    "StudyError",
    "Varied",
    "build",
    "check",
    "draft",
    "load_study",
    "trace",
    "vary",
]

_ERRORS = (
    "ClusterError",
    "DataError",
    "FaultError",
    "Finding",
    "Findings",
    "InputError",
    "StudyError",
)
_HOMES = {
    **dict.fromkeys(("Draft", "draft"), "etl.drafting"),
    **dict.fromkeys(_ERRORS, "etl.errors"),
    **dict.fromkeys(
        ("Result", "Varied", "build", "check", "load_study", "trace", "vary"), "etl.session"
    ),
    "Study": "etl.study",
}
__getattr__ = loader(__name__, _HOMES)


def __dir__() -> list[str]:
    """Every name that the package offers."""
    return sorted({*globals(), *__all__})
