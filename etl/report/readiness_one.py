"""One outcome in one region as the audit page unfolds it: conditions, readers, texts, formulas."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup, escape

from etl.readiness.facts import (
    CellCount,
    CellState,
    OutcomeReadiness,
    Separation,
    Step,
    UnitCount,
    Variation,
)
from etl.report.charts import counts_bar
from etl.report.readiness_words import each_parameter, rarer
from etl.report.wording import NOTHING, count, counted, listed, name, percent

#: With more conditions than this only those with the fewest ones or zeros are shown.
MOST_CELLS = 16
#: Stands in place of what was just said of the formula before.
AGAIN = "Expect the same."
#: The state of a condition in words.
_STATES: dict[CellState, str] = {
    "": "",
    "empty": "empty",
    "all 0": "zeros only",
    "all 1": "ones only",
}
#: What units are called.
_UNITS = {"participant": "reader", "item": "item"}


@dataclass(frozen=True, slots=True)
class CellRow:
    """A condition.

    Attributes
    ----------
    levels : Markup
        A level of each factor.
    ones, zeros, missing : str
        How many there are.
    rate : str
        Share of ones; a dash where there is no value.
    interval : str
        Wilson's, in percent; empty where there is no value.
    bar : Markup
        Ones and zeros, drawn.
    state : str
        What is the matter with it; empty where nothing is.
    """

    levels: Markup
    ones: str
    zeros: str
    missing: str
    rate: str
    interval: str
    bar: Markup
    state: str


@dataclass(frozen=True, slots=True)
class Rung:
    """A formula of the ladder.

    Attributes
    ----------
    number : int
        From 1.
    formula : str
        As it is fitted, without what all formulas begin with.
    change : str
        What was taken away from the one before.
    size : str
        Parameters and random effects; ones a parameter where the expectation does not name them.
    expectation : str
        What to expect.
    start : bool
        Whether to begin with it.
    """

    number: int
    formula: str
    change: str
    size: str
    expectation: str
    start: bool


@dataclass(frozen=True, slots=True)
class One:
    """All about an outcome in a region.

    Attributes
    ----------
    rate : str
        Share of ones with its interval; empty where there is no value.
    sentences : tuple of str
        What to expect.
    cells : tuple of CellRow
        Conditions; none where there are no factors.
    cells_left : str
        What is said of conditions that are not shown; empty where all are.
    any_missing : bool
        Whether a condition has missing values.
    facts : tuple of (str, Markup)
        Readers, items, the design and separation, each with a heading.
    ladder : tuple of Rung
        From the maximal formula down.
    common : str
        With what all formulas begin, if it is left out of each.
    start : str
        Where to begin; empty without a ladder.
    start_word : str
        What stands beside that formula.
    """

    rate: str
    sentences: tuple[str, ...]
    cells: tuple[CellRow, ...]
    cells_left: str
    any_missing: bool
    facts: tuple[tuple[str, Markup], ...]
    ladder: tuple[Rung, ...]
    common: str
    start: str
    start_word: str


def collect_one(judged: OutcomeReadiness) -> One:
    """Gather all about an outcome in a region.

    Parameters
    ----------
    judged : OutcomeReadiness
        What is told of it.
    """
    # Of an outcome without any value the conditions have nothing to tell, nor has anything else.
    cells = [cell for cell in judged.cells if cell.levels and judged.total.values]
    shown = _shown(cells)
    most = max((cell.values for cell in cells), default=0)
    left = len(cells) - len(shown)
    common = _common(judged.ladder)
    return One(
        _rate(judged.total),
        judged.sentences,
        tuple(_cell(cell, most) for cell in shown),
        f"The {len(shown)} of {count(len(cells))} conditions with the fewest ones or zeros."
        if left
        else "",
        any(cell.missing for cell in shown),
        _facts(judged) if judged.total.values else (),
        _rungs(judged, common),
        common.removesuffix(" + "),
        _start(judged),
        "Start here" if judged.verdict == "ready" else "Start here, with care",
    )


def tally(cell: CellCount) -> str:
    """Ones and zeros in a few words.

    Examples
    --------
    >>> tally(CellCount((), zeros=140, ones=46, missing=0, low=0.19, high=0.31))
    '46 ones, 140 zeros'
    """
    if not cell.values:
        return f"{count(cell.missing)} missing" if cell.missing else "no rows"
    return f"{counted(cell.ones, 'one')}, {counted(cell.zeros, 'zero')}"


def _shown(cells: Sequence[CellCount]) -> list[CellCount]:
    """The conditions that are shown, in the order of the design."""
    if len(cells) <= MOST_CELLS:
        return list(cells)
    order = sorted(range(len(cells)), key=lambda place: (rarer(cells[place])[0], place))
    return [cells[place] for place in sorted(order[:MOST_CELLS])]


def _cell(cell: CellCount, most: int) -> CellRow:
    """A condition."""
    return CellRow(
        Markup(" · ").join(name(level) for level in cell.levels),
        count(cell.ones),
        count(cell.zeros),
        count(cell.missing) if cell.missing else NOTHING,
        percent(cell.rate if cell.values else None),
        _interval(cell),
        counts_bar(cell.ones, cell.zeros, most),
        _STATES[cell.state],
    )


def _interval(cell: CellCount) -> str:
    """Wilson's interval in percent."""
    return f"{100 * cell.low:.1f}–{100 * cell.high:.1f}" if cell.values else ""


