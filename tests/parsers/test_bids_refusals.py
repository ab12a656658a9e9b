"""Damaged or contradictory recordings of the open standard (BIDS): refused, each with its place."""

from __future__ import annotations

import gzip
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.parsers.bids_making import CLOCK_MS, EVENTS, RUN, TASK, Dataset, told, zipped

SAMPLES = f"sub-P01/beh/sub-P01{RUN}_physio.tsv.gz"
EVENTS_FILE = f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz"
TASK_FILE = "sub-P01/beh/sub-P01_task-read_events.tsv"


def spoil_samples(row: int, *cells: object) -> Callable[[Dataset], object]:
    """Replace one row of the samples."""
    rows: list[tuple[object, ...]] = [(CLOCK_MS + ms, 5, 5, 3) for ms in range(500)]
    rows[row] = cells
    return lambda data: data.samples(rows)


def cut(data: Dataset) -> None:
    """Cut the samples short, as a broken transfer does."""
    path = data.folder / SAMPLES
    path.write_bytes(path.read_bytes()[:-200])


def not_zipped(data: Dataset) -> None:
    """Store the samples as they are under the name of a compressed file."""
    path = data.folder / SAMPLES
    path.write_bytes(gzip.decompress(path.read_bytes()))


DAMAGE: dict[str, tuple[Callable[[Dataset], object], str]] = {
    "samples cut short": (cut, f"{SAMPLES}: the gzip file is cut short"),
    "samples not compressed": (not_zipped, f"{SAMPLES}: the name ends in .gz but the file is not"),
    "samples empty": (
        lambda data: zipped(data.folder / SAMPLES, ""),
        f"{SAMPLES}: the file is empty",
    ),
    "a sample short of a column": (
        spoil_samples(7, CLOCK_MS + 7, 5, 5),
        (
            f"{SAMPLES}:8: the row has another number of fields than the sidecar names; "
            'found "3 fields", expected 4 fields separated by tabs: timestamp, x_coordinate, '
            "y_coordinate, pupil_size"
        ),
    ),
    "a blank line among samples": (
        spoil_samples(7, ""),
        f"{SAMPLES}:8: the row has another number of fields than the sidecar names",
    ),
    "a sample that is no number": (
        spoil_samples(7, CLOCK_MS + 7, "lost", 5, 3),
        f'{SAMPLES}:8: column "x_coordinate": this is no number; found "lost"',
    ),
    "a sample that is infinite": (
        spoil_samples(7, CLOCK_MS + 7, 5, "inf", 3),
        f'{SAMPLES}:8: column "y_coordinate": this is no number; found "inf"',
    ),
    "a sample that is not a number": (
        spoil_samples(7, CLOCK_MS + 7, 5, "nan", 3),
        f'{SAMPLES}:8: column "y_coordinate": this is no number; found "nan"',
    ),
    "a sample without a time": (
        spoil_samples(7, "n/a", 5, 5, 3),
        f'{SAMPLES}:8: column "timestamp": the sample has no time stamp',
    ),
    "time that goes back": (
        spoil_samples(7, CLOCK_MS + 1, 5, 5, 3),
        (
            f'{SAMPLES}:8: column "timestamp": the time stamp is before the one above it; '
            'found "7000001"'
        ),
    ),
    "samples with a header": (
        spoil_samples(0, "timestamp", "x_coordinate", "y_coordinate", "pupil_size"),
        f"{SAMPLES}:1: the file begins with a header",
    ),
    "events without a fixation": (
        lambda data: data.events([(CLOCK_MS, 5, "fix"), (CLOCK_MS, 5, "sacc")]),
        (
            f'{EVENTS_FILE}: column "trial_type": no event is a fixation; found "fix, sacc", '
            "expected fixation"
        ),
    ),
    "an event without an onset": (
        lambda data: data.events([("n/a", 5, "fixation")]),
        f'{EVENTS_FILE}:1: column "onset": the event has no onset; found "n/a"',
    ),
    "a fixation without a duration": (
        lambda data: data.events([(CLOCK_MS + 100, "n/a", "fixation")]),
        f'{EVENTS_FILE}:1: column "duration": the fixation has no duration; found "n/a"',
    ),
    "a fixation that lasts nothing": (
        lambda data: data.events([(CLOCK_MS + 100, 0, "fixation")]),
        f'{EVENTS_FILE}:1: column "duration": the fixation has no duration; found "0"',
    ),
    "a blink that is neither": (
        lambda data: data.events([(CLOCK_MS + 100, 5, "fixation", "maybe")]),
        (
            f'{EVENTS_FILE}:1: column "blink": this does not say whether there was a blink; '
            'found "maybe"'
        ),
    ),
    "events in another encoding": (
        lambda data: (data.folder / EVENTS_FILE).write_bytes(
            gzip.compress(f"{CLOCK_MS}\t5\tfixation\t0\tcafé\n".encode("latin-1"))
        ),
        (
            f'{EVENTS_FILE}:1: the text is not valid utf-8; found "byte 0xe9", expected UTF-8\n'
            "    fix: save the file as UTF-8, as the standard has it"
        ),
    ),
    "a saccade whose duration is no number": (
        lambda data: data.events([(CLOCK_MS, "5o", "saccade"), (CLOCK_MS, 5, "fixation")]),
        f'{EVENTS_FILE}:1: column "duration": this is no number; found "5o"',
    ),
    "an event of an unknown type": (
        lambda data: data.events([(CLOCK_MS, 5, "fixation"), (CLOCK_MS, 5, "Fixation")]),
        (
            f'{EVENTS_FILE}:2: column "trial_type": nothing says what this type of event is; '
            'found "Fixation", expected blink, fixation, saccade, or n/a for a message'
        ),
    ),
    "an event whose type was lost": (
        lambda data: data.events([(CLOCK_MS, 5, "fixation"), (CLOCK_MS, 5, "n/a")]),
        (
            f'{EVENTS_FILE}:2: column "trial_type": the event lasts for some time, and has no '
            'type; found "n/a"'
        ),
    ),
    "a fixation that outlasts the recording": (
        lambda data: data.events([(CLOCK_MS + 100, 40_000, "fixation")]),
        (
            f'{EVENTS_FILE}:1: column "duration": the fixation lasts beyond the end of the '
            'recording; found "40000", expected an end by 7000499 ms'
        ),
    ),
    "events with another number of columns": (
        lambda data: zipped(data.folder / EVENTS_FILE, f"{CLOCK_MS}\t5\tfixation\n"),
        f"{EVENTS_FILE}:1: the row has another number of fields than the sidecar names",
    ),
    "events with an open quote mark": (
        lambda data: data.events(
            [(CLOCK_MS + 100, 5, "fixation", 0, '"open'), (CLOCK_MS + 120, 5, "fixation")]
        ),
        f"{EVENTS_FILE}",
    ),
    "no column of types": (
        lambda data: data.sidecar("physioevents.json", told(EVENTS, Columns=["onset", "duration"])),
        'physioevents.json:2: Columns: there is no column "trial_type"',
    ),
    "no events of the task": (
        lambda data: data.remove(TASK_FILE),
        f"{EVENTS_FILE}: no events of the task say which trials there were",
    ),
    "two files of events of the task": (
        lambda data: data.task([(0, 1, 1, "pear")], entities=""),
        f"{TASK_FILE}: two files of events of the task apply to",
    ),
    "events of the task without a row": (
        lambda data: data.task([]),
        f"{TASK_FILE}:1: the events have a header and no row",
    ),
    "a trial without a duration": (
        lambda data: data.task([(0.1, "n/a", 1, "pear")]),
        f'{TASK_FILE}:2: column "duration": the trial has no duration; found "n/a"',
    ),
    "a trial that lasts nothing": (
        lambda data: data.task([(0.1, 0, 1, "pear")]),
        f'{TASK_FILE}:2: column "duration": the trial has no duration; found "0"',
    ),
    "trials that overlap": (
        lambda data: data.task([(0.1, 0.1, 1, "pear"), (0.15, 0.1, 2, "plum")]),
        (
            f"{TASK_FILE}:3: the trial begins before the one before it is over; "
            'found "50 ms too early"'
        ),
    ),
    "a trial without a name": (
        lambda data: data.task([(0.1, 0.1, "n/a", "pear")]),
        f'{TASK_FILE}:2: column "trial": the trial is missing; found "n/a"',
    ),
    "a trial without a text": (
        lambda data: data.task([(0.1, 0.1, 1, "n/a")]),
        f'{TASK_FILE}:2: column "item": the item is missing; found "n/a"',
    ),
    "no column of the trial": (
        lambda data: data.task([(0.1, 0.1, 1, "pear")], ("onset", "duration", "trail", "item")),
        (
            f'{TASK_FILE}:1: there is no column "trial"; found "onset, duration, trail, item", '
            'expected a column "trial" of the events of the task\n    fix: did you mean "trail"?'
        ),
    ),
    "no sidecar of the events": (
        lambda data: data.remove("physioevents.json"),
        f"{EVENTS_FILE}: no sidecar describes this file",
    ),
}


