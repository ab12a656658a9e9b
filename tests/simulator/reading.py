"""One reader reads one text: word by word, forwards and back."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tests.simulator.draws import chance, clipped_normal, normal, pick, probability, uniform, whole
from tests.simulator.layout import Layout, Word
from tests.simulator.spec import Habits

#: A forward saccade longer than this many characters is not planned: the next word is taken
#: instead of one more skip. (A choice of ours; forward saccades beyond 15 characters are rare.)
LONGEST_SKIP_CHARACTERS = 13
#: How much likelier, in log-odds, a word is skipped when it has been passed before.
REREADING_SKIP = 0.6
#: Nobody looks at one of our texts longer than this many fixations.
MOST_FIXATIONS = 250
SHORTEST_MS, LONGEST_MS = 50, 950
SHORTEST_SACCADE_MS, LONGEST_SACCADE_MS = 20, 40


@dataclass(slots=True)
class Look:
    """A fixation before it has a time of its own.

    ``gap_ms`` is what passes until the next one; ``aside`` marks one that is no part of reading:
    it came before the text was there, or after it had gone.
    """

    word: Word | None
    x_px: float
    y_px: float
    duration_ms: int
    gap_ms: int
    regressive: bool = False
    blink: bool = False
    mess: str = ""
    aside: bool = False


@dataclass(frozen=True, slots=True)
class State:
    """What the reader brings to this text.

    Attributes
    ----------
    log_pace : float
        Added to the log of every duration.
    exit_probability : mapping of str to float
        Region to the probability that its first pass ends with a regression.
    exit_log_duration : float
        Added to the log of the durations on these regions.
    """

    log_pace: float
    exit_probability: Mapping[str, float]
    exit_log_duration: float


class Reading:
    """The way through one text, fixation after fixation."""

    def __init__(
        self, layout: Layout, habits: Habits, state: State, rng: np.random.Generator
    ) -> None:
        self.layout = layout
        self.habits = habits
        self.state = state
        self.rng = rng
        self.looks: list[Look] = []
        self.furthest_word = 0
        self.furthest_region = 0
        self.region: int | None = None
        self.in_first_pass = False
        self.drift_px = clipped_normal(rng, habits.drift_sd_px, habits.drift_limit_px)

    def run(self) -> list[Look]:
        """Read the text once and return the fixations in time order."""
        word = self.next_word(0)
        x_px = None
        while word is not None and len(self.looks) < MOST_FIXATIONS:
            if x_px is None:
                x_px = self.landing_px(word)
            self.look_at(word, x_px)
            word, x_px = self.decide(word, x_px)
        for number, look in enumerate(self.looks):
            drift = self.drift_px * number / len(self.looks)
            look.y_px = round(look.y_px + drift, 1)
        return self.looks

    def look_at(self, word: Word, x_px: float, *, briefly: bool = False) -> None:
        """Fixate a word at a place."""
        if word.region_order is not None and word.region_order != self.region:
            self.region = word.region_order
            self.in_first_pass = self.region > self.furthest_region
        log_ms = math.log(self.habits.median_duration_ms) + self.state.log_pace
        if word.region in self.state.exit_probability:
            log_ms += self.state.exit_log_duration
        if briefly:
            log_ms -= 0.35
        duration = math.exp(normal(self.rng, log_ms, self.habits.duration_sigma))
        limit = self.habits.vertical_limit_px
        y_px = self.layout.line_centre_px(word.line)
        y_px += clipped_normal(self.rng, self.habits.vertical_sd_px, limit)
        regressive = bool(self.looks) and self.goes_back(word, x_px)
        if self.looks:
            self.looks[-1].gap_ms = self.saccade_ms(abs(x_px - self.looks[-1].x_px))
        duration_ms = max(SHORTEST_MS, min(LONGEST_MS, round(duration)))
        self.looks.append(Look(word, x_px, y_px, duration_ms, 0, regressive))
        self.furthest_word = max(self.furthest_word, word.number)
        self.furthest_region = max(self.furthest_region, word.region_order or 0)

    def goes_back(self, word: Word, x_px: float) -> bool:
        """Whether a saccade to this place goes back in the text."""
        last = self.looks[-1]
        assert last.word is not None
        if word.number == last.word.number:
            return x_px < last.x_px
        return word.number < last.word.number

    def decide(self, word: Word, x_px: float) -> tuple[Word | None, float | None]:
        """Where to look next, and at which place where that is decided too."""
        again = self.habits.refixation_per_letter * max(0, word.letters - 4)
        times = sum(1 for look in self.looks[-2:] if look.word is word)
        if times < 2 and chance(self.rng, min(0.35, 0.02 + again)):
            return word, self.other_half_px(word, x_px)
        onward = self.next_word(word.number)
        governed = word.region is not None and word.region in self.state.exit_probability
        if governed and self.in_first_pass:
            assert word.region is not None
            leaves = onward is None or onward.region != word.region
            if leaves and chance(self.rng, self.state.exit_probability[word.region]):
                return self.earlier_word(word, earlier_region=True), None
        elif len(self.looks) > 1 and chance(self.rng, self.habits.regression_probability):
            return self.earlier_word(word, earlier_region=False), None
        if onward is not None and onward.line > word.line:
            onward = self.sweep(onward)
        return onward, None

    def sweep(self, onward: Word) -> Word:
        """Go to the start of the next line, at times by a fixation that falls short of it."""
        first = next(word for word in self.layout.words if word.line == onward.line)
        if not chance(self.rng, self.habits.undersweep_probability):
            return first
        width = self.layout.grid.character_width_px
        x_px = round(self.layout.grid.left_px + uniform(self.rng, 6.0, 12.0) * width, 1)
        hit = self.layout.word_at(x_px, self.layout.line_centre_px(onward.line))
        if hit is None or hit.number == first.number or hit.region in self.state.exit_probability:
            return first
        # One look at the place where the sweep ended, then the correction to the line's start.
        self.look_at(hit, x_px, briefly=True)
        return first

    def next_word(self, number: int) -> Word | None:
        """The next word to the right that is not skipped."""
        words = self.layout.words
        width = self.layout.grid.character_width_px
        start = self.looks[-1].x_px if self.looks else self.layout.grid.left_px
        for word in words[number:]:
            log_odds = self.habits.skip_log_odds
            log_odds += self.habits.skip_log_odds_per_letter * word.letters
            if word.number < self.furthest_word:
                log_odds += REREADING_SKIP
            same_line = number > 0 and word.line == words[number - 1].line
            far = same_line and word.right_px - start > LONGEST_SKIP_CHARACTERS * width
            opens_line = number > 0 and not same_line
            if far or opens_line or not chance(self.rng, probability(log_odds)):
                return word
        return None

    def earlier_word(self, word: Word, *, earlier_region: bool) -> Word:
        """A word to go back to: mostly the last one, seldom further."""
        before = self.layout.words[: word.number - 1]
        if earlier_region:
            assert word.region_order is not None
            before = tuple(w for w in before if (w.region_order or 99) < word.region_order)
        if not before:
            return word
        if chance(self.rng, 0.6):
            return before[-1]
        return pick(self.rng, before[-5:])

    def landing_px(self, word: Word) -> float:
        """A place in a word, most often a little left of its middle (Rayner 1979, Perception 8)."""
        width = word.right_px - word.left_px
        place = normal(self.rng, 0.47, 0.2) * width
        return inside(word, word.left_px + place)

    def other_half_px(self, word: Word, x_px: float) -> float:
        """A place in the other half of a word."""
        middle = (word.left_px + word.right_px) / 2
        if x_px < middle:
            return inside(word, uniform(self.rng, middle, word.right_px))
        return inside(word, uniform(self.rng, word.left_px, middle))

    def saccade_ms(self, distance_px: float) -> int:
        """How long the eyes fly: longer saccades take longer."""
        characters = distance_px / self.layout.grid.character_width_px
        flight = 20 + 0.8 * characters + whole(self.rng, -2, 4)
        return max(SHORTEST_SACCADE_MS, min(LONGEST_SACCADE_MS, round(flight)))


def inside(word: Word, x_px: float) -> float:
    """A place with one decimal that lies in the word's own box."""
    return min(max(round(x_px, 1), float(word.left_px)), word.right_px - 0.1)
