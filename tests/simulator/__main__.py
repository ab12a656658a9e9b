"""Write the sample studies: ``python -m tests.simulator``."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from tests.simulator.orchard import laboratory_logs, orchard_spec, write_orchard
from tests.simulator.passages import passages_spec, write_passages
from tests.simulator.spec import SimulatedStudy
from tests.simulator.study import simulate_study

ORCHARD_SEED = 20260301
PASSAGES_SEED = 20260302
PROJECT = Path(__file__).resolve().parents[2]


def sample_orchard() -> SimulatedStudy:
    """The orchard study as committed."""
    rng = np.random.Generator(np.random.PCG64(ORCHARD_SEED))
    return simulate_study(orchard_spec(rng), rng)


def sample_passages() -> SimulatedStudy:
    """The passages study as committed."""
    rng = np.random.Generator(np.random.PCG64(PASSAGES_SEED))
    return simulate_study(passages_spec(), rng)


def regenerate(root: Path) -> None:
    """Write both sample studies and their region definitions below a folder.

    Logs that the simulator does not write (any more) are deleted from the studies' log folders.
    """
    for name in ("orchard", "passages"):
        for stale in sorted((root / "sample_logs" / name / "logs").glob("*")):
            stale.unlink()
    definitions = root / "region_definitions"
    orchard = sample_orchard()
    write_orchard(
        orchard,
        root / "sample_logs" / "orchard",
        definitions / "orchard.csv",
        laboratory_logs(orchard),
    )
    write_passages(
        sample_passages(), root / "sample_logs" / "passages", definitions / "passages.csv"
    )


if __name__ == "__main__":
    regenerate(PROJECT)
