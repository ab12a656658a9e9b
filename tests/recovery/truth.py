"""The true model of the recovery studies: design, effects and variation, and what is drawn.

Whether an outcome happens in a trial is one draw with the probability
``plogis(intercept + effects + reader's intercept and slope + item's intercept)``, on columns of
-0.5 and 0.5. So the logistic mixed model with these terms is the true one, and what it should find
is known exactly.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from tests.simulator.draws import chance, normal, probability, shuffled

#: Readers and items are multiples of the four cells of the design, so that lists are balanced.
READERS = 28
ITEMS = 40
#: Both factors vary within readers and within items; the second level is the one at 0.5.
LEVELS = {"notice": ("short", "long"), "crop": ("usual", "unusual")}
CELLS = tuple((notice, crop) for notice in LEVELS["notice"] for crop in LEVELS["crop"])
#: The terms of the model, with the names that R gives them.
TERMS = ("(Intercept)", "notice", "crop", "notice:crop")

#: A trial ends before the critical region in this share of trials, whatever its outcomes would
#: have been; it differs by condition, so that taking such trials for zeros moves the effects.
UNREACHED = {"usual": 0.03, "unusual": 0.09}
#: Share of trials that the experimenter's notes leave out, whatever happened in them.
NOTED = 0.02
#: Trials of each reader that do not belong to the study.
PRACTICE = 2


@dataclass(frozen=True, slots=True)
class Truth:
    """What governs one outcome on the critical region, in log-odds.

    ``effects`` are by ``TERMS``; ``slope_sd`` is the standard deviation over readers of the effect
    of ``crop``, 0 where all readers share it. Intercepts and slopes of readers are independent, and
    so are those of different outcomes: which trials have no first pass then says nothing about the
    outcomes of a first pass, given the conditions.
    """

    outcome: str
    effects: Mapping[str, float]
    reader_sd: float
    item_sd: float
    slope_sd: float = 0.0

    @property
    def formula(self) -> str:
        """The true model as lme4 writes it.

        Examples
        --------
        >>> TRUTHS[0].formula
        'first_pass_skip ~ notice * crop + (1 | participant) + (1 | item)'
        """
        readers = "(1 + crop || participant)" if self.slope_sd else "(1 | participant)"
        return f"{self.outcome} ~ notice * crop + {readers} + (1 | item)"

    @property
    def deviations(self) -> dict[str, float]:
        """The standard deviations between readers, by the names that R gives them."""
        own = {"(Intercept)": self.reader_sd}
        return {**own, "crop": self.slope_sd} if self.slope_sd else own


#: About three zeros to each one in all three, as is common in reading.
TRUTHS = (
    Truth(
        "first_pass_skip",
        dict(zip(TERMS, (-1.2, 0.7, -0.4, 0.4), strict=True)),
        reader_sd=0.6,
        item_sd=0.4,
    ),
    Truth(
        "first_pass_regression_out",
        dict(zip(TERMS, (-1.2, 0.3, 0.8, 0.6), strict=True)),
        reader_sd=0.7,
        item_sd=0.4,
        slope_sd=0.8,
    ),
    Truth(
        "reread",
        dict(zip(TERMS, (-1.2, -0.5, 0.5, 0.0), strict=True)),
        reader_sd=0.8,
        item_sd=0.3,
    ),
)


@dataclass(frozen=True, slots=True)
class Trial:
    """A trial as planned and as drawn.

    ``probabilities`` are the true ones. ``outcomes`` hold 0, 1, or the reason why the outcome is
    undefined: the text was left before the critical region, or that had no first pass.
    """

    participant: str
    trial: int
    item: str
    notice: str
    crop: str
    probabilities: Mapping[str, float] = field(default_factory=dict)
    outcomes: Mapping[str, int | str] = field(default_factory=dict)
    noted: bool = False
    practice: bool = False


def half(factor: str, level: str) -> float:
    """A level as a number: the first level -0.5, the second 0.5.

    Examples
    --------
    >>> half("crop", "usual"), half("crop", "unusual")
    (-0.5, 0.5)
    """
    return LEVELS[factor].index(level) - 0.5


def draw_trials(rng: np.random.Generator) -> list[Trial]:
    """The trials of one study, reader by reader in the order in which they were read.

    Parameters
    ----------
    rng : numpy.random.Generator
        Whence all draws come.

    Returns
    -------
    list of Trial
        ``READERS`` times ``ITEMS`` trials and the practice. Each reader sees every item once and
        each cell of the design equally often; each item is seen in each cell by as many readers.
    """
    readers = [f"P{number:02d}" for number in range(1, READERS + 1)]
    items = [f"S{number:02d}" for number in range(1, ITEMS + 1)]
    of_items = {t.outcome: {item: normal(rng, 0.0, t.item_sd) for item in items} for t in TRUTHS}
    trials = []
    for at, reader in enumerate(readers):
        own = {t.outcome: normal(rng, 0.0, t.reader_sd) for t in TRUTHS}
        slopes = {t.outcome: normal(rng, 0.0, t.slope_sd) for t in TRUTHS}
        trials += [
            Trial(reader, number, items[number], *CELLS[0], practice=True)
            for number in range(1, PRACTICE + 1)
        ]
        for number, place in enumerate(shuffled(rng, range(ITEMS)), start=PRACTICE + 1):
            item = items[place]
            notice, crop = CELLS[(at + place) % len(CELLS)]
            chances = {
                t.outcome: true_probability(
                    t, notice, crop, own[t.outcome], slopes[t.outcome], of_items[t.outcome][item]
                )
                for t in TRUTHS
            }
            outcomes = draw_outcomes(chances, crop, rng)
            noted = chance(rng, NOTED)
            trials.append(Trial(reader, number, item, notice, crop, chances, outcomes, noted))
    return trials


def true_probability(
    truth: Truth, notice: str, crop: str, intercept: float, slope: float, item_intercept: float
) -> float:
    """The probability of a one, given the condition, the reader and the item.

    Examples
    --------
    >>> plain = Truth("reread", dict(zip(TERMS, (0.1, 0.2, 0.4, 0.8), strict=True)), 1.0, 1.0)
    >>> by_hand = probability(0.1 + 0.2 * 0.5 - 0.4 * 0.5 - 0.8 * 0.25)
    >>> true_probability(plain, "long", "usual", 0.0, 0.0, 0.0) == by_hand
    True
    """
    effects, first, second = truth.effects, half("notice", notice), half("crop", crop)
    log_odds = effects["(Intercept)"] + effects["notice"] * first + effects["crop"] * second
    log_odds += effects["notice:crop"] * first * second
    return probability(log_odds + intercept + slope * second + item_intercept)


def draw_outcomes(
    chances: Mapping[str, float], crop: str, rng: np.random.Generator
) -> dict[str, int | str]:
    """The outcomes of a trial, each from one draw of its own, or why there is none."""
    drawn: dict[str, int | str] = {
        outcome: int(chance(rng, chances[outcome])) for outcome in chances
    }
    if chance(rng, UNREACHED[crop]):
        return dict.fromkeys(drawn, "not_reached")
    if drawn["first_pass_skip"]:
        return {name: 1 if name == "first_pass_skip" else "skipped" for name in drawn}
    return drawn
