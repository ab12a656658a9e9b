"""How far an assignment of lines can be trusted: signs of trouble, and chances calibrated on them.

The chances of a fitted model are chances only if the model is true; they are too high on trials
that differ from it. What is given out is a logistic function of such chances and of other signs,
fitted once on simulated trials, whose lines are known, by ``tests/lines/fit_confidence.py``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from etl.lines.consensus_reading import Flags, Floats
from etl.lines.passage import Lines

#: A trial is right if this share of its fixations is: on their line, or on none if they are.
RIGHT_SHARE: Final = 0.97

#: A run of fixations is contested that begins with a jump over a line or more, and on whose line
#: fewer of the methods agree. Trials with enough of them to be no longer right are not sure: the
#: chance given for them is at most this. People who correct by hand find such runs hard, too.
FAR_LINES, AGREEING_LEAST, CONTESTED_MOST = 2, 2 / 3, 0.75

#: Fits that put more than this share of fixations on other lines are rivals.
RIVAL_SHARE: Final = 0.05
#: A lead over rivals of more than this (in log units) says no more.
WIDEST_LEAD: Final = 30.0
#: A fixation is this far, in distances between lines, from the middle between two lines at most.
HALF_LINE: Final = 0.5

#: Keep logarithms finite; below what is seen in clean trials.
LEAST_DOUBT: Final = 0.002
CHANCE_ENDS: Final = (1e-6, 1 - 1e-6)

TRIAL_SIGNS: Final = (
    "doubt",
    "lead",
    "scatter",
    "agreement",
    "backward_jumps",
    "near_half_way",
    "few_fixations",
)
FIXATION_SIGNS: Final = ("chance", "trial", "none", "agreement")

#: Constant, then a weight for each sign, of the chance that a trial is right.
TRIAL_WEIGHTS: Final = (-4.964, -0.833, 0.2905, -0.8264, 3.945, -7.04, -1.64, -3.073)
#: The same of the chance that a fixation is; then what log odds come to: whole trials go wrong
#: together, and a single logistic function says too much in its middle and too little at its end.
FIXATION_WEIGHTS: Final = (-0.5845, 0.5666, 0.1909, 1.021, 2.592)
LOG_ODDS_SAID: Final = (-2.0, 0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0)
LOG_ODDS_SEEN: Final = (-1.653, -0.1426, 0.7493, 1.811, 3.315, 4.468, 5.964, 8.768, 11.68)


@dataclass(frozen=True, slots=True, eq=False)
class Signs:
    """What may tell whether an assignment is right.

    Attributes
    ----------
    line : (n,) int32 array
        The lines assigned, from 1; 0 for none. At least one fixation.
    chances : (n, m + 1) float64 array
        The model's chance of none, then of each line.
    off : (n,) float64 array
        How far each fixation lies below its line as it drifted, in distances between lines.
    scatter : float
        The standard deviation of that, of the best fit.
    evidence : (d,) float64 array
        Log evidence of the distinct fits, from the best.
    differing : (d,) float64 array
        The share of fixations that each of them puts on another line than the best.
    agreeing : (k, n) bool array
        Whether each method gives the same line.
    """

    line: Lines
    chances: Floats
    off: Floats
    scatter: float
    evidence: Floats
    differing: Floats
    agreeing: Flags


def trial_signs(signs: Signs) -> Floats:
    """The values of ``TRIAL_SIGNS``.

    Parameters
    ----------
    signs : Signs
        Of one trial.

    Returns
    -------
    (7,) float64 array
        In this order: log of the mean chance of being wrong; log of the lead over the best rival;
        log of the scatter; agreement of the best method; square root of the share of jumps to
        earlier lines (a root, as the first few say most); share of fixations as near the half way
        between lines as scatter goes; one over the root of their number.
    """
    on_line = signs.line[signs.line > 0]
    jumps = np.diff(on_line) if on_line.size > 1 else np.zeros(1)
    off = np.abs(signs.off[signs.line > 0]) if on_line.size else np.full(1, HALF_LINE)
    to_half_way = (HALF_LINE - np.minimum(off, HALF_LINE)) / signs.scatter
    rivals = signs.evidence[signs.differing > RIVAL_SHARE]
    lead = min(float(signs.evidence[0] - rivals.max()), WIDEST_LEAD) if rivals.size else WIDEST_LEAD
    return np.array(
        [
            np.log(np.mean(1 - _chance_given(signs)) + LEAST_DOUBT),
            np.log1p(max(lead, 0.0)),
            np.log(signs.scatter),
            signs.agreeing.mean(1).max(),
            np.sqrt(np.mean(jumps < 0)),
            np.mean(np.exp(-0.5 * to_half_way**2)),
            1 / np.sqrt(signs.line.size),
        ]
    )


def fixation_signs(signs: Signs, trial: float) -> Floats:
    """The values of ``FIXATION_SIGNS`` for each fixation.

    Parameters
    ----------
    signs : Signs
        Of one trial.
    trial : float
        The chance that the trial is right, before contested runs are looked at.

    Returns
    -------
    (n, 4) float64 array
        In this order: log odds of the model's chance of what was assigned; log odds of the trial;
        1 where no line was assigned; share of methods that agree.
    """
    columns = (
        _log_odds(_chance_given(signs)),
        np.full(signs.line.size, _log_odds(np.array(trial))),
        np.asarray(signs.line == 0, dtype=np.float64),
        signs.agreeing.mean(0),
    )
    return np.stack(columns, axis=1)


def calibrated_trial(signs: Signs) -> float:
    """The chance that a trial is right, from its signs."""
    return float(chance_of(weighted(trial_signs(signs)[None, :], TRIAL_WEIGHTS))[0])


def confidence_of_trial(signs: Signs) -> float:
    """The chance that a trial is right; held down where too much of it is contested."""
    chance = calibrated_trial(signs)
    # Enough to be wrong, if they all are; at least the share that may be, not more than it.
    contested = contested_share(signs) >= 1 - RIGHT_SHARE
    return min(chance, CONTESTED_MOST) if contested else chance


def confidence_of_fixations(signs: Signs) -> Floats:
    """The chance that what each fixation was given, a line or none, is right."""
    total = weighted(fixation_signs(signs, calibrated_trial(signs)), FIXATION_WEIGHTS)
    return chance_of(np.interp(total, LOG_ODDS_SAID, LOG_ODDS_SEEN))


def contested_share(signs: Signs) -> float:
    """The share of fixations in contested runs.

    Parameters
    ----------
    signs : Signs
        Of one trial.

    Returns
    -------
    float
        From 0 to 1.

    Examples
    --------
    Three fixations on line 1, then two on line 3, which only one of two methods finds:

    >>> line = np.array([1, 1, 1, 3, 3], np.int32)
    >>> agreeing = np.array([[True] * 5, [True, True, True, False, False]])
    >>> none = np.zeros(0)
    >>> contested_share(Signs(line, none, none, 0.1, none, none, agreeing))
    0.4
    """
    kept = np.flatnonzero(signs.line)
    if not kept.size:
        return 0.0
    jumps = np.diff(signs.line[kept])
    begins = np.append(0, np.flatnonzero(jumps) + 1)
    sizes = np.diff(np.append(begins, kept.size))
    agreement = np.add.reduceat(signs.agreeing.mean(0)[kept], begins) / sizes
    far = np.append(False, np.abs(jumps[begins[1:] - 1]) >= FAR_LINES)
    return float(sizes[far & (agreement < AGREEING_LEAST)].sum() / signs.line.size)


def _chance_given(signs: Signs) -> Floats:
    """The model's chance of what each fixation was given."""
    given: Floats = np.take_along_axis(signs.chances, signs.line[:, None].astype(np.intp), 1)[:, 0]
    return given


def _log_odds(chance: Floats) -> Floats:
    bounded = np.clip(chance, *CHANCE_ENDS)
    odds: Floats = np.log(bounded / (1 - bounded))
    return odds


def weighted(signs: Floats, weights: Sequence[float]) -> Floats:
    """A constant and weighted signs, added up; signs are in columns."""
    total: Floats = weights[0] + signs @ np.array(weights[1:])
    return total


def chance_of(log_odds: Floats) -> Floats:
    """The logistic function, without overflow."""
    chance: Floats = 0.5 * (1 + np.tanh(0.5 * log_odds))
    return chance
