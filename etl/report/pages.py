"""Pages of one file of HTML that needs nothing else, not even a script."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Sequence
from functools import cache

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from etl.report.charts import HATCHINGS, SHAPES


def rendered(template: str, scripts: Sequence[str], page: object) -> str:
    """A page as text.

    Parameters
    ----------
    template : str
        The name of its template.
    scripts : sequence of str
        The names of its scripts.
    page : object
        What the template shows.

    Returns
    -------
    str
        HTML; everything that comes from data is escaped.
    """
    environment = _environment()
    # Template text itself is not escaped, so style and script go in as they are.
    script = "".join(environment.get_template(name).render() for name in scripts)
    digest = base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii")
    text = environment.get_template(template).render(
        page=page,
        script=Markup(script),  # noqa: S704 - a file of this package
        script_digest=digest,
        hatchings=range(HATCHINGS),
        shapes=range(SHAPES),
    )
    # A lone surrogate cannot come from a file that was read as UTF-8, but may come from Python.
    return text.encode("utf-8", "replace").decode("utf-8")


@cache
def _environment() -> Environment:
    """The templates, compiled once for all pages of a process."""
    return Environment(
        loader=PackageLoader("etl.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
