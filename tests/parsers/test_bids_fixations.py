"""Fixations of recordings of the open standard (BIDS): when, where, in which trial."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from etl.parsers.bids_fixations import touched_by_blinks
from etl.parsers.bids_samples import mean_positions
from tests.parsers.bids_making import CLOCK_MS, EVENTS, RECORDING, RUN, TASK, Dataset, told
from tests.parsers.reading import texts

NUMBERED = ["timestamp", "x_coordinate", "y_coordinate", "sample"]


def counted(data: Dataset) -> dict[str, int]:
    """What became of the lines of the events."""
    return {fate: tally.count for fate, tally in data.log()[1].account.lines.items()}


def test_position_is_the_mean_of_the_samples(tmp_path: Path) -> None:
    """The sample at the onset counts, that at the end does not; samples without y do not."""
    data = Dataset(tmp_path)
    rows = [(CLOCK_MS + ms, ms, 100) for ms in range(500)]
    rows[103] = (CLOCK_MS + 103, 9999, "n/a")
    data.samples((*row, 3) for row in rows)
    data.events([(CLOCK_MS + 100, 5, "fixation")])
    log, _ = data.log()
    assert log.x_px.tolist() == [(100 + 101 + 102 + 104) / 4]
    assert log.y_px.tolist() == [100.0]


def test_means_are_those_of_a_plain_loop() -> None:
    """Any fixations, overlapping and without samples too, have the mean of what lies in them."""
    random = np.random.default_rng(7)
    for _ in range(50):
        time = np.sort(random.integers(0, 200, 60)).astype(float)
        x, y = random.normal(size=(2, 60))
        x[random.random(60) < 0.2] = np.nan
        y[random.random(60) < 0.2] = np.nan
        onset = random.integers(-20, 220, 25).astype(float)
        end = onset + random.integers(0, 60, 25)
        found = mean_positions(time, x, y, onset, end)
        known = ~(np.isnan(x) | np.isnan(y))
        for at in range(25):
            inside = known & (time >= onset[at]) & (time < end[at])
            for values, mean in zip((x, y), found, strict=True):
                wanted = values[inside].mean() if inside.any() else np.nan
                # Rounded to a millionth.
                assert mean[at] == pytest.approx(wanted, abs=1e-6, nan_ok=True)


def test_fixation_without_a_sample_has_no_position(tmp_path: Path) -> None:
    """Where all samples of a fixation are missing, its place is missing too, and counted."""
    data = Dataset(tmp_path)
    data.samples((CLOCK_MS + ms, "n/a" if ms < 200 else 5, 5, 3) for ms in range(500))
    log, note = data.log()
    assert np.isnan(log.x_px).tolist() == [True, False]
    assert note.counts["fixations without a position"] == 1


def test_source_lines_are_those_of_the_events(tmp_path: Path) -> None:
    """The line of a fixation is its line in the events beside the recording."""
    data = Dataset(tmp_path)
    data.events(
        [
            (CLOCK_MS, 10, "saccade"),
            (CLOCK_MS + 100, 40, "fixation"),
            ("n/a", "n/a", "n/a", "n/a", "calibrated"),
            (CLOCK_MS + 250, 30, "fixation"),
        ]
    )
    log, note = data.log()
    assert log.source_line.tolist() == [2, 4]
    assert note.shown == f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz"
    assert counted(data) == {"saccades": 1, "other events": 1, "fixations": 2}


def test_every_file_that_is_read_is_told(tmp_path: Path) -> None:
    """The run record names samples, events of the task and sidecars, each with its role."""
    _, note = Dataset(tmp_path).log()
    assert [(Path(name).name, role) for name, role, _ in note.parts] == [
        ("physio.json", "sidecar"),
        ("sub-P01_task-read_events.tsv", "trials"),
        ("events.json", "sidecar"),
        (f"sub-P01{RUN}_physio.tsv.gz", "samples"),
        ("physioevents.json", "sidecar"),
    ]
    assert all(len(digest) == 64 for _, _, digest in note.parts)


@pytest.mark.parametrize(
    ("at_ms", "trial"),
    [(99, None), (100, "1"), (199, "1"), (200, None), (249, None), (250, "2"), (350, None)],
)
def test_fixation_is_of_the_trial_in_which_it_begins(
    tmp_path: Path, at_ms: int, trial: str | None
) -> None:
    """A trial holds its onset and not its end; what lies in none is counted and left out."""
    data = Dataset(tmp_path)
    data.events([(CLOCK_MS + 150, 5, "fixation"), (CLOCK_MS + at_ms, 60, "fixation")])
    log, note = data.log()
    assert texts(log, "trial") == (["1"] if trial is None else ["1", trial])
    outside = note.account.lines.get("fixations outside every trial")
    assert (outside is None) == (trial is not None)


@pytest.mark.parametrize("start_s", [-0.05, 0, 0.05, 12.5])
def test_start_time_shifts_trials_in_the_recording(tmp_path: Path, start_s: float) -> None:
    """The first sample was taken StartTime seconds after the start of the events' clock."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, StartTime=start_s))
    data.task([(0.1 + start_s, 0.1, 1, "pear"), (0.25 + start_s, 0.1, 2, "plum")])
    log, _ = data.log()
    assert texts(log, "trial") == ["1", "2"]


