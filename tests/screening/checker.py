"""Finds contradictions in a built folder by reading nothing but what was published.

Only ``fixations``, ``exclusions.csv``, ``accounts.csv``, ``outcomes`` and ``trials`` are read, by
pyarrow's and Python's own readers; nothing of the program is used. What the logs say of durations
may be handed in, for a fixation that took others in shows what was used and not what was recorded.
"""

from __future__ import annotations

import csv
import re
from collections import Counter, defaultdict
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import pyarrow.parquet as pq

from tests.measures import naive

Row = dict[str, Any]
Key = tuple[Any, ...]

BEFORE = ("skip", "repeated")
OF_FIXATIONS = (
    *("outside_text_time", "off_screen", "first", "last", "blink", "undersweep"),
    *("merge", "under_ms", "over_ms"),
)
OF_TRIALS = (
    *("notes", "fewest_fixations", "line_confidence_under", "outside_share_over", "duration_ms"),
    *("blink_in_first_pass_of", "no_first_pass_on", "answer_wrong"),
)
OF_READERS = (
    *("participant_notes", "correct_share_under"),
    *("lost_trials_share_over", "fewest_trials_per_cell"),
)
ORDER = (*BEFORE, *OF_FIXATIONS, *OF_TRIALS, *OF_READERS)
LEVELS = ("fixation", "trial", "participant", "value")
ROUNDING_MS = 1e-6


@dataclass(frozen=True)
class Published:
    """The five published files of a build.

    Attributes
    ----------
    folder : Path
        Where they are.
    recorded_ms : mapping of (file, line) to float, or None
        The duration of each fixation as it stands in the logs.
    outside, no_opportunity : str
        The conventions under which outcomes are computed.
    """

    folder: Path
    recorded_ms: Mapping[tuple[str, int], float] | None = None
    outside: str = "ignore"
    no_opportunity: str = "missing"

    def _table(self, name: str) -> list[Row]:
        with pq.ParquetFile(self.folder / f"{name}.parquet") as file:
            return file.read().to_pylist()

    def _text(self, name: str) -> list[dict[str, str]]:
        with (self.folder / f"{name}.csv").open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))

    @cached_property
    def fixations(self) -> list[Row]:
        """The rows of ``fixations``."""
        return self._table("fixations")

    @cached_property
    def outcomes(self) -> list[Row]:
        """The rows of ``outcomes``."""
        return self._table("outcomes")

    @cached_property
    def trials(self) -> list[Row]:
        """The rows of ``trials``."""
        return self._table("trials")

    @cached_property
    def ledger(self) -> list[dict[str, str]]:
        """The rows of the ledger."""
        return self._text("exclusions")

    @cached_property
    def accounts(self) -> list[dict[str, str]]:
        """The rows of the accounts."""
        return self._text("accounts")

    @property
    def ids(self) -> tuple[str, ...]:
        """What identifies a trial."""
        sessions = ("session",) if self.fixations and "session" in self.fixations[0] else ()
        return ("participant", *sessions, "trial")

    def key(self, row: Mapping[str, Any]) -> tuple[str, ...]:
        """The trial that a row is about, as texts."""
        return tuple(str(row[name]) for name in self.ids)

    @cached_property
    def by_trial(self) -> dict[Key, list[Row]]:
        """The fixations of each trial."""
        found: dict[Key, list[Row]] = defaultdict(list)
        for row in self.fixations:
            found[self.key(row)].append(row)
        return dict(found)

    @cached_property
    def kept_trials(self) -> set[Key]:
        """The rows of ``trials``."""
        return {self.key(row) for row in self.trials}

    def told(self, level: str) -> list[dict[str, str]]:
        """The ledger's rows of one level."""
        return [row for row in self.ledger if row["level"] == level]

    @cached_property
    def lost_trials(self) -> dict[Key, str]:
        """Rule of each trial in the ledger."""
        return {self.key(row): row["rule"] for row in self.told("trial")}

    @cached_property
    def lost_readers(self) -> dict[str, str]:
        """Rule of each reader in the ledger."""
        return {row["participant"]: row["rule"] for row in self.told("participant")}

    def charge(self, key: Key) -> str:
        """What a trial is charged to; empty where it is kept."""
        return self.lost_trials.get(key) or self.lost_readers.get(key[0], "")


