"""Columns of few distinct texts as codes, and look-ups of rows by several such columns."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Iterable, Sequence
from dataclasses import dataclass
from math import prod
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

#: Keys stay below this, so that one more column never overflows them.
_MOST_KEYS = 1 << 62
#: Where there are no more than so many keys a row, each has a place of its own in memory.
_ROOMY = 4


@dataclass(frozen=True, slots=True)
class Coded:
    """A column of few distinct texts, kept as codes.

    Attributes
    ----------
    codes : (n,) int32 array
        Index into ``values``; -1 where the cell is missing.
    values : tuple of str
        The distinct texts, in order of first appearance.

    Examples
    --------
    >>> Coded.of(pa.array(["b", " a", "NA", "b"]), {"", "NA"}).codes.tolist()
    [0, 1, -1, 0]
    """

    codes: NDArray[np.int32]
    values: tuple[str, ...]

    @classmethod
    def of(cls, column: pa.Array, missing: Collection[str]) -> Coded:
        """Code a column of text: cells trimmed, composed (Unicode NFC), missing marks as -1."""
        encoded = pc.dictionary_encode(column)
        known: dict[str, int] = {}
        new_code = np.empty(len(encoded.dictionary), dtype=np.int32)
        for old, raw in enumerate(encoded.dictionary.to_pylist()):
            text = unicodedata.normalize("NFC", raw.strip())
            new_code[old] = -1 if text in missing else known.setdefault(text, len(known))
        codes = encoded.indices.to_numpy(zero_copy_only=False)
        return cls(new_code[codes] if len(new_code) else codes.astype(np.int32), tuple(known))

    @classmethod
    def constant(cls, text: str, length: int) -> Coded:
        """The same text in every row."""
        return cls(np.zeros(length, dtype=np.int32), (text,))

    @classmethod
    def absent(cls, length: int) -> Coded:
        """No text in any row."""
        return cls(np.full(length, -1, dtype=np.int32), ())

    @classmethod
    def joined(cls, parts: Sequence[Coded]) -> Coded:
        """Several columns, one below the other, under one list of texts."""
        if len(parts) == 1:
            return parts[0]
        known: dict[str, int] = {}
        codes = np.empty(sum(map(len, parts)), dtype=np.int32)
        stop, values, new = 0, None, np.zeros(0, dtype=np.int32)
        for part in parts:
            if part.values is not values:  # columns of many logs may share one list of texts
                values = part.values
                found = [known.setdefault(text, len(known)) for text in values]
                new = np.array([*found, -1], dtype=np.int32)
            start, stop = stop, stop + len(part)
            codes[start:stop] = new[part.codes]
        return cls(codes, tuple(known))

    def __len__(self) -> int:
        return len(self.codes)

    def take(self, rows: NDArray[np.integer] | NDArray[np.bool_]) -> Coded:
        """Some of the rows."""
        return Coded(self.codes[rows], self.values)

    def text(self, row: int) -> str:
        """The text of one row, empty where it is missing."""
        code = int(self.codes[row])
        return "" if code < 0 else self.values[code]

    def recoded(self, values: Iterable[str]) -> NDArray[np.int32]:
        """The codes that the rows have under another list of texts; -1 for a text not on it."""
        place = {text: code for code, text in enumerate(values)}
        new = [place.get(text, -1) for text in self.values]
        return np.array([*new, -1], dtype=np.int32)[self.codes]

    def among(self, texts: Collection[str]) -> NDArray[np.bool_]:
        """Whether each row's text is one of some."""
        listed = [text in texts for text in self.values]
        return np.array([*listed, False], dtype=bool)[self.codes]


def marks_of(missing: Iterable[str]) -> frozenset[str]:
    """What stands in a cell that has no value, as cells are compared.

    Parameters
    ----------
    missing : iterable of str
        The marks that the study file lists.

    Returns
    -------
    frozenset of str
        Trimmed and composed; an empty cell is among them always.

    Examples
    --------
    >>> sorted(marks_of(["NA", " . "]))
    ['', '.', 'NA']
    """
    return frozenset(unicodedata.normalize("NFC", mark).strip() for mark in missing) | {""}


