"""Lines of a log of events that no pattern describes, and patterns that must not run away."""

import time
from pathlib import Path

import numpy as np
import pytest

from tests.parsers.event_reading import (
    CLOSES,
    OPENS,
    TRIAL,
    VISITOR,
    fates,
    read_and_told,
    reader_of,
    refusal,
    rested,
)

FIX = (
    "    fix: correct the line, or the pattern (.* stands for what does not matter); or add a "
    "pattern for such lines, to ignore where they mean nothing\n"
)


def unfit(line: int, found: str, expected: str) -> str:
    """What is said of a line that no pattern describes."""
    return (
        f'P01.log:{line}: logs.patterns: no pattern describes this line; found "{found}", '
        f"expected {expected}\n{FIX}"
    )


@pytest.mark.parametrize(
    ("lines", "line", "expected"),
    [
        pytest.param(
            [VISITOR, OPENS, "rested 1000 to 12x0 on 50/25", CLOSES],
            3,
            'a line as fixation describes it, which this one leaves at "x0 on 50/25"',
            id="a letter in a number",
        ),
        pytest.param(
            [VISITOR, OPENS, "rested 1000 to 1200 on 5"],
            3,
            "a line as fixation describes it, of which this is only the beginning",
            id="cut short",
        ),
        pytest.param(
            [VISITOR, OPENS, f"{rested(1000)} and on", CLOSES],
            3,
            'a line as fixation describes it, which this one leaves at " and on"',
            id="too long",
        ),
        pytest.param(
            [VISITOR, OPENS, rested(1000) + rested(1300), CLOSES],
            3,
            "a line as fixation describes it, which this one leaves at "
            '"rested 1300 to 1500 on 50/25"',
            id="two lines in one",
        ),
        pytest.param(
            [VISITOR, "gate l opens on pear", rested(1000), CLOSES],
            2,
            "a line as trial_start or trial_end describes it, which this one leaves at "
            '"l opens on pear"',
            id="start of a trial",
        ),
        pytest.param(
            [VISITOR, OPENS, rested(1000), "cue: ea\trly", CLOSES],
            4,
            r'a line as facts (entry 2) describes it, which this one leaves at "\trly"',
            id="one of several patterns",
        ),
        pytest.param(
            [VISITOR, "a bird", OPENS, rested(1000), CLOSES],
            2,
            "a line that begins like those of a pattern",
            id="like nothing",
        ),
    ],
)
def test_line_that_no_pattern_describes(
    tmp_path: Path, lines: list[str], line: int, expected: str
) -> None:
    """The message says which pattern comes nearest, and where the line leaves it."""
    found = lines[line - 1].replace("\t", r"\t")
    closing = "1 problem; nothing was written"
    assert refusal(tmp_path, lines) == unfit(line, found, expected) + closing


def test_many_lines_that_no_pattern_describes(tmp_path: Path) -> None:
    """The first few are spelled out, the others counted."""
    said = refusal(tmp_path, [*TRIAL, *["a bird"] * 100_000])
    like_nothing = "a line that begins like those of a pattern"
    assert said == (
        "".join(unfit(line, "a bird", like_nothing) for line in range(6, 11))
        + "    … and 99,995 more like this in P01.log\n100000 problems; nothing was written"
    )


@pytest.mark.parametrize(
    "damaged",
    ["rested 1000 to 12x0 on 50/25", "gate 2 opens", "cue: ea rly", "row of", "shut 1000"],
)
def test_damaged_line_stops_where_others_are_counted(tmp_path: Path, damaged: str) -> None:
    """A line that begins like those of a pattern is never one of the others."""
    said = refusal(tmp_path, ["a bird", *TRIAL, damaged], reader_of({"other": "ignore"}))
    assert said.startswith(
        f'P01.log:7: logs.patterns: no pattern describes this line; found "{damaged}"'
    )
    assert said.endswith("\n1 problem; nothing was written")


@pytest.mark.parametrize(
    ("line", "other"),
    [
        pytest.param(f"wind{rested(1600)}", "error", id="ignored line and fixation"),
        pytest.param(f"wind 3{CLOSES}", "error", id="ignored line and end of a trial"),
        pytest.param(f"wind!\x0b{rested(1600)}", "error", id="line end that is damaged"),
        pytest.param(f"# a bird{rested(1600)}", "error", id="remark and fixation"),
        pytest.param("a birdgate 2 opens on plum ", "ignore", id="other line and start of a trial"),
    ],
)
def test_line_end_that_is_lost(tmp_path: Path, line: str, other: str) -> None:
    """What is glued to a line that is not read is not passed over with it."""
    shown = line.replace("\x0b", r"\x0b")
    assert refusal(tmp_path, [*TRIAL, line], reader_of({"other": other})) == (
        f'P01.log:6: logs.patterns: two lines are run together; found "{shown}", expected a line '
        "end before what a pattern describes\n"
        "    fix: put the line end back; a line that is not read hides one that is\n"
        "1 problem; nothing was written"
    )


def test_what_is_ignored_may_speak_of_lines(tmp_path: Path) -> None:
    """An ignored line may hold a line of a pattern behind a blank or a sign."""
    lines = [*TRIAL, f"wind {rested(1600)}", f"wind:{CLOSES}"]
    _, note, said = read_and_told(tmp_path, lines)
    assert (said, fates(note)["ignored lines"]) == ("", 2)


