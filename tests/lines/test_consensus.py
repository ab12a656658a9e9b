"""The consensus of all methods: what it does not mind, what it leaves out, when it is unsure."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.errors import FaultError
from etl.lines import Passage
from etl.lines.consensus import REASONS, SURE, LineAssignment, assign_by_consensus
from etl.lines.consensus_confidence import Signs, contested_share
from tests.lines.building import any_fixations, text
from tests.lines.simulated import Layout, Manner, Trial, make_passage, read


def made(seed: int, manner: Manner, layout: Layout | None = None) -> Trial:
    """One made-up trial."""
    rng = np.random.default_rng(seed)
    return read(rng, make_passage(rng, layout or Layout(9)), manner)


def assigned(trial: Trial) -> LineAssignment:
    """What the consensus makes of a trial."""
    return assign_by_consensus(trial.x_px, trial.y_px, trial.duration_ms, trial.passage)


def right(trial: Trial) -> float:
    """The share of fixations on the right line, or rightly on none."""
    return float(np.mean(assigned(trial).line == trial.line))


DRIFTING = Manner(noise_px=15, slope=0.03, shift=0.08, offset_lines=0.3, within=0.4)

LAYOUTS = {
    "two lines": Layout(2),
    "three short lines": Layout(3, columns=30),
    "small type": Layout(10, character_px=7.5, line_height_px=26, left_px=80, top_px=60),
    "wide spacing": Layout(6, character_px=14, line_height_px=120, left_px=10, top_px=300),
    "twenty lines": Layout(20, columns=60, character_px=12, line_height_px=40),
}


@pytest.mark.parametrize("layout", LAYOUTS.values(), ids=LAYOUTS)
@pytest.mark.parametrize("seed", range(3))
def test_other_layouts_are_read_as_well(layout: Layout, seed: int) -> None:
    """Lengths count in line heights and widths of the text, whatever those are."""
    assert right(made(seed, Manner(noise_px=10, offset_lines=0.2), layout)) >= 0.97


@pytest.mark.parametrize("seed", range(3))
def test_moved_together_nothing_changes(seed: int) -> None:
    """Text and fixations moved by whole pixels have the same lines and confidence."""
    trial = made(seed, DRIFTING)
    passage = trial.passage
    moved = replace(passage, line_y_px=passage.line_y_px + 523, word_x_px=passage.word_x_px - 1361)
    there = assign_by_consensus(trial.x_px - 1361, trial.y_px + 523, trial.duration_ms, moved)
    here = assigned(trial)
    assert there.line.tolist() == here.line.tolist()
    assert there.trial_confidence == pytest.approx(here.trial_confidence, abs=1e-6)


@pytest.mark.parametrize("scale", [0.5, 2.0])
@pytest.mark.parametrize("seed", range(3))
def test_scaled_together_lines_stay(seed: int, scale: float) -> None:
    """Only the methods have settings in px; what their proposals lead to has no px in it."""
    trial = made(seed, DRIFTING)
    scaled = Passage(
        trial.passage.line_y_px * scale,
        trial.passage.word_x_px * scale,
        trial.passage.word_line,
        trial.passage.line_height_px * scale,
        trial.passage.width_px * scale,
    )
    there = assign_by_consensus(trial.x_px * scale, trial.y_px * scale, trial.duration_ms, scaled)
    assert there.line.tolist() == assigned(trial).line.tolist()


def test_mirrored_text_has_the_same_lines() -> None:
    """A text read from right to left, given as its mirror image, is the same text."""
    trial = made(1, DRIFTING)
    turned = replace(trial.passage, word_x_px=1900 - trial.passage.word_x_px)
    there = assign_by_consensus(
        -(1900 - trial.x_px), trial.y_px, trial.duration_ms, turned.mirrored
    )
    assert there.line.tolist() == assigned(trial).line.tolist()


def test_same_trial_same_answer() -> None:
    """Nothing is drawn."""
    first, second = assigned(made(5, DRIFTING)), assigned(made(5, DRIFTING))
    assert first.line.tolist() == second.line.tolist()
    assert first.confidence.tolist() == second.confidence.tolist()
    assert first.trial_confidence == second.trial_confidence


@settings(max_examples=60)
@given(any_fixations(25), st.integers(1, 7), st.sampled_from([20.0, 64.0]), st.booleans())
def test_every_fixation_gets_a_line_or_none(
    fixations: list[tuple[float, float]], lines: int, height: float, timed: bool
) -> None:
    """Few fixations, equal ones, ones far off: lines in range, chances from 0 to 1."""
    x, y = np.array(fixations, dtype=np.float64).reshape(-1, 2).T
    duration = np.full(x.size, 200.0 if timed else np.nan)
    got = assign_by_consensus(x, y, duration, text(lines, height=height))
    assert got.line.shape == got.reason.shape == got.confidence.shape == x.shape
    assert ((got.line >= 0) & (got.line <= lines)).all()
    assert ((got.reason > 0) == (got.line == 0)).all()
    assert ((got.confidence >= 0) & (got.confidence <= 1)).all()
    assert got.sure == (got.trial_confidence >= SURE)


def test_without_fixations_nothing_is_wrong() -> None:
    """An empty trial is sure; that it is empty is for other rules to say."""
    none = np.zeros(0)
    got = assign_by_consensus(none, none, none, text(3))
    assert (got.line.size, got.sure) == (0, True)


@pytest.mark.parametrize("count", [1, 2, 3])
def test_few_fixations_are_on_their_line_but_not_sure(count: int) -> None:
    """Nothing but height tells that they are on the third line, and height may be off."""
    passage = text(5)
    x, y = np.array([110.0, 205.0, 290.0])[:count], np.full(count, passage.line_y_px[2])
    got = assign_by_consensus(x, y, np.full(count, 200.0), passage)
    assert got.line.tolist() == [3] * count
    assert not got.sure


def test_positions_must_be_known() -> None:
    """Fixations without a position are for the caller to leave out."""
    with pytest.raises(FaultError, match="positions must be finite"):
        assign_by_consensus(np.array([np.nan]), np.zeros(1), np.zeros(1), text(2))


def test_arrays_must_be_of_one_length() -> None:
    """Whatever is too long or too short is a fault of the caller."""
    with pytest.raises(FaultError, match="as long as each other"):
        assign_by_consensus(np.zeros(2), np.zeros(2), np.zeros(1), text(2))


PARTLY = {
    "stops in the middle": Manner(last_line=5),
    "starts in the middle": Manner(first_line=4),
    "read twice": Manner(readings=2),
    "earlier lines read again": Manner(between=0.5),
    "undersweeps": Manner(undersweep=0.8),
    "slow drift": Manner(drift_lines=0.6),
    "arc": Manner(arc_lines=0.5),
}


@pytest.mark.parametrize("manner", PARTLY.values(), ids=PARTLY)
@pytest.mark.parametrize("seed", range(3))
def test_unusual_readings_are_followed(manner: Manner, seed: int) -> None:
    """Not every trial goes through the text once from its first to its last line."""
    assert right(made(seed, manner)) >= 0.97


@pytest.mark.parametrize("seed", range(4))
def test_whole_text_a_line_too_low_is_told(seed: int) -> None:
    """All lines were read, so that only one place fits them."""
    assert right(made(seed, Manner(offset_lines=1.0))) == 1.0


@pytest.mark.parametrize("seed", range(4))
def test_part_of_a_text_a_line_too_low_is_never_sure(seed: int) -> None:
    """The first five lines recorded a line too low might be lines two to six."""
    assert not assigned(made(seed, Manner(offset_lines=1.0, last_line=5))).sure


def reasons(got: LineAssignment) -> list[str]:
    """The names of reasons, in order of the fixations."""
    return [REASONS[code] for code in got.reason]


def with_fixation(trial: Trial, place: int, x_px: float, y_px: float) -> LineAssignment:
    """What the consensus makes of a trial with one fixation more."""
    return assign_by_consensus(
        np.insert(trial.x_px, place, x_px),
        np.insert(trial.y_px, place, y_px),
        np.insert(trial.duration_ms, place, 180.0),
        trial.passage,
    )


def test_glance_below_the_text_is_left_out() -> None:
    """Two lines below the last one nothing can be read."""
    trial = made(2, Manner())
    below = float(trial.passage.line_y_px[-1]) + 2 * trial.passage.line_height_px
    assert reasons(with_fixation(trial, 40, 900.0, below))[40] in {"off_text", "stray"}


def test_looking_below_the_text_for_long_is_left_out() -> None:
    """Several fixations on end two lines below the last one are on no line all the same."""
    trial = made(2, Manner())
    below = float(trial.passage.line_y_px[-1]) + 2 * trial.passage.line_height_px
    x, y = np.array([700.0, 760.0, 830.0, 880.0, 960.0]), np.full(5, below)
    got = assign_by_consensus(
        np.append(trial.x_px, x),
        np.append(trial.y_px, y),
        np.append(trial.duration_ms, np.full(5, 200.0)),
        trial.passage,
    )
    assert reasons(got)[-5:] == ["off_text"] * 5
    assert got.line[:-5].tolist() == trial.line.tolist()


def test_glance_beside_the_text_is_left_out() -> None:
    """Far beside every line nothing can be read."""
    trial = made(2, Manner())
    beside = float(trial.passage.word_x_px.max()) + 0.2 * trial.passage.width_px
    assert reasons(with_fixation(trial, 40, beside, trial.y_px[40]))[40] == "off_text"


def test_arrival_from_elsewhere_is_left_out() -> None:
    """The first saccade onto the text lands before reading begins."""
    trial = made(2, Manner())
    got = with_fixation(trial, 0, 1100.0, float(trial.passage.line_y_px[6]))
    assert reasons(got)[0] == "arrival"
    assert got.line[1:].tolist() == trial.line.tolist()


def test_fixation_in_mid_sweep_is_left_out() -> None:
    """Between the end of a line and the beginning of the next, on the way."""
    trial = made(2, Manner())
    place = int(np.flatnonzero(np.diff(trial.line) == 1)[3]) + 1
    x = float(trial.x_px[place - 1 : place + 1].mean())
    y = float(trial.y_px[place - 1 : place + 1].mean())
    assert reasons(with_fixation(trial, place, x, y))[place] == "mid_sweep"


def test_lone_fixation_between_lines_is_left_out() -> None:
    """Half way to the next line, between two fixations on one line, is on neither."""
    trial = made(2, Manner(noise_px=3))
    place = int(np.flatnonzero(trial.line == 4)[4])
    between = float(trial.passage.line_y_px[3:5].mean())
    got = with_fixation(trial, place, float(trial.x_px[place - 1 : place + 1].mean()), between)
    assert reasons(got)[place] == "stray"


def with_rising_first_line(seed: int, lines: float) -> tuple[Trial, LineAssignment]:
    """A trial whose first line leaves its height by so many lines towards its end."""
    trial = made(seed, Manner(noise_px=3))
    first = np.flatnonzero(trial.line == 1)
    rise = np.zeros(trial.y_px.size)
    rise[first] = np.linspace(0, lines, first.size) * trial.passage.line_height_px
    got = assign_by_consensus(trial.x_px, trial.y_px - rise, trial.duration_ms, trial.passage)
    return trial, got


@pytest.mark.parametrize("seed", range(2, 6))
def test_run_off_the_first_line_is_kept(seed: int) -> None:
    """Several fixations on end that leave the line slowly are reading; the tracker drifts."""
    trial, got = with_rising_first_line(seed, 0.55)
    assert got.line.tolist() == trial.line.tolist()


@pytest.mark.parametrize("seed", range(2, 6))
def test_first_line_that_is_nearly_off_the_text_is_right_or_unsure(seed: int) -> None:
    """It might as well be a look off the text, with everything else a line lower."""
    trial, got = with_rising_first_line(seed, 0.8)
    assert got.line.tolist() == trial.line.tolist() or not got.sure


def contested(agreement: list[bool], line: list[int]) -> float:
    """The contested share where one of two methods agrees everywhere, the other as given."""
    none = np.zeros(0)
    agreeing = np.array([[True] * len(line), agreement])
    lines = np.array(line, dtype=np.int32)
    return contested_share(Signs(lines, none, none, 0.1, none, none, agreeing))


def test_runs_that_methods_agree_on_are_not_contested() -> None:
    """A jump by itself is no reason for doubt."""
    assert contested([True] * 4, [1, 1, 4, 4]) == 0


def test_next_line_is_never_contested() -> None:
    """Where reading goes on as usual, methods that fail elsewhere do not matter."""
    assert contested([True, True, False, False], [1, 1, 2, 2]) == 0


def test_contested_runs_count_by_fixations() -> None:
    """Two of five fixations are on a far line that half of the methods do not find."""
    assert contested([True, True, False, False, True], [1, 1, 4, 4, 5]) == 0.4
