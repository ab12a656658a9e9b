"""The starter script in Python, run as it is in a process of its own, warnings as errors."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from statsmodels.genmod.bayes_mixed_glm import BinomialBayesMixedGLM

from etl.handoff.scripts import VERDICT_ADVICE
from etl.readiness.facts import VERDICT_RULES
from tests.bundle.odd_studies import ODD_STUDIES
from tests.handoff.bundles import bundle_of, rows_of, small_study

pytestmark = pytest.mark.slow
AGREE = re.compile(r"^All (\d+) counts agree\.$", re.MULTILINE)


def run_python(
    *arguments: object, folder: Path | None = None, **environment: str
) -> subprocess.CompletedProcess[str]:
    """Run a script in a Python of its own."""
    return subprocess.run(
        [sys.executable, "-W", "error", *map(str, arguments)],
        cwd=folder,
        env={**os.environ, "PYTHONUTF8": "1", **environment},
        capture_output=True,
        encoding="utf-8",
        check=False,
        timeout=300,
    )


@pytest.fixture
def copied(odd_bundle: Callable[[str], Path], tmp_path: Path) -> Path:
    """A copy of a small study's bundle."""
    return shutil.copytree(odd_bundle("stated contrasts"), tmp_path / "got by mail")


def test_script_runs_as_it_is_to_the_first_model(orchard_bundle: Path, tmp_path: Path) -> None:
    """In one command, from another folder: all counts agree, and a model is printed."""
    ran = run_python(orchard_bundle / "start.py", folder=tmp_path)
    assert (ran.returncode, ran.stderr) == (0, "")
    agreed = AGREE.search(ran.stdout)
    assert agreed is not None
    assert int(agreed[1]) == len(rows_of(orchard_bundle / "readiness.csv"))
    assert "Binomial Mixed GLM Results" in ran.stdout
    assert "What remains for you to decide" in ran.stdout


@pytest.mark.parametrize("name", ODD_STUDIES)
def test_script_runs_on_an_odd_study(odd_bundle: Callable[[str], Path], name: str) -> None:
    """Missing parts and odd names do not stop it."""
    bundle = odd_bundle(name)
    ran = run_python(bundle / "start.py", folder=bundle)
    assert (ran.returncode, ran.stderr) == (0, "")
    agreed = AGREE.search(ran.stdout)
    assert agreed is not None
    assert int(agreed[1]) == len(rows_of(bundle / "readiness.csv"))
    assert "Binomial Mixed GLM Results" in ran.stdout


def test_terminal_without_other_letters_shows_their_codes(
    odd_bundle: Callable[[str], Path],
) -> None:
    """Where a terminal knows no other letters the script still runs to its end."""
    bundle = odd_bundle("letters of other languages")
    plain = {"PYTHONUTF8": "0", "PYTHONIOENCODING": "ascii"}
    ran = run_python(bundle / "start.py", **plain)
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "\\u65e9" in ran.stdout


def test_types_and_levels_are_those_of_the_codebook(copied: Path) -> None:
    """What the script hands to pandas: names as text, levels in order, flags, numbers."""
    ask = copied.parent / "ask.py"
    ask.write_text(
        "import sys\n"
        f"sys.path.insert(0, {str(copied)!r})\n"
        "import start\n"
        "wide = start.read_table('outcomes_wide')\n"
        "print(list(wide['cue'].cat.categories), wide['cue'].cat.ordered)\n"
        "print(*(wide[name].dtype for name in ('trial', 'reread', 'total_time', 'cue_early')))\n"
        "print(wide['participant'].unique().tolist(), wide['item'].unique().tolist()[:3])\n",
        encoding="utf-8",
    )
    ran = run_python("-B", ask)
    assert ran.stderr == ""
    assert ran.stdout.splitlines() == [
        "['early', 'mid', 'late'] False",
        "Int64 Int8 float64 float64",
        "['007', '1e1', '1e2', 'P10', 'P5', 'P6', 'P7', 'P8', 'P9', 'T'] ['NA', 'TRUE', '0x1A']",
    ]