def place_rows(wanted: Sequence[Coded], table: Sequence[Coded]) -> NDArray[np.int64]:
    """Find for each row the row of a table that has the same texts in all key columns.

    Parameters
    ----------
    wanted : sequence of Coded, each of length n
        The key columns of the rows to be placed.
    table : sequence of Coded, each of length m
        The same columns of the table; no two rows alike.

    Returns
    -------
    (n,) int64 array
        Row of the table; -1 where there is none or a key is missing.

    Examples
    --------
    >>> numbers = Coded.of(pa.array(["1", "2", "3"]), {""})
    >>> place_rows([Coded.of(pa.array(["3", "9"]), {""})], [numbers]).tolist()
    [2, -1]
    """
    known = np.ones(len(wanted[0]), dtype=bool)
    number = _whole([len(have.values) for have in table])
    keys: NDArray[Any] = np.zeros(len(wanted[0]), dtype=number)
    own: NDArray[Any] = np.zeros(len(table[0]), dtype=number)
    span = 1
    for ask, have in zip(wanted, table, strict=True):
        codes = ask.recoded(have.values)
        known &= codes >= 0
        width = len(have.values) + 1
        if span * width > _MOST_KEYS:
            own, keys, span = _numbered(own, keys)
        for place, own_codes in ((keys, codes), (own, have.codes)):
            place *= width
            place += own_codes
            place += 1
        span *= width
    if span <= _ROOMY * (len(keys) + len(own)):
        rows: NDArray[np.int64] = _row_of(own, span)[keys].astype(np.int64)
        rows[~known] = -1
        return rows
    order = np.argsort(own, kind="stable")
    at = np.searchsorted(own[order], keys)
    at = np.minimum(at, len(own) - 1)
    rows = order[at] if len(own) else np.zeros(len(keys), dtype=np.int64)
    known &= own[rows] == keys if len(own) else False
    return np.where(known, rows, -1)


def _whole(counts: Sequence[int]) -> type[np.int32] | type[np.int64]:
    """Whole numbers that hold a key for each combination of so many texts and of missing ones."""
    return np.int32 if prod(count + 1 for count in counts) < 1 << 31 else np.int64


def _row_of(keys: NDArray[Any], span: int) -> NDArray[np.int32]:
    """For each key the first row that has it, -1 where none has."""
    row_of = np.full(span, -1, dtype=np.int32)
    # Written from behind, so that of rows alike the first stays.
    row_of[keys[::-1]] = np.arange(len(keys) - 1, -1, -1, dtype=np.int32)
    return row_of


def _numbered(
    one: NDArray[Any], other: NDArray[Any]
) -> tuple[NDArray[np.int64], NDArray[np.int64], int]:
    """Keys of two tables numbered anew, so that they never overflow; and how many there are."""
    distinct, place = np.unique(np.concatenate([one, other]), return_inverse=True)
    return place[: len(one)], place[len(one) :], len(distinct)


def group_rows(columns: Sequence[Coded]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Group rows that have the same texts in all columns.

    Parameters
    ----------
    columns : sequence of Coded, each of length n
        At least one.

    Returns
    -------
    first : (groups,) int64 array
        The first row of each group.
    group : (n,) int64 array
        The group of each row.

    Examples
    --------
    >>> first, group = group_rows([Coded.of(pa.array(["b", "a", "b"]), {""})])
    >>> first.tolist(), group.tolist()
    ([0, 1], [0, 1, 0])
    """
    number = _whole([len(column.values) for column in columns])
    keys: NDArray[Any] = np.zeros(len(columns[0]), dtype=number)
    span = 1
    for column in columns:
        width = len(column.values) + 1
        if span * width > _MOST_KEYS:
            keys, _, span = _numbered(keys, keys[:0])
        keys *= width
        keys += column.codes
        keys += 1
        span *= width
    if span > _ROOMY * len(keys):
        _, first, group = np.unique(keys, return_index=True, return_inverse=True)
        return first, group
    # Where nearly all combinations occur, a place for each is sooner done than sorting.
    row_of = _row_of(keys, span)
    there = row_of >= 0
    first = row_of[there].astype(np.int64)
    row_of[there] = np.arange(len(first), dtype=np.int32)
    return first, row_of[keys].astype(np.int64)
