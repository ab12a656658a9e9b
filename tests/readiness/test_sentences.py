"""What is said of an outcome, whole sentences, and by which rules its verdict is given."""

from __future__ import annotations

import random
from itertools import product

import pytest

from etl.readiness.facts import VERDICT_RULES, VERDICTS
from tests.readiness.making import Row, crossed, judged

CUE = {"cue": ["early", "late"]}
CUE_FIT = {**CUE, "fit": ["fitting", "odd"]}


SPARSE = """
15 ones against 105 zeros; fewest ones in cue = late: 7 ones against 53 zeros.
3 of 10 readers have zeros only; 3 of 12 items have zeros only: little is learnt there of effects \
within.
The design allows by-reader slopes for cue.
There are 1.5 ones for each reader on average, so these by-reader slopes will hardly be estimated.
The design allows no by-item slopes for cue: cue does not vary within items.
The maximal formula has 6 parameters (2 fixed, 4 random) on 15 ones. With 2.5 ones a parameter, \
where 10 for each fixed effect are asked for, it is likely not to converge, or to be singular.
Something speaks against every formula; the least against step 3: reread ~ cue + \
(1 | participant) + (1 | item)
"""


def between_items(readers: int, items: int, share: float) -> list[Row]:
    """Items come with one cue each; readers see all items, so cue varies within readers only."""
    source = random.Random(2)
    return [
        (f"P{r}", f"i{i}", (CUE["cue"][i % 2],), int(source.random() < share))
        for r in range(readers)
        for i in range(items)
    ]


def test_sparse_outcome_is_told_in_plain_sentences() -> None:
    """Counts, constant units, slopes and why not, the maximal formula, where to begin."""
    one = judged(CUE, between_items(10, 12, 0.15), outcome="reread")
    assert one.verdict == "sparse"
    assert list(one.sentences) == SPARSE.strip().splitlines()


def test_ready_outcome_begins_with_the_maximal_formula() -> None:
    """Where nothing speaks against the largest formula, nothing smaller is talked of."""
    one = judged(CUE, crossed(CUE, 30, 40))
    assert (one.verdict, one.start) == ("ready", 1)
    assert one.sentences[-1] == (
        "The maximal formula has 8 parameters (2 fixed, 6 random) on 339 ones, and nothing speaks "
        "against it. Begin there, and go down where it does not converge or is singular: "
        "regression_out ~ cue + (1 + cue | participant) + (1 + cue | item)"
    )


def separated_rows(*, whole_level: bool) -> list[Row]:
    """Zeros only where cue is late (and fit odd)."""
    rows = crossed(CUE_FIT, 20, 20, share=0.5)
    return [
        (r, i, own, 0 if own[0] == "late" and (whole_level or own[1] == "odd") else value)
        for r, i, own, value in rows
    ]


def test_separation_by_a_level_is_told_with_what_can_be_done() -> None:
    """Main effects are separated already."""
    one = judged(CUE_FIT, separated_rows(whole_level=True))
    assert one.verdict == "separated"
    assert (
        "Separation is quasi-complete already by cue + fit: cue = late has zeros only. Estimates "
        "run off without bound, with huge standard errors: merge levels, leave the effect out, or "
        "use a penalty or a prior (Firth 1993, doi:10.1093/biomet/80.1.27)."
    ) in one.sentences


def test_separation_by_an_interaction_says_what_can_be_estimated() -> None:
    """Without the interaction estimates exist."""
    one = judged(CUE_FIT, separated_rows(whole_level=False))
    assert one.verdict == "separated"
    (sentence,) = [text for text in one.sentences if text.startswith("Separation")]
    assert sentence.startswith(
        "Separation is quasi-complete by cue * fit: cue = late × fit = odd has zeros only. "
        "Estimates of the interaction run off without bound, with huge standard errors; cue + fit "
        "alone can be estimated. Leave interactions out, or merge levels"
    )


def test_every_step_names_the_separation() -> None:
    """Formulas stay as they are, and what speaks against each ends with what separates it."""
    whole = judged(CUE_FIT, separated_rows(whole_level=True))
    part = judged(CUE_FIT, separated_rows(whole_level=False))
    firth = "penalised fit (Firth 1993, doi:10.1093/biomet/80.1.27)"
    assert whole.separated == (
        f"Separated: cue = late has zeros only; estimates run off. A {firth} can be estimated."
    )
    assert part.separated == (
        "Separated: cue = late × fit = odd has zeros only; estimates run off. Fewer interactions "
        f"(cue + fit) can be estimated, or a {firth}."
    )
    for one in (whole, part):
        assert len(one.ladder) > 3
        for step in one.ladder:
            assert step.formula.startswith("regression_out ~ cue * fit + ")
            assert step.expectation.endswith(one.separated)
            assert step.expectation.count("Separated") == 1
    assert any(step.expectation == part.separated for step in part.ladder)


def test_separated_outcome_is_not_said_to_be_free_of_doubt() -> None:
    """What nothing else speaks against has the separation against it still."""
    rows = [(r, i, own, 0 if own == ("late",) else v) for r, i, own, v in crossed(CUE, 40, 60)]
    one = judged(CUE, rows)
    assert (one.verdict, one.start) == ("separated", 1)
    assert "and nothing else speaks against it. Begin there" in one.sentences[-1]


