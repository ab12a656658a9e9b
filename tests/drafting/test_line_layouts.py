"""A draft of logs in many layouts of lines builds what a lab's own study file builds."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import etl
from etl.drafting.event_ignored import damaged
from tests.drafting.answering import answered, lab_knows
from tests.drafting.line_layouts import LAYOUTS
from tests.simulator.dialects import RecordedStudy, recorded_study
from tests.simulator.dialects.events import write_events

READING = ("trial_start", "trial_end", "fixation", "blink", "facts", "lasting")


@pytest.fixture(scope="module")
def recorded() -> RecordedStudy:
    """What was recorded, the same in every layout."""
    return recorded_study(readers=4)


@pytest.mark.parametrize("name", LAYOUTS)
def test_answered_draft_of_any_layout_builds_the_study(
    name: str, recorded: RecordedStudy, tmp_path: Path
) -> None:
    """With what only the lab can know in its place, a draft gives the same outcomes to the byte."""
    by_hand = write_events(recorded, tmp_path, LAYOUTS[name])
    study = tomllib.loads(by_hand.read_text(encoding="utf-8"))
    drafted = etl.draft([tmp_path / "logs"], into=tmp_path / "draft.toml")
    assert drafted.findings.lines() == []
    answers = lab_knows(study)
    assert {question.key for question in drafted.questions} <= answers.keys()
    told = answered(drafted.text, answers)
    (tmp_path / "answered.toml").write_text(told, encoding="utf-8")
    etl.build(etl.load_study(by_hand), into=tmp_path / "by_hand")
    etl.build(etl.load_study(tmp_path / "answered.toml"), into=tmp_path / "from_draft")
    outcomes = [
        (tmp_path / folder / "outcomes.parquet").read_bytes()
        for folder in ("by_hand", "from_draft")
    ]
    assert outcomes[0] == outcomes[1]


@pytest.fixture(scope="module")
def drafted_layouts(
    recorded: RecordedStudy, tmp_path_factory: pytest.TempPathFactory
) -> dict[str, tuple[dict[str, list[str]], list[str]]]:
    """The patterns of each layout's draft, and the lines of its first log that tell something."""
    found = {}
    for name, dialect in LAYOUTS.items():
        folder = tmp_path_factory.mktemp("layout")
        write_events(recorded, folder, dialect)
        logs = tomllib.loads(etl.draft([folder / "logs"]).text)["logs"]
        patterns = {
            key: [own] if isinstance(own, str) else own for key, own in logs["patterns"].items()
        }
        reading = [re.compile(one) for key in READING for one in patterns.get(key, ())]
        text = next(iter(sorted((folder / "logs").iterdir()))).read_text(encoding="utf-8")
        lines = [line for line in text.split("\n") if any(p.search(line) for p in reading)]
        assert len(lines) > 50
        found[name] = patterns, lines
    return found


@pytest.mark.parametrize("name", LAYOUTS)
@given(data=st.data())
@settings(max_examples=30, deadline=None)
def test_no_damaged_line_is_left_aside(
    name: str,
    drafted_layouts: dict[str, tuple[dict[str, list[str]], list[str]]],
    data: st.DataObject,
) -> None:
    """A line that tells something and has one slip in it is among none that mean nothing."""
    patterns, lines = drafted_layouts[name]
    line = data.draw(st.sampled_from(lines))
    slipped = data.draw(st.sampled_from(list(damaged(line))))
    assert not [p for p in patterns.get("ignore", ()) if re.search(p, slipped)]


@pytest.mark.parametrize("name", LAYOUTS)
def test_patterns_of_lines_left_aside_are_narrow(
    name: str, drafted_layouts: dict[str, tuple[dict[str, list[str]], list[str]]]
) -> None:
    """What is left aside is described from its beginning to its end, by a word of its own."""
    for pattern in drafted_layouts[name][0].get("ignore", ()):
        assert pattern[0] == "^"
        assert pattern[-1] == "$"
        assert re.search(r"(?<!\\)[^\W\d_]{2,}", pattern)
