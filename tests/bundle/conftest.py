"""Bundles of the sample studies and of small odd ones, each built once."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from tests.bundle.odd_studies import ODD_STUDIES, even_study
from tests.end_to_end.building import build, copied_sample
from tests.handoff.bundles import bundle_of, small_study


@pytest.fixture(scope="session")
def orchard_bundle(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The bundle of the orchard study as committed."""
    root = tmp_path_factory.mktemp("orchard")
    return build(copied_sample("orchard", root, rules=None), root / "built").folder / "handoff"


@pytest.fixture(scope="session")
def passages_bundle(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The bundle of the passages study as committed."""
    root = tmp_path_factory.mktemp("passages")
    return build(copied_sample("passages", root, rules=None), root / "built").folder / "handoff"


@pytest.fixture(scope="session")
def even_bundle(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The bundle of a study whose readers do not differ."""
    return bundle_of(even_study(tmp_path_factory.mktemp("even")))


@pytest.fixture(scope="session")
def odd_bundle(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Path]:
    """The bundle of an odd study by its name."""
    made: dict[str, Path] = {}

    def of(name: str) -> Path:
        if name not in made:
            options = dict(ODD_STUDIES[name])
            folder = tmp_path_factory.mktemp("odd study")  # with a blank, as folders have
            made[name] = bundle_of(small_study(folder, options.pop("factors"), **options))
        return made[name]

    return of
