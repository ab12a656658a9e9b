"""What R says of the same data: cross-tables, model matrices, refusals, estimates that run off."""

from __future__ import annotations

import random
from dataclasses import dataclass
from itertools import product
from pathlib import Path

import numpy as np
import pytest

from etl.coding import coding_of
from etl.readiness import separation_of
from etl.readiness.facts import OutcomeReadiness, Step
from etl.readiness.ladder import Grouping, Model, ladder_of
from etl.readiness.terms import design_matrix, quoted, terms_of
from tests.readiness.in_r import ask, read_rows, write_rows
from tests.readiness.making import Row, counts_of, crossed, judged

pytestmark = pytest.mark.slow

# ---- Data of lme4 -------------------------------------------------------------------------------

VERBAGG = """
data(VerbAgg, package = "lme4")
write.csv(VerbAgg, "data.csv", row.names = FALSE)
"""


@pytest.fixture(scope="module")
def verbagg(tmp_path_factory: pytest.TempPathFactory) -> OutcomeReadiness:
    """316 persons answered 24 items on verbal aggression (De Boeck & Wilson 2004)."""
    folder = tmp_path_factory.mktemp("verbagg")
    ask(VERBAGG, folder, "lme4")
    factors = {
        "btype": ["curse", "scold", "shout"],
        "situ": ["other", "self"],
        "mode": ["want", "do"],
        "Gender": ["F", "M"],
    }
    rows: list[Row] = [
        (r["id"], r["item"], tuple(r[name] for name in factors), int(r["r2"] == "Y"))
        for r in read_rows(folder / "data.csv")
    ]
    return judged(factors, rows, outcome="r2", region="")


def kinds(one: OutcomeReadiness, unit: str) -> dict[tuple[str, ...], str]:
    """How each factor and interaction varies within one kind of unit."""
    return {own.factors: own.kind for own in one.variations if own.unit == unit}


def test_items_of_verbagg_vary_within_persons_only(verbagg: OutcomeReadiness) -> None:
    """What an item is varies within persons, gender within items, and no two cross both."""
    persons, items = kinds(verbagg, "participant"), kinds(verbagg, "item")
    for term in persons:
        assert persons[term] == ("between" if "Gender" in term else "within")
        assert items[term] == ("within" if term == ("Gender",) else "between")


