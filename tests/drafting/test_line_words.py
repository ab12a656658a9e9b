"""Which words of lines of events stay, which are values, and which lines are of one kind."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import etl
from etl.drafting.event_clusters import shapes_of
from etl.drafting.event_ignored import ignoring, slips_in
from etl.drafting.event_patterns import pattern_of_line
from etl.drafting.event_tokens import has_decimal_commas, numbers_within
from tests.drafting.small_logs import Fixated, put, reading

CUES = ("late", "early")


def log(
    begins: Callable[[int], str],
    *,
    fixation: Callable[[Fixated], str] = lambda f: f"fix {f.onset_ms} {f.duration_ms} {f.x_px} 500",
    ends: Callable[[int], list[str]] = lambda trial: [f"end of trial {trial}"],
    more: Callable[[Fixated], list[str]] = lambda _: [],
    participant: str = "P01",
) -> str:
    """A log of one reader; ``ends`` gives the lines after the last fixation of a trial."""
    rows = reading(participant)
    lines = [f"reader: {participant}"]
    for row, following in zip(rows, [*rows[1:], None], strict=True):
        if row.number == 1:
            lines.append(begins(row.trial))
        lines += [fixation(row), *more(row)]
        if following is None or following.number == 1:
            lines += ends(row.trial)
    return "\n".join(lines) + "\n"


def patterns_of(text: str, tmp_path: Path) -> dict[str, Any]:
    """The patterns of a draft of one log."""
    drafted = etl.draft([put(tmp_path / "P01.txt", text)])
    return dict(tomllib.loads(drafted.text)["logs"]["patterns"])


def patterns_in(lines: list[str]) -> list[str]:
    """The patterns of the shapes of lines."""
    return [pattern_of_line(shape, {}) for shape in shapes_of(lines)]


def test_ids_with_and_without_letters_are_of_one_kind() -> None:
    """Practice texts named U1 and texts named 4 stand in lines of one shape."""
    lines = ["12 start trial 1 item U1", "30 start trial 2 item 4", "55 start trial 3 item 11"]
    assert patterns_in(lines) == [r"^\d+ start trial \d+ item \S+$"]


def test_word_that_varies_later_is_no_part_of_the_pattern() -> None:
    """All lines decide what stays, not the first one."""
    lines = [f"{9 * n} start trial {n} cue {CUES[n > 20]}" for n in range(1, 40)]
    assert patterns_in(lines) == [r"^\d+ start trial \d+ cue \S+$"]


def test_first_word_that_is_a_level_is_a_value() -> None:
    """Lines that only differ in a first word, and stand beside the same lines, are of one kind."""
    lines = []
    for trial in range(1, 13):
        lines += [f"{CUES[trial % 3 == 0]} trial {trial}", "fix 1 2", "fix 3 4", "done"]
    assert r"^\S+ trial \d+$" in patterns_in(lines)


def test_levels_that_alternate_are_values(tmp_path: Path) -> None:
    """A factor whose levels come in turn is a group, for the same lines stand beside it."""
    found = patterns_of(log(lambda t: f"trial {t} begins, cue {CUES[t % 2]}"), tmp_path)
    assert found["trial_start"] == r"^trial (?P<trial>\d+) begins, cue (?P<cue>\S+)$"


def test_start_and_end_in_one_word_are_told_apart(tmp_path: Path) -> None:
    """What stands beside a line says that a word tells the start from the end of a trial."""
    text = log(lambda t: f"12 trial {t} begins", ends=lambda t: [f"12 trial {t} over"])
    found = patterns_of(text, tmp_path)
    assert found["trial_start"] == r"^\d+ trial (?P<trial>\d+) begins$"
    assert found["trial_end"] == r"^\d+ trial \d+ over$"


def test_names_of_values_tell_lines_apart() -> None:
    """A word is a name of what follows it where each name has values of its own."""
    lines = [
        line
        for n in range(12)
        for line in (
            f"msg button {('left', 'right')[n % 2]}",
            f"msg sound {('on', 'off')[n % 3 > 0]}",
        )
    ]
    assert set(patterns_in(lines)) == {r"^msg button \S+$", r"^msg sound \S+$"}


def test_line_that_closes_trials_is_found_beside_others(tmp_path: Path) -> None:
    """An end and an answer of as many words are two kinds of line."""
    text = log(
        lambda t: f"{t} start trial {t}",
        ends=lambda t: [f"{t} end trial", f"{t} answer yes"],
    )
    found = patterns_of(text, tmp_path)
    assert found["trial_end"] == r"^\d+ end trial$"
    assert found["ignore"] == [r"^\d+ answer yes$"]


def test_practice_in_a_longer_line_starts_trials_too(tmp_path: Path) -> None:
    """A line that goes on where others end is a sibling, never one that means nothing."""
    text = log(lambda t: f"start trial {t} item {t * 3}" + (" as practice, 1" if t < 3 else ""))
    found = patterns_of(text, tmp_path)
    assert len(found["trial_start"]) == 2
    assert all(r"start trial (?P<trial>\d+) item (?P<item>\d+)" in p for p in found["trial_start"])
    assert "ignore" not in found


def test_practice_that_counts_anew_keeps_its_word(tmp_path: Path) -> None:
    """Two trials of a reader never have one name: practice 1 is not trial 1."""
    text = log(lambda t: f"practice {t} begins" if t < 4 else f"trial {t - 3} begins")
    found = patterns_of(text, tmp_path)
    assert set(found["trial_start"]) == {
        r"^trial (?P<trial>\d+) begins$",
        r"^(?P<trial>practice \d+) begins$",
    }
    assert "trial practice 1" in etl.draft([tmp_path / "P01.txt"]).first_trial


def test_facts_that_are_sentences_have_the_name_of_what_they_tell(tmp_path: Path) -> None:
    """The word before "is" names what is said."""
    text = log(
        lambda t: f"trial {t} begins\nnow: the cue is {CUES[t % 3 == 0]}",
        ends=lambda t: [f"trial ends, answer {('right', 'wrong')[t % 3 == 0]}"],
    )
    found = patterns_of(text, tmp_path)
    assert found["facts"] == [r"^now: the cue is (?P<cue>\S+)$"]
    assert found["trial_end"] == r"^trial ends, answer (?P<answer>\S+)$"


def test_lines_of_numbers_alone_are_asked_about(tmp_path: Path) -> None:
    """A pattern of numbers alone would swallow damaged lines, so the lab must say what they are."""
    text = log(lambda t: f"trial {t} begins", more=lambda f: [f"{f.number} {f.onset_ms}"])
    found = patterns_of(text, tmp_path)
    assert (found["other"], "ignore" in found) == ("?", False)


def test_word_that_a_damaged_line_would_fit_is_spelled_out() -> None:
    """Where any word would do, a slip in a line that tells something would go unseen."""
    (noise,) = shapes_of([f"msg {what} 12" for what in ("beep", "tone", "beep", "beep", "tone")])
    (trial,) = shapes_of(["msg trial 3", "msg trial 4"])
    assert pattern_of_line(noise, {}) == r"^msg \S+ \d+$"
    assert "msg tria 3" in slips_in([trial])
    assert ignoring(noise, slips_in([trial])) == r"^msg (?:beep|tone) \d+$"


@pytest.mark.parametrize(
    ("cells", "numbers"),
    [
        pytest.param(["802..914", "948..1166"], [["802", "948"], ["914", "1166"]], id="points"),
        pytest.param(["802-914", "948-1166"], [["802", "948"], ["914", "1166"]], id="hyphens"),
        pytest.param(["281.2/317.6", "./."], [["281.2", "."], ["317.6", "."]], id="missing"),
        pytest.param(["-3.5/-2.0", "4.0/1.5"], [["-3.5", "4.0"], ["-2.0", "1.5"]], id="signs"),
        pytest.param(["151ms", "90ms"], [["151", "90"]], id="a unit"),
        pytest.param(["x281.2", "x90.0"], [["281.2", "90.0"]], id="a letter"),
        pytest.param(["12px..95px", "14px..99px"], [["12", "14"], ["95", "99"]], id="units"),
        pytest.param(["1/40", "2/40"], [["1", "2"], ["40", "40"]], id="of how many"),
    ],
)
def test_numbers_in_one_word_come_apart(cells: list[str], numbers: list[list[str]]) -> None:
    """Ranges, pairs and measures are numbers with signs, letters or units around them."""
    found = numbers_within(cells)
    assert found is not None
    assert found.numbers == numbers


@pytest.mark.parametrize(
    "cells",
    [
        pytest.param(["P01", "P02"], id="a letter"),
        pytest.param(["4-2", "3-7"], id="no range"),
        pytest.param(["4/2", "3/7"], id="two small numbers"),
        pytest.param(["2025-03-02", "2025-03-01"], id="a date"),
        pytest.param(["12a", "12b"], id="letters that differ"),
        pytest.param(["1.2.3", "1.2.4"], id="a version"),
    ],
)
def test_ids_stay_whole(cells: list[str]) -> None:
    """What only names something is no measure."""
    assert numbers_within(cells) is None


def test_comma_between_whole_numbers_is_no_decimal_sign() -> None:
    """Pairs such as 281,317 have many digits after the comma, and never a 0 first."""
    pairs = [f"at {281 + 3 * n},{317 + 7 * n}" for n in range(60)]
    assert not has_decimal_commas(pairs)
    assert has_decimal_commas([f"at {n},{n % 10}" for n in range(100, 160)])
