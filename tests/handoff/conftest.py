"""Studies that are built and described once for all checks of what is handed over."""

from __future__ import annotations

import pytest

from tests.end_to_end.building import copied_sample
from tests.handoff.bundles import small_study
from tests.handoff.codebook_building import AWKWARD, AWKWARD_OUTPUT, Described, described

CENTRED = """[output]
contrasts = { cue = "sum", fit = "treatment" }
centred = ["age"]"""


@pytest.fixture(scope="session")
def orchard_described(tmp_path_factory: pytest.TempPathFactory) -> Described:
    """The orchard study as committed, with contrasts and a centred covariate besides."""
    root = tmp_path_factory.mktemp("described_orchard")
    return described(copied_sample("orchard", root, {"[output]": CENTRED}, rules=None), root / "o")


@pytest.fixture(scope="session")
def passages_described(tmp_path_factory: pytest.TempPathFactory) -> Described:
    """The passages study as committed."""
    root = tmp_path_factory.mktemp("described_passages")
    return described(copied_sample("passages", root, rules=None), root / "o")


@pytest.fixture(scope="session")
def awkward_described(tmp_path_factory: pytest.TempPathFactory) -> Described:
    """A study whose names and levels are as awkward as they get, in both formats."""
    root = tmp_path_factory.mktemp("described_awkward")
    study_file = small_study(root, AWKWARD, output=AWKWARD_OUTPUT, title="=Pears | *and* `plums`")
    return described(study_file, root / "o")


@pytest.fixture(scope="session")
def parquet_described(tmp_path_factory: pytest.TempPathFactory) -> Described:
    """A study that wants Parquet alone, without factors or texts."""
    root = tmp_path_factory.mktemp("described_parquet")
    return described(small_study(root, {}, items=False, formats='["parquet"]'), root / "o")


@pytest.fixture(params=["orchard", "passages", "awkward", "parquet"])
def any_described(request: pytest.FixtureRequest) -> Described:
    """Each of these studies in turn."""
    return request.getfixturevalue(f"{request.param}_described")
