"""The table of regions: every region of every text, with its words and where it lies."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from etl.cells import Cell, write_csv
from etl.handoff.codebook_cells import in_one_cell
from etl.tables import Column, IdColumn

REGIONS: Final = "regions"


@dataclass(frozen=True, slots=True)
class RegionRow:
    """One region of one text.

    Attributes
    ----------
    keys : tuple of str
        The facts by which trials find the text.
    region : str
        Its name.
    order : int
        Its place in reading order, from 1.
    text : str
        What it says, with a line break where the screen has one; empty where the definitions
        hold no text.
    characters : int or None
        How many characters wide it is, all lines together; None where it has no text.
    lines : tuple of int
        The lines of the text on which it stands, from 1; none where it has no place.
    box_px : tuple of float or None
        Left, top, right and bottom of the box around all of it; None where it has no place.
    labels : tuple of str
        The labels of the logs that stand for it; none where it has a place.
    """

    keys: tuple[str, ...]
    region: str
    order: int
    text: str = ""
    characters: int | None = None
    lines: tuple[int, ...] = ()
    box_px: tuple[float, float, float, float] | None = None
    labels: tuple[str, ...] = ()


def region_key_columns(
    keys: Sequence[str], rows: Sequence[RegionRow], factors: Mapping[str, Sequence[str]]
) -> tuple[Column, ...]:
    """The columns by which a row of the table of regions is joined to trials.

    Parameters
    ----------
    keys : sequence of str
        Names of the facts by which trials find their text.
    rows : sequence of RegionRow
        All rows.
    factors : mapping of str to sequence of str
        The study's factors with their levels.

    Returns
    -------
    tuple of Column
        A factor is a category, unless some text is for a level that no trial has; another fact is
        a whole number where every value of it is one.

    Examples
    --------
    >>> rows = [RegionRow(("7", "late"), "w1", 1)]
    >>> [c.type for c in region_key_columns(["item", "cue"], rows, {"cue": ["early", "late"]})]
    ['integer', 'category']
    """
    columns = []
    for place, name in enumerate(keys):
        values = {row.keys[place] for row in rows}
        meaning = "trials of this value show the text"
        levels = tuple(factors.get(name, ()))
        if levels and values <= set(levels):
            columns.append(Column(name, "category", meaning, levels=levels))
        else:
            columns.append(Column(name, IdColumn.of(values).type, meaning))
    return tuple(columns)


def region_columns(keys: Sequence[Column], names: Sequence[str]) -> tuple[Column, ...]:
    """The columns of the table of regions.

    Parameters
    ----------
    keys : sequence of Column
        From :func:`region_key_columns`.
    names : sequence of str
        All names of regions.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    box = "of the box around the region, on all of its lines"
    return (
        *keys,
        Column("region", "category", "name of the region", levels=tuple(names)),
        Column("region_order", "integer", "place of the region in reading order, from 1"),
        Column("region_text", "text", "what the region says on the screen", nullable=True),
        Column(
            "region_characters",
            "integer",
            "how many characters wide the region is, blanks within it included, line breaks not",
            nullable=True,
        ),
        Column(
            "region_lines",
            "text",
            "the lines of the text on which it stands, from 1, separated by blanks",
            nullable=True,
        ),
        Column("left_px", "number", f"left edge {box}", "px", nullable=True),
        Column("top_px", "number", f"top {box}", "px", nullable=True),
        Column("right_px", "number", f"right edge {box}", "px", nullable=True),
        Column("bottom_px", "number", f"bottom {box}", "px", nullable=True),
        Column(
            "region_labels",
            "text",
            "the labels of the logs that stand for the region, with | between them",
            nullable=True,
        ),
    )


def write_regions(folder: Path, rows: Iterable[RegionRow], columns: Sequence[Column]) -> None:
    """Write ``regions.csv`` into a folder.

    Parameters
    ----------
    folder : Path
        Where it goes.
    rows : iterable of RegionRow
        All regions, text by text, in reading order.
    columns : sequence of Column
        From :func:`region_columns`.
    """
    cells = ([*row.keys, *_cells(row)] for row in rows)
    write_csv(folder / f"{REGIONS}.csv", [column.name for column in columns], cells)


def _cells(row: RegionRow) -> list[Cell]:
    """The cells of a row after its keys."""
    box: Sequence[Cell] = (None,) * 4 if row.box_px is None else [*map(_short, row.box_px)]
    return [
        row.region,
        row.order,
        row.text or None,
        row.characters,
        " ".join(map(str, row.lines)) or None,
        *box,
        in_one_cell(row.labels) or None,
    ]


def _short(value_px: float) -> int | float:
    """A place without a needless point, as the other tables have it."""
    return int(value_px) if value_px.is_integer() else value_px