def contradictions(told: Published) -> list[str]:
    """Everything in which the published files contradict one another, in words."""
    return [found for check in CHECKS for found in check(told)]


def every_fixation_has_its_place(told: Published) -> Iterator[str]:
    """Each line of a log once; numbers in a trial from 1 on; kept or left out, never both."""
    lines = Counter((row["source_file"], row["source_line"]) for row in told.fixations)
    yield from (f"{file}:{line} is told {n} times" for (file, line), n in lines.items() if n > 1)
    if told.recorded_ms is not None and set(lines) != set(told.recorded_ms):
        yield f"lines of the logs and of fixations differ: {set(lines) ^ set(told.recorded_ms)}"
    for key, rows in told.by_trial.items():
        if [row["fixation"] for row in rows] != list(range(1, len(rows) + 1)):
            yield f"{key}: fixations are not numbered from 1"
        for row in rows:
            if bool(row["kept"]) == bool(row["left_out_by"]):
                yield f"{key}: fixation {row['fixation']} is kept and left out, or neither"
            if not row["kept"] and (row["visit"] or row["first_pass"] is not None):
                yield f"{key}: fixation {row['fixation']} is left out and has a visit"


def accounts_balance(told: Published) -> Iterator[str]:
    """Row by row, and the last two rows are the sum of the others; columns in order."""
    if not told.accounts:
        yield "the accounts are empty"
        return
    columns = list(told.accounts[0])
    if columns != [
        *("participant", "unit", "read"),
        *(rule for rule in ORDER if rule in columns),
        "kept",
    ]:
        yield f"the accounts have columns {columns}"
    rules = columns[3:-1]
    sums: dict[str, Counter[str]] = {"trials": Counter(), "fixations": Counter()}
    for row in told.accounts:
        if int(row["read"]) != int(row["kept"]) + sum(int(row[rule]) for rule in rules):
            yield f"the accounts of {row['unit']} of {row['participant']} do not balance"
        if row["participant"] != "(all)":
            sums[row["unit"]].update({name: int(row[name]) for name in columns[2:]})
    for row in told.accounts[-2:]:
        whole = {name: int(row[name]) for name in columns[2:]}
        if row["participant"] != "(all)" or whole != {n: sums[row["unit"]][n] for n in whole}:
            yield f"the last row of {row['unit']} is not the sum of the others"
    readers = sorted({str(row["participant"]) for row in told.fixations})
    listed = [(row["participant"], row["unit"]) for row in told.accounts[:-2]]
    if sorted(listed) != [(who, unit) for who in readers for unit in ("fixations", "trials")]:
        yield "the accounts do not list each reader of fixations once a unit"


def accounts_are_those_of_the_tables(told: Published) -> Iterator[str]:
    """Counted anew from ``fixations``, ``trials`` and the ledger."""
    counted: dict[Key, Counter[str]] = defaultdict(Counter)
    for row in told.fixations:
        who = str(row["participant"])
        counted[who, "fixations"].update(["read", row["left_out_by"] or "kept"])
    for key in told.by_trial:
        counted[key[0], "trials"].update(["read", told.charge(key) or "kept"])
    for row in told.accounts[:-2]:
        own = counted[row["participant"], row["unit"]]
        given = {
            name: int(cell) for name, cell in row.items() if name not in ("participant", "unit")
        }
        if {name: n for name, n in given.items() if n} != dict(own):
            yield f"accounts of {row['unit']} of {row['participant']}: {given}, counted {dict(own)}"


def ledger_is_in_order(told: Published) -> Iterator[str]:
    """By reader, session, trial, level, fixation; each thing once."""
    seen: Counter[Key] = Counter()
    place = {key: at for at, key in enumerate(told.by_trial)}
    readers: list[str] = []
    last: Key = ()
    for row in told.ledger:
        if row["participant"] not in readers:
            readers.append(row["participant"])
            last = ()
        if row["participant"] != readers[-1]:
            yield f"the ledger comes back to {row['participant']}"
        at = place.get(told.key(row), -1) if row["trial"] else len(place)
        if at < 0:
            yield f"the ledger names a trial that is not in fixations: {told.key(row)}"
        now = (at, LEVELS.index(row["level"]), int(row["fixation"] or 0))
        if now < last:
            yield f"the ledger is out of order at {told.key(row)}"
        last = now
        seen[
            tuple(row[name] for name in ("level", *told.ids, "region", "fixation", "observed"))
        ] += 1
    yield from (f"the ledger tells {thing} {n} times" for thing, n in seen.items() if n > 1)


