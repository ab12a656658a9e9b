"""Quoted cells as some programs write them: with quote marks inside that are not doubled."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence

from etl.files.headers import Header
from etl.files.quoted import Split, longer_cells, picker
from etl.files.separators import BLANK, fields_in, reader_of, split_line
from etl.files.stray_quotes import sound_row


def split_loosely(text: str, header: Header, places: Sequence[int], *, wary: bool) -> Split | None:
    """Split text into rows line by line; a cell may hold quote marks that are not doubled.

    A line that the standard of quoted cells splits into as many fields as the header is read so.
    In any other, a quote mark opens a cell only at the cell's start and closes it only before a
    separator or the line's end. No cell may run over lines: a quote mark that is too much or too
    few would then swallow rows. Of all ways to let marks before separators close cells, this one
    gives the most fields, so no other one gives as many as the header.

    Parameters
    ----------
    text : str
        The lines below the header.
    header : Header
        The header.
    places : sequence of int
        Which cells of a row are kept.
    wary : bool
        Whether a cell that is mended must not hold as many separators as a row: in a log, a line
        end is then lost.

    Returns
    -------
    Split or None
        None where some line has not as many fields as the header.
    """
    pick, width = picker(places), len(header.names)
    split = Split()
    closing = re.compile(rf'"(?={re.escape(header.separator)}|$)')
    sound = sound_row(header.separator)
    with longer_cells():
        for number, line in enumerate(text.removesuffix("\n").split("\n"), start=header.first):
            if split.aside.takes(line, number, header):
                continue
            cells = strict = _strictly(line, header.separator)
            if cells is not None and '"' in line and sound.fullmatch(line) is None:
                # A mark in a cell without quotes is no standard either: one cell may be two.
                cells = None
            if cells is None or len(cells) != width:
                cells = _loosely(line, header.separator, closing)
                (split.mended if cells != strict else split.stray).append(number)
                if wary and any(_holds_a_row(cell, header) for cell in cells or ()):
                    return None
            if cells is None or len(cells) != width:
                return None
            split.rows.append(pick(cells))
            split.lines.append(number)
    return split


def _holds_a_row(cell: str, header: Header) -> bool:
    """Whether a cell would be a row by itself."""
    return fields_in(cell, header.separator) >= len(header.names) > 1


def _strictly(line: str, separator: str) -> list[str] | None:
    """The cells of a line by the standard; None where it is broken, or goes on."""
    if '"' not in line:
        return split_line(line, separator)
    line = line.rstrip(BLANK) if separator == BLANK else line
    try:
        return next(reader_of([line], separator, strict=True), None)
    except csv.Error:
        return None


def _loosely(line: str, separator: str, closing: re.Pattern[str]) -> list[str] | None:
    """The cells of a line, in which quote marks may be not doubled; None where one stays open."""
    line = line.strip(BLANK) if separator == BLANK else line
    cells: list[str] = []
    at = 0
    while True:
        if line.startswith('"', at):
            close = closing.search(line, at + 1)
            if close is None:
                return None
            cells.append(line[at + 1 : close.start()].replace('""', '"'))
            at = close.end()
        else:
            end = line.find(separator, at)
            end = len(line) if end < 0 else end
            cells.append(line[at:end])
            at = end
        if at == len(line):
            return cells
        at += 1
        while separator == BLANK and line.startswith(BLANK, at):
            at += 1
