"""A draft of any log, its questions answered, builds what the study file of a lab builds."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

import etl
from tests.drafting.answering import answered, lab_knows
from tests.simulator.dialects import DIALECTS, RecordedStudy, recorded_study


@pytest.fixture(scope="module")
def recorded() -> RecordedStudy:
    """What was recorded, the same in every dialect."""
    return recorded_study()


@pytest.mark.parametrize("dialect", DIALECTS)
def test_answered_draft_builds_the_study(
    dialect: str, recorded: RecordedStudy, tmp_path: Path
) -> None:
    """With what only the lab can know in its place, a draft gives the same outcomes to the byte."""
    by_hand = DIALECTS[dialect](recorded, tmp_path)
    study = tomllib.loads(by_hand.read_text(encoding="utf-8"))
    logs = tmp_path / "logs"
    drafted = etl.draft([logs if logs.is_dir() else tmp_path], into=tmp_path / "draft.toml")
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