def ledger_of_fixations_is_that_of_the_table(told: Published) -> Iterator[str]:
    """A row for each fixation left out by a rule of its own, with its line, and no other row."""
    own = ("repeated", *OF_FIXATIONS)
    expected = {
        (*told.key(row), row["fixation"]): (
            row["left_out_by"],
            row["source_file"],
            row["source_line"],
        )
        for row in told.fixations
        if row["left_out_by"] in own
    }
    given = {
        (*told.key(row), int(row["fixation"])): (
            row["rule"],
            row["source_file"],
            int(row["source_line"]),
        )
        for row in told.told("fixation")
    }
    for key in expected.keys() | given.keys():
        if expected.get(key) != given.get(key):
            yield f"{key}: fixations say {expected.get(key)}, the ledger {given.get(key)}"
    for row in told.told("fixation"):
        merged = row["action"].startswith("merged into ")
        if merged != (row["rule"] == "merge") or not (merged or row["action"] == "left out"):
            yield f"{told.key(row)}: the action {row['action']} is not one of {row['rule']}"


def every_trial_is_somewhere(told: Published) -> Iterator[str]:
    """Kept or in the ledger, and fixations agree; a reader who is lost is in it, trial by trial."""
    for key in told.kept_trials - told.by_trial.keys():
        yield f"{key} is in trials and not in fixations"
    for key, rows in told.by_trial.items():
        lost = key in told.lost_trials
        if lost and key in told.kept_trials:
            yield f"{key} is kept and in the ledger"
        if key[0] in told.lost_readers and key in told.kept_trials:
            yield f"{key} is kept and its reader is in the ledger"
        if not lost and key not in told.kept_trials:
            yield f"{key} is nowhere"
        if told.lost_trials.get(key) in OF_READERS and key[0] not in told.lost_readers:
            yield f"{key} went with its reader, who is not in the ledger"
        charge = told.charge(key)
        allowed = {"skip"} if charge == "skip" else {"repeated", *OF_FIXATIONS, charge or None}
        wrong = {row["left_out_by"] for row in rows} - allowed
        if wrong:
            yield f"{key} is charged to {charge or 'nothing'}, its fixations to {wrong}"
    for level, rules in (
        ("trial", ("skip", *OF_TRIALS, *OF_READERS)),
        ("participant", OF_READERS),
    ):
        for row in told.told(level):
            if row["rule"] not in rules or row["action"] != "left out":
                yield f"the {level} {told.key(row)} has {row['rule']}, {row['action']}"


def later_rules_are_later(told: Published) -> Iterator[str]:
    """``also`` names rules after the one charged, in order; those of the trial and the reader."""
    for row in told.ledger:
        also = [ORDER.index(rule) for rule in row["also"].split()]
        if also != sorted(set(also)) or (also and also[0] <= ORDER.index(row["rule"])):
            yield f"{told.key(row)}: also {row['also']} after {row['rule']}"
        if row["level"] in ("value", "participant") or row["rule"] in (*BEFORE, *OF_READERS):
            continue
        named = row["also"].split()
        above = [told.lost_readers.get(row["participant"])]
        if row["level"] == "fixation":
            above.append(told.lost_trials.get(told.key(row)))
        for rule in above:
            if rule and rule not in named:
                yield f"{told.key(row)}: {rule} above it is not in also"


def _limit(row: Mapping[str, str]) -> float:
    return float(row["limit"])


