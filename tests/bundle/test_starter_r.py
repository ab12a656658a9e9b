"""The starter script in R, run as it is by a real R."""

from __future__ import annotations

import re
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from tests.bundle.odd_studies import ODD_STUDIES
from tests.handoff.bundles import (
    bundle_of,
    has_lme4,
    needs_lme4,
    needs_r,
    rows_of,
    run_r,
    small_study,
)

pytestmark = [pytest.mark.slow, needs_r]
AGREE = re.compile(r"^All (\d+) counts agree", re.MULTILINE)


@pytest.fixture
def copied(orchard_bundle: Path, tmp_path: Path) -> Path:
    """A copy of the orchard's bundle, sent to somebody else."""
    return shutil.copytree(orchard_bundle, tmp_path / "got by mail")


def changed(bundle: Path, name: str, old: str, new: str) -> None:
    """Change a text in a file of the bundle, where it stands first."""
    path = bundle / name
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), encoding="utf-8", newline="\n")


def without_fits(bundle: Path) -> Path:
    """The script changed to stop before any model, as its top invites; gives the script."""
    changed(bundle, "start.R", "fit_models <- TRUE", "fit_models <- FALSE")
    return bundle / "start.R"


@needs_lme4
@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_script_runs_as_it_is_to_the_first_model(
    request: pytest.FixtureRequest, name: str, tmp_path: Path
) -> None:
    """In one command, from another folder: all counts agree, and a model is printed."""
    bundle = request.getfixturevalue(f"{name}_bundle")
    ran = run_r(bundle / "start.R", folder=tmp_path)
    assert (ran.returncode, ran.stderr) == (0, "")
    agreed = AGREE.search(ran.stdout)
    assert agreed is not None
    assert int(agreed[1]) == len(rows_of(bundle / "readiness.csv"))
    assert "Generalized linear mixed model fit by maximum likelihood" in ran.stdout
    assert "What remains for you to decide" in ran.stdout


@needs_lme4
def test_script_runs_from_within_its_folder(odd_bundle: Callable[[str], Path]) -> None:
    """A person who went into the folder names the script alone."""
    ran = run_r("start.R", folder=odd_bundle("no factors"))
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)


@needs_lme4
@pytest.mark.parametrize("locale", ["C.UTF-8", "C"])
@pytest.mark.parametrize("name", ODD_STUDIES)
def test_script_runs_on_an_odd_study(
    odd_bundle: Callable[[str], Path], name: str, locale: str
) -> None:
    """Missing parts, odd names and other letters do not stop it, whatever R's own letters."""
    bundle = odd_bundle(name)
    ran = run_r(bundle / "start.R", folder=bundle.parent, LC_ALL=locale)
    assert (ran.returncode, ran.stderr) == (0, "")
    agreed = AGREE.search(ran.stdout)
    assert agreed is not None
    assert int(agreed[1]) == len(rows_of(bundle / "readiness.csv"))
    assert "Fixed effects:" in ran.stdout


@needs_lme4
@pytest.mark.parametrize("locale", ["C.UTF-8", "C"])
def test_script_is_sourced_from_anywhere(
    odd_bundle: Callable[[str], Path], tmp_path: Path, locale: str
) -> None:
    """An R editor sources the script; it finds its tables wherever R is at work."""
    script = odd_bundle("letters of other languages") / "start.R"
    ran = run_r("-e", f'source("{script.as_posix()}")', folder=tmp_path, LC_ALL=locale)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)


def test_script_says_where_it_must_lie(copied: Path) -> None:
    """A script that was put elsewhere by itself says what it needs."""
    away = copied.parent / "alone" / "start.R"
    away.parent.mkdir()
    shutil.copy(copied / "start.R", away)
    ran = run_r(away, folder=away.parent)
    assert ran.returncode == 1
    assert "start.R must lie beside" in ran.stderr


def test_types_are_those_of_the_codebook(odd_bundle: Callable[[str], Path], tmp_path: Path) -> None:
    """Names that look like numbers stay names; factors have their levels in order."""
    bundle = shutil.copytree(odd_bundle("names that need quoting"), tmp_path / "b")
    shown = run_r(without_fits(bundle)).stdout.partition("The table trials")[0]
    columns = [line for line in shown.splitlines() if line.startswith(" $ ")]
    lines = {line[3:28].strip(): line.partition(": ")[2] for line in columns}
    assert lines["participant"].startswith('chr  "007"')
    assert lines["item"].startswith('chr  "NA" "NA"')
    assert lines["trial"].startswith("int  1 ")
    assert lines["cue type"].startswith('Factor w/ 2 levels "early","late": 1')
    assert lines["if"].startswith('Factor w/ 3 levels "=SUM(A1)","\'=x",..: 3 ')
    assert lines["reread"].startswith("int  ")
    assert lines["total_time"].startswith("num  ")
    assert lines["cue_type_late"].startswith("num  0 ")