def test_changed_value_is_found_and_named(copied: Path) -> None:
    """One value that is not what was counted stops the script, with outcome, region, cell."""
    path = copied / "trials.csv"
    header, first, *rest = path.read_text(encoding="utf-8").splitlines()
    names = [name.strip('"') for name in header.split(",")]
    cells = first.split(",")
    cells[names.index("any_skip")] = "01"[cells[names.index("any_skip")] == "0"]
    path.write_text("\n".join([header, ",".join(cells), *rest, ""]), encoding="utf-8", newline="\n")
    ran = run_python(copied / "start.py")
    facts = {name: cell.strip('"') for name, cell in zip(names, cells, strict=True)}
    assert ran.returncode == 1
    assert re.search(r"the tables are not those .* 2 of \d+ counts differ", ran.stderr)
    assert f"any_skip, cue = {facts['cue']}, fit = {facts['fit']}: " in ran.stderr


def test_value_that_cannot_be_is_named(copied: Path) -> None:
    """A value that the codebook does not allow stops the script with its row and column."""
    path = copied / "trials.csv"
    text = path.read_text(encoding="utf-8")
    path.write_text(text.replace('"late"', '"often"', 1), encoding="utf-8", newline="\n")
    ran = run_python(copied / "start.py")
    assert ran.returncode == 1
    assert re.search(
        r'^trials\.csv: row \d+ below the header, column "cue": found "often", expected one of '
        r"early, mid, late$",
        ran.stderr,
        re.MULTILINE,
    )


def test_another_outcome_and_region_are_asked_for(copied: Path) -> None:
    """Words after the script's name choose outcome and region; a wrong one is answered by all."""
    assert "\nreread in a (" in run_python(copied / "start.py", "reread", "a").stdout
    assert "\nany_skip (" in run_python(copied / "start.py", "any_skip").stdout
    ran = run_python(copied / "start.py", "rereading", "a")
    assert ran.returncode == 1
    assert "there is no outcome rereading in a; there are:\n" in ran.stderr
    assert "\n  reread in a\n" in ran.stderr


def test_without_statsmodels_the_counts_are_compared_and_help_is_given(copied: Path) -> None:
    """A computer without the package gets everything but the model, and is told how to get it."""
    hidden = copied.parent / "hidden"
    hidden.mkdir()
    (hidden / "statsmodels.py").write_text("raise ImportError\n", encoding="utf-8")
    ran = run_python(copied / "start.py", PYTHONPATH=str(hidden))
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)
    assert "pip install statsmodels" in ran.stdout
    assert "What remains for you to decide" in ran.stdout


def test_constant_outcome_is_not_fitted(passages_bundle: Path) -> None:
    """Where there is no formula the script says why and ends well."""
    rows = rows_of(passages_bundle / "readiness.csv")
    constant = next(row for row in rows if row["verdict"] == "constant")
    ran = run_python(passages_bundle / "start.py", constant["outcome"], constant["region"] or "-")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "No formula is given for it" in ran.stdout


def test_study_without_binary_outcomes_in_regions_ends_well(tmp_path: Path) -> None:
    """Tables without anything of 0 and 1 in regions are read, and the trials are counted."""
    study_file = small_study(tmp_path, {}, output='[measures]\noutcomes = ["total_time"]')
    ran = run_python(bundle_of(study_file) / "start.py")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)


def test_errors_that_are_too_small_are_warned_of(copied: Path) -> None:
    """Behind the table of the model stands what its standard deviations are worth."""
    _, _, behind = run_python(copied / "start.py").stdout.partition("Post. SD")
    assert "(Post. SD) are most often too small" in " ".join(behind.split())


def test_verdict_is_explained(copied: Path) -> None:
    """Meaning, reason and what to do stand below the counts."""
    said = " ".join(run_python(copied / "start.py", "reread", "a").stdout.split())
    row = next(
        row
        for row in rows_of(copied / "readiness.csv")
        if (row["outcome"], row["region"], row["cue"]) == ("reread", "a", "")
    )
    verdict = row["verdict"]
    assert f'What "{verdict}" means: {VERDICT_RULES[verdict]}. Why: {row["why"]} What' in said
    assert f"What to do: {VERDICT_ADVICE[verdict]}." in said


