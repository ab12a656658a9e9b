"""Writes the page about the variants of a study: one file of HTML that needs nothing else."""

from __future__ import annotations

import base64
import hashlib
from functools import cache
from pathlib import Path

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from etl.report.charts import HATCHINGS, SHAPES
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
    environment = _environment()
    # Template text itself is not escaped, so the script goes in as it is.
    script = environment.get_template("variants.js").render()
    digest = base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii")
    page = environment.get_template("variants.html").render(
        page=collect_variants(facts),
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