def test_printed_counts_are_those_of_readiness(copied: Path) -> None:
    """With all counts asked for, R's own numbers stand beside ours, row for row."""
    script = without_fits(copied)
    changed(copied, "start.R", "print_all_counts <- FALSE", "print_all_counts <- TRUE")
    shown = run_r(script).stdout
    table = shown.partition("(readiness.csv):\n")[2].partition("\n\n")[0].splitlines()[1:]
    numbers = [
        [float(word) for word in re.findall(r"(?<= )(?:\d+(?:\.\d+)?|NaN)(?= |$)", line)][:7]
        for line in table
    ]
    expected = rows_of(copied / "readiness.csv")
    assert len(numbers) == len(expected)
    for found, row in zip(numbers, expected, strict=True):
        counts = [float(row[name]) for name in ("zeros", "ones", "missing")]
        assert found[:3] == counts
        assert found[4:] == counts
        # Printed to three digits; an empty cell is a rate of nothing.
        rate = float(row["rate"] or "nan")
        assert found[3] == pytest.approx(rate, abs=0.0005 + 1e-12, nan_ok=True)


def test_changed_value_is_found_and_named(copied: Path) -> None:
    """One value that is not what was counted stops the script, with outcome, region, cell."""
    header, first = (copied / "outcomes_wide.csv").read_text(encoding="utf-8").splitlines()[:2]
    names = [name.strip('"') for name in header.split(",")]
    cells = first.split(",")
    place = names.index("fixated")
    cells[place] = "01"[cells[place] == "0"]
    changed(copied, "outcomes_wide.csv", first, ",".join(cells))
    ran = run_r(copied / "start.R")
    facts = {name: cell.strip('"') for name, cell in zip(names, cells, strict=True)}
    levels = ", ".join(f"{factor} = {facts[factor]}" for factor in ("cue", "fit", "group"))
    assert ran.returncode == 1
    assert re.search(r"the tables are not those .* 2 of \d+ counts differ", ran.stderr)
    assert f"fixated in {facts['region']}, all conditions: " in ran.stderr
    assert f"fixated in {facts['region']}, {levels}: " in ran.stderr
    assert "Generalized" not in ran.stdout


@pytest.mark.parametrize(
    ("name", "value", "message"),
    [
        ("fixated", "2", 'column "fixated": found "2", expected 0 or 1'),
        ("total_time", "long", 'column "total_time": found "long", expected a number'),
        ("region_order", "1.5", 'column "region_order": found "1.5", expected a whole number'),
        ("cue", '"often"', 'column "cue": found "often", expected one of early, late'),
    ],
)
def test_value_that_cannot_be_is_named(copied: Path, name: str, value: str, message: str) -> None:
    """A value that the codebook does not allow stops the script with its row and column."""
    header, first = (copied / "outcomes_wide.csv").read_text(encoding="utf-8").splitlines()[:2]
    cells = first.split(",")
    cells[[column.strip('"') for column in header.split(",")].index(name)] = value
    changed(copied, "outcomes_wide.csv", first, ",".join(cells))
    ran = run_r(copied / "start.R")
    assert ran.returncode == 1
    assert f"outcomes_wide.csv: row 1 below the header, {message}" in ran.stderr


def test_column_that_is_gone_is_named(copied: Path) -> None:
    """A table with other columns than the codebook states is not read."""
    changed(copied, "trials.csv", '"any_skip"', '"any_skips"')
    ran = run_r(copied / "start.R")
    assert ran.returncode == 1
    assert (
        "trials.csv: its columns are not those of the codebook: any_skips, any_skip" in ran.stderr
    )


@needs_lme4
def test_another_outcome_region_and_step_are_asked_for(copied: Path) -> None:
    """Words after the script's name choose outcome, region and step."""
    steps = [
        row
        for row in rows_of(copied / "formulas.csv")
        if (row["outcome"], row["region"]) == ("first_pass_skip", "verb")
    ]
    ran = run_r(copied / "start.R", "first_pass_skip", "verb", steps[-1]["step"])
    assert ran.returncode == 0
    fitted = re.findall(r"^Fitting step (\d+), \d+ rows: (.*)$", ran.stdout, re.MULTILINE)
    assert fitted == [(steps[-1]["step"], steps[-1]["formula"])]


