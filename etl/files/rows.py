"""Rows that were read below a header, and the lines between them that were set aside."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
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


def tell_uneven(
    header: Header, uneven: list[tuple[int, int]], count: int, shown: str, findings: Findings
) -> bool:
    """Record the rows that are not as wide as the header.

    Parameters
    ----------
    header : Header
        The header.
    uneven : list of (int, int)
        Line and number of fields of each such row.
    count : int
        How many rows there are.
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
    if count > 1 and len(uneven) == count and len({fields for _, fields in uneven}) == 1:
        findings.error(
            "the header has another number of fields than every row",
            path=shown,
            line=header.line,
            found=f"{width} in the header, {uneven[0][1]} in each row",
            expected=f"as many names, separated by {spelled(header.separator)}, as fields in a row",
            fix="complete the header, or remove the name that is too much",
        )
        return True
    for line, fields in uneven:
        findings.error(
            "the row has too few fields" if fields < width else "the row has too many fields",
            path=shown,
            line=line,
            found=f"{fields} field{'' if fields == 1 else 's'}",
            expected=f"{width} fields, as in the header",
            fix="complete the row, or remove what is too much; a cell that holds the separator "
            "must stand in quotes",
        )
    return bool(uneven)
