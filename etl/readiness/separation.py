"""Whether fixed effects predict an outcome without error somewhere, so that estimates run off."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from itertools import combinations
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.readiness.counts import Flags, Ints, OutcomeCounts, cell_of
from etl.readiness.facts import Separation
from etl.readiness.terms import design_matrix, quoted, terms_of, written

Kind = Literal["none", "quasi-complete", "complete"]

#: This many causes are spelled out; the rest are counted.
MOST_CAUSES = 6
#: With more cells than this interactions of all factors are not looked for in levels that cells
#: have in common: each cell is named by itself.
_MOST_SUBSETS = 64
#: Sizes below this are rounding: columns are scaled to 1.
_ZERO = 1e-9


def separation_of(
    matrix: NDArray[np.float64], zeros: NDArray[np.int64], ones: NDArray[np.int64]
) -> tuple[Kind, Flags]:
    """Whether a design matrix separates zeros from ones.

    The estimates of a logistic regression exist unless some b other than 0 has x b >= 0 wherever
    there is a one and x b <= 0 wherever there is a zero, with x b not 0 somewhere. A linear program
    looks for the b that has x b other than 0 in as many rows as can be: with a margin z of 0 to 1
    in each row that has one value only, it maximises their sum. As b may be as large as it likes,
    each margin comes out as 0 or 1.

    Parameters
    ----------
    matrix : (rows, coefficients) float64 array
        A row for each combination of predictors, with the intercept; columns may depend on one
        another.
    zeros, ones : (rows,) int64 arrays
        How often each value occurs there. Rows without values count for nothing.

    Returns
    -------
    kind : {"none", "quasi-complete", "complete"}
        Complete where every row with values is told without error.
    separated : (rows,) bool array
        The rows that are.

    References
    ----------
    Albert & Anderson (1984). On the existence of maximum likelihood estimates in logistic
    regression models. Biometrika, 71, 1-10. doi:10.1093/biomet/71.1.1
    Konis (2007). Linear programming algorithms for detecting separated data in binary logistic
    regression models. Thesis, University of Oxford (from memory). We differ in the bound: it lies
    on the margins, not on b, so that the rows that are separated can be read off.

    Examples
    --------
    Zeros below 2, ones above it, both at 2: told without error but at 2.

    >>> x = np.array([[1.0, 1], [1, 2], [1, 3]])
    >>> kind, separated = separation_of(x, np.array([4, 3, 0]), np.array([0, 2, 5]))
    >>> kind, separated.tolist()
    ('quasi-complete', [True, False, True])
    """
    separated = np.zeros(len(matrix), dtype=np.bool_)
    single = (zeros > 0) != (ones > 0)
    mixed = (zeros > 0) & (ones > 0)
    if single.any():
        scaled = matrix / np.where((top := np.abs(matrix).max(axis=0)) > 0, top, 1.0)
        signed = scaled[single] * np.where(ones[single] > 0, 1.0, -1.0)[:, None]
        separated[single] = _margins(signed, scaled[mixed])
    if not separated.any():
        return "none", separated
    whole = not mixed.any() and bool(separated[single].all())
    return "complete" if whole else "quasi-complete", separated


def _margins(signed: NDArray[np.float64], mixed: NDArray[np.float64]) -> Flags:
    """Which rows of one value can be told without error while mixed rows stay at 0.

    Most tables need no linear program: what is left for b once mixed rows are at 0 is nothing, or
    one direction.
    """
    row_space = _spans(np.vstack([signed, mixed]))
    left = row_space @ _kernel(mixed @ row_space)
    if left.shape[1] == 0:
        return np.zeros(len(signed), dtype=np.bool_)
    if left.shape[1] > 1:
        return _by_program(signed, mixed)
    margin = (signed @ left)[:, 0]
    margin[np.abs(margin) < _ZERO] = 0.0
    if (margin > 0).any() and (margin < 0).any():
        return np.zeros(len(signed), dtype=np.bool_)
    told: Flags = margin != 0
    return told


def _spans(matrix: NDArray[np.float64]) -> NDArray[np.float64]:
    """An orthonormal basis of the rows of a matrix, a column each."""
    _, sizes, vectors = np.linalg.svd(matrix, full_matrices=False)
    basis: NDArray[np.float64] = vectors[sizes > _ZERO * max(sizes.max(initial=0.0), 1.0)].T
    return basis


def _kernel(matrix: NDArray[np.float64]) -> NDArray[np.float64]:
    """An orthonormal basis of what a matrix takes to 0, a column each."""
    if not len(matrix):
        return np.eye(matrix.shape[1])
    _, sizes, vectors = np.linalg.svd(matrix)
    rank = int((sizes > _ZERO * max(sizes.max(initial=0.0), 1.0)).sum())
    basis: NDArray[np.float64] = vectors[rank:].T
    return basis


def _by_program(signed: NDArray[np.float64], mixed: NDArray[np.float64]) -> Flags:
    """The same by a linear program, whatever is left for b."""
    told = _solved(signed.shape[1], signed.tobytes(), mixed.tobytes())
    return np.frombuffer(told, dtype=np.bool_)


@lru_cache(maxsize=4096)
def _solved(width: int, signed_bytes: bytes, mixed_bytes: bytes) -> bytes:
    """The solution of a program; many outcomes of a study ask for the same one."""
    # Importing the solver takes longer than a small build, so only where it is needed.
    from scipy.optimize import linprog  # noqa: PLC0415

    signed = np.frombuffer(signed_bytes).reshape(-1, width)
    mixed = np.frombuffer(mixed_bytes).reshape(-1, width)
    rows = len(signed)
    # Unknown are b, without bounds, and the margins z: z - signed b <= 0, and b is 0 in mixed rows.
    found = linprog(
        np.concatenate([np.zeros(width), -np.ones(rows)]),
        A_ub=np.hstack([-signed, np.eye(rows)]),
        b_ub=np.zeros(rows),
        A_eq=np.hstack([mixed, np.zeros((len(mixed), rows))]) if len(mixed) else None,
        b_eq=np.zeros(len(mixed)) if len(mixed) else None,
        bounds=[(None, None)] * width + [(0.0, 1.0)] * rows,
        method="highs",
    )
    if found.x is None:  # 0 is always a solution: without an answer the solver gave up
        raise FaultError(f"the linear program was not solved: {found.message}")
    return np.asarray(found.x[width:] > 0.5).tobytes()


def separations(counts: OutcomeCounts) -> tuple[Separation, ...]:
    """Whether the factors separate an outcome.

    Parameters
    ----------
    counts : OutcomeCounts
        With zeros and ones.

    Returns
    -------
    tuple of Separation
        By main effects; with interactions of two factors where there are three or more; with all.
        Empty where no factor has two levels.
    """
    own = counts.varying
    if not own:
        return ()
    names = [counts.conditions.factors[place] for place in own]
    there = counts.values > 0
    cells = counts.cells[there]
    sizes = tuple(len(counts.active[place]) for place in own)
    codes = np.stack(
        [np.searchsorted(counts.active[p], counts.conditions.codes[there, p]) for p in own], axis=1
    )
    # Combinations that differ only in a factor that is left out are one: they have one level each.
    atoms = {name: [quoted(name)] for name in names}
    found = []
    for order in sorted({1, min(2, len(own)), len(own)}):
        if order == len(own):
            # With all interactions every cell has a coefficient of its own.
            separated = (cells[:, 0] == 0) | (cells[:, 1] == 0)
            kind: Kind = "quasi-complete" if separated.any() else "none"
            kind = "complete" if separated.all() else kind
        else:
            matrix = design_matrix(codes, sizes, order)
            kind, separated = separation_of(matrix, cells[:, 0], cells[:, 1])
        levels = [
            tuple(counts.conditions.levels[place][code] for code in counts.active[place])
            for place in own
        ]
        why = _causes(names, levels, codes, np.where(separated, (cells[:, 1] > 0) * 1, -1))
        found.append(Separation(written(terms_of(names, order), atoms), kind, why))
    return tuple(found)


def _causes(
    factors: Sequence[str], levels: Sequence[Sequence[str]], codes: Ints, told: Ints
) -> tuple[str, ...]:
    """Levels, else combinations of levels, that have one value only; -1 where nothing is told."""
    causes: list[str] = []
    open_ = told >= 0
    largest = len(factors) if 2 ** len(factors) <= _MOST_SUBSETS else 1
    sizes = tuple(len(own) for own in levels)
    subsets = [s for size in range(1, largest + 1) for s in combinations(range(len(factors)), size)]
    if largest < len(factors):
        subsets.append(tuple(range(len(factors))))
    for subset in subsets:
        if not open_.any():
            break
        own = cell_of(codes[:, list(subset)], tuple(sizes[place] for place in subset))
        for code in np.unique(own[open_]).tolist():
            members = own == code
            values = np.unique(told[members])
            if len(values) > 1 or values[0] < 0:
                continue
            row = codes[np.flatnonzero(members)[0]]
            where = " × ".join(f"{factors[p]} = {levels[p][row[p]]}" for p in subset)
            causes.append(f"{where} has {'ones' if values[0] else 'zeros'} only")
            open_ &= ~members
    more = len(causes) - MOST_CAUSES
    return (*causes[:MOST_CAUSES], *([f"and {more:,} more such"] if more > 0 else []))
