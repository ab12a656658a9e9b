"""What the audit page says of readiness: every number as the facts have it, in every state."""

from __future__ import annotations

import re
from dataclasses import replace

import pandas as pd
import pytest

import etl
from etl.readiness.facts import ROWS_REMARK, OutcomeReadiness, Readiness
from etl.report.audit import audit_page
from etl.session.readiness import readiness_of
from tests.report.conftest import PROJECT
from tests.report.making import Made, made_from, small
from tests.report.reading import Node, read
from tests.report.readying import (
    CONSTANT,
    DEPENDENCES,
    EMPTY,
    EVERY,
    READY,
    SEPARATED,
    SPARSE,
    TOGETHER,
    four,
    many,
    named,
    total,
    without_factors,
    without_items,
)
from tests.report.test_page_text import ODD_NAMES, of_pages


@pytest.fixture(scope="module")
def plain() -> Made:
    """A small study that the facts are put into."""
    return small([(f"P{i}", "1", {}, [(1, 200.0), (2, 210.0)]) for i in range(3)], {})


@pytest.fixture(scope="module")
def every(plain: Made) -> Node:
    """The page with an outcome of each verdict."""
    return page_with(plain, EVERY)


def page_with(made: Made, readiness: Readiness | None) -> Node:
    """The page of a study, read back."""
    return read(audit_page(replace(made.given(), readiness=readiness)))


def alone(judged: OutcomeReadiness, factors: tuple[str, ...] = ("cue", "fit")) -> Readiness:
    """A study with one outcome."""
    return Readiness(factors, (judged,), (), together=False)


def part(page: Node) -> Node:
    """The part of the page on readiness."""
    return page.one("section", id="readiness")


def folded(page: Node, spoken: str) -> Node:
    """The fold-out of an outcome."""
    return page.one("details", data_ready=spoken)


def test_page_without_facts_has_no_such_part(plain: Made) -> None:
    """No empty heading, no link into nothing, no headline."""
    for readiness in (None, Readiness((), (), (), together=False)):
        page = page_with(plain, readiness)
        assert not list(page.all(id="readiness"))
        assert not list(page.all("a", href="#readiness"))


def test_part_begins_with_the_summing_up(every: Node) -> None:
    """How many outcomes have which verdict, in a sentence, and each with what it means."""
    assert part(every).one("span", data_fact="readiness-says").text == (
        "Of 6 binary outcomes by region or of whole trials, 2 can carry a model as they are (1 the "
        "maximal one, 1 a smaller one), 1 is sparse, 1 is separated by the factors and 2 cannot "
        "be fitted (1 constant, 1 without values)."
    )
    legend = [item.text for item in part(every).one("ul", class_="verdicts").all("li")]
    assert legend == [
        "2 ready a formula of the ladder has nothing against it",
        "1 sparse something speaks against every formula, most often too few ones or zeros",
        (
            "1 separated the factors foretell it without error somewhere: estimates run off to "
            "infinity"
        ),
        "1 constant only zeros or only ones: nothing to model",
        "1 no values missing everywhere, which can be so by definition",
    ]


def test_gravest_are_told_with_numbers(every: Node) -> None:
    """The constant one, the separated one, the sparse one; none for want of values."""
    lines = part(every).one("ul", class_="graves")
    assert [item.text for item in lines.all("li")] == [
        "first_pass_skip in end is constant: all 239 values are 0.",
        (
            "first_pass_skip in topic is separated: 5 ones against 175 zeros; cue = early × fit = "
            "odd has zeros only, for instance."
        ),
        (
            "first_pass_skip in place is sparse: 10 ones against 230 zeros; 2.0 ones a parameter "
            "even in formula 3 of 3."
        ),
    ]
    assert [a.attributes["href"] for a in lines.all("a")] == ["#ready-4", "#ready-3", "#ready-2"]


