"""Questions that a draft left open: each is told once, and nothing else complains of it."""

from __future__ import annotations

import tomllib
from collections.abc import Callable

import pytest

from etl.study.questions import open_questions
from tests.study.written import SOUND

Said = Callable[[str], str]


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            'kind = "boxes"',
            'kind = "?"',
            'study.toml:14: regions.kind: a question of the draft is still open; found "?", '
            'expected "marked_text", "words", "boxes", "wkt" or "labels"\n'
            '    fix: write for example kind = "marked_text"',
            id="a choice",
        ),
        pytest.param(
            'trial = "trial_no"',
            'trial = "?"',
            'study.toml:6: logs.columns.trial: a question of the draft is still open; found "?", '
            'expected which trial of the reader\n    fix: write for example trial = "trial_no"',
            id="a column",
        ),
        pytest.param(
            'onset = "t_start"',
            'onset = { column = "?", unit = "ms" }',
            "study.toml:7: logs.columns.onset.column: a question of the draft is still open; found "
            '"?", expected when the fixation began, in log time\n'
            '    fix: write for example onset = { column = "t_start", unit = "ms" }',
            id="a column within a table",
        ),
        pytest.param(
            'duration = "dur"',
            'duration = { column = "dur", unit = "?" }',
            "study.toml:8: logs.columns.duration.unit: a question of the draft is still open; "
            'found "?", expected "ms", "s" or "us"\n    fix: write one of these',
            id="a unit",
        ),
        pytest.param(
            'files = ["logs/*.tsv"]',
            'files = ["?"]',
            "study.toml:2: logs.files, entry 1: a question of the draft is still open; found "
            '"?", expected the logs: file names or patterns with *, relative to the study file\n'
            '    fix: write for example files = ["logs/*.tsv"]',
            id="an entry of a list",
        ),
        pytest.param(
            "[regions]",
            '[screen]\nwidth_px = "?"\nheight_px = 1080\n\n[regions]',
            'study.toml:13: screen.width_px: a question of the draft is still open; found "?", '
            "expected width in pixels\n    fix: write for example width_px = 1920",
            id="a number",
        ),
        pytest.param(
            "[regions]",
            '[logs.eye]\nuse = "?"\n\n[regions]',
            'study.toml:13: logs.eye.use: a question of the draft is still open; found "?", '
            "expected the eye that counts, as the logs spell it, for every reader of whom nothing "
            'else is said\n    fix: write for example use = "R"',
            id="an eye, though no column names eyes",
        ),
    ],
)
def test_open_question_is_the_only_problem(
    refusal: Said, old: str, new: str, expected: str
) -> None:
    """A question names its line, its key and what is expected, and no rule speaks of that key."""
    assert refusal(SOUND.replace(old, new)) == f"{expected}\n1 problem; nothing was written"


def test_other_problems_are_listed_with_questions(refusal: Said) -> None:
    """What is wrong besides is told in the same run, in the order of the file."""
    text = SOUND.replace('trial = "trial_no"', 'trial = "?"').replace('"boxes"', '"box"')
    told = refusal(text)
    assert [line.split(":")[1] for line in told.split("\n") if line.startswith("study")] == [
        "6",
        "14",
    ]


def test_unknown_key_is_no_question(refusal: Said) -> None:
    """A key that no study file has is told as such, whatever its value."""
    told = refusal(SOUND.replace('kind = "boxes"', 'kind = "boxes"\ncolour = "?"'))
    assert told.startswith("study.toml:15: regions.colour: unknown key; ")


@pytest.mark.parametrize(
    "entry",
    [
        'logs.missing = ["", "?"]',
        'logs.comment = ["?"]',
        'logs.where = { sure = ["?"] }',
        'trials.skip = { answer = ["?"] }',
        'trials.levels = { answer = ["?", "yes"] }',
    ],
)
def test_question_mark_in_a_cell_is_a_value(entry: str) -> None:
    """Where texts of logs and tables are listed, a question mark stands for itself."""
    assert open_questions(tomllib.loads(entry)) == []


def test_questions_come_in_the_order_of_the_file() -> None:
    """Every open key is found, wherever it stands."""
    data = tomllib.loads('[logs]\nfiles = "?"\n[logs.columns]\nx = "?"\n[regions]\nkind = "?"\n')
    assert open_questions(data) == [
        ("logs", "files"),
        ("logs", "columns", "x"),
        ("regions", "kind"),
    ]
