"""Every outcome of every region and trial, from the passes; see the catalogue for the definitions.

Plain sums come first (:mod:`etl.measures.tallies`); here each is given its kind, its place in the
catalogue and, where the reader had no chance, its reason.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt

from etl.errors import FaultError
from etl.measures import reasons as why
from etl.measures.conventions import NoOpportunity, Outside
from etl.measures.outcomes import Measured, Outcomes, RegressiveSaccades
from etl.measures.passes import Passes, find_passes, number_visits
from etl.measures.sequences import Sequences, check_sequences
from etl.measures.tallies import Tally, add_up, take_tally

Kind = TypeVar("Kind", bound=np.generic)


def compute(
    sequences: Sequences,
    *,
    outside: Outside = "ignore",
    no_opportunity: NoOpportunity = "missing",
) -> Outcomes:
    """Compute every outcome of the catalogue for every region and every trial.

    Parameters
    ----------
    sequences : Sequences
        The kept fixations of the kept trials.
    outside : {"ignore", "interrupt"}
        Whether fixations outside every region are removed before anything is computed, or end the
        visit in progress, in no direction.
    no_opportunity : {"missing", "zero"}
        What a binary or count outcome is where the reader had no chance: missing with a reason, or
        0 (and ``first_pass_skip`` of a region that was not reached: 1).

    Returns
    -------
    Outcomes
        All measures, whatever the study asks for; trials do not influence one another.

    Raises
    ------
    FaultError
        If the arrays do not fit together, or an option is unknown.

    References
    ----------
    Rayner (1998), doi:10.1037/0033-2909.124.3.372; Liversedge, Paterson & Pickering (1998);
    Clifton, Staub & Rayner (2007). Each measure's own source stands in the catalogue.

    Examples
    --------
    Regions 2, 1, 3 of a text of three: region 1 was passed over at first and then returned to, so
    the way from region 2 past it took 180 + 200 ms.

    >>> outcomes = compute(Sequences(
    ...     np.zeros(3, np.int64), np.array([2, 1, 3], np.int32),
    ...     np.array([180.0, 200.0, 250.0]), np.array([3], np.int32)))
    >>> outcomes.regions["first_pass_skip"].values.tolist()
    [1.0, 0.0, 0.0]
    >>> outcomes.regions["go_past_time"].values.tolist()
    [nan, 380.0, 250.0]
    >>> why.REASONS[outcomes.regions["go_past_time"].reasons[0]]
    'skipped'
    """
    if outside not in ("ignore", "interrupt"):
        raise FaultError(f'outside: must be "ignore" or "interrupt", got {outside!r}')
    if no_opportunity not in ("missing", "zero"):
        raise FaultError(f'no_opportunity: must be "missing" or "zero", got {no_opportunity!r}')
    check_sequences(sequences)
    cell_offsets = np.zeros(sequences.region_count.size + 1, np.int64)
    np.cumsum(sequences.region_count, out=cell_offsets[1:])
    passes = find_passes(sequences, cell_offsets, interrupt=outside == "interrupt")
    tally = take_tally(passes, cell_offsets)
    regions = _region_measures(tally, _chances(tally, zero=no_opportunity == "zero"))
    number = number_visits(passes, tally.has_first_pass)
    visit = np.zeros(sequences.trial.size, np.int32)
    visit[passes.inside] = np.repeat(number, passes.visit_length)
    first_pass = np.zeros(sequences.trial.size, np.bool_)
    first_pass[passes.inside] = passes.first_pass
    return Outcomes(
        cell_offsets=_frozen(cell_offsets),
        regions=regions,
        trials=_trial_measures(sequences, passes, tally, regions["first_pass_skip"]),
        visit=_frozen(visit),
        first_pass=_frozen(first_pass),
        regressions=_regressive_saccades(passes),
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Chances:
    """For each group of measures that share their conditions, why a cell has no value."""

    always: npt.NDArray[np.uint8]
    skip: npt.NDArray[np.uint8]
    first_pass: npt.NDArray[np.uint8]
    first_pass_out: npt.NDArray[np.uint8]
    regression_out: npt.NDArray[np.uint8]
    regression_in: npt.NDArray[np.uint8]
    first_pass_ms: npt.NDArray[np.uint8]
    single_fixation_ms: npt.NDArray[np.uint8]
    total_ms: npt.NDArray[np.uint8]


def _chances(tally: Tally, *, zero: bool) -> _Chances:
    """Find out where there was a chance, and which reason holds where there was none.

    Under the convention "zero" only the structural reasons remain for binary and count outcomes: a
    region that gave no opportunity has neither a first pass, nor a fixation, nor a saccade, so the
    plain sums are 0 there already (and the skip 1).
    """
    cell_offsets = tally.cell_offsets
    from_furthest = np.arange(cell_offsets[-1], dtype=np.int64)
    from_furthest -= np.repeat(tally.furthest, np.diff(cell_offsets))
    unreached = from_furthest > 0
    always = np.zeros(from_furthest.size, np.uint8)
    not_reached = unreached * why.NOT_REACHED
    first_pass = np.where(
        unreached, why.NOT_REACHED, np.where(tally.has_first_pass, np.uint8(0), why.SKIPPED)
    )
    fixated = np.where(
        unreached, why.NOT_REACHED, np.where(tally.fixations > 0, np.uint8(0), why.NEVER_FIXATED)
    )
    passed = np.where(
        unreached, why.NOT_REACHED, np.where(from_furthest < 0, np.uint8(0), why.NOT_PASSED)
    )
    single = first_pass.copy()
    single[tally.first_pass_fixations > 1] = why.REFIXATED
    first_cells, last_cells = cell_offsets[:-1], cell_offsets[1:] - 1
    out = always if zero else first_pass
    return _Chances(
        always=_frozen(always),
        skip=_frozen(always if zero else not_reached),
        first_pass=_frozen(out),
        first_pass_out=_structural(out, first_cells, why.NO_EARLIER_REGION),
        regression_out=_structural(always if zero else fixated, first_cells, why.NO_EARLIER_REGION),
        regression_in=_structural(always if zero else passed, last_cells, why.NO_LATER_REGION),
        first_pass_ms=_frozen(first_pass),
        single_fixation_ms=_frozen(single),
        total_ms=_frozen(fixated),
    )


def _structural(
    reasons: npt.NDArray[np.uint8], cells: npt.NDArray[np.int64], reason: np.uint8
) -> npt.NDArray[np.uint8]:
    """The reasons with a structural one put over those of the given cells."""
    reasons = reasons.copy()
    reasons[cells] = reason
    return _frozen(reasons)


def _region_measures(tally: Tally, chance: _Chances) -> dict[str, Measured]:
    """Every measure of a region, in the order of the catalogue."""
    visits, single = tally.visits, tally.first_pass_fixations == 1
    return {
        "first_pass_skip": _measured(~tally.has_first_pass, chance.skip),
        "fixated": _measured(tally.fixations > 0, chance.always),
        "first_pass_refixation": _measured(tally.first_pass_fixations > 1, chance.first_pass),
        "first_pass_regression_out": _measured(
            tally.first_pass_regression_out, chance.first_pass_out
        ),
        "regression_out": _measured(tally.regressions_out > 0, chance.regression_out),
        "regression_in": _measured(tally.regressions_in > 0, chance.regression_in),
        "reread": _measured(tally.has_first_pass & (visits > 1), chance.first_pass),
        "fixation_count": _measured(tally.fixations, chance.always),
        "first_pass_fixation_count": _measured(tally.first_pass_fixations, chance.first_pass),
        "visit_count": _measured(visits, chance.always),
        "regression_out_count": _measured(tally.regressions_out, chance.regression_out),
        "regression_in_count": _measured(tally.regressions_in, chance.regression_in),
        "first_fixation_duration": _measured(tally.first_fixation_ms, chance.first_pass_ms),
        "single_fixation_duration": _measured(
            tally.first_fixation_ms * single, chance.single_fixation_ms
        ),
        "first_pass_time": _measured(tally.first_pass_ms, chance.first_pass_ms),
        "go_past_time": _measured(tally.go_past_ms, chance.first_pass_ms),
        "right_bounded_time": _measured(tally.right_bounded_ms, chance.first_pass_ms),
        "second_pass_time": _measured(tally.total_ms - tally.first_pass_ms, chance.total_ms),
        "total_time": _measured(tally.total_ms, chance.total_ms),
    }


def _trial_measures(
    sequences: Sequences, passes: Passes, tally: Tally, skip: Measured
) -> dict[str, Measured]:
    """Every measure of a trial, in the order of the catalogue."""
    trials = sequences.region_count.size
    first_cells = tally.cell_offsets[:-1]
    fixations = tally.by_trial(tally.fixations)
    everywhere = np.diff(np.searchsorted(sequences.trial, np.arange(trials + 1, dtype=np.int64)))
    regressions = tally.by_trial(tally.regressions_out)
    reading_ms = add_up(passes.trial, passes.duration_ms, trials)
    never = _frozen(np.zeros(trials, np.uint8))
    no_saccade = (fixations < 2) * why.NO_SACCADE
    no_way_back = no_saccade.copy()
    no_way_back[sequences.region_count == 1] = why.NO_EARLIER_REGION
    return {
        "any_regression": _measured(regressions > 0, _frozen(no_saccade)),
        "any_first_pass_regression": _measured(
            tally.by_trial(tally.first_pass_regression_out) > 0, _frozen(no_way_back)
        ),
        "any_skip": _measured(tally.by_trial(skip.values == 1) > 0, never),
        "fixation_count": _measured(fixations, never),
        "outside_fixation_count": _measured(everywhere - fixations, never),
        "regression_count": _measured(regressions, never),
        "progression_count": _measured(
            np.bincount(passes.progression_trial, minlength=trials), never
        ),
        "regions_reached": _measured(tally.furthest - first_cells + 1, never),
        "reading_time": _measured(reading_ms, never),
    }


def _regressive_saccades(passes: Passes) -> RegressiveSaccades:
    """The saccades to a lower order, with the fixations numbered as they were handed in."""
    landing = passes.visit_start[passes.landing_visit]
    return RegressiveSaccades(
        launch=_frozen(passes.inside[landing - 1]),
        landing=_frozen(passes.inside[landing]),
        ends_first_pass=_frozen(passes.visit_is_first_pass[passes.landing_visit - 1]),
    )


def _measured(values: npt.NDArray[Any], reasons: npt.NDArray[np.uint8]) -> Measured:
    """The values as floats, missing wherever there is a reason."""
    return Measured(_frozen(np.where(reasons == 0, values, np.nan)), reasons)


def _frozen(array: npt.NDArray[Kind]) -> npt.NDArray[Kind]:
    """The array itself, from now on read-only, since several measures share it."""
    array.flags.writeable = False
    return array