def test_headline_tells_of_the_worst(every: Node) -> None:
    """One entry at the top of the page, with the summing-up and the worst of all."""
    (headline,) = every.all("li", class_="headline readiness")
    says = part(every).one("span", data_fact="readiness-says").text
    assert headline.text == (
        f"Hard to model {says} The worst is first_pass_skip in end: all 239 values are 0."
    )
    assert headline.one("a").attributes["href"] == "#readiness"


def test_nothing_grave_makes_no_headline(plain: Made) -> None:
    """Where every outcome is ready, or has no values by definition, the top of the page is calm."""
    page = page_with(plain, Readiness(("cue", "fit"), (READY, EMPTY), (), together=False))
    assert not list(page.all("li", class_="headline readiness"))
    assert not list(page.all("ul", class_="graves"))
    assert "No reader stands out" in page.one("ul", class_="headlines").text


def test_overview_has_a_tile_for_each_outcome(every: Node) -> None:
    """Sign, name, bar, numbers and verdict in words; outcomes of trials by themselves."""
    groups = list(part(every).all("ul", class_="tiles"))
    assert groups[0].attributes["aria-label"] == "first_pass_skip"
    assert [item.text for item in groups[0].all("li")] == [
        "verb77 ones, 163 zerosready",
        "place10 ones, 230 zerossparse",
        "topic5 ones, 175 zerosseparated",
        "end0 ones, 239 zerosconstant",
        "start240 missingno values",
    ]
    (trials,) = part(every).all("ul", class_="tiles by-outcome")
    assert trials.attributes["aria-label"] == "Whole trials"
    assert trials.text == "any_skip77 ones, 163 zerosready"


def test_every_verdict_has_a_sign_of_its_own(every: Node) -> None:
    """Verdicts are told apart by a sign as well, and each sign is defined on the page."""
    signs = [
        use.attributes["href"]
        for item in part(every).one("ul", class_="tiles").all("li")
        for use in item.all("use")
    ]
    assert signs == [
        "#verdict-ready",
        "#verdict-sparse",
        "#verdict-separated",
        "#verdict-constant",
        "#verdict-no-values",
    ]
    for sign in signs:
        assert every.one("g", id=sign[1:]).children


def test_tiles_lead_to_their_fold_outs(every: Node) -> None:
    """Each link of the overview names an outcome in full and leads to what is told of it."""
    links = [a for group in part(every).all("ul") for a in group.all("a", aria_label=None)]
    assert len(links) == len(EVERY.outcomes)
    for link in links:
        target = every.one("details", id=link.attributes["href"][1:])
        assert target.attributes["data-ready"] == link.attributes["aria-label"]


@pytest.mark.parametrize("judged", [READY, SPARSE, SEPARATED], ids=lambda one: one.verdict)
def test_bars_are_as_long_as_the_numbers_say(every: Node, judged: OutcomeReadiness) -> None:
    """The hollow bar holds all values, the filled one the ones, on a scale that all share."""
    most = max(one.total.zeros + one.total.ones for one in EVERY.outcomes)
    place = EVERY.outcomes.index(judged) + 1
    link = next(iter(part(every).one("ul", class_="tiles").all("a", href=f"#ready-{place}")))
    tile = next(i for i in part(every).one("ul", class_="tiles").all("li") if link in i.children)
    hollow, filled = tile.one("svg", class_="counts").all("rect")
    widths = [float(rect.attributes["width"].removesuffix("%")) for rect in (hollow, filled)]
    zeros, ones = judged.total.zeros, judged.total.ones
    exact = [100 * (zeros + ones) / most, 100 * ones / most]
    # The page rounds to four digits.
    assert widths == pytest.approx(exact, rel=1e-3)


