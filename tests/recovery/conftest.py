"""The recovery studies, built and fitted once for all checks and all test processes."""

from __future__ import annotations

from functools import partial
from pathlib import Path

import pytest

from tests.recovery.fitting import (
    STUDIES,
    Built,
    Fits,
    build_study,
    drawn_study,
    faulty_models,
    fit,
    models,
    read_fits,
    why_no_r,
)
from tests.recovery.shared_work import share, shared_folder
from tests.recovery.truth import TRUTHS

#: Of the draws that this number decides; ``python -m tests.recovery`` shows others.
SEED = 1
#: What the study files say: as it should be, and with a fault planted.
VARIANTS = {"sound": {}, "zeros": {"no_opportunity": "zero"}}


@pytest.fixture(scope="session")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Where the studies are."""
    return shared_folder(tmp_path_factory, "recovery")


@pytest.fixture(scope="session")
def studies(folder: Path) -> list[Built]:
    """Forty studies, drawn, written as logs and built."""
    numbers = range(STUDIES)
    build = {
        f"study-{n}": partial(build_study, SEED, n, folder / str(n), VARIANTS) for n in numbers
    }
    share(folder, build)
    return [drawn_study(SEED, n, folder / str(n)) for n in numbers]


@pytest.fixture(scope="session")
def fits(folder: Path, request: pytest.FixtureRequest) -> Fits:
    """All models, sound and faulty, fitted by R to the built tables."""
    if why_no_r():
        pytest.skip(why_no_r())
    studies = request.getfixturevalue("studies")
    wanted = [*models(studies), *faulty_models(studies, TRUTHS[1])]
    share(folder, {"fits": partial(fit, wanted, folder / "fits")})
    return read_fits(folder / "fits")
