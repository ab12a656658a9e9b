"""What the words say is what the kernels compute: the value, the reason, and sums that add up."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import pytest
from hypothesis import given, settings

from etl.errors import FaultError
from etl.measures import MEASURES, TRIAL_MEASURES
from etl.report.trace_input import Cell, TracedTrial
from etl.report.trace_phrases import COUNTS, DURATIONS
from etl.report.trace_picture import draw
from etl.report.trace_words import Statement, explain
from tests.trace.random_trials import trials
from tests.trace.tracing import BuiltStudy, by_hand, worked_example

#: Durations are said to a thousandth of a millisecond, so each term may be off by half of that.
ROUNDING_MS = 0.0005


def said_value(sentence: str) -> tuple[float, str]:
    """The value that a sentence begins with, and the reason where it says that there is none."""
    missing = re.match(r"missing \((\w+)\): ", sentence)
    if missing:
        return math.nan, missing[1]
    found = re.match(r"(\d+(?:\.\d+)?)( ms)?(?:[:,]| =| by) ", sentence)
    assert found, sentence
    return float(found[1]), ""


def said_sum(sentence: str) -> list[float]:
    """The terms of the sum that a sentence writes out; empty where it has none."""
    head = re.match(r"(?:missing .*? it was )?[\d.]+ ms = ", sentence)
    if not head:
        return []
    terms = re.match(r"[\d.]+ \(.*?\)(?: \+ [\d.]+ \(.*?\))*", sentence[head.end() :])
    assert terms, sentence
    return [float(term) for term in re.findall(r"(?:^|\+ )([\d.]+) \(", terms[0])]


def check(statement: Statement, cell: Cell) -> None:
    """The words say the cell, and their own numbers add up."""
    value, reason = said_value(statement.sentence)
    assert reason == cell.reason
    assert value == pytest.approx(cell.value, abs=ROUNDING_MS, nan_ok=True)
    terms = said_sum(statement.sentence)
    if reason == "outlier":
        was = float(re.search(r"; it was ([\d.]+) ms = ", statement.sentence)[1])
        assert sum(terms) == pytest.approx(was, abs=ROUNDING_MS * (len(terms) + 1))
    if statement.measure in DURATIONS and value > 0:
        assert terms
        assert sum(terms) == pytest.approx(value, abs=ROUNDING_MS * (len(terms) + 1))
    if statement.measure in COUNTS and not reason and value and "visit 1 is" in statement.sentence:
        assert statement.sentence.count("visit ") == value


def check_all(traced: TracedTrial) -> int:
    """Check every cell of a trial against its words; how many there were."""
    said = explain(traced)
    for region in said.regions:
        assert [s.measure for s in region.statements] == list(traced.outcomes)
        for statement in region.statements:
            check(statement, traced.outcomes[statement.measure][region.order - 1])
    for statement in said.trial:
        check(statement, traced.trial_outcomes[statement.measure])
    return sum(len(region.statements) for region in said.regions) + len(said.trial)


@settings(max_examples=400, deadline=None)
@given(traced=trials())
def test_words_say_what_the_kernels_compute(traced: TracedTrial) -> None:
    """For every measure, region and convention of any trial, words and values are the same."""
    cells = len(MEASURES) * len(traced.region_names) + len(TRIAL_MEASURES)
    assert check_all(traced) == cells


@settings(max_examples=200, deadline=None)
@given(traced=trials())
def test_fixations_named_are_kept_ones(traced: TracedTrial) -> None:
    """No outcome is put down to a fixation that was left out or is not there."""
    kept = {fixation.number for fixation in traced.fixations if fixation.kept}
    said = explain(traced)
    for statement in (*said.trial, *(s for region in said.regions for s in region.statements)):
        assert set(statement.fixations) <= kept
        if statement.measure != "reading_time":
            listed = re.findall(r"fixations? (\d+)", statement.sentence)
            assert {int(number) for number in listed} <= kept


@settings(max_examples=100, deadline=None)
@given(traced=trials())
def test_visits_and_first_passes_of_the_table_are_not_looked_at(traced: TracedTrial) -> None:
    """The explanation finds visits and passes itself: wrong ones in the table change nothing."""
    wrong = tuple(
        replace(fixation, visit=9, first_pass=not fixation.first_pass)
        for fixation in traced.fixations
    )
    assert explain(replace(traced, fixations=wrong, regressions=())).regions == (
        explain(traced).regions
    )


def test_words_agree_with_every_cell_of_the_sample(study: BuiltStudy) -> None:
    """Every cell of the sample studies' outcomes is explained, and the words say its value."""
    cells = sum(check_all(study.trace(*key)) for key in study.trials)
    regions = sum(len(study.trace(*key).region_names) for key in study.trials)
    assert cells == regions * len(MEASURES) + len(study.trials) * len(TRIAL_MEASURES)


def test_every_rule_of_a_screened_study_is_told_and_shown(screened: BuiltStudy) -> None:
    """Each fixation left out has its rule in the words and in the picture; each value its own."""
    told, set_missing = set(), 0
    for key in screened.trials:
        traced = screened.trace(*key)
        said = explain(traced)
        out = [fixation for fixation in traced.fixations if not fixation.kept]
        words = "\n".join(said.left_out)
        for fixation in out:
            assert fixation.left_out_by in words
            told.add(fixation.left_out_by)
        if out:
            picture = draw(traced)
            assert all(f"{f.number} " in picture and f.left_out_by in picture for f in out)
        outliers = [s for r in said.regions for s in r.statements if s.reason == "outlier"]
        assert all("set missing by outlier_sd = 2.5; it was" in s.sentence for s in outliers)
        set_missing += len(outliers)
    assert told == {"outside_text_time", "off_screen", "blink", "merge", "under_ms", "over_ms"}
    assert set_missing > 100


def test_measures_and_kinds_are_those_of_the_catalogue() -> None:
    """What is told as a duration or as a count is one in the catalogue."""
    every = [*MEASURES.values(), *TRIAL_MEASURES.values()]
    assert {m.name for m in every if m.kind == "duration"} == DURATIONS
    assert {m.name for m in every if m.kind == "count"} == COUNTS


@pytest.mark.parametrize(
    ("measure", "value"),
    [("go_past_time", 881.0), ("first_pass_regression_out", 0.0), ("fixation_count", 3.0)],
)
def test_value_that_does_not_follow_from_the_fixations_is_refused(
    measure: str, value: float
) -> None:
    """Words that would not fit the number are a fault, not an explanation."""
    traced = worked_example()
    cells = list(traced.outcomes[measure])
    cells[3] = Cell(value)
    wrong = replace(traced, outcomes={**traced.outcomes, measure: tuple(cells)})
    with pytest.raises(FaultError, match=f"the tables differ: {measure} of `verb` is {value}, but"):
        explain(wrong)


def test_reason_that_does_not_follow_is_refused() -> None:
    """A wrong reason is a fault as much as a wrong value."""
    traced = by_hand([1, 3], [200, 200], 3)
    cells = (*traced.outcomes["reread"][:1], Cell(math.nan, "not_reached"), Cell(0))
    with pytest.raises(FaultError, match="is not_reached, but by the fixations skipped"):
        explain(replace(traced, outcomes={"reread": cells}))