def test_one_outcome_is_told_in_full(every: Node) -> None:
    """Sentences, conditions, readers and items, the design, separation, and the ladder."""
    assert folded(every, "first_pass_skip, verb").text == (
        "verb ready: 77 ones, 163 zeros, 32.1% (26.5–38.2); start with formula 2 of 3 "
        "77 ones against 163 zeros.Begin with step 2. "
        "cue · fitOnesZerosMissingRate, 95% interval "
        "early · fitting2040–33.3% 22.7–45.9 "
        "early · odd1941–31.7% 21.3–44.2 "
        "late · fitting21381 35.6% 24.6–48.3 "
        "late · odd1744–27.9% 18.2–40.2 "
    ).replace("21381 ", "21381") + (
        "Readers24 with values, of which 3 with zeros only "
        "Varying within readerscue in all 24; fit in 20 of 24; cue × fit in all 24, but with one "
        "value for each combination of levels "
        "Items32 with values, none of them constant "
        "Varying within itemscue in all 32; fit in none "
        "Separationnone by cue + fit and cue * fit "
        "Every formula begins with first_pass_skip ~ cue * fit "
        "+ (1 + cue * fit | participant) + (1 + cue | item)4 fixed and 13 random parameters, up to "
        "96 random effects. With 4.5 ones a parameter it may not converge. "
        "Start here without correlations+ (1 + cue_late || participant) + (1 | item)4 fixed and 3 "
        "random parameters, up to 48 random effects, 11.0 ones a parameter. "
        "without items+ (1 | participant)4 fixed and 1 random parameter, up to 24 random effects, "
        "15.4 ones a parameter."
    )


def test_one_sided_and_empty_conditions_say_so(every: Node) -> None:
    """In words, beside the condition; a condition without rows has no rate."""
    rows = [row.cells() for row in folded(every, "first_pass_skip, topic").one("tbody").all("tr")]
    assert rows == [
        ["early · fitting", "2", "58", "3.3% 0.9–11.4", ""],
        ["early · odd zeros only", "0", "60", "0.0% 0.0–6.0", ""],
        ["late · fitting", "3", "57", "5.0% 1.7–13.7", ""],
        ["late · odd empty", "0", "0", "–", ""],
    ]


def test_outcome_of_ones_only_says_so(plain: Made) -> None:
    """The other side of constant."""
    cells = four((0, 60), (0, 60), (0, 60), (0, 60))
    ones = replace(CONSTANT, cells=cells, total=total(cells))
    page = page_with(plain, alone(ones))
    assert "is constant: all 240 values are 1." in part(page).one("ul", class_="graves").text
    table = folded(page, "first_pass_skip, end").one("table", class_="conditions")
    assert table.text.count("ones only") == 4


@pytest.mark.parametrize(
    ("judged", "words"),
    [
        (READY, "start with formula 2 of 3"),
        (SPARSE, "start with formula 3 of 3"),
        (CONSTANT, "constant: 0 ones, 239 zeros, 0.0% (0.0–1.6)"),
        (EMPTY, "no values: 240 missing"),
    ],
    ids=lambda value: value.verdict if isinstance(value, OutcomeReadiness) else "",
)
def test_summary_says_where_to_begin(every: Node, judged: OutcomeReadiness, words: str) -> None:
    """What can be fitted names the formula to start with; what cannot, none."""
    spoken = f"first_pass_skip, {judged.region}"
    summary = folded(every, spoken).one("summary").text
    assert summary.endswith(words)


@pytest.mark.parametrize(
    ("spoken", "word"),
    [
        ("first_pass_skip, verb", "Start here"),
        ("first_pass_skip, place", "Start here, with care"),
        ("first_pass_skip, topic", "Start here, with care"),
    ],
)
def test_the_formula_to_begin_with_is_marked(every: Node, spoken: str, word: str) -> None:
    """One formula of the ladder, and with a warning where something speaks against it."""
    (start,) = folded(every, spoken).one("ol", class_="ladder").all("li", class_="start")
    assert start.one("strong").text == word


def test_outcome_without_values_says_only_that(every: Node) -> None:
    """No table of nothing, and nothing of readers without values."""
    fold = folded(every, "first_pass_skip, start")
    assert fold.text == "start no values: 240 missing None of 240 rows has a value."


