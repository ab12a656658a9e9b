"""From fixations in their places to outcomes: screening, measures, values that are set missing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.measures import Outcomes, Sequences, compute
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import outlying
from etl.screening.entries import Screened
from etl.screening.ledger import FarValue
from etl.screening.rules import OUTLIER
from etl.session.ordered import OrderedFixations
from etl.session.placing import Placed
from etl.session.reader import Options, ReaderGroup
from etl.session.screening import Unscreened, screen
from etl.tables import MeasureColumn


@dataclass(frozen=True, slots=True, eq=False)
class Computed:
    """What became of some readers under the decisions of a study.

    Attributes
    ----------
    screened : Screened
        What is left out.
    trial_codes, gone : (trials,) and (n,) int8 array
        What left each trial and each fixation out; -1 kept.
    kept : (k,) int64 array
        The fixations that are kept.
    in_study : (m,) int64 array
        The trials that are kept.
    place : (trials,) int64 array
        The place of each trial among those that are kept; others 0.
    outcomes : Outcomes
        The measures of the kept trials.
    """

    screened: Screened
    trial_codes: NDArray[np.int8]
    gone: NDArray[np.int8]
    kept: NDArray[np.int64]
    in_study: NDArray[np.int64]
    place: NDArray[np.int64]
    outcomes: Outcomes


def compute_outcomes(
    group: ReaderGroup,
    log: CanonicalLog,
    ordered: OrderedFixations,
    placed: Placed,
    using: tuple[RegionLibrary, Options],
) -> Computed:
    """Screen some readers, and compute the outcomes of what is kept.

    Parameters
    ----------
    group : ReaderGroup
        Readers of whom nothing is wrong.
    log : CanonicalLog
        Their fixations, in time order.
    ordered : OrderedFixations
        Trial and number of each.
    placed : Placed
        Where each was.
    using : tuple
        The texts and the decisions of the study.

    Returns
    -------
    Computed
    """
    library, options = using
    screened = screen(
        Unscreened(
            *(group.trials, group.reader_of_trial, log, ordered, placed.order),
            group.notes,
            placed.lines,
        ),
        library,
        options,
    )
    trial_codes, gone = screened.trial_codes(), screened.fixation_codes()
    kept = np.flatnonzero(gone < 0)
    in_study = np.flatnonzero(trial_codes < 0)
    place = np.zeros(len(trial_codes), dtype=np.int64)
    place[in_study] = np.arange(len(in_study))
    texts = group.trials.text[in_study]
    outcomes = compute(
        Sequences(
            place[ordered.trial[kept]],
            placed.order[kept],
            screened.fixations.duration_ms[kept],
            library.region_count[texts].astype(np.int32),
        ),
        outside=options.outside,
        no_opportunity=options.no_opportunity,
    )
    return Computed(screened, trial_codes, gone, kept, in_study, place, outcomes)


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """The regions of some trials, one after the other.

    Attributes
    ----------
    counts : (trials,) int64 array
        How many regions each trial has.
    trial : (cells,) int64 array
        The trial of each.
    order : (cells,) int32 array
        Its place in reading order, from 1.
    code : (cells,) int32 array
        Its name, as an index into the names of the library.
    """

    counts: NDArray[np.int64]
    trial: NDArray[np.int64]
    order: NDArray[np.int32]
    code: NDArray[np.int32]


def cells_of(text: NDArray[np.integer], trials: NDArray[np.int64], library: RegionLibrary) -> Cells:
    """The regions of some trials.

    Parameters
    ----------
    text : (all trials,) integer array
        The text of every trial.
    trials : (trials,) int64 array
        Those that are wanted; each has a text.
    library : RegionLibrary
        The texts.

    Returns
    -------
    Cells
    """
    own = text[trials].astype(np.int64)
    counts = library.region_count[own].astype(np.int64)
    starts = np.cumsum(counts) - counts
    within = np.arange(int(counts.sum())) - np.repeat(starts, counts)
    code = library.region_code[np.repeat(library.region_offsets[own], counts) + within]
    return Cells(counts, np.repeat(trials, counts), (within + 1).astype(np.int32), code)


def set_far_values_missing(
    cells: Cells,
    reader: NDArray[np.int64],
    measures: Sequence[MeasureColumn],
    reasons_known: Sequence[str],
    limits: tuple[float, int],
    measured: tuple[dict[str, NDArray[np.float64]], dict[str, NDArray[np.uint8]]],
) -> list[FarValue]:
    """Set durations missing that are far from the others of their reader and region.

    Parameters
    ----------
    cells : Cells
        The regions of the kept trials.
    reader : (trials,) int64 array
        The reader of every trial.
    measures : sequence of MeasureColumn
        Those that are computed.
    reasons_known : sequence of str
        The reasons by their codes.
    limits : tuple of float and int
        Standard deviations from the mean, and how many region names there are.
    measured : tuple of two dicts
        Values and reasons by measure; replaced where a value is set missing.

    Returns
    -------
    list of FarValue
        What was set missing.
    """
    values, reasons = measured
    outlier_sd, names = limits
    own_reader = reader[cells.trial]
    group = own_reader * names + cells.code
    outlier = reasons_known.index(OUTLIER)
    far: list[FarValue] = []
    for name in (m.name for m in measures if m.kind == "duration"):
        own = values[name]
        away = outlying(own, group, outlier_sd)
        rows = np.flatnonzero(away)
        far += [
            FarValue(trial, code, name, value, whose)
            for trial, code, value, whose in zip(
                *(cells.trial[rows].tolist(), cells.code[rows].tolist(), own[rows].tolist()),
                own_reader[rows].tolist(),
                strict=True,
            )
        ]
        values[name] = np.where(away, np.nan, own)
        reasons[name] = np.where(away, outlier, reasons[name]).astype(np.uint8)
    return far
