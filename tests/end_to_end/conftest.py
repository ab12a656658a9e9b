"""The sample studies without screening, built once for all end-to-end checks."""

from __future__ import annotations

import pytest

from tests.end_to_end.building import Sample, build, copied_sample
from tests.simulator import write_orchard, write_passages
from tests.simulator.__main__ import sample_orchard, sample_passages
from tests.simulator.orchard import laboratory_logs


@pytest.fixture(scope="session")
def orchard(tmp_path_factory: pytest.TempPathFactory) -> Sample:
    """The orchard study."""
    root = tmp_path_factory.mktemp("orchard")
    truth = sample_orchard()
    places = write_orchard(truth, root / "again", root / "again.csv", laboratory_logs(truth))
    study_file = copied_sample("orchard", root)
    result = build(study_file, root / "built")
    return Sample("orchard", study_file.parent, truth, places, result)


@pytest.fixture(scope="session")
def passages(tmp_path_factory: pytest.TempPathFactory) -> Sample:
    """The passages study."""
    root = tmp_path_factory.mktemp("passages")
    truth = sample_passages()
    places = write_passages(truth, root / "again", root / "again.csv")
    study_file = copied_sample("passages", root)
    result = build(study_file, root / "built")
    return Sample("passages", study_file.parent, truth, places, result)


@pytest.fixture(params=["orchard", "passages"])
def sample(request: pytest.FixtureRequest) -> Sample:
    """Each of the sample studies in turn."""
    return request.getfixturevalue(request.param)
