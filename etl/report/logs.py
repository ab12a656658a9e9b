"""The part of the audit page about the logs: where their lines went, how they differ."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from markupsafe import Markup

from etl.report.wording import count, counted, name

#: So many logs are named at once; a longer list is folded away, and whole when it is opened.
MOST_UNFOLDED = 8
#: So many logs are named at all; the page would grow with the study otherwise.
MOST_NAMED = 1000
#: What the page calls each kind of matter, in the order in which it shows them.
WORDS = {"warning": "Warning", "note": "Differs", "mended": "Mended"}


@dataclass(frozen=True, slots=True)
class LogFate:
    """What became of some lines of the logs.

    Attributes
    ----------
    what : str
        In a few words.
    lines : int
        How many lines.
    logs : int
        How many logs have such lines.
    """

    what: str
    lines: int
    logs: int


@dataclass(frozen=True, slots=True)
class LogMatter:
    """Something in which some logs differ from the rest, or that was mended in them.

    Attributes
    ----------
    kind : {"warning", "note", "mended"}
        Decides its word.
    says : str
        What it is, in a sentence without a full stop.
    logs : tuple of (str, str)
        All logs that it is about, each with a remark, which may be empty.
    """

    kind: Literal["warning", "note", "mended"]
    says: str
    logs: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class LogsTold:
    """What is told of the logs.

    Attributes
    ----------
    logs : int
        How many there are.
    fates : tuple of LogFate
        Where their lines went.
    matters : tuple of LogMatter
        How they differ, and what was mended.
    """

    logs: int = 0
    fates: tuple[LogFate, ...] = ()
    matters: tuple[LogMatter, ...] = ()


@dataclass(frozen=True, slots=True)
class MatterRow:
    """A row of the table of differences and repairs.

    Attributes
    ----------
    kind, word : str
        What kind of matter it is.
    says : str
        The matter.
    number, summary : str
        How many logs it is about, in words; the same for the list of them.
    logs : Markup
        All of them; of very many, the first.
    folded : bool
        Whether the list of them is folded away.
    """

    kind: str
    word: str
    says: str
    number: str
    summary: str
    logs: Markup
    folded: bool


@dataclass(frozen=True, slots=True)
class LogsPart:
    """The part of the page.

    Attributes
    ----------
    says : str
        What it finds, in a sentence.
    number : str
        How many logs there are, in words.
    fates : tuple of (str, str, str)
        Where lines went: what, lines, logs.
    lines : str
        How many lines there are.
    matters : tuple of MatterRow
        Differences, then repairs.
    """

    says: str
    number: str
    fates: tuple[tuple[str, str, str], ...]
    lines: str
    matters: tuple[MatterRow, ...]


def collect_logs(told: LogsTold) -> LogsPart:
    """Gather what the page shows of the logs.

    Parameters
    ----------
    told : LogsTold
        What is told of them.

    Returns
    -------
    LogsPart
        Numbers in words, names escaped.
    """
    others = [matter for matter in told.matters if matter.kind != "mended"]
    differing = {log for matter in others for log, _ in matter.logs}
    number = counted(told.logs, "log")
    differ = "differs" if len(differing) == 1 else "differ"
    says = f"{count(len(differing))} of {number} {differ} from the rest"
    return LogsPart(
        says if differing else f"{number}, none unlike the rest",
        number,
        tuple((fate.what, count(fate.lines), count(fate.logs)) for fate in told.fates),
        count(sum(fate.lines for fate in told.fates)),
        tuple(
            MatterRow(
                matter.kind,
                WORDS[matter.kind],
                matter.says,
                counted(len(matter.logs), "log"),
                ("All " if len(matter.logs) <= MOST_NAMED else "")
                + counted(len(matter.logs), "log"),
                _named(matter.logs),
                len(matter.logs) > MOST_UNFOLDED,
            )
            for matter in sorted(told.matters, key=lambda one: list(WORDS).index(one.kind))
        ),
    )


def doubtful(told: LogsTold) -> list[Markup]:
    """The differences that may well be faults, for the top of the page.

    Parameters
    ----------
    told : LogsTold
        What is told of the logs.

    Returns
    -------
    list of Markup
        A sentence each; a single log is named.
    """
    return [
        Markup("{}: {}.").format(name(matter.logs[0][0]), matter.says)
        if len(matter.logs) == 1
        else Markup("{}.").format(matter.says)
        for matter in told.matters
        if matter.kind == "warning"
    ]


def _named(logs: tuple[tuple[str, str], ...]) -> Markup:
    """The logs with their remarks; of very many the rest is counted."""
    named = Markup(", ").join(
        Markup("{} ({})").format(name(log), remark) if remark else name(log)
        for log, remark in logs[:MOST_NAMED]
    )
    more = len(logs) - MOST_NAMED
    return named if more <= 0 else Markup("{} and {} more").format(named, count(more))
