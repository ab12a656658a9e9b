"""The small orchard study as a dataset of the open standard (BIDS 1.11): recordings of gaze."""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from itertools import pairwise
from pathlib import Path
from typing import Any

from tests.simulator.dialects.recorded import Fixated, ReadTrial, RecordedStudy, in_unit
from tests.simulator.dialects.sampled import samples_of_trial
from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.dialects.tables import DISTANCE_CM, WIDTH_CM, WIDTH_PX, put_documents, zipped
from tests.simulator.writing import put

#: When the first sample was taken, in seconds since the start of the acquisition.
START_S = 2.5
#: What stands for no value (BIDS 1.11, Common principles, "Tabular files").
MISSING = "n/a"
_EYES = {"L": "left", "R": "right"}
#: A sample: time, x, y.
Sampled = tuple[int, float | None, float | None]


@dataclass(frozen=True, slots=True)
class BidsDialect:
    """How a dataset is written.

    ``interval_ms`` is the time from a sample to the next. ``rows`` lets onsets count rows of the
    recording in place of time stamps; ``unit`` is that of time stamps and events; ``degrees``
    gives places as visual angles from the middle. ``inherited`` says things once for the whole
    dataset, not beside each file. With ``from_samples`` there are no events of fixations.
    ``facts`` are columns of the events of the task, and there is no trial list.
    """

    interval_ms: int = 10
    rows: bool = False
    unit: str = "ms"
    degrees: bool = False
    inherited: bool = True
    both_eyes: bool = False
    from_samples: bool = False
    facts: bool = False
    study: Callable[[str], StudyFile] = StudyFile


FROM_EVENTS = partial(StudyFile, trials="", tables={"participants": "participants.tsv"})
STANDARD = partial(StudyFile, tables={"participants": "participants.tsv"})

BIDS_DIALECTS: dict[str, BidsDialect] = {
    "bids": BidsDialect(facts=True, study=FROM_EVENTS),
    "bids, a trial list": BidsDialect(study=STANDARD),
    "bids, sidecars beside": BidsDialect(inherited=False, study=STANDARD),
    "bids, onsets by row": BidsDialect(interval_ms=1, rows=True, study=STANDARD),
    "bids, seconds": BidsDialect(unit="s", study=STANDARD),
    "bids, degrees": BidsDialect(
        degrees=True, study=partial(STANDARD, screen={"origin": '"centre"'})
    ),
    "bids, both eyes": BidsDialect(both_eyes=True, study=STANDARD),
    "bids, from samples": BidsDialect(
        interval_ms=1, from_samples=True, study=partial(STANDARD, blinks=False)
    ),
}


def write_bids(study: RecordedStudy, folder: Path, dialect: BidsDialect) -> Path:
    """Write a study as a dataset.

    Parameters
    ----------
    study : RecordedStudy
        What was recorded.
    folder : Path
        Made where it is missing.
    dialect : BidsDialect
        How.

    Returns
    -------
    Path
        The study file.
    """
    put_documents(study, folder)
    (folder / "participants.csv").unlink()
    header, *people = study.reader_rows()
    people = [[f"sub-{who}", *rest] for who, *rest in people]
    put(folder / "participants.tsv", rows_of([["participant_id", *header[1:]], *people]))
    about = {"Name": "Orchard notes", "BIDSVersion": "1.11.0"}
    put(folder / "dataset_description.json", in_json(about))
    if dialect.facts:
        (folder / "trial_list.csv").unlink()
    for reader in study.readers:
        eyes = [reader.eye]
        if dialect.both_eyes:
            eyes.append("L" if reader.eye == "R" else "R")
        name = f"sub-{reader.participant}/beh/sub-{reader.participant}_task-orchard"
        trials = study.of(reader.participant)
        for number, eye in enumerate(sorted(eyes), start=1):
            own = [(t, _fixations(t, other=eye != reader.eye)) for t in trials]
            counts = eye == reader.eye
            _put_recording(folder, f"{name}_recording-eye{number}", (eye, counts), own, dialect)
        first = samples_of_reader([(t, t.fixations) for t in trials], dialect)[0][0]
        put(folder / f"{name}_events.tsv", task_events(trials, first, dialect))
    put(folder / "task-orchard_events.json", in_json({"StimulusPresentation": screen(dialect)}))
    path = folder / "study.toml"
    put(path, dialect.study(logs_table(study, dialect)).text().encode("utf-8"))
    return path


def logs_table(study: RecordedStudy, dialect: BidsDialect) -> str:
    """The tables ``[logs]`` and below of a study file."""
    lines = ["[logs]", 'files = ["sub-*/beh/*_physio.tsv.gz"]', 'kind = "bids"', ""]
    lines += ["[logs.columns]", 'trial = "trial_no"', 'item = "sentence"']
    if dialect.both_eyes:
        left = [f'{r.participant} = "left"' for r in study.readers if r.eye == "L"]
        lines += ["", "[logs.eye]", 'use = "right"', f"readers = {{ {', '.join(left)} }}"]
    if dialect.from_samples:
        lines += ["", "[logs.samples]", 'method = "engbert_kliegl"', "shortest_fixation_ms = 30"]
    return "\n".join(lines) + "\n"


def _fixations(trial: ReadTrial, *, other: bool) -> tuple[Fixated, ...]:
    """The fixations of the eye that counts, or of the other one."""
    if not other:
        return trial.fixations
    return tuple(fixation.by_other_eye() for fixation in trial.fixations)


