"""Rows of text without quote marks, by pyarrow's reader."""

from __future__ import annotations

import re

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray
from pyarrow import csv as arrow_csv

from etl.errors import Findings
from etl.files.headers import Header
from etl.files.rows import Rows, SetAside, Uneven, tell_uneven
from etl.files.separators import BLANK, blanks, spelled, split_line

#: The longest piece of text, in bytes, that pyarrow's reader is given; it takes 32-bit sizes.
_LARGEST_BLOCK = 1 << 30


def read_plain(
    body: bytes, header: Header, wanted: tuple[str, ...], shown: str, findings: Findings
) -> Rows | None:
    """Split text without quote marks into rows.

    Parameters
    ----------
    body : bytes
        The lines below the header.
    header : Header
        The header.
    wanted : tuple of str
        The columns that are kept.
    shown : str
        The file's name for messages.
    findings : Findings
        Where rows that are not as wide as the header are recorded.

    Returns
    -------
    Rows or None
        None where a problem was recorded.
    """
    rows = plain_rows(body, header, wanted)
    if isinstance(rows, Rows):
        return rows
    if not tell_uneven(header, rows, shown, findings):
        findings.error(
            "the table cannot be split into rows and columns",
            path=shown,
            expected=f"rows of {len(header.names)} fields separated by {spelled(header.separator)}",
            fix="open the file in a text editor and look for a damaged line",
        )
    return None


def plain_rows(body: bytes, header: Header, wanted: tuple[str, ...]) -> Rows | Uneven:
    """Split text without quote marks into rows.

    Parameters
    ----------
    body : bytes
        The lines below the header.
    header : Header
        The header.
    wanted : tuple of str
        The columns that are kept.

    Returns
    -------
    Rows or Uneven
        The rows that are not as wide as the header, where there are any.
    """
    body, lines, height, aside = _data_lines(body, header)
    if not len(lines):
        empty = pa.table({name: pa.array([], pa.string()) for name in wanted})
        return Rows(empty, lines, height, aside)
    if header.separator == BLANK:
        body = _squeezed(body)
    kept = set(wanted)
    try:
        table = arrow_csv.read_csv(
            pa.BufferReader(body),
            read_options=arrow_csv.ReadOptions(
                use_threads=False,
                column_names=[
                    name if name in kept else f"\x00{place}"
                    for place, name in enumerate(header.names)
                ],
                block_size=min(max(len(body) + 1, 1 << 16), _LARGEST_BLOCK),
            ),
            parse_options=arrow_csv.ParseOptions(
                delimiter=header.separator, quote_char=False, ignore_empty_lines=False
            ),
            convert_options=arrow_csv.ConvertOptions(
                include_columns=list(wanted),
                column_types={name: pa.string() for name in wanted},
                null_values=[],
                strings_can_be_null=False,
            ),
        )
    except pa.ArrowInvalid:
        table = None
    if table is not None and table.num_rows == len(lines):
        return Rows(table, lines, height, aside)
    width = len(header.names)
    texts = body.decode("utf-8").split("\n")[: len(lines)]
    widths = [len(split_line(line, header.separator)) for line in texts]
    told = zip(lines.tolist(), widths, strict=True)
    return Uneven.of([(line, fields) for line, fields in told if fields != width], len(widths))


def _data_lines(body: bytes, header: Header) -> tuple[bytes, NDArray[np.int32], int, SetAside]:
    """The body's data lines, their numbers in the file, how many lines it has, and the others."""
    aside = SetAside()
    signs = np.frombuffer(body, dtype=np.uint8)
    ends = np.flatnonzero(signs == ord("\n"))
    height = len(ends) + (not body.endswith(b"\n") and bool(body))
    numbers = np.arange(header.first, header.first + height, dtype=np.int32)
    # Only what begins so can be blank or a remark.
    special = {
        text.encode("utf-8")[:1] for text in ("\n", *blanks(header.separator), *header.remarks)
    }
    is_special = np.zeros(256, dtype=bool)
    is_special[[ord(sign) for sign in special]] = True
    if not is_special[signs[:1]].any() and not is_special[signs[ends[: height - 1] + 1]].any():
        return body, numbers, height, aside
    lines = body.split(b"\n")[:height]
    first = tuple(special - {b"\n"})
    kept = [
        place
        for place, line in enumerate(lines)
        if (line and not line.startswith(first))
        or not aside.takes(line.decode("utf-8"), header.first + place, header)
    ]
    return b"\n".join([lines[place] for place in kept]) + b"\n", numbers[kept], height, aside


def _squeezed(body: bytes) -> bytes:
    """Lines in which one blank stands for each run of them, and none at either end."""
    if b"  " not in body and b" \n" not in body and b"\n " not in body:
        return body.strip(b" ")
    return re.sub(rb"(?m)^ +| +$", b"", re.sub(rb"  +", b" ", body))
