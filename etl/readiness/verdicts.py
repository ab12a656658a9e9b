"""Verdicts, and what they rest on, in few words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from etl.readiness.facts import OutcomeReadiness, Separation, Verdict
from etl.readiness.ladder import Ladder

#: This many causes of a separation are named in few words; the rest are counted.
_MOST_NAMED = 2
_PENALISED = "a penalised fit (Firth 1993, doi:10.1093/biomet/80.1.27)"


def separation_of_the_ladder(told: Sequence[Separation], order: int) -> Separation | None:
    """The separation by the fixed effects that the formulas have.

    Parameters
    ----------
    told : sequence of Separation
        Main effects first, all interactions last.
    order : int
        Of how many factors the interactions of the formulas go up to.

    Returns
    -------
    Separation or None
        None where no factor varies.
    """
    return told[min(order, len(told)) - 1] if order < len(told) else (told[-1] if told else None)


def verdict_of(zeros: int, ones: int, fixed: Separation | None, ladder: Ladder) -> Verdict:
    """The worst that can be said, by the rules of ``VERDICT_RULES``.

    Parameters
    ----------
    zeros, ones : int
        How often each value occurs.
    fixed : Separation or None
        By the fixed effects of the ladder.
    ladder : Ladder
        The formulas, and whether nothing speaks against one of them.

    Examples
    --------
    >>> verdict_of(9, 0, None, Ladder((), 0, free=False))
    'constant'
    """
    if not zeros + ones:
        return "no values"
    if not (zeros and ones):
        return "constant"
    if fixed is not None and fixed.kind != "none":
        return "separated"
    return "ready" if ladder.free else "sparse"


def with_reasons(facts: OutcomeReadiness, fixed: Separation | None) -> OutcomeReadiness:
    """The facts with what the verdict rests on, and separation told at every step.

    Parameters
    ----------
    facts : OutcomeReadiness
        With its sentences; what is expected of steps knows nothing of separation yet.
    fixed : Separation or None
        By the fixed effects of the ladder.

    Returns
    -------
    OutcomeReadiness
        With ``why`` and, where it is separated, ``separated`` and steps that end with it. The
        fixed effects stay as they are: which of them to give up is the question of the study.

    References
    ----------
    Firth (1993). Bias reduction of maximum likelihood estimates. Biometrika, 80, 27-38.
    doi:10.1093/biomet/80.1.27
    """
    if facts.verdict != "separated" or fixed is None:
        return replace(facts, why=_why(facts))
    note = _separated(facts.separations, fixed)
    steps = tuple(
        replace(step, expectation=f"{step.expectation} {note}".lstrip()) for step in facts.ladder
    )
    first = _first(facts.separations)
    by = f"{fixed.kind} by {fixed.effects}"
    if first is facts.separations[0]:
        by = f"{first.kind} already by {first.effects}"
    why = f"Separation is {by}: {_named(first.causes)}."
    return replace(facts, ladder=steps, why=why, separated=note)


def _why(facts: OutcomeReadiness) -> str:
    """What a verdict other than separated rests on."""
    if not facts.ladder:
        return facts.sentences[0]
    start = facts.ladder[facts.start - 1]
    place = f"step {start.number} of {len(facts.ladder)}"
    if facts.verdict == "ready":
        return f"Nothing speaks against {place}{', the maximal formula' * (start.number == 1)}."
    return f"Even of {place}: {start.expectation[:1].lower()}{start.expectation[1:]}"


def _first(told: Sequence[Separation]) -> Separation:
    """The separation by the fewest effects that do."""
    return next(own for own in told if own.kind != "none")


def _named(causes: Sequence[str]) -> str:
    """Causes in few words."""
    more = len(causes) - _MOST_NAMED
    return "; ".join(causes[:_MOST_NAMED]) + (f"; and {more:,} more" if more > 0 else "")


def _separated(told: Sequence[Separation], fixed: Separation) -> str:
    """What separates, and what can be estimated nevertheless."""
    fewer = [own.effects for own in told[: told.index(fixed)] if own.kind == "none"]
    estimable = f"{_PENALISED[:1].upper()}{_PENALISED[1:]} can be estimated."
    if fewer:
        estimable = f"Fewer interactions ({fewer[-1]}) can be estimated, or {_PENALISED}."
    return f"Separated: {_named(_first(told).causes)}; estimates run off. {estimable}"
