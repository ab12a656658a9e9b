"""From logs put aside to readers ready for work: every trial known, every text found."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from etl.errors import Findings
from etl.measures import MEASURES, REASONS, TRIAL_MEASURES, Measure, select
from etl.parsers import LogReader
from etl.session.one_reader import LEFT_OUT_BY, Options, sorted_trials
from etl.session.plan import Plan
from etl.session.seen import tell_variation
from etl.session.work import LogAnswer, LogTask, LogWork, ReaderTask, map_tasks
from etl.study import Study
from etl.tables import IdColumn, MeasureColumn, TableDesign
from etl.trials import Facts, KnownTrial, SeenTrial

Progress = Callable[[str, int, int], None]

#: Outside these, a log's median fixation is not one of silent reading, whose means lie near
#: 225 ms (Rayner 1998, doi:10.1037/0033-2909.124.3.372); most often the unit is wrong.
PLAUSIBLE_MEDIAN_MS = (50.0, 1000.0)


@dataclass(slots=True)
class Gathered:
    """The readers of a study, ready for work.

    Attributes
    ----------
    design : TableDesign
        What the study's tables have in common.
    options : Options
        Its decisions.
    tasks : list of ReaderTask
        The readers, in the order of the tables.
    """

    design: TableDesign
    options: Options
    tasks: list[ReaderTask]


@dataclass(slots=True)
class _Trials:
    """The trials of all readers while they are gathered."""

    seen: dict[str, dict[tuple[str, str], SeenTrial]] = field(default_factory=dict)
    parts: dict[str, list[tuple[Path, int, int]]] = field(default_factory=dict)
    known: dict[str, list[KnownTrial]] = field(default_factory=dict)
    spoiled: set[str] = field(default_factory=set)


def read_logs(
    logs: tuple[tuple[Path, str], ...],
    reader: LogReader,
    kept: Path,
    workers: int,
    progress: Progress,
) -> list[LogAnswer]:
    """Read all logs and put their fixations aside in the folder ``kept``."""
    tasks = [
        LogTask(path, shown, kept / f"{number}.arrow") for number, (path, shown) in enumerate(logs)
    ]
    answers = []
    for answer in map_tasks(LogWork, (reader,), tasks, workers):
        answers.append(answer)
        progress("reading logs", len(answers), len(tasks))
    return answers


def gather(plan: Plan, answers: list[LogAnswer], kept: Path, findings: Findings) -> Gathered | None:
    """Join facts and texts to every trial that the logs show.

    Parameters
    ----------
    plan : Plan
        The study's tables and texts.
    answers : list of LogAnswer
        What each log holds, in the order of the plan's logs.
    kept : Path
        Where their fixations were put aside.
    findings : Findings
        Where trials without facts or texts are recorded.

    Returns
    -------
    Gathered or None
        None where no reader is left to work on. Readers with a problem are not among the tasks.
    """
    trials = _Trials()
    for number, answer in enumerate(answers):
        for participant, batch in answer.batches.items():
            trials.parts.setdefault(participant, []).append(
                (kept / f"{number}.arrow", batch, number)
            )
        for seen in answer.trials:
            listed = trials.seen.setdefault(seen.participant, {})
            known = listed.setdefault((seen.session, seen.trial), seen)
            if known is not seen and (known.item, known.facts) != (seen.item, seen.facts):
                tell_variation(known, seen, plan.facts.from_log, findings)
    for participant, shown in trials.seen.items():
        _know_reader(plan, participant, shown.values(), trials, findings)
    levels = _levels(plan, trials.known, findings)
    _notice_what_is_missing(plan, trials, findings)
    kept_trials = [trial for own in trials.known.values() for trial in own if trial.text >= 0]
    if not kept_trials:
        if not findings.failed:
            findings.error(
                "no trial is left: every one that was recorded is skipped",
                path=plan.study.shown,
                line=plan.study.line_of("trials", "skip"),
                where="trials.skip",
                fix="correct [trials] skip, or name the logs of the study in [logs] files",
            )
        return None
    design = _design(plan, trials, kept_trials, levels)
    tasks = []
    for participant in design.ids["participant"].values:
        if participant in trials.spoiled:
            continue
        own = sorted_trials(trials.known[participant], design)
        parts = trials.parts[participant]
        tasks.append(
            ReaderTask(
                participant,
                tuple((path, batch) for path, batch, _ in parts),
                tuple(number for _, _, number in parts),
                own,
            )
        )
    study = plan.study
    options = Options(study.trials.repeated, study.measures.outside, study.measures.no_opportunity)
    return Gathered(design, options, tasks)


def _know_reader(
    plan: Plan,
    participant: str,
    seen: Iterable[SeenTrial],
    trials: _Trials,
    findings: Findings,
) -> None:
    """Join what is known of a reader's trials and look up their texts."""
    own = trials.known.setdefault(participant, [])
    names = plan.facts.names
    for one in seen:
        known = plan.facts.know(one, findings)
        text = -1
        if known is not None and not known.skipped_by:
            text = _text_of(plan, participant, one, known, findings)
        if known is None or (text < 0 and not known.skipped_by):
            trials.spoiled.add(participant)
            continue
        facts = known.facts
        own.append(
            KnownTrial(
                one.session,
                one.trial,
                known.identity.get("item", ""),
                tuple([facts.get(name, "") for name in names]),
                text,
                known.skipped_by,
                one.shown,
                one.line,
            )
        )


