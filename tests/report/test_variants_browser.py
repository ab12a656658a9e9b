"""The page about variants in headless Chromium: sound, silent, sorted, whole without scripts.

Skipped where there is no Chromium, node or npm, as the other tests of pages in a browser.
"""

from __future__ import annotations

import json
import os
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from etl.report.variants_input import VariantsInput
from etl.report.variants_page import write_variants_page
from tests.report import test_browser as browsing
from tests.report.varying import Names, crossing_of, facts_of, named_crossing

packages = browsing.packages
pytestmark = pytest.mark.slow
LONG = "a name that goes on and on and_has_a_part_that_is_longer_than_any_phone_is_wide_" * 2
CASES: dict[str, Callable[[], VariantsInput]] = {
    "4 variants": lambda: facts_of(crossing_of([2, 2])),
    "36 variants": lambda: facts_of(crossing_of([3, 3, 2, 2]), without=3),
    "1 000 variants": lambda: facts_of(crossing_of([5, 5, 2, 2, 5, 2])),
    "named": lambda: facts_of(named_crossing()),
    "rates": lambda: facts_of(crossing_of([3, 3, 2]), rates=True),
    "long names": lambda: facts_of(
        crossing_of([3, 3, 2, 3, 2]),
        names=Names(LONG, LONG, LONG, LONG, f"{LONG}1", f"{LONG}2", LONG, LONG),
    ),
}


@pytest.fixture(scope="module", params=CASES)
def seen(
    request: pytest.FixtureRequest, packages: Path, tmp_path_factory: pytest.TempPathFactory
) -> dict[str, Any]:
    """What the browser saw of a page."""
    folder = tmp_path_factory.mktemp("page")
    facts = CASES[request.param]()
    return {**answer_of("variants.mjs", folder, facts, packages), "facts": facts}


def answer_of(script: str, folder: Path, facts: VariantsInput, packages: Path) -> dict[str, Any]:
    """What a script of the browser says of the page of these facts."""
    write_variants_page(folder, facts)
    node, browser = browsing.needed("node"), browsing.needed(*browsing.BROWSERS)
    files = Path(__file__).with_name(script), folder / "variants.html", packages
    done = subprocess.run(
        [node, os.fspath(files[0]), browser, *map(os.fspath, files[1:])],
        capture_output=True,
        timeout=240,
        check=False,
        encoding="utf-8",
    )
    assert done.returncode == 0, done.stderr
    answer: dict[str, Any] = json.loads(done.stdout)
    return answer


def test_page_is_sound_and_silent(seen: dict[str, Any]) -> None:
    """No fault of accessibility with everything unfolded, no request, no message."""
    assert seen["faults"] == {"light": [], "dark": [], "phone": []}
    assert (seen["requests"], seen["console"]) == ([], [])


def test_nothing_is_wider_than_the_window(seen: dict[str, Any]) -> None:
    """Neither the page nor a mark of a curve, which no bar scrolls to."""
    assert seen["overflow"] == {"light": 0, "dark": 0, "phone": 0}
    assert seen["outside"] == {"light": 0, "dark": 0, "phone": 0}


def test_losses_sort_by_keyboard_and_the_study_stays_first(seen: dict[str, Any]) -> None:
    """A press on a head sorts the others up, another down."""
    facts = seen["facts"]
    kept = [one.trials_kept for one in facts.losses]
    shown = [kept[number - 1] for number in seen["asWritten"]]
    assert seen["asWritten"][0] == facts.crossing.base + 1
    assert seen["ascending"] == [shown[0], *sorted(shown[1:])]
    assert seen["descending"] == [shown[0], *sorted(shown[1:], reverse=True)]
    assert seen["sorted"] == "descending"


def test_page_is_whole_without_scripts(seen: dict[str, Any]) -> None:
    """All rows and curves are there, and no button that would do nothing."""
    assert seen["withoutScripts"] == {
        "rows": len(seen["asWritten"]),
        "curves": len(seen["facts"].leading),
        "buttons": 0,
    }


def test_page_prints_on_white_and_a_click_selects_the_passage(seen: dict[str, Any]) -> None:
    """Paper has no links to parts."""
    assert browsing.rgb(seen["print"]["paper"]) == [255, 255, 255]
    assert not seen["print"]["nav"]
    assert seen["print"]["bytes"] > 30_000
    assert seen["selected"] == "all"


def test_rows_for_variants_not_shown_sort_with_places_only(packages: Path, tmp_path: Path) -> None:
    """By place they stand in their gaps; by a decision, which they have not, at the end."""
    facts = facts_of(crossing_of([5, 5, 2, 2, 5]), without=120)
    seen = answer_of("variants_sorting.mjs", tmp_path, facts, packages)
    assert seen["errors"] == []
    written = seen["asWritten"]
    gaps = [row[1] for row in written if row[0]]
    assert len(gaps) >= 2
    assert seen["byPlace"] == written
    by_decision = seen["byDecision"]
    assert [row[1] for row in by_decision[-len(gaps) :]] == gaps
    taken = [row[2] for row in by_decision[: -len(gaps)]]
    assert taken == sorted(taken, key=int)
    assert not any(row[0] for row in by_decision[: -len(gaps)])