#: Whether what was observed is against the limit.
AGAINST: Mapping[str, Callable[[Mapping[str, str]], bool]] = {
    "under_ms": lambda row: float(row["observed"]) < _limit(row),
    "over_ms": lambda row: float(row["observed"]) > _limit(row),
    "first": lambda row: int(row["observed"]) <= _limit(row),
    "last": lambda row: int(row["observed"]) <= _limit(row),
    "merge": lambda row: float(row["observed"]) <= float(re.findall(r"[\d.]+", row["limit"])[0]),
    "fewest_fixations": lambda row: int(row["observed"]) < _limit(row),
    "line_confidence_under": lambda row: float(row["observed"]) < _limit(row),
    "outside_share_over": lambda row: float(row["observed"]) > _limit(row),
    "correct_share_under": lambda row: float(row["observed"]) < _limit(row),
    "lost_trials_share_over": lambda row: float(row["observed"]) > _limit(row),
    "fewest_trials_per_cell": lambda row: int(row["observed"]) < _limit(row),
    "duration_ms": lambda row: (
        not (
            float(row["limit"].split(", ")[0])
            <= float(row["observed"])
            <= float(row["limit"].split(", ")[1])
        )
    ),
}


def what_was_observed_is_against_the_limit(told: Published) -> Iterator[str]:
    """Every number in ``observed`` is on the wrong side of its limit."""
    for row in told.ledger:
        against = AGAINST.get(row["rule"])
        if against is not None and not against(row):
            yield f"{told.key(row)}: {row['observed']} is not against {row['rule']} {row['limit']}"


def observed_is_what_the_table_has(told: Published) -> Iterator[str]:
    """What rules for trials counted, counted anew from the fixations that they were left with."""
    for row in told.told("trial"):
        own = ("repeated", *OF_FIXATIONS)
        left = [f for f in told.by_trial.get(told.key(row), ()) if f["left_out_by"] not in own]
        if row["rule"] == "fewest_fixations" and int(row["observed"]) != len(left):
            yield f"{told.key(row)}: {row['observed']} fixations observed, {len(left)} in the table"
        if row["rule"] == "outside_share_over":
            share = sum(f["region"] is None for f in left) / len(left)
            if abs(float(row["observed"]) - share) > 1e-9:
                yield f"{told.key(row)}: {row['observed']} outside observed, {share} in the table"
    for who, rule in told.lost_readers.items():
        if rule == "lost_trials_share_over":
            own = [key for key in told.by_trial if key[0] == who and told.charge(key) != "skip"]
            share = sum(told.lost_trials.get(key, "") in OF_TRIALS for key in own) / len(own)
            (row,) = (row for row in told.told("participant") if row["participant"] == who)
            if abs(float(row["observed"]) - share) > 1e-9:
                yield f"{who}: {row['observed']} lost observed, {share} in the tables"


def merged_durations_add_up(told: Published) -> Iterator[str]:
    """Every step leads to a fixation of the same trial that is not merged; durations add up."""
    into: dict[Key, dict[int, tuple[int, float]]] = defaultdict(dict)
    for row in told.told("fixation"):
        if row["rule"] == "merge" and row["action"].startswith("merged into "):
            target = int(row["action"].removeprefix("merged into "))
            into[told.key(row)][int(row["fixation"])] = target, float(row["observed"])
    for key, rows in told.by_trial.items():
        steps = into.get(key, {})
        parts: dict[int, list[int]] = {row["fixation"]: [row["fixation"]] for row in rows}
        for number in steps:
            at, passed = number, set()
            while at in steps and at not in passed:
                passed.add(at)
                at = steps[at][0]
            if at in passed or at not in parts:
                yield f"{key}: fixation {number} is merged into none that is there"
                continue
            for step in {number, *passed} - {number}:
                parts[step].append(number)
            parts[at].append(number)
        yield from _durations_are_sums(told, key, rows, (steps, parts))


