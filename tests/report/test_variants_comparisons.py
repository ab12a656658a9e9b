"""Comparisons on the page about variants, by what the decisions do to them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest

from etl.report import variants_comparisons
from etl.report.variants_comparisons import MOST_OPEN, collect_comparisons, comparisons_say
from etl.report.variants_input import VariantsInput
from etl.report.variants_page import variants_page
from etl.variants.facts import Compared, Comparison, Summary
from etl.variants.summaries import summarise
from tests.report.reading import Node, read
from tests.report.test_variants_page import by_class
from tests.report.varying import crossing_of, facts_of

NAN = math.nan
#: Differences with their intervals in two variants.
ROWS = {
    "decided": ((0.5, 0.1, 0.9), (0.3, -0.1, 0.7)),
    "decided by its side": ((0.5, 0.1, 0.9), (-0.5, -0.9, -0.1)),
    "held apart": ((0.5, 0.1, 0.9), (0.6, 0.2, 1.0)),
    "held": ((-0.2, -0.6, 0.2), (-0.1, -0.5, 0.3)),
    "around 0": ((0.1, -0.3, 0.5), (-0.1, -0.5, 0.3)),
    "around 0 from 0": ((0.0, -0.4, 0.4), (0.1, -0.3, 0.5)),
    "held from nothing": ((NAN, NAN, NAN), (0.1, -0.3, 0.5)),
    "held but for one": ((0.5, 0.1, 0.9), (NAN, NAN, NAN)),
    "none": ((NAN, NAN, NAN), (NAN, NAN, NAN)),
}
TITLES = {
    "decided": "The decisions decide",
    "held": "The decisions do not decide",
    "around 0": "Around 0 in all variants",
    "none": "Cannot be made",
}


def summary_of(row: str, number: int = 0, *, rate: bool = False) -> Summary:
    """A comparison of this sort, whose region says which sort, and its number."""
    difference, low, high = np.array(ROWS[row]).T
    levels = ("", "", "") if rate else ("fit", "odd", "fitting")
    none = np.zeros(2, dtype=bool)
    own = Comparison("went_back", f"{row} {number}", *levels)
    counts = np.ones((2, 2, 2), dtype=np.int64)
    return summarise(Compared(own, counts, difference, low, high, none), crossing_of([2]))


def facts_with(rows: Sequence[str], *, rate: bool = False) -> VariantsInput:
    """The input of a page with such comparisons, none of which has a curve."""
    summaries = tuple(summary_of(row, number, rate=rate) for number, row in enumerate(rows))
    return replace(facts_of(crossing_of([2])), summaries=summaries, leading=(), passages=())


def standing_of(row: str) -> str:
    """In which part a row belongs."""
    return next(name for name in TITLES if row.startswith(name))


def part_of(facts: VariantsInput) -> Node:
    """The section on all comparisons, read back from the page."""
    return read(variants_page(facts)).one("section", id="comparisons")


def test_each_comparison_is_in_the_part_that_it_belongs_to() -> None:
    """Decided ones first; within a part as numbered, whatever stands between them."""
    rows = [*reversed(ROWS), *ROWS]
    facts = facts_with(rows)
    found = collect_comparisons(facts)
    assert [part.title for part in found.parts] == [*TITLES.values()]
    for part, name in zip(found.parts, TITLES, strict=True):
        expected = [f"{row} {n}" for n, row in enumerate(rows) if standing_of(row) == name]
        assert [row.place.striptags() for row in part.rows] == expected
        assert {row.turned for row in part.rows} == {name == "decided"}
        assert part.how.endswith(".")
        assert not part.folded
    assert found.left == ""
    section = part_of(facts)
    assert [n.text for n in section.all("h3")] == [*TITLES.values()]
    assert len(by_class(section, "turned", "tr")) == 4
    captions = [n.text for n in section.all("caption")]
    assert captions == [part.how for part in found.parts]


def test_parts_without_comparisons_are_not_there() -> None:
    """No heading without a table."""
    found = collect_comparisons(facts_with(["held", "held apart"]))
    assert [(part.title, len(part.rows)) for part in found.parts] == [(TITLES["held"], 2)]
    assert [n.text for n in part_of(facts_with(["none"])).all("h3")] == [TITLES["none"]]


@pytest.mark.parametrize("row", ["decided", "held", "around 0", "none"])
@pytest.mark.parametrize("more", [0, 1])
def test_long_parts_are_folded_but_for_decided_ones(row: str, more: int) -> None:
    """From one more than fifteen on; a table that is folded says how many it has."""
    facts = facts_with([row] * (MOST_OPEN + more))
    folded = bool(more) and row != "decided"
    (part,) = collect_comparisons(facts).parts
    assert part.folded is folded
    section = part_of(facts)
    summaries = [n.text for n in section.all("summary")]
    assert summaries == ([f"{TITLES[row]}: {MOST_OPEN + 1}"] if folded else [])
    assert [n.text for n in section.all("h3")] == ([] if folded else [TITLES[row]])
    assert len(by_class(section, "figure", "td")) == MOST_OPEN + more


def test_too_many_comparisons_are_cut_from_the_last_parts(monkeypatch: pytest.MonkeyPatch) -> None:
    """Those that are decided are kept, and how many are not shown is said."""
    monkeypatch.setattr(variants_comparisons, "MOST_COMPARISONS", 5)
    rows = ["none", "held", "held", "decided", "around 0", "decided", "held", "held", "none"]
    found = collect_comparisons(facts_with(rows))
    assert [(part.title, len(part.rows)) for part in found.parts] == [
        (TITLES["decided"], 2),
        (TITLES["held"], 3),
    ]
    assert found.left.striptags() == "and 4 more: comparisons.csv has all"
    exact = collect_comparisons(facts_with(rows[:5]))
    assert sum(len(part.rows) for part in exact.parts) == 5
    assert exact.left == ""
    # All are counted in the sentence.
    assert found.says.startswith("In 2 of 9 comparisons ")


@pytest.mark.parametrize(
    ("rows", "text"),
    [
        (
            ["decided", "decided by its side", "held", "around 0", "around 0", "around 0", "none"],
            (
                "In 2 of 7 comparisons the decisions decide whether the interval leaves out 0; in "
                "3 the sign does not hold, but no interval leaves out 0; 1 cannot be made."
            ),
        ),
        (
            ["held", "held apart"],
            "In none of 2 comparisons do the decisions decide whether the interval leaves out 0.",
        ),
        (
            ["held", "none", "none"],
            (
                "In none of 3 comparisons do the decisions decide whether the interval leaves out "
                "0; 2 cannot be made."
            ),
        ),
        (
            ["held", "held from nothing", "held but for one", "none"],
            (
                "In none of 4 comparisons do the decisions decide whether the interval leaves out "
                "0; 1 cannot be made. Of all these, 2 have no value in some variants."
            ),
        ),
        (
            ["decided"],
            "In 1 of 1 comparison the decisions decide whether the interval leaves out 0.",
        ),
        (
            ["decided"] * 1_234,
            "In 1,234 of 1,234 comparisons the decisions decide whether the interval leaves out 0.",
        ),
        ([], "The study has no binary outcome to compare."),
    ],
)
def test_sentence_counts_what_is_in_the_parts(rows: list[str], text: str) -> None:
    """Whole texts; what holds is what is left."""
    assert comparisons_say([summary_of(row) for row in rows], rate=False) == text


def test_sentence_counts_others_as_such() -> None:
    """Where some have been told of before; and of rates there is no sign to speak of."""
    some = [summary_of("decided"), summary_of("held")]
    assert comparisons_say(some, rate=False, others=True).startswith("In 1 of 2 other comparisons ")
    rates = [summary_of("held", rate=True)]
    assert comparisons_say(rates, rate=True).endswith("these are rates.")


def test_rows_say_in_how_many_variants_sign_and_interval_hold() -> None:
    """Against the summary; a study without a sign, or without a value, has none that could hold."""
    found = collect_comparisons(facts_with([*ROWS]))
    rows = {row.place.striptags().rpartition(" ")[0]: row for p in found.parts for row in p.rows}
    assert {name: (row.holds, row.apart) for name, row in rows.items()} == {
        "decided": ("2 of 2", "1 of 2"),
        "decided by its side": ("1 of 2", "2 of 2"),
        "held apart": ("2 of 2", "2 of 2"),
        "held": ("2 of 2", "0 of 2"),
        "around 0": ("1 of 2", "0 of 2"),
        "around 0 from 0": ("the study has none", "0 of 2"),
        "held from nothing": ("the study has no value", "0 of 1"),
        "held but for one": ("1 of 1", "1 of 1"),
        "none": ("the study has no value", "–"),
    }
    told = {name: row.without for name, row in rows.items() if row.without}
    assert told == {"held from nothing": "no value in 1", "held but for one": "no value in 1"}
    for name, row in rows.items():
        own = summary_of(name)
        numbers = [float(text) if text else None for text in row.values]
        assert numbers[5] == own.apart
        assert numbers[3] == own.same_sign
        assert (numbers[0] is None) == math.isnan(own.compared.difference[0])
    assert (rows["around 0"].low, rows["around 0"].high) == ("−0.10", "+0.10")


def test_what_is_said_of_a_part_is_true_of_variants_that_have_a_difference() -> None:
    """A sign of which there is nothing is not said to hold, and the page counts the others."""
    section = part_of(facts_with(["held but for one", "held"]))
    (caption,) = [n.text for n in section.all("caption")]
    assert caption.startswith("Of the variants that have a difference, all have the same sign")
    assert [n.text for n in by_class(section, "without")] == ["no value in 1"]
    assert "the row says in how many, and counts are out of the others" in section.text


def test_lost_values_turn_no_sign() -> None:
    """Where the interval is decided, only signs that differ are marked beside it."""
    values = ((0.5, 0.1, 0.9), (0.3, -0.1, 0.7), (NAN, NAN, NAN))
    difference, low, high = np.array(values).T
    own = Comparison("went_back", "verb", "fit", "odd", "fitting")
    compared = Compared(
        own, np.ones((3, 2, 2), np.int64), difference, low, high, np.zeros(3, dtype=bool)
    )
    facts = replace(
        facts_of(crossing_of([3])),
        summaries=(summarise(compared, crossing_of([3])),),
        leading=(),
        passages=(),
    )
    (part,) = collect_comparisons(facts).parts
    (row,) = part.rows
    assert (row.turned, row.sign_turns) == (True, False)
    assert (row.holds, row.apart, row.without) == ("2 of 2", "1 of 2", "no value in 1")


def test_rates_without_any_value_stand_apart() -> None:
    """With a heading each, since there are two tables then."""
    facts = facts_with(["held", "none", "held"], rate=True)
    assert [(one.title, len(one.rows)) for one in collect_comparisons(facts).parts] == [
        ("All rates", 2),
        ("No rate", 1),
    ]
    assert [n.text for n in part_of(facts).all("h3")] == ["All rates", "No rate"]


def test_rates_are_in_one_part_without_a_word_on_signs() -> None:
    """However their intervals lie."""
    facts = facts_with(["decided", "around 0", "held"], rate=True)
    (part,) = collect_comparisons(facts).parts
    assert (part.title, part.how, len(part.rows)) == ("All rates", "", 3)
    assert {(row.holds, row.apart, row.turned) for row in part.rows} == {("", "", False)}
    assert "no sign that could turn" in part_of(facts).text


def test_curves_are_linked_from_their_comparisons() -> None:
    """The number of each, in the order in which the page begins with them."""
    facts = replace(facts_with(["none", "held", "decided"]), leading=(2, 1), passages=("a", "b"))
    found = collect_comparisons(facts)
    told = {row.place.striptags(): row.curve for part in found.parts for row in part.rows}
    assert told == {"decided 2": 1, "held 1": 2, "none 0": 0}