@pytest.mark.parametrize("damage", DAMAGE)
def test_damage_is_refused_with_its_place(tmp_path: Path, damage: str) -> None:
    """Nothing is guessed: file, line and what was expected are said."""
    spoil, said = DAMAGE[damage]
    data = Dataset(tmp_path)
    spoil(data)
    assert data.refusal().startswith(said)


def test_rows_that_are_trials_must_occur(tmp_path: Path) -> None:
    """A value of [logs.bids] trials that no row has is an error."""
    said = Dataset(tmp_path).refusal(bids={"trials": {"item": ["cherry"]}})
    assert 'column "item": no row is a trial by [logs.bids] trials; found "pear, plum"' in said


def test_column_that_tells_trials_must_be_there(tmp_path: Path) -> None:
    """A column of [logs.bids] trials that the events lack is an error."""
    said = Dataset(tmp_path).refusal(bids={"trials": {"items": ["pear"]}})
    assert 'there is no column "items", by which the study tells trials' in said
    assert 'did you mean "item"?' in said


@pytest.mark.parametrize("name", ["reader1_physio.tsv.gz", "task-read_physio.tsv.gz"])
def test_name_without_a_reader_is_refused(tmp_path: Path, name: str) -> None:
    """The name says whose the recording is."""
    data = Dataset(tmp_path)
    path = (data.folder / SAMPLES).rename(data.folder / "sub-P01/beh" / name)
    assert "the file's name is none of the standard" in data.refusal(path)


