"""The draft for recordings of the open standard (BIDS)."""

from __future__ import annotations

import os
from collections import Counter
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from etl.drafting.beginning import begun
from etl.drafting.columns import Pooled, PooledColumn
from etl.drafting.heads import read_head
from etl.drafting.made import Made
from etl.drafting.meanings import NAMED, Understanding, shortened
from etl.drafting.place_text import write_centred_screen, write_regions
from etl.drafting.table_heads import as_table
from etl.drafting.table_text import write_eyes, write_facts, write_rest, write_samples
from etl.drafting.toml_text import StudyText
from etl.drafting.vocabulary import likeness
from etl.errors import Findings
from etl.parsers.bids_log import is_recording
from etl.parsers.bids_names import Place, events_beside, subject_folder
from etl.parsers.bids_sidecars import read_sidecar
from etl.parsers.bids_trials import find_task_events

#: Columns of the events of a task that the standard itself defines (BIDS 1.11, "Task events").
_STANDARD = frozenset(
    ("onset", "duration", "response_time", "HED", "stim_file", "channel", "sample")
)
_MOST_BYTES = 200_000
_MOST_TASKS = 60


def of_bids(paths: Sequence[Path], target: Path | None, findings: Findings) -> Made | None:
    """Draft a study file for recordings of the open standard.

    Parameters
    ----------
    paths : sequence of Path
        The recordings, ``…_physio.tsv.gz``; those of other things than gaze are passed over.
    target : Path or None
        Where the study file goes.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Made or None
        None where a problem was recorded.
    """
    recordings = [path for path in paths if is_recording(path)]
    if not recordings:
        findings.error(
            "no sidecar says that this is a recording of gaze",
            path=paths[0].as_posix(),
            expected='a sidecar, here or in a folder above, with "PhysioType": "eyetrack"',
            fix="add it, or name other recordings",
        )
        return None
    found = Understanding()
    found.eye_values = _eyes(recordings, findings)
    trials = _pooled_events(recordings, findings)
    if findings.failed:
        return None
    without = [path for path in recordings if not events_beside(path).is_file()]
    if len(without) == len(recordings):
        found.samples = (
            f"no recording has events beside it ({events_beside(recordings[0]).name}), so "
            "fixations are found in the samples"
        )
    out = begun(list(paths), target)
    told = "the names and sidecars of the recordings are those of the standard"
    out.guess("kind", "bids", told)
    item = _write_columns(out, trials, found)
    write_eyes(out, {}, found.eye_values, "recording")
    write_samples(out, found)
    subject = subject_folder(recordings[0])
    readers = None if subject is None else subject.parent / "participants.tsv"
    found.facts = {name: values for name, values in found.facts.items() if name != item}
    write_facts(
        out,
        found,
        item_is_known=item is not None,
        readers=_relative(readers, target) if readers is not None and readers.is_file() else "",
    )
    _write_screen(out, recordings[0], findings)
    write_regions(out, found, None)
    write_rest(out)
    eye = next(iter(found.eye_values), "")
    return Made(out, tuple(recordings), eye)


def _relative(path: Path, target: Path | None) -> str:
    """A file as seen from the study file."""
    folder = Path() if target is None else target.parent
    return Path(os.path.relpath(path, folder.absolute())).as_posix()


def _eyes(recordings: Sequence[Path], findings: Findings) -> dict[str, int]:
    """The eyes of the recordings, where some run has more than one."""
    eyes: Counter[str] = Counter()
    folders: Counter[Path] = Counter()
    for path in recordings:
        sidecar = read_sidecar(path, Place(path, path.as_posix()), findings)
        if sidecar is None:
            continue
        eyes[str(sidecar.values.get("RecordedEye", ""))] += 1
        folders[path.with_name(path.name.partition("_recording-")[0])] += 1
    both = any(count > 1 for count in folders.values())
    return dict(eyes) if both and len(eyes) > 1 else {}


def _pooled_events(recordings: Sequence[Path], findings: Findings) -> Pooled | None:
    """The rows of the events of the tasks."""
    tables = {}
    for path in recordings[:_MOST_TASKS]:
        events = find_task_events(path, Place(path, path.as_posix()), findings)
        if events is None or events in tables:
            continue
        head = read_head(events, events.as_posix(), _MOST_BYTES, findings)
        table = None if head is None else as_table(head, findings)
        if table is not None:
            tables[events] = table
    if not tables:
        return None
    header = next(iter(tables.values())).cells.header
    alike = [(path.name, t.cells) for path, t in tables.items() if t.cells.header == header]
    return Pooled.of(alike)


