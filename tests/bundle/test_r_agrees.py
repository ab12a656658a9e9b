"""R by itself, without our script: it reads, counts and fits what we say."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy.optimize import minimize
from scipy.special import expit, roots_hermite

from tests.handoff.bundles import needs_lme4, needs_r, r_answers, rows_of

pytestmark = [pytest.mark.slow, needs_r]

FACTORS = ("cue", "fit", "group")
#: What a person would type who knows nothing of our script: R's own types, tables and means.
COUNTING = """
wide <- read.csv("{wide}", na.strings = "", stringsAsFactors = TRUE)
found <- NULL
for (outcome in c("first_pass_skip", "first_pass_regression_out", "regression_in", "reread")) {{
  wide$y <- wide[[outcome]]
  ones <- as.data.frame(xtabs(y ~ region + cue + fit + group, wide))
  zeros <- as.data.frame(xtabs((1 - y) ~ region + cue + fit + group, wide))
  means <- aggregate(y ~ region + cue + fit + group, wide, mean)
  both <- merge(merge(zeros, ones, by = 1:4), means, by = 1:4, all.x = TRUE)
  names(both)[5:7] <- c("zeros", "ones", "rate")
  found <- rbind(found, cbind(outcome, both))
}}
found$rate <- format(found$rate, digits = 17)
write.csv(found, "answers.csv", row.names = FALSE, quote = FALSE)
"""


def test_cross_tables_and_means_of_r_are_those_of_readiness(
    orchard_bundle: Path, tmp_path: Path
) -> None:
    """Zeros, ones and rates by region and condition, as R's xtabs and aggregate give them."""
    wide = (orchard_bundle / "outcomes_wide.csv").as_posix()
    header, *found = r_answers(COUNTING.format(wide=wide), tmp_path)
    assert header == ["outcome", "region", *FACTORS, "zeros", "ones", "rate"]
    by_cell = {tuple(row[:5]): row[5:] for row in found}
    ours = {
        (row["outcome"], row["region"], *(row[factor] for factor in FACTORS)): row
        for row in rows_of(orchard_bundle / "readiness.csv")
        if row["cue"]
    }
    assert len(by_cell) > 100
    for cell, (zeros, ones, rate) in by_cell.items():
        row = ours[cell]
        assert (int(zeros), int(ones)) == (int(row["zeros"]), int(row["ones"])), cell
        if row["rate"]:
            # R's mean adds in extended precision: it may differ from the quotient in the last bit.
            assert float(rate) == pytest.approx(float(row["rate"]), rel=1e-14), cell


#: Every formula as R and lme4 take it: the error, or nothing.
ACCEPTING = """
source("{script}", local = (one <- new.env()))
answer <- function(row) {{
  step <- one$formulas[row, ]
  rows <- one$rows_of(step$region)
  rows <- rows[!is.na(rows[[step$outcome]]), , drop = FALSE]
  tryCatch({{
    formula <- as.formula(step$formula)
    if (grepl("|", step$formula, fixed = TRUE)) {{
      suppressMessages(lme4::glFormula(formula, rows, family = binomial))
    }} else {{
      model.matrix(formula, rows)
    }}
    ""
  }}, error = function(e) conditionMessage(e))
}}
said <- vapply(seq_len(nrow(one$formulas)), answer, "")
said <- cbind(one$formulas[c("outcome", "region", "step")], said)
write.csv(said, "answers.csv", row.names = FALSE)
"""


@needs_lme4
@pytest.mark.parametrize("bundle", ["orchard_bundle", "passages_bundle"])
def test_lme4_accepts_every_formula_that_nothing_speaks_against(
    request: pytest.FixtureRequest, tmp_path: Path, bundle: str
) -> None:
    """R can read all formulas; lme4 sets up the model of those without a remark."""
    folder = request.getfixturevalue(bundle)
    text = (folder / "start.R").read_text(encoding="utf-8")
    quiet = text.replace("fit_models <- TRUE", "fit_models <- FALSE", 1)
    # Beside the tables, where a person would keep it, but not in the bundle that others check.
    beside = tmp_path / "copy"
    beside.mkdir()
    for name in ("outcomes_wide.csv", "trials.csv", "readiness.csv", "formulas.csv"):
        (beside / name).write_bytes((folder / name).read_bytes())
    script = beside / "start.R"
    script.write_text(quiet, encoding="utf-8", newline="\n")
    _, *answers = r_answers(ACCEPTING.format(script=script.as_posix()), tmp_path)
    formulas = rows_of(folder / "formulas.csv")
    assert [row[:3] for row in answers] == [
        [row["outcome"], row["region"], row["step"]] for row in formulas
    ]
    refused = [
        (row["formula"], answer[3])
        for row, answer in zip(formulas, answers, strict=True)
        if answer[3] and not row["expectation"]
    ]
    assert refused == []
    # What R cannot even read names no model, whatever was said of it.
    assert [answer for answer in answers if "unexpected" in answer[3]] == []


