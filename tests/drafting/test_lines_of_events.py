"""What the lines of a log of events tell, and the patterns that describe them."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import etl
from etl.drafting.event_clusters import shapes_of
from etl.drafting.event_patterns import pattern_of_line
from tests.drafting.small_logs import Fixated, put, reading

Wording = Callable[[Fixated], str]


def log(
    fixation: Wording,
    *,
    begins: str = "trial {trial} begins, text {item}",
    ends: str | None = "trial ends",
    more: Callable[[Fixated], list[str]] = lambda _: [],
    participant: str = "P01",
) -> str:
    """A log of one reader; ``more`` gives lines that stand after each fixation."""
    lines = [f"reader: {participant}"]
    rows = reading(participant)
    for row, following in zip(rows, [*rows[1:], None], strict=True):
        if row.number == 1:
            lines.append(begins.format(trial=row.trial, item=row.item))
        lines += [fixation(row), *more(row)]
        if ends is not None and (following is None or following.number == 1):
            lines.append(ends)
    return "\n".join(lines) + "\n"


def plain(row: Fixated) -> str:
    """A fixation in plain words."""
    return f"fix {row.onset_ms} {row.duration_ms} {row.x_px} {row.y_px}"


def patterns_of(text: str, tmp_path: Path) -> dict[str, Any]:
    """The patterns of a draft of one log."""
    drafted = etl.draft([put(tmp_path / "P01.txt", text)])
    return dict(tomllib.loads(drafted.text)["logs"]["patterns"])


def test_shapes_keep_words_and_free_numbers() -> None:
    """Lines are alike where their words are; numbers and ids change."""
    lines = ["fix 12 at 3.5", "blink 9 11", "fix 40 at 7.0", "reader: P01"]
    assert [(len(shape), pattern_of_line(shape, {})) for shape in shapes_of(lines)] == [
        (2, r"^fix \d+ at [-+0-9.]+$"),
        (1, r"^blink \d+ \d+$"),
        (1, r"^reader: \S+$"),
    ]


def test_words_that_come_in_turn_are_keys() -> None:
    """Begin and end, or the names of facts, tell lines apart; levels of a factor do not."""
    lines = [
        line
        for trial, cue in enumerate(("late", "early", "early", "late", "late"))
        for line in (f"trial {trial} begins", f"note|cue|{cue}", f"trial {trial} over")
    ]
    assert {pattern_of_line(shape, {}) for shape in shapes_of(lines)} == {
        r"^trial \d+ begins$",
        r"^trial \d+ over$",
        r"^note\|cue\|\S+$",
    }


def test_ends_of_differing_length_are_one_rest() -> None:
    """Lines that differ only in the words at their end have one shape."""
    lines = ["fix 1 on the old tree", "fix 2 on nothing", "fix 3 on the tree"]
    assert [pattern_of_line(shape, {}) for shape in shapes_of(lines)] == [r"^fix \d+ on .+$"]


def test_lines_of_trials_and_fixations_are_found(tmp_path: Path) -> None:
    """Where trials start and end, what a fixation's numbers are, and who read."""
    assert patterns_of(log(plain), tmp_path) == {
        "trial_start": r"^trial (?P<trial>\d+) begins, text (?P<item>\S+)$",
        "trial_end": "^trial ends$",
        "fixation": r"^fix (?P<onset>\d+) (?P<duration>\d+) (?P<x>[-+0-9.]+) (?P<y>[-+0-9.]+)$",
        "lasting": [r"^reader: (?P<participant>\S+)$"],
    }


def test_order_of_numbers_is_found_by_what_they_are(tmp_path: Path) -> None:
    """Numbers without a word before them are told by how they go on from line to line."""

    def fixation(row: Fixated) -> str:
        return f"F;{row.y_px};{row.duration_ms};{row.x_px};{row.end_ms};{row.onset_ms}"

    found = patterns_of(log(fixation), tmp_path)["fixation"]
    groups = [part.split(">")[0] for part in found.split("(?P<")[1:]]
    assert groups == ["y", "duration", "x", "onset"]


def test_saccades_and_other_lines_are_left_aside(tmp_path: Path) -> None:
    """Lines that tell of something else are counted, each kind by a pattern of whole lines."""

    def more(row: Fixated) -> list[str]:
        return [f"saccade {row.end_ms} {row.end_ms + 25} {row.x_px} {row.y_px} 3.2", "beep!"]

    found = patterns_of(log(plain, more=more), tmp_path)
    numbers = " ".join([r"\d+"] * 2 + ["[-+0-9.]+"] * 3)
    assert found["ignore"] == [f"^saccade {numbers}$", "^beep!$"]
    assert found["fixation"].startswith("^fix ")


def test_decimal_commas_are_found(tmp_path: Path) -> None:
    """Numbers with commas are numbers where something else separates them."""

    def fixation(row: Fixated) -> str:
        return plain(row).replace(".", ",")

    drafted = etl.draft([put(tmp_path / "P01.txt", log(fixation))])
    assert tomllib.loads(drafted.text)["logs"]["decimal"] == ","
    assert drafted.first_trial


def test_line_that_says_no_trial_is_a_question(tmp_path: Path) -> None:
    """Without a line that starts trials, the lab must say how one is told from the next."""
    text = "\n".join(plain(row) if row.number % 3 else f"beep\n{plain(row)}" for row in reading())
    drafted = etl.draft([put(tmp_path / "P01.txt", text)])
    assert "logs.patterns.trial_start" in [question.key for question in drafted.questions]


def test_lines_that_begin_like_remarks_are_read(tmp_path: Path) -> None:
    """Where # begins a line that tells something, it marks no remarks."""
    drafted = etl.draft([put(tmp_path / "P01.txt", log(plain, begins="# trial {trial} begins"))])
    assert tomllib.loads(drafted.text)["logs"]["comment"] == []
    assert "(participant P01, trial 1;" in drafted.first_trial


def test_reader_by_the_names_of_logs(tmp_path: Path) -> None:
    """Where no line says who read, the names of the logs do."""
    for who in ("P01", "P02", "P03"):
        text = log(plain, participant=who).partition("\n")[2]
        put(tmp_path / f"{who}.txt", text)
    logs = tomllib.loads(etl.draft([tmp_path]).text)["logs"]
    assert logs["participant_from_name"] == r"(?P<participant>P\d+)"


def test_facts_before_the_first_trial_hold_for_those_that_follow(tmp_path: Path) -> None:
    """A line above a trial's start tells of what comes; one within it tells of that trial."""

    def more(row: Fixated) -> list[str]:
        return ["answer = 1"] if row.number == 3 else []

    text = log(plain, begins="cue = early\ntrial {trial} begins", more=more)
    found = patterns_of(text, tmp_path)
    assert found["lasting"] == [r"^cue = (?P<cue>\S+)$", r"^reader: (?P<participant>\S+)$"]
    assert found["facts"] == [r"^answer = (?P<answer>\d+)$"]


@pytest.mark.parametrize(
    "line", ['say "half', "\x07 bell 3", "a\tb\t4", "𝒳 5", "(?P<x>6", "7 " * 300], ids=repr
)
def test_odd_lines_do_no_harm(line: str, tmp_path: Path) -> None:
    """Lines with any signs in them are described so that the log reads."""
    drafted = etl.draft([put(tmp_path / "P01.txt", log(plain, more=lambda _: [line]))])
    assert tomllib.loads(drafted.text)["logs"]["kind"] == "events"
    assert drafted.findings.lines() == []
    assert drafted.first_trial