def _write_columns(out: StudyText, trials: Pooled | None, found: Understanding) -> str | None:
    """Which columns of the events name the trial and the text; gives that of the text."""
    out.begin(
        "logs.columns",
        "Who read, when and where is known by the standard. What is left are columns of the task's "
        "events (…_events.tsv), which say which trials there were.",
    )
    columns = {} if trials is None else trials.columns
    others = [name for name in columns if name not in _STANDARD]
    assert trials is not None or not columns  # noqa: S101
    named = [
        name for name in others if trials is not None and _names_rows(columns[name], trials.file)
    ]
    by_name = [name for name in named if likeness(name, "trial") >= NAMED]
    counting = [name for name in named if columns[name].numeric and columns[name].whole]
    trial = next(iter(by_name), counting[0] if len(counting) == 1 else None)
    if trial is None:
        hint = f" They have the columns {shortened(others)}" if others else ""
        out.ask("trial", f"which column of the task's events names the trial?{hint}")
    else:
        told = "no two rows of the events of one reader have the same value"
        out.guess("trial", trial, told)
    items = [n for n in others if n != trial and likeness(n, "item") >= NAMED]
    item = max(items, key=lambda n: likeness(n, "item"), default=None)
    if item is not None:
        told = f"the header says text; it holds {shortened(columns[item].distinct, 4)}"
        out.guess("item", item, told)
    kinds = columns.get("trial_type")
    if kinds is not None and len(kinds.distinct) > 1:
        out.example_table("logs.bids", "If not every row of the events is a trial:")
        out.example("trials", {"trial_type": [kinds.distinct[0]]}, "the rows that are")
    found.facts = {name: columns[name].distinct for name in others if name != trial}
    return item


def _names_rows(column: PooledColumn, file: np.ndarray) -> bool:
    """Whether each row of a log has a value of its own."""
    if column.absent:
        return False
    keys = file.astype(np.int64) * (len(column.coded.values) + 1) + column.coded.codes
    return len(np.unique(keys)) == len(keys)


def _write_screen(out: StudyText, recording: Path, findings: Findings) -> None:
    """The screen, of which the sidecars tell all but which way y grows from its middle."""
    place = Place(recording, recording.as_posix())
    gaze = read_sidecar(recording, place, findings)
    events = find_task_events(recording, place, findings)
    task = None if events is None else read_sidecar(events, place, Findings())
    said = {} if task is None else task.values.get("StimulusPresentation", {})
    column = {} if gaze is None else gaze.values.get("x_coordinate", {})
    unit = column.get("Units", "") if isinstance(column, dict) else ""
    in_degrees = str(unit).startswith("deg")
    origin = said.get("ScreenOrigin") if isinstance(said, dict) else None
    if not in_degrees and origin != ["center", "center"]:
        out.section("The screen")
        told = "The sidecars of the task's events describe it; what you write here must agree."
        out.example_table("screen", told)
        out.example("width_px", 1920)
        out.example("height_px", 1080)
        return
    known: dict[str, tuple[float, str]] = {}
    for number, key in enumerate(("width_px", "height_px")):
        size = _part(said, "ScreenResolution", number)
        if size is not None:
            known[key] = (int(size), "ScreenResolution in the sidecar of the task's events")
    for key, name in (("width_cm", "ScreenSize"), ("distance_cm", "ScreenDistance")):
        metres = _part(said, name, 0)
        if metres is not None:
            known[key] = (round(100 * metres, 2), f"{name} there, in metres")
    needed = ("width_px", "height_px", *(("width_cm", "distance_cm") if in_degrees else ()))
    why = "the sidecars count positions from the middle of the screen"
    write_centred_screen(out, needed, known, why)


def _part(said: object, key: str, place: int) -> float | None:
    """A number of a sidecar, alone or in a list."""
    value = said.get(key) if isinstance(said, dict) else None
    if isinstance(value, list):
        value = value[place] if place < len(value) else None
    known = isinstance(value, (int, float)) and not isinstance(value, bool) and value > 0
    return float(value) if known and value is not None else None
