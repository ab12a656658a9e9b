"""The methods on 24 real trials, against what the paper's own published corrections score.

The data: Carr, Pescuma, Furlan, Ktori & Crepaldi (2022, doi:10.3758/s13428-021-01554-0), CC BY 4.0.
"""

from __future__ import annotations

import csv
import re
import statistics
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from etl.lines import METHODS, Passage
from tests.lines.building import Trial

PASSAGES = Path(__file__).resolve().parents[3] / "shared" / "open_data" / "passages"
pytestmark = pytest.mark.skipif(
    not PASSAGES.is_dir(), reason="the open data are not beside the checkout (../shared/open_data)"
)

#: From the data's description: first character's left edge at 360 px, 16 px a character, lines
#: 64 px apart, the first line's middle at 155 px.
LEFT, WIDTH, HEIGHT, FIRST_MIDDLE = 360, 16, 64, 155
#: Medians over trials of the percentage of fixations on the line that two correctors agreed on,
#: discarded ones counted as wrong, computed from the paper's own data files.
MEDIANS = {
    "attach": 94.8,
    "chain": 96.4,
    "cluster": 97.3,
    "merge": 97.6,
    "regress": 97.1,
    "segment": 97.3,
    "slice": 98.4,
    "split": 96.8,
    "stretch": 96.9,
    "warp": 97.9,
}
#: Those that leave nothing open: no random start, no search, no order among equals.
SETTLED = ("attach", "chain", "segment", "slice", "split", "warp")


def rows(name: str, delimiter: str) -> list[dict[str, str]]:
    """A table of the open data."""
    with (PASSAGES / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, delimiter=delimiter))


def passage_of(content: str) -> Passage:
    """The places of a text's lines and words."""
    lines = content.split("\n")
    words = [(at, m) for at, line in enumerate(lines) for m in re.finditer(r"\S+", line)]
    middles = [LEFT + WIDTH * (m.start() + m.end()) / 2 for _, m in words]
    return Passage(
        FIRST_MIDDLE + HEIGHT * np.arange(len(lines), dtype=np.float64),
        np.array(middles),
        np.array([at for at, _ in words], dtype=np.int32),
        float(HEIGHT),
        float(WIDTH * max(map(len, lines))),
    )


@cache
def trials() -> list[Trial]:
    """The 24 trials, with the lines by hand counted from 0; -1 is a discarded fixation."""
    passages = {row["item"]: passage_of(row["text"]) for row in rows("texts.csv", ",")}
    own: dict[tuple[str, str], list[tuple[float, float, int]]] = {}
    by_hand = rows("lines_by_hand.tsv", "\t")
    for row, hand in zip(rows("fixations.tsv", "\t"), by_hand, strict=True):
        key = row["reader"], row["passage"]
        fixation = float(row["x_px"]), float(row["y_px"]), int(hand["line"]) - 1
        own.setdefault(key, []).append(fixation)
    made = []
    for (_, passage), fixations in own.items():
        x, y, line = np.array(fixations).T
        made.append(Trial(passages[passage], x, y, line.astype(np.int32)))
    return made


def median_right(method: str) -> float:
    """The median percentage of fixations on the right line."""
    return statistics.median(100 * trial.right(method) for trial in trials())


def test_every_method_has_a_published_median() -> None:
    """No method is left unchecked."""
    assert MEDIANS.keys() == METHODS.keys()
    assert len(trials()) == 24


@pytest.mark.parametrize("method", METHODS)
def test_method_scores_the_published_median(method: str) -> None:
    """Within 1.5 points; those that leave nothing open within a tenth, the last published digit."""
    tolerance = 0.1 if method in SETTLED else 1.5
    assert median_right(method) == pytest.approx(MEDIANS[method], abs=tolerance)
