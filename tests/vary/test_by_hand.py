"""Variants that can be worked out by hand, and a study in which one decision turns the sign."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest
from click.testing import CliRunner

import etl
from etl.cli import main
from etl.session.varied import Varied
from tests.vary.labelled import BY_HAND, labelled_study, turning_trials

TWO = """\
[screening.fixations]
under_ms = [80, false]

[[comparisons]]
outcome = "first_pass_regression_out"
region = "middle"
factor = "cue"
"""
THREE = """\
[screening.fixations]
under_ms = [80, false]
over_ms = [false, 1000]

[screening.trials]
fewest_fixations = [false, 3]

[[comparisons]]
outcome = "first_pass_regression_out"
region = "middle"
factor = "cue"
level = "late"
"""


@pytest.fixture
def by_hand(tmp_path: Path) -> Varied:
    """Two variants of eight trials."""
    study, variants = labelled_study(tmp_path, BY_HAND, TWO)
    return etl.vary(etl.load_study(study), variants)


def test_two_variants_by_hand(by_hand: Varied) -> None:
    """Counts, rates, log odds ratios and intervals worked out with pen and paper.

    With ``under_ms = 80``: early 0, 0, 0, 1; late 1, 0, 1 and a skipped middle. The odds are 1/3
    and 2/1, log 6 = 1.7918; 1/3 + 1/1 + 1/1 + 1/2 = 2.8333, whose root times 1.959964 is 3.2991.
    Without: early 0, 1, 0, 1; late 1, 0, 1, 1; odds 1 and 3, log 3 = 1.0986;
    1/2 + 1/2 + 1/1 + 1/3 = 2.3333, root times 1.959964 is 2.9939.
    """
    rates = by_hand.table("rates")
    own = rates[(rates.measure == "first_pass_regression_out") & (rates.region == "middle")]
    told = {
        (row["variant"], row["cue"] if isinstance(row["cue"], str) else ""): row
        for row in own.to_dict("records")
    }
    assert len(told) == 6
    for key, rows, missing, ones in (
        ((1, ""), 8, 1, 3),
        ((1, "early"), 4, 0, 1),
        ((1, "late"), 4, 1, 2),
        ((2, ""), 8, 0, 5),
        ((2, "early"), 4, 0, 2),
        ((2, "late"), 4, 0, 3),
    ):
        row = told[key]
        assert (row["rows"], row["rows_lost"]) == (rows, 0), key
        assert (row["missing"], row["n"], row["ones"]) == (missing, rows - missing, ones), key
        assert math.isclose(row["rate"], ones / (rows - missing))
    for variant, difference, half in ((1, 1.7918, 3.2991), (2, 1.0986, 2.9939)):
        row = told[variant, "late"]
        assert row["against"] == "early"
        assert row["corrected"] == 0
        assert row["difference"] == pytest.approx(difference, abs=5e-5)
        assert row["difference_low"] == pytest.approx(difference - half, abs=1e-4)
        assert row["difference_high"] == pytest.approx(difference + half, abs=1e-4)
        assert math.isnan(told[variant, "early"]["difference"])


def test_what_variants_keep_by_hand(by_hand: Varied) -> None:
    """27 fixations, two of them short."""
    variants = by_hand.table("variants").to_dict("records")
    assert [row["under_ms"] for row in variants] == ["80", "false"]
    assert [row["study"] for row in variants] == [1, 0]
    assert [row["trials_kept"] for row in variants] == [8, 8]
    assert [row["fixations_kept"] for row in variants] == [25, 27]
    accounts = by_hand.table("variant_accounts").to_dict("records")
    assert [(row["unit"], row["read"], row["under_ms"], row["kept"]) for row in accounts] == [
        ("trials", 8, 0, 8),
        ("fixations", 27, 2, 25),
        ("trials", 8, 0, 8),
        ("fixations", 27, 0, 27),
    ]


def test_changed_cells_by_hand(by_hand: Varied) -> None:
    """Two cells of the outcome change: from 0, and from nothing since the middle was skipped."""
    cells = by_hand.table("changed_cells")
    own = cells[(cells.measure == "first_pass_regression_out") & (cells.region == "middle")]
    assert [
        (row["participant"], row["trial"], row["in_study"], row["variants_other_value"])
        for row in own.to_dict("records")
    ] == [("R1", 2, "value", 1), ("R2", 3, "missing", 1)]
    assert own.value.iloc[0] == 0
    assert set(own.hangs_on_under_ms) == {1.0}
    assert {*cells.trial} == {2, 3}
    changes = by_hand.table("changes")
    (row,) = changes[
        (changes.measure == "first_pass_regression_out") & (changes.region == "middle")
    ].to_dict("records")
    assert (row["cells"], row["cells_changed"], row["trials_changed"]) == (8, 2, 2)
    assert (row["chance"], row["share"]) == (0.25, 1.0)


def test_passage_for_a_paper(by_hand: Varied) -> None:
    """What can go into a paper, word for word."""
    (passage,) = by_hand.passages
    assert (by_hand.folder / "for_paper.txt").read_text(encoding="utf-8") == f"{passage}\n\n"
    assert passage == (
        "The rates of first_pass_regression_out at middle with cue late and with early were "
        "compared in 2 variants of the data (a multiverse analysis; Steegen, Tuerlinckx, Gelman, & "
        "Vanpaemel, 2016), by under_ms (80, off). In the study as it stands 2 of 3 values (66.7%) "
        "are 1 with cue late and 1 of 4 values (25.0%) with early: a difference of 1.79 in "
        "log-odds (95% interval −1.51 to 5.09). Over the variants the difference in log-odds "
        "ranges from 1.10 to 1.79. It is above 0 in both variants (the interval leaves out 0 in "
        "neither of these). Intervals (Woolf, 1955) take trials as independent, though they share "
        "readers and items."
    )


def test_decision_that_turns_the_sign_is_found_and_named(tmp_path: Path) -> None:
    """Glances of 60 ms are 12 of 20 against 8 of 20 regressions, or 0 against 8.

    Four late trials have two fixations, none a regression; with ``fewest_fixations = 3`` they go,
    and 8 of 16 stays below 12 of 20. ``over_ms`` leaves nothing out.
    """
    study, variants = labelled_study(tmp_path, turning_trials(), THREE)
    varied = etl.vary(etl.load_study(study), variants)
    (place,) = varied.leading
    summary = varied.summaries[place]
    settings = [setting.key for setting in varied.crossing.settings]
    assert settings == [
        "screening.fixations.under_ms",
        "screening.fixations.over_ms",
        "screening.trials.fewest_fixations",
    ]
    assert (summary.positive, summary.negative, summary.same_sign) == (4, 4, 4)
    assert summary.turns is not None
    assert settings[summary.turns] == "screening.fixations.under_ms"
    assert summary.matters == summary.turns
    shares = {settings[own.setting]: own for own in summary.shares}
    assert shares["screening.fixations.under_ms"].flips == 1
    assert shares["screening.fixations.over_ms"].together == pytest.approx(0, abs=1e-12)
    assert shares["screening.trials.fewest_fixations"].flips == 0
    # Early 0 of 20, late 8 of 20, 0.5 added to each: (8.5 x 20.5) / (12.5 x 0.5) = 27.88.
    base = summary.compared.difference[varied.crossing.base]
    assert base == pytest.approx(math.log(27.88), abs=1e-6)
    # Early 12 of 20, late 8 of 20: (8 / 12) / (12 / 8) = 4 / 9.
    assert summary.compared.difference.min() == pytest.approx(math.log(4 / 9))
    told = CliRunner().invoke(main, ["vary", str(study), str(variants)], catch_exceptions=False)
    assert told.exit_code == 0
    assert "the sign turns with screening.fixations.under_ms" in told.output
    page = (varied.folder / "variants.html").read_text(encoding="utf-8")
    assert "The sign changes with <code>under_<wbr>ms</code>" in page
    with (varied.folder / "comparisons.csv").open(encoding="utf-8", newline="") as file:
        rows = [
            row
            for row in csv.DictReader(file)
            if (row["measure"], row["region"]) == ("first_pass_regression_out", "middle")
        ]
    assert [row["turns_with"] for row in rows] == ["screening.fixations.under_ms"]
    assert [row["same_sign"] for row in rows] == ["4"]


def test_readers_and_trials_are_linked_to_their_traces(tmp_path: Path) -> None:
    """Each trial that hangs on the decision is drawn twice; the pages say what is decided there."""
    study, variants = labelled_study(tmp_path, turning_trials(), THREE)
    varied = etl.vary(etl.load_study(study), variants)
    page = (varied.folder / "variants.html").read_text(encoding="utf-8")
    pages = sorted((varied.folder / "traces").iterdir())
    assert pages
    for path in pages:
        assert f'href="traces/{path.name}"' in page
        text = path.read_text(encoding="utf-8")
        base = path.stem.endswith("variant_1")
        assert ("Under the study as it stands." in text) == base
        assert ("with under_ms off" in text or "fewest_fixations" in text) != base
