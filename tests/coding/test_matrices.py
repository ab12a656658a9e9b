"""The contrast matrices against other programs that have them, and against their definitions."""

from __future__ import annotations

import math
import shutil
import subprocess
import warnings

import numpy as np
import pytest
from numpy.typing import NDArray

from etl.coding import NAMED, coding_of

LEVELS = tuple("abcdefgh")
IN_R = {
    "treatment": "contr.treatment",
    "sum": "contr.sum",
    "helmert": "contr.helmert",
    "polynomial": "contr.poly",
}
#: R and patsy decompose powers of eight levels in double precision, and lose up to five digits of
#: sixteen on the way; ours are rounded once.
CLOSE = 1e-10


def matrix(name: str, count: int) -> NDArray[np.float64]:
    """The numbers of a named contrast."""
    coding = coding_of("cue", LEVELS[:count], name)
    return np.array(coding.matrix).reshape(count, len(coding.columns))


@pytest.fixture(scope="module")
def from_r(tmp_path_factory: pytest.TempPathFactory) -> dict[str, list[float]]:
    """Every matrix that R makes, by its function and number of levels, column after column."""
    rscript = shutil.which("Rscript")
    if rscript is None:
        pytest.skip("no Rscript on the path: R (r-base-core in Debian) is needed")
    script = tmp_path_factory.mktemp("r") / "contrasts.R"
    script.write_text(
        "for (k in 2:8) for (f in c('contr.treatment', 'contr.sum', 'contr.helmert', "
        "'contr.poly'))\n  cat(f, k, sprintf('%.17g', c(get(f)(k))), '\\n')\n"
        "cat('one level:', inherits(try(contr.treatment(1), silent = TRUE), 'try-error'), '\\n')\n",
        encoding="utf-8",
    )
    ran = subprocess.run([rscript, str(script)], capture_output=True, text=True, check=True)
    *lines, last = ran.stdout.splitlines()
    assert last.split() == ["one", "level:", "TRUE"], "R, too, has no contrast for one level"
    cells = [line.split() for line in lines]
    return {f"{row[0]} {row[1]}": [float(number) for number in row[2:]] for row in cells}


@pytest.mark.parametrize("name", NAMED)
@pytest.mark.parametrize("count", range(2, 9))
def test_matrix_is_that_of_r(from_r: dict[str, list[float]], name: str, count: int) -> None:
    """A named contrast has the numbers of R's function of that name, for two to eight levels."""
    wanted = np.array(from_r[f"{IN_R[name]} {count}"]).reshape(count - 1, count).T
    assert np.abs(matrix(name, count) - wanted).max() < CLOSE


@pytest.mark.parametrize("name", NAMED)
@pytest.mark.parametrize("count", range(2, 9))
def test_matrix_is_that_of_patsy(name: str, count: int) -> None:
    """A named contrast has the numbers of patsy's class of that name."""
    patsy = pytest.importorskip("patsy", reason="patsy is not installed")
    made = {
        "treatment": patsy.Treatment(),
        "sum": patsy.Sum(),
        "helmert": patsy.contrasts.Helmert(),
        "polynomial": patsy.Poly(),
    }[name]
    wanted = made.code_without_intercept(list(LEVELS[:count])).matrix
    assert np.abs(matrix(name, count) - wanted).max() < CLOSE


@pytest.mark.parametrize("name", NAMED)
@pytest.mark.parametrize("count", range(2, 9))
def test_matrix_is_that_of_formulaic(name: str, count: int) -> None:
    """A named contrast has the numbers of formulaic's contrast of that name."""
    with warnings.catch_warnings():
        # What its own imports complain of is no concern of ours.
        warnings.simplefilter("ignore")
        contrasts = pytest.importorskip(
            "formulaic.transforms.contrasts", reason="formulaic is not installed"
        )
    made = {
        "treatment": contrasts.TreatmentContrasts(),
        "sum": contrasts.SumContrasts(),
        "helmert": contrasts.HelmertContrasts(reverse=True, scale=False),
        "polynomial": contrasts.PolyContrasts(),
    }[name]
    wanted = made.get_coding_matrix(list(LEVELS[:count])).to_numpy()
    assert np.abs(matrix(name, count) - wanted).max() < CLOSE


@pytest.mark.parametrize("name", NAMED)
def test_factor_with_one_level_has_no_column(name: str) -> None:
    """Nothing varies, so that there is nothing to estimate."""
    coding = coding_of("cue", ["early"], name)
    assert (coding.columns, coding.matrix) == ((), ((),))


@pytest.mark.parametrize("name", NAMED)
@pytest.mark.parametrize("count", [2, 3, 5, 8, 30])
def test_columns_with_the_intercept_have_full_rank(name: str, count: int) -> None:
    """Every difference between levels can be told from the columns."""
    coding = coding_of("cue", [f"l{place}" for place in range(count)], name)
    whole = np.column_stack([np.ones(count), np.array(coding.matrix)])
    assert np.linalg.matrix_rank(whole) == count


@pytest.mark.parametrize("count", [2, 3, 8, 30, 60])
def test_polynomials_are_orthonormal(count: int) -> None:
    """They sum to zero, have length one, and none has to do with another; also of high degree."""
    numbers = np.array(coding_of("cue", [str(n) for n in range(count)], "polynomial").matrix)
    # Sums of as many products as there are levels, each rounded.
    near = count * np.finfo(float).eps
    assert np.abs(numbers.sum(axis=0)).max() < near
    assert np.abs(numbers.T @ numbers - np.eye(count - 1)).max() < near
    assert (numbers[-1] > 0).all()


def test_polynomials_of_four_levels_are_those_of_the_tables() -> None:
    """-3 -1 1 3, 1 -1 -1 1 and -1 3 -3 1, as in the tables of Fisher & Yates (from memory)."""
    wanted = [[-3, -1, 1, 3], [1, -1, -1, 1], [-1, 3, -3, 1]]
    lengths = [math.sqrt(20), math.sqrt(4), math.sqrt(20)]
    expected = [[n / size for n in row] for row, size in zip(wanted, lengths, strict=True)]
    got = np.array(coding_of("cue", "abcd", "polynomial").matrix).T
    # One rounding of the ratio and one of the root.
    assert np.abs(got - np.array(expected)).max() <= 2 * np.finfo(float).eps


@pytest.mark.parametrize("name", NAMED)
@pytest.mark.parametrize("count", range(1, 9))
def test_no_number_is_a_negative_zero(name: str, count: int) -> None:
    """A zero with a minus sign would be another text in the tables."""
    numbers = matrix(name, count)
    assert not (np.signbit(numbers) & (numbers == 0)).any()
