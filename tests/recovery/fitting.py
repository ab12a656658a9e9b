"""From drawn trials to fitted models: logs written, studies built, one call of R."""

from __future__ import annotations

import csv
import functools
import shutil
import subprocess
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

import etl
from tests.recovery.study_files import DIALECTS, record, study_text, write_study
from tests.recovery.truth import TRUTHS, Trial, Truth, draw_trials

STUDIES = 40
#: What study files say beyond the ordinary (see ``study_text``).
SOUND: Mapping[str, Mapping[str, Any]] = {"sound": {}}
#: The columns of what R is told to do.
PLAN = ("study", "variant", "outcome", "table", "region", "formula", "coding", "agq")
#: What is looked at, of all that is built: what a statistician is handed.
NEEDED = ("handoff/outcomes.csv", "handoff/outcomes_wide.csv")
#: The critical region.
REGION = "verb"
SCRIPT = Path(__file__).with_name("fit.R")
#: How long R may take for everything, in seconds; it takes a fraction of it.
R_TIMEOUT_S = 900

Cell = int | str
#: Participant and number of a trial.
Key = tuple[str, int]


@dataclass(frozen=True, slots=True)
class Built:
    """A study drawn, written as logs and built.

    Attributes
    ----------
    number : int
        Which study, from 0.
    trials : tuple of Trial
        What was drawn, practice and noted trials included.
    folder : Path
        Where its files are.
    """

    number: int
    trials: tuple[Trial, ...]
    folder: Path

    @property
    def kept(self) -> dict[Key, Trial]:
        """The trials that are to be in the tables."""
        return {
            (trial.participant, trial.trial): trial
            for trial in self.trials
            if not trial.noted and not trial.practice
        }

    def table(self, variant: str = "sound") -> Path:
        """The table handed off that has a row for each trial and region."""
        return self.folder / variant / "handoff" / "outcomes_wide.csv"


@dataclass(frozen=True, slots=True)
class Wanted:
    """One model to fit: to which table, and how the factors become numbers.

    ``variant`` is "sound" or the name of a planted fault.
    """

    study: int
    outcome: str
    table: Path
    formula: str
    variant: str = "sound"
    coding: str = "stated"
    agq: int = 1


@dataclass(frozen=True, slots=True)
class Fits:
    """What R wrote, as read by pandas: one table each, and the versions it ran with."""

    coefficients: pd.DataFrame
    deviations: pd.DataFrame
    fitted: pd.DataFrame
    notes: pd.DataFrame
    versions: pd.DataFrame


def build_study(
    seed: int, number: int, folder: Path, variants: Mapping[str, Mapping[str, Any]] = SOUND
) -> None:
    """Draw a study, write its logs in the dialect that is its turn, and build it.

    Parameters
    ----------
    seed : int
        With the number it decides everything.
    number : int
        Which study, from 0.
    folder : Path
        Where it is written; made where it is missing. Only the tables of outcomes stay, in a folder
        for each variant: the logs of all studies would fill hundreds of megabytes.
    variants : mapping of str to mapping
        Names, and what their study files say (see ``study_text``); all read the same logs.
    """
    rng = np.random.default_rng([seed, number])
    dialect = DIALECTS[number % len(DIALECTS)]
    write_study(folder, record(draw_trials(rng), rng), dialect)
    for variant, said in variants.items():
        study_file = folder / f"{variant}.toml"
        study_file.write_text(study_text(dialect, **said), encoding="utf-8", newline="")
        etl.build(etl.load_study(study_file), into=folder / variant)
        for path in (folder / variant).rglob("*"):
            if path.is_file() and path.relative_to(folder / variant).as_posix() not in NEEDED:
                path.unlink()
    shutil.rmtree(folder / "logs")


def drawn_study(seed: int, number: int, folder: Path) -> Built:
    """A study that was built, with what was drawn for it."""
    return Built(number, tuple(draw_trials(np.random.default_rng([seed, number]))), folder)


def built_cells(table: Path) -> dict[Key, dict[str, Cell]]:
    """The outcomes on the critical region as published: 0 or 1, or "" for an empty cell.

    Read with the standard library, so that a 1.0 or a 2 would not pass for a 1.
    """
    cells: dict[Key, dict[str, Cell]] = {}
    with table.open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            if row["region"] == REGION:
                key = row["participant"], int(row["trial"])
                cells[key] = {t.outcome: as_cell(row[t.outcome]) for t in TRUTHS}
    return cells


def as_cell(text: str) -> Cell:
    """A cell as 0 or 1 where it is written so, else as it stands.

    Examples
    --------
    >>> as_cell("1"), as_cell("0.0"), as_cell(""), as_cell("2")
    (1, 0, '', '2')
    """
    return {"0": 0, "1": 1, "0.0": 0, "1.0": 1}.get(text, text)


