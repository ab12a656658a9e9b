"""The page as a document: escaped, whole, the same again, sound for small and odd studies."""

from __future__ import annotations

import re
from dataclasses import replace
from importlib import resources
from pathlib import Path

import pytest

from etl.report import AUDIT, GalleryEntry, NotRecorded, Profiles, write_audit
from etl.report.audit import audit_page
from tests.report.making import Made, losing, small
from tests.report.reading import Node, read

ODD_NAMES = {
    "markup": "<script>alert(1)</script>",
    "quotes": "\"quoted\" & 'so'",
    "emoji": "reader 🍎👩‍🌾",
    "right to left": "قارئ ٣",
    "braces": "{{ 7 * 7 }}{% raw %}",
    "end of style": "</style></svg>",
    "long": "x" * 300,
}


def of_pages(node: Node) -> list[str]:
    """Every tag in order."""
    return [child.tag for child in node.all()]


def with_names(text: str) -> Made:
    """A study whose readers, factor, levels, regions and title all are called like this."""
    readers = [f"{text} {i}" for i in range(6)]
    trials = [
        (who, "1", {text: f"{text} {i % 2}"}, [(1, 200.0 + i), (2, 210.0 + (900 if i == 5 else i))])
        for i, who in enumerate(readers)
    ]
    levels = {text: (f"{text} 0", f"{text} 1")}
    made = small(trials, levels, title=text, regions=(f"{text} a", f"{text} b"))
    made = losing(made, {(readers[1], "1"): "notes"})
    entry = GalleryEntry(text, text, "<svg></svg>", text)
    return replace(
        made,
        gallery=[entry],
        warnings=[f"warning: {text}"],
        not_recorded=[NotRecorded(readers[0], text, text)],
    )


@pytest.mark.parametrize("text", ODD_NAMES.values(), ids=ODD_NAMES)
def test_names_appear_as_text(text: str) -> None:
    """Names add no element to the page: it has the tags that plain names give, and all the text."""
    odd, plain = (
        read(audit_page(with_names(text).given())),
        read(audit_page(with_names("n").given())),
    )
    assert of_pages(odd) == of_pages(plain)
    assert odd.one("h1").text == text
    whole = odd.one("main").text
    for word in (f"{text} 0", f"{text} 1", f"{text} a"):
        assert " ".join(word.split()) in whole


def test_names_keep_their_direction(page_text: str) -> None:
    """Names stand in elements that keep their direction of writing to themselves."""
    made = with_names(ODD_NAMES["right to left"])
    tree = read(audit_page(made.given()))
    names = {node.text for node in tree.all("bdi")}
    assert {*made.participants, *made.design.regions, *made.design.factors} <= names
    assert tree.one("h1").attributes["dir"] == "auto"
    assert "<bdi>P01</bdi>" in page_text


def test_same_input_gives_same_bytes(made: Made, tmp_path: Path) -> None:
    """No clock, no chance, no order of a set is in the page."""
    pages = []
    for name in ("one", "other"):
        folder = tmp_path / name
        folder.mkdir()
        write_audit(folder, made.given())
        pages.append((folder / AUDIT).read_bytes())
    assert pages[0] == pages[1]
    assert b"\r" not in pages[0]


def test_page_names_no_other_file(page: Node) -> None:
    """Nothing is loaded: links lead into the page or to the sources of methods."""
    ids = {node.attributes["id"] for node in page.all(id=None)}
    for node in page.all():
        for name in ("src", "href", "srcset", "action", "data", "poster", "background"):
            value = node.attributes.get(name)
            if value is None:
                continue
            into = value.startswith("#") and value[1:] in ids
            source = node.tag == "a" and value.startswith("https://doi.org/")
            icon = node.tag == "link" and value == "data:,"
            assert into or source or icon, (node.tag, name, value)


def test_style_loads_nothing(page: Node) -> None:
    """The style sheet refers to patterns of the page only."""
    style = page.one("style").text
    assert "@import" not in style
    assert all(url.startswith("#") for url in re.findall(r"url\(([^)]*)\)", style))


def test_page_forbids_requests(page: Node) -> None:
    """A policy in the page itself forbids loading whatever a name could smuggle in."""
    policy = page.one("meta", http_equiv="Content-Security-Policy").attributes["content"]
    assert policy.startswith("default-src 'none'")


def test_ids_are_given_once(page: Node) -> None:
    """No two elements have the same id."""
    ids = [node.attributes["id"] for node in page.all(id=None)]
    assert len(ids) == len(set(ids))


def test_document_has_language_landmarks_and_captions(page: Node) -> None:
    """Programs that read aloud find their way."""
    assert page.one("html").attributes["lang"] == "en"
    for landmark in ("header", "main", "footer"):
        page.one(landmark)
    assert page.one("a", class_="skip").attributes["href"] == "#content"
    assert all(list(table.all("caption")) for table in page.all("table"))
    assert all(th.attributes.get("scope") for th in page.all("th"))


def test_gallery_shows_drawings_with_reasons(page: Node, made: Made) -> None:
    """Each drawing stands on the page as it is, with title and reason, and the list leads to it."""
    entry = made.gallery[0]
    figure = page.one("figure", class_="plate")
    assert entry.title in figure.text
    assert entry.why in figure.text
    assert figure.one("svg").attributes["aria-label"] == "A trial"
    link = page.one("ol", class_="gallery-list").one("a")
    assert (link.text, link.attributes["href"]) == (entry.link_text, f"#{figure.attributes['id']}")


