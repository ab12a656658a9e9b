"""The page in headless Chromium: silent, alone, accessible, usable without scripts.

Needs Chromium (or Chrome), node and npm, which fetches playwright-core and axe-core into a folder
for temporary files; without any of them these tests are skipped.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import tempfile
from pathlib import Path
from typing import Any

import pytest

import etl
from tests.report.making import Made
from tests.report.test_page_numbers import expected_readers
from tests.trace.tracing import unsure_sample

PACKAGES = ("playwright-core@1.65.1", "axe-core@4.14.1")
BROWSERS = ("chromium", "chromium-browser", "google-chrome", "chrome", "msedge")

pytestmark = pytest.mark.slow


def needed(*names: str) -> str:
    """The first of these programs that is here."""
    found = next((path for name in names if (path := shutil.which(name))), None)
    if found is None:
        pytest.skip(f"needs one of the programs {', '.join(names)}")
    return found


@pytest.fixture(scope="session")
def packages() -> Path:
    """A folder with the packages, kept between runs."""
    npm = needed("npm")
    versions = "_".join(p.replace("@", "-") for p in PACKAGES)
    folder = Path(tempfile.gettempdir()) / f"trialwright-tests-{versions}"
    if not (folder / "done").exists():
        folder.mkdir(exist_ok=True)
        install = [npm, "install", "--no-audit", "--no-fund", "--ignore-scripts", *PACKAGES]
        try:
            done = subprocess.run(
                install, cwd=folder, capture_output=True, timeout=120, check=False
            )
        except subprocess.TimeoutExpired:
            pytest.skip("npm did not answer within two minutes")
        if done.returncode:
            pytest.skip(f"npm cannot install: {done.stderr.decode(errors='replace')[-200:]}")
        (folder / "done").touch()
    return folder


@pytest.fixture(scope="session")
def seen(
    page_text: str, packages: Path, tmp_path_factory: pytest.TempPathFactory
) -> dict[str, Any]:
    """What the browser saw of the page of the screened orchard study."""
    page = tmp_path_factory.mktemp("page") / "audit.html"
    page.write_text(page_text, encoding="utf-8", newline="\n")
    return looked_at(page, packages)


@pytest.fixture(scope="session")
def seen_lines(packages: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """What the browser saw of the page of texts of several lines, with drawings of unsure ones."""
    root = tmp_path_factory.mktemp("lines")
    etl.build(etl.load_study(unsure_sample(root)), into=root / "out", workers=1)
    return looked_at(root / "out" / "audit.html", packages)


def looked_at(page: Path, packages: Path) -> dict[str, Any]:
    """What the browser sees of a page."""
    node, browser = needed("node"), needed(*BROWSERS)
    script = Path(__file__).with_name("browser.mjs")
    done = subprocess.run(
        [node, os.fspath(script), browser, os.fspath(page), os.fspath(packages)],
        capture_output=True,
        timeout=240,
        check=False,
        encoding="utf-8",
    )
    assert done.returncode == 0, done.stderr
    answer: dict[str, Any] = json.loads(done.stdout)
    return answer


@pytest.mark.parametrize("look", ["light", "dark", "phone"])
def test_page_with_unsure_lines_is_as_sound(seen_lines: dict[str, Any], look: str) -> None:
    """The part on lines and the maps in the gallery: no fault, no request, nothing too wide."""
    assert seen_lines["faults"][look] == []
    assert (seen_lines["requests"], seen_lines["console"]) == ([], [])
    assert seen_lines["overflow"][look] == 0


def test_no_request_leaves_the_page(seen: dict[str, Any]) -> None:
    """Not even where the page's own policy is switched off."""
    assert seen["requests"] == []


def test_console_is_silent(seen: dict[str, Any]) -> None:
    """No error, no warning, nothing."""
    assert seen["console"] == []


@pytest.mark.parametrize("look", ["light", "dark", "phone"])
def test_no_fault_of_accessibility(seen: dict[str, Any], look: str) -> None:
    """axe-core finds nothing, however slight."""
    assert seen["faults"][look] == []


def test_nothing_is_wider_than_the_window(seen: dict[str, Any]) -> None:
    """Neither on a screen nor on a phone of 360 px."""
    assert seen["overflow"] == {"light": 0, "dark": 0, "phone": 0}


def test_dark_is_dark_and_paper_is_white(seen: dict[str, Any]) -> None:
    """The page follows the system; print is on white even then."""
    assert sum(rgb(seen["darkPaper"])) < 100
    assert sum(rgb(seen["lightPaper"])) > 700
    assert rgb(seen["print"]["paper"]) == [255, 255, 255]


def rgb(color: str) -> list[int]:
    """The parts of a colour."""
    return [int(part) for part in color.removeprefix("rgb(").removesuffix(")").split(",")]


def test_table_sorts_by_keyboard(seen: dict[str, Any], made: Made) -> None:
    """A press on a head sorts up, another down; readers without a value come last both times."""
    values = expected_readers(made)["duration"].sort_values()
    nameless = [who for who in made.participants if who not in values.index]
    assert seen["asWritten"] == made.participants
    assert seen["sorted"] == "ascending"
    assert seen["ascending"] == [*values.index, *nameless]
    assert seen["descending"] == [*values.index[::-1], *nameless]


def test_table_filters(seen: dict[str, Any], made: Made) -> None:
    """By a part of the name in any case, and by standing out."""
    assert sorted(seen["found"]) == [who for who in made.participants if who.startswith("P1")]
    assert 0 < len(seen["standingOut"]) < len(made.participants)
    out, all_ = len(seen["standingOut"]), len(made.participants)
    assert seen["status"] == f"{out} of {all_} readers"


def test_first_stop_skips_to_the_content(seen: dict[str, Any]) -> None:
    """The first press on Tab offers to skip what every page begins with."""
    assert seen["firstStop"] == "Skip to the content"


@pytest.mark.parametrize(
    "what",
    ['href="#losses"', 'id="find"', 'id="choose"', "<button", "<summary", "Table of readers"],
)
def test_everything_is_reached_by_keyboard(seen: dict[str, Any], what: str) -> None:
    """Links, the filter, the heads that sort, the numbers behind drawings, what scrolls."""
    assert any(what in stop for stop in seen["stops"])


def test_page_is_whole_without_scripts(seen: dict[str, Any], made: Made) -> None:
    """All rows and drawings are there, and no control that would do nothing."""
    still = seen["withoutScripts"]
    assert still["rows"] == len(made.participants)
    assert still["drawings"] > 100
    assert (still["controls"], still["buttons"]) == (False, 0)


def test_page_prints(seen: dict[str, Any]) -> None:
    """Without what paper cannot do."""
    assert seen["print"]["bytes"] > 50_000
    assert not seen["print"]["nav"]
