"""Which logs of a study differ from the rest, and how.

Nothing here stops a build: a log that differs may be right. Each difference names every log that
has it, also where they are hundreds.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, field

from etl.files.headers import spelled
from etl.session.compared_logs import ComparedLog, Difference
from etl.session.differing_figures import other_durations, other_numbers, other_places
from etl.session.told import counted

#: So many different values of one thing are told apart; where there are more, each log is named
#: with its own (our choice).
_MOST_APART = 6
#: So many columns are named of those that a log lacks or has besides (our choice).
_MOST_COLUMNS = 6
#: Lines that every log may have or not without being different from another.
_ORDINARY = ("fixations", "blank lines", "blinks")


@dataclass(slots=True)
class _Group:
    """Logs that share a value other than the usual one."""

    logs: list[str] = field(default_factory=list)
    values: list[str] = field(default_factory=list)


def cut_short(logs: Sequence[ComparedLog]) -> list[ComparedLog]:
    """The logs whose last line has no line end where most others have one.

    A cut in the last cell of a row leaves a row that can be read, with a wrong number in it; only
    the missing line end tells. A program that ends its files so does it in all of them: so the
    majority decides, and at least two other logs must end as they should (our choice).

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study.

    Returns
    -------
    list of ComparedLog
        Empty where half of the logs or more end so.
    """
    open_ended = [log for log in logs if log.note.ends_open]
    whole = len(logs) - len(open_ended)
    return open_ended if whole >= 2 and len(open_ended) < whole else []


def differences(
    logs: Sequence[ComparedLog], wrong: Collection[str] = frozenset()
) -> list[Difference]:
    """Compare every log with the rest.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study.
    wrong : collection of str
        Logs whose durations or onsets were found wrong, which needs no telling again.

    Returns
    -------
    list of Difference
        Empty where all logs are alike, or there is only one.
    """
    if len(logs) < 2:
        return []
    out = _not_alike(logs, "encoding", lambda log: log.note.encoding)
    out += _not_alike(logs, "separator of fields", lambda log: spelled(log.note.delimiter))
    out += _not_alike(logs, "decimal sign", lambda log: f'"{log.note.decimal}"')
    if not cut_short(logs):
        ends = ("with a line end", "without one")
        out += _not_alike(logs, "last line", lambda log: ends[log.note.ends_open])
    out += _other_columns(logs)
    out += _other_lines(logs)
    out += other_numbers(logs)
    out += other_durations([log for log in logs if log.shown not in wrong])
    out += other_places(logs)
    return out


def _not_alike(
    logs: Sequence[ComparedLog], what: str, value_of: Callable[[ComparedLog], str]
) -> list[Difference]:
    """Logs that are written in another way than most."""
    values = [value_of(log) for log in logs]
    usual, count = Counter(values).most_common(1)[0]
    others = [(log.shown, value) for log, value in zip(logs, values, strict=True) if value != usual]
    return [
        Difference(
            "note",
            f"in {len(group.logs):,} of {len(logs):,} logs the {what} is "
            + (f"another than {usual}, as" if remarks else f"{group.values[0]}, and {usual}")
            + f" in {count:,}",
            f"the {what} is {group.values[0]}, and {usual} in {count:,} of {len(logs):,} logs",
            tuple(group.logs),
            remarks,
        )
        for group, remarks in _grouped(others)
    ]


def _grouped(others: Sequence[tuple[str, str]]) -> list[tuple[_Group, tuple[str, ...]]]:
    """Logs with other values by value; with many values one group, and a remark for each log."""
    groups: dict[str, _Group] = {}
    together = len({value for _, value in others}) > _MOST_APART
    for log, value in others:
        group = groups.setdefault("" if together else value, _Group())
        group.logs.append(log)
        group.values.append(value)
    return [(group, tuple(group.values) if together else ()) for group in groups.values()]


def _other_columns(logs: Sequence[ComparedLog]) -> list[Difference]:
    """Logs whose header is not the usual one; those without a header are left aside."""
    headed = [log for log in logs if log.note.columns]
    if not headed:
        return []
    usual, count = Counter(log.note.columns for log in headed).most_common(1)[0]
    words = {own: _against(own, usual) for own in {log.note.columns for log in headed} - {usual}}
    others = [(log.shown, words[c]) for log in headed if (c := log.note.columns) != usual]
    return [
        Difference(
            "note",
            f"in {len(group.logs):,} of {len(headed):,} logs the columns are not those of the "
            f"rest, {counted(count, 'log')}" + ("" if remarks else f": {group.values[0]}"),
            f"the columns are not those of the rest, {count:,} of {len(headed):,} logs: "
            f"{group.values[0]}",
            tuple(group.logs),
            remarks,
        )
        for group, remarks in _grouped(others)
    ]


def _against(own: tuple[str, ...], usual: tuple[str, ...]) -> str:
    """What is other in a header, in words."""
    mine, theirs = set(own), set(usual)
    lacking = {name.casefold(): name for name in usual if name not in mine}
    besides = [name for name in own if name not in theirs]
    respelled = {name: lacking.pop(c) for name in besides if (c := name.casefold()) in lacking}
    parts = []
    if lacking:
        parts.append("without " + _some(list(lacking.values())))
    if added := [name for name in besides if name not in respelled]:
        parts.append("with " + _some(added) + " besides")
    if respelled:
        pairs = [f'"{name}" for "{usually}"' for name, usually in respelled.items()]
        parts.append(_some(pairs, quoted=True))
    known = [respelled.get(name, name) for name in own if name in theirs or name in respelled]
    if known != [name for name in usual if name in set(known)]:
        parts.append("in another order")
    return ", ".join(parts)


def _some(names: Sequence[str], *, quoted: bool = False) -> str:
    """Names of columns, the first few."""
    shown = [name if quoted else f'"{name}"' for name in names[:_MOST_COLUMNS]]
    more = len(names) - _MOST_COLUMNS
    return ", ".join(shown) + (f" and {more:,} more" if more > 0 else "")


def _other_lines(logs: Sequence[ComparedLog]) -> list[Difference]:
    """Logs that hold lines of a kind that most do not, or lack what most have."""
    out: list[Difference] = []
    kinds = dict.fromkeys(what for log in logs for what in log.note.account.lines)
    for what in kinds:
        if what in _ORDINARY:
            continue
        having = [log for log in logs if what in log.note.account.lines]
        lacking = [log for log in logs if what not in log.note.account.lines]
        if lacking and len(having) <= len(lacking):
            tallies = [log.note.account.lines[what] for log in having]
            out.append(
                Difference(
                    "note",
                    f"{len(having):,} of {len(logs):,} logs hold lines of a kind that the others "
                    f"do not: {what}",
                    f"the log holds {counted(tallies[0].count, 'line')} of a kind that "
                    f"{len(lacking):,} of {len(logs):,} logs do not: {what}",
                    tuple(log.shown for log in having),
                    tuple(f"{tally.count:,}" for tally in tallies),
                    tallies[0].first_line,
                )
            )
        elif lacking:
            out.append(
                Difference(
                    "note",
                    f"{len(lacking):,} of {len(logs):,} logs lack lines of a kind that the others "
                    f"have: {what}",
                    f"the log lacks lines of a kind that {len(having):,} of {len(logs):,} logs "
                    f"have: {what}",
                    tuple(log.shown for log in lacking),
                )
            )
    return out