def test_maximal_formula_of_verbagg_has_all_slopes_of_its_design(verbagg: OutcomeReadiness) -> None:
    """Each person has two items in each of 12 combinations; each item all persons."""
    first = verbagg.ladder[0]
    assert first.formula == (
        "r2 ~ btype * situ * mode * Gender + (1 + btype * situ * mode | participant) + "
        "(1 + Gender | item)"
    )
    assert (first.fixed_parameters, first.random_parameters) == (24, 12 * 13 // 2 + 3)
    assert [(own.unit, own.units) for own in verbagg.units] == [("participant", 316), ("item", 24)]
    assert verbagg.verdict == "ready"


def test_herds_of_cbpp_vary_by_period(tmp_path: Path) -> None:
    """Incidence in 15 herds over four periods (Lesnoff et al. 2004), as zeros and ones."""
    script = """
    data(cbpp, package = "lme4")
    write.csv(cbpp, "data.csv", row.names = FALSE)
    """
    ask(script, tmp_path, "lme4")
    rows: list[Row] = [
        (r["herd"], None, (r["period"],), int(n < int(r["incidence"])))
        for r in read_rows(tmp_path / "data.csv")
        for n in range(int(r["size"]))
    ]
    one = judged({"period": list("1234")}, rows, outcome="incidence", region="", items=False)
    (own,) = one.variations
    # One herd was seen in one period.
    assert (own.kind, own.varying, own.units, own.repeated) == ("within some", 14, 15, True)
    assert one.ladder[0].formula == "incidence ~ period + (1 + period | participant)"
    assert one.separations[0].kind == "none"
    assert (one.total.ones, one.total.values) == (99, 842)


# ---- What lme4 makes of every step --------------------------------------------------------------

ACCEPTED = """
suppressMessages(library(lme4))
formulas <- read.csv("formulas.csv", colClasses = "character", check.names = FALSE)
levels <- read.csv("levels.csv", colClasses = "character")
answers <- lapply(seq_len(nrow(formulas)), function(row) {
  name <- formulas$data[[row]]
  data <- read.csv(name, check.names = FALSE, colClasses = c(participant = "character",
    item = "character"), na.strings = "")
  for (factor in unique(levels$factor[levels$data == name])) {
    own <- levels$level[levels$data == name & levels$factor == factor]
    data[[factor]] <- factor(data[[factor]], levels = own)
  }
  made <- try(suppressMessages(glFormula(as.formula(formulas$formula[[row]]), data,
    family = binomial)), silent = TRUE)
  if (inherits(made, "try-error")) {
    return(data.frame(refused = conditionMessage(attr(made, "condition")), fixed = NA, random = NA,
      effects = NA))
  }
  terms <- made$reTrms
  by_group <- tapply(diff(terms$Gp), names(terms$cnms), sum)
  data.frame(refused = "", fixed = ncol(made$X), random = length(terms$theta),
    effects = max(by_group))
})
write.csv(do.call(rbind, answers), "answers.csv", row.names = FALSE)
"""


@dataclass
class Asked:
    """A step, and what lme4 made of it."""

    step: Step
    answer: dict[str, str]


def small_designs() -> list[tuple[dict[str, list[str]], list[Row]]]:
    """Designs so small that some formulas have more random effects than there are values."""
    source = random.Random(20)
    out = []
    for number in range(24):
        factors = {"cue type": ["early", "late"]}
        if number % 2:
            factors["fit"] = ["fitting", "odd", "so-so"][: 2 + number % 3 // 2]
        if number % 5 == 4:
            factors["in"] = ["x", "y"]
        readers, items = source.randint(2, 9), source.randint(4, 10)
        rows = crossed(factors, readers, items, seed=number, share=0.4)
        if number % 3 == 0:
            rows = source.sample(rows, min(len(rows), max(len(rows) // 3, 12)))
        if number % 4 == 0:
            rows = [(reader, item if n % 7 else None, levels, value)
                    for n, (reader, item, levels, value) in enumerate(rows)]  # fmt: skip
        out.append((factors, rows))
    return out


def overloaded(factors: dict[str, list[str]], rows: list[Row]) -> tuple[Step, ...]:
    """The ladder with slopes for everything, whether or not the design can carry them."""
    counts = counts_of(factors, rows)
    terms = terms_of(list(factors), len(factors))
    groupings = [
        Grouping(
            own.unit, len(set(own.owner.tolist())), int(own.values.sum()), dict.fromkeys(terms, 1.0)
        )
        for own in counts.units
    ]
    columns = {name: coding_of(name, levels).columns for name, levels in factors.items()}
    there = int((counts.values > 0).sum())
    fixed = " * ".join(quoted(name) for name in factors)
    values, ones = int(counts.values.sum()), int(counts.cells[:, 1].sum())
    model = Model("regression_out", fixed, there, values, ones, "ones", columns)
    return ladder_of(model, groupings).steps


@pytest.fixture(scope="module")
def asked(tmp_path_factory: pytest.TempPathFactory) -> list[Asked]:
    """Every step of every small design, put before lme4."""
    folder = tmp_path_factory.mktemp("accepted")
    formulas: list[dict[str, object]] = []
    levels: list[dict[str, object]] = []
    steps: list[Step] = []
    for number, (factors, rows) in enumerate(small_designs()):
        name = f"data{number}.csv"
        one = judged(factors, rows)
        codings = [coding_of(factor, own) for factor, own in factors.items()]
        table: list[dict[str, object]] = []
        for reader, item, own, value in rows:
            row: dict[str, object] = {"participant": reader, "item": item, "regression_out": value}
            row |= dict(zip(factors, own, strict=True))
            for coding, level in zip(codings, own, strict=True):
                at = coding.levels.index(level)
                row |= dict(zip(coding.columns, coding.matrix[at], strict=True))
            table.append(row)
        write_rows(folder / name, table)
        levels += [
            {"data": name, "factor": factor, "level": level}
            for factor, own in factors.items()
            for level in own
        ]
        own_steps = [*one.ladder, *overloaded(factors, rows)]
        formulas += [{"data": name, "formula": step.formula} for step in own_steps]
        steps += own_steps
    write_rows(folder / "formulas.csv", formulas)
    write_rows(folder / "levels.csv", levels)
    ask(ACCEPTED, folder, "lme4")
    answers = read_rows(folder / "answers.csv")
    return [Asked(step, answer) for step, answer in zip(steps, answers, strict=True)]


def test_lme4_refuses_the_steps_that_are_said_to_be_refused(asked: list[Asked]) -> None:
    """And no others; its own message has the same numbers."""
    refused = 0
    for own in asked:
        step = own.step
        said = step.expectation.startswith("lme4 refuses it")
        message = own.answer["refused"]
        assert said == (message != ""), (step, message)
        if said:
            refused += 1
            assert "number of observations" in message
    assert refused >= 8
    assert len(asked) - refused >= 60


def test_lme4_counts_the_same_parameters(asked: list[Asked]) -> None:
    """Coefficients, variances with correlations, and random effects of the largest grouping."""
    for own in asked:
        step, answer = own.step, own.answer
        if not answer["refused"]:
            counted = [int(answer[name]) for name in ("fixed", "random", "effects")]
            told = [step.fixed_parameters, step.random_parameters, step.random_effects]
            assert told == counted, step.formula


# ---- Counts -------------------------------------------------------------------------------------


def test_cross_tables_of_r_have_the_same_counts(tmp_path: Path) -> None:
    """``xtabs`` over factors and values equals the cells, level by level."""
    factors = {"cue": ["early", "late"], "fit": ["fitting", "odd", "so-so"]}
    rows = crossed(factors, 11, 13, seed=4)
    names = ("reader", "item", "cue", "fit", "value")
    write_rows(
        tmp_path / "rows.csv",
        [dict(zip(names, (r, i, *own, v), strict=True)) for r, i, own, v in rows],
    )
    script = """
    rows <- read.csv("rows.csv")
    counted <- as.data.frame(xtabs(~ cue + fit + value, rows))
    write.csv(counted, "counted.csv", row.names = FALSE)
    """
    ask(script, tmp_path)
    theirs = {
        (row["cue"], row["fit"], int(row["value"])): int(row["Freq"])
        for row in read_rows(tmp_path / "counted.csv")
    }
    ours = {
        (*cell.levels, value): count
        for cell in judged(factors, rows).cells
        for value, count in enumerate((cell.zeros, cell.ones))
    }
    assert ours == theirs


# ---- Separation ---------------------------------------------------------------------------------


def table_of(name: str, folder: Path) -> list[dict[str, str]]:
    """A table of R's own, a row for each cell."""
    script = f'write.csv(as.data.frame(datasets::{name}), "table.csv", row.names = FALSE)'
    ask(script, folder)
    return read_rows(folder / "table.csv")


def test_children_of_two_classes_all_survived_the_titanic(tmp_path: Path) -> None:
    """``datasets::Titanic``: separated by class and age together, and not by main effects."""
    cells = table_of("Titanic", tmp_path)
    factors = {
        "Class": ["1st", "2nd", "3rd", "Crew"],
        "Sex": ["Male", "Female"],
        "Age": ["Child", "Adult"],
    }
    rows: list[Row] = [
        (f"P{n % 3}", None, tuple(row[f] for f in factors), int(row["Survived"] == "Yes"))
        for row in cells
        for n in range(int(row["Freq"]))
    ]
    one = judged(factors, rows, outcome="survived", region="", items=False)
    assert [(own.effects, own.kind) for own in one.separations] == [
        ("Class + Sex + Age", "none"),
        ("(Class + Sex + Age)^2", "quasi-complete"),
        ("Class * Sex * Age", "quasi-complete"),
    ]
    assert one.separations[1].causes == (
        "Class = 1st × Age = Child has ones only",
        "Class = 2nd × Age = Child has ones only",
    )
    assert any(
        "No values in Crew × Male × Child; Crew × Female × Child" in s for s in one.sentences
    )


def test_admissions_are_not_separated(tmp_path: Path) -> None:
    """``datasets::UCBAdmissions``: every department admitted and rejected of both."""
    rows: list[Row] = [
        (f"P{n % 3}", None, (row["Gender"], row["Dept"]), int(row["Admit"] == "Admitted"))
        for row in table_of("UCBAdmissions", tmp_path)
        for n in range(int(row["Freq"]))
    ]
    factors = {"Gender": ["Male", "Female"], "Dept": list("ABCDEF")}
    one = judged(factors, rows, outcome="admitted", region="", items=False)
    assert [own.kind for own in one.separations] == ["none", "none"]


FITTED = """
cells <- read.csv("cells.csv", stringsAsFactors = TRUE)
fitted <- lapply(split(cells, cells$table), function(own) {
  own <- own[own$zeros + own$ones > 0, ]
  formula <- as.formula(as.character(own$formula[[1]]))
  # Stopped by its own rule: long after it, weights of 0 make nonsense of what was fitted.
  model <- suppressWarnings(glm(formula, binomial, own))
  data.frame(table = own$table, cell = own$cell, fitted = fitted(model))
})
write.csv(do.call(rbind, fitted), "fitted.csv", row.names = FALSE)
"""


def test_estimates_of_r_run_off_exactly_in_separated_cells(tmp_path: Path) -> None:
    """In 400 small tables ``glm`` fits 0 or 1 in the cells that are separated, and in no other."""
    rng = np.random.default_rng(6)
    shapes = [((2, 2), 1), ((2, 3), 1), ((3, 3), 1), ((2, 2, 2), 1), ((2, 2, 2), 2), ((4, 2), 1)]
    out: list[dict[str, object]] = []
    expected: dict[tuple[str, str], bool] = {}
    found = {"none": 0, "quasi-complete": 0, "complete": 0}
    for number in range(400):
        sizes, order = shapes[number % len(shapes)]
        codes = np.array(list(product(*map(range, sizes))))
        counts = rng.integers(0, 4, (len(codes), 2)) * (rng.random((len(codes), 2)) < 0.75)
        while (counts.sum(axis=1) > 0).sum() < 2:
            counts[rng.integers(len(codes)), rng.integers(2)] += 1
        kind, told = separation_of(design_matrix(codes, sizes, order), *counts.T)
        found[kind] += 1
        # Factors with one level that occurs have no contrasts in R.
        valued = codes[counts.sum(axis=1) > 0]
        names = [f"f{p}" for p in range(len(sizes)) if len(np.unique(valued[:, p])) > 1]
        right = " + ".join(names) if order == 1 or len(names) < 2 else f"({' + '.join(names)})^2"
        for cell, (levels, (zeros, ones)) in enumerate(zip(codes, counts, strict=True)):
            factors = {f"f{p}": f"l{c}" for p, c in enumerate(levels)}
            factors |= {f"f{p}": "l0" for p in range(len(levels), 3)}
            head = {"table": f"t{number}", "cell": f"c{cell}"}
            values = {"zeros": int(zeros), "ones": int(ones)}
            formula = f"cbind(ones, zeros) ~ {right or 1}"
            out.append({**head, **factors, **values, "formula": formula})
            expected[f"t{number}", f"c{cell}"] = bool(told[cell])
    write_rows(tmp_path / "cells.csv", out)
    ask(FITTED, tmp_path)
    fitted = read_rows(tmp_path / "fitted.csv")
    for row in fitted:
        rate = float(row["fitted"])
        # Where estimates exist, so few values give no rate nearer to 0 or 1 than this.
        runs_off = min(rate, 1 - rate) < 1e-5
        assert runs_off == expected[row["table"], row["cell"]], row
    assert len(fitted) > 2000
    assert min(found.values()) >= 10