def _durations_are_sums(
    told: Published,
    key: Key,
    rows: list[Row],
    merges: tuple[dict[int, tuple[int, float]], dict[int, list[int]]],
) -> Iterator[str]:
    """Own durations, from the logs where known, sum to those used and to those observed."""
    steps, parts = merges
    own: dict[int, float | None] = {}
    for row in rows:
        number = row["fixation"]
        if told.recorded_ms is not None:
            own[number] = told.recorded_ms.get((row["source_file"], row["source_line"]))
        else:
            own[number] = None if row["kept"] and len(parts[number]) > 1 else row["duration_ms"]
        if own[number] is None and told.recorded_ms is not None:
            yield f"{key}: fixation {number} names a line that the logs do not have"
            return
    for row in rows:
        number = row["fixation"]
        total = sum(own[part] or 0.0 for part in set(parts[number]))
        known = own[number] is not None
        if number in steps and known and abs(steps[number][1] - total) > ROUNDING_MS:
            yield f"{key}: fixation {number} was {steps[number][1]} when merged, its parts {total}"
        used = total if row["kept"] else own[number]
        if known and abs(row["duration_ms"] - used) > ROUNDING_MS:
            yield f"{key}: fixation {number} lasts {row['duration_ms']}, its parts {used}"
        if not known and row["duration_ms"] <= total:
            yield f"{key}: fixation {number} is shorter than what it took in"


def outcomes_follow_from_kept_fixations(told: Published) -> Iterator[str]:
    """Every outcome anew by the naive loop; what ``outlier_sd`` set aside is in the ledger."""
    cells: dict[Key, dict[tuple[int, str], Row]] = defaultdict(dict)
    for row in told.outcomes:
        cells[told.key(row)][row["region_order"], row["measure"]] = row
    if cells.keys() != told.kept_trials:
        yield f"outcomes and trials have different trials: {cells.keys() ^ told.kept_trials}"
    aside = Counter(
        (*told.key(row), row["region"], *row["observed"].split(" ")) for row in told.told("value")
    )
    for row in told.told("value"):
        if (row["rule"], row["action"]) != ("outlier_sd", "set missing"):
            yield f"the value {told.key(row)} has {row['rule']}, {row['action']}"
    for key, own in cells.items():
        regions = max((order for order, _ in own), default=0)
        kept = [row for row in told.by_trial.get(key, ()) if row["kept"]]
        orders = [row["region_order"] or 0 for row in kept]
        trial = naive.Trial(orders, [row["duration_ms"] for row in kept], regions)
        found = naive.measure(trial, told.outside, told.no_opportunity)
        for (order, measure), row in own.items():
            value, reason = found.regions[measure][order - 1]
            if row["missing"] == "outlier":
                thing = (*key, row["region"], measure, f"{value:.10g}" if value is not None else "")
                if row["value"] is not None or not aside[thing]:
                    yield f"{thing} is an outlier and not in the ledger"
                aside[thing] -= 1
            elif not _same(row, value, reason):
                given = row["missing"] if row["value"] is None else row["value"]
                expected = reason if value is None else value
                yield f"{key} {row['region']} {measure}: {given}, not {expected}"
    yield from (f"{thing} is in the ledger and not missing" for thing, n in aside.items() if n > 0)


def _same(row: Row, value: float | None, reason: str) -> bool:
    """Whether a cell holds a value or a reason; sums may be rounded."""
    if value is None or row["value"] is None:
        return row["value"] is value and (row["missing"] or "") == reason
    return row["missing"] is None and abs(row["value"] - value) <= ROUNDING_MS


def trials_follow_from_kept_fixations(told: Published) -> Iterator[str]:
    """Counts and reading time of each trial."""
    for row in told.trials:
        kept = [f for f in told.by_trial.get(told.key(row), ()) if f["kept"]]
        inside = [f for f in kept if f["region"] is not None]
        counts = (row["fixation_count"], row["outside_fixation_count"])
        if counts != (len(inside), len(kept) - len(inside)):
            yield f"{told.key(row)}: {counts} fixations in and outside, the table has {len(inside)}"
        if abs(row["reading_time"] - sum(f["duration_ms"] for f in inside)) > ROUNDING_MS:
            yield f"{told.key(row)}: reading time is not that of the kept fixations"


CHECKS: tuple[Callable[[Published], Iterator[str]], ...] = (
    every_fixation_has_its_place,
    accounts_balance,
    accounts_are_those_of_the_tables,
    ledger_is_in_order,
    ledger_of_fixations_is_that_of_the_table,
    every_trial_is_somewhere,
    later_rules_are_later,
    what_was_observed_is_against_the_limit,
    observed_is_what_the_table_has,
    merged_durations_add_up,
    outcomes_follow_from_kept_fixations,
    trials_follow_from_kept_fixations,
)
