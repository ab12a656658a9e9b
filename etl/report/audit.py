"""Writes the audit page: one file of HTML that needs nothing else, not even a script."""

from __future__ import annotations

import base64
import hashlib
from functools import cache
from pathlib import Path

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from etl.report.charts import HATCHINGS, SHAPES
from etl.report.collect import collect
from etl.report.inputs import AuditInput

#: The name of the page in the output folder.
AUDIT = "audit.html"
_SCRIPTS = ("sorting.js", "unfolding.js")


def write_audit(folder: Path, facts: AuditInput) -> None:
    """Write ``audit.html``; the same facts give the same bytes.

    Parameters
    ----------
    folder : Path
        Where to.
    facts : AuditInput
        What the page is made from.
    """
    (folder / AUDIT).write_text(audit_page(facts), encoding="utf-8", newline="\n")


def audit_page(facts: AuditInput) -> str:
    """The page as text.

    Parameters
    ----------
    facts : AuditInput
        What it is made from.

    Returns
    -------
    str
        HTML; everything that comes from data is escaped.
    """
    environment = _environment()
    # Template text itself is not escaped, so style and script go in as they are.
    script = "".join(environment.get_template(name).render() for name in _SCRIPTS)
    digest = base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii")
    page = environment.get_template("audit.html").render(
        page=collect(facts),
        script=Markup(script),  # noqa: S704 - a file of this package
        script_digest=digest,
        hatchings=range(HATCHINGS),
        shapes=range(SHAPES),
    )
    # A lone surrogate cannot come from a file that was read as UTF-8, but may come from Python.
    return page.encode("utf-8", "replace").decode("utf-8")


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