def test_recording_that_begins_later_has_its_trials_earlier(tmp_path: Path) -> None:
    """A recording begun at 0.15 s has the trial of 0.25 s at its own 0.1 s."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, StartTime=0.15))
    log, _ = data.log()
    assert texts(log, "trial") == ["2"]


def test_clocks_that_do_not_meet_are_refused(tmp_path: Path) -> None:
    """Where no fixation lies in a trial, the clocks are named."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, StartTime=100))
    assert "no fixation lies in a trial" in data.refusal()


@pytest.mark.parametrize(("first_row", "row"), [(0, 100), (1, 101)])
def test_onsets_may_be_rows_of_the_recording(tmp_path: Path, first_row: int, row: int) -> None:
    """OnsetSource "n/a": rows counted from 0, or from 1 where the study says so."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, OnsetSource="n/a"))
    data.events([(row, 40, "fixation")])
    log, _ = data.log(bids={"first_row": first_row})
    assert log.onset_ms.tolist() == [CLOCK_MS + 100.0]


@pytest.mark.parametrize(("first_row", "row"), [(0, 500), (1, 0), (0, 10.5), (0, -1)])
def test_row_that_is_not_there_is_refused(tmp_path: Path, first_row: int, row: float) -> None:
    """An index outside the recording, or between two rows, is an error on its line."""
    data = Dataset(tmp_path)
    data.sidecar("physioevents.json", told(EVENTS, OnsetSource="n/a"))
    data.events([(100, 40, "fixation"), (row, 40, "fixation")])
    said = data.refusal(bids={"first_row": first_row})
    assert (
        f'physioevents.tsv.gz:2: column "onset": the recording has no such row; found "{row}"'
        in (said)
    )


def test_onsets_may_refer_to_another_column(tmp_path: Path) -> None:
    """OnsetSource may name any column of the recording; the sample with that value is meant."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, Columns=NUMBERED))
    data.sidecar("physioevents.json", told(EVENTS, OnsetSource="sample"))
    data.samples((CLOCK_MS + ms, 5, 5, 2 * ms) for ms in range(500))
    data.events([(200, 40, "fixation")])
    log, _ = data.log()
    assert log.onset_ms.tolist() == [CLOCK_MS + 100.0]


def test_other_column_without_that_value_is_refused(tmp_path: Path) -> None:
    """A value that no sample has is an error on its line."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, Columns=NUMBERED))
    data.sidecar("physioevents.json", told(EVENTS, OnsetSource="sample"))
    data.samples((CLOCK_MS + ms, 5, 5, 2 * ms) for ms in range(500))
    data.events([(201, 40, "fixation")])
    assert 'physioevents.tsv.gz:1: column "onset": no sample has this onset; found "201"' in (
        data.refusal()
    )


def test_event_outside_the_recording_is_refused(tmp_path: Path) -> None:
    """A time that no sample has been taken at is of another clock."""
    data = Dataset(tmp_path)
    data.events([(CLOCK_MS + 100, 40, "fixation"), (100, 40, "fixation")])
    said = data.refusal()
    assert 'physioevents.tsv.gz:2: column "onset": the event lies outside the recording' in said
    assert "expected a time from 7000000 to 7000499 ms, in the recording's clock" in said


def test_trials_are_the_rows_that_the_study_names(tmp_path: Path) -> None:
    """[logs.bids] trials picks rows of the events of the task."""
    data = Dataset(tmp_path)
    header = ("onset", "duration", "trial", "item", "trial_type")
    data.task(
        [
            (0, 0.5, "n/a", "n/a", "block"),
            (0.1, 0.1, 1, "pear", "reading"),
            (0.25, 0.1, 2, "plum", "reading"),
        ],
        header,
    )
    log, _ = data.log(bids={"trials": {"trial_type": ["reading"]}}, facts=("trial_type",))
    assert texts(log, "item") == ["pear", "plum"]
    assert log.recording.tolist() == [1, 2]
    assert log.facts["trial_type"].values == ("reading",)


def test_trial_of_two_rows_is_recorded_twice(tmp_path: Path) -> None:
    """Each row of the events is a recording of its trial."""
    data = Dataset(tmp_path)
    data.task([(0.1, 0.1, 1, "pear"), (0.25, 0.1, 1, "pear")])
    log, _ = data.log()
    assert (texts(log, "trial"), log.recording.tolist()) == (["1", "1"], [0, 1])


def test_name_of_the_file_gives_facts(tmp_path: Path) -> None:
    """Entities of the name are columns, as the eye is; the run may be the session."""
    data = Dataset(tmp_path)
    (tmp_path / "sub-P01/beh").rename(tmp_path / "sub-P01/old")
    where = {"entities": "_task-read_run-2_recording-eye1"}
    data.samples(((CLOCK_MS + ms, 5, 5, 3) for ms in range(500)), **where)
    data.events([(CLOCK_MS + 100, 40, "fixation")], **where)
    data.task([(0.1, 0.1, 1, "pear")], entities="_task-read_run-2")
    log, _ = data.log(
        data.path("physio.tsv.gz", **where),
        columns={"session": "run"},
        facts=("task", "eye"),
    )
    assert log.ids["session"].values == ("2",)
    assert (log.facts["task"].values, log.facts["eye"].values) == (("read",), ("right",))


def test_session_is_that_of_the_name(tmp_path: Path) -> None:
    """In a dataset with sessions, the session is the label of the name."""
    data = Dataset(tmp_path)
    folder = tmp_path / "sub-P01/ses-2"
    (tmp_path / "sub-P01/beh").rename(tmp_path / "moved")
    folder.mkdir(parents=True)
    (tmp_path / "moved").rename(folder / "beh")
    for file in (folder / "beh").iterdir():
        file.rename(file.with_name(file.name.replace("sub-P01", "sub-P01_ses-2")))
    log, _ = data.log(folder / "beh" / f"sub-P01_ses-2{RUN}_physio.tsv.gz")
    assert log.ids["session"].values == ("2",)


def test_dataset_without_sessions_has_none(tmp_path: Path) -> None:
    """Where no reader came in sessions, a trial's identity has none."""
    log, _ = Dataset(tmp_path).log()
    assert sorted(log.ids) == ["item", "participant", "trial"]


