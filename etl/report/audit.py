"""Writes the audit page: one file of HTML that needs nothing else, not even a script."""

from __future__ import annotations

from pathlib import Path

from etl.report.collect import collect
from etl.report.inputs import AuditInput
from etl.report.pages import rendered

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
    return rendered("audit.html", _SCRIPTS, collect(facts))