def differences(built: Built, variant: str = "sound") -> list[str]:
    """Where the built outcomes are not the drawn ones; trials too few or too many as well."""
    cells, kept = built_cells(built.table(variant)), built.kept
    wrong = [f"study {built.number}: trial {key} in one only" for key in cells.keys() ^ kept.keys()]
    for key in cells.keys() & kept.keys():
        for outcome, drawn in kept[key].outcomes.items():
            # An undefined outcome is an empty cell; its reason stands in the long table.
            expected = drawn if isinstance(drawn, int) else ""
            if cells[key][outcome] != expected:
                found = cells[key][outcome]
                wrong.append(f"study {built.number}: {key} {outcome}: {found!r}, not {expected!r}")
    return wrong


def wrong_reasons(built: Built) -> list[str]:
    """Undefined outcomes whose reason in the long table is not the drawn one."""
    kept = built.kept
    outcomes = {truth.outcome for truth in TRUTHS}
    wrong = []
    with built.table().with_name("outcomes.csv").open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            if row["region"] != REGION or row["measure"] not in outcomes:
                continue
            key = row["participant"], int(row["trial"])
            drawn = kept[key].outcomes[row["measure"]]
            if row["missing"] != (drawn if isinstance(drawn, str) else ""):
                wrong.append(f"study {built.number}: {key} {row['measure']}: {row['missing']!r}")
    return wrong


def models(studies: Iterable[Built], *, agq: int = 1) -> list[Wanted]:
    """The true model of each outcome, for each study.

    ``agq=1`` is the Laplace approximation, the default of glmer; 0 is faster and, with as few ones
    as here, draws the effects towards 0.
    """
    return [
        Wanted(study.number, truth.outcome, study.table(), truth.formula, agq=agq)
        for study in studies
        for truth in TRUTHS
    ]


def faulty_models(studies: Iterable[Built], truth: Truth) -> list[Wanted]:
    """The true model of an outcome fitted wrongly: once with a wrong table, once wrongly coded."""
    wanted = []
    for study in studies:
        sound = Wanted(study.number, truth.outcome, study.table(), truth.formula)
        wanted.append(replace(sound, table=study.table("zeros"), variant="zeros"))
        wanted.append(replace(sound, coding="treatment", variant="treatment"))
    return wanted


@functools.cache
def why_no_r() -> str:
    """Why nothing can be fitted here; empty where it can."""
    rscript = shutil.which("Rscript")
    if rscript is None:
        return "no Rscript on the path: R (r-base-core in Debian) is needed for the recovery check"
    asked = 'quit(status = if (requireNamespace("lme4", quietly = TRUE)) 0 else 3)'
    done = subprocess.run([rscript, "--vanilla", "-e", asked], capture_output=True, check=False)
    if done.returncode:
        return "R has no package lme4 (r-cran-lme4 in Debian), needed for the recovery check"
    return ""


def fit(wanted: Sequence[Wanted], folder: Path) -> None:
    """Fit all models in one call of R.

    Parameters
    ----------
    wanted : sequence of Wanted
        One a study and outcome.
    folder : Path
        Where the plan and R's tables go; made where it is missing.

    Raises
    ------
    RuntimeError
        With what R said, if it failed.
    """
    folder.mkdir(parents=True, exist_ok=True)
    plan = folder / "plan.csv"
    with plan.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(PLAN)
        for model in wanted:
            table = model.table.as_posix()
            names = [model.study, model.variant, model.outcome]
            writer.writerow([*names, table, REGION, model.formula, model.coding, model.agq])
    done = subprocess.run(
        [shutil.which("Rscript") or "Rscript", "--vanilla", str(SCRIPT), str(plan), str(folder)],
        capture_output=True,
        check=False,
        encoding="utf-8",
        errors="replace",
        timeout=R_TIMEOUT_S,
    )
    if done.returncode:
        raise RuntimeError(f"R ended with status {done.returncode}:\n{done.stderr}")


def read_fits(folder: Path) -> Fits:
    """What R wrote into a folder."""
    names = ("coefficients", "deviations", "fitted", "notes", "versions")
    return Fits(*(pd.read_csv(folder / f"{name}.csv", encoding="utf-8") for name in names))


def of_outcome(table: pd.DataFrame, outcome: str, variant: str = "sound") -> pd.DataFrame:
    """The rows of one outcome, fitted soundly or with a planted fault."""
    return table[(table["outcome"] == outcome) & (table["variant"] == variant)]


def with_truth(
    fits: Fits, studies: Iterable[Built], outcome: str, variant: str = "sound"
) -> pd.DataFrame:
    """The fitted values of an outcome with what was drawn and its true probability.

    Returns
    -------
    DataFrame
        A row for each trial that went into a fit and in which the outcome was defined: ``study``,
        ``participant``, ``trial``, ``value`` (as R read it), ``fitted``, ``drawn``, ``true``.
    """
    trials = [
        (study.number, *key, trial.outcomes[outcome], trial.probabilities[outcome])
        for study in studies
        for key, trial in study.kept.items()
        if isinstance(trial.outcomes[outcome], int)
    ]
    columns = ["study", "participant", "trial", "drawn", "true"]
    drawn = pd.DataFrame(trials, columns=columns).astype({"drawn": "int64"})
    return of_outcome(fits.fitted, outcome, variant).merge(drawn, on=columns[:3])
