"""Units of the open standard (BIDS): what the sidecars say, and what is refused to be guessed."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest

from tests.parsers.bids_making import CLOCK_MS, EVENTS, RECORDING, RUN, TASK, Dataset, told

#: The events that the specification prints for eye tracking (BIDS 1.11, "Modality specific
#: files", "Physiological recordings", eye-tracking): onsets, durations and trial types as facts.
PRINTED = [(7186806, 72, "fixation"), (7187111, 6186, "saccade")]


def printed(folder: Path, **sidecar: Any) -> Dataset:
    """A dataset with the events that the specification prints."""
    data = Dataset(folder)
    data.sidecar("physioevents.json", told(EVENTS, **sidecar))
    data.samples((ms, 50.0, 20.0, 3) for ms in range(7186800, 7194000))
    data.events(PRINTED)
    data.task([(0, 8, 1, "pear")])
    return data


def test_printed_events_are_milliseconds_where_the_sidecar_says_so(tmp_path: Path) -> None:
    """The printed fixation begins at 7186806 and lasts 72 ms."""
    log, note = printed(tmp_path).log()
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([7186806.0], [72.0])
    assert {fate: tally.count for fate, tally in note.account.lines.items()} == {
        "fixations": 1,
        "saccades": 1,
    }


def test_printed_saccade_lasts_as_long_as_printed(tmp_path: Path) -> None:
    """The second printed event, taken as a fixation by the study, lasts 6186 ms."""
    log, _ = printed(tmp_path).log(bids={"fixation": ["saccade"], "ignore": ["fixation"]})
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([7187111.0], [6186.0])


def test_printed_events_without_a_unit_are_refused(tmp_path: Path) -> None:
    """By the standard they would be seconds, a fixation of 72 s: that is not guessed but said."""
    assert printed(tmp_path, duration=None).refusal() == (
        f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz:1: "
        'column "duration": nothing says the unit of the durations, and seconds, which the '
        'standard has, would be absurd; found "72", expected fixations whose median is below 10 s\n'
        '    fix: say the unit in physioevents.json, "duration": {"Units": "ms"}, or in the study '
        'file by [logs.bids] duration_unit = "ms"\n'
        "1 problem; nothing was written"
    )


def test_study_says_the_unit_where_the_sidecar_is_silent(tmp_path: Path) -> None:
    """duration_unit of the study file is taken where no sidecar says a unit."""
    log, _ = printed(tmp_path, duration=None).log(bids={"duration_unit": "ms"})
    assert log.duration_ms.tolist() == [72.0]


def test_plausible_seconds_need_no_unit(tmp_path: Path) -> None:
    """Durations that can be seconds are seconds, as the standard has it."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, duration=None))
    data.events([(CLOCK_MS + 100, 0.04, "fixation")])
    log, _ = data.log()
    assert log.duration_ms.tolist() == [40.0]


@pytest.mark.parametrize(
    ("spelled", "cell"),
    [
        *((one, "0.04") for one in ("s", "sec", "seconds", "Second")),
        *((one, "40") for one in ("ms", "msec", "milliseconds", "Millisecond")),
        *((one, "40000") for one in ("us", "µs", "μs", "microseconds")),
    ],
)
def test_units_of_time_are_known_by_their_spellings(
    tmp_path: Path, spelled: str, cell: str
) -> None:
    """40 ms are 40 ms, whichever unit they are written in."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, duration={"Units": spelled}))
    data.events([(CLOCK_MS + 100, cell, "fixation")])
    log, _ = data.log()
    assert log.duration_ms.tolist() == [40.0]


def test_unknown_unit_is_refused(tmp_path: Path) -> None:
    """A unit that is none of time stops the build, with the sidecar and its line."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, duration={"Units": "frames"}))
    assert 'physioevents.json:10: duration.Units: the unit is not known; found "frames"' in (
        data.refusal()
    )


