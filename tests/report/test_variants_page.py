"""The page about variants as a document: escaped, whole, the same again, true to its input."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from etl.report.variants_input import VariantsInput
from etl.report.variants_page import VARIANTS_PAGE, variants_page, write_variants_page
from etl.report.variants_words import value
from etl.variants.facts import Crossing, Setting
from tests.report.reading import Node, read
from tests.report.test_page_text import ODD_NAMES
from tests.report.varying import Names, crossing_of, facts_of, named_crossing


def page_of(facts: VariantsInput) -> Node:
    """The page read back."""
    return read(variants_page(facts))


def by_class(node: Node, kind: str, tag: str = "") -> list[Node]:
    """Elements of a class."""
    return [n for n in node.all(tag) if kind in n.attributes.get("class", "").split()]


def called(text: str) -> VariantsInput:
    """An input in which everything that has a name is called like this."""
    base = crossing_of([2, 3])
    settings = tuple(
        Setting(f"{text}.{i}", (f"{text} off", *own.alternatives[1:]), 0)
        for i, own in enumerate(base.settings)
    )
    crossing = Crossing(settings, (text,) * len(base), base.choices, 0)
    names = Names(text, text, text, text, f"{text} 1", f"{text} 0", text, text)
    facts = facts_of(crossing, names=names)
    one = facts.trials[0]
    trials = (
        replace(one, session=text, trial=text, item=text, changes=(text,), pages=((text, text),)),
    )
    return replace(
        facts,
        about=text,
        study_file=text,
        variants_file=text,
        rule=text,
        passages=(text, text),
        trials=trials,
        tables=((text, text),),
    )


@pytest.mark.parametrize("text", ODD_NAMES.values(), ids=ODD_NAMES)
def test_names_appear_as_text(text: str) -> None:
    """Names add no element to the page: it has the tags that plain names give, and all the text."""
    odd, plain = page_of(called(text)), page_of(called("n"))
    # An underscore or a full stop in a name is a place where it may break, hence no count of these.
    tags, expected = ([n.tag for n in p.all() if n.tag != "wbr"] for p in (odd, plain))
    assert tags == expected
    assert odd.one("h1").text == text
    whole = odd.one("main").text
    for word in (f"{text} 0", f"{text} 1", f"{text} off"):
        assert " ".join(word.split()) in whole


def test_same_input_gives_same_bytes(tmp_path: Path) -> None:
    """No clock, no chance, no order of a set is in the page."""
    pages = []
    for name in ("one", "other"):
        (tmp_path / name).mkdir()
        write_variants_page(tmp_path / name, facts_of(crossing_of([3, 3, 2])))
        pages.append((tmp_path / name / VARIANTS_PAGE).read_bytes())
    assert pages[0] == pages[1]


def test_ids_are_there_once_and_links_lead_somewhere() -> None:
    """Links within the page, and shapes that drawings use."""
    page = page_of(facts_of(crossing_of([3, 3, 2, 2])))
    ids = [n.attributes["id"] for n in page.all() if "id" in n.attributes]
    assert len(ids) == len(set(ids))
    wanted = {
        n.attributes["href"][1:] for n in page.all() if n.attributes.get("href", "").startswith("#")
    }
    assert wanted <= set(ids)


def test_page_asks_for_nothing() -> None:
    """Addresses outside are those of the sources and the tables' and traces' only."""
    text = variants_page(facts_of(crossing_of([3, 3])))
    links = re.findall(r'(?:href|src)="([^"#][^"]*)"', text)
    assert {x.split("/")[2] for x in links if ":" in x and x != "data:,"} == {"doi.org"}
    assert "url(http" not in text


@pytest.mark.parametrize(
    ("alternatives", "columns"), [([2, 2], 4), ([5, 5, 2, 3], 150), ([5, 5, 2, 2, 2], 100)]
)
def test_many_variants_share_columns(alternatives: list[int], columns: int) -> None:
    """Each variant has a column, from 151 variants on there are 100, and the page says so."""
    facts = facts_of(crossing_of(alternatives))
    first = by_class(page_of(facts), "one-curve")[0]
    (drawn,) = by_class(first, "curve-plot")
    single = len(facts.crossing) <= 150
    if single:
        # The study is a diamond; all others are dots.
        assert len(by_class(drawn, "dot")) == columns - 1
    else:
        marks = "".join(n.attributes["d"] for n in by_class(drawn, "mid"))
        assert marks.count("M") == columns
    assert len(by_class(drawn, "own-mark")) == 1
    assert ("stands for" in first.text) is not single


def test_columns_hold_every_variant_once_in_order() -> None:
    """Bars of a decision's alternatives add up to one in each column, whatever it holds."""
    facts = facts_of(crossing_of([5, 5, 2, 2, 2]))
    first = by_class(page_of(facts), "one-curve")[0]
    heights = np.zeros((len(facts.crossing.settings), 100))
    weights = {s.setting: s.together for s in facts.summaries[0].shares}
    order = sorted(weights, key=lambda s: -weights[s])
    strips = [n.attributes["d"] for n in by_class(first, "bars")][1:]
    for at, setting in enumerate(order):
        for _ in facts.crossing.settings[setting].alternatives:
            for x, top in re.findall(r"M([\d.]+) 18V([\d.]+)h", strips.pop(0)):
                heights[at, int(float(x))] += 18 - float(top)
    assert strips == []
    # A share so small that its bar could not be seen is drawn a little higher.
    assert heights.min() > 15.9
    assert heights.max() < 20


