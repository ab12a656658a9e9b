"""The worked example of the definitions as a study of one trial, in every kind of region file.

The cells are those of ``tests/measures/test_worked_example.py``, typed in from the definitions;
here they must come out of the published files, by the whole way from a log and a region file.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

import pytest

from tests.end_to_end.building import Row, build, rows_of, write
from tests.measures.test_worked_example import REGION_TABLE, SEQUENCE, TRIAL_TABLE

NAMES = ("one", "two", "three", "four", "five")
#: Each region is five characters wide: four letters and the space before them; the first has none.
TEXT = "aaaa bbbb cccc dddd eeee"
LEFT_PX, TOP_PX, CHARACTER_PX, LINE_PX = 100, 200, 10, 40
LOOKS = [tuple(map(int, look.split(":"))) for look in SEQUENCE.split()]
#: The middle of each region's letters.
MIDDLE_PX = {order: LEFT_PX + (5 * (order - 1) + 2) * CHARACTER_PX for order in range(1, 6)}
GAP_MS = 30

LAYOUT = f"""
[regions.layout]
left_px = {LEFT_PX}
top_px = {TOP_PX}
character_width_px = {CHARACTER_PX}
line_height_px = {LINE_PX}
"""


def box(order: int) -> tuple[int, int, int, int]:
    """Left, top, right and bottom of a region."""
    right = LEFT_PX + (5 * order - 1) * CHARACTER_PX
    left = LEFT_PX if order == 1 else right - 5 * CHARACTER_PX
    return left, TOP_PX, right, TOP_PX + LINE_PX


def boxes() -> str:
    """A region a row, with its box; not in reading order, for the column says it."""
    rows = [f"{name},{n},{','.join(map(str, box(n)))}" for n, name in enumerate(NAMES, 1)]
    return "\n".join(["region,order,left,top,right,bottom", *reversed(rows)]) + "\n"


def polygons() -> str:
    """A region a row, as a polygon."""
    rows = []
    for order, name in enumerate(NAMES, start=1):
        left, top, right, bottom = box(order)
        ring = f"{left} {top}, {right} {top}, {right} {bottom}, {left} {bottom}, {left} {top}"
        rows.append(f'{name},{order},"POLYGON (({ring}))"')
    return "\n".join(["region,order,wkt", *rows]) + "\n"


def marked() -> str:
    """The text with its regions marked."""
    words = zip(NAMES, TEXT.split(), strict=True)
    return "text\n" + " ".join(f"{{{name}: {word}}}" for name, word in words) + "\n"


def labels() -> str:
    """Two labels a region, so that a label is not the region."""
    rows = [f"A{n}{half},{name},{n}" for n, name in enumerate(NAMES, 1) for half in "xy"]
    return "\n".join(["label,region,order", *rows]) + "\n"


KINDS = {
    "labels": (labels(), "", NAMES),
    "boxes": (boxes(), "", NAMES),
    "wkt": (polygons(), "", NAMES),
    "marked_text": (marked(), LAYOUT, NAMES),
    "words": (f"text\n{TEXT}\n", LAYOUT, ("w1", "w2", "w3", "w4", "w5")),
}


def log(kind: str) -> str:
    """The example's sequence as a log: with places, or with labels and no times of onset."""
    lines = ["who,trial,text,n,area,dur" if kind == "labels" else "who,trial,text,start,dur,x,y"]
    clock_ms = 1000
    for number, (order, duration_ms) in enumerate(LOOKS, start=1):
        if kind == "labels":
            lines.append(f"R1,1,example,{number},A{order}{'xy'[number % 2]},{duration_ms}")
        else:
            y_px = TOP_PX + LINE_PX // 2
            lines.append(f"R1,1,example,{clock_ms},{duration_ms},{MIDDLE_PX[order]},{y_px}")
        clock_ms += duration_ms + GAP_MS
    return "\n".join(lines) + "\n"


def study(kind: str) -> str:
    """The study file."""
    places = 'label = "area"\nfixation = "n"' if kind == "labels" else 'x="x"\ny="y"\nonset="start"'
    return f"""
[logs]
files = ["log.csv"]
kind = "table"
[logs.columns]
participant = "who"
trial = "trial"
item = "text"
duration = "dur"
{places}
[regions]
file = "regions.csv"
kind = "{kind}"
{KINDS[kind][1]}
[output]
formats = ["parquet", "csv"]
"""


@dataclass(frozen=True)
class Example:
    """The example built from one kind of region file."""

    kind: str
    folder: Path

    @property
    def names(self) -> tuple[str, ...]:
        """The regions in order."""
        return KINDS[self.kind][2]

    def rows(self, table: str) -> list[Row]:
        """The rows of a table."""
        return rows_of(self.folder, table)