@pytest.mark.parametrize("name", ["outcome", "zeros", "state", "verdict", "why", "our zeros"])
def test_factor_may_be_called_like_a_column_of_readiness(
    odd_bundle: Callable[[str], Path], tmp_path: Path, name: str
) -> None:
    """Columns of readiness.csv are found by their places, not by names that come twice."""
    bundle = shutil.copytree(odd_bundle("no items"), tmp_path / "b")
    for file in ("start.py", "outcomes_wide.csv", "trials.csv", "readiness.csv"):
        text = (bundle / file).read_text(encoding="utf-8")
        renamed = re.sub(r'(?<![\w-])"?\bcue\b"?(?![\w-])', f'"{name}"', text, count=0)
        assert renamed != text
        renamed = renamed.replace("FIT_MODEL = True", "FIT_MODEL = False")
        (bundle / file).write_text(renamed, encoding="utf-8", newline="\n")
    ran = run_python(bundle / "start.py")
    assert (ran.returncode, ran.stderr) == (0, "")
    assert AGREE.search(ran.stdout)
    assert re.search(rf"^ *{name} +zeros +ones +missing +rate ", ran.stdout, re.MULTILINE)


def test_model_is_that_of_a_hand_made_call(copied: Path) -> None:
    """The script's means are those of a model set up by hand from the Parquet table."""
    ran = run_python(copied / "start.py", "any_skip")
    trials = pd.read_parquet(copied / "trials.parquet")
    trials = trials[trials["any_skip"].notna()]
    a, b, half = (trials[name].to_numpy() for name in ("cue_early", "cue_mid", "fit_half"))
    fixed = np.column_stack([np.ones(len(trials)), a, b, half, a * half, b * half])
    units = [pd.get_dummies(trials[name]).to_numpy(dtype=float) for name in ("participant", "item")]
    ident = np.repeat([0, 1], [own.shape[1] for own in units])
    model = BinomialBayesMixedGLM(
        trials["any_skip"].to_numpy(dtype=float), fixed, np.hstack(units), ident, vcp_p=1, fe_p=2
    )
    by_hand = model.fit_vb()
    shown = re.findall(r"^\S+ +M +(-?\d+\.\d+)", ran.stdout, re.MULTILINE)
    # The order of readers changes sums in the last bits, and the search stops at 1e-5 or so;
    # four digits are printed.
    assert list(map(float, shown)) == pytest.approx(by_hand.fe_mean.tolist(), abs=2e-3)


@pytest.mark.parametrize(
    ("formula", "terms"),
    [
        ("y ~ 1 + (1 | participant)", []),
        ("y ~ cue + (1 + cue | participant) + (1 | item)", ["cue"]),
        ("y ~ a * b * c + (1 | i)", ["a", "b", "c", "a:b", "a:c", "b:c", "a:b:c"]),
        ("y ~ (a + b + c)^2 + (1 + (a + b)^2 || i)", ["a", "b", "c", "a:b", "a:c", "b:c"]),
        ("y ~ (a_2 + a_3) * b", ["a_2", "a_3", "b", "a_2:b", "a_3:b"]),
        ("y ~ `cue (1 | x) + z` * `b\\`c`", ["cue (1 | x) + z", "b`c", "b`c:cue (1 | x) + z"]),
        ("y ~ a + a:b", ["a", "a:b"]),
    ],
)
def test_terms_of_a_formula_are_those_that_r_makes(
    copied: Path, formula: str, terms: list[str]
) -> None:
    """The script reads the formulas' fixed effects as R does, and leaves out random ones."""
    ask = copied.parent / "ask.py"
    ask.write_text(
        f"import sys\nsys.path.insert(0, {str(copied)!r})\nimport start\n"
        f"print([':'.join(term) for term in start.fixed_terms({formula!r})])\n",
        encoding="utf-8",
    )
    assert run_python("-B", ask).stdout == f"{terms}\n"
