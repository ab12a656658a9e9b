"""From the maximal formula down to simpler ones, and what to expect of each."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from math import prod
from typing import Final

from etl.readiness.counts import UNIT_WORDS
from etl.readiness.facts import Step
from etl.readiness.terms import Term, quoted, written

#: With fewer rarer values a parameter, estimates were found to be biased (Peduzzi et al. 1996, who
#: looked at fixed effects only; that it is asked for variances too is common practice, no source).
FEW_A_PARAMETER: Final = 10
#: With fewer levels a variance among them is hardly estimated (common practice; lme4 itself can be
#: made to warn below 5).
FEW_LEVELS: Final = 5
#: With more slopes than this all of the highest order go at once.
_MOST_ONE_BY_ONE: Final = 6
#: What is said of the last step with random effects, where something speaks against it.
_SINGULAR: Final = (
    "A singular fit with the variance 0 is here the same as a logistic regression without random "
    "effects."
)


@dataclass(frozen=True, slots=True)
class Grouping:
    """Readers, or items, as a grouping of random effects.

    Attributes
    ----------
    unit : str
        The grouping column.
    levels : int
        How many have values.
    values : int
        Values whose reader or item is known: rows without are left out of the fit.
    slopes : dict of tuple of str to float
        The terms that vary within, in the order of the formula, with the rarer values behind each
        coefficient.
    """

    unit: str
    levels: int
    values: int
    slopes: Mapping[Term, float]

    @property
    def repeated(self) -> bool:
        """Whether any of them has more values than one, without which nothing tells them apart."""
        return self.values > self.levels


@dataclass(frozen=True, slots=True)
class Model:
    """What all steps of a ladder have in common.

    Attributes
    ----------
    outcome, fixed : str
        The response, and the fixed effects as in a formula; ``1`` without factors.
    coefficients : int
        Fixed effects that can be estimated, with the intercept.
    values, rarer : int
        Values, and how many there are of the rarer one.
    rarer_word : str
        ``ones`` or ``zeros``.
    columns : dict of str to tuple of str
        The numeric columns of each factor, one fewer than levels that have values.
    """

    outcome: str
    fixed: str
    coefficients: int
    values: int
    rarer: int
    rarer_word: str
    columns: Mapping[str, tuple[str, ...]]


@dataclass(frozen=True, slots=True)
class _Stage:
    """The random effects of one step."""

    change: str
    correlated: bool
    groupings: tuple[Grouping, ...]
    given_up: tuple[Grouping, ...] = ()


@dataclass(frozen=True, slots=True)
class Ladder:
    """The steps, and where to begin.

    Attributes
    ----------
    steps : tuple of Step
        From the maximal formula down.
    start : int
        Number of the step to begin with.
    free : bool
        Whether nothing speaks against that step.
    """

    steps: tuple[Step, ...]
    start: int
    free: bool


def ladder_of(model: Model, groupings: Sequence[Grouping]) -> Ladder:
    """The formulas that a design can carry, simpler and simpler.

    First correlations go; then slopes, those with the fewest rarer values behind each coefficient
    first, an interaction before the effects within it; then, with intercepts only, the items (or
    the readers, where each has one value only). A last step without random effects, a logistic
    regression, is there only where no grouping has more values than units.

    Parameters
    ----------
    model : Model
        Fixed effects, values.
    groupings : sequence of Grouping
        Readers, items; only those with two levels or more.

    Returns
    -------
    Ladder
        One step at least.

    References
    ----------
    Barr, Levy, Scheepers & Tily (2013). Random effects structure for confirmatory hypothesis
    testing: keep it maximal. Journal of Memory and Language, 68, 255-278.
    doi:10.1016/j.jml.2012.11.001: the first step.
    Bates, Kliegl, Vasishth & Baayen (2015). Parsimonious mixed models. arXiv:1506.04967; and
    Matuschek, Kliegl, Vasishth, Baayen & Bates (2017). Balancing type I error and power in linear
    mixed models. Journal of Memory and Language, 94, 305-315. doi:10.1016/j.jml.2017.01.001: why
    simpler ones.
    Peduzzi, Concato, Kemper, Holford & Feinstein (1996). A simulation study of the number of events
    per variable in logistic regression analysis. Journal of Clinical Epidemiology, 49, 1373-1379.
    doi:10.1016/S0895-4356(96)00236-3: ten of the rarer value for each fixed effect.
    """
    steps, grave = [], []
    for number, stage in enumerate(_stages(tuple(groupings)), start=1):
        step, severity = _step(model, stage, number)
        steps.append(step)
        grave.append(severity)
    if grave[-1] == 1 and "|" in steps[-1].formula:
        told = f"{steps[-1].expectation} {_SINGULAR}"
        steps[-1] = replace(steps[-1], expectation=told)
    for step, severity in zip(steps, grave, strict=True):
        if not severity:
            return Ladder(tuple(steps), step.number, free=True)
    start = len(steps)
    lost = [own for own in groupings if own.unit != _kept(groupings).unit] if groupings else []
    # Leaving items out mends nothing but a want of levels, or of values.
    if any(own.repeated and own.levels >= FEW_LEVELS for own in lost) and grave[-2] < 2:
        start -= 1
    return Ladder(tuple(steps), start, free=False)


def _kept(groupings: Sequence[Grouping]) -> Grouping:
    """The grouping that goes last: readers, unless each has one value and items have more."""
    first, last = groupings[0], groupings[-1]
    return last if last.repeated and not first.repeated else first


def _stages(groupings: tuple[Grouping, ...]) -> Iterator[_Stage]:
    """The random effects of every step."""
    yield _Stage("", correlated=True, groupings=groupings)
    left = {(own.unit, term): rarer for own in groupings for term, rarer in own.slopes.items()}
    if left:
        yield _Stage("without correlations", correlated=False, groupings=groupings)
    while left:
        gone = _next_gone(left)
        for pair in gone:
            del left[pair]
        change = _away(gone) + ("" if left else ": intercepts only")
        groupings = tuple(
            replace(own, slopes={t: r for t, r in own.slopes.items() if (own.unit, t) in left})
            for own in groupings
        )
        yield _Stage(change, correlated=False, groupings=groupings)
    if len(groupings) > 1:
        kept = _kept(groupings)
        lost = tuple(own for own in groupings if own is not kept)
        change = f"without {UNIT_WORDS[lost[0].unit]}s"
        yield _Stage(change, correlated=False, groupings=(kept,), given_up=lost)
    if groupings and not any(own.repeated for own in groupings):
        yield _Stage("without random effects", correlated=False, groupings=())


def _next_gone(left: Mapping[tuple[str, Term], float]) -> list[tuple[str, Term]]:
    """The slopes that go next."""
    order = max(len(term) for _, term in left)
    if order > 1 and len(left) > _MOST_ONE_BY_ONE:
        return [pair for pair in left if len(pair[1]) == order]
    outer = [
        (unit, term)
        for unit, term in left
        if not any(unit == u and set(term) < set(other) for u, other in left)
    ]
    places = {pair: place for place, pair in enumerate(left)}
    # Of equals the larger one goes, then that of items, then the later factor.
    return [min(outer, key=lambda pair: (left[pair], -len(pair[1]), -places[pair]))]


def _away(gone: Sequence[tuple[str, Term]]) -> str:
    """What was taken away, in words."""
    if len(gone) == 1:
        unit, term = gone[0]
        return f"without the by-{UNIT_WORDS[unit]} slope for {' × '.join(term)}"
    return f"without slopes for interactions of {len(gone[0][1])} factors"


def _step(model: Model, stage: _Stage, number: int) -> tuple[Step, int]:
    """One formula, and how much speaks against it: nothing 0, doubts 1, refusal 2."""
    parts, parameters, effects = [], 0, []
    for own in stage.groupings:
        width = 1 + sum(prod(len(model.columns[f]) for f in term) for term in own.slopes)
        correlated = stage.correlated or width == 1
        parameters += width * (width + 1) // 2 if correlated else width
        effects.append((own, own.levels * width, own.levels * (width if correlated else 1)))
        names = {f: (quoted(f),) if stage.correlated else model.columns[f] for f in model.columns}
        inner = written(list(own.slopes), names)
        bar = "|" if correlated else "||"
        parts.append(f"({'1 + ' + inner if inner else '1'} {bar} {quoted(own.unit)})")
    each = model.rarer / (model.coefficients + parameters)
    expectation, severity = _expectation(model, stage, effects, each)
    return (
        Step(
            number,
            f"{quoted(model.outcome)} ~ {' + '.join([model.fixed, *parts])}",
            stage.change,
            model.coefficients,
            parameters,
            max((total for _, total, _ in effects), default=0),
            each,
            expectation,
        ),
        severity,
    )


def _expectation(
    model: Model, stage: _Stage, effects: Sequence[tuple[Grouping, int, int]], each: float
) -> tuple[str, int]:
    """What speaks against a formula, and how much."""
    values = min([own.values for own in stage.groupings], default=model.values)
    # lme4, checkZdims as glmer calls it: more random effects in one term than values.
    refused = [
        f"{total:,} random effects by {UNIT_WORDS[own.unit]}"
        for own, total, term in effects
        if term > values
    ]
    if refused:
        return f"lme4 refuses it: {' and '.join(refused)}, but {values:,} values.", 2
    told: list[str] = []
    for own, total, _ in effects:
        word = UNIT_WORDS[own.unit]
        if total >= values:
            told.append(
                f"{total:,} random effects by {word} cannot be told apart by {values:,} values"
            )
        if own.levels < FEW_LEVELS:
            told.append(f"{own.levels:,} {word}s are too few to estimate how much {word}s differ")
    if each < FEW_A_PARAMETER:
        likely = "estimates are unsure, and tend to be too large"
        if any(own.slopes for own in stage.groupings):
            often = "likely" if each < FEW_A_PARAMETER / 2 else "apt"
            likely = f"it is {often} not to converge, or to be singular"
        told.append(
            f"with {each:.1f} {model.rarer_word} a parameter, where {FEW_A_PARAMETER} for each "
            f"fixed effect are asked for, {likely}"
        )
    told += [
        f"what {UNIT_WORDS[own.unit]}s have in common is taken for chance, so effects look surer "
        "than they are"
        for own in stage.given_up
        if own.repeated and own.levels >= FEW_LEVELS
    ]
    if not stage.groupings:
        why = "nothing to group by"
        if stage.change:
            why = "no random effect can be told from the scatter of single values"
        told.append(f"{why}: a logistic regression (glm), not a mixed one")
    if not told:
        return "", 0
    text = "; ".join(told)
    return f"{text[0].upper()}{text[1:]}.", 1