def test_outcome_that_cannot_be_fitted_has_no_ladder(every: Node) -> None:
    """Neither the constant one nor the one without values."""
    for spoken in ("first_pass_skip, end", "first_pass_skip, start"):
        assert not list(folded(every, spoken).all("ol"))


def test_same_expectation_is_said_once(plain: Made) -> None:
    """Formula after formula of which the same is to be expected says only its own figure."""
    doubt = "With {} ones a parameter it may not converge."
    ladder = tuple(
        replace(
            READY.ladder[0],
            number=number,
            ones_per_parameter=float(number),
            expectation=doubt.format(f"{number}.0"),
        )
        for number in (1, 2, 3)
    )
    page = page_with(plain, alone(replace(SPARSE, ladder=ladder)))
    rungs = [li.text for li in folded(page, "first_pass_skip, place").one("ol").all("li")]
    formula = "+ (1 + cue * fit | participant) + (1 + cue | item)"
    size = "4 fixed and 13 random parameters, up to 96 random effects"
    assert rungs == [
        f"{formula}{size}. {doubt.format('1.0')}",
        f"{formula}{size}, 2.0 ones a parameter. Expect the same.",
        f"Start here, with care {formula}{size}. {doubt.format('3.0')}",
    ]


def test_formulas_that_begin_otherwise_stand_whole(plain: Made) -> None:
    """Where one formula has no random effects, every formula is written out."""
    first = READY.ladder[0]
    glm = replace(first, number=2, formula="first_pass_skip ~ cue * fit", random_parameters=0)
    page = page_with(plain, alone(replace(READY, ladder=(first, glm))))
    codes = [code.text for code in folded(page, "first_pass_skip, verb").one("ol").all("code")]
    assert codes == [first.formula, "first_pass_skip ~ cue * fit"]
    assert "4 fixed parameters, up to 96 random effects" in part(page).text


def test_study_without_factors(plain: Made) -> None:
    """No table of conditions, and a word why."""
    page = page_with(plain, alone(without_factors(READY), ()))
    assert not list(part(page).all("table"))
    assert "The study names no factors, so there are no conditions to compare." in part(page).text
    fold = folded(page, "first_pass_skip, verb").text
    assert "Every formula begins with first_pass_skip ~ 1 Start here + (1 | participant)" in fold
    assert "Separation" not in fold
    assert "Varying" not in fold


def test_units_with_one_value_each_are_not_said_to_be_constant(plain: Made) -> None:
    """Whether a factor varies within them cannot be told."""
    single = replace(READY.variations[4], several=0)
    page = page_with(plain, alone(replace(READY, variations=(single,))))
    text = folded(page, "first_pass_skip, verb").text
    assert "Varying within itemsfit cannot be told: one value each" in text


def test_bars_are_said_to_be_alike_within_a_group_only(every: Node) -> None:
    """Groups have columns of different widths."""
    assert "within a group all bars have the same scale" in part(every).text


def test_study_without_items(plain: Made) -> None:
    """Nothing is said of items."""
    page = page_with(plain, alone(without_items(READY)))
    terms = [dt.text for dt in folded(page, "first_pass_skip, verb").all("dt")]
    assert terms == ["Readers", "Varying within readers", "Separation"]


def test_regions_taken_together_are_one_group(plain: Made) -> None:
    """Tiles bear the names of outcomes, and nothing speaks of a region that there is not."""
    page = page_with(plain, TOGETHER)
    (tiles,) = part(page).all("ul", class_="tiles by-outcome")
    assert tiles.attributes["aria-label"] == "All regions together"
    assert [a.text for a in tiles.all("a")] == ["first_pass_skip", "fixated"]
    assert part(page).one("span", data_fact="readiness-says").text == (
        "All 2 binary outcomes over all regions together can carry a model as they are (the "
        "maximal one)."
    )
    assert "(all regions)" not in part(page).text