def test_page_without_gallery_has_no_place_for_it(orchard: Made) -> None:
    """No empty heading, no link into nothing."""
    tree = read(audit_page(orchard.given()))
    assert not list(tree.all(id="gallery"))
    assert not list(tree.all("a", href="#gallery"))


def test_first_lines_name_what_matters(page: Node) -> None:
    """Loss that differs, readers left out, readers who stand out, trials not recorded, warnings."""
    first = page.one("section", class_="first").text
    assert "Loss differs fit: " in first
    assert "This can bias the result" in first
    assert "Left out P20 (correct_share_under)." in first
    assert re.search(r"Stands out P07: trials lost [\d.]+%, [\d.]+ deviations above", first)
    assert "1 trial of the trial list is in no log: P11 trial 23." in first
    assert "Warning trial_list.csv" in first


def test_quiet_study_says_so() -> None:
    """Where nothing was lost and nobody stands out, the page says that, and does not look odd."""
    six = [(f"P{i}", "1", {}, [(1, 200.0 + i), (2, 210.0 + i)]) for i in range(6)]
    first = read(audit_page(small(six, {}).given())).one("section", class_="first").text
    assert "No reader stands out, and no loss of trials differs between conditions." in first


def test_one_reader_is_not_judged() -> None:
    """With one reader there is nobody to compare with."""
    made = small([("P1", "1", {"f": "a"}, [(1, 200.0), (2, 210.0)])], {"f": ("a", "b")})
    text = read(audit_page(made.given())).one("main").text
    assert "1 reader: too few to say who stands out" in text
    assert "nobody is judged" in text
    assert "nothing to compare: no trial was lost" in text


def test_study_without_factors_has_rates_over_all_trials() -> None:
    """One panel, called all trials."""
    made = small([(f"P{i}", "1", {}, [(1, 200.0), (2, 210.0)]) for i in range(3)], {})
    tree = read(audit_page(made.given()))
    assert "The study names no factors" in tree.one("main").text
    table = tree.one("section", data_outcome="fixated").one("table", class_="rates")
    assert table.one("tr", data_region="a").cells()[1].startswith("100.0% of 3")


def test_study_in_which_everybody_lost_everything_has_a_page() -> None:
    """No division by nothing where no trial is left."""
    made = small([("P1", "1", {}, [(1, 200.0)]), ("P2", "1", {}, [(1, 210.0)])], {})
    lost = losing(made, {("P1", "1"): "notes", ("P2", "1"): "notes"})
    text = read(audit_page(lost.given())).one("main").text
    assert "2 of 2 trials lost, 100.0%" in text
    assert "No reader has a value" in text


def test_study_without_readers_has_a_page(orchard: Made) -> None:
    """An empty study is no reason to fail."""
    given = replace(orchard.given(), profiles=Profiles(), accounts=(), warnings=())
    assert "0 readers read 0 trials" in read(audit_page(given)).one("header").text


def test_study_without_title_has_a_heading(orchard: Made) -> None:
    """The heading is never empty."""
    given = replace(orchard.given(), study={**orchard.study, "title": ""})
    assert read(audit_page(given)).one("h1").text == "A study without a title"


def test_many_regions_are_taken_together(passages: Made) -> None:
    """A study in which every word is a region has one row an outcome."""
    tree = read(audit_page(passages.given()))
    table = tree.one("section", data_outcome="regression_in").one("table", class_="rates")
    values = passages.frames["outcomes"].query("measure == 'regression_in'")["value"].dropna()
    cell = table.one("td", data_n=None).attributes
    assert (int(cell["data-ones"]), int(cell["data-n"])) == (int(values.sum()), len(values))
    assert f"the study’s {len(passages.design.regions)} region names" in tree.one("main").text


def test_study_is_shown_as_understood(page: Node) -> None:
    """Keys with their values; keys not used are named."""
    section = page.one("section", id="study")
    keys = {
        row.one("dt").text: row.one("dd").text
        for row in section.all("div")
        if "dt" in {c.tag for c in row.children if isinstance(c, Node)}
    }
    assert keys["columns.onset"] == '{ column = "start_ms", unit = "ms" }'
    assert keys["trials"].startswith('{ notes = "notes.csv"')
    assert keys["factors"] == '["cue", "fit", "group"]'
    assert "participant_from_name" in section.text


def test_hundreds_of_readers_make_a_page_that_opens(made: Made) -> None:
    """400 readers stay under 3 MB, and no more than 60 bars are drawn."""
    given = made.given()
    profiles, accounts = Profiles(counts=given.profiles.counts), []
    for place in range(400):
        old = given.profiles.readers[place % len(given.profiles.readers)]
        profiles.readers.append(replace(old, participant=f"R{place:03}"))
        own = [row for row in given.accounts if row.participant == old.participant]
        accounts += [replace(row, participant=f"R{place:03}") for row in own]
    text = audit_page(replace(given, profiles=profiles, accounts=accounts))
    assert len(text.encode("utf-8")) < 3_000_000
    tree = read(text)
    assert len(list(tree.one("ul", class_="reader-bars").all("li"))) == 60
    assert len(list(tree.one("table", id="reader-table").all("tr", data_reader=None))) == 400


def test_templates_are_part_of_the_package() -> None:
    """Templates, style and script lie inside the package, where an installation finds them."""
    folder = resources.files("etl.report") / "templates"
    assert {"audit.html", "style.css", "sorting.js"} <= {path.name for path in folder.iterdir()}
