"""Terms of a model, the numbers in their columns, and how a formula writes them."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable, Mapping, Sequence
from itertools import combinations
from math import prod
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.coding import Coding

#: A main effect is a term of one factor, an interaction one of several.
Term = tuple[str, ...]

#: Names that R keeps for itself (from memory, ``?Reserved``).
_RESERVED: Final = frozenset(
    {
        *("if", "else", "repeat", "while", "function", "for", "next", "break", "in"),
        *("TRUE", "FALSE", "NULL", "Inf", "NaN", "NA"),
        *("NA_integer_", "NA_real_", "NA_complex_", "NA_character_"),
    }
)
_SYNTACTIC: Final = re.compile(r"(?:[A-Za-z]|\.(?![0-9]))[A-Za-z0-9._]*")
#: With more coefficients than this in the fixed effects, interactions of many factors are left out.
MOST_COEFFICIENTS: Final = 64


def quoted(name: str) -> str:
    """A name as R takes it in a formula.

    Parameters
    ----------
    name : str
        Of a column. Letters other than A to Z are quoted too: whether R takes them bare depends on
        the machine's language.

    Examples
    --------
    >>> quoted("cue"), quoted("fit type"), quoted("if")
    ('cue', '`fit type`', '`if`')
    """
    if name not in _RESERVED and _SYNTACTIC.fullmatch(name):
        return name
    return "`" + name.replace("\\", "\\\\").replace("`", "\\`") + "`"


def terms_of(factors: Sequence[str], order: int) -> tuple[Term, ...]:
    """Main effects and interactions of up to so many factors.

    Examples
    --------
    >>> terms_of(["a", "b"], 2)
    (('a',), ('b',), ('a', 'b'))
    """
    return tuple(term for size in range(1, order + 1) for term in combinations(factors, size))


def highest_order(sizes: Sequence[int]) -> int:
    """Of how many factors the interactions of the formulas go up to.

    Parameters
    ----------
    sizes : sequence of int
        How many levels each factor has.

    Returns
    -------
    int
        All of them where that makes no more than ``MOST_COEFFICIENTS`` coefficients; else two, or
        one. A main effect is kept always.

    Examples
    --------
    >>> highest_order([2, 2, 2]), highest_order([5, 5, 5]), highest_order([40, 40])
    (3, 2, 1)
    """
    if prod(sizes) <= MOST_COEFFICIENTS:
        return len(sizes)
    free = [size - 1 for size in sizes]
    pairs = sum(a * b for a, b in combinations(free, 2))
    return 2 if len(sizes) > 2 and 1 + sum(free) + pairs <= MOST_COEFFICIENTS else 1


def written(terms: Collection[Term], atoms: Mapping[str, Sequence[str]]) -> str:
    """Terms as the right side of a formula.

    Parameters
    ----------
    terms : collection of tuple of str
        With every interaction also the terms within it.
    atoms : mapping of str to sequence of str
        How each factor is written: its own name, or its numeric columns.

    Returns
    -------
    str
        Empty where there are no terms.

    Examples
    --------
    >>> own = {name: [name] for name in "abc"}
    >>> written([("a",), ("b",), ("a", "b"), ("c",)], own)
    'a * b + c'
    >>> written(terms_of("abc", 2), own)
    '(a + b + c)^2'
    >>> written(terms_of("ab", 2), {"a": ["a_2", "a_3"], "b": ["b_2"]})
    '(a_2 + a_3) * b_2'
    """
    named = [name for name in atoms if (name,) in terms]
    if len(named) > 2 and set(terms) == set(terms_of(named, 2)):
        columns = [column for name in named for column in atoms[name]]
        # Columns of one factor have no products with one another, so a square takes whole factors.
        if len(columns) == len(named):
            return f"({' + '.join(columns)})^2"
    largest = [term for term in terms if not any(set(term) < set(other) for other in terms)]
    places = {name: place for place, name in enumerate(atoms)}
    largest.sort(key=lambda term: [places[name] for name in term])
    return " + ".join(_product([atoms[name] for name in term]) for term in largest)


def _product(parts: Sequence[Sequence[str]]) -> str:
    """The product of factors, each of one column or several."""
    if len(parts) == 1:
        return " + ".join(parts[0])
    return " * ".join(own[0] if len(own) == 1 else f"({' + '.join(own)})" for own in parts)


def design_matrix(
    codes: NDArray[np.int64], sizes: Sequence[int], order: int
) -> NDArray[np.float64]:
    """Intercept, main effects and interactions of treatment-coded factors.

    Parameters
    ----------
    codes : (rows, factors) int64 array
        The place of each factor's level, 0 the reference.
    sizes : sequence of int
        How many levels each factor has.
    order : int
        Of how many factors interactions go up to.

    Returns
    -------
    (rows, coefficients) float64 array
        Columns may depend on one another where combinations do not occur.

    Examples
    --------
    >>> design_matrix(np.array([[0, 0], [1, 0], [1, 1]]), [2, 2], 2).tolist()
    [[1.0, 0.0, 0.0, 0.0], [1.0, 1.0, 0.0, 0.0], [1.0, 1.0, 1.0, 1.0]]
    """
    parts = [np.eye(size)[codes[:, place]][:, 1:] for place, size in enumerate(sizes)]
    columns = [np.ones((len(codes), 1))]
    for term in (t for size in range(1, order + 1) for t in combinations(range(len(parts)), size)):
        block = parts[term[0]]
        for place in term[1:]:
            block = (block[:, :, None] * parts[place][:, None, :]).reshape(len(codes), -1)
        columns.append(block)
    return np.hstack(columns)


def numeric_columns(coding: Coding, levels: Iterable[int]) -> tuple[str, ...]:
    """The numeric columns of a factor that say something where only some levels occur.

    Parameters
    ----------
    coding : Coding
        The factor as columns.
    levels : iterable of int
        The places of the levels that occur.

    Returns
    -------
    tuple of str
        Names of columns that with the intercept do not depend on one another: one fewer than
        levels.

    Examples
    --------
    >>> from etl.coding import coding_of
    >>> numeric_columns(coding_of("cue", ["early", "late", "never"]), [0, 2])
    ('cue_never',)
    """
    matrix = np.array(coding.matrix, dtype=np.float64).reshape(len(coding.levels), -1)
    matrix = matrix[list(levels)]
    kept = np.ones((len(matrix), 1))
    names = []
    for place, name in enumerate(coding.columns):
        wider = np.hstack([kept, matrix[:, [place]]])
        if np.linalg.matrix_rank(wider) == wider.shape[1]:
            kept = wider
            names.append(name)
    return tuple(names)
