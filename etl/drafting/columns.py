"""The columns of logs of one kind, pooled, and what can be said of their cells."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.drafting.vocabulary import unit_in
from etl.files import Cells, Coded
from etl.files.units import units_in_row

Floats = NDArray[np.float64]

#: Words that stand for no value in tables (common practice, no source).
MISSING_WORDS = frozenset(
    (
        "",
        ".",
        "NA",
        "-",
        "--",
        "n/a",
        "N/A",
        "na",
        "NaN",
        "nan",
        "NAN",
        "null",
        "NULL",
        "None",
        "none",
    )
)
_NUMBER = r"^[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?$"
_WITH_COMMA = r"^[+-]?[0-9]*,[0-9]+(?:[eE][+-]?[0-9]+)?$"
_WITH_POINT = r"^[+-]?[0-9]*\.[0-9]+(?:[eE][+-]?[0-9]+)?$"
#: From which share of numbers on a column is one of numbers, with marks for missing ones in it.
MOSTLY = 0.5


@dataclass(frozen=True)
class Pooled:
    """Rows from the beginning of logs that have the same columns.

    Attributes
    ----------
    names : tuple of str
        The file names of the logs, without folders.
    headers : tuple of str
        The columns that have a name.
    cells : pa.Table
        The cells of all rows as text, trimmed.
    file : (n,) int32 array
        Which log each row is from.
    decimals : tuple of str
        The decimal sign of each log; empty where no number has decimals.
    units : dict of str to str
        The units that a row below the header names, by column.
    unit_rows : int
        How many logs have such a row, which is none of the rows.
    """

    names: tuple[str, ...]
    headers: tuple[str, ...]
    cells: pa.Table
    file: NDArray[np.int32]
    decimals: tuple[str, ...]
    units: dict[str, str] = field(default_factory=dict)
    unit_rows: int = 0

    @classmethod
    def of(cls, logs: Sequence[tuple[str, Cells]]) -> Pooled:
        """Pool the rows of logs, given their names and cells."""
        headers = tuple(name for name in logs[0][1].header if name)
        tables, decimals = [], []
        units: dict[str, str] = {}
        unit_rows = 0
        for _, cells in logs:
            columns = [pc.utf8_trim_whitespace(cells.column(name)) for name in headers]
            table = pa.table(columns, names=list(headers))
            own = _units_below_header(table)
            if own:
                units, unit_rows, table = {**own, **units}, unit_rows + 1, table.slice(1)
            tables.append(table)
            decimals.append(_decimal_in(table))
        counts = [len(table) for table in tables]
        file = np.repeat(np.arange(len(logs), dtype=np.int32), counts)
        pooled = pa.concat_tables(tables).combine_chunks()
        names = tuple(name for name, _ in logs)
        return cls(names, headers, pooled, file, tuple(decimals), units, unit_rows)

    def __len__(self) -> int:
        return len(self.file)

    def texts(self, header: str) -> pa.Array:
        """The cells of a column, trimmed."""
        column = self.cells.column(header)
        return column.chunk(0) if column.num_chunks == 1 else column.combine_chunks()

    @cached_property
    def columns(self) -> dict[str, PooledColumn]:
        """All columns by header."""
        commas = np.array([sign == "," for sign in self.decimals])[self.file]
        return {
            header: PooledColumn.of(header, self.texts(header), commas, self.units.get(header, ""))
            for header in self.headers
        }

    def only(self, rows: NDArray[np.bool_]) -> Pooled:
        """Some of the rows."""
        kept = self.cells.filter(pa.array(rows)).combine_chunks()
        return replace(self, cells=kept, file=self.file[rows])


@dataclass(frozen=True)
class PooledColumn:
    """One column of many logs.

    Attributes
    ----------
    header : str
        Its name.
    coded : Coded
        Its cells; none is missing.
    numbers : (n,) float64 array
        NaN where a cell is no number.
    below : str
        The unit that stands below its header; empty where none does.
    """

    header: str
    coded: Coded
    numbers: Floats
    below: str = ""

    @classmethod
    def of(
        cls, header: str, cells: pa.Array, commas: NDArray[np.bool_], below: str = ""
    ) -> PooledColumn:
        """Read the cells of a column, in some rows of which the comma is the decimal sign."""
        pointed = cells
        if commas.any():
            replaced = pc.replace_substring(cells, ",", ".", max_replacements=1)
            pointed = pc.if_else(pa.array(commas), replaced, cells)
        good = pc.match_substring_regex(pointed, _NUMBER)
        if not pc.any(good).as_py():
            numbers = np.full(len(cells), np.nan)
        else:
            kept = pc.if_else(good, pointed, pa.scalar(None, pa.string()))
            kept = pc.replace_substring_regex(kept, r"^\+", "")
            numbers = pc.cast(kept, pa.float64()).to_numpy(zero_copy_only=False)
            numbers = np.where(np.isfinite(numbers), numbers, np.nan)
        return cls(header, Coded.of(cells, ()), numbers, below)

    @cached_property
    def is_number(self) -> NDArray[np.bool_]:
        """Whether each cell is a number."""
        return ~np.isnan(self.numbers)

    @cached_property
    def numeric(self) -> bool:
        """Whether it is a column of numbers: most of the cells that hold a value are."""
        held = len(self.numbers) - self.absent
        return held > 0 and float(self.is_number.sum()) > MOSTLY * held

    @cached_property
    def absent(self) -> int:
        """How many cells hold a common mark for no value."""
        return int(self.coded.among(MISSING_WORDS).sum())

    @cached_property
    def words(self) -> dict[str, int]:
        """What stands in the cells that are no numbers, and how often."""
        counts = np.bincount(self.coded.codes[~self.is_number], minlength=len(self.coded.values))
        return {
            self.coded.values[code]: int(counts[code])
            for code in np.argsort(-counts, kind="stable").tolist()
            if counts[code]
        }

    @cached_property
    def values(self) -> Floats:
        """Its numbers alone."""
        return self.numbers[self.is_number]

    @cached_property
    def whole(self) -> bool:
        """Whether all its numbers are whole."""
        return bool(len(self.values)) and bool((self.values == np.floor(self.values)).all())

    @cached_property
    def distinct(self) -> tuple[str, ...]:
        """The values that are none of the common marks for no value."""
        return tuple(text for text in self.coded.values if text not in MISSING_WORDS)

    @property
    def unit(self) -> str | None:
        """The unit that its header names, or that stands below it."""
        return unit_in(self.header) or self.below or None

    def share(self, q: float) -> float:
        """A quantile of its numbers; NaN where there are none."""
        return float(np.quantile(self.values, q)) if len(self.values) else float("nan")

    @property
    def median(self) -> float:
        """The median of its numbers."""
        return self.share(0.5)


def _units_below_header(table: pa.Table) -> dict[str, str]:
    """The units that the first row names, where it is a row of units above rows of numbers."""
    if len(table) < 2:
        return {}
    rows = table.slice(1)
    numeric = []
    for name in table.column_names:
        cells = rows.column(name)
        numbers = pc.or_(
            pc.match_substring_regex(cells, _NUMBER), pc.match_substring_regex(cells, _WITH_COMMA)
        )
        if (pc.sum(numbers).as_py() or 0) > MOSTLY * len(rows):
            numeric.append(name)
    first = {name: str(table.column(name)[0].as_py()) for name in table.column_names}
    return units_in_row(first, numeric)


def _decimal_in(table: pa.Table) -> str:
    """The decimal sign of a log's numbers; empty where none has decimals."""
    commas = points = 0
    for column in table.columns:
        cells = column.combine_chunks()
        with_point = pc.sum(pc.match_substring_regex(cells, _WITH_POINT)).as_py() or 0
        with_comma = pc.sum(pc.match_substring_regex(cells, _WITH_COMMA)).as_py() or 0
        points, commas = points + with_point, commas + with_comma
    if commas > points:
        return ","
    return "." if points else ""


