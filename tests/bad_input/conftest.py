"""A small study to spoil."""

from pathlib import Path

import pytest

from tests.bad_input.small_study import SmallStudy


@pytest.fixture
def study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> SmallStudy:
    """A sound study in the current folder, with an earlier build in its output folder."""
    monkeypatch.chdir(tmp_path)
    return SmallStudy.sound(tmp_path)