def test_open_points_are_those_whose_interval_includes_0() -> None:
    """Hollow points, and the row beneath, against the input."""
    facts = facts_of(crossing_of([3, 3, 2]))
    compared = facts.summaries[0].compared
    clear = (compared.low > 0) | (compared.high < 0)
    first = by_class(page_of(facts), "one-curve")[0]
    (drawn,) = by_class(first, "curve-plot")
    dots = by_class(drawn, "dot")
    kinds = ["clear" in n.attributes["class"].split() for n in dots]
    others = [bool(clear[v]) for v in facts.summaries[0].order if v != facts.crossing.base]
    assert kinds == others
    assert 0 < sum(kinds) < len(kinds)
    (row,) = by_class(first, "curve-clear")
    assert len(by_class(row, "takes")) == clear.sum()


def test_points_lie_where_their_values_are() -> None:
    """The place down is linear in the value, with 0 on its line, and ever higher to the right."""
    facts = facts_of(crossing_of([3, 3, 2]))
    (drawn,) = by_class(by_class(page_of(facts), "one-curve")[0], "curve-plot")
    dots = [
        (float(n.attributes["cx"][:-1]), float(n.attributes["cy"])) for n in by_class(drawn, "dot")
    ]
    summary = facts.summaries[0]
    values = [summary.compared.difference[v] for v in summary.order if v != facts.crossing.base]
    slope, nought = np.polyfit(values, [y for _, y in dots], 1)
    assert slope < 0
    assert np.allclose(np.polyval((slope, nought), values), [y for _, y in dots], atol=0.2)
    (line,) = by_class(drawn, "nought")
    assert float(line.attributes["y1"]) == pytest.approx(nought, abs=0.2)
    assert [x for x, _ in dots] == sorted(x for x, _ in dots)


def test_decided_comparisons_stand_first_and_are_marked() -> None:
    """With a sign and in a table of their own, not by colour alone."""
    facts = facts_of(crossing_of([3, 3, 2]))
    part = page_of(facts).one("section", id="comparisons")
    turned = [one for one in facts.summaries if one.standing == "decided"]
    rows = by_class(part, "turned", "tr")
    assert 0 < len(rows) == len(turned) < len(facts.summaries)
    for row, one in zip(rows, turned, strict=True):
        assert len(by_class(row, "turned-sign")) == 1 + (not one.holds)
        assert f"{one.same_sign} of {len(facts.crossing)}" in row.text or "none" in row.text
        assert f"{one.apart} of {len(facts.crossing)}" in row.text
        known = one.compared.difference
        assert value(float(known.min()), rate=False) in row.cells()
        assert value(float(known.max()), rate=False) in row.cells()
    assert len(by_class(part, "figure", "td")) == len(facts.summaries)


def test_long_lists_are_cut_and_the_table_that_has_all_is_named() -> None:
    """Two hundred variants, the study first, then those that change most."""
    facts = facts_of(crossing_of([5, 5, 2, 2, 5]), regions=20)
    page = page_of(facts)
    losses = page.one("section", id="losses")
    rows = list(by_class(losses, "variant-losses")[0].one("tbody").all("tr"))
    assert len(rows) == 200
    assert "data-first" in rows[0].attributes
    changed = [one.cells_changed for one in facts.losses]
    shown = [int(next(row.all("th")).attributes["data-value"]) for row in rows[1:]]
    assert min(changed[n - 1] for n in shown) >= sorted(changed)[-199]
    assert "and 300 more: variants.csv has all." in losses.text
    assert "and 5 more: changes.csv has all." in page.text
    bare = page_of(replace(facts, tables=()))
    assert "and 300 more: the tables beside this page have all" in bare.text