def test_recording_of_no_session_beside_others_has_an_empty_one(tmp_path: Path) -> None:
    """Where others came in sessions, the session of one who did not is an empty text."""
    data = Dataset(tmp_path)
    (tmp_path / "sub-P02/ses-1").mkdir(parents=True)
    log, _ = data.log()
    assert log.ids["session"].values == ("",)


def test_own_positions_of_events_are_not_those_that_count(tmp_path: Path) -> None:
    """The mean of the samples counts, whatever the events say."""
    data = Dataset(tmp_path)
    columns = ["onset", "duration", "trial_type", "x_coordinate", "y_coordinate"]
    data.sidecar("physioevents.json", told(EVENTS, Columns=columns))
    data.events([(CLOCK_MS + 100, 40, "fixation", 999, 999)])
    log, _ = data.log()
    assert log.x_px.tolist() == [12.0]


BLINKS = {
    "in a column of the fixation": ([("", 0), ("blink", 1), ("", 0)], [0, 1, 0]),
    "in a row over a fixation": ([("", 0), ("", 0), ("over", 0), ("", 0)], [0, 1, 0]),
    "in a row between two": ([("", 0), ("between", 0), ("", 0), ("", 0)], [1, 1, 0]),
    "in a saccade between two": ([("", 0), ("saccade", 1), ("", 0), ("", 0)], [1, 1, 0]),
    "before the first": ([("before", 0), ("", 0), ("", 0), ("", 0)], [0, 0, 0]),
}


@pytest.mark.parametrize("case", BLINKS)
def test_blink_touches_what_it_overlaps_or_lies_between(tmp_path: Path, case: str) -> None:
    """A blink is a row of its own, or any row that is not 0 in the column blink."""
    data = Dataset(tmp_path)
    rows, at = [], iter((100, 130, 160))
    for what, blink in BLINKS[case][0]:
        if what in ("", "blink"):
            rows.append((CLOCK_MS + next(at), 20, "fixation", blink))
        elif what == "over":
            rows.append((CLOCK_MS + 145, 2, "blink", "n/a"))
        elif what == "before":
            rows.append((CLOCK_MS + 80, 10, "blink", "n/a"))
        else:
            rows.append((CLOCK_MS + 122, 5, "saccade" if blink else "blink", blink))
    data.events(rows)
    log, _ = data.log()
    assert log.blink.astype(int).tolist() == BLINKS[case][1]


def test_blink_at_an_unknown_time_touches_none(tmp_path: Path) -> None:
    """A blink without an onset is counted apart."""
    data = Dataset(tmp_path)
    data.events([("n/a", 5, "blink"), (CLOCK_MS + 100, 20, "fixation")])
    log, note = data.log()
    assert log.blink.tolist() == [False]
    assert note.account.lines["blinks without an onset"].count == 1