@pytest.fixture(scope="module", params=KINDS)
def example(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Example:
    """The example in each kind of region file in turn."""
    root = tmp_path_factory.mktemp(request.param)
    files = {
        "study.toml": study(request.param),
        "log.csv": log(request.param),
        "regions.csv": KINDS[request.param][0],
    }
    return Example(request.param, build(write(root, files)).folder)


def kind_of(measure: str) -> str:
    """The kind of a measure, by the names of the definitions."""
    if measure.endswith("_count"):
        return "count"
    return "duration" if measure.endswith(("_time", "_duration")) else "binary"


def test_outcomes_are_those_worked_by_hand(example: Example) -> None:
    """Every row of the long table, in order: region, then measure; value or reason."""
    expected = []
    for order, name in enumerate(example.names, start=1):
        for measure in sorted(REGION_TABLE):
            cell = REGION_TABLE[measure][order - 1]
            missing = cell if isinstance(cell, str) else None
            value = None if missing else float(cell)
            expected.append((name, order, measure, kind_of(measure), value, missing))
    columns = ("region", "region_order", "measure", "kind", "value", "missing")
    rows = example.rows("outcomes")
    assert [tuple(row[column] for column in columns) for row in rows] == expected
    assert {(r["participant"], r["trial"], r["item"]) for r in rows} == {("R1", 1, "example")}


def test_wide_outcomes_are_those_worked_by_hand(example: Example) -> None:
    """A row a region, a column a measure, nothing where there is no value."""
    expected = [
        {
            "participant": "R1",
            "trial": 1,
            "item": "example",
            "region": name,
            "region_order": order,
            **{
                measure: None if isinstance(cells[order - 1], str) else cells[order - 1]
                for measure, cells in REGION_TABLE.items()
            },
        }
        for order, name in enumerate(example.names, start=1)
    ]
    assert example.rows("outcomes_wide") == expected


def test_trial_is_that_worked_by_hand(example: Example) -> None:
    """The outcomes of the trial; none is missing."""
    told = {"participant": "R1", "trial": 1, "item": "example", **TRIAL_TABLE, "missing": None}
    assert example.rows("trials") == [told]


def test_regressions_are_those_worked_by_hand(example: Example) -> None:
    """4 to 3 and 5 to 3 end first passes; 3 to 2 leaves a region that has none.

    Landing onsets by hand: fixation 5 begins 1000 + (200 + 180 + 220 + 250) + 4 * 30 = 1970 ms,
    6 at 1970 + 190 + 30 = 2190, 9 at 2190 + (210 + 230 + 300) + 3 * 30 = 3020. One region is 50 px
    wide. A log of labels has neither.
    """
    _, two, three, four, five = example.names
    saccades = [
        (four, 4, three, 3, 1, 4, 5),
        (three, 3, two, 2, 0, 5, 6),
        (five, 5, three, 3, 1, 8, 9),
    ]
    amounts = [(1970.0, -50.0), (2190.0, -50.0), (3020.0, -100.0)]
    if example.kind == "labels":
        amounts = [(None, None)] * 3
    expected = [
        {
            "participant": "R1",
            "trial": 1,
            "item": "example",
            "from_region": origin,
            "from_order": a,
            "to_region": goal,
            "to_order": b,
            "regions_crossed": a - b,
            "ends_first_pass": ends,
            "launch_fixation": launch,
            "landing_fixation": landing,
            "onset_ms": onset_ms,
            "amplitude_px": amplitude_px,
        }
        for (origin, a, goal, b, ends, launch, landing), (onset_ms, amplitude_px) in zip(
            saccades, amounts, strict=True
        )
    ]
    assert example.rows("regressions") == expected


def test_fixations_show_visits_and_first_passes(example: Example) -> None:
    """Region, visit and first pass of each fixation by hand; the log's line in ``source_line``."""
    visits = [1, 1, 1, 1, 1, 2, 2, 1, 2, 2]
    first_pass = [1, 1, 1, 1, 0, 0, 0, 1, 0, 0]
    told = ("region_order", "duration_ms", "visit", "first_pass", "fixation", "source_line", "kept")
    rows = example.rows("fixations")
    assert [tuple(row[column] for column in told) for row in rows] == [
        (order, duration_ms, visits[n], first_pass[n], n + 1, n + 2, 1)
        for n, (order, duration_ms) in enumerate(LOOKS)
    ]
    assert [row["region"] for row in rows] == [example.names[order - 1] for order, _ in LOOKS]
    assert {row["source_file"] for row in rows} == {"log.csv"}


def test_csv_says_the_same_in_plain_text(example: Example) -> None:
    """The CSV of the long table, read by the standard library: empty where there is no value."""
    with (example.folder / "outcomes.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    told = {(r["region"], r["measure"]): r["value"] or r["missing"] for r in rows}
    assert told == {
        (name, measure): str(cells[n])
        for n, name in enumerate(example.names)
        for measure, cells in REGION_TABLE.items()
    }
    assert all(bool(row["value"]) != bool(row["missing"]) for row in rows)