def test_study_of_one_region_names_it(plain: Made) -> None:
    """One group under the name of the region."""
    judged = tuple(replace(READY, outcome=name) for name in ("first_pass_skip", "fixated"))
    page = page_with(plain, Readiness(("cue", "fit"), judged, (), together=False))
    (tiles,) = part(page).all("ul", class_="tiles by-outcome")
    assert tiles.attributes["aria-label"] == "verb"
    assert [node.text for node in part(page).all("h4")] == ["verb"]


def test_many_conditions_are_cut_to_the_thinnest(plain: Made) -> None:
    """Of 20 conditions the 16 with the fewest ones or zeros are shown, in their order."""
    cells = tuple(replace(READY.cells[0], levels=(f"l{i:02}",), ones=20 - i) for i in range(20))
    page = page_with(plain, alone(replace(READY, cells=cells, total=total(cells)), ("cue",)))
    table = folded(page, "first_pass_skip, verb").one("table", class_="conditions")
    assert [row.cells()[0] for row in table.one("tbody").all("tr")] == [
        f"l{i:02}" for i in range(4, 20)
    ]
    assert table.one("caption").text == (
        "The 16 of 20 conditions with the fewest ones or zeros. readiness.csv has them all."
    )


def test_dependences_among_binary_outcomes_come_first(plain: Made) -> None:
    """A reason that names both says it alone; others list their pairs; the rest is folded."""
    judged = (READY, replace(READY, outcome="fixated"))
    page = part(page_with(plain, Readiness(("cue", "fit"), judged, DEPENDENCES, together=False)))
    shown, others = page.all("ul", class_="dependences")
    assert shown.text == "first_pass_skip = 0 means that fixated = 1"
    assert others.text == (
        "Both rest on the fixations of the first pass: first_pass_skip with first_pass_time and "
        "go_past_time; fixated with total_time"
    )
    assert "3 other pairs, with counts and durations" in page.text
    assert ROWS_REMARK in page.text


def test_dependences_alone_make_a_part(plain: Made) -> None:
    """A study that asks for durations only hears of those that are not independent."""
    page = part(page_with(plain, Readiness((), (), DEPENDENCES, together=False)))
    assert page.one("span", data_fact="readiness-says").text == (
        "The study asks for no binary outcome."
    )
    assert [h.text for h in page.all("h3")] == ["Outcomes that are not independent"]
    assert page.one("summary").text == "4 pairs, with counts and durations"


@pytest.mark.parametrize("text", ODD_NAMES.values(), ids=ODD_NAMES)
def test_names_appear_as_text(plain: Made, text: str) -> None:
    """Names of levels, factors and regions, causes and formulas add no element to the page."""
    odd, tame = page_with(plain, named(text)), page_with(plain, named("n"))
    assert of_pages(odd) == of_pages(tame)
    whole = part(odd).text
    for word in (f"{text} a", f"{text} 0 · {text} 1", f"{text} = {text} 0 has zeros only"):
        assert " ".join(word.split()) in whole


def test_names_keep_their_direction(plain: Made) -> None:
    """Names stand in elements that keep their direction of writing to themselves."""
    text = ODD_NAMES["right to left"]
    names = {node.text for node in part(page_with(plain, named(text))).all("bdi")}
    assert {text, f"{text} 0", f"{text} a"} <= names


def test_sixty_outcomes_stay_a_page(plain: Made) -> None:
    """10 outcomes over 6 regions are 60 tiles in 10 rows and 60 fold-outs, 6 gravest, 0.4 MB."""
    text = audit_page(replace(plain.given(), readiness=many(6, 10)))
    page = part(read(text))
    assert len(list(page.all("ul", class_="tiles"))) == 10
    assert len(list(page.all("details", class_="ready-one"))) == 60
    assert [i.text for i in page.one("ul", class_="graves").all("li")][-1] == (
        "24 more: see the overview."
    )
    without = audit_page(replace(plain.given(), readiness=None))
    assert len(text.encode()) - len(without.encode()) < 400_000