def is_plain_number(text: str) -> bool:
    """Whether a text is a number with a point or none.

    Examples
    --------
    >>> is_plain_number("-3.5"), is_plain_number("P01")
    (True, False)
    """
    return re.fullmatch(_NUMBER, text) is not None


def steps(values: Floats, group: NDArray[np.int64]) -> Floats:
    """Differences between neighbouring rows of each group.

    Parameters
    ----------
    values : (n,) float64 array
        The numbers; NaN where there is none.
    group : (n,) int64 array
        The group of each row; the rows of a group need not stand together.

    Returns
    -------
    (m,) float64 array
        Without those where one of the two has no number.

    Examples
    --------
    >>> steps(np.array([1.0, 5.0, 2.0, 6.0]), np.array([0, 1, 0, 1])).tolist()
    [1.0, 1.0]
    """
    order = np.argsort(group, kind="stable")
    moved, same = np.diff(values[order]), np.diff(group[order]) == 0
    moved = moved[same]
    return np.asarray(moved[~np.isnan(moved)])


def share_of(mask: NDArray[np.bool_]) -> float:
    """The share of true among values; 0 where there are none."""
    return float(mask.mean()) if mask.size else 0.0


def constant_within(codes: NDArray[np.integer], group: NDArray[np.int64]) -> float:
    """The share of groups in which a column of codes has one value."""
    if not len(codes):
        return 0.0
    order = np.argsort(group, kind="stable")
    own, ordered = codes[order], group[order]
    changes = (own[1:] != own[:-1]) & (ordered[1:] == ordered[:-1])
    groups = 1 + int((ordered[1:] != ordered[:-1]).sum())
    broken = len(np.unique(ordered[1:][changes]))
    return 1 - broken / groups