@pytest.mark.parametrize(("alternatives", "whole"), [([5, 5, 2, 3, 2], 300), ([2, 2, 2], 8)])
def test_up_to_three_hundred_variants_all_have_their_numbers(
    alternatives: list[int], whole: int
) -> None:
    """In the order of the curve, and nothing is said of others."""
    facts = facts_of(crossing_of(alternatives))
    table = by_class(page_of(facts), "numbers")[0]
    rows = list(table.one("tbody").all("tr"))
    assert [row.cells()[0] for row in rows] == [f"{n + 1}" for n in range(whole)]
    assert by_class(table, "gap", "tr") == []
    assert "both ends and the study" not in page_of(facts).text


@pytest.mark.parametrize("without", [0, 1, 120])
def test_numbers_left_out_are_named_where_they_are_missing(without: int) -> None:
    """Places of rows and gaps add up to all; the end shown is that of the values."""
    whole = 500
    facts = facts_of(crossing_of([5, 5, 2, 2, 5]), without=without)
    first = by_class(page_of(facts), "one-curve")[0]
    rows = list(by_class(first, "numbers")[0].one("tbody").all("tr"))
    places: list[int] = []
    for row in rows:
        if "data-gap" not in row.attributes:
            places.append(int(row.cells()[0]))
            continue
        text = row.cells()[1]
        found = re.fullmatch(
            r"Places? (\d+)(?: to (\d+))?: (\d+) variants?( without a difference)? (?:is|are) not "
            r"shown\.",
            text,
        )
        assert found, text
        start = int(found[1])
        stop = int(found[2] or start)
        assert stop - start + 1 == int(found[3])
        assert bool(found[4]) is (start > whole - without)
        assert float(next(iter(row.all("td"))).attributes["data-value"]) == start - 0.5
        assert places == [] or start == places[-1] + 1
        places += range(start, stop + 1)
    assert places == [*range(1, whole + 1)]
    shown = [int(row.cells()[0]) for row in rows if "data-gap" not in row.attributes]
    there = whole - without
    own = int(np.flatnonzero(facts.summaries[0].order == facts.crossing.base)[0]) + 1
    assert shown == sorted({*range(1, 51), *range(there - 49, there + 1), own})
    assert f"and {whole - len(shown)} more: rates.csv has all." in first.text


def test_notices_keep_their_lines() -> None:
    """A notice of several lines is one entry, and the page says what it is."""
    facts = replace(facts_of(crossing_of([2])), notices=("first line\n    second line", "other"))
    text = variants_page(facts)
    assert "<strong>Warning</strong> first line\n    second line</li>" in text
    assert len(by_class(read(text), "message", "li")) == 2


def test_shares_that_are_not_quite_all_are_not_called_so() -> None:
    """The page writes a share as the console and the passage do."""
    facts = facts_of(crossing_of([2, 2]))
    one = facts.summaries[0]
    shares = (
        replace(one.shares[0], alone=0.9996, together=0.9998),
        replace(one.shares[1], alone=0.0, together=0.0004),
    )
    summaries = (replace(one, shares=shares, matters=0), *facts.summaries[1:])
    change = replace(facts.changes[0], cells=20_000, changed=19_999)
    page = page_of(replace(facts, summaries=summaries, changes=(change,)))
    table = by_class(page, "weights")[0]
    firsts = [next(iter(body.all("tr"))).cells() for body in table.all("tbody")]
    assert [row[1:3] for row in firsts] == [
        ["more than 99%", "more than 99%"],
        ["0%", "less than 1%"],
    ]
    assert "moves most with under_ms: more than 99% of the variance" in page.text
    assert "more than 99%" in by_class(page, "comparisons")[0].text
    assert "19,999 of 20,000 cells (more than 99.9%)" in page.text


def test_trials_say_how_they_were_chosen() -> None:
    """Where chances are known only."""
    told = "For each decision those that hang most on it; of equal ones the first."
    assert told in page_of(facts_of(crossing_of([2, 2]))).one("section", id="hanging").text
    assert told not in page_of(facts_of(named_crossing())).text


def test_variants_without_a_difference_are_counted_in_words() -> None:
    """They are not drawn, and there are no shares; the page says both and why."""
    first = by_class(page_of(facts_of(crossing_of([3, 3, 2]), without=2)), "one-curve")[0]
    assert "2 variants have no difference and are not drawn." in first.text
    assert "There are no shares: 2 variants have no difference" in first.text
    assert len(by_class(first, "dot")) == 18 - 2 - 1


