"""How readiness is summed up, the order of what is grave, and the last lines of a build."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from etl.errors import Findings
from etl.readiness.facts import ALL_REGIONS, OutcomeReadiness, Readiness
from etl.report.readiness_words import gravest, summed_up
from etl.session.result import Result
from etl.session.told import built, readiness_lines
from tests.report.readying import (
    CONSTANT,
    EMPTY,
    EVERY,
    OF_TRIALS,
    READY,
    SEPARATED,
    SPARSE,
    four,
    many,
    total,
)

NONE = Readiness((), (), (), together=False)
FIRST = replace(READY, start=1)
COUNTS = {
    "readers": 24,
    "trials read": 100,
    "trials skipped": 0,
    "trials kept": 100,
    "fixations read": 1000,
    "fixations of skipped trials": 0,
    "fixations of repeated trials": 0,
    "fixations kept": 1000,
    "fixations kept outside every region": 10,
}


def of(*judged: OutcomeReadiness, together: bool = False) -> Readiness:
    """A study with these outcomes."""
    return Readiness(("cue", "fit"), judged, (), together=together)


@pytest.mark.parametrize(
    ("readiness", "sentence"),
    [
        (NONE, "The study asks for no binary outcome."),
        (
            of(READY),
            (
                "The one binary outcome by region can carry a model as it is (a smaller one than "
                "the maximal)."
            ),
        ),
        (of(SPARSE), "The one binary outcome by region is sparse."),
        (of(SEPARATED), "The one binary outcome by region is separated by the factors."),
        (
            of(EMPTY),
            "The one binary outcome by region cannot be fitted, because it has no values.",
        ),
        (
            of(CONSTANT, CONSTANT),
            "All 2 binary outcomes by region cannot be fitted, because they are constant.",
        ),
        (of(OF_TRIALS, SPARSE), None),
        (
            of(FIRST, FIRST, SPARSE),
            (
                "Of 3 binary outcomes by region, 2 can carry a model as they are (the maximal one) "
                "and 1 is sparse."
            ),
        ),
        (
            of(SEPARATED, SEPARATED, CONSTANT),
            (
                "Of 3 binary outcomes by region, 2 are separated by the factors and 1 cannot be "
                "fitted (constant)."
            ),
        ),
        (
            of(OF_TRIALS, replace(OF_TRIALS, verdict="sparse")),
            (
                "Of 2 binary outcomes of whole trials, 1 can carry a model as it is (the maximal "
                "one) and 1 is sparse."
            ),
        ),
        (
            of(
                replace(READY, region=ALL_REGIONS),
                replace(EMPTY, region=ALL_REGIONS),
                OF_TRIALS,
                together=True,
            ),
            (
                "Of 3 binary outcomes over all regions together or of whole trials, 2 can carry a "
                "model as they are (1 the maximal one, 1 a smaller one) and 1 cannot be fitted (no "
                "values)."
            ),
        ),
    ],
    ids=[
        *("no outcome", "one ready", "one sparse", "one separated", "one without values"),
        *("all constant", "regions and trials", "maximal", "none ready", "trials", "together"),
    ],
)
def test_summing_up_counts_verdicts(readiness: Readiness, sentence: str | None) -> None:
    """One sentence for each mixture of verdicts, in the right number."""
    expected = sentence or (
        "Of 2 binary outcomes by region or of whole trials, 1 can carry a model as it is (the "
        "maximal one) and 1 is sparse."
    )
    assert summed_up(readiness) == expected


def test_grave_is_what_a_model_will_not_take() -> None:
    """Constant, separated, sparse, in this order; neither what is ready nor what has no values."""
    found = gravest(EVERY)
    assert [grave.judged.verdict for grave in found] == ["constant", "separated", "sparse"]
    assert [EVERY.outcomes[grave.place] for grave in found] == [g.judged for g in found]


def test_rarest_comes_first_among_the_like() -> None:
    """By the ones, or by the zeros where these are rarer; of equals the earlier first."""
    rare = [(57, 3), (1, 59), (58, 2), (59, 1)]
    judged = []
    for place, (zeros, ones) in enumerate(rare):
        cells = four((zeros, ones), (0, 0), (0, 0), (0, 0))
        judged.append(replace(SPARSE, region=str(place), cells=cells, total=total(cells)))
    assert [g.judged.region for g in gravest(of(*judged))] == ["1", "3", "2", "0"]


def test_other_doubts_than_few_ones_are_spelled() -> None:
    """Where ones are many, what speaks against the formula is said as it stands."""
    few = "4 readers are too few to estimate how much readers differ."
    ladder = tuple(replace(step, expectation=few) for step in READY.ladder)
    (grave,) = gravest(of(replace(READY, verdict="sparse", ladder=ladder)))
    assert grave.says == (
        "77 ones against 163 zeros; even for formula 2 of 3: 4 readers are too few to estimate how "
        "much readers differ"
    )


def test_last_lines_name_the_worst() -> None:
    """The summing-up, and a line for each of what is grave, with numbers, fit for any terminal."""
    assert readiness_lines(EVERY) == [
        summed_up(EVERY),
        "  first_pass_skip, end (constant): all 239 values are 0",
        (
            "  first_pass_skip, topic (separated): 5 ones against 175 zeros; cue = early and fit = "
            "odd has zeros only, for instance"
        ),
        (
            "  first_pass_skip, place (sparse): 10 ones against 230 zeros; 2.0 ones a parameter "
            "even in formula 3 of 3"
        ),
    ]


def test_last_lines_are_few() -> None:
    """At most five of the worst; the rest are counted."""
    lines = readiness_lines(many(20, 9))
    assert len(lines) == 7
    assert lines[-1] == "  and 85 more: audit.html shows all under Readiness"


def test_trials_and_regions_together_have_no_region() -> None:
    """No empty name, and no name of a region that there is not."""
    sparse = replace(SPARSE, region=ALL_REGIONS)
    of_trials = replace(SPARSE, outcome="any_skip", region="")
    lines = readiness_lines(of(sparse, of_trials, together=True))
    assert [line.partition(" (")[0] for line in lines[1:]] == ["  first_pass_skip", "  any_skip"]


def test_names_do_not_break_lines() -> None:
    """A line break in the name of a level stays within its line."""
    odd = replace(SEPARATED.separations[1], causes=("cue = a\nWritten to b has zeros only",))
    judged = replace(SEPARATED, separations=(odd,), region="r\n1")
    assert readiness_lines(of(judged))[1:] == [
        (
            "  first_pass_skip, r 1 (separated): 5 ones against 175 zeros; cue = a Written to b "
            "has zeros only"
        )
    ]


def test_build_ends_with_what_to_do_next(tmp_path: Path) -> None:
    """Tables, further files, readiness, and the folder that is sent away; no more than 12 lines."""
    result = Result(
        tmp_path, COUNTS, {"outcomes": 12_345, "trials": 100}, Findings(), readiness=EVERY
    )
    lines = built(result).splitlines()
    assert lines == [
        "24 readers, 100 trials, 1,000 fixations, 10 of them outside every region",
        f"Written to {tmp_path}:",
        "  outcomes       12,345 rows",
        "  trials            100 rows",
        (
            "  accounts.csv, log_accounts.csv, regions.csv, codebook.csv, codebook.md, "
            "datapackage.json,"
        ),
        "  readiness.csv, readiness.json, formulas.csv, run.json, and audit.html to look at",
        *readiness_lines(EVERY),
        "handoff/ is what the statistician gets; start there with: Rscript start.R",
    ]
    worst = replace(result, readiness=many(20, 9))
    assert len(built(worst).splitlines()) - lines.index("  trials            100 rows") - 1 <= 12
