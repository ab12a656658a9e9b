"""The ledger: a row for each thing that was left out or changed, and the accounts of a reader."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.screening.rules import (
    BEFORE,
    CODE,
    FIXATION_RULES,
    LEFT_OUT_BY,
    READER_RULES,
    TRIAL_RULES,
    Limits,
)
from etl.screening.screen import FixationScreening, Recorded, Verdict

LEVELS = ("fixation", "trial", "participant", "value")
LEFT_OUT = "left out"
SET_MISSING = "set missing"


class Entry(NamedTuple):
    """One row of the ledger; -1 where a place does not apply.

    Attributes
    ----------
    level : str
        One of ``LEVELS``.
    trial, region, fixation : int
        Index of the trial, code of the region, number of the fixation in its trial.
    rule, limit, observed, action, also : str
        As the ledger shows them.
    row : int
        The fixation whose place in the log is named.
    reader : int
        The place of the reader among those of the group.
    """

    level: str
    trial: int
    region: int
    fixation: int
    rule: str
    limit: str
    observed: str
    action: str
    also: str
    row: int
    reader: int = 0

    @property
    def place(self) -> tuple[int, bool, int, int, int, int]:
        """Where the row stands among all."""
        level = LEVELS.index(self.level)
        return (self.reader, self.trial < 0, self.trial, level, self.fixation, self.region)


@dataclass(slots=True)
class Accounts:
    """What became of the trials or the fixations of one or more readers.

    Attributes
    ----------
    read, kept : int
        How many were read, and how many are left.
    by_rule : Counter
        How many each rule left out.
    """

    read: int = 0
    kept: int = 0
    by_rule: Counter[str] = field(default_factory=Counter)

    @classmethod
    def of(cls, left_out: NDArray[np.int8]) -> Accounts:
        """Count codes of what left things out; -1 is kept."""
        (accounts,) = cls.of_each(left_out, np.zeros(len(left_out), dtype=np.int64), 1)
        return accounts

    @classmethod
    def of_each(
        cls, left_out: NDArray[np.int8], reader: NDArray[np.int64], readers: int
    ) -> list[Accounts]:
        """Count codes of what left things out reader by reader.

        Parameters
        ----------
        left_out : (n,) int8 array
            Codes; -1 is kept.
        reader : (n,) int64 array
            Whose each is, from 0.
        readers : int
            How many readers there are.

        Returns
        -------
        list of Accounts
            One a reader.
        """
        width = len(LEFT_OUT_BY) + 1
        counts = np.bincount(reader * width + left_out + 1, minlength=readers * width)
        every = []
        for own in counts.reshape(readers, width).tolist():
            by_rule = {rule: own[code + 1] for rule, code in CODE.items() if own[code + 1]}
            every.append(cls(sum(own), own[0], Counter(by_rule)))
        return every

    def add(self, other: Accounts) -> None:
        """Add the accounts of another reader."""
        self.read += other.read
        self.kept += other.kept
        self.by_rule.update(other.by_rule)

    def balance(self) -> bool:
        """Whether all that was read is accounted for."""
        return self.read == self.kept + sum(self.by_rule.values())


@dataclass(frozen=True, slots=True)
class Screened:
    """Everything that screening found out about one or more readers.

    Attributes
    ----------
    recorded : Recorded
        The fixations as they were.
    number : (n,) int64 array
        Number of each fixation in its trial.
    fixations : FixationScreening
        After the rules for fixations.
    trials, readers : Verdict
        What the rules for trials and readers say.
    before : (trials,) int8 array
        Code of ``skip`` for trials that are no part of the study, else -1.
    reader : (trials,) int64 array
        The reader of each trial, from 0; non-decreasing.
    """

    recorded: Recorded
    number: NDArray[np.int64]
    fixations: FixationScreening
    trials: Verdict
    readers: Verdict
    before: NDArray[np.int8]
    reader: NDArray[np.int64]

    def trial_codes(self) -> NDArray[np.int8]:
        """What left each trial out: ``skip``, a rule for trials, a rule for readers; -1 kept."""
        codes = np.where(self.before >= 0, self.before, self.trials.left_out)
        return np.where(codes >= 0, codes, self.readers.left_out[self.reader]).astype(np.int8)

    def fixation_codes(self) -> NDArray[np.int8]:
        """What left each fixation out; those of a trial or reader left out are charged to that."""
        own = self.fixations.left_out
        of_trial = self.trial_codes()
        if (of_trial < 0).all():
            return own
        return np.where(own >= 0, own, of_trial[self.recorded.trial]).astype(np.int8)


def entries_of(
    screened: Screened,
    limits: Limits,
    reasons: tuple[Sequence[str], Sequence[str], Sequence[str]],
    first_row: NDArray[np.int64],
) -> list[Entry]:
    """The rows of the ledger for fixations, trials and readers.

    Parameters
    ----------
    screened : Screened
        What screening found out.
    limits : Limits
        The study's rules.
    reasons : tuple
        For each trial why it is skipped (``block = practice``) and the experimenter's note, and the
        note on each reader.
    first_row : (trials,) int64 array
        The first fixation of each trial.

    Returns
    -------
    list of Entry
        Sorted by reader, trial, level and fixation; of each reader the row on the reader last.
    """
    skipped, notes, reader_notes = reasons
    above, why = _of_readers(screened, reader_notes)
    entries = [*_fixation_entries(screened, limits, above)]
    codes = screened.trial_codes()
    for trial in np.flatnonzero(codes >= 0).tolist():
        rule, reader = LEFT_OUT_BY[int(codes[trial])], int(screened.reader[trial])
        limit, observed = limits.shown.get(rule, ""), ""
        also = "" if rule == "skip" else _join(_later(screened.trials, trial, rule), above[reader])
        if rule == "skip":
            limit = skipped[trial]
        elif rule == "notes":
            observed = notes[trial]
        elif rule in READER_RULES:
            # The trials of a reader who is left out are told one by one as well.
            also, observed = " ".join(_later(screened.readers, reader, rule)), why[reader]
        else:
            observed = _number(screened.trials.observed[rule][trial])
        row = int(first_row[trial])
        entries.append(
            Entry("trial", trial, -1, -1, rule, limit, observed, LEFT_OUT, also, row, reader)
        )
    for reader in np.flatnonzero(screened.readers.left_out >= 0).tolist():
        rule = LEFT_OUT_BY[int(screened.readers.left_out[reader])]
        also = " ".join(_later(screened.readers, reader, rule))
        limit, observed = limits.shown.get(rule, ""), why[reader]
        entries.append(
            Entry("participant", -1, -1, -1, rule, limit, observed, LEFT_OUT, also, -1, reader)
        )
    return sorted(entries, key=lambda entry: entry.place)


def _of_readers(screened: Screened, notes: Sequence[str]) -> tuple[list[list[str]], list[str]]:
    """For each reader who is left out: all rules against the reader; what the first looked at."""
    above: list[list[str]] = [[] for _ in notes]
    why = [""] * len(notes)
    for reader in np.flatnonzero(screened.readers.left_out >= 0).tolist():
        rule = LEFT_OUT_BY[int(screened.readers.left_out[reader])]
        holds = screened.readers.holds
        above[reader] = [name for name in holds if holds[name][reader]]
        why[reader] = (
            notes[reader]
            if rule == "participant_notes"
            else _number(screened.readers.observed[rule][reader])
        )
    return above, why


class FarValue(NamedTuple):
    """A value that ``outlier_sd`` sets aside: trial, region code, measure, value and reader."""

    trial: int
    region: int
    measure: str
    value: float
    reader: int = 0


def with_values(entries: list[Entry], far: Sequence[FarValue], limits: Limits) -> list[Entry]:
    """The ledger with the values that were set missing, in its order."""
    if not far:
        return entries
    limit = limits.shown.get("outlier_sd", "")
    added = [
        Entry(
            "value",
            one.trial,
            one.region,
            -1,
            "outlier_sd",
            limit,
            f"{one.measure} {_number(one.value)}",
            SET_MISSING,
            "",
            -1,
            one.reader,
        )
        for one in far
    ]
    return sorted([*entries, *added], key=lambda entry: entry.place)


def _fixation_entries(
    screened: Screened, limits: Limits, above: Sequence[list[str]]
) -> Iterable[Entry]:
    """A row for each fixation that a rule for fixations, or a repeated trial, leaves out."""
    own = screened.fixations
    rows = np.flatnonzero(
        (own.left_out >= CODE["repeated"]) & (own.left_out <= CODE[FIXATION_RULES[-1]])
    )
    trial_code = screened.trials.left_out
    for row in rows.tolist():
        rule = LEFT_OUT_BY[int(own.left_out[row])]
        trial = int(screened.recorded.trial[row])
        reader = int(screened.reader[trial])
        also: list[str] = []
        if rule != "repeated":
            later = FIXATION_RULES[FIXATION_RULES.index(rule) + 1 :]
            also = [name for name in later if name in own.holds and own.holds[name][row]]
            if trial_code[trial] >= 0:
                also += [name for name, holds in screened.trials.holds.items() if holds[trial]]
            also += above[reader]
        action = LEFT_OUT
        if rule == "merge":
            action = f"merged into {int(screened.number[own.into[row]])}"
        yield Entry(
            "fixation",
            trial,
            -1,
            int(screened.number[row]),
            rule,
            limits.shown.get(rule, ""),
            _observed(rule, screened, row),
            action,
            " ".join(also),
            row,
            reader,
        )


def _observed(rule: str, screened: Screened, row: int) -> str:
    """What a rule for fixations looked at."""
    recorded = screened.recorded
    if rule in ("merge", "under_ms", "over_ms"):
        return _number(screened.fixations.duration_ms[row])
    if rule == "outside_text_time":
        return _number(recorded.onset_ms[row])
    if rule == "off_screen":
        return f"{_number(recorded.x_px[row])}, {_number(recorded.y_px[row])}"
    if rule == "first":
        return str(int(recorded.from_start[row]))
    if rule == "last":
        return str(int(recorded.from_end[row]))
    return "1"


def _later(verdict: Verdict, at: int, rule: str) -> list[str]:
    """Rules of the same level, after the one that is charged, that hold as well."""
    return [name for name, holds in verdict.holds.items() if holds[at] and CODE[name] > CODE[rule]]


def _join(*parts: Iterable[str]) -> str:
    return " ".join(name for part in parts for name in part)


def _number(value: float) -> str:
    """A number without needless digits."""
    return f"{float(value):.10g}"


def check_balance(
    accounts: Mapping[str, Sequence[Accounts]],
    entries: Sequence[Entry],
    kept: Mapping[str, NDArray[np.int64]],
) -> None:
    """See that accounts, ledger and tables of each reader say the same.

    Parameters
    ----------
    accounts : mapping of str to sequence of Accounts
        Of ``trials`` and ``fixations``, one a reader.
    entries : sequence of Entry
        The rows of the ledger.
    kept : mapping of str to (readers,) int64 array
        For each reader, rows of the table ``trials``, and rows of ``fixations`` that are kept.

    Raises
    ------
    FaultError
        If anything is not accounted for. Nothing is published then.
    """
    told: Counter[tuple[str, int, str]] = Counter(
        (entry.level, entry.reader, entry.rule) for entry in entries
    )
    for unit, every in accounts.items():
        for own, there in zip(every, kept[unit].tolist(), strict=True):
            if not own.balance() or own.kept != there:
                raise FaultError(
                    f"the accounts of {unit} do not balance: {own.read} read, {own.kept} kept, "
                    f"{there} in the tables, left out {dict(own.by_rule)}"
                )
    for level, unit, rules in (
        ("trial", "trials", ("skip", *TRIAL_RULES, *READER_RULES)),
        ("fixation", "fixations", ("repeated", *FIXATION_RULES)),
    ):
        charged = {
            (level, reader, rule): count
            for reader, own in enumerate(accounts[unit])
            for rule, count in own.by_rule.items()
            if rule in rules
        }
        listed = {key: told[key] for key in told if key[0] == level and key[2] in rules}
        for key in sorted({*charged, *listed}):
            if told[key] != charged.get(key, 0):
                raise FaultError(
                    f"the ledger has {told[key]} {level} rows for {key[2]}, the accounts "
                    f"{charged.get(key, 0)}"
                )


def columns_of_accounts(limits: Limits) -> tuple[str, ...]:
    """The rules that have a column in the accounts of a study, in order of application."""
    return tuple(rule for rule in (*BEFORE, *LEFT_OUT_BY[len(BEFORE) :]) if limits.on(rule))