def test_name_in_the_folder_of_another_reader_is_refused(tmp_path: Path) -> None:
    """Folder and name must be of one reader."""
    data = Dataset(tmp_path)
    (data.folder / "sub-P01").rename(data.folder / "sub-P02")
    path = data.folder / SAMPLES.replace("sub-P01/", "sub-P02/", 1)
    said = data.refusal(path)
    assert "the file's name is not of the folder that it lies in" in said
    assert 'found "sub-P02", expected sub-P01 in both' in said


def test_blank_lines_at_the_end_are_counted(tmp_path: Path) -> None:
    """Lines below the last row mean nothing, and are accounted for."""
    data = Dataset(tmp_path)
    cells = (CLOCK_MS + 100, 40, "fixation", 0, "n/a")
    zipped(data.folder / EVENTS_FILE, "\t".join(map(str, cells)) + "\n\n\n")
    _, note = data.log()
    assert note.account.lines["blank lines"].count == 2
    assert note.account.total == 3


SCREEN = TASK["StimulusPresentation"]
STATED = {"width_px": 1000, "height_px": 500}


@pytest.mark.parametrize(
    ("screen", "said"),
    [
        ({"width_px": 1024, "height_px": 500}, "expected width_px = 1024 as in [screen]"),
        ({**STATED, "width_cm": 52.0}, "expected width_cm = 52.0 as in [screen]"),
        ({**STATED, "distance_cm": 70.0}, "expected distance_cm = 70.0 as in [screen]"),
        ({**STATED, "origin": "centre"}, "expected origin = centre as in [screen]"),
        ({**STATED, "y_axis": "up", "origin": "top-left"}, "expected y_axis = up as in [screen]"),
    ],
)
def test_screen_of_the_study_must_be_that_of_the_sidecar(
    tmp_path: Path, screen: dict[str, object], said: str
) -> None:
    """Where both say it, study and sidecar say the same, to a millimetre or a centimetre."""
    text = Dataset(tmp_path).refusal(screen=screen)
    assert "events.json:2: StimulusPresentation." in text
    assert "the sidecar and the study say different things of the screen" in text
    assert said in text


