"""How ready the outcomes are for a model, in a sentence, and the gravest things in plain words."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from etl.readiness.facts import (
    ALL_REGIONS,
    CellCount,
    OutcomeReadiness,
    Readiness,
    Step,
    Verdict,
)
from etl.report.wording import count, counted

#: What is grave, the gravest first. An outcome without values is not: of a first region there can
#: be no regression out, whatever the readers do.
_GRAVE: tuple[Verdict, ...] = ("constant", "separated", "sparse")
_IS: dict[Verdict, str] = {
    "ready": "can carry a model as it is",
    "sparse": "is sparse",
    "separated": "is separated by the factors",
    "constant": "cannot be fitted, because it is constant",
    "no values": "cannot be fitted, because it has no values",
}
_ARE: dict[Verdict, str] = {
    "ready": "can carry a model as they are",
    "sparse": "are sparse",
    "separated": "are separated by the factors",
    "constant": "cannot be fitted, because they are constant",
    "no values": "cannot be fitted, because they have no values",
}


@dataclass(frozen=True, slots=True)
class Grave:
    """One of the gravest things.

    Attributes
    ----------
    place : int
        Of the outcome in ``Readiness.outcomes``.
    judged : OutcomeReadiness
        The outcome.
    says : str
        What is the matter, with numbers, in a sentence without a full stop.
    """

    place: int
    judged: OutcomeReadiness
    says: str


def summed_up(readiness: Readiness) -> str:
    """How far the outcomes can be taken, in a sentence.

    Parameters
    ----------
    readiness : Readiness
        What is told of the outcomes.

    Returns
    -------
    str
        With the number of outcomes of each verdict; those without values and the constant ones
        are one number with both beside it.

    Examples
    --------
    >>> summed_up(Readiness((), (), (), False))
    'The study asks for no binary outcome.'
    """
    outcomes = readiness.outcomes
    if not outcomes:
        return "The study asks for no binary outcome."
    kinds = Counter(one.verdict for one in outcomes)
    scope = _scope(readiness)
    if len(kinds) == 1:
        (verdict,) = kinds
        if len(outcomes) == 1:
            return f"The one binary outcome{scope} {_IS[verdict]}{_maximal(outcomes)}."
        return (
            f"All {count(len(outcomes))} binary outcomes{scope} "
            f"{_ARE[verdict]}{_maximal(outcomes)}."
        )
    parts = [
        f"{count(kinds[verdict])} {_are(verdict, kinds[verdict])}"
        + (_maximal(outcomes) if verdict == "ready" else "")
        for verdict in ("ready", "sparse", "separated")
        if kinds[verdict]
    ]
    unfit = kinds["constant"] + kinds["no values"]
    if unfit:
        parts.append(f"{count(unfit)} cannot be fitted{_unfit(kinds)}")
    said = f"{', '.join(parts[:-1])} and {parts[-1]}" if len(parts) > 1 else parts[0]
    return f"Of {count(len(outcomes))} binary outcomes{scope}, {said}."


def _are(verdict: Verdict, number: int) -> str:
    """A verdict on some outcomes."""
    return (_IS if number == 1 else _ARE)[verdict]


def _unfit(kinds: Counter[Verdict]) -> str:
    """Why some cannot be fitted."""
    constant, empty = kinds["constant"], kinds["no values"]
    if not empty:
        return " (constant)"
    if not constant:
        return " (no values)"
    return f" ({count(constant)} constant, {count(empty)} without values)"


def _scope(readiness: Readiness) -> str:
    """What the outcomes are of."""
    levels = {bool(one.region) for one in readiness.outcomes}
    if levels == {False}:
        return " of whole trials"
    by = " over all regions together" if readiness.together else " by region"
    return by if levels == {True} else f"{by} or of whole trials"


def _maximal(outcomes: Sequence[OutcomeReadiness]) -> str:
    """How many of those that are ready begin with the maximal formula."""
    ready = [one for one in outcomes if one.verdict == "ready"]
    if not ready:
        return ""
    maximal = sum(one.start == 1 for one in ready)
    if not maximal:
        return " (a smaller one than the maximal)"
    if maximal == len(ready):
        return " (the maximal one)"
    return f" ({count(maximal)} the maximal one, {count(len(ready) - maximal)} a smaller one)"


def gravest(readiness: Readiness) -> tuple[Grave, ...]:
    """What is the matter with the outcomes that a model will not take as they are.

    Parameters
    ----------
    readiness : Readiness
        What is told of the outcomes.

    Returns
    -------
    tuple of Grave
        Constant ones first, then separated ones, then sparse ones; among the like those with the
        fewest ones, or zeros where they are rarer, first.
    """
    found = [(place, one) for place, one in enumerate(readiness.outcomes) if one.verdict in _GRAVE]
    found.sort(key=lambda pair: (_GRAVE.index(pair[1].verdict), rarer(pair[1].total)[0], pair[0]))
    return tuple(Grave(place, one, _says(one)) for place, one in found)


def rarer(cell: CellCount) -> tuple[int, str]:
    """How often the rarer value occurs, and what it is called; ones where both are as rare.

    Parameters
    ----------
    cell : CellCount
        Zeros and ones.

    Returns
    -------
    tuple of int and str
        With ``one`` or ``zero``.

    Examples
    --------
    >>> rarer(CellCount((), zeros=3, ones=9, missing=0, low=0.47, high=0.91))
    (3, 'zero')
    """
    return (cell.ones, "one") if cell.ones <= cell.zeros else (cell.zeros, "zero")


def against(cell: CellCount) -> str:
    """The rarer value against the other.

    Parameters
    ----------
    cell : CellCount
        Zeros and ones.

    Returns
    -------
    str
        Such as ``9 ones against 743 zeros``.

    Examples
    --------
    >>> against(CellCount((), zeros=140, ones=46, missing=0, low=0.19, high=0.31))
    '46 ones against 140 zeros'
    """
    ones, zeros = counted(cell.ones, "one"), _zeros(cell.zeros)
    return f"{ones} against {zeros}" if cell.ones <= cell.zeros else f"{zeros} against {ones}"


def each_parameter(step: Step, total: CellCount) -> str:
    """How many of the rarer value stand behind each parameter of a formula.

    Parameters
    ----------
    step : Step
        The formula.
    total : CellCount
        Zeros and ones.

    Returns
    -------
    str
        Such as ``2.8 ones a parameter``.
    """
    return f"{step.ones_per_parameter:,.1f} {rarer(total)[1]}s a parameter"


def _zeros(number: int) -> str:
    """A number of zeros."""
    return counted(number, "zero")


def region_of(judged: OutcomeReadiness) -> str:
    """The region of an outcome as it is worth naming.

    Parameters
    ----------
    judged : OutcomeReadiness
        What is told of it.

    Returns
    -------
    str
        Empty for an outcome of trials, and where regions are taken together.
    """
    return "" if judged.region == ALL_REGIONS else judged.region


def _says(one: OutcomeReadiness) -> str:
    """What is the matter with an outcome, with numbers."""
    if one.verdict == "constant":
        value = "1" if one.total.ones else "0"
        if one.total.values == 1:
            return f"its one value is {value}"
        return f"all {count(one.total.values)} values are {value}"
    said = against(one.total)
    if one.verdict == "separated":
        return f"{said}{_separated(one)}"
    if one.start:
        step = one.ladder[one.start - 1]
        formula = f"formula {one.start} of {len(one.ladder)}"
        few = each_parameter(step, one.total)
        if few in step.expectation:
            said += f"; {few} even in {formula}"
        else:
            doubt = f"{step.expectation[:1].lower()}{step.expectation[1:]}".rstrip(".")
            said += f"; even for {formula}: {doubt}"
    return said


def _separated(one: OutcomeReadiness) -> str:
    """What separates: the first cause by the fewest effects that do."""
    causes = next((s.causes for s in one.separations if s.kind != "none"), ())
    if not causes:
        return ""
    return f"; {causes[0]}{', for instance' if len(causes) > 1 else ''}"
