"""Study files on disk, and what is said of them."""

from collections.abc import Callable, Collection
from pathlib import Path

import pytest

from etl.errors import StudyError
from etl.study import Study, load_study


@pytest.fixture
def load(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., Study]:
    """Write a study file into an empty folder and load it under the name study.toml."""
    monkeypatch.chdir(tmp_path)

    def written_and_loaded(
        written: str | bytes, known_outcomes: Collection[str] | None = None
    ) -> Study:
        raw = written if isinstance(written, bytes) else written.encode("utf-8")
        Path("study.toml").write_bytes(raw)
        return load_study("study.toml", known_outcomes=known_outcomes)

    return written_and_loaded


@pytest.fixture
def refusal(load: Callable[..., Study]) -> Callable[..., str]:
    """The whole message by which a study file is refused."""

    def message(written: str | bytes, known_outcomes: Collection[str] | None = None) -> str:
        with pytest.raises(StudyError) as caught:
            load(written, known_outcomes)
        return str(caught.value)

    return message
