"""The ledger: a row for each thing that was left out or changed, and the accounts of a reader."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.screening.entries import LEFT_OUT, SET_MISSING, Entry, Screened, in_order
from etl.screening.rules import (
    BEFORE,
    CODE,
    FIXATION_RULES,
    LEFT_OUT_BY,
    READER_RULES,
    TRIAL_RULES,
    Limits,
)
from etl.screening.screen import Verdict


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
    return in_order(entries)


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
    return in_order([*entries, *added])


def _fixation_entries(
    screened: Screened, limits: Limits, above: Sequence[list[str]]
) -> Iterable[Entry]:
    """A row for each fixation that a rule for fixations, or a repeated trial, leaves out."""
    own, recorded = screened.fixations, screened.recorded
    for rule in ("repeated", *FIXATION_RULES):
        rows = np.flatnonzero(own.left_out == CODE[rule])
        trial = recorded.trial[rows]
        reader = screened.reader[trial].tolist()
        actions = [LEFT_OUT] * len(rows)
        if rule == "merge":
            into = screened.number[own.into[rows]].tolist()
            actions = [f"merged into {number}" for number in into]
        also = [""] * len(rows)
        if rule != "repeated":
            also = _also_by(screened, rule, rows, above)
        limit, observed = limits.shown.get(rule, ""), _observed(rule, screened, rows)
        for place, row in enumerate(rows.tolist()):
            yield Entry(
                "fixation",
                int(trial[place]),
                -1,
                int(screened.number[row]),
                rule,
                limit,
                observed[place],
                actions[place],
                also[place],
                row,
                reader[place],
            )


def _also_by(
    screened: Screened, rule: str, rows: NDArray[np.int64], above: Sequence[list[str]]
) -> list[str]:
    """The later rules against each of some fixations, their trials and readers, that hold too."""
    own, trial = screened.fixations, screened.recorded.trial[rows]
    later = FIXATION_RULES[FIXATION_RULES.index(rule) + 1 :]
    holding = [(name, own.holds[name][rows]) for name in later if name in own.holds]
    lost = screened.trials.left_out[trial] >= 0
    holding += [(name, holds[trial] & lost) for name, holds in screened.trials.holds.items()]
    names: list[list[str]] = [[] for _ in rows]
    for name, holds in holding:
        for place in np.flatnonzero(holds).tolist():
            names[place].append(name)
    readers = screened.reader[trial].tolist()
    return [
        " ".join([*own_names, *above[at]]) for own_names, at in zip(names, readers, strict=True)
    ]


def _observed(rule: str, screened: Screened, rows: NDArray[np.int64]) -> list[str]:
    """What a rule for fixations looked at."""
    recorded = screened.recorded
    if rule in ("merge", "under_ms", "over_ms"):
        return [_number(ms) for ms in screened.fixations.duration_ms[rows].tolist()]
    if rule == "outside_text_time":
        return [_number(ms) for ms in recorded.onset_ms[rows].tolist()]
    if rule == "off_screen":
        places = zip(recorded.x_px[rows].tolist(), recorded.y_px[rows].tolist(), strict=True)
        return [f"{_number(x)}, {_number(y)}" for x, y in places]
    if rule == "first":
        return [str(place) for place in recorded.from_start[rows].tolist()]
    if rule == "last":
        return [str(place) for place in recorded.from_end[rows].tolist()]
    return ["1"] * len(rows)


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
