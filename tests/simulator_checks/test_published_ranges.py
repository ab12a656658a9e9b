"""The simulated reading lies in published ranges, measured on the simulated fixations themselves.

Rayner 1998 is doi:10.1037/0033-2909.124.3.372.
"""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

import numpy as np
import pytest

from tests.simulator import SimulatedFixation, SimulatedStudy, SimulatedTrial

CHARACTER_PX = 14


@pytest.fixture(params=["orchard", "passages"])
def study(request: pytest.FixtureRequest) -> SimulatedStudy:
    """Each of the sample studies in turn."""
    return request.getfixturevalue(request.param)


def undisturbed(trial: SimulatedTrial) -> list[SimulatedFixation]:
    """The fixations that belong to reading."""
    return [fixation for fixation in trial.fixations if not fixation.mess]


def saccades(study: SimulatedStudy) -> Iterator[tuple[SimulatedFixation, SimulatedFixation]]:
    """Pairs of neighbouring fixations on one line, so that return sweeps do not count."""
    for trial in study.trials:
        for before, after in pairwise(undisturbed(trial)):
            if after.fixation == before.fixation + 1 and after.line == before.line:
                yield before, after


def skip_share(study: SimulatedStudy, fewest: int, most: int) -> float:
    """Share of words of so many letters that were passed without a fixation before."""
    chances = skips = 0
    for trial in study.trials:
        words = study.spec.layouts[trial.plan.text].words
        furthest = 0
        fixated = set()
        for fixation in undisturbed(trial):
            assert fixation.word is not None
            if fixation.word > furthest:
                fixated.add(fixation.word)
                furthest = fixation.word
        for word in words[:furthest]:
            if fewest <= word.letters <= most:
                chances += 1
                skips += word.number not in fixated
    return skips / chances


def refixation_share(study: SimulatedStudy, fewest: int, most: int) -> float:
    """Share of words of so many letters that got a second fixation right after the first."""
    chances = again = 0
    for trial in study.trials:
        words = study.spec.layouts[trial.plan.text].words
        looks = undisturbed(trial)
        furthest = 0
        for number, fixation in enumerate(looks):
            assert fixation.word is not None
            if fixation.word > furthest:
                furthest = fixation.word
                if fewest <= words[furthest - 1].letters <= most:
                    chances += 1
                    again += number + 1 < len(looks) and looks[number + 1].word == furthest
    return again / chances


def test_mean_fixation_lasts_200_to_250_ms(study: SimulatedStudy) -> None:
    """Fixations in silent reading last 200-250 ms on average (Rayner 1998)."""
    durations = [f.duration_ms for trial in study.trials for f in undisturbed(trial)]
    assert 200 <= np.mean(durations) <= 250


def test_durations_are_skewed_to_the_right(study: SimulatedStudy) -> None:
    """Fixation durations have a long right tail (Rayner 1998): their skewness is well above 0."""
    durations = np.array([f.duration_ms for trial in study.trials for f in undisturbed(trial)])
    standard = (durations - durations.mean()) / durations.std()
    assert np.mean(standard**3) > 0.5


def test_mean_forward_saccade_spans_7_to_9_characters(study: SimulatedStudy) -> None:
    """The mean saccade in reading spans 7-9 letter spaces (Rayner 1998)."""
    lengths = [(b.x_px - a.x_px) / CHARACTER_PX for a, b in saccades(study) if b.x_px > a.x_px]
    assert 7 <= np.mean(lengths) <= 9


def test_regressive_saccades_are_10_to_15_percent(study: SimulatedStudy) -> None:
    """About 10-15 % of saccades in skilled reading go back (Rayner 1998)."""
    share = np.mean([after.regressive for _, after in saccades(study)])
    assert 0.10 <= share <= 0.15


def test_short_words_are_skipped_and_long_ones_are_not(orchard: SimulatedStudy) -> None:
    """Words of up to 3 letters are skipped more often than not, of 8 and more nearly never.

    Rayner & McConkie 1976, as told by Rayner 1998 (from memory): words of 2-3 letters are fixated
    about one time in four, words of 8 and more nearly always. Our readers skip short words a
    little less. The passages have too few words of 8 letters and more to say (about 40 looks).
    """
    assert skip_share(orchard, 1, 3) > 0.5
    assert skip_share(orchard, 8, 20) < 0.1


def test_long_words_are_fixated_again_more_often(orchard: SimulatedStudy) -> None:
    """Refixations become likelier with the length of the word (Rayner 1998).

    The bound of 10 % is ours. The passages have too few long words to say.
    """
    assert refixation_share(orchard, 7, 20) > 0.10 > refixation_share(orchard, 1, 4)


def test_fixations_do_not_overlap_and_saccades_last_20_to_40_ms(study: SimulatedStudy) -> None:
    """A saccade of reading takes about 30 ms (Rayner 1998); time never goes back for a reader.

    Only after a blink, or where a trial ends, does more time pass.
    """
    clock_ms: dict[str, int] = {}
    for trial in study.trials:
        who = trial.plan.participant
        assert trial.fixations[0].onset_ms > clock_ms.get(who, 0)
        clock_ms[who] = trial.fixations[-1].end_ms
        for before, after in pairwise(trial.fixations):
            gap_ms = after.onset_ms - before.end_ms
            most_ms = 260 if before.blink and after.blink else 40
            if "off_screen" in (before.mess, after.mess):
                most_ms = 260
            assert 20 <= gap_ms <= most_ms


def test_about_three_zeros_to_each_first_pass_regression(orchard: SimulatedStudy) -> None:
    """The critical region and the one after it give about three zeros to each one.

    Common practice, no source: the sparseness that the sample study is to show.
    """
    shares = [p for trial in orchard.trials for p in trial.exit_probability.values()]
    assert 1 / 4.5 < np.mean(shares) < 1 / 3.3
