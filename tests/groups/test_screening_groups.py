"""Screening of several readers at once against each alone, on random readers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest

from etl.export.rows import TrialColumns
from etl.screening.ledger import Screened
from etl.session.lines import ReaderLines
from etl.session.ordered import OrderedFixations
from etl.session.screening import Unscreened, screen
from tests.screening.random_readers import (
    LIBRARY,
    options,
    random_reader,
    random_rules,
    unscreened,
)


def joined(readers: Sequence[Unscreened]) -> Unscreened:
    """Several readers as one group."""
    counts = [len(reader.trials) for reader in readers]
    first = np.cumsum([0, *counts])[:-1].tolist()
    log = readers[0].log
    arrays = {
        name: np.concatenate([getattr(reader.log, name) for reader in readers])
        for name in ("onset_ms", "number", "duration_ms", "x_px", "y_px", "source_line")
    }
    blink = np.concatenate([reader.log.blink for reader in readers])
    recording = np.concatenate([reader.log.recording for reader in readers])
    lines = None
    if readers[0].lines is not None:
        lines = ReaderLines(
            **{
                name: np.concatenate([getattr(reader.lines, name) for reader in readers])
                for name in ReaderLines.__slots__
            }
        )
    return Unscreened(
        TrialColumns.joined([reader.trials for reader in readers]),
        np.repeat(np.arange(len(readers)), counts),
        replace(log, **arrays, blink=blink, recording=recording),
        OrderedFixations.joined([reader.ordered for reader in readers], first),
        np.concatenate([reader.order for reader in readers]),
        tuple(reader.notes[0] for reader in readers),
        lines,
    )


def told(screened: Screened, reader: int) -> list[object]:
    """All that screening says of one reader."""
    trials = screened.reader == reader
    rows = trials[screened.recorded.trial]
    first = int(np.argmax(rows))
    own = screened.fixations
    into = own.into[rows]
    return [
        screened.trial_codes()[trials].tolist(),
        screened.fixation_codes()[rows].tolist(),
        own.duration_ms[rows].tolist(),
        own.onset_ms[rows].tolist(),
        own.blink[rows].tolist(),
        np.where(into < 0, -1, into - first).tolist(),
        {rule: holds[rows].tolist() for rule, holds in own.holds.items()},
        {rule: holds[trials].tolist() for rule, holds in screened.trials.holds.items()},
        {rule: str(seen[trials].tolist()) for rule, seen in screened.trials.observed.items()},
        {rule: bool(holds[reader]) for rule, holds in screened.readers.holds.items()},
        {rule: str(float(seen[reader])) for rule, seen in screened.readers.observed.items()},
    ]


@pytest.mark.parametrize("seed", range(200))
def test_reader_is_screened_alike_in_a_group(seed: int) -> None:
    """Some readers have no y, no answers, notes; some trials are skipped, some recorded twice."""
    rng = np.random.default_rng(seed)
    limits = options(random_rules(rng), ("ignore", "interrupt")[rng.integers(2)])
    readers = [unscreened(*random_reader(rng)) for _ in range(12)]
    # Lines are told in all of a study or in none.
    with_lines = bool(rng.integers(2))
    readers = [reader for reader in readers if (reader.lines is not None) is with_lines]
    if not readers:
        readers = [unscreened(*random_reader(rng))]
    together = screen(joined(readers), LIBRARY, limits)
    for place, reader in enumerate(readers):
        assert told(together, place) == told(screen(reader, LIBRARY, limits), 0)
