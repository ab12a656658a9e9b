"""The sample studies, built once, from which trials are traced."""

from __future__ import annotations

import re

import pytest

from tests.end_to_end.building import PROJECT, copied_sample
from tests.trace.tracing import BuiltStudy, unsure_sample


@pytest.fixture(scope="session")
def orchard(tmp_path_factory: pytest.TempPathFactory) -> BuiltStudy:
    """Sentences of one line."""
    folder = tmp_path_factory.mktemp("traced") / "orchard"
    return BuiltStudy(PROJECT / "sample_logs" / "orchard" / "study.toml", folder)


@pytest.fixture(scope="session")
def passages(tmp_path_factory: pytest.TempPathFactory) -> BuiltStudy:
    """Texts of several lines."""
    folder = tmp_path_factory.mktemp("traced") / "passages"
    return BuiltStudy(PROJECT / "sample_logs" / "passages" / "study.toml", folder)


@pytest.fixture(scope="session")
def unsure(tmp_path_factory: pytest.TempPathFactory) -> BuiltStudy:
    """Texts of several lines, half of them recorded badly."""
    root = tmp_path_factory.mktemp("unsure")
    return BuiltStudy(unsure_sample(root), root / "out")


SCREENING = """
[screening.fixations]
outside_text_time = true
off_screen = true
blink = "drop"
merge = { under_ms = 110, within_characters = 2 }
under_ms = 80
over_ms = 500
[screening.values]
outlier_sd = 2.5
"""


@pytest.fixture(scope="session")
def screened(tmp_path_factory: pytest.TempPathFactory) -> BuiltStudy:
    """The sentences under many rules; the other convention for fixations outside."""
    root = tmp_path_factory.mktemp("screened")
    study_file = copied_sample("orchard", root, {'outside = "ignore"': 'outside = "interrupt"'})
    text = study_file.read_text(encoding="utf-8")
    own = re.sub(r"(?ms)^\[screening.*?(?=^# ----|^\[(?!screening)|\Z)", "", text)
    study_file.write_text(own + SCREENING, encoding="utf-8", newline="\n")
    return BuiltStudy(study_file, root / "out")


@pytest.fixture(params=["orchard", "passages", "screened", "unsure"])
def study(request: pytest.FixtureRequest) -> BuiltStudy:
    """Each of the sample studies in turn."""
    return request.getfixturevalue(request.param)