def test_what_is_ignored_need_not_be_sound(tmp_path: Path) -> None:
    """A line that a pattern of ignore takes is never called damaged."""
    reader = reader_of({"ignore": "^rested .* on a bench$", "other": "ignore"})
    _, note, said = read_and_told(tmp_path, [*TRIAL, "rested for long on a bench"], reader)
    assert (said, fates(note)["ignored lines"]) == ("", 1)


@pytest.mark.parametrize(
    "line", ["wind" + "x" * 10_000_000, "ä" * 60_000], ids=["10 MB", "2 bytes"]
)
@pytest.mark.parametrize("other", ["error", "ignore"])
def test_line_too_long_for_patterns(tmp_path: Path, line: str, other: str) -> None:
    """No pattern is tried on a very long line, and none of them is passed over."""
    size = len(line.encode("utf-8"))
    assert refusal(tmp_path, [*TRIAL, line], reader_of({"other": other})) == (
        f"P01.log:6: logs.patterns: the line is too long to tell of an event; found "
        f'"{line[:60]}…", '
        f"expected at most 100,000 bytes, not {size:,}\n"
        "    fix: open the file in a text editor: line ends may be lost, or the file is no such "
        "log\n1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    "pattern",
    ["(x+x+)+y", "(x|x|xx)*y", "(.*)(.*)(.*)(.*)(.*)y", "(?:x?){99}x{99}y", r"^(\w+\s?)*$"],
)
def test_no_pattern_runs_away(tmp_path: Path, pattern: str) -> None:
    """Patterns that take other engines longer than a life are matched in seconds."""
    lines = [*TRIAL, *("x" * 99_000 + "!" for _ in range(10))]
    began = time.perf_counter()
    _, note, _ = read_and_told(tmp_path, lines, reader_of({"ignore": pattern, "other": "ignore"}))
    # Each takes well under a second where this was written; engines that back up take for ever.
    assert time.perf_counter() - began < 30
    assert fates(note)["other lines"] == 10


def test_pattern_that_cannot_be_matched(tmp_path: Path) -> None:
    """What the engine refuses beyond the rules of the study file is told by its own reason."""
    assert refusal(tmp_path, TRIAL, reader_of({"ignore": "(?:a{500}b){500}"})) == (
        "logs.patterns: a pattern cannot be matched: invalid repetition size: {500}; found "
        '"(?:a{500}b){500}", expected a regular expression that RE2 knows too\n'
        "    fix: write the pattern in another way\n1 problem; nothing was written"
    )


def test_log_without_what_it_should_tell(tmp_path: Path) -> None:
    """A log of another kind is not taken for an empty one."""
    fix = "    fix: correct the pattern, or remove the file from the folder\n"
    assert refusal(tmp_path, ["wind", "wind"]) == (
        "P01.log: logs.patterns: no line of the log says that a trial starts; expected lines as "
        f"trial_start describes them\n{fix}"
        "P01.log: logs.patterns: no line of the log tells of a fixation; expected lines as "
        f"fixation describes them\n{fix}2 problems; nothing was written"
    )


def test_group_that_finds_no_number(tmp_path: Path) -> None:
    """What a group finds is read like the cell of a table, and its line is told."""
    lines = [VISITOR, OPENS, "rested 1.2.3 to 1200 on 50/25", CLOSES]
    assert refusal(tmp_path, lines) == (
        'P01.log:3: column "onset": this is no number; found "1.2.3", expected a number in ms\n'
        '    fix: the log is read with "." as decimal sign and without thousands signs: '
        "correct the cell, or [logs] decimal in the study file\n1 problem; nothing was written"
    )


def test_fixation_that_takes_no_time(tmp_path: Path) -> None:
    """What is not possible of a fixation is told as in a table."""
    lines = [VISITOR, OPENS, rested(1000, 0), CLOSES]
    assert refusal(tmp_path, lines) == (
        'P01.log:3: column "end": the fixation does not end after its onset; found "1000", '
        "expected an end after its onset\n    fix: correct the cell, remove the row, or leave such "
        "rows out by [logs.where]\n1 problem; nothing was written"
    )


def test_long_log_reads_like_a_short_one(tmp_path: Path) -> None:
    """Trials said one by one come out one by one, whatever their number."""
    count = 500
    lines = [VISITOR]
    for trial in range(count):
        lines += [f"gate {trial} opens on t{trial % 7}", f"cue: c{trial % 3}"]
        lines += [rested(1000 * trial + 10 * n, 10, n) for n in range(trial % 5 + 1)]
        lines += ["wind", CLOSES]
    log, note, _ = read_and_told(tmp_path, lines, reader_of(facts=("cue",)))
    own = np.repeat(np.arange(count), np.arange(count) % 5 + 1)
    assert log.recording.tolist() == own.tolist()
    assert [log.ids["trial"].text(row) for row in range(len(log))] == [str(t) for t in own]
    assert [log.facts["cue"].text(row) for row in range(len(log))] == [f"c{t % 3}" for t in own]
    assert [log.ids["item"].text(row) for row in range(len(log))] == [f"t{t % 7}" for t in own]
    assert note.account.total == len(lines)
