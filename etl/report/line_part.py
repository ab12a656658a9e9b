"""What the audit page says of lines: how many trials are sure of them, and which are not."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

from etl.report.charts import Part, share_bar
from etl.report.inputs import AuditInput, UnsureTrial
from etl.report.line_trust import CLASSES, LineTally
from etl.report.wording import count, counted, listed, name, percent

#: This many trials are named.
MOST_NAMED = 24


@dataclass(frozen=True, slots=True)
class ConfidenceRow:
    """Trials with about the same confidence.

    Attributes
    ----------
    label : str
        From where to where.
    trials : str
        How many.
    bar : Markup
        Their share of all, drawn.
    """

    label: str
    trials: str
    bar: Markup


@dataclass(frozen=True, slots=True)
class LinesPart:
    """All that the page says of lines.

    Attributes
    ----------
    says : str
        How many trials are sure, in a sentence.
    method : str
        How lines were told.
    rows : tuple of ConfidenceRow
        Trials by their confidence, the most confident first; none where no method told one.
    by_hand : str
        How many trials were set by hand; empty where none was.
    unsure : Markup
        The trials that are not sure, by name, the least sure first; empty where all are.
    """

    says: str
    method: str
    rows: tuple[ConfidenceRow, ...]
    by_hand: str
    unsure: Markup


def collect_lines(given: AuditInput) -> LinesPart | None:
    """Gather what the page says of lines.

    Parameters
    ----------
    given : AuditInput
        What the page is made from.

    Returns
    -------
    LinesPart or None
        None where no trial has lines of which anything is known.
    """
    tally = given.profiles.lines
    if not tally.judged:
        return None
    by_hand = ""
    if tally.by_hand:
        verb = "trial has" if tally.by_hand == 1 else "trials have"
        by_hand = f"{count(tally.by_hand)} {verb} lines that were set by hand and count as sure."
    return LinesPart(
        says_of_lines(tally),
        _method(given.study),
        _rows(tally),
        by_hand,
        _named(given.unsure, tally.unsure),
    )


def says_of_lines(tally: LineTally) -> str:
    """How many trials are sure, in a sentence without a full stop.

    Examples
    --------
    >>> says_of_lines(LineTally(sure=10, unsure=2, by_hand=1))
    '11 of 13 trials of several lines are sure of their lines; 2 are not'
    >>> says_of_lines(LineTally(sure=1))
    'The one trial of several lines is sure of its lines'
    """
    sure = tally.sure + tally.by_hand
    if tally.judged == 1:
        verdict = "is" if sure else "is not"
        return f"The one trial of several lines {verdict} sure of its lines"
    if not tally.unsure:
        return f"All {count(tally.judged)} trials of several lines are sure of their lines"
    rest = f"{count(tally.unsure)} {'is' if tally.unsure == 1 else 'are'} not"
    verb = "is sure of its" if sure == 1 else "are sure of their"
    return f"{count(sure)} of {count(tally.judged)} trials of several lines {verb} lines; {rest}"


def lines_headline(given: AuditInput) -> tuple[str, Markup] | None:
    """What is said of lines at the top of the page: the kind of headline, and the text."""
    tally = given.profiles.lines
    if not tally.judged:
        return None
    said = says_of_lines(tally)
    if not tally.unsure:
        return "fine", Markup("{}.").format(said)
    return "lines", Markup(
        "{} ({}). Their outcomes may rest on the wrong lines: look at them, and correct them by "
        "hand or leave them out by <code>line_confidence_under</code>."
    ).format(said, percent(tally.unsure / tally.judged))


def _method(study: Mapping[str, Any]) -> str:
    """How lines were told."""
    return str((study.get("lines") or {}).get("method") or "")


def _rows(tally: LineTally) -> tuple[ConfidenceRow, ...]:
    """Trials by their confidence."""
    ends = (*CLASSES[1:], 1.0)
    told = sum(tally.classes)
    if not told:
        return ()
    return tuple(
        ConfidenceRow(
            f"{100 * low:.0f} to {100 * high:.0f}%",
            count(trials),
            share_bar([Part(None, trials)], told, height=12),
        )
        for low, high, trials in reversed(list(zip(CLASSES, ends, tally.classes, strict=True)))
    )


def _named(unsure: Sequence[UnsureTrial], every: int) -> Markup:
    """The trials that are not sure, by name."""
    shown = [
        Markup("{} trial {}{} ({})").format(
            name(one.participant),
            name(one.trial),
            Markup(" of session {}").format(name(one.session)) if one.session else "",
            percent(one.confidence),
        )
        for one in unsure[:MOST_NAMED]
    ]
    more = every - len(shown)
    if more > 0 and shown:
        shown.append(Markup("{}").format(counted(more, "more trial")))
    return listed(shown, most=len(shown) or 1)
