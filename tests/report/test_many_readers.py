"""A page about very many readers: it does not grow with them, and says so."""

from __future__ import annotations

import pytest

from etl.report.audit import audit_page
from tests.report.making import Made
from tests.report.reading import Node, read

ROWS = 8


@pytest.fixture
def bounded(made: Made, monkeypatch: pytest.MonkeyPatch) -> Node:
    """The page of the screened study, as if eight readers were very many."""
    monkeypatch.setattr("etl.report.readers.MOST_ROWS", ROWS)
    monkeypatch.setattr("etl.report.readers.MOST_STRANGE", 2)
    return read(audit_page(made.given()))


def names(table: Node) -> list[str]:
    """The readers who have a row."""
    return [row.attributes["data-reader"] for row in table.all("tr", data_reader=None)]


def test_remarkable_readers_have_their_rows(bounded: Node, page: Node) -> None:
    """Who was left out or stands out comes first; the order is that of the whole table."""
    shown, every = (names(p.one("table", id="reader-table")) for p in (bounded, page))
    assert len(shown) == ROWS < len(every)
    assert shown == [name for name in every if name in shown]
    whole = page.one("table", id="reader-table")
    remarkable = [
        row.attributes["data-reader"]
        for row in whole.all("tr", data_reader=None)
        if "data-out" in row.attributes or "left out by" in row.text
    ]
    assert 0 < len(remarkable) <= ROWS
    assert set(remarkable) <= set(shown)


def test_the_page_says_how_many_have_no_row(bounded: Node, page: Node) -> None:
    """And where they are; the page of few readers says nothing of that."""
    every = len(names(page.one("table", id="reader-table")))
    assert f"These are {ROWS} of {every} readers" in bounded.text
    assert f"accounts.csv, which has {every - ROWS} more readers" in bounded.text
    assert "With so many readers" in bounded.text
    assert "These are" not in page.text
    assert "With so many readers" not in page.text


def test_accounts_add_up_over_all(bounded: Node, page: Node) -> None:
    """Rows are those of the table of readers, the sums are of everybody."""
    shown = names(bounded.one("table", id="reader-table"))
    for unit in ("trials", "fixations"):
        few, whole = (p.one("table", data_unit=unit) for p in (bounded, page))
        assert names(few) == shown
        assert few.one("tfoot").text == whole.one("tfoot").text
        rows = {
            row.attributes["data-reader"]: row.cells() for row in whole.all("tr", data_reader=None)
        }
        for row in few.all("tr", data_reader=None):
            assert row.cells() == rows[row.attributes["data-reader"]]


def test_strips_judge_all_and_draw_some(bounded: Node, page: Node) -> None:
    """The words below a strip are the same; the dots are fewer, those farthest out among them."""
    for few, whole in zip(
        bounded.all("figure", data_measure=None), page.all("figure", data_measure=None), strict=True
    ):
        words = [p.text for p in few.all("p", class_="strip-words")]
        assert words == [p.text for p in whole.all("p", class_="strip-words")]
        dots, every = (
            len(list(f.all("circle", class_="reader")))
            + len(list(f.all("use", class_="stands-out")))
            for f in (few, whole)
        )
        assert dots == min(every, ROWS)


def test_links_lead_somewhere(bounded: Node) -> None:
    """A reader who is named at the top has a row to be led to."""
    there = {node.attributes["id"] for node in bounded.all(id=None)}
    links = [a.attributes["href"] for a in bounded.all("a", href=None)]
    assert {link[1:] for link in links if link.startswith("#")} <= there
    assert any(link.startswith("#reader-") for link in links)


def test_lists_of_logs_and_warnings_are_cut(made: Made, monkeypatch: pytest.MonkeyPatch) -> None:
    """What there is no room for is counted."""
    monkeypatch.setattr("etl.report.collect.MOST_FINDINGS", 2)
    given = made.given()
    given.warnings[:] = [f"warning: odd {n}\n  fix: it" for n in range(5)] + ["note: of note"]
    text = read(audit_page(given)).text
    assert "odd 1" in text
    assert "odd 2" not in text
    assert "and 3 more, which run.json lists" in text
    assert "of note" in text
