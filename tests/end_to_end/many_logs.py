"""A study of many small logs that are alike, and what can be changed in one of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from pathlib import Path

import etl
from tests.end_to_end.building import write

STUDY = """\
[logs]
files = ["logs/*"]
participant_from_name = '(?P<participant>P\\d+)'

[logs.columns]
trial = "trial"
item = "sentence"
onset = "start_ms"
duration = "dur_ms"
x = "x"
y = "y"

[regions]
file = "regions.csv"
kind = "boxes"
vertical = "VERTICAL"
"""
HEADER = ("trial", "sentence", "start_ms", "dur_ms", "x", "y", "device")
REGIONS = "item,region,order,left,top,right,bottom\n" + "".join(
    f"pears,r{number},{number},{100 + 100 * number},500,{200 + 100 * number},560\n"
    for number in range(1, 7)
)

Row = dict[str, str]
Change = Callable[[list[Row]], None]


def rows_of_log(number: int, *, trials: int = 10, fixations: int = 6) -> list[Row]:
    """The rows of one log: a fixation a region from left to right, trial after trial."""
    rows = []
    start_ms = 1000.5
    for trial in range(1, trials + 1):
        for place in range(fixations):
            dur_ms = 180.5 + 5 * ((7 * number + 3 * trial + 11 * place) % 17)
            cells = (
                str(trial),
                "pears",
                f"{start_ms:.1f}",
                f"{dur_ms:.1f}",
                f"{250.5 + 100 * (place % 6) + (number + trial) % 20:.1f}",
                f"{520.5 + (number + trial + place) % 20:.1f}",
                "one",
            )
            rows.append(dict(zip(HEADER, cells, strict=True)))
            start_ms += dur_ms + 30
        start_ms += 2000
    return rows


def text_of(rows: Iterable[Row], *, separator: str = "\t", newline: str = "\n") -> str:
    """Rows as text; the header is the keys of the first."""
    listed = list(rows)
    lines = [list(listed[0]), *(list(row.values()) for row in listed)]
    return "".join(separator.join(line) + newline for line in lines)


def make(
    folder: Path,
    logs: int = 12,
    changes: Mapping[int, Change] | None = None,
    *,
    vertical: str = "box",
    trials: int = 10,
) -> Path:
    """Write a study; the logs with these numbers have their rows changed. Gives its file."""
    files = {"study.toml": STUDY.replace("VERTICAL", vertical), "regions.csv": REGIONS}
    for number in range(1, logs + 1):
        rows = rows_of_log(number, trials=trials)
        if changes and number in changes:
            changes[number](rows)
        files[name_of(number)] = text_of(rows)
    return write(folder, files)


def name_of(number: int) -> str:
    """The name of a log, as the program says it."""
    return f"logs/P{number:03d}.tsv"


def each(column: str, change: Callable[[str], str]) -> Change:
    """A change of every cell of one column."""

    def changed(rows: list[Row]) -> None:
        for row in rows:
            row[column] = change(row[column])

    return changed


def scaled(column: str, factor: float) -> Change:
    """A change of every number of one column by a factor."""
    return each(column, lambda cell: f"{float(cell) * factor:.6f}")


def renamed(names: Mapping[str, str]) -> Change:
    """A change of the header: a name for each column, or none to leave it out."""

    def changed(rows: list[Row]) -> None:
        rows[:] = [{new: row[old] for old, new in names.items()} for row in rows]

    return changed


def first_trials(count: int) -> Change:
    """A change that leaves the first trials only."""

    def changed(rows: list[Row]) -> None:
        rows[:] = [row for row in rows if int(row["trial"]) <= count]

    return changed


def swapped(one: str, other: str) -> Change:
    """A change of two columns for each other under their headers."""

    def changed(rows: list[Row]) -> None:
        for row in rows:
            row[one], row[other] = row[other], row[one]

    return changed


def check(study_file: Path) -> etl.Findings:
    """Check a study in this process."""
    return etl.check(etl.load_study(study_file))
