"""Damage to datasets of the open standard: sidecars, events of the task, files that are missing."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from random import Random
from typing import Any

from tests.fuzz.damage import LOST_TRIALS, Owes, whole
from tests.fuzz.logs import Files, LogKind, content_of, unzipped
from tests.simulator.dialects.tables import zipped

RECORDING, EVENTS = "task-orchard_physio.json", "task-orchard_physioevents.json"
TASK = "task-orchard_events.json"
Change = Callable[[dict[str, Any], Random], dict[str, Any]]


def to_sidecar(name: str, file: str, *, told_by: str = "") -> Callable[[Change], Change]:
    """Register damage to what a sidecar of the whole dataset says."""

    def register(change: Change) -> Change:
        @whole(name, told_by=told_by)
        def spoil(_: LogKind, files: Files, rng: Random) -> Files | None:
            if file not in files:
                return None
            values = change(json.loads(content_of(files, file)), rng)
            return {**files, file: json.dumps(values, indent=1).encode("utf-8")}

        assert spoil
        return change

    return register


def said(key: str, value: Any) -> Change:
    """A sidecar that says something else."""
    return lambda values, _: {**values, key: value}


def unsaid(key: str) -> Change:
    """A sidecar that does not say something."""
    return lambda values, _: {own: value for own, value in values.items() if own != key}


for _file, _kind, _keys in (
    (
        RECORDING,
        "recording",
        ("SamplingFrequency", "StartTime", "Columns", "SampleCoordinateSystem"),
    ),
    (EVENTS, "its events", ("Columns", "OnsetSource", "duration")),
):
    for _key in _keys:
        to_sidecar(f"{_kind}: {_key} is not said", _file)(unsaid(_key))
for _name, _file, _key, _values in (
    ("sampling frequency", RECORDING, "SamplingFrequency", (0, -100, "100 Hz", None, 0.1, 1e5)),
    ("start time", RECORDING, "StartTime", ("2.5", None, [2.5], True, {})),
    ("coordinate system", RECORDING, "SampleCoordinateSystem", ("eye-in-head", 3, None)),
    ("source of onsets", EVENTS, "OnsetSource", ("n/a", "clock", None, 7, "x_coordinate")),
    ("unit of places", RECORDING, "x_coordinate", ({"Units": "cubits"}, {"Units": 5}, {}, "px")),
    ("unit of durations", EVENTS, "duration", ({"Units": "fortnights"}, {"Units": "us"}, 3)),
    ("unit of onsets", EVENTS, "onset", ({"Units": "s"}, {"Units": "us"}, {"Units": "h"})),
    ("unit of time stamps", RECORDING, "timestamp", ({"Units": "s"}, {"Units": "us"})),
    ("names of columns", RECORDING, "Columns", ([], "timestamp", None, [1, 2, 3], ["timestamp"])),
    ("names of columns of events", EVENTS, "Columns", ([], None, ["onset", "duration"])),
):

    def _other(
        values: dict[str, Any], rng: Random, key: str = _key, others: tuple[Any, ...] = _values
    ) -> dict[str, Any]:
        return {**values, key: rng.choice(others)}

    to_sidecar(f"another {_name}", _file)(_other)


@to_sidecar("a name too many in a sidecar", EVENTS)
def name_too_many(values: dict[str, Any], rng: Random) -> dict[str, Any]:
    """More names than columns."""
    names = list(values["Columns"])
    names.insert(rng.randrange(len(names) + 1), "extra")
    return {**values, "Columns": names}


@to_sidecar("names in another order in a sidecar", EVENTS)
def names_in_other_order(values: dict[str, Any], _: Random) -> dict[str, Any]:
    """Onsets and durations change their names."""
    return {**values, "Columns": ["duration", "onset", "trial_type"]}


@to_sidecar(
    "x and y change their names in a sidecar", RECORDING, told_by="lie outside every region"
)
def x_and_y(values: dict[str, Any], _: Random) -> dict[str, Any]:
    """For all readers."""
    return {**values, "Columns": ["timestamp", "y_coordinate", "x_coordinate"]}


@to_sidecar("a start time of other seconds", RECORDING, told_by="outside every trial")
def other_start(values: dict[str, Any], rng: Random) -> dict[str, Any]:
    """All trials lie elsewhere in the recording."""
    return {**values, "StartTime": values["StartTime"] + rng.choice([-3, 3, 1000])}


@to_sidecar("a recording of another type", RECORDING, told_by=LOST_TRIALS)
def other_type(values: dict[str, Any], rng: Random) -> dict[str, Any]:
    """The dataset says that these are no recordings of eyes."""
    return {**values, "PhysioType": rng.choice(["generic", "Eyetrack", "eye-track"])}


@to_sidecar("a screen of another size", TASK)
def other_screen(values: dict[str, Any], _: Random) -> dict[str, Any]:
    """The study says something else."""
    about = {**values["StimulusPresentation"], "ScreenResolution": [1280, 1024]}
    return {**values, "StimulusPresentation": about}


@to_sidecar("a screen counted from elsewhere", TASK)
def other_origin(values: dict[str, Any], rng: Random) -> dict[str, Any]:
    """From another corner."""
    origin = rng.choice([["bottom", "left"], ["top", "right"], ["top"], "top-left", 3])
    about = {**values["StimulusPresentation"], "ScreenOrigin": origin}
    return {**values, "StimulusPresentation": about}


ToText = Callable[[str, Random], str | None]


def to_files(
    name: str, pattern: str, *, owes: Owes = "told", told_by: str = ""
) -> Callable[[ToText], ToText]:
    """Register damage to the text of some file that has a name like this; None removes it."""

    def register(change: ToText) -> ToText:
        @whole(name, owes=owes, told_by=told_by)
        def spoil(kind: LogKind, files: Files, rng: Random) -> Files | None:
            names = sorted(own for own in files if re.fullmatch(pattern, own))
            if not kind.name.startswith("bids") or not names:
                return None
            own = rng.choice(names)
            changed = change(unzipped(content_of(files, own)).decode("utf-8"), rng)
            if changed is None:
                return {other: content for other, content in files.items() if other != own}
            content = changed.encode("utf-8")
            return {**files, own: zipped(content) if own.endswith(".gz") else content}

        assert spoil
        return change

    return register


def gone(_: str, __: Random) -> str | None:
    """The file is missing."""
    return None


SIDECARS = r".*(_physio|_physioevents)\.json"
to_files("a sidecar is missing", SIDECARS)(gone)
to_files("the recording is missing", r".*_physio\.tsv\.gz", told_by=LOST_TRIALS)(gone)
to_files("the events of the recording are missing", r".*_physioevents\.tsv\.gz")(gone)
to_files("the events of the task are missing", r".*_events\.tsv")(gone)
to_files("the readers are missing", r"participants\.tsv")(gone)


@to_files("a sidecar that is no JSON", SIDECARS)
def no_json(text: str, rng: Random) -> str:
    """Broken in one of the usual ways."""
    return rng.choice(
        [text[: len(text) // 2], text.replace('"', "'"), text + "}", "", "[]", "null", "NaN", "7"]
    )


@to_files("a sidecar with a key twice", SIDECARS)
def key_twice(text: str, _: Random) -> str:
    """Which of the two counts, nobody says."""
    first = text.split("\n")[1]
    return text.replace(first, f"{first.rstrip(',')},\n{first}", 1)


@to_files("a sidecar nested without an end", SIDECARS)
def nested(_: str, __: Random) -> str:
    """No reader of such files goes so deep."""
    return '{"a":' * 100_000


@to_files("two sidecars for one file", r"sub-P01/beh/.*_physio\.json")
def two_sidecars(text: str, _: Random) -> str:
    """A sidecar that says something else for the same file."""
    return text.replace('"right"', '"both"').replace('"left"', '"both"')


@to_files("events of the task without rows", r".*_events\.tsv")
def no_rows(text: str, _: Random) -> str:
    """Only their header."""
    return text.split("\n", 1)[0] + "\n"


@to_files("events of the task without a header", r".*_events\.tsv")
def no_header(text: str, _: Random) -> str:
    """The first trial stands in its place."""
    return text.split("\n", 1)[1]


@to_files("a trial missing in the events of the task", r".*_events\.tsv", told_by=LOST_TRIALS)
def trial_missing(text: str, rng: Random) -> str:
    """Its fixations lie in no trial."""
    lines = text.split("\n")
    del lines[rng.randrange(1, len(lines) - 1)]
    return "\n".join(lines)


@to_files("trials that overlap in the events of the task", r".*_events\.tsv")
def overlapping(text: str, rng: Random) -> str:
    """One lasts until after the next has begun."""
    lines = text.split("\n")
    at = rng.randrange(1, len(lines) - 2)
    cells = lines[at].split("\t")
    lines[at] = "\t".join([cells[0], "60.0", *cells[2:]])
    return "\n".join(lines)


@to_files("events of the task in milliseconds", r".*_events\.tsv")
def in_milliseconds(text: str, _: Random) -> str:
    """The standard wants seconds."""
    head, *rows = text.rstrip("\n").split("\n")
    out = [head]
    for row in rows:
        onset, duration, *others = row.split("\t")
        out.append(
            "\t".join([f"{float(onset) * 1000:.0f}", f"{float(duration) * 1000:.0f}", *others])
        )
    return "\n".join(out) + "\n"


@to_files("a header in the recording", r".*_physio\.tsv\.gz")
def header_in_recording(text: str, _: Random) -> str:
    """In the standard the names stand in the sidecar."""
    return "timestamp\tx_coordinate\ty_coordinate\n" + text


@to_files("the recording cut", r".*_physio\.tsv\.gz")
def recording_cut(text: str, rng: Random) -> str:
    """The samples end in the midst of a trial."""
    return text[: rng.randrange(len(text) // 4, len(text) // 2)]


@to_files("time stamps that go back", r".*_physio\.tsv\.gz")
def stamps_back(text: str, rng: Random) -> str:
    """Two samples changed places."""
    lines = text.split("\n")
    at = rng.randrange(1, len(lines) - 3)
    lines[at], lines[at + 1] = lines[at + 1], lines[at]
    return "\n".join(lines)


@to_files("another word for a fixation", r".*_physioevents\.tsv\.gz")
def other_word(text: str, rng: Random) -> str:
    """In one row."""
    lines = text.split("\n")
    own = [n for n, line in enumerate(lines) if line.endswith("\tfixation")]
    at = rng.choice(own)
    word = rng.choice(["Fixation", "fixations", "fix", "FIXATION", "fixatoin"])
    lines[at] = lines[at].replace("fixation", word)
    return "\n".join(lines)