def samples_of_reader(
    trials: Sequence[tuple[ReadTrial, tuple[Fixated, ...]]], dialect: BidsDialect
) -> list[Sampled]:
    """The samples of all trials of a reader."""
    samples: list[Sampled] = []
    for _, fixations in trials:
        if dialect.from_samples:
            samples += samples_of_trial(fixations, dialect.interval_ms)
            continue
        begin, end = fixations[0].onset_ms, fixations[-1].end_ms
        own = iter(fixations)
        at = next(own)
        for time in range(begin, end, dialect.interval_ms):
            while time >= at.end_ms:
                at = next(own)
            inside = at.onset_ms <= time
            samples.append((time, at.x_px if inside else None, at.y_px if inside else None))
    return samples


def _put_recording(
    folder: Path,
    name: str,
    whose: tuple[str, bool],
    trials: Sequence[tuple[ReadTrial, tuple[Fixated, ...]]],
    dialect: BidsDialect,
) -> None:
    """Write the recording of one eye and its events; ``whose``: the eye, and if it counts."""
    eye, counts = whose
    samples = samples_of_reader(trials, dialect)
    put(folder / f"{name}_physio.tsv.gz", zipped(rows_of(_sample_rows(samples, dialect))))
    unit = {"Units": dialect.unit}
    place = {"Units": "deg" if dialect.degrees else "pixel"}
    common: dict[str, Any] = {
        "PhysioType": "eyetrack",
        "SamplingFrequency": 1000 / dialect.interval_ms,
        "StartTime": START_S,
        "Columns": ["timestamp", "x_coordinate", "y_coordinate"],
        "SampleCoordinateSystem": "gaze-on-screen",
        "timestamp": unit,
        "x_coordinate": place,
        "y_coordinate": place,
    }
    events = {
        "Columns": ["onset", "duration", "trial_type"],
        "OnsetSource": MISSING if dialect.rows else "timestamp",
        "duration": unit,
    }
    if not dialect.rows:
        events["onset"] = unit
    if dialect.inherited:
        put(folder / "task-orchard_physio.json", in_json(common))
        put(folder / f"{name}_physio.json", in_json({"RecordedEye": _EYES[eye]}))
    else:
        put(folder / f"{name}_physio.json", in_json({**common, "RecordedEye": _EYES[eye]}))
    if dialect.from_samples:
        return
    place_of = {time: row for row, (time, _, _) in enumerate(samples)}
    rows = []
    for kind, onset, duration in sorted(_events(trials, blinks=counts), key=lambda one: one[1]):
        # A blink may begin where nothing was sampled any more, and then is not told of by row.
        begins = place_of.get(onset, MISSING) if dialect.rows else in_unit(onset, dialect.unit)
        rows.append([begins, in_unit(duration, dialect.unit), kind])
    put(folder / f"{name}_physioevents.tsv.gz", zipped(rows_of(rows)))
    if dialect.inherited:
        put(folder / "task-orchard_physioevents.json", in_json(events))
    else:
        put(folder / f"{name}_physioevents.json", in_json(events))


def _events(
    trials: Sequence[tuple[ReadTrial, tuple[Fixated, ...]]], *, blinks: bool
) -> Iterator[tuple[str, int, int]]:
    """Fixations, the saccades between them, and blinks: what, when, how long."""
    for trial, fixations in trials:
        for f in fixations:
            yield "fixation", f.onset_ms, f.duration_ms
        for one, following in pairwise(fixations):
            gap = following.onset_ms - one.end_ms
            if gap > 0:
                yield "saccade", one.end_ms, gap
        for onset, end in trial.blinks if blinks else ():
            yield "blink", onset, end - onset


def _sample_rows(samples: Sequence[Sampled], dialect: BidsDialect) -> list[list[str]]:
    """Samples as cells."""
    return [
        [in_unit(time, dialect.unit), _place(x, 960, dialect), _place(y, 540, dialect)]
        for time, x, y in samples
    ]


def _place(px: float | None, middle: int, dialect: BidsDialect) -> str:
    """A position in the dataset's unit."""
    if px is None:
        return MISSING
    if not dialect.degrees:
        return f"{px:.3f}".rstrip("0").rstrip(".")
    cm = (px - middle) * WIDTH_CM / WIDTH_PX
    return f"{math.degrees(math.atan2(cm, DISTANCE_CM)):.6f}"


def task_events(trials: Sequence[ReadTrial], first_ms: int, dialect: BidsDialect) -> bytes:
    """The events of the task: a row a trial, in seconds since the start of the acquisition."""
    header = ["onset", "duration", "trial_no", "sentence"]
    if dialect.facts:
        header += ["cue", "fit", "answer_ok", "text_on", "text_off"]
    rows = [header]
    for t in trials:
        begin = min(t.fixations[0].onset_ms, t.text_on_ms) - 40
        end = max(t.fixations[-1].end_ms, t.text_off_ms) + 40
        onset_s = START_S + (begin - first_ms) / 1000
        row = [f"{onset_s:.3f}", f"{(end - begin) / 1000:.3f}", str(t.trial), t.item]
        if dialect.facts:
            row += [t.cue, t.fit, str(t.answer_ok), str(t.text_on_ms), str(t.text_off_ms)]
        rows.append(row)
    return rows_of(rows)


def screen(dialect: BidsDialect) -> dict[str, Any]:
    """The screen, as the standard has it."""
    origin = ["center", "center"] if dialect.degrees else ["top", "left"]
    return {
        "ScreenDistance": 0.65,
        "ScreenOrigin": origin,
        "ScreenResolution": [1920, 1080],
        "ScreenSize": [0.53, 0.298],
    }


def rows_of(rows: Sequence[Sequence[object]]) -> bytes:
    """Rows as text separated by tabs."""
    return "".join("\t".join(map(str, row)) + "\n" for row in rows).encode("utf-8")


def in_json(values: dict[str, Any]) -> bytes:
    """A sidecar, a key a line."""
    return (json.dumps(values, indent=2, ensure_ascii=False) + "\n").encode("utf-8")