@pytest.mark.parametrize(("unit", "per_ms"), [("s", 0.001), ("ms", 1), ("us", 1000)])
@pytest.mark.parametrize("said", [True, False], ids=["said", "silent"])
def test_time_stamps_are_in_the_unit_that_fits_the_frequency(
    tmp_path: Path, unit: str, per_ms: float, said: bool
) -> None:
    """A silent sidecar leaves one unit by which stamps go with the sampling frequency."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, timestamp={"Units": unit} if said else None))
    data.samples((f"{ms * per_ms:.6f}", ms, 20, 3) for ms in range(500))
    data.events([(f"{120 * per_ms:.6f}", 40, "fixation")])
    log, _ = data.log()
    assert log.onset_ms.tolist() == [120.0]
    assert log.x_px.tolist() == [139.5]


@pytest.mark.parametrize("unit", ["s", "us"])
def test_unit_that_contradicts_the_frequency_is_refused(tmp_path: Path, unit: str) -> None:
    """Stamps a millisecond apart are no seconds at 1000 samples a second."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, timestamp={"Units": unit}))
    assert (
        "timestamp.Units: the time stamps do not go with the sampling frequency; "
        f'found "steps of 1 {unit}", expected steps of 1 ms, at 1000 samples a second'
    ) in data.refusal()


def test_onset_may_have_a_unit_of_its_own(tmp_path: Path) -> None:
    """Onsets in seconds of a clock in milliseconds are converted, where the sidecar says so."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, onset={"Units": "s"}))
    data.events([(f"{(CLOCK_MS + 100) / 1000:.3f}", 40, "fixation")])
    log, _ = data.log()
    assert log.onset_ms.tolist() == [CLOCK_MS + 100.0]


def test_events_of_the_task_may_be_in_milliseconds_if_their_sidecar_says_so(
    tmp_path: Path,
) -> None:
    """Seconds are the standard's; a sidecar that says otherwise is believed."""
    data = Dataset(tmp_path)
    unit = {"Units": "ms"}
    data.sidecar("events.json", told(TASK, onset=unit, duration=unit))
    data.task([(100, 100, 1, "pear"), (250, 100, 2, "plum")])
    log, _ = data.log()
    assert [log.ids["trial"].text(row) for row in range(2)] == ["1", "2"]


def test_positions_without_a_unit_are_refused(tmp_path: Path) -> None:
    """Whether positions are pixels or degrees is never guessed."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, x_coordinate=None, y_coordinate=None))
    assert "x_coordinate: nothing says the unit of the positions" in data.refusal()


def test_study_says_the_unit_of_positions_where_the_sidecar_is_silent(tmp_path: Path) -> None:
    """A unit that the study states of x and y is taken."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, x_coordinate=None, y_coordinate=None))
    columns = {k: {"column": f"{k}_coordinate", "unit": "px"} for k in ("x", "y")}
    log, _ = data.log(columns=columns)
    assert log.x_px.tolist() == [12.0, 15.0]


def test_units_of_positions_that_contradict_the_study_are_refused(tmp_path: Path) -> None:
    """Pixels by the sidecar are no degrees by the study."""
    columns = {k: {"column": f"{k}_coordinate", "unit": "deg"} for k in ("x", "y")}
    said = Dataset(tmp_path).refusal(columns=columns)
    assert "x_coordinate: the sidecar and the study say different units" in said
    assert 'expected "deg" as in [logs.columns]' in said


def test_degrees_become_pixels_by_the_screen_of_the_sidecar(tmp_path: Path) -> None:
    """Ten degrees at 60 cm on a screen of 1000 px over 50 cm, worked out by plane trigonometry."""
    data = Dataset(tmp_path)
    degrees = {"Units": "deg"}
    data.sidecar("physio.json", told(RECORDING, x_coordinate=degrees, y_coordinate=degrees))
    screen = {**TASK["StimulusPresentation"], "ScreenOrigin": ["center", "center"]}
    data.sidecar("events.json", {"StimulusPresentation": screen})
    data.samples((CLOCK_MS + ms, 10, -5, 3) for ms in range(500))
    log, _ = data.log(screen={"width_px": 1000, "height_px": 500, "y_axis": "up"})
    px = [1000 / 50 * 60 * math.tan(math.radians(angle)) for angle in (10, 5)]
    assert log.x_px.tolist() == pytest.approx([500 + px[0]] * 2)
    assert log.y_px.tolist() == pytest.approx([250 + px[1]] * 2)