def test_study_without_a_difference_is_not_marked() -> None:
    """And nothing is said of a sign that it has not."""
    crossing = crossing_of([3, 2])
    turned = Crossing(crossing.settings, crossing.names, crossing.choices, len(crossing) - 1)
    first = by_class(page_of(facts_of(turned, without=1)), "one-curve")[0]
    assert "The study as it stands has no difference, so it is not marked." in first.text
    assert "the study as it stands has no sign" in first.text.lower()
    assert by_class(first, "own-mark") == []


def test_no_variant_with_a_difference_has_no_drawing() -> None:
    """Words are left."""
    first = by_class(page_of(facts_of(crossing_of([2, 2]), without=4)), "one-curve")[0]
    assert "No variant has a difference." in first.text
    assert by_class(first, "curve-plot") == []


def test_named_variants_have_names_and_no_shares() -> None:
    """Why there are no shares and no chances is said; hangs are dashes."""
    facts = facts_of(named_crossing())
    page = page_of(facts)
    assert "not every combination of the alternatives is among the variants" in page.text
    assert "it cannot be told on which decision a cell hangs" in page.text
    assert "2 as the other lab does" in page.one("section", id="losses").text
    chances = by_class(page.one("section", id="cells"), "chance", "td")
    assert {n.text for n in chances} == {"–"}
    assert "nan" not in page.text.lower().split()


def test_rates_speak_of_no_sign() -> None:
    """A study without factors compares nothing."""
    page = page_of(facts_of(crossing_of([3, 2]), rates=True))
    assert by_class(page, "nought") == []
    shown = page.one("section", id="curves").text + page.one("section", id="comparisons").text
    assert "no sign that could turn" in shown
    assert "Sign holds" not in shown
    assert "log-odds" not in page.text
    assert "doi:10.1080/01621459.1927.10502953" in page.text


def test_choices_and_losses_are_those_of_the_variant() -> None:
    """A row of the losses against the input; what is not as in the study stands out."""
    facts = facts_of(crossing_of([3, 2, 2]))
    table = by_class(page_of(facts), "variant-losses")[0]
    rows = list(table.one("tbody").all("tr"))
    assert len(rows) == len(facts.crossing)
    for at, row in enumerate(rows):
        loss, cells = facts.losses[at], row.cells()
        taken = [
            own.alternatives[int(place)]
            for own, place in zip(facts.crossing.settings, facts.crossing.choices[at], strict=True)
        ]
        assert cells[1:4] == taken
        assert cells[4].startswith(f"{loss.trials_kept} (")
        assert cells[9:11] == [str(loss.cells_changed), str(loss.cells_trials)]
        assert f"outside_share_over {loss.trials_by_rule['outside_share_over']}" in cells[11]
        assert "answer_wrong" not in cells[11]
        differing = int((facts.crossing.choices[at] > 0).sum())
        assert len(by_class(row, "differs")) == differing


def test_chances_over_regions_weigh_every_cell() -> None:
    """A measure's chance is the mean over its cells: regions with few cells count for little."""
    facts = facts_of(crossing_of([2, 2]), regions=2)
    big, small = facts.changes[:2]
    changes = (
        replace(big, cells=900, hangs=np.array([0.10, 0.0])),
        replace(small, cells=100, hangs=np.array([0.50, 0.0])),
    )
    page = page_of(replace(facts, changes=changes))
    table = by_class(page.one("section", id="cells"), "changes")[0]
    (row,) = table.one("tbody").all("tr")
    # (900 · 0.10 + 100 · 0.50) / 1000
    assert [n.text for n in by_class(row, "chance")] == ["14%", "0%"]
    assert "hang most on under_ms: where it alone is chosen anew, 14% of them change" in page.text


def test_trace_with_a_colon_in_its_name_stays_beside_the_page() -> None:
    """A browser would take what stands before the colon for a scheme."""
    facts = facts_of(crossing_of([2, 2]))
    one = replace(facts.trials[0], pages=(("as in the study", "javascript:alert(1).html"),))
    page = page_of(replace(facts, trials=(one,)))
    links = [n.attributes["href"] for n in page.one("section", id="hanging").all("a")]
    assert "./javascript:alert(1).html" in links


def test_ten_thousand_variants_make_a_modest_page() -> None:
    """The page does not grow with the variants: it has as many rows and marks as of hundreds."""
    sizes = [
        len(variants_page(facts_of(crossing_of(own))))
        for own in ([5, 5, 2, 3, 2, 2], [5, 5, 2, 3, 5, 4, 2])
    ]
    assert sizes[1] < 700_000
    assert sizes[1] < 1.4 * sizes[0]
