"""Rows that were read below a header, and the lines between them that were set aside."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import SPELLED_OUT, Findings
from etl.files.separators import blanks, fields_in, spelled
from etl.files.tally import Tally

if TYPE_CHECKING:
    from etl.files.headers import Header


@dataclass(slots=True)
class SetAside:
    """Lines below a header that are no rows.

    Attributes
    ----------
    blank : list of int
        The lines that are blank.
    remarks : list of int
        The lines that are remarks.
    alike : list of int
        Those remarks that have as many fields as the header.
    """

    blank: list[int] = field(default_factory=list)
    remarks: list[int] = field(default_factory=list)
    alike: list[int] = field(default_factory=list)

    def takes(self, line: str, number: int, header: Header) -> bool:
        """Whether a line between rows is blank or a remark; it is then remembered."""
        content = line.lstrip(blanks(header.separator))
        if content.startswith(header.remarks):
            self.remarks.append(number)
            if fields_in(line, header.separator) == len(header.names) > 1:
                self.alike.append(number)
            return True
        if content.strip("\n"):
            return False
        self.blank.append(number)
        return True


@dataclass(frozen=True, slots=True)
class Rows:
    """What was read below a header.

    Attributes
    ----------
    table : pa.Table
        The columns that were asked for, as text.
    lines : (n,) int32 array
        The line on which each row begins, from 1.
    height : int
        How many lines there are below the header.
    aside : SetAside
        Those of them that are no rows.
    mended : Tally
        Rows with quote marks that were not doubled.
    stray : Tally
        Rows with quote marks in a cell without quotes, where other cells have quotes.
    """

    table: pa.Table
    lines: NDArray[np.int32]
    height: int
    aside: SetAside
    mended: Tally = field(default_factory=Tally)
    stray: Tally = field(default_factory=Tally)

    def without(self, places: NDArray[np.integer]) -> Rows:
        """The rows but for some."""
        kept = np.ones(len(self.lines), dtype=bool)
        kept[places] = False
        return replace(self, table=self.table.filter(pa.array(kept)), lines=self.lines[kept])


@dataclass(frozen=True, slots=True)
class Uneven:
    """Rows that are not as wide as the header.

    Attributes
    ----------
    rows : list of (int, int)
        Line and number of fields of each such row, or of as many as are spelled out.
    number : dict of int to int
        How many rows there are of each number of fields.
    count : int
        How many rows there are, the others included.
    """

    rows: list[tuple[int, int]]
    number: Counter[int]
    count: int

    @classmethod
    def of(cls, rows: list[tuple[int, int]], count: int) -> Uneven:
        """All such rows of a text."""
        return cls(rows, Counter(fields for _, fields in rows), count)

    def joined(self, below: Uneven, width: int) -> Uneven:
        """These rows and those of the text below, of which only the first few are kept."""
        kept: list[tuple[int, int]] = []
        of_kind: Counter[bool] = Counter()
        for line, fields in (*self.rows, *below.rows):
            of_kind[fields < width] += 1
            if of_kind[fields < width] <= SPELLED_OUT:
                kept.append((line, fields))
        return Uneven(kept, self.number + below.number, self.count + below.count)


def tell_uneven(header: Header, uneven: Uneven, shown: str, findings: Findings) -> bool:
    """Record the rows that are not as wide as the header.

    Parameters
    ----------
    header : Header
        The header.
    uneven : Uneven
        Such rows.
    shown : str
        The file's name for messages.
    findings : Findings
        Where they are recorded.

    Returns
    -------
    bool
        Whether there is any.
    """
    width = len(header.names)
    if uneven.count > 1 and [*uneven.number.values()] == [uneven.count]:
        findings.error(
            "the header has another number of fields than every row",
            path=shown,
            line=header.line,
            found=f"{width} in the header, {uneven.rows[0][1]} in each row",
            expected=f"as many names, separated by {spelled(header.separator)}, as fields in a row",
            fix="complete the header, or remove the name that is too much",
        )
        return True
    few, many = "the row has too few fields", "the row has too many fields"
    for line, fields in uneven.rows:
        findings.error(
            few if fields < width else many,
            path=shown,
            line=line,
            found=f"{fields} field{'' if fields == 1 else 's'}",
            expected=f"{width} fields, as in the header",
            fix="complete the row, or remove what is too much; a cell that holds the separator "
            "must stand in quotes",
        )
    for problem, is_few in ((few, True), (many, False)):
        count = sum(n for fields, n in uneven.number.items() if (fields < width) is is_few)
        if count:
            findings.more["error", shown, "", problem] = count
    return bool(uneven.rows)
