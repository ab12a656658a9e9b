"""Facts about trials that screening needs: when the text was there, the answer, the notes."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import number_of, truth_of
from etl.files.packed import RowTexts
from etl.parsers.time_checks import in_ms
from etl.session.plan import Plan
from etl.trials import IDS, KnownTrials
from etl.trials.facts import shown_path
from etl.trials.labels import labels_of
from etl.trials.notes import Notes, notes_on_readers, notes_on_trials, read_notes

#: Numbers whose commas may mark thousands; none is written with a leading zero.
_GROUPED = re.compile(r"[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+")
_CORRECT = "correct the cell, or add the word to [logs] missing if it means no value"


@dataclass(slots=True)
class TrialFacts:
    """What screening needs to know of trials, one value a trial.

    Attributes
    ----------
    came_ms, went_ms : (trials,) float64 array, milliseconds
        When the text came up and went away, in log time; NaN where unknown.
    answer : (trials,) float64 array
        1 right, 0 wrong, NaN where nothing was asked.
    notes : RowTexts
        The experimenter's note on each trial, empty where there is none.
    reader_notes : dict of str to str
        The note on each reader who has one.
    inputs : list of Notes
        The files of notes.
    """

    came_ms: NDArray[np.float64]
    went_ms: NDArray[np.float64]
    answer: NDArray[np.float64]
    notes: RowTexts
    reader_notes: dict[str, str] = field(default_factory=dict)
    inputs: list[Notes] = field(default_factory=list)


def trial_facts(
    plan: Plan,
    trials: KnownTrials,
    shown: Sequence[str],
    findings: Findings,
    *,
    complete: bool = True,
) -> TrialFacts:
    """Gather what the rules that a study uses need to know.

    Parameters
    ----------
    plan : Plan
        The study's tables and rules.
    trials : KnownTrials
        All trials that the logs show.
    shown : sequence of str
        The names of the logs, for messages.
    findings : Findings
        Where cells that cannot be read, and notes that match nothing, are recorded.
    complete : bool
        Whether every log could be read; if not, nothing can be said of notes that match nothing.

    Returns
    -------
    TrialFacts
        Of facts that no rule needs, all values are missing.
    """
    settings, limits = plan.study.trials, plan.limits
    # One number for all trials, which takes no room.
    unknown = np.broadcast_to(np.nan, len(trials))
    facts = TrialFacts(unknown, unknown, unknown, RowTexts(len(trials)))
    place = _Place(plan, trials, shown, findings)
    if limits.on("outside_text_time"):
        onset = plan.study.logs.columns.clock
        unit = "ms" if onset is None else str(onset.unit)
        # Converted as the onsets in the logs are, or 1.001 s would lie before 1.001 s.
        if settings.onset is not None:
            facts.came_ms = in_ms(place.numbers(settings.onset), unit)
        if settings.offset is not None:
            facts.went_ms = in_ms(place.numbers(settings.offset), unit)
        place.warn_of_unknown_times()
    if settings.answer_correct is not None and (
        limits.on("answer_wrong") or limits.on("correct_share_under")
    ):
        facts.answer = place.answers(settings.answer_correct)
    if complete:
        _add_notes(plan, trials, facts, findings)
    return facts


def _add_notes(plan: Plan, trials: KnownTrials, facts: TrialFacts, findings: Findings) -> None:
    """Read the files of notes, once each, and match them to trials and readers."""
    screening = plan.study.screening
    if screening is None:
        return
    of_trials = screening.trials.notes if screening.trials else None
    of_readers = screening.participants.notes if screening.participants else None
    columns = plan.study.logs.columns
    synonyms = {n: column.column for n in IDS if (column := getattr(columns, n)) is not None}
    hide = plan.pseudonyms
    for given in dict.fromkeys(name for name in (of_trials, of_readers) if name is not None):
        shown = shown_path(plan.study, given)
        notes = read_notes(
            plan.study.folder / given,
            shown if hide is None else hide.shown_file(shown),
            synonyms,
            plan.study.logs.missing,
            findings,
            on_trials=given == of_trials,
            prefixes=labels_of(plan.study.logs.kind),
        )
        if notes is None:
            continue
        notes = notes.under(hide)
        if hide is not None:
            findings.note(
                "readers go by pseudonyms, so the reasons in the notes are left out of the output; "
                "the tables say which trials and readers have a note",
                path=notes.shown,
            )
        facts.inputs.append(notes)
        on_trials = notes.on_trials()
        if given == of_trials:
            facts.notes = notes_on_trials(notes, trials.seen, plan.facts.trial_list, findings)
            for row in np.flatnonzero(trials.skipped & facts.notes.some()).tolist():
                findings.note(
                    "a note is on a trial that is no part of the study, and changes nothing",
                    path=notes.shown,
                    found=f"participant {trials.seen.ids['participant'].text(row)}, "
                    f"trial {trials.seen.ids['trial'].text(row)}",
                )
        if given == of_readers:
            facts.reader_notes = notes_on_readers(notes, trials.seen, findings)
        for used, rows, what, key in (
            (of_trials, on_trials, "a trial", "trials"),
            (of_readers, ~on_trials, "a reader", "participants"),
        ):
            elsewhere = (key, given) in plan.notes_elsewhere
            if given != used and rows.any() and not elsewhere:
                findings.error(
                    f"the note is on {what}, which the study file does not ask this file for",
                    path=notes.shown,
                    line=int(notes.lines[np.flatnonzero(rows)[0]]),
                    expected="notes on "
                    + ("readers only" if key == "trials" else "trials, each with its trial"),
                    fix=f'add notes = "{given}" to [screening.{key}], or correct the row',
                )


@dataclass(slots=True)
class _Place:
    """Reads facts as numbers and says where a cell is wrong."""

    plan: Plan
    trials: KnownTrials
    shown: Sequence[str]
    findings: Findings
    unknown: dict[str, int] = field(default_factory=dict)

    def numbers(self, name: str) -> NDArray[np.float64]:
        """A fact as numbers, NaN where missing or where the trial is no part of the study."""
        column = self.trials.known[name]
        judged = ~self.trials.skipped
        # A log has a decimal sign of its own; a table has one.
        from_log = self.plan.facts.sources.get(name) == "log"
        file = self.trials.seen.file if from_log else np.zeros(len(self.trials), dtype=np.int32)
        values = np.full(len(self.trials), np.nan)
        unclear = np.zeros(len(self.trials), dtype=bool)
        for number in np.unique(file).tolist():
            own = (file == number) & (column.codes >= 0)
            present = {column.values[code] for code in np.unique(column.codes[own & judged])}
            sign = _decimal_sign(present) or self.plan.study.logs.decimal
            read = np.array([*(_number(text, sign or ",") for text in column.values), np.nan])
            values[own] = read[column.codes[own]]
            grouped = [sign is None and "," in text for text in column.values]
            unclear |= own & np.array([*grouped, False])[column.codes]
        self._tell(
            name,
            judged & unclear,
            "the comma could be a decimal sign or a thousands sign",
            "numbers that can be read in one way only",
            'state decimal = "," in [logs] if it is the decimal sign; otherwise write the numbers '
            "without thousands signs",
        )
        wrong = judged & np.isinf(values) & ~unclear
        self._tell(name, wrong, "this is no number", "a time in log time", _CORRECT)
        self.unknown[name] = int((judged & np.isnan(values)).sum())
        values[np.isinf(values)] = np.nan
        return values

    def answers(self, name: str) -> NDArray[np.float64]:
        """A fact as 1, 0, or NaN where missing."""
        column = self.trials.known[name]
        truths = [truth_of(text) for text in column.values]
        coded = [np.inf if truth is None else float(truth) for truth in truths]
        values = np.array([*coded, np.nan])[column.codes]
        self._tell(
            name,
            ~self.trials.skipped & np.isinf(values),
            "this does not say whether the answer was right",
            "1 or 0, true or false, yes or no, correct or wrong; nothing where nothing was asked",
            _CORRECT,
        )
        values[np.isinf(values)] = np.nan
        return values

    def warn_of_unknown_times(self) -> None:
        """Say for how many trials it is not known when the text was there."""
        for name, count in self.unknown.items():
            if count:
                self.findings.warning(
                    f"{count:,} trial{' has' if count == 1 else 's have'} no time here and "
                    f"{'is' if count == 1 else 'are'} not judged by it",
                    path=self.plan.study.shown,
                    line=self.plan.study.line_of("screening", "fixations", "outside_text_time"),
                    where=f'column "{name}"',
                )

    def _tell(
        self, name: str, rows: NDArray[np.bool_], problem: str, expected: str, fix: str
    ) -> None:
        """Record cells that cannot be read."""
        wrong = np.flatnonzero(rows)
        if not wrong.size:
            return
        table, listed, lines = self.plan.facts.origins(name, self.trials, wrong)
        for row, in_table, line in zip(
            wrong.tolist(), listed.tolist(), lines.tolist(), strict=True
        ):
            self.findings.error(
                problem,
                path=table if in_table else self.shown[int(self.trials.seen.file[row])],
                line=line,
                where=f'column "{name}"',
                found=self.trials.known[name].text(row),
                expected=expected,
                fix=fix,
            )


def _decimal_sign(texts: set[str]) -> str | None:
    """The decimal sign of some numbers; None where each comma could as well mark thousands."""
    commas = [text for text in texts if "," in text]
    if not commas or any("." in text for text in texts):
        return "."
    return None if all(_GROUPED.fullmatch(text) for text in commas) else ","


def _number(text: str, sign: str) -> float:
    """A cell as a number; infinite where it is none."""
    pointed = text.replace(".", "?").replace(",", ".") if sign == "," else text
    number = number_of(pointed)
    return np.inf if number is None else number
