"""Columns of texts about very many trials, held as small as they can be."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.files.coded import Coded

#: With more texts than this a column holds them as one piece of memory, not one by one: a text of
#: its own takes some sixty bytes.
_FEW_TEXTS = 1 << 12

Narrow = NDArray[np.signedinteger[Any]]


def narrow(codes: NDArray[np.integer], count: int) -> Narrow:
    """Codes in the smallest whole numbers that hold them.

    Parameters
    ----------
    codes : (n,) array of whole numbers
        From -1 to ``count - 1``.
    count : int
        How many codes there are.

    Returns
    -------
    (n,) int8, int16 or int32 array

    Examples
    --------
    >>> narrow(np.array([0, -1, 200]), 201).dtype
    dtype('int16')
    """
    if count <= np.iinfo(np.int8).max:
        return codes.astype(np.int8, copy=False)
    if count <= np.iinfo(np.int16).max:
        return codes.astype(np.int16, copy=False)
    return codes.astype(np.int32, copy=False)


class Packed:
    """A column of texts in little memory, from which a :class:`Coded` is made when it is wanted.

    Parameters
    ----------
    codes : (n,) array of whole numbers
        Index into the texts; -1 where the cell is missing.
    texts : sequence of str, or pa.Array of them
        The distinct texts.

    Examples
    --------
    >>> column = Packed(np.array([1, 0, -1]), ("early", "late"))
    >>> column.coded().text(0), column.codes.dtype
    ('late', dtype('int8'))
    """

    __slots__ = ("_texts", "codes")

    def __init__(self, codes: NDArray[np.integer], texts: Sequence[str] | pa.Array) -> None:
        self.codes = narrow(codes, len(texts))
        self._texts: tuple[str, ...] | pa.Array
        if len(texts) <= _FEW_TEXTS:
            given = texts.to_pylist() if isinstance(texts, pa.Array) else texts
            self._texts = tuple(given)
        else:
            self._texts = (
                texts if isinstance(texts, pa.Array) else pa.array(texts, pa.large_string())
            )

    @classmethod
    def of(cls, column: Coded) -> Packed:
        """A column, packed."""
        return cls(column.codes, column.values)

    @classmethod
    def of_cells(cls, cells: pa.Array, missing: Collection[str]) -> Packed:
        """Pack a column of text as :meth:`Coded.of` codes it, many texts at once where it can."""
        encoded = pc.dictionary_encode(cells)
        texts = encoded.dictionary
        if len(texts) <= _FEW_TEXTS or not _are_bare(texts):
            return cls.of(Coded.of(cells, missing))
        # Nothing is there to be trimmed or composed, so the texts stay as they lie in memory.
        absent = pc.is_in(texts, value_set=pa.array(sorted(missing), texts.type))
        codes = encoded.indices.to_numpy(zero_copy_only=False)
        if pc.any(absent).as_py():
            gone = absent.to_numpy(zero_copy_only=False)
            code = np.where(gone, -1, np.cumsum(~gone) - 1).astype(np.int32)
            codes, texts = code[codes], texts.filter(pc.invert(absent))
        return cls(codes, texts)

    def __len__(self) -> int:
        return len(self.codes)

    def values(self) -> tuple[str, ...]:
        """The distinct texts."""
        texts = self._texts
        return texts if isinstance(texts, tuple) else tuple(texts.to_pylist())

    def text(self, row: int) -> str:
        """The text of one row, empty where it is missing."""
        code = int(self.codes[row])
        if code < 0:
            return ""
        texts = self._texts
        return texts[code] if isinstance(texts, tuple) else str(texts[code].as_py())

    def coded(self) -> Coded:
        """The column as codes, which takes more memory."""
        return Coded(self.codes.astype(np.int32), self.values())

    def take(self, rows: NDArray[np.integer]) -> Packed:
        """Some of the rows; missing where a row is -1."""
        if not len(self.codes):
            return Packed(np.full(len(rows), -1, dtype=np.int8), self._texts)
        codes = self.codes[rows]
        codes[rows < 0] = -1
        return Packed(codes, self._texts)


class PackedColumns(Mapping[str, Coded]):
    """Columns by name, each unpacked whenever it is asked for.

    What a column unpacks to is not kept, so whoever needs it again and again holds on to it.
    """

    __slots__ = ("_columns",)

    def __init__(self, columns: Mapping[str, Coded | Packed]) -> None:
        self._columns = dict(columns)

    def __getitem__(self, name: str) -> Coded:
        column = self._columns[name]
        return column.coded() if isinstance(column, Packed) else column

    def __setitem__(self, name: str, column: Coded | Packed) -> None:
        self._columns[name] = column

    def __iter__(self) -> Iterator[str]:
        return iter(self._columns)

    def __len__(self) -> int:
        return len(self._columns)

    def __contains__(self, name: object) -> bool:
        return name in self._columns

    def packed(self, name: str) -> Packed:
        """A column as it is held."""
        column = self._columns[name]
        return column if isinstance(column, Packed) else Packed.of(column)

    def release(self) -> None:
        """Let go of what the columns hold; their names stay."""
        for name in self._columns:
            self._columns[name] = Coded.absent(0)


class RowTexts:
    """A text for each row, most of them empty, such as the note on a trial.

    Parameters
    ----------
    length : int
        How many rows.

    Examples
    --------
    >>> notes = RowTexts(3)
    >>> notes[1] = "yawned"
    >>> [*notes], notes.some().tolist()
    (['', 'yawned', ''], [False, True, False])
    """

    __slots__ = ("_code_of", "_texts", "codes")

    def __init__(self, length: int) -> None:
        # Memory that is only zeros is taken when something is written there.
        self.codes: Narrow = np.zeros(length, dtype=np.int32)
        self._texts = [""]
        self._code_of = {"": 0}

    def __len__(self) -> int:
        return len(self.codes)

    def __getitem__(self, row: int) -> str:
        return self._texts[int(self.codes[row])]

    def __setitem__(self, row: int | NDArray[np.integer], text: str) -> None:
        self.codes[row] = self._code(text)

    def __iter__(self) -> Iterator[str]:
        return (self._texts[code] for code in self.codes.tolist())

    def put(
        self, rows: NDArray[np.integer], texts: Sequence[str], which: NDArray[np.integer]
    ) -> None:
        """Put one of some texts into each of some rows."""
        codes = np.array([self._code(text) for text in texts], dtype=np.int32)
        self.codes[rows] = codes[which]

    def _code(self, text: str) -> int:
        """The code of a text, which may be new."""
        code = self._code_of.setdefault(text, len(self._texts))
        if code == len(self._texts):
            self._texts.append(text)
        return code

    def some(self) -> NDArray[np.bool_]:
        """Which rows have a text."""
        some: NDArray[np.bool_] = self.codes != 0
        return some

    def texts_of(self, start: int, stop: int) -> tuple[str, ...]:
        """The texts of some rows that follow one another."""
        return tuple([self._texts[code] for code in self.codes[start:stop].tolist()])

    def ordered(self, order: NDArray[np.integer] | None) -> RowTexts:
        """The texts in another order of rows; for None in the order that they have."""
        other = RowTexts(0)
        other._texts, other._code_of = self._texts, self._code_of
        if len(self._texts) == 1:
            other.codes = np.zeros(len(self.codes), dtype=np.int8)
        else:
            codes = self.codes if order is None else self.codes[order]
            other.codes = narrow(codes, len(self._texts))
        return other


def _are_bare(texts: pa.Array) -> bool:
    """Whether all texts are letters, digits and marks of ASCII, without a blank."""
    letters = texts.buffers()[2]
    if letters is None:
        return True
    # The texts lie one behind the other; what is behind the last one is no matter.
    signs = np.frombuffer(letters, dtype=np.uint8)[: pc.sum(pc.binary_length(texts)).as_py()]
    return bool(len(signs) == 0 or (signs.min() > ord(" ") and signs.max() < 127))
