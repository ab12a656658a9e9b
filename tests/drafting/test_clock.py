"""Whether fixations begin or end at the time of their line, and when blinks were."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import etl
from tests.drafting.small_logs import Fixated, put, reading, table
from tests.drafting.test_line_words import log


def logs_of(text: str, tmp_path: Path) -> dict[str, Any]:
    """The table [logs] of a draft of one log."""
    return dict(tomllib.loads(etl.draft([put(tmp_path / "P01.txt", text)]).text)["logs"])


def fixed(stamp: Callable[[Fixated], int]) -> Callable[[Fixated], str]:
    """A fixation's line with a time and a duration."""
    return lambda f: f"[{stamp(f)}] fix {f.duration_ms} ms at ({f.x_px}, {f.y_px})"


def spread(row: Fixated) -> int:
    """A time at which nothing says whether the fixation begins or ends: gaps are long."""
    return 20_000 * row.trial + 560 * row.number + 200 * (row.number % 2)


@pytest.mark.parametrize(
    ("stamp", "role"),
    [
        pytest.param(lambda f: f.onset_ms, "onset", id="begins"),
        pytest.param(lambda f: f.end_ms, "end", id="ends"),
    ],
)
def test_time_of_a_line_is_told_by_its_neighbours(
    stamp: Callable[[Fixated], int], role: str, tmp_path: Path
) -> None:
    """A fixation reaches into no other one, neither from its time on nor up to it."""
    found = logs_of(log(lambda t: f"[{t}] trial {t}", fixation=fixed(stamp)), tmp_path)
    assert {"onset", "end"} & found["columns"].keys() == {role}
    assert found["columns"]["duration"] == {"column": "duration", "unit": "ms"}


def test_time_that_could_be_either_is_asked_about(tmp_path: Path) -> None:
    """Where fixations are far apart, nobody but the lab knows."""
    text = log(lambda t: f"trial {t}", fixation=fixed(spread))
    found = logs_of(text, tmp_path)
    assert (found["columns"]["onset"], "end" in found["columns"]) == ("?", False)
    assert "(?P<time>" in found["patterns"]["fixation"]


@pytest.mark.parametrize(
    ("begins", "ends", "role"),
    [
        pytest.param(700, 5000, "onset", id="the trial begins just before"),
        pytest.param(0, 10, "end", id="the trial ends just after"),
    ],
)
def test_time_is_told_by_the_bounds_of_trials(
    begins: int, ends: int, role: str, tmp_path: Path
) -> None:
    """No fixation begins before its trial or ends after it."""
    last = {row.trial: spread(row) for row in reading()}
    text = log(
        lambda t: f"[{20_000 * t + begins}] trial {t}",
        fixation=fixed(spread),
        ends=lambda t: [f"[{last[t] + ends}] end"],
    )
    assert {"onset", "end"} & logs_of(text, tmp_path)["columns"].keys() == {role}


def test_table_of_ends_and_durations_has_no_onset(tmp_path: Path) -> None:
    """A column of times is the end where the durations before them leave no overlap."""
    columns = {"who": "participant", "trial": "trial", "t": "end", "dur": "duration", "x": "x"}
    text = table(reading(), {**columns, "y": "y"})
    found = tomllib.loads(etl.draft([put(tmp_path / "P01.tsv", text)]).text)["logs"]["columns"]
    assert found["end"] == {"column": "t", "unit": "ms"}
    assert "onset" not in found


@pytest.mark.parametrize(
    ("blink", "pattern"),
    [
        pytest.param(
            "{line} blink {onset} {end}",
            r"^\d+ blink (?P<onset>\d+) (?P<end>\d+)$",
            id="two times after its own",
        ),
        pytest.param(
            "{onset} blink {lasted}", r"^(?P<onset>\d+) blink (?P<duration>\d+)$", id="duration"
        ),
        pytest.param("blink {onset}", r"^blink \d+$", id="one time"),
        pytest.param("blink for {lasted} ms", r"^blink for \d+ ms$", id="no time"),
        pytest.param("blink", "^blink$", id="nothing"),
    ],
)
def test_times_of_blinks_are_plausible(blink: str, pattern: str, tmp_path: Path) -> None:
    """Two times that differ as a blink lasts are onset and end; a duration is as long as one."""

    def more(row: Fixated) -> list[str]:
        told = {
            "onset": row.end_ms + 2,
            "end": row.end_ms + 37 + row.number,
            "line": row.end_ms + 60,
        }
        return [blink.format(lasted=35 + row.number, **told)] if row.number % 4 == 0 else []

    found = logs_of(log(lambda t: f"trial {t}", more=more), tmp_path)["patterns"]
    assert found["blink"] == [pattern]


def test_blinks_whose_lines_are_written_when_they_are_over_have_no_times(tmp_path: Path) -> None:
    """A stamp that is an end, as that of the fixations is, is not taken for an onset."""
    text = log(
        lambda t: f"[{t}] trial {t}",
        fixation=fixed(lambda f: f.end_ms),
        more=lambda f: [f"[{f.end_ms + 45}] blink {35 + f.number} ms"] if f.number % 4 == 0 else [],
    )
    assert logs_of(text, tmp_path)["patterns"]["blink"] == [r"^\[\d+\] blink \d+ ms$"]