def test_types_that_mean_nothing_are_counted(tmp_path: Path) -> None:
    """[logs.bids] ignore names further types of event."""
    data = Dataset(tmp_path)
    data.events([(CLOCK_MS, 5, "drift"), (CLOCK_MS + 100, 20, "fixation")])
    log, note = data.log(bids={"ignore": ["drift", "saccade"]})
    assert len(log) == 1
    assert note.account.lines["other events"].count == 1


def test_trial_without_a_fixation_is_told(tmp_path: Path) -> None:
    """A row of the events that no fixation begins in is warned of."""
    data = Dataset(tmp_path)
    data.events([(CLOCK_MS + 100, 20, "fixation")])
    read, findings = data.read()
    assert read is not None
    assert "sub-P01/beh/sub-P01_task-read_events.tsv:3: 1 trial has no fixation" in findings.text()


def test_gaze_that_goes_on_after_the_events_is_told(tmp_path: Path) -> None:
    """Events that end long before the reader looked away may be cut short."""
    data = Dataset(tmp_path)
    data.samples((CLOCK_MS + ms, 5, 5, 3) for ms in range(2000))
    data.task([(0.1, 0.1, 1, "pear"), (0.25, 1.5, 2, "plum")])
    read, findings = data.read()
    assert read is not None
    assert "the samples show 1470 ms of gaze in trials after the last fixation" in findings.text()


def test_blink_between_two_trials_touches_none(tmp_path: Path) -> None:
    """Fixations of different trials are not neighbours."""
    data = Dataset(tmp_path)
    data.events(
        [
            (CLOCK_MS + 150, 20, "fixation"),
            (CLOCK_MS + 210, 20, "blink"),
            (CLOCK_MS + 250, 20, "fixation"),
        ]
    )
    log, _ = data.log()
    assert log.blink.tolist() == [False, False]


def test_blinks_are_those_of_a_plain_loop() -> None:
    """Any blinks and fixations, in any order, by the rule written out in a loop."""
    random = np.random.default_rng(3)
    for _ in range(200):
        bounds = np.sort(random.choice(np.arange(100), 16, replace=False)).astype(float)
        onset, end = bounds[::2], bounds[1::2]
        trial = np.sort(random.integers(0, 3, 8))
        began = random.integers(0, 100, 3).astype(float)
        ended = began + random.integers(1, 10, 3)
        wanted = np.zeros(8, dtype=bool)
        for first, last in zip(began, ended, strict=True):
            over = (onset < last) & (end > first)
            wanted |= over
            before, after = np.flatnonzero(end <= first), np.flatnonzero(onset >= last)
            if (
                not over.any()
                and before.size
                and after.size
                and trial[before[-1]] == trial[after[0]]
            ):
                wanted[[before[-1], after[0]]] = True
        mixed = random.permutation(8)
        found = touched_by_blinks(onset[mixed], end[mixed], trial[mixed], (began, ended))
        assert found.tolist() == wanted[mixed].tolist()


def test_samples_alone_need_a_way_to_find_fixations(tmp_path: Path) -> None:
    """Without events beside the recording, the study must describe detection."""
    data = Dataset(tmp_path)
    data.remove(f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz")
    assert (
        "_physio.tsv.gz: the recording has no events that say which samples are a fixation; "
        f"expected sub-P01{RUN}_physioevents.tsv.gz beside it"
    ) in data.refusal()


def test_fixations_are_found_in_samples_where_the_study_says_how(tmp_path: Path) -> None:
    """Two places of 50 ms each in a trial are two fixations, on lines of the samples."""
    data = Dataset(tmp_path)
    data.samples(
        (CLOCK_MS + ms, 100 if ms < 150 else 400 if ms < 225 else 700, 50, 3) for ms in range(500)
    )
    log, note = data.log(samples={"method": "dispersion", "dispersion_px": 20})
    assert log.x_px.tolist() == [100.0, 400.0, 700.0]
    assert log.onset_ms.tolist() == [CLOCK_MS + ms for ms in (100, 150, 250)]
    assert log.duration_ms.tolist() == [50.0, 50.0, 100.0]
    assert log.source_line.tolist() == [101, 151, 251]
    assert texts(log, "trial") == ["1", "1", "2"]
    assert note.shown == f"sub-P01/beh/sub-P01{RUN}_physio.tsv.gz"
    assert note.account.lines["samples outside every trial"].count == 300


def test_screen_of_the_sidecar_turns_positions_over(tmp_path: Path) -> None:
    """Positions from the bottom left are counted from the top left in the tables."""
    data = Dataset(tmp_path)
    screen = {**TASK["StimulusPresentation"], "ScreenOrigin": ["bottom", "left"]}
    data.sidecar("events.json", {"StimulusPresentation": screen})
    log, _ = data.log()
    assert log.y_px.tolist() == [480.0, 480.0]