def _text_of(
    plan: Plan, participant: str, seen: SeenTrial, known: Facts, findings: Findings
) -> int:
    """The text of a trial, whose own facts are added; -1, with a finding, where there is none."""
    library = plan.library
    values = tuple([known.get(key) for key in library.keys])
    text = library.find(values)
    if text < 0:
        shown = plan.study.regions.file
        spelled = ", ".join(f'{k} "{v}"' for k, v in zip(library.keys, values, strict=True))
        findings.error(
            f"the trial has no text in {shown}",
            path=seen.shown,
            line=seen.line,
            found=f"trial {seen.trial} of reader {participant}",
            expected="a text" + (f" for {spelled}" if spelled else ""),
            fix=f"add the text to {shown}, correct the trial's facts, or name such trials in "
            "[trials] skip",
        )
        return -1
    for name in plan.supplied:
        known.facts[name] = library.texts[text].facts[name]
    return text


def _levels(
    plan: Plan, known: dict[str, list[KnownTrial]], findings: Findings
) -> dict[str, tuple[str, ...]]:
    """The levels of every factor in order; missing and unlisted values are errors."""
    trials = plan.study.trials
    levels: dict[str, tuple[str, ...]] = {}
    for name in trials.factors:
        stated = trials.levels.get(name)
        found: set[str] = set()
        place = plan.facts.names.index(name)
        for participant, own in known.items():
            for trial in own:
                value = trial.facts[place]
                if value in found or trial.text < 0:
                    continue
                if value and (stated is None or value in stated):
                    found.add(value)
                    continue
                shown, line = plan.facts.origin(name, participant, trial)
                findings.error(
                    f"the factor {name} has "
                    + ("a level that is not listed" if value else "no value"),
                    path=shown,
                    line=line,
                    where=f'column "{name}"',
                    found=value or None,
                    expected=("one of " + ", ".join(stated)) if stated else "a level",
                    fix="correct the cell"
                    + (", or add the level to [trials] levels" if value else "")
                    + "; trials that are no part of the study belong in [trials] skip",
                )
        levels[name] = tuple(stated) if stated is not None else tuple(sorted(found))
        for level in levels[name]:
            if level not in found and found:
                findings.warning(
                    f"the level {level} of {name} occurs in no trial",
                    path=plan.study.shown,
                    line=plan.study.line_of("trials", "levels", name),
                )
    return levels


def _notice_what_is_missing(plan: Plan, trials: _Trials, findings: Findings) -> None:
    """Warn of trials of the list, and readers of the table, that no log has."""
    book = plan.facts
    seen = {participant: own.keys() for participant, own in trials.seen.items()}
    if book.trial_list is not None:
        for spelled, line in book.unrecorded(seen):
            findings.warning(
                "the trial is in the list but in no log",
                path=book.trial_list.shown,
                line=line,
                found=spelled,
            )
    if book.participants is not None:
        for (participant,) in book.participants.rows:
            if participant not in trials.seen:
                findings.warning(
                    "the reader is in the table but in no log",
                    path=book.participants.shown,
                    line=book.participants.lines[(participant,)],
                    found=participant,
                )


def _design(
    plan: Plan,
    trials: _Trials,
    kept: list[KnownTrial],
    levels: dict[str, tuple[str, ...]],
) -> TableDesign:
    """What all tables of the study have in common."""
    study = plan.study
    every = [trial for own in trials.known.values() for trial in own]
    place = {name: i for i, name in enumerate(plan.facts.names)}
    ids = {"participant": IdColumn.of(trials.seen)}
    sessions = {trial.session for trial in every}
    if sessions != {""}:
        ids["session"] = IdColumn.of(sessions)
    ids["trial"] = IdColumn.of(trial.trial for trial in every)
    ids["item"] = IdColumn.of(trial.item for trial in every if trial.item)
    chosen = [MEASURES[name] for name in select(study.measures.outcomes)]
    return TableDesign(
        ids,
        levels,
        {name: _type_of(t.facts[place[name]] for t in kept) for name in study.trials.covariates},
        plan.library.region_names,
        tuple(_measure_column(m) for m in chosen),
        tuple(_measure_column(m) for m in TRIAL_MEASURES.values()),
        REASONS,
        LEFT_OUT_BY,
        tuple(shown for _, shown in plan.logs),
    )


def _type_of(texts: Iterable[str]) -> Literal["text", "number"]:
    """Number where every value that is there is one."""
    present = {text for text in texts if text}
    for text in present:
        try:
            if not math.isfinite(float(text)):
                return "text"
        except ValueError:
            return "text"
    return "number" if present else "text"


def _measure_column(measure: Measure) -> MeasureColumn:
    """What the tables need to know of a measure."""
    return MeasureColumn(measure.name, measure.kind, measure.unit, measure.definition)


def notice_logs(study: Study, answers: list[LogAnswer], findings: Findings) -> None:
    """Note how the logs were understood, and warn of those whose durations are odd."""
    dialects = Counter(
        (a.note.encoding, a.note.delimiter, a.note.decimal) for a in answers if a.note.decimal
    )
    spelled = {"\t": "tabs", ";": "semicolons", ",": "commas", "|": "bars", " ": "blanks"}
    if len(dialects) > 1:
        usual = dialects.most_common(1)[0][0]
        for answer in answers:
            note = answer.note
            if note.decimal and (note.encoding, note.delimiter, note.decimal) != usual:
                findings.note(
                    f"read as {note.encoding}, separated by "
                    f'{spelled.get(note.delimiter, note.delimiter)}, decimal sign "{note.decimal}";'
                    " most other logs are different",
                    path=note.shown,
                )
    low, high = PLAUSIBLE_MEDIAN_MS
    for answer in answers:
        middle = answer.durations_ms[0]
        if answer.note.decimal and not low <= middle <= high:
            findings.warning(
                "the middle (median) duration of the fixations is not one of reading",
                path=answer.note.shown,
                found=f"{middle:g} ms",
                expected=f"between {low:g} and {high:g} ms",
                fix=f"check the unit of the duration in {study.shown}",
            )
