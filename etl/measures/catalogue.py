"""What every outcome is, in plain words: the catalogue that the codebook and the command print.

The definitions say what the kernels compute. The chapters and papers named as sources are cited
from memory; a DOI stands where it is certain. Where a source is said to be common practice, the
field uses the outcome without an agreed first definition.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from typing import Final

from etl.errors import FaultError
from etl.measures.measure import Measure

RAYNER: Final = (
    "Rayner (1998). Eye movements in reading and information processing: 20 years of research. "
    "Psychological Bulletin, 124, 372-422. doi:10.1037/0033-2909.124.3.372"
)
LIVERSEDGE: Final = (
    "Liversedge, Paterson & Pickering (1998). Eye movements and measures of reading time. In "
    "Underwood (Ed.), Eye guidance in reading and scene perception"
)
INHOFF: Final = (
    "Inhoff & Radach (1998). Definition and computation of oculomotor measures in the study of "
    "cognitive processes. In Underwood (Ed.), Eye guidance in reading and scene perception"
)
CLIFTON: Final = (
    "Clifton, Staub & Rayner (2007). Eye movements in reading words and sentences. In van Gompel, "
    "Fischer, Murray & Hill (Eds.), Eye movements: a window on mind and brain"
)
COMMON_PRACTICE: Final = "common practice, no source"

# What an option adds to a definition that rests on visits, on saccades, or on the first pass.
_VISIT_BROKEN: Final = "A fixation outside every region ends a visit."
_STEP_BROKEN: Final = (
    "A step with a fixation outside every region in between is neither a regression nor a "
    "progression."
)
_FIRST_VISIT_BROKEN: Final = "A fixation outside every region ends the first pass."
_FIRST_VISIT_CLOSED: Final = (
    "A fixation outside every region ends the first pass without a regression."
)

_NO_FIRST_PASS: Final = ("not_reached", "skipped")
_NOT_FIXATED: Final = ("not_reached", "never_fixated")
_NO_WAY_OUT: Final = ("no_earlier_region", "not_reached", "never_fixated")
_NO_WAY_IN: Final = ("no_later_region", "not_reached", "not_passed")


def _by_name(measures: Iterable[Measure]) -> dict[str, Measure]:
    """The measures by name, in the order given."""
    return {measure.name: measure for measure in measures}


#: The outcomes of a region, in the order in which they are explained and computed.
MEASURES: Final[dict[str, Measure]] = _by_name(
    [
        Measure(
            "first_pass_skip",
            "region",
            "binary",
            "1 if the eyes went beyond the region without a first pass on it, that is, before they "
            "ever fixated it; 0 if it has a first pass.",
            RAYNER,
            ("not_reached",),
            zeroed="A region that was never reached counts as skipped: the value is 1.",
        ),
        Measure(
            "fixated",
            "region",
            "binary",
            "1 if any fixation of the trial is on the region, else 0.",
            INHOFF,
        ),
        Measure(
            "first_pass_refixation",
            "region",
            "binary",
            "1 if the first pass on the region has two or more fixations, 0 if it has one.",
            RAYNER,
            _NO_FIRST_PASS,
            _FIRST_VISIT_BROKEN,
        ),
        Measure(
            "first_pass_regression_out",
            "region",
            "binary",
            "1 if the saccade that ends the first pass on the region lands on an earlier region; 0 "
            "if it lands on a later one or the trial ends there.",
            CLIFTON,
            ("no_earlier_region", *_NO_FIRST_PASS),
            _FIRST_VISIT_CLOSED,
        ),
        Measure(
            "regression_out",
            "region",
            "binary",
            "1 if any saccade of the trial goes from the region to an earlier one, else 0.",
            RAYNER,
            _NO_WAY_OUT,
            _STEP_BROKEN,
        ),
        Measure(
            "regression_in",
            "region",
            "binary",
            "1 if any saccade of the trial lands on the region from a later one, else 0.",
            RAYNER,
            _NO_WAY_IN,
            _STEP_BROKEN,
        ),
        Measure(
            "reread",
            "region",
            "binary",
            "1 if the region has a first pass and is visited again later in the trial, from either "
            "side; 0 if it has a first pass only.",
            LIVERSEDGE,
            _NO_FIRST_PASS,
            f"{_VISIT_BROKEN} Coming back to the same region after it is a visit again.",
        ),
        Measure(
            "fixation_count",
            "region",
            "count",
            "Number of fixations on the region in the whole trial.",
            INHOFF,
        ),
        Measure(
            "first_pass_fixation_count",
            "region",
            "count",
            "Number of fixations in the first pass on the region.",
            INHOFF,
            _NO_FIRST_PASS,
            _FIRST_VISIT_BROKEN,
        ),
        Measure(
            "visit_count",
            "region",
            "count",
            "Number of visits to the region, a visit being a run of fixations on it.",
            COMMON_PRACTICE,
            (),
            _VISIT_BROKEN,
        ),
        Measure(
            "regression_out_count",
            "region",
            "count",
            "Number of saccades of the trial from the region to an earlier one.",
            RAYNER,
            _NO_WAY_OUT,
            _STEP_BROKEN,
        ),
        Measure(
            "regression_in_count",
            "region",
            "count",
            "Number of saccades of the trial that land on the region from a later one.",
            RAYNER,
            _NO_WAY_IN,
            _STEP_BROKEN,
        ),
        Measure(
            "first_fixation_duration",
            "region",
            "duration",
            "Duration of the first fixation of the first pass on the region.",
            RAYNER,
            _NO_FIRST_PASS,
        ),
        Measure(
            "single_fixation_duration",
            "region",
            "duration",
            "Duration of the fixation where the first pass on the region has exactly one.",
            RAYNER,
            (*_NO_FIRST_PASS, "refixated"),
            _FIRST_VISIT_BROKEN,
        ),
        Measure(
            "first_pass_time",
            "region",
            "duration",
            "Sum of the durations of the fixations in the first pass on the region; for a region "
            "of one word this is gaze duration.",
            f"{RAYNER}; {LIVERSEDGE}",
            _NO_FIRST_PASS,
            _FIRST_VISIT_BROKEN,
        ),
        Measure(
            "go_past_time",
            "region",
            "duration",
            "Sum of the durations of all fixations inside regions from the first one of the first "
            "pass on the region until the eyes first go beyond it or the trial ends, on whatever "
            "region they are; also called regression-path duration.",
            f"{LIVERSEDGE}; {CLIFTON}",
            _NO_FIRST_PASS,
        ),
        Measure(
            "right_bounded_time",
            "region",
            "duration",
            "Sum of the durations of the fixations on the region itself from the first one of its "
            "first pass until the eyes first go beyond it or the trial ends.",
            f"{LIVERSEDGE}, for the interval",
            _NO_FIRST_PASS,
        ),
        Measure(
            "second_pass_time",
            "region",
            "duration",
            "total_time less first_pass_time: 0 where the region was never visited again, all of "
            "it where there was no first pass.",
            LIVERSEDGE,
            _NOT_FIXATED,
            "A fixation outside every region ends the first pass; what follows on the same region "
            "belongs here.",
        ),
        Measure(
            "total_time",
            "region",
            "duration",
            "Sum of the durations of all fixations on the region in the whole trial.",
            f"{RAYNER}; {LIVERSEDGE}",
            _NOT_FIXATED,
        ),
    ]
)

#: The outcomes of a trial, in the order in which they are explained and computed.
TRIAL_MEASURES: Final[dict[str, Measure]] = _by_name(
    [
        Measure(
            "any_regression",
            "trial",
            "binary",
            "1 if any saccade of the trial lands on an earlier region than it left, else 0.",
            RAYNER,
            ("no_saccade",),
            _STEP_BROKEN,
        ),
        Measure(
            "any_first_pass_regression",
            "trial",
            "binary",
            "1 if first_pass_regression_out is 1 for any region of the trial, else 0.",
            CLIFTON,
            ("no_earlier_region", "no_saccade"),
            _FIRST_VISIT_CLOSED,
        ),
        Measure(
            "any_skip",
            "trial",
            "binary",
            "1 if first_pass_skip is 1 for any region of the trial, else 0.",
            RAYNER,
            zeroed="A region that was never reached counts as skipped.",
        ),
        Measure(
            "fixation_count",
            "trial",
            "count",
            "Number of kept fixations inside regions.",
            INHOFF,
        ),
        Measure(
            "outside_fixation_count",
            "trial",
            "count",
            "Number of kept fixations outside every region.",
            COMMON_PRACTICE,
        ),
        Measure(
            "regression_count",
            "trial",
            "count",
            "Number of saccades that land on an earlier region than they left.",
            RAYNER,
            (),
            _STEP_BROKEN,
        ),
        Measure(
            "progression_count",
            "trial",
            "count",
            "Number of saccades that land on a later region than they left.",
            RAYNER,
            (),
            _STEP_BROKEN,
        ),
        Measure(
            "regions_reached",
            "trial",
            "count",
            "Order of the furthest region that was fixated; 0 if none was.",
            COMMON_PRACTICE,
        ),
        Measure(
            "reading_time",
            "trial",
            "duration",
            "Sum of the durations of the kept fixations inside regions.",
            COMMON_PRACTICE,
        ),
    ]
)

#: The groups by which a study asks for outcomes.
GROUPS: Final = ("binary", "count", "duration")

#: Everything that a study may name among its outcomes.
SELECTABLE: Final = tuple(dict.fromkeys([*GROUPS, *MEASURES, *TRIAL_MEASURES]))


def select(outcomes: Sequence[str]) -> tuple[str, ...]:
    """Name the outcomes of a region that groups and single names ask for.

    The outcomes of a trial are few and always written, all of them; naming one is allowed and adds
    nothing here. (``fixation_count`` is the name of one of each.)

    Parameters
    ----------
    outcomes : sequence of str
        Groups and names out of ``SELECTABLE``, in any order, repeats allowed.

    Returns
    -------
    tuple of str
        Names out of ``MEASURES``, each once, in the order of the catalogue.

    Raises
    ------
    FaultError
        If a name is unknown. A study file is checked against ``SELECTABLE`` when it is read, so an
        unknown name here is a fault of the program.

    Examples
    --------
    >>> select(["total_time", "first_pass_time", "any_skip", "total_time"])
    ('first_pass_time', 'total_time')
    """
    unknown = [name for name in outcomes if name not in SELECTABLE]
    if unknown:
        near = difflib.get_close_matches(unknown[0], SELECTABLE, n=1)
        hint = f"; the nearest is {near[0]!r}" if near else ""
        raise FaultError(f"there is no outcome or group {unknown[0]!r}{hint}")
    return tuple(
        name for name, measure in MEASURES.items() if name in outcomes or measure.kind in outcomes
    )
