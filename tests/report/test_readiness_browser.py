"""The part on readiness in headless Chromium: sound, reached by keyboard, unfolded by links.

Skipped where there is no Chromium, node or npm, as the other tests of the page in a browser.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from etl.report.audit import audit_page
from tests.report import test_browser as browsing
from tests.report.making import small
from tests.report.readying import EVERY, named

packages = browsing.packages
pytestmark = pytest.mark.slow
LONG = "a level whose name goes on and on and_has_a_part_that_is_longer_than_any_phone_is_wide " * 2


@pytest.fixture(scope="module")
def seen(packages: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """What the browser saw of a page with an outcome of each verdict, and with long names."""
    long = named(LONG.strip())
    both = replace(long, outcomes=EVERY.outcomes + long.outcomes)
    made = small([(f"P{i}", "1", {}, [(1, 200.0), (2, 210.0)]) for i in range(3)], {})
    page = tmp_path_factory.mktemp("page") / "audit.html"
    text = audit_page(replace(made.given(), readiness=both))
    page.write_text(text, encoding="utf-8", newline="\n")
    return browsing.looked_at(page, packages)


@pytest.mark.parametrize("look", ["light", "dark", "phone"])
def test_part_is_sound(seen: dict[str, Any], look: str) -> None:
    """No fault of accessibility, with everything unfolded, and nothing wider than the window."""
    assert seen["faults"][look] == []
    assert seen["overflow"][look] == 0


def test_part_is_silent(seen: dict[str, Any]) -> None:
    """No request, no message."""
    assert (seen["requests"], seen["console"]) == ([], [])


def test_link_unfolds_what_it_leads_to(seen: dict[str, Any]) -> None:
    """A press on a name of the overview unfolds the outcome, and again after it was folded."""
    assert seen["unfolded"] == [["ready-1"], [], ["ready-1"]]
    assert seen["unfoldedAddress"] == "#ready-1"


@pytest.mark.parametrize("what", ['href="#readiness"', 'href="#ready-1"', '<summary class="'])
def test_part_is_reached_by_keyboard(seen: dict[str, Any], what: str) -> None:
    """The link at the top, the overview, the fold-outs."""
    assert any(what in stop for stop in seen["stops"])


def test_paper_has_only_what_is_unfolded(seen: dict[str, Any]) -> None:
    """Printing unfolds no outcome: sixty of them would fill a book."""
    assert seen["print"]["unfolded"] == 1
