"""What is told of each reader besides rows: counts, accounts, what the audit page needs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.measures import Outcomes
from etl.parsers import CanonicalLog
from etl.report import LineTrust, ReaderProfile, TrialFates, profiles_of
from etl.screening import LEFT_OUT_BY
from etl.screening.entries import Entry, Screened
from etl.screening.ledger import Accounts, check_balance
from etl.session.gallery import candidates
from etl.session.labels import Unlisted, unlisted_labels
from etl.session.line_ledger import check_lines, counts_of_lines
from etl.session.line_trust import trust_of
from etl.session.misplaced import outside_by_log
from etl.session.ordered import OrderedFixations, by_log
from etl.session.placing import Placed
from etl.session.reader import ReaderGroup, ReaderTables, starts_of

if TYPE_CHECKING:
    from etl.regions import RegionLibrary
    from etl.session.bench import Bench


@dataclass(frozen=True, slots=True, eq=False)
class Worked:
    """The work on some readers of whom nothing is wrong.

    Attributes
    ----------
    group : ReaderGroup
        The readers.
    ordered : OrderedFixations
        Their fixations in order.
    log : CanonicalLog
        The fixations in that order.
    file : (n,) int32 array
        The log of each, by its place among the study's.
    placed : Placed
        Where they were.
    screened : Screened
        What is left out.
    trial_codes, gone : (trials,) and (n,) int8 array
        What left each trial and each fixation out; -1 kept.
    kept : (k,) int64 array
        The fixations that are kept.
    outcomes : Outcomes
        The measures.
    entries : list of Entry
        The rows of the ledger.
    batches : dict of str to pa.RecordBatch
        Rows of every table.
    row_starts : dict of str to (readers + 1,) int64 array
        For each table where the rows of each reader begin, and how many there are.
    """

    group: ReaderGroup
    ordered: OrderedFixations
    log: CanonicalLog
    file: NDArray[np.int32]
    placed: Placed
    screened: Screened
    trial_codes: NDArray[np.int8]
    gone: NDArray[np.int8]
    kept: NDArray[np.int64]
    outcomes: Outcomes
    entries: list[Entry]
    batches: dict[str, pa.RecordBatch]
    row_starts: dict[str, NDArray[np.int64]]


def told_of(
    bench: Bench, worked: Worked, told: Mapping[str, Findings], *, page: bool
) -> dict[str, ReaderTables]:
    """See that nothing contradicts itself, and gather what is told of each reader.

    Parameters
    ----------
    bench : Bench
        The study's tables, texts and decisions.
    worked : Worked
        The work on some readers.
    told : mapping of str to Findings
        What was found of each.
    page : bool
        Whether the summaries for the audit page are wanted too.

    Returns
    -------
    dict of str to ReaderTables
        By reader; without rows, which are those of the group.

    Raises
    ------
    FaultError
        If ledger, accounts and tables of a reader do not say the same.
    """
    group, ordered, readers = worked.group, worked.ordered, len(worked.group)
    accounts = {
        "trials": Accounts.of_each(worked.trial_codes, group.reader_of_trial, readers),
        "fixations": Accounts.of_each(worked.gone, group.reader_of_row, readers),
    }
    fixations = worked.batches["fixations"]
    in_table = np.asarray(fixations.column("kept"))
    check_balance(
        accounts,
        worked.entries,
        {
            "trials": np.diff(worked.row_starts["trials"]),
            "fixations": np.bincount(group.reader_of_row[in_table == 1], minlength=readers),
        },
    )
    check_lines(worked.entries, worked.screened, worked.placed.lines, fixations)
    order = worked.placed.order
    outside = np.zeros(len(order), dtype=bool)
    outside[worked.kept] = order[worked.kept] == 0
    trust = trust_of(worked.placed.lines, ordered.trial)
    counts = _counts(worked, accounts, outside)
    profiles = _profiles(bench, worked, trust) if page else [None] * readers
    launch = worked.kept[worked.outcomes.regressions.launch]
    chosen = candidates(
        group.participants,
        worked.screened,
        outside,
        np.bincount(ordered.trial[launch], minlength=len(group.trials)),
        trust,
    )
    beside = outside_by_log(
        group, ordered.trial, worked.file, (order, _placed(bench.library, worked.log))
    )
    moved, gaps = _by_reader(worked, ordered.moved), _by_reader(worked, ordered.gap)
    unlisted = _unlisted(bench.library, worked)
    every = {}
    for place, participant in enumerate(group.participants):
        trials = slice(*group.trial_starts[place : place + 2].tolist())
        every[participant] = ReaderTables(
            participant,
            {},
            counts[place],
            {unit: own[place] for unit, own in accounts.items()},
            profiles[place],
            chosen[place],
            told[participant],
            beside[place],
            moved[place],
            gaps[place],
            unlisted[place],
            None if trust is None else trust.of(trials),
        )
    return every


def _counts(
    worked: Worked, accounts: Mapping[str, list[Accounts]], outside: NDArray[np.bool_]
) -> list[dict[str, int]]:
    """What was counted of each reader."""
    group, readers = worked.group, len(worked.group)

    def by_reader(which: NDArray[np.bool_]) -> list[int]:
        own: list[int] = np.bincount(group.reader_of_row[which], minlength=readers).tolist()
        return own

    beside, overlaps = by_reader(outside), by_reader(worked.ordered.overlapping)
    looked_at = np.zeros(len(group.trials), dtype=bool)
    looked_at[worked.ordered.trial[worked.kept]] = True
    bare = group.reader_of_trial[(worked.trial_codes < 0) & ~looked_at]
    bare_trials = np.bincount(bare, minlength=readers).tolist()
    of_lines = counts_of_lines(worked.entries, worked.screened, worked.placed.lines)
    return [
        {
            "readers left out": int(worked.screened.readers.left_out[place] >= 0),
            "fixations read": fixations.read,
            "fixations of skipped trials": fixations.by_rule["skip"],
            "fixations of repeated trials": fixations.by_rule["repeated"],
            "fixations kept": fixations.kept,
            "fixations kept outside every region": beside[place],
            "overlaps taken for rounding": overlaps[place],
            "trials read": trials.read,
            "trials skipped": trials.by_rule["skip"],
            "trials kept": trials.kept,
            "trials kept without a fixation": bare_trials[place],
            **of_lines[place],
        }
        for place, (trials, fixations) in enumerate(
            zip(accounts["trials"], accounts["fixations"], strict=True)
        )
    ]


def _profiles(bench: Bench, worked: Worked, trust: LineTrust | None) -> list[ReaderProfile]:
    """The summaries of the readers for the audit page."""
    group = worked.group
    read = group.trials.text >= 0
    own = np.bincount(group.reader_of_trial[read], minlength=len(group))
    # From a rule's code among all rules to its place among those of this study; -1 stays -1.
    used = {rule: code for code, rule in enumerate(bench.design.left_out_by)}
    named = np.array([*(used.get(rule, -1) for rule in LEFT_OUT_BY), -1], dtype=np.int32)
    return profiles_of(
        group.participants,
        (worked.batches, worked.row_starts),
        TrialFates(
            {name: levels[read] for name, levels in group.trials.factors.items()},
            named[worked.trial_codes[read]],
            None if trust is None else trust.of(read),
            starts_of(own),
        ),
        bench.design,
        (bench.options.outside, bench.options.grid),
    )


def _by_reader(worked: Worked, which: NDArray[np.bool_]) -> list[dict[int, tuple[int, int]]]:
    """For each reader and log how many of some fixations there are, and the first line of these."""
    found: list[dict[int, tuple[int, int]]] = [{} for _ in worked.group.participants]
    rows = np.flatnonzero(which)
    reader = worked.group.reader_of_row[rows]
    for place in np.unique(reader).tolist():
        own = rows[reader == place]
        found[place] = by_log(worked.file[own], worked.log.source_line[own])
    return found


def _unlisted(library: RegionLibrary, worked: Worked) -> list[dict[str, Unlisted]]:
    """Labels that no region definition lists, of trials of the study."""
    group = worked.group
    if library.labels is None:
        return [{} for _ in group.participants]
    # In the order of the logs, in which the first is told.
    in_study = np.empty(len(group.log), dtype=bool)
    in_study[worked.ordered.rows] = group.trials.text[worked.ordered.trial] >= 0
    return unlisted_labels(
        group.log,
        group.file,
        in_study,
        library.labels.codes,
        (group.reader_of_row, group.labels),
    )


def _placed(library: RegionLibrary, log: CanonicalLog) -> NDArray[np.bool_]:
    """Whether each fixation says where it is."""
    if library.labels is not None and log.label is not None:
        return np.asarray(log.label.codes >= 0)
    return ~np.isnan(log.x_px)
