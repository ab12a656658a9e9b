"""From logs put aside to readers ready for work: every trial known, every text found."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows, number_of
from etl.files.packed import Packed
from etl.measures import MEASURES, TRIAL_MEASURES, select
from etl.regions import RegionLibrary
from etl.report import NotRecorded
from etl.screening.ledger import columns_of_accounts
from etl.session.decisions import options_of, reasons_of
from etl.session.kept_logs import Aside
from etl.session.model_columns import (
    centred_means,
    codings_wanted,
    measure_column,
    tell_clashes,
)
from etl.session.notices import notice_similar_readers, notice_what_is_missing
from etl.session.odd_values import notice_odd_regions, notice_odd_values
from etl.session.plan import Plan
from etl.session.pseudonym_guards import (
    hide_in_reasons,
    refuse_ids_in_names,
    refuse_ids_in_values,
)
from etl.session.reader import Options
from etl.session.reader_tasks import Corrections, ReaderTasks, reader_tasks, texts_in
from etl.session.trial_facts import trial_facts
from etl.session.work import LogAnswer
from etl.tables import CovariateColumn, IdColumn, TableDesign
from etl.trials import IDS, KnownTrials, SeenTrials
from etl.trials.notes import Notes

#: A number that is written with zeros before it, as only names are.
_PADDED = re.compile(r"[+-]?0[0-9]")


@dataclass(slots=True)
class Gathered:
    """The readers of a study, ready for work.

    Attributes
    ----------
    design : TableDesign
        What the study's tables have in common.
    options : Options
        Its decisions.
    library : RegionLibrary
        Its texts.
    aside : Aside
        Where fixations were put aside.
    tasks : ReaderTasks
        The readers, in the order of the tables.
    notes : list of Notes
        The experimenter's notes that were read.
    unrecorded : list of NotRecorded
        Trials of the trial list that no log has.
    fixations : dict of str to int
        How many each reader has.
    """

    design: TableDesign
    options: Options
    library: RegionLibrary
    aside: Aside
    tasks: ReaderTasks
    notes: list[Notes]
    unrecorded: list[NotRecorded]
    fixations: dict[str, int]

    def bench(self) -> tuple[TableDesign, RegionLibrary, Options, Aside]:
        """What the work on readers needs."""
        return self.design, self.library, self.options, self.aside


def gather(
    plan: Plan, answers: list[LogAnswer], aside: Aside, findings: Findings
) -> Gathered | None:
    """Join facts and texts to every trial that the logs show.

    Parameters
    ----------
    plan : Plan
        The study's tables and texts.
    answers : list of LogAnswer
        What each log holds, in the order of the plan's logs.
    aside : Aside
        Where their fixations were put aside.
    findings : Findings
        Where trials without facts or texts are recorded.

    Returns
    -------
    Gathered or None
        None where no reader is left to work on. Readers with a problem are not among the tasks.
    """
    shown = plan.log_names
    parts: dict[str, list[tuple[str, int, int]]] = {}
    fixations: Counter[str] = Counter()
    for number, answer in enumerate(answers):
        fixations.update(answer.fixations)
        for name, batches in answer.entries():
            for participant, batch in batches.items():
                parts.setdefault(participant, []).append((name, batch, plan.places[number]))
    every, places = [], []
    for number, answer in enumerate(answers):
        if answer.trials is not None:
            every.append(answer.trials)
            places.append(plan.places[number])
            answer.trials = None  # joined below; twice would be too much for a large study
    if not every:
        return None
    # A log that could not be read says nothing about what was not recorded.
    complete = len(every) == len(answers)
    seen = SeenTrials.joined(every, places)
    every.clear()
    seen = seen.once(shown, findings)
    trials = plan.facts.know(seen, shown, findings)
    hide_in_reasons(trials, plan.pseudonyms)
    text = _texts(plan, trials, shown, findings)
    for name in plan.supplied:
        supplied = pa.array([known.facts[name] for known in plan.library.texts], pa.string())
        trials.known[name] = Packed.of(Coded.of(supplied, {""})).take(text)
    good = trials.good & (trials.skipped | (text >= 0))
    refuse_ids_in_values(plan, (trials, text), shown, findings)
    refuse_ids_in_names(plan, findings)
    levels = _levels(plan, trials, text, shown, findings)
    notice_odd_values(plan.study, trials, text >= 0, shown, findings)
    notice_odd_regions(plan.library, plan.study.regions.file, findings)
    notice_similar_readers(seen, shown, findings, plan.pseudonyms)
    unrecorded = notice_what_is_missing(plan, trials, findings) if complete else []
    if not (text >= 0).any():
        if not findings.failed:
            findings.error(
                "no trial is left: every one that was recorded is skipped",
                path=plan.study.shown,
                line=plan.study.line_of("trials", "skip"),
                where="trials.skip",
                fix="correct [trials] skip, or name the logs of the study in [logs] files",
            )
        return None
    covariates = {
        name: _covariate(plan, name, (trials, text), shown, findings)
        for name in plan.study.trials.covariates
    }
    design = _design(plan, (trials, text), levels, covariates, findings)
    facts = trial_facts(plan, trials, shown, findings, complete=complete)
    corrections = Corrections(plan.corrections, findings, complete)
    tasks = reader_tasks(design, trials, (text, good), facts, parts, corrections)
    return Gathered(
        design, options_of(plan), plan.library, aside, tasks, facts.inputs, unrecorded, fixations
    )


def _texts(
    plan: Plan, trials: KnownTrials, shown: Sequence[str], findings: Findings
) -> NDArray[np.int32]:
    """The text of each trial; -1, with a finding where the trial is part of the study, for none."""
    library, seen = plan.library, trials.seen
    keys = [trials.known.get(key, Coded.absent(len(seen))) for key in library.keys]
    # One look-up for each combination of key values there is; a text without keys suits any trial.
    first, group = group_rows(keys or [Coded.constant("", len(seen))])
    found = [library.find(tuple([key.text(row) for key in keys])) for row in first.tolist()]
    text = np.array(found, dtype=np.int32)[group]
    text[trials.skipped] = -1
    file = plan.study.regions.file
    for row in np.flatnonzero((text < 0) & ~trials.skipped & trials.good).tolist():
        spelled = ", ".join(
            f'{name} "{key.text(row)}"' for name, key in zip(library.keys, keys, strict=True)
        )
        findings.error(
            f"the trial has no text in {file}",
            path=shown[int(seen.file[row])],
            line=int(seen.line[row]),
            found=f"trial {seen.ids['trial'].text(row)} of reader "
            f"{seen.ids['participant'].text(row)}",
            expected="a text" + (f" for {spelled}" if spelled else ""),
            fix=f"add the text to {file}, correct the trial's facts, or name such trials in "
            "[trials] skip",
        )
    return text


def _levels(
    plan: Plan,
    trials: KnownTrials,
    text: NDArray[np.int32],
    shown: Sequence[str],
    findings: Findings,
) -> dict[str, tuple[str, ...]]:
    """The levels of every factor in order; missing and unlisted values are errors."""
    settings = plan.study.trials
    in_study = text >= 0
    levels: dict[str, tuple[str, ...]] = {}
    for name in settings.factors:
        stated = settings.levels.get(name)
        column = trials.known[name]
        found = {column.values[code] for code in np.unique(column.codes[in_study]) if code >= 0}
        allowed = found if stated is None else set(stated)
        bad = np.flatnonzero(in_study & trials.good & ~column.among(allowed))
        for row, path, line in _places(plan, name, (trials, text), bad, shown):
            value = column.text(row)
            findings.error(
                f"the factor {name} has " + ("a level that is not listed" if value else "no value"),
                path=path,
                line=line,
                where=f'column "{name}"',
                found=value or None,
                expected=("one of " + ", ".join(stated)) if stated else "a level",
                fix="correct the cell"
                + (
                    ", or add the level to [trials] levels"
                    if value
                    else ", or take a word that is a level out of [logs] missing"
                )
                + "; trials that are no part of the study belong in [trials] skip",
            )
        levels[name] = IdColumn.of(found).values if stated is None else tuple(stated)
        for level in levels[name]:
            if found and level not in found:
                findings.warning(
                    f"the level {level} of {name} occurs in no trial",
                    path=plan.study.shown,
                    line=plan.study.line_of("trials", "levels", name),
                )
    return levels


def _places(
    plan: Plan,
    name: str,
    known: tuple[KnownTrials, NDArray[np.int32]],
    rows: NDArray[np.int64],
    shown: Sequence[str],
) -> Iterator[tuple[int, str, int]]:
    """For each cell from which some trials have a fact, one of the trials, file and line."""
    trials, text = known
    if plan.facts.sources.get(name) == "regions":
        for of_text in dict.fromkeys(text[rows].tolist()):
            definition = plan.library.texts[of_text]
            yield int(rows[text[rows] == of_text][0]), definition.path, definition.line
        return
    table, listed, lines = plan.facts.origins(name, trials, rows)
    file = np.where(listed, -1, trials.seen.file[rows]).astype(np.int64)
    first = np.unique((file << 32) + lines, return_index=True)[1]
    for at in np.sort(first).tolist():
        yield int(rows[at]), table if listed[at] else shown[int(file[at])], int(lines[at])


def _tell_text(
    plan: Plan,
    name: str,
    known: tuple[KnownTrials, NDArray[np.int32]],
    shown: Sequence[str],
    findings: Findings,
) -> None:
    """Say where a covariate that is to be centred holds what is no number."""
    trials, text = known
    column = trials.known[name]
    wrong = [v for v in column.values if number_of(v) is None or _PADDED.match(v)]
    rows = np.flatnonzero((text >= 0) & column.among(wrong))[:1]
    for at, path, line in _places(plan, name, known, rows, shown):
        findings.error(
            f"the covariate {name} is to be centred, and this is no number",
            path=path,
            line=line,
            where=f'column "{name}"',
            found=column.text(at),
            expected="a number without zeros before it",
            fix="correct the cell, add the word to [logs] missing if it stands for no value, or "
            "remove the covariate from [output] centred",
        )
    if not len(rows):
        findings.error(
            f"the covariate {name} is to be centred, and no trial has a value of it",
            path=plan.study.shown,
            line=plan.study.line_of("output", "centred"),
            where="output.centred",
            found=name,
            fix="fill in the column, or remove the covariate from the list",
        )


def _design(
    plan: Plan,
    looked_up: tuple[KnownTrials, NDArray[np.int32]],
    levels: dict[str, tuple[str, ...]],
    covariates: dict[str, CovariateColumn],
    findings: Findings,
) -> TableDesign:
    """What all tables of the study have in common; new columns need names of their own."""
    study = plan.study
    trials, text = looked_up
    known = trials.known
    ids = {
        name: IdColumn.of(texts_in(known[name]) if name in known else ())
        for name in IDS
        if name in known or name == "item"
    }
    chosen = [MEASURES[name] for name in select(study.measures.outcomes)]
    design = TableDesign(
        ids,
        levels,
        covariates,
        plan.library.region_names,
        tuple(measure_column(plan, m) for m in chosen),
        tuple(measure_column(plan, m) for m in TRIAL_MEASURES.values()),
        reasons_of(plan.limits),
        columns_of_accounts(plan.limits),
        plan.log_names,
        plan.lines is not None,
        codings_wanted(study, levels, findings),
        centred_means(study, covariates, (known, text)),
    )
    tell_clashes(study, design, findings)
    return design


def _covariate(
    plan: Plan,
    name: str,
    known: tuple[KnownTrials, NDArray[np.int32]],
    shown: Sequence[str],
    findings: Findings,
) -> CovariateColumn:
    """Numbers where every value that is there is one; a value such as 007 is a name."""
    trials, text = known
    column = trials.known[name]
    texts = texts_in(column.take(text >= 0))
    words = [value for value in texts if number_of(value) is None]
    if texts and not words and not any(_PADDED.match(value) for value in texts):
        return CovariateColumn("number")
    if name in plan.study.output.centred:
        _tell_text(plan, name, known, shown, findings)
    elif words and len(words) < len(texts):
        row = np.flatnonzero((text >= 0) & column.among(words))[:1]
        for at, path, line in _places(plan, name, known, row, shown):
            findings.note(
                f"some values of the covariate {name} are numbers and some are not: it is text",
                path=path,
                line=line,
                where=f'column "{name}"',
                found=column.text(at),
                fix="correct the cell, or add the word to [logs] missing if it stands for no value",
            )
    return CovariateColumn("text", tuple(sorted(texts)))