@pytest.fixture(scope="module")
def orchard_built(tmp_path_factory: pytest.TempPathFactory) -> tuple[Node, pd.DataFrame, Readiness]:
    """The page of the orchard study with its real readiness, and the table it was counted in."""
    study = etl.load_study(PROJECT / "sample_logs" / "orchard" / "study.toml")
    unscreened = study.model_copy(update={"screening": None})
    result = etl.build(unscreened, into=tmp_path_factory.mktemp("orchard") / "out")
    made = made_from(result, study)
    readiness = readiness_of(result.folder, made.design)
    return page_with(made, readiness), made.frames["outcomes_wide"], readiness


def test_conditions_are_those_of_the_table(
    orchard_built: tuple[Node, pd.DataFrame, Readiness],
) -> None:
    """Ones, zeros and missing of each condition, counted anew from outcomes_wide."""
    page, wide, readiness = orchard_built
    factors = list(readiness.factors)
    checked = 0
    for outcome in ("first_pass_skip", "regression_in"):
        for region, rows in wide.groupby("region", observed=True):
            fold = folded(page, f"{outcome}, {region}")
            heads = [th.text for th in fold.one("thead").all("th")]
            for row in fold.one("tbody").all("tr"):
                cells = dict(zip(heads, row.cells(), strict=False))
                levels = re.sub(r" (zeros only|ones only|empty)$", "", row.cells()[0]).split(" · ")
                own = rows
                for factor, level in zip(factors, levels, strict=True):
                    own = own[own[factor].astype(str) == level]
                assert int(cells["Ones"]) == (own[outcome] == 1).sum()
                assert int(cells["Zeros"]) == (own[outcome] == 0).sum()
                missing = cells.get("Missing", "–").replace("–", "0")
                assert int(missing) == own[outcome].isna().sum()
                checked += 1
    assert checked == 2 * 6 * 8


def test_constant_readers_are_those_of_the_table(
    orchard_built: tuple[Node, pd.DataFrame, Readiness],
) -> None:
    """How many readers, and items, never skip a region, counted anew."""
    page, wide, _ = orchard_built
    for region, rows in wide.groupby("region", observed=True):
        for unit, heading in (("participant", "Readers"), ("item", "Items")):
            means = rows.groupby(unit, observed=True)["first_pass_skip"].mean().dropna()
            fold = folded(page, f"first_pass_skip, {region}")
            facts = {
                dt.text: dd.text for dt, dd in zip(fold.all("dt"), fold.all("dd"), strict=True)
            }
            zeros = (means == 0).sum()
            wanted = f"of which {zeros} with zeros only" if zeros else "none of them constant"
            assert facts[heading] == f"{len(means)} with values, {wanted}"


def test_every_figure_of_the_ladders_is_in_the_facts(
    orchard_built: tuple[Node, pd.DataFrame, Readiness],
) -> None:
    """Formula, change, parameters, random effects, ones a parameter, expectation of each step."""
    page, _, readiness = orchard_built
    for one in readiness.outcomes:
        fold = folded(page, ", ".join(filter(None, (one.outcome, one.region))))
        if not one.ladder:
            assert not list(fold.all("ol"))
            continue
        begins = fold.one("p", class_="how").one("code").text
        rungs = list(fold.one("ol", class_="ladder").all("li"))
        assert len(rungs) == len(one.ladder)
        said = ""
        for rung, step in zip(rungs, one.ladder, strict=True):
            assert f"{begins} {rung.one('code').text}" == step.formula
            assert f"{step.fixed_parameters} fixed and {step.random_parameters} random" in rung.text
            assert f"up to {step.random_effects} random effects" in rung.text
            assert f" {step.ones_per_parameter:.1f} " in rung.text
            assert step.change in rung.text
            each = f"{step.ones_per_parameter:.1f} "
            # Separation is told above the formulas, once.
            expectation = step.expectation.removesuffix(one.separated).rstrip()
            assert "Separated:" not in rung.text
            if "Expect the same." in rung.text:
                assert expectation.replace(each, "") == said
            else:
                assert expectation in rung.text
            said = expectation.replace(each, "")
            assert ("start" in rung.attributes.get("class", "")) == (step.number == one.start)
