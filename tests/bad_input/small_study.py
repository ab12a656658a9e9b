"""A tiny sound study in a folder of its own, for tests that spoil one thing in it."""

from __future__ import annotations

import os
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from click.testing import CliRunner, Result

from etl.cli import main

STUDY = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial"
item = "sentence"
onset = "start_ms"
duration = "dur_ms"
x = "x"
y = "y"

[regions]
file = "regions.csv"
kind = "boxes"
"""
#: What is added to the study file where a test is about tables of facts.
TABLES = """
[participants]
table = "participants.csv"

[trials]
table = "trial_list.csv"
factors = ["cue", "group"]
"""
PARTICIPANTS = "participant,group\nP01,volunteer\nP02,visitor\n"
TRIAL_LIST = "participant,trial,cue\nP01,1,early\nP01,2,late\nP02,1,late\nP02,2,early\n"
REGIONS = """\
item,region,order,left,top,right,bottom
pear,who,1,0,0,100,50
pear,verb,2,100,0,200,50
plum,who,1,0,0,100,50
plum,verb,2,100,0,200,50
"""
#: Where the other kinds of region definition place the text.
LAYOUT = """
[regions.layout]
left_px = 0
top_px = 0
character_width_px = 10
line_height_px = 50
"""
HEADER = "reader\ttrial\tsentence\tstart_ms\tdur_ms\tx\ty"
#: An earlier build, by which the output folder is known as one of ours.
EARLIER = {
    "run.json": '{"program": "trialwright", "files": ["outcomes.csv"]}\n',
    "outcomes.csv": "an earlier build\n",
}


def row(reader: str, trial: int, item: str, start_ms: int) -> str:
    """One fixation of 200 ms on the first region."""
    return f"{reader}\t{trial}\t{item}\t{start_ms}\t200\t50\t25"


def log(reader: str, *, trials: Iterable[int] = (1, 2), fixations: int = 3) -> str:
    """A sound log of a few trials; the header is line 1, the first fixation line 2."""
    rows = [
        row(reader, trial, "pear" if trial % 2 else "plum", trial * 1_000_000 + number * 250)
        for trial in trials
        for number in range(fixations)
    ]
    return "\n".join([HEADER, *rows, ""])


@dataclass(frozen=True, slots=True)
class SmallStudy:
    """A study file with two logs, a region file and an earlier build beside it."""

    folder: Path

    @classmethod
    def sound(cls, folder: Path) -> SmallStudy:
        """Write the study."""
        study = cls(folder)
        study.write("study.toml", STUDY)
        study.write("regions.csv", REGIONS)
        study.write("logs/P01.tsv", log("P01"))
        study.write("logs/P02.tsv", log("P02"))
        for name, text in EARLIER.items():
            study.write(f"out/{name}", text)
        return study

    def add_tables(self) -> None:
        """Add a trial list and a table of readers."""
        self.add("study.toml", TABLES)
        self.write("participants.csv", PARTICIPANTS)
        self.write("trial_list.csv", TRIAL_LIST)

    def define_texts(self, text: str) -> None:
        """Define regions by texts with marks in braces instead of boxes."""
        self.change("study.toml", 'kind = "boxes"', 'kind = "marked_text"')
        self.add("study.toml", LAYOUT)
        self.write("regions.csv", text)

    def define_polygon(self, wkt: str) -> None:
        """Define regions by polygons instead of boxes; the first one is as given."""
        self.change("study.toml", 'kind = "boxes"', 'kind = "wkt"')
        right = "POLYGON ((100 0, 200 0, 200 50, 100 50, 100 0))"
        left = "POLYGON ((0 0, 100 0, 100 50, 0 50, 0 0))"
        rows = [f'pear,who,1,"{wkt}"', f'pear,verb,2,"{right}"']
        rows += [f'plum,who,1,"{left}"', f'plum,verb,2,"{right}"']
        self.write("regions.csv", "\n".join(["item,region,order,wkt", *rows, ""]))

    def write(self, name: str, content: str | bytes) -> None:
        """Write a file, byte for byte."""
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))

    def change(self, name: str, old: str, new: str) -> None:
        """Change one place of a file; the place must be there once."""
        text = (self.folder / name).read_bytes().decode("utf-8")
        assert text.count(old) == 1, (name, old, text.count(old))
        self.write(name, text.replace(old, new))

    def add(self, name: str, text: str) -> None:
        """Add text at the end of a file."""
        self.write(name, (self.folder / name).read_bytes() + text.encode("utf-8"))

    def content(self) -> dict[str, bytes | None]:
        """Every file with its bytes, and every folder."""
        return {
            path.relative_to(self.folder).as_posix(): None if path.is_dir() else path.read_bytes()
            for path in sorted(self.folder.rglob("*"))
            if os.access(path, os.R_OK)
        }

    def run(self, *arguments: str) -> Result:
        """Run the command in the study's folder, which must be the current one."""
        return CliRunner().invoke(main, list(arguments))

    def refusal(self, *arguments: str) -> str:
        """What is said when a build is refused; all else that a refusal must keep is checked."""
        before = self.content()
        result = self.run("build", "study.toml", *arguments)
        assert result.exit_code == 2, (result.exit_code, result.stderr)
        assert result.stdout == ""
        assert self.content() == before
        return result.stderr
