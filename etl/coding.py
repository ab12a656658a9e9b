"""Factors as numbers: the published contrast matrices, and the columns that hold them."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Final

import numpy as np
from numpy.typing import NDArray

#: The contrasts that have a name.
NAMED: Final = ("treatment", "sum", "helmert", "polynomial")
#: What the columns of polynomial contrasts are called; higher degrees by their number.
_DEGREES = ("linear", "quadratic", "cubic")


@dataclass(frozen=True, slots=True)
class Coding:
    """A factor as numeric columns.

    Attributes
    ----------
    factor : str
        Its name.
    name : str
        One of ``NAMED``, or ``given`` for numbers of the study file.
    levels : tuple of str
        In order, one row of the matrix each.
    columns : tuple of str
        Names of the numeric columns, which need no quoting in a formula.
    matrix : tuple of tuple of float
        ``levels`` rows of ``columns`` numbers.
    """

    factor: str
    name: str
    levels: tuple[str, ...]
    columns: tuple[str, ...]
    matrix: tuple[tuple[float, ...], ...]


def coding_of(
    factor: str,
    levels: Sequence[str],
    wanted: str | Mapping[str, Sequence[float]] = "treatment",
) -> Coding:
    """The numeric columns of a factor.

    Parameters
    ----------
    factor : str
        Its name.
    levels : sequence of str
        In order, the first is the reference level.
    wanted : str or mapping of str to sequence of float
        One of ``NAMED``, or columns given by name with a number for each level.

    Returns
    -------
    Coding
        ``levels - 1`` columns for a named contrast; none for a factor with one level.

    Raises
    ------
    KeyError
        If there is no contrast of that name.

    References
    ----------
    Chambers & Hastie (1992). Statistical Models in S, section 2.3: the four named matrices.
    Schad, Vasishth, Hohenstein & Kliegl (2020). How to capitalize on a priori contrasts in linear
    (mixed) models: a tutorial. Journal of Memory and Language, 110, 104038.
    doi:10.1016/j.jml.2019.104038

    Examples
    --------
    >>> coding_of("cue", ["early", "late"], "sum").matrix
    ((1.0,), (-1.0,))
    >>> coding_of("cue", ["early", "late"]).columns
    ('cue_late',)
    """
    levels = tuple(levels)
    if not isinstance(wanted, str):
        ends = list(wanted)
        matrix = np.array([list(map(float, numbers)) for numbers in wanted.values()]).T
        return Coding(
            factor, "given", levels, _named(factor, ends), _rows(matrix.reshape(len(levels), -1))
        )
    matrix = {
        "treatment": _treatment,
        "sum": _sum,
        "helmert": _helmert,
        "polynomial": _polynomial,
    }[wanted](len(levels))
    ends = {
        "treatment": list(levels[1:]),
        "sum": list(levels[:-1]),
        "helmert": list(levels[1:]),
        "polynomial": [
            _DEGREES[k] if k < len(_DEGREES) else str(k + 1) for k in range(len(levels) - 1)
        ],
    }[wanted]
    return Coding(factor, wanted, levels, _named(factor, ends), _rows(matrix))


def tells_levels_apart(columns: Sequence[Sequence[float]], levels: int) -> bool:
    """Whether columns of numbers can stand for a factor in a model.

    Parameters
    ----------
    columns : sequence of sequence of float
        ``levels`` finite numbers each.
    levels : int
        How many the factor has.

    Returns
    -------
    bool
        Whether there are ``levels - 1`` columns, of which none can be computed from the others and
        a constant: the columns with the intercept have full rank.

    Examples
    --------
    >>> tells_levels_apart([[-0.5, 0.5]], 2), tells_levels_apart([[1, 1]], 2)
    (True, False)
    """
    if len(columns) != levels - 1:
        return False
    matrix = np.ones((levels, levels))
    for place, numbers in enumerate(columns, start=1):
        # A column in other units is the same column.
        largest = max(map(abs, numbers))
        matrix[:, place] = np.array(numbers, dtype=np.float64) / (largest or 1.0)
    return bool(np.linalg.matrix_rank(matrix) == levels)


def _named(factor: str, ends: Sequence[str]) -> tuple[str, ...]:
    """Names of columns that need no quotes in a formula; numbered where signs would clash."""
    start = plain_name(factor) or "factor"
    if not start[0].isalpha():
        start = f"f_{start}"
    plain = [plain_name(end) for end in ends]
    if "" in plain or len(set(plain)) < len(plain):
        plain = [str(place) for place in range(1, len(ends) + 1)]
    return tuple(f"{start}_{end}" for end in plain)


def plain_name(text: str) -> str:
    """What can be kept of a text in the name of a column that needs no quotes in a formula.

    Parameters
    ----------
    text : str
        A factor, a level, or the name of a column.

    Returns
    -------
    str
        Its unaccented letters and digits, with single underscores between; perhaps nothing.

    Examples
    --------
    >>> plain_name("too early (1)"), plain_name("+")
    ('too_early_1', '')
    """
    return re.sub(r"[^0-9A-Za-z]+", "_", text).strip("_")


def _rows(matrix: NDArray[np.float64]) -> tuple[tuple[float, ...], ...]:
    """A matrix as plain numbers."""
    return tuple(tuple(row) for row in matrix.tolist())


def _treatment(k: int) -> NDArray[np.float64]:
    """Each level against the first."""
    return np.eye(k)[:, 1:]


def _sum(k: int) -> NDArray[np.float64]:
    """Each level but the last against the mean of all."""
    return np.vstack([np.eye(k - 1), -np.ones((1, k - 1))]) if k else np.zeros((0, 0))


def _helmert(k: int) -> NDArray[np.float64]:
    """Each level after the first against the mean of those before it."""
    matrix = np.zeros((k, max(k - 1, 0)))
    for column in range(k - 1):
        matrix[: column + 1, column] = -1.0
        matrix[column + 1, column] = column + 1.0
    return matrix


def _polynomial(k: int) -> NDArray[np.float64]:
    """Orthonormal polynomials over equally spaced levels; each ends above zero.

    Exact fractions until the last step give the same digits on every machine: a decomposition of
    powers does not, and loses them where there are many levels.
    """
    matrix = np.zeros((k, max(k - 1, 0)))
    steps = [Fraction(2 * place - k + 1) for place in range(k)]
    before, now = [Fraction(0)] * k, [Fraction(1)] * k
    ratio = Fraction(0)
    for degree in range(1, k):
        length = sum((value * value for value in now), Fraction(0))
        before, now = (
            now,
            [x * y - ratio * z for x, y, z in zip(steps, now, before, strict=True)],
        )
        squares = sum((value * value for value in now), Fraction(0))
        ratio = squares / length
        matrix[:, degree - 1] = [
            math.copysign(math.sqrt(value * value / squares), value) if value else 0.0
            for value in now
        ]
    return matrix
