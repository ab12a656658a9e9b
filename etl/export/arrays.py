"""From numpy arrays to Arrow's, without looking at each cell twice.

A missing cell is a bit that is not set; eight of them are packed into a byte at once.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray


def array_of(values: NDArray[Any], there: NDArray[np.bool_] | None = None) -> pa.Array:
    """Numbers as a column.

    Parameters
    ----------
    values : (n,) array of int8, int32, int64 or float64
        The cells; taken over as they are, not to be changed afterwards.
    there : (n,) bool array, optional
        Whether each cell has a value; None where all have.

    Returns
    -------
    pa.Array
        Of the same type.

    Examples
    --------
    >>> array_of(np.array([7, 0]), np.array([True, False])).to_pylist()
    [7, None]
    """
    values = np.ascontiguousarray(values)
    bits = None
    if there is not None and not there.all():
        bits = pa.py_buffer(np.packbits(there, bitorder="little"))
    kind = pa.from_numpy_dtype(values.dtype)
    return pa.Array.from_buffers(kind, len(values), [bits, pa.py_buffer(values)])


def numbers_of(values: NDArray[np.float64]) -> pa.Array:
    """Numbers as a column; NaN is missing.

    Parameters
    ----------
    values : (n,) float64 array
        The cells.

    Returns
    -------
    pa.Array
    """
    return array_of(values, ~np.isnan(values))


def coded_of(codes: NDArray[np.int32], values: pa.Array, *, whole: bool = False) -> pa.Array:
    """Codes with their texts; a negative code is missing.

    Parameters
    ----------
    codes : (n,) int32 array
        Places in ``values``.
    values : pa.Array
        The texts, or numbers.
    whole : bool
        Whether it is known that nothing is missing.

    Returns
    -------
    pa.DictionaryArray

    Examples
    --------
    >>> coded_of(np.array([1, -1], dtype=np.int32), pa.array(["a", "b"])).to_pylist()
    ['b', None]
    """
    indices = array_of(codes, None if whole else codes >= 0)
    # The codes are ours: checking each of them again would cost as much as making the column.
    return pa.DictionaryArray.from_arrays(indices, values, safe=False)


@dataclass(frozen=True, slots=True, eq=False)
class Fact:
    """A column that describes trials, before it is known how often each is needed.

    Attributes
    ----------
    cells : (trials,) array
        Codes or numbers.
    made : callable
        From any of these to a column.
    """

    cells: NDArray[Any]
    made: Callable[[NDArray[Any]], pa.Array]

    @classmethod
    def of_codes(cls, codes: NDArray[np.int32], values: pa.Array) -> Fact:
        """A column of texts; a negative code is missing."""
        whole = len(codes) == 0 or int(codes.min()) >= 0
        return cls(codes, lambda cells: coded_of(cells, values, whole=whole))

    @classmethod
    def of_whole(cls, codes: NDArray[np.int32], values: NDArray[np.int64]) -> Fact:
        """A column of whole numbers, given as codes; a negative code is missing."""
        if len(codes) and int(codes.min()) < 0:
            # Numbers are looked up when it is known which are needed: none stands for missing.
            return cls(codes, lambda cells: array_of(_looked_up(cells, values), cells >= 0))
        return cls(values[codes], array_of)

    @classmethod
    def of_numbers(cls, numbers: NDArray[np.float64]) -> Fact:
        """A column of numbers; NaN is missing."""
        return cls(numbers, numbers_of if np.isnan(numbers).any() else array_of)

    def column(self) -> pa.Array:
        """The column, one row a trial."""
        return self.made(self.cells)

    def repeated(self, counts: NDArray[np.int64] | int) -> pa.Array:
        """The column with each trial's cell as often as ``counts`` says."""
        return self.made(np.repeat(self.cells, counts))

    def taken(self, trial: NDArray[np.int64]) -> pa.Array:
        """The column with the cells of some trials."""
        return self.made(self.cells[trial])


def _looked_up(codes: NDArray[np.int32], values: NDArray[np.int64]) -> NDArray[np.int64]:
    """The number of each code; anything where there is none."""
    return np.append(values, 0)[codes]