PLAIN = """
wide <- read.csv("{wide}", na.strings = "")
model <- glm({outcome} ~ 1, binomial, wide, subset = region == "verb",
             control = glm.control(epsilon = 1e-14))
answer <- c(coef(summary(model))[1:2], logLik(model))
write.csv(format(answer, digits = 15), "answers.csv", row.names = FALSE, quote = FALSE)
"""


@pytest.mark.parametrize("outcome", ["first_pass_regression_out", "reread", "fixated"])
def test_intercept_by_r_is_that_by_statsmodels(
    orchard_bundle: Path, tmp_path: Path, outcome: str
) -> None:
    """The plain intercept, its standard error and likelihood from our CSV and our Parquet."""
    wide = (orchard_bundle / "outcomes_wide.csv").as_posix()
    _, *found = r_answers(PLAIN.format(wide=wide, outcome=outcome), tmp_path)
    intercept, error, likelihood = (float(row[0]) for row in found)
    table = pd.read_parquet(orchard_bundle / "outcomes_wide.parquet")
    values = table.loc[table["region"] == "verb", outcome].dropna().to_numpy(dtype=float)
    fitted = sm.Logit(values, np.ones((len(values), 1))).fit(disp=0, method="newton", tol=1e-14)
    # Both are Newton's method to the end, in double precision.
    assert intercept == pytest.approx(float(fitted.params[0]), rel=1e-9)
    assert error == pytest.approx(float(fitted.bse[0]), rel=1e-9)
    assert likelihood == pytest.approx(float(fitted.llf), rel=1e-12)
    # By hand: the logit of the rate, and the square root of n / (zeros × ones).
    ones = values.sum()
    zeros = len(values) - ones
    assert intercept == pytest.approx(math.log(ones / zeros), rel=1e-9)
    assert error == pytest.approx(math.sqrt(len(values) / (zeros * ones)), rel=1e-7)


MIXED = """
wide <- read.csv("{wide}", na.strings = "")
model <- lme4::glmer(reread ~ 1 + (1 | participant), wide, subset = region == "verb",
  family = binomial, nAGQ = 25, control = lme4::glmerControl(optimizer = "bobyqa",
  optCtrl = list(rhoend = 1e-9)))
answer <- c(lme4::fixef(model), sqrt(unlist(lme4::VarCorr(model))))
write.csv(format(answer, digits = 15), "answers.csv", row.names = FALSE, quote = FALSE)
"""


@needs_lme4
def test_random_intercept_by_lme4_is_that_of_the_likelihood_itself(
    orchard_bundle: Path, tmp_path: Path
) -> None:
    """On our CSV glmer finds the maximum of the likelihood integrated in Python.

    One random intercept a reader leaves one integral a reader, here by Gauss-Hermite quadrature
    at 80 nodes that do not depend on the data (Liu & Pierce 1994, doi:10.1093/biomet/81.3.624, for
    the 25 adaptive ones of lme4).
    """
    wide = (orchard_bundle / "outcomes_wide.csv").as_posix()
    _, *found = r_answers(MIXED.format(wide=wide), tmp_path)
    intercept, deviation = (float(row[0]) for row in found)
    table = pd.read_parquet(orchard_bundle / "outcomes_wide.parquet")
    table = table[table["region"] == "verb"].dropna(subset=["reread"])
    by_reader = table.groupby("participant", observed=True)["reread"].agg(["sum", "count"])
    ones = by_reader["sum"].to_numpy(dtype=float)[:, None]
    zeros = by_reader["count"].to_numpy(dtype=float)[:, None] - ones
    nodes, weights = roots_hermite(80)

    def lost(guess: np.ndarray) -> float:
        """Minus the log likelihood."""
        chance = expit(guess[0] + math.sqrt(2) * abs(guess[1]) * nodes)
        inner = np.exp(ones * np.log(chance) + zeros * np.log1p(-chance))
        return -float(np.log(inner @ weights / math.sqrt(math.pi)).sum())

    best = minimize(lost, [0.0, 0.5], method="Nelder-Mead", options={"xatol": 1e-8, "fatol": 1e-11})
    assert best.success
    # The quadratures agree to some 1e-9. lme4 stops where steps of its optimizer change the
    # deviance by less than about 1e-7; the likelihood is flat at its top, so that this leaves
    # errors of the order of the square root, 3e-4, of a standard error, which is some 0.1 here.
    assert intercept == pytest.approx(best.x[0], abs=1e-4)
    assert deviation == pytest.approx(abs(best.x[1]), abs=1e-4)