def test_outcome_of_trials_needs_no_region(copied: Path) -> None:
    """An outcome of whole trials is asked for by its name."""
    ran = run_r(without_fits(copied), "any_skip")
    assert ran.returncode == 0
    assert re.search(r"^any_skip \(\w+\), by condition:$", ran.stdout, re.MULTILINE)


def test_unknown_outcome_is_answered_by_those_there_are(copied: Path) -> None:
    """A name that is none stops the script, which then lists the names."""
    ran = run_r(copied / "start.R", "rereading", "verb")
    assert ran.returncode == 1
    assert "there is no outcome rereading in verb; there are:" in ran.stderr
    assert "\n  reread in verb\n" in ran.stderr


def test_unknown_step_is_answered_by_those_there_are(copied: Path) -> None:
    """A step that is none stops the script, which then lists the steps."""
    ran = run_r(copied / "start.R", "reread", "verb", "99")
    assert ran.returncode == 1
    assert re.search(r"the ladder of reread in verb has the steps 1, 2,", ran.stderr)


def test_constant_outcome_is_not_fitted(passages_bundle: Path) -> None:
    """Where there is no formula the script says why and ends well."""
    rows = rows_of(passages_bundle / "readiness.csv")
    constant = next(row for row in rows if row["verdict"] == "constant")
    ran = run_r(passages_bundle / "start.R", constant["outcome"], constant["region"] or "-")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "No formula is given for it" in ran.stdout


def test_without_lme4_the_counts_are_compared_and_help_is_given(
    copied: Path, tmp_path: Path
) -> None:
    """A computer without the package gets everything but the models, and is told how to get it."""
    nothing = tmp_path / "no packages"
    nothing.mkdir()
    places = dict.fromkeys(("R_LIBS", "R_LIBS_USER", "R_LIBS_SITE"), str(nothing))
    question = 'cat(requireNamespace("lme4", quietly = TRUE))'
    if has_lme4() and run_r("-e", question, **places).stdout != "FALSE":
        pytest.skip("lme4 lies among R's own packages here and cannot be hidden")
    ran = run_r(copied / "start.R", **places)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)
    assert 'install.packages("lme4")' in ran.stdout
    assert "What remains for you to decide" in ran.stdout


def test_study_without_binary_outcomes_ends_well(tmp_path: Path) -> None:
    """Tables without anything of 0 and 1 in regions are shown, and the trials are counted."""
    study_file = small_study(tmp_path, {}, output='[measures]\noutcomes = ["total_time"]')
    ran = run_r(bundle_of(study_file) / "start.R")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)


@needs_lme4
def test_script_writes_no_file(odd_bundle: Callable[[str], Path], tmp_path: Path) -> None:
    """What was sent is what is there after the script has run."""
    bundle = shutil.copytree(odd_bundle("no factors"), tmp_path / "b")
    before = sorted((path.name, path.stat().st_mtime_ns) for path in bundle.iterdir())
    assert run_r("start.R", folder=bundle).returncode == 0
    assert sorted((path.name, path.stat().st_mtime_ns) for path in bundle.iterdir()) == before


def test_changed_contrasts_reach_factors_and_numeric_columns(
    odd_bundle: Callable[[str], Path], tmp_path: Path
) -> None:
    """Numbers changed at the top of the script are what a model is fitted with, in both shapes."""
    bundle = shutil.copytree(odd_bundle("no items"), tmp_path / "b")
    script = without_fits(bundle)
    changed(bundle, "start.R", "c(0),  # early\n      c(1)", "c(-5),  # early\n      c(5)")
    ask = tmp_path / "ask.R"
    ask.write_text(_SLOPES.format(script=script.as_posix()), encoding="utf-8", newline="\n")
    early, late, by_factor, by_column, plain = map(float, run_r(ask).stdout.split("\n")[-1].split())
    assert (early, late) == (-5.0, 5.0)
    assert by_factor == by_column
    # Ten units apart in place of one. Both fits are done when the deviance changes by less than
    # 1e-8 of itself, where the error of a slope is of the order of 1e-4 of its standard error.
    assert by_factor * 10 == pytest.approx(plain, rel=1e-3)


#: Fits an outcome by the factor and by the numeric column of the script, and by 0 and 1.
_SLOPES = """
source("{script}")
slope <- function(formula) coef(glm(formula, data = trials, family = binomial))[[2]]
codes <- tapply(trials$cue_late, trials$cue, unique)
trials$plain <- as.integer(trials$cue == "late")
cat("\n")
slopes <- c(slope(any_skip ~ cue), slope(any_skip ~ cue_late), slope(any_skip ~ plain))
cat(codes[["early"]], codes[["late"]], format(slopes, digits = 15))
"""
