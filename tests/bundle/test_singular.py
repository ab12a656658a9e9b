"""What the starter script in R says of fits without variance, and of errors without bounds."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from etl.readiness.facts import VERDICT_RULES
from tests.handoff.bundles import needs_lme4, needs_r, rows_of, run_r

pytestmark = [pytest.mark.slow, needs_r, needs_lme4]


def said_of(bundle: Path, *asked: str) -> str:
    """What the script says, in one line as a person reads it, the numbers in their lines."""
    ran = run_r(bundle / "start.R", *asked)
    assert (ran.returncode, ran.stderr) == (0, "")
    return ran.stdout


def flowing(text: str) -> str:
    """A text without its line ends."""
    return " ".join(text.split())


def test_fit_without_any_variance_is_shown_with_the_plain_regression(even_bundle: Path) -> None:
    """Readers and texts that do not differ are a finding, no failure: glm says the same."""
    said = said_of(even_bundle, "first_pass_skip", "b")
    assert "not to be relied on" not in said
    assert "No step of the ladder converged" not in said
    assert (
        "Step 4 converged, with a variance of 0: the intercept by participant. Without random "
        "effects it is a plain logistic regression (glm)"
    ) in flowing(said)
    assert "\nThe plain logistic regression: first_pass_skip ~ cue\n" in said
    # By hand: 30 zeros and 30 ones where the cue is early, so a variance of 1 / 30 + 1 / 30.
    errors = re.findall(r"^\(Intercept\) +\S+ +(\S+) ", said, re.MULTILINE)
    assert [float(error) for error in errors[-2:]] == pytest.approx([(2 / 30) ** 0.5] * 2, abs=5e-5)


def test_every_step_says_which_variance_is_0(even_bundle: Path) -> None:
    """A step that is singular is told of as it ends, and the next one begins."""
    said = said_of(even_bundle, "first_pass_skip", "b")
    steps = re.split(r"^Fitting step ", said, flags=re.MULTILINE)[1:]
    assert [step[0] for step in steps] == ["1", "2", "3", "4"]
    third = flowing(steps[2])
    assert "converged, but is singular: a variance of 0: the intercept by item, the" in third
    assert "the intercept by participant. On to the next step." in third


def test_items_that_differ_are_kept_where_readers_do_not(even_bundle: Path) -> None:
    """Of two singular fits the one with the texts' variance is shown, though it is the larger."""
    said = said_of(even_bundle, "first_pass_skip", "d")
    assert (
        "Step 3 converged, with a variance of 0: the intercept by participant. Without that it is "
        "the simpler model with what is left"
    ) in flowing(said)
    assert re.search(r"^ item +\(Intercept\) +[1-9]", said, re.MULTILINE)
    assert "plain logistic regression" not in said


def test_separated_outcome_is_explained_and_its_errors_are_warned_of(even_bundle: Path) -> None:
    """Meaning, cause and ways out stand before the fit, a warning stands behind it."""
    said = flowing(said_of(even_bundle, "first_pass_skip", "c"))
    before, fitted = said.split("Fitting step", maxsplit=1)
    row = next(
        row
        for row in rows_of(even_bundle / "readiness.csv")
        if (row["outcome"], row["region"], row["cue"]) == ("first_pass_skip", "c", "")
    )
    assert "cue = early has zeros only" in row["why"]
    assert f'What "separated" means: {VERDICT_RULES["separated"]}. Why: {row["why"]}' in before
    assert "fit with a penalty (Firth 1993, Heinze & Schemper 2002)" in before
    assert re.search(
        r"Beware: standard errors are absurd \(above 10 on the log-odds scale, or none\) for "
        r"\(Intercept\) \(\d+\), cue_late \(\d+\)",
        fitted,
    )


def test_sound_errors_are_not_warned_of(even_bundle: Path) -> None:
    """Where the data bound every estimate nothing is said of errors."""
    assert "Beware" not in said_of(even_bundle, "first_pass_skip", "d")


def test_small_contrast_numbers_are_no_absurd_errors(even_bundle: Path, tmp_path: Path) -> None:
    """An error is judged over the range of its column: a tiny unit makes a huge one by itself."""
    text = (even_bundle / "start.R").read_text(encoding="utf-8")
    small = text.replace("c(0),  # early\n      c(1)", "c(0),  # early\n      c(0.001)", 1)
    assert small != text
    for name in ("outcomes_wide.csv", "trials.csv", "readiness.csv", "formulas.csv"):
        (tmp_path / name).write_bytes((even_bundle / name).read_bytes())
    (tmp_path / "start.R").write_text(small, encoding="utf-8", newline="\n")
    said = said_of(tmp_path, "first_pass_skip", "d", "4")
    error = re.search(r"^cue_late +\S+ +(\S+) ", said, re.MULTILINE)
    assert error is not None
    assert float(error[1]) > 100
    assert "Beware" not in said


def test_step_that_fails_is_told_from_a_singular_one(even_bundle: Path, tmp_path: Path) -> None:
    """A fit that was stopped before its end is not relied on, and the last one is shown so."""
    text = (even_bundle / "start.R").read_text(encoding="utf-8")
    hasty = text.replace("maxfun = 1e5", "maxfun = 5", 1)
    assert hasty != text
    for name in ("outcomes_wide.csv", "trials.csv", "readiness.csv", "formulas.csv"):
        (tmp_path / name).write_bytes((even_bundle / name).read_bytes())
    (tmp_path / "start.R").write_text(hasty, encoding="utf-8", newline="\n")
    said = said_of(tmp_path, "first_pass_skip", "d", "3")
    assert said.count("did not converge, not to be relied on.") == 2
    assert "No step of the ladder converged: look at the counts above. The last model" in flowing(
        said
    )
