"""The orchard study, built once, as it is and as screening might leave it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

import etl
from etl.report import GalleryEntry, NotRecorded
from etl.report.audit import audit_page
from tests.report.making import Made, made_from, screened
from tests.report.reading import Node, read

PROJECT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="session")
def orchard(tmp_path_factory: pytest.TempPathFactory) -> Made:
    """The tables of the orchard study with nothing left out but skipped trials."""
    study = etl.load_study(PROJECT / "sample_logs" / "orchard" / "study.toml")
    unscreened = study.model_copy(update={"screening": None})
    return made_from(etl.build(unscreened, into=tmp_path_factory.mktemp("orchard") / "out"), study)


@pytest.fixture(scope="session")
def passages(tmp_path_factory: pytest.TempPathFactory) -> Made:
    """The tables of the passages study: no factors, every word a region."""
    study = etl.load_study(PROJECT / "sample_logs" / "passages" / "study.toml")
    return made_from(etl.build(study, into=tmp_path_factory.mktemp("passages") / "out"), study)


@pytest.fixture(scope="session")
def made(orchard: Made) -> Made:
    """The orchard study with losses of every kind, a trial not recorded, and a drawing."""
    drawing = '<svg width="600" height="60" role="img" aria-label="A trial"><title>A</title></svg>'
    entry = GalleryEntry("Reader P07, trial 12", "It is the longest.", drawing, "P07, trial 12")
    return replace(screened(orchard), not_recorded=[NotRecorded("P11", "23")], gallery=[entry])


@pytest.fixture(scope="session")
def page_text(made: Made) -> str:
    """The page of the screened orchard study."""
    return audit_page(made.given())


@pytest.fixture(scope="session")
def page(page_text: str) -> Node:
    """The same, read back."""
    return read(page_text)
