"""From a region definition file to a library of texts with regions."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from etl.errors import Findings
from etl.files import read_table
from etl.regions.assign import Manner
from etl.regions.library import RegionLibrary, library_of
from etl.regions.running_text import texts_laid_out
from etl.regions.shapes import texts_of_boxes, texts_of_labels, texts_of_polygons
from etl.regions.sources import Draft, Source, TrialWords, understand_columns

if TYPE_CHECKING:
    from etl.study.models import Lines, Regions

LAID_OUT = ("marked_text", "words")


def read_definitions(
    regions: Regions,
    lines: Lines | None,
    *,
    path: Path,
    shown: str,
    words: TrialWords,
    findings: Findings,
) -> RegionLibrary | None:
    """Read a region definition file.

    Parameters
    ----------
    regions : Regions
        ``[regions]`` of the study file.
    lines : Lines or None
        ``[lines]`` of the study file, None where it does not say.
    path : Path
        The definition file: delimited text, or a workbook, its sheet after a hash.
    shown : str
        Its name for messages.
    words : TrialWords
        The facts that trials have without this file, and those that the study asks for; the marks
        of a missing value.
    findings : Findings
        Where everything that is wrong is recorded.

    Returns
    -------
    RegionLibrary or None
        None where an error was recorded.
    """
    before = findings.count("error")
    cells = read_table(path, shown, findings)
    if cells is None:
        return None
    source = understand_columns(cells, regions.kind, words, findings)
    if source is None:
        return None
    drafts = _drafts(source, regions)
    if regions.vertical == "any":
        _only_one_line_each(drafts, findings)
    if findings.count("error") > before:
        return None
    manner = manner_of(regions, lines)
    library = library_of(drafts, source.keys, tuple(source.supplied), manner)
    return replace(library, sha256=cells.text.sha256)


def manner_of(regions: Regions, lines: Lines | None) -> Manner | None:
    """How points are taken to regions.

    Parameters
    ----------
    regions : Regions
        ``[regions]`` of the study file.
    lines : Lines or None
        ``[lines]`` of the study file, None where it does not say.

    Returns
    -------
    Manner or None
        None where the labels of the logs say which region it is.
    """
    if regions.kind == "labels":
        return None
    layout = regions.layout
    return Manner(
        only_x=regions.vertical == "any",
        nearest_line=lines is not None and lines.method not in ("consensus", "none"),
        laid_out=regions.kind in LAID_OUT,
        right_to_left=layout is not None and layout.direction == "rtl",
        tolerance_px=float(regions.tolerance_px),
        overlap=regions.overlap,
    )


def _drafts(source: Source, regions: Regions) -> list[Draft]:
    """The texts of a file of any kind."""
    may_overlap = regions.overlap != "error"
    if regions.kind == "boxes":
        return texts_of_boxes(source, may_overlap=may_overlap)
    if regions.kind == "wkt":
        return texts_of_polygons(source, may_overlap=may_overlap)
    if regions.kind == "labels":
        return texts_of_labels(source)
    if regions.layout is None:
        source.findings.error(
            f'regions of kind "{regions.kind}" need a layout',
            where="regions.layout",
            expected="left_px, top_px, character_width_px and line_height_px",
            fix="add [regions.layout] to the study file",
        )
        return []
    return texts_laid_out(source, regions.kind, regions.layout)


def _only_one_line_each(drafts: list[Draft], findings: Findings) -> None:
    """Record the texts in which x alone cannot decide."""
    for draft in drafts:
        if draft.shape is not None and len(draft.shape.lines) > 1:
            text = draft.text
            named = ", ".join(f"{key} {value}" for key, value in text.keys.items())
            findings.error(
                'vertical = "any" is for texts of one line only',
                path=text.path,
                line=text.line,
                found=f"{named or 'text without keys'}: {len(draft.shape.lines)} lines",
                expected="one line",
                fix='set vertical = "box" in [regions]',
            )