@pytest.mark.parametrize("screen", [STATED, {**STATED, "width_cm": 50.05, "distance_cm": 60.5}])
def test_screen_that_agrees_is_taken(tmp_path: Path, screen: dict[str, object]) -> None:
    """Rounding is no contradiction."""
    log, _ = Dataset(tmp_path).log(screen=screen)
    assert log.y_px.tolist() == [20.0, 20.0]


def test_study_says_the_screen_where_the_sidecar_is_silent(tmp_path: Path) -> None:
    """An older dataset without StimulusPresentation is read by the study's own [screen]."""
    data = Dataset(tmp_path)
    data.remove("events.json")
    log, _ = data.log(screen={**STATED, "origin": "bottom-left", "y_axis": "up"})
    assert log.y_px.tolist() == [480.0, 480.0]


def test_screen_that_nobody_describes_is_asked_for(tmp_path: Path) -> None:
    """Where positions are counted from is never guessed."""
    data = Dataset(tmp_path)
    data.remove("events.json")
    assert "ScreenOrigin: nothing says where positions are counted from" in data.refusal()


@pytest.mark.parametrize(
    ("field", "value", "said"),
    [
        ("ScreenOrigin", ["top", "right"], "this origin is not understood"),
        ("ScreenOrigin", "top-left", "this origin is not understood"),
        ("ScreenOrigin", ["center", "center"], "nothing says which way y grows from the middle"),
        ("ScreenResolution", [1000], "this is no extent of a screen"),
        ("ScreenSize", [0, 1], "this is no extent of a screen"),
        ("ScreenDistance", "far", "this is no distance"),
    ],
)
def test_screen_that_is_not_understood_is_refused(
    tmp_path: Path, field: str, value: object, said: str
) -> None:
    """A field of StimulusPresentation with another value stops the build."""
    data = Dataset(tmp_path)
    data.sidecar("events.json", {"StimulusPresentation": {**SCREEN, field: value}})
    assert said in data.refusal()


@pytest.mark.parametrize(
    ("field", "value", "said"),
    [
        ("ScreenOrigin", ["top", "left"], "degrees are counted from the middle of the screen"),
        ("ScreenSize", "n/a", "nothing says width_cm of the screen"),
        ("ScreenDistance", [0.1, 0.1, 0.6], "nothing says distance_cm of the screen"),
        ("ScreenSize", [0.5, 0.5], "the pixels of the screen are not square"),
    ],
)
def test_degrees_need_a_whole_screen(tmp_path: Path, field: str, value: object, said: str) -> None:
    """Degrees become pixels by size, distance and middle of the screen only."""
    data = Dataset(tmp_path)
    degrees = {"Units": "deg"}
    data.sidecar(
        f"sub-P01/sub-P01{RUN}_physio.json", {"x_coordinate": degrees, "y_coordinate": degrees}
    )
    screen = {**SCREEN, "ScreenOrigin": ["center", "center"], field: value}
    data.sidecar("events.json", {"StimulusPresentation": screen})
    assert said in data.refusal(screen={**STATED, "y_axis": "up"})
