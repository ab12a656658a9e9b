"""Writes the page about the variants of a study: one file of HTML that needs nothing else."""

from __future__ import annotations

from pathlib import Path

from etl.report.pages import rendered
from etl.report.variants_collect import collect_variants
from etl.report.variants_input import VariantsInput

#: The name of the page.
VARIANTS_PAGE = "variants.html"


def write_variants_page(folder: Path, facts: VariantsInput) -> None:
    """Write ``variants.html``; the same facts give the same bytes.

    Parameters
    ----------
    folder : Path
        Where to.
    facts : VariantsInput
        What the page is made from.
    """
    (folder / VARIANTS_PAGE).write_text(variants_page(facts), encoding="utf-8", newline="\n")


def variants_page(facts: VariantsInput) -> str:
    """The page as text.

    Parameters
    ----------
    facts : VariantsInput
        What it is made from.

    Returns
    -------
    str
        HTML; everything that comes from data is escaped.
    """
    return rendered("variants.html", ("variants.js",), collect_variants(facts))