@pytest.mark.parametrize(
    ("rows", "why"),
    [
        (
            separated_rows(whole_level=True),
            "Separation is quasi-complete already by cue + fit: cue = late has zeros only.",
        ),
        (
            separated_rows(whole_level=False),
            "Separation is quasi-complete by cue * fit: cue = late × fit = odd has zeros only.",
        ),
        (
            crossed(CUE_FIT, 10, 12, seed=4, share=0.3),
            (
                "Even of step 8 of 9: with 7.3 ones a parameter, where 10 for each fixed effect "
                "are asked for, estimates are unsure, and tend to be too large."
            ),
        ),
        (crossed(CUE_FIT, 20, 20), "Nothing speaks against step 2 of 9."),
    ],
    ids=["separated", "separated by an interaction", "sparse", "ready"],
)
def test_verdict_has_its_reason(rows: list[Row], why: str) -> None:
    """The first sentence behind it, for a table."""
    assert judged(CUE_FIT, rows).why == why


def zeros_only(items: int) -> list[Row]:
    """Thirty readers, twenty items; so many of the items have zeros only."""
    rows = crossed(CUE, 30, 20, share=0.5)
    return [(r, i, own, 0 if int(i[1:]) < items else v) for r, i, own, v in rows]


def test_slopes_that_the_data_hardly_carry_are_told() -> None:
    """The design has them, and more than one unit in three has one value only."""
    told = judged(CUE, zeros_only(7)).sentences
    place = told.index("The design allows by-item slopes for cue.")
    assert told[place + 1] == (
        "7 of 20 items have zeros only, so these by-item slopes will hardly be estimated."
    )
    assert not any("hardly" in text for text in judged(CUE, zeros_only(6)).sentences)


def single_readers(several: int, single: int) -> list[Row]:
    """Some readers with twelve rows each, others with one."""
    rows = [(f"P{r}", f"i{i}", (CUE["cue"][i % 2],), (r + i) % 2) for r in range(several)
            for i in range(12)]  # fmt: skip
    return [*rows, *((f"S{r}", f"i{r}", (CUE["cue"][r % 2],), r // 2 % 2) for r in range(single))]


def test_readers_with_one_row_count_among_those_that_could_vary() -> None:
    """Six readers with all trials, eighteen with one each: the design has no slopes by reader."""
    one = judged(CUE, single_readers(6, 18))
    own = one.variations[0]
    assert (own.kind, own.varying, own.units, own.several) == ("within some", 6, 24, 6)
    assert not own.supported
    assert (
        "The design allows no by-reader slopes for cue: cue does not vary within most readers (18 "
        "of 24 have one value)."
    ) in one.sentences
    assert not any("| participant" in s.formula and "cue |" in s.formula for s in one.ladder)


def test_slopes_are_there_where_most_of_all_readers_vary() -> None:
    """Of 24 readers 13 are most, 12 are not."""
    assert judged(CUE, single_readers(13, 11)).variations[0].supported
    assert not judged(CUE, single_readers(12, 12)).variations[0].supported


def test_units_with_one_value_each_cannot_be_told() -> None:
    """One reader, 32 items of one row: nothing varies, and nobody knows whether it would."""
    one = judged(CUE, crossed(CUE, 1, 32))
    own = next(v for v in one.variations if v.unit == "item")
    assert (own.kind, own.varying, own.units, own.several) == ("between", 0, 32, 0)
    assert (
        "The design allows no by-item slopes for cue: each item has one value, so it cannot be "
        "told what varies within items."
    ) in one.sentences


def test_empty_combination_is_named() -> None:
    """R leaves out a coefficient there, and says so in its own words."""
    rows = [row for row in crossed(CUE_FIT, 20, 20) if row[2] != ("late", "odd")]
    one = judged(CUE_FIT, rows)
    assert (
        "No values in late × odd: R leaves a coefficient of the interaction out for each, and says "
        "that the matrix is rank deficient."
    ) in one.sentences
    assert one.ladder[0].fixed_parameters == 3


def test_values_without_item_are_counted() -> None:
    """A formula with items omits them."""
    rows = [(r, None if r == "P3" else i, own, v) for r, i, own, v in crossed(CUE, 12, 12)]
    assert "12 values without item: a formula with item omits them." in judged(CUE, rows).sentences


def test_few_items_are_better_fixed() -> None:
    """Three texts are no sample of texts."""
    one = judged({}, crossed({}, 40, 3))
    assert one.sentences[-1] == (
        "3 items are too few for random effects: take item as a fixed effect, or say that the "
        "result holds for these only."
    )


@pytest.mark.parametrize(
    ("value", "said"),
    [
        (None, "None of 16 rows has a value: the outcome is not possible here, or never was."),
        (0, "All 16 values are 0: there is nothing to model."),
        (1, "All 16 values are 1: there is nothing to model."),
    ],
    ids=["no values", "zeros", "ones"],
)
def test_outcome_without_variation_is_told_in_one_sentence(value: int | None, said: str) -> None:
    """No ladder, no slopes, nothing else to read."""
    one = judged(CUE, [(r, i, own, value) for r, i, own, _ in crossed(CUE, 4, 4)])
    assert (one.sentences, one.ladder, one.start) == ((said,), (), 0)
    assert one.verdict == ("no values" if value is None else "constant")


def test_verdicts_follow_their_rules() -> None:
    """Over designs of all sizes each verdict is given exactly where its rule says so."""
    given = set()
    for readers, items, share, seed in product((3, 12, 30), (4, 25), (0.0, 0.05, 0.4), (1, 2)):
        one = judged(CUE_FIT, crossed(CUE_FIT, readers, items, seed=seed, share=share))
        given.add(one.verdict)
        total = one.total
        if not (total.zeros and total.ones):
            assert one.verdict == "constant"
        elif one.separations[-1].kind != "none":
            assert one.verdict == "separated"
        else:
            free = any(step.expectation == "" for step in one.ladder)
            assert one.verdict == ("ready" if free else "sparse")
            assert free == (one.ladder[one.start - 1].expectation == "")
    assert given == {"constant", "separated", "sparse", "ready"}
    assert list(VERDICT_RULES) == list(VERDICTS)
