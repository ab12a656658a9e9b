"""What lines of a log of events say of trials: from where to where it holds, and contradictions."""

from pathlib import Path

import pytest

from tests.parsers.event_reading import (
    CLOSES,
    OPENS,
    PATTERNS,
    TRIAL,
    VISITOR,
    read,
    reader_of,
    refusal,
    rested,
    texts,
)

SECOND = ("gate 2 opens on plum", rested(2000), CLOSES)
THIRD = ("gate 3 opens on fig", rested(3000), CLOSES)
FACTS = ("cue", "row", "answer")
FIX = (
    "\n    fix: correct one of the two lines; if it holds from there on until it is said anew, "
    "move its pattern to lasting in [logs.patterns]\n"
)


@pytest.mark.parametrize(
    ("lines", "cues"),
    [
        pytest.param(["cue: early", *TRIAL, *SECOND], ["early"] * 3, id="before the first trial"),
        pytest.param(
            [*TRIAL[:3], "cue: late", *TRIAL[3:], *SECOND],
            ["late", "late", ""],
            id="within a trial",
        ),
        pytest.param([*TRIAL, "cue: late", *SECOND], ["late", "late", ""], id="after its end"),
        pytest.param([*TRIAL, *SECOND, "cue: late"], ["", "", "late"], id="at the end of the log"),
        pytest.param(
            [*TRIAL, *SECOND[:2], "cue: late", "cue: late", CLOSES, "cue: late"],
            ["", "", "late"],
            id="said twice alike",
        ),
        pytest.param([*TRIAL, "cue: NA", *SECOND], ["", "", ""], id="said to be missing"),
    ],
)
def test_of_which_trial_a_fact_is(tmp_path: Path, lines: list[str], cues: list[str]) -> None:
    """A fact is of the trial that started last; before the first trial, of all."""
    log, _ = read(tmp_path, lines, reader_of(facts=FACTS))
    assert texts(log, "cue") == cues


def test_end_of_a_trial_tells_of_it(tmp_path: Path) -> None:
    """What the line says with which a trial ends is a fact of that trial."""
    lines = [*TRIAL[:-1], "gate closes, answer right", *SECOND]
    log, _ = read(tmp_path, lines, reader_of(facts=FACTS))
    assert texts(log, "answer") == ["right", "right", ""]


def test_lasting_fact_holds_until_it_is_said_anew(tmp_path: Path) -> None:
    """What lasts holds for the trials that start below it, and no longer than it is said."""
    lines = [TRIAL[0], "row of pears", *TRIAL[1:3], "row of figs", TRIAL[3], CLOSES, *SECOND]
    log, _ = read(tmp_path, [*lines, "row of figs", "row of NA", *THIRD], reader_of(facts=FACTS))
    assert texts(log, "row") == ["pears", "pears", "figs", ""]


def test_readers_one_after_the_other(tmp_path: Path) -> None:
    """Logs that were put one below the other are told apart where the reader is a lasting fact."""
    lasting = [PATTERNS["lasting"], r"^visitor (?P<participant>\w+)$"]
    reader = reader_of({"facts": r"^cue: (?P<cue>\w+)$", "lasting": lasting})
    log, _ = read(tmp_path, [*TRIAL, "visitor P02", *TRIAL[1:]], reader)
    assert texts(log, "participant") == ["P01", "P01", "P02", "P02"]


def contradiction(line: int, problem: str, found: str, expected: str, first: int) -> str:
    """What is said of a line that contradicts another."""
    return (
        f'P01.log:{line}: {problem}; found "{found}", expected "{expected}" as in line {first}{FIX}'
    )


@pytest.mark.parametrize(
    ("lines", "told"),
    [
        pytest.param(
            [*TRIAL[:2], "cue: early", *TRIAL[2:], "cue: late"],
            (7, "the cue of a trial is said twice and differently", "late", "early", 3),
            id="of a trial",
        ),
        pytest.param(
            ["visitor P02", *TRIAL],
            (2, "the participant of the log is said twice and differently", "P01", "P02", 1),
            id="of the log",
        ),
        pytest.param(
            [*TRIAL, "visitor P02", *SECOND],
            (6, "the participant of a trial is not the one that was said of all", "P02", "P01", 1),
            id="of the log, further down",
        ),
        pytest.param(
            [VISITOR, "cue: early", *TRIAL[1:3], "cue: NA", *TRIAL[3:]],
            (5, "the cue of a trial is not the one that was said of all", "NA", "early", 2),
            id="missing once",
        ),
    ],
)
def test_what_is_said_twice_must_agree(
    tmp_path: Path, lines: list[str], told: tuple[int, str, str, str, int]
) -> None:
    """A contradiction names both lines."""
    expected = contradiction(*told) + "1 problem; nothing was written"
    assert refusal(tmp_path, lines, reader_of(facts=FACTS)) == expected


#: Lines of fixations that may name their gate.
NAMED = {"fixation": r"^(?:gate (?P<trial>\d+): )?" + str(PATTERNS["fixation"])[1:]}


def test_line_of_a_fixation_may_say_what_its_trial_says(tmp_path: Path) -> None:
    """A fact on the line of a fixation agrees with that of the trial, or stands in for it."""
    lines = [VISITOR, OPENS, rested(1000), f"gate 1: {rested(1300)}", CLOSES]
    log, _ = read(tmp_path, lines, reader_of(NAMED))
    assert texts(log, "trial") == ["1", "1"]
    start = {"trial_start": "^gate opens on (?P<item>.*)$"}
    lines = [VISITOR, "gate opens on pear", f"gate 1: {rested(1000)}", CLOSES]
    log, _ = read(tmp_path, lines, reader_of({**NAMED, **start}))
    assert texts(log, "trial") == ["1"]


def test_line_of_a_fixation_must_not_contradict_its_trial(tmp_path: Path) -> None:
    """A fixation of another trial shows that a start is lost."""
    lines = [VISITOR, OPENS, f"gate 1: {rested(1000)}", f"gate 2: {rested(1300)}", CLOSES]
    assert refusal(tmp_path, lines, reader_of(NAMED)) == (
        "P01.log:4: the line of a fixation says another trial than its trial; "
        'found "2", expected "1" as in line 2\n'
        "    fix: correct one of the two lines, or look for the start of a trial that is lost "
        "between them\n1 problem; nothing was written"
    )


NOT_SAID_FIX = "\n    fix: correct the pattern, or add the line to the log\n"


def test_reader_that_no_line_names(tmp_path: Path) -> None:
    """What a whole log does not say is told once."""
    assert refusal(tmp_path, TRIAL[1:]) == (
        "P01.log: logs.patterns: no line of the log says the participant; expected a line that a "
        f"pattern with the group participant describes{NOT_SAID_FIX}1 problem; nothing was written"
    )


@pytest.mark.parametrize("item", ["", " on NA"], ids=["absent", "missing"])
def test_trial_of_which_no_line_says_the_item(tmp_path: Path, item: str) -> None:
    """What one trial does not say is told where the trial starts."""
    start = {"trial_start": r"^gate (?P<trial>\d+) opens(?: on (?P<item>\w+))?$"}
    lines = [*TRIAL, f"gate 2 opens{item}", rested(2000), CLOSES]
    assert refusal(tmp_path, lines, reader_of(start)) == (
        'P01.log:6: no line says the item of this trial; found "trial 2", expected a line that a '
        f"pattern with the group item describes{NOT_SAID_FIX}1 problem; nothing was written"
    )