def _rate(cell: CellCount) -> str:
    """A rate with its interval."""
    return f"{percent(cell.rate)} ({_interval(cell)})" if cell.values else ""


def _facts(judged: OutcomeReadiness) -> tuple[tuple[str, Markup], ...]:
    """Readers and items, what varies within them, and separation."""
    facts = []
    for unit in judged.units:
        word = f"{_UNITS.get(unit.unit, unit.unit)}s"
        facts.append((word.capitalize(), _units(unit)))
        own = [one for one in judged.variations if one.unit == unit.unit]
        if own:
            facts.append((f"Varying within {word}", _variations(own)))
    if judged.separations:
        facts.append(("Separation", _separations(judged.separations)))
    return tuple(facts)


def _units(unit: UnitCount) -> Markup:
    """How many readers, or items, are constant."""
    kinds = [
        f"{count(number)} with {word} only"
        for number, word in ((unit.all_zero, "zeros"), (unit.all_one, "ones"))
        if number
    ]
    constant = f"of which {' and '.join(kinds)}" if kinds else "none of them constant"
    return escape(f"{count(unit.units)} with values, {constant}")


def _variations(own: Sequence[Variation]) -> Markup:
    """Which factors and interactions vary within how many readers, or items."""
    constant = {one.factors[0] for one in own if one.kind == "between" and len(one.factors) == 1}
    groups: dict[str, list[tuple[str, ...]]] = {}
    for one in own:
        # Where a factor is constant, so is whatever it interacts with.
        if len(one.factors) > 1 and constant & set(one.factors):
            continue
        where = f"in {count(one.varying)} of {count(one.units)}"
        if not one.several:
            where = "cannot be told: one value each"
        elif one.kind == "between":
            where = "in none"
        elif one.kind == "within":
            where = f"in all {count(one.units)}"
        if one.kind != "between" and not one.repeated:
            where += ", but with one value for each combination of levels"
        groups.setdefault(where, []).append(one.factors)
    return Markup("; ").join(
        Markup("{} {}").format(_effects(effects), where) for where, effects in groups.items()
    )


def _effects(effects: Sequence[tuple[str, ...]]) -> Markup:
    """Factors and interactions; where all interactions of some factors are there, in a word."""
    factors = [effect[0] for effect in effects if len(effect) == 1]
    within = [effect for effect in effects if set(effect) <= set(factors)]
    if len(factors) > 2 and len(within) == len(effects) == 2 ** len(factors) - 1:
        return Markup("{} and all their interactions").format(
            Markup(", ").join(name(factor) for factor in factors)
        )
    return listed([name(" × ".join(effect)) for effect in effects], len(effects))


def _separations(separations: Sequence[Separation]) -> Markup:
    """How the factors separate zeros from ones, by which effects; what does it, is told before."""
    groups: dict[str, list[Markup]] = {}
    for one in separations:
        groups.setdefault(one.kind, []).append(Markup("<code>{}</code>").format(one.effects))
    return Markup("; ").join(
        Markup("{} by {}").format(
            escape(kind) if kind == "none" else Markup("<strong>{}</strong>").format(kind),
            listed(effects, len(effects)),
        )
        for kind, effects in groups.items()
    )


def _common(ladder: Sequence[Step]) -> str:
    """The response and the fixed effects, with which all formulas begin; empty where they differ.

    Examples
    --------
    >>> steps = [Step(1, "y ~ a + (1 + a | u)", "", 2, 3, 8, 4.0, ""),
    ...          Step(2, "y ~ a + (1 | u)", "", 2, 1, 4, 7.0, "")]
    >>> _common(steps)
    'y ~ a + '
    """
    starts = {step.formula.partition(" + (1 ")[0] for step in ladder}
    if len(starts) != 1 or any(" + (1 " not in step.formula for step in ladder):
        return ""
    return f"{starts.pop()} + "


def _rungs(judged: OutcomeReadiness, common: str) -> tuple[Rung, ...]:
    """The formulas; where the same is to be expected of one after the other, it is said once."""
    rungs, before = [], ""
    for step in judged.ladder:
        each = each_parameter(step, judged.total)
        # Separation is told above the formulas, once.
        expectation = step.expectation.removesuffix(judged.separated).rstrip()
        expected = expectation.replace(each, "")
        again = bool(expected) and expected == before and step.number != judged.start
        before = expected
        rungs.append(
            Rung(
                step.number,
                step.formula.removeprefix(common),
                step.change,
                _size(step, each if again or each not in expectation else ""),
                AGAIN if again else expectation,
                step.number == judged.start,
            )
        )
    return tuple(rungs)


def _size(step: Step, each: str) -> str:
    """Parameters and random effects of a formula."""
    size = counted(step.fixed_parameters, "fixed parameter")
    if step.random_parameters:
        random = counted(step.random_parameters, "random parameter")
        size = f"{count(step.fixed_parameters)} fixed and {random}"
    if step.random_effects:
        size += f", up to {counted(step.random_effects, 'random effect')}"
    return f"{size}, {each}" if each else size


def _start(judged: OutcomeReadiness) -> str:
    """Where to begin on the ladder."""
    if not judged.ladder:
        return ""
    last = judged.ladder[-1].number
    return f"start with formula {judged.start} of {last}" if judged.start else ""
