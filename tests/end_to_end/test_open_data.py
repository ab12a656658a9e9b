"""Real trials on texts of several lines against a count straight from the log and the geometry.

24 adults, each reading one passage: public data of Carr, Pescuma, Furlan, Ktori & Crepaldi (2022),
doi:10.3758/s13428-021-01554-0, CC BY 4.0. Looked for in ``shared/open_data/passages`` beside the
checkout. The count here uses the standard library only.
"""

from __future__ import annotations

import csv
import math
import re
import shutil
from collections import defaultdict
from dataclasses import dataclass

import pytest

from tests.end_to_end.building import PROJECT, Row, build, rows_of, write

DATA = PROJECT.parent / "shared" / "open_data" / "passages"

pytestmark = pytest.mark.skipif(
    not DATA.is_dir(),
    reason="the open data is not beside this checkout (../shared/open_data/passages)",
)

#: From the description that comes with the data.
LEFT_PX, CHARACTER_PX, LINE_PX, FIRST_MIDDLE_PX = 360, 16, 64, 155

STUDY = """
[logs]
files = ["fixations.tsv"]
kind = "table"
[logs.columns]
participant = "reader"
trial = "passage"
item = "passage"
fixation = "n"
onset = {{ column = "start_ms", unit = "ms" }}
end = {{ column = "end_ms", unit = "ms" }}
x = {{ column = "x_px", unit = "px" }}
y = {{ column = "y_px", unit = "px" }}
[regions]
file = "texts.csv"
kind = "words"
[regions.layout]
left_px = 360
top_px = 123
character_width_px = 16
line_height_px = 64
space = "{space}"
[lines]
method = "nearest"
"""

Word = tuple[int, int]


@dataclass(frozen=True)
class Counted:
    """What the log and the geometry say: word looked at and line of each fixation, by trial."""

    words: dict[str, int]
    looks: dict[tuple[int, str], list[tuple[int, int | None, float]]]


def words_of(text: str, space: str) -> list[tuple[int, float, float]]:
    """Line, left and right edge (exclusive) of every word of a passage, in reading order."""
    words = []
    for number, line in enumerate(text.split("\n"), start=1):
        spans = [match.span() for match in re.finditer(r"\S+", line)]
        for at, (start, end) in enumerate(spans):
            # The gap between two words goes to the later one or to the earlier one.
            if space == "following" and at > 0:
                start = spans[at - 1][1]
            if space == "preceding" and at < len(spans) - 1:
                end = spans[at + 1][0]
            left = LEFT_PX + start * CHARACTER_PX
            words.append((number, left, LEFT_PX + end * CHARACTER_PX))
    return words


def nearest_line(y_px: float, lines: int) -> int:
    """The line whose middle is nearest; halfway between two lines the lower one begins."""
    line = math.floor((y_px - FIRST_MIDDLE_PX) / LINE_PX + 0.5) + 1
    return min(max(line, 1), lines)


def count(space: str) -> Counted:
    """Where each fixation of the open data lies, without the program."""
    with (DATA / "texts.csv").open(encoding="utf-8", newline="") as file:
        texts = {row["item"]: row["text"] for row in csv.DictReader(file)}
    words = {item: words_of(text, space) for item, text in texts.items()}
    looks = defaultdict(list)
    with (DATA / "fixations.tsv").open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file, delimiter="\t"):
            own = words[row["passage"]]
            line = nearest_line(float(row["y_px"]), own[-1][0])
            x_px = float(row["x_px"])
            hit = None
            for order, (on, left, right) in enumerate(own, start=1):
                if on == line and left <= x_px < right:
                    hit = order
            duration_ms = float(row["end_ms"]) - float(row["start_ms"])
            looks[int(row["reader"]), row["passage"]].append((line, hit, duration_ms))
    return Counted({item: len(own) for item, own in words.items()}, dict(looks))


@dataclass(frozen=True)
class Compared:
    """The built tables and the count."""

    counted: Counted
    wide: list[Row]
    fixations: list[Row]


@pytest.fixture(scope="module", params=["following", "preceding"])
def compared(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Compared:
    """The open data under each convention of spaces in turn."""
    root = tmp_path_factory.mktemp(request.param)
    for name in ("fixations.tsv", "texts.csv"):
        shutil.copy(DATA / name, root / name)
    folder = build(write(root, {"study.toml": STUDY.format(space=request.param)})).folder
    return Compared(
        count(request.param), rows_of(folder, "outcomes_wide"), rows_of(folder, "fixations")
    )


def test_all_trials_and_fixations_are_there(compared: Compared) -> None:
    """24 trials with 3,604 fixations, as the description of the data says."""
    assert len({(r["participant"], r["trial"]) for r in compared.fixations}) == 24
    assert len(compared.fixations) == 3604


def test_every_fixation_is_on_its_line_and_word(compared: Compared) -> None:
    """Nearest line, then the word whose box holds the place, fixation by fixation."""
    told = defaultdict(list)
    for row in compared.fixations:
        key = row["participant"], row["trial"]
        told[key].append((row["line"], row["region_order"], row["duration_ms"]))
    assert told == compared.counted.looks


def test_fixation_count_and_total_time_of_every_word(compared: Compared) -> None:
    """Each word's fixations and their summed time; a word without any has no time."""
    expected = {}
    for (who, passage), looks in compared.counted.looks.items():
        for order in range(1, compared.counted.words[passage] + 1):
            times_ms = [duration for _, hit, duration in looks if hit == order]
            total_ms = sum(times_ms) if times_ms else None
            expected[who, passage, order] = len(times_ms), total_ms
    told = {
        (r["participant"], r["trial"], r["region_order"]): (r["fixation_count"], r["total_time"])
        for r in compared.wide
    }
    assert told == expected
    assert sum(number for number, _ in told.values()) > 3000


def test_space_convention_matters_to_the_count() -> None:
    """The two conventions put some fixations on different words, so both are really checked."""
    assert count("following").looks != count("preceding").looks
