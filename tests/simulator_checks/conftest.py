"""The sample studies, read once for all checks of the simulator."""

from __future__ import annotations

import pytest

from tests.simulator import SimulatedStudy
from tests.simulator.__main__ import sample_orchard, sample_passages


@pytest.fixture(scope="session")
def orchard() -> SimulatedStudy:
    """The orchard study as committed, with the truth about it."""
    return sample_orchard()


@pytest.fixture(scope="session")
def passages() -> SimulatedStudy:
    """The passages study as committed, with the truth about it."""
    return sample_passages()
