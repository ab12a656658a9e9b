"""Small datasets of the open standard (BIDS), and studies that read them."""

from __future__ import annotations

import gzip
import json
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.parsers import CanonicalLog, counted_file, reader_for
from etl.parsers.canonical import LogNote
from etl.study import Study

#: The sidecar of every recording, in the dataset's own folder.
RECORDING: Mapping[str, Any] = {
    "PhysioType": "eyetrack",
    "SamplingFrequency": 1000,
    "StartTime": 0,
    "RecordedEye": "right",
    "SampleCoordinateSystem": "gaze-on-screen",
    "Columns": ["timestamp", "x_coordinate", "y_coordinate", "pupil_size"],
    "timestamp": {"Units": "ms"},
    "x_coordinate": {"Units": "pixel"},
    "y_coordinate": {"Units": "pixel"},
}
#: That of the events beside each recording.
EVENTS: Mapping[str, Any] = {
    "Columns": ["onset", "duration", "trial_type", "blink", "message"],
    "OnsetSource": "timestamp",
    "duration": {"Units": "ms"},
}
#: That of the events of the task.
TASK: Mapping[str, Any] = {
    "StimulusPresentation": {
        "ScreenDistance": 0.6,
        "ScreenOrigin": ["top", "left"],
        "ScreenResolution": [1000, 500],
        "ScreenSize": [0.5, 0.25],
    }
}
#: When the clock of the recorder began.
CLOCK_MS = 7_000_000


def told(base: Mapping[str, Any], **changes: Any) -> dict[str, Any]:
    """A sidecar with some keys changed; None takes one away."""
    whole = {**base, **changes}
    return {key: value for key, value in whole.items() if value is not None}


class Dataset:
    """A dataset with one recording: two trials of 100 ms each, 50 ms apart, from 0.1 s on."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.sidecar("physio.json", RECORDING)
        self.sidecar("physioevents.json", EVENTS)
        self.sidecar("events.json", TASK)
        self.samples(
            (CLOCK_MS + ms, 10.0 + ms // 50, 20.0 if ms % 50 else "n/a", 3) for ms in range(500)
        )
        self.events([(CLOCK_MS + 100, 40, "fixation"), (CLOCK_MS + 250, 30, "fixation")])
        self.task([(0.1, 0.1, 1, "pear"), (0.25, 0.1, 2, "plum")])

    def path(self, suffix: str, sub: str = "P01", entities: str = "_task-read") -> Path:
        """A file of a reader."""
        folder = self.folder / f"sub-{sub}" / "beh"
        folder.mkdir(parents=True, exist_ok=True)
        return folder / f"sub-{sub}{entities}_{suffix}"

    def sidecar(self, name: str, values: Mapping[str, Any] | str) -> Path:
        """Write a sidecar anywhere in the dataset."""
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        text = values if isinstance(values, str) else json.dumps(values, indent=1)
        path.write_text(text, encoding="utf-8", newline="\n")
        return path

    def samples(self, rows: Iterable[Sequence[Any]], **where: str) -> Path:
        """Write the samples of a recording."""
        return zipped(self.path("physio.tsv.gz", **{"entities": RUN, **where}), rows)

    def events(self, rows: Iterable[Sequence[Any]], **where: str) -> Path:
        """Write the events of a recording: onset, duration, trial_type, and further cells."""
        filled = [(*row, *["n/a"] * (5 - len(row))) for row in rows]
        return zipped(self.path("physioevents.tsv.gz", **{"entities": RUN, **where}), filled)

    def task(
        self,
        rows: Iterable[Sequence[Any]],
        header: Sequence[str] = ("onset", "duration", "trial", "item"),
        **where: str,
    ) -> Path:
        """Write the events of the task."""
        path = self.path("events.tsv", **where)
        path.write_text(tabbed([header, *rows]), encoding="utf-8", newline="\n")
        return path

    def remove(self, name: str) -> None:
        """Take a file away."""
        (self.folder / name).unlink()

    def read(
        self, path: Path | None = None, **logs: Any
    ) -> tuple[tuple[CanonicalLog, LogNote] | None, Findings]:
        """Read a recording, by a study with some keys changed."""
        path = path or self.path("physio.tsv.gz", entities=RUN)
        study = study_of(**logs)
        findings = Findings()
        shown = counted_file(study.logs, path).relative_to(self.folder).as_posix()
        facts = tuple(logs.get("facts", ()))
        return reader_for(study.logs, study.screen, facts).read(path, shown, findings), findings

    def log(self, path: Path | None = None, **logs: Any) -> tuple[CanonicalLog, LogNote]:
        """Read a recording in which nothing is wrong."""
        read, findings = self.read(path, **logs)
        assert read is not None, findings.text()
        assert read[1].account.balances(), read[1].account
        return read

    def refusal(self, path: Path | None = None, **logs: Any) -> str:
        """What is said of a recording in which something is wrong."""
        read, findings = self.read(path, **logs)
        assert read is None
        assert findings.failed
        return findings.text()


#: The entities of the one recording.
RUN = "_task-read_recording-eye1"


def study_of(**logs: Any) -> Study:
    """A study of the dataset; ``screen`` and ``columns`` apart, the keys are those of [logs]."""
    screen, columns = logs.pop("screen", None), logs.pop("columns", {})
    logs.pop("facts", None)
    return Study.model_validate(
        {
            "logs": {
                "files": ["sub-*/**/*_physio.tsv.gz"],
                "kind": "bids",
                "columns": {"trial": "trial", "item": "item", **columns},
                **logs,
            },
            "regions": {"file": "regions.csv", "kind": "boxes"},
            **({"screen": screen} if screen else {}),
        }
    )


def tabbed(rows: Iterable[Sequence[Any]]) -> str:
    """Rows as tab-separated text."""
    return "".join("\t".join(map(str, row)) + "\n" for row in rows)


def zipped(path: Path, rows: Iterable[Sequence[Any]] | str) -> Path:
    """Write rows without a header, compressed."""
    text = rows if isinstance(rows, str) else tabbed(rows)
    path.write_bytes(gzip.compress(text.encode("utf-8"), mtime=0))
    return path
