"""What to expect of an outcome, in plain sentences for people who do not program."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

from etl.readiness.counts import UNIT_WORDS, OutcomeCounts
from etl.readiness.facts import (
    ALL_REGIONS,
    CellCount,
    OutcomeReadiness,
    Separation,
    Step,
    UnitCount,
    Variation,
)
from etl.readiness.ladder import FEW_LEVELS

#: This many cells are named; the rest are counted.
_MOST_NAMED = 4
#: Where more than one in so many units is constant, slopes within them have little to go by
#: (common practice, no source).
FEW_OF = 3


def sentences_of(
    facts: OutcomeReadiness, counts: OutcomeCounts, fixed: Separation | None
) -> OutcomeReadiness:
    """The facts with sentences about them.

    Parameters
    ----------
    facts : OutcomeReadiness
        All but the sentences.
    counts : OutcomeCounts
        What they were made from.
    fixed : Separation or None
        By the fixed effects of the ladder; None where there is none.

    Returns
    -------
    OutcomeReadiness
        Counts first, then what cannot be estimated, which slopes there are, where to begin.
    """
    return replace(facts, sentences=tuple(_told(facts, counts, fixed)))


def _told(
    facts: OutcomeReadiness, counts: OutcomeCounts, fixed: Separation | None
) -> Iterator[str]:
    """One sentence after the other."""
    total = facts.total
    rows = total.values + total.missing
    if not total.values:
        if not rows:
            yield "There is no row: no trial that was kept has this region."
        else:
            yield (
                f"None of {_many(rows, 'row')} has a value: the outcome is not possible here, or "
                "never was."
            )
        return
    if facts.verdict == "constant":
        value = 1 if total.ones else 0
        yield f"{_all(total.values)} {value}: there is nothing to model."
        return
    yield _counts(facts, counts)
    if facts.region == ALL_REGIONS:
        yield (
            "The study has many regions, so they are counted together: nothing in the formulas "
            "allows for what they differ in."
        )
    yield from _one_level(counts)
    yield from _empty(facts)
    if fixed is not None and fixed.kind != "none":
        yield _separated(facts.separations, fixed)
    yield from _constant(facts.units)
    yield from _unknown(counts)
    yield from _slopes(facts)
    yield from _begin(facts, counts)


def _counts(facts: OutcomeReadiness, counts: OutcomeCounts) -> str:
    """Zeros and ones, and where the rarer value is rarest."""
    total, rarer = facts.total, counts.rarer
    text = _against(total, rarer)
    cells = [cell for cell in facts.cells if cell.values]
    if len(cells) > 1:
        rarest = min(cells, key=lambda cell: (cell.ones if rarer else cell.zeros, -cell.values))
        where = _where(counts.conditions.factors, rarest.levels)
        text += f"; fewest {_word(rarer)} in {where}: {_against(rarest, rarer)}"
    return f"{text}."


def _against(cell: CellCount, rarer: int) -> str:
    """So many of one value against so many of the other, the rarer first."""
    pair = [(cell.zeros, "zero"), (cell.ones, "one")]
    return f"{_many(*pair[rarer])} against {_many(*pair[1 - rarer])}"


def _word(value: int) -> str:
    """The values in the plural."""
    return ("zeros", "ones")[value]


def _where(factors: Sequence[str], levels: Sequence[str]) -> str:
    """A cell in words."""
    return ", ".join(f"{f} = {level}" for f, level in zip(factors, levels, strict=True))


def _one_level(counts: OutcomeCounts) -> Iterator[str]:
    """Factors that are no part of the formulas."""
    for place, own in enumerate(counts.active):
        if len(own) == 1:
            name = counts.conditions.factors[place]
            level = counts.conditions.levels[place][own[0]]
            yield f"{name} has the level {level} only, so it is left out of the formulas."


def _empty(facts: OutcomeReadiness) -> Iterator[str]:
    """Combinations without values, of levels that do occur."""
    places = range(len(facts.cells[0].levels))
    there = [{cell.levels[place] for cell in facts.cells if cell.values} for place in places]
    empty = [
        cell.levels
        for cell in facts.cells
        if not cell.values and all(v in own for v, own in zip(cell.levels, there, strict=True))
    ]
    if empty:
        named = "; ".join(" × ".join(levels) for levels in empty[:_MOST_NAMED])
        more = f" and {len(empty) - _MOST_NAMED:,} more" if len(empty) > _MOST_NAMED else ""
        yield (
            f"No values in {named}{more}: R leaves a coefficient of the interaction out for each, "
            "and says that the matrix is rank deficient."
        )


def _separated(told: Sequence[Separation], fixed: Separation) -> str:
    """Which effects run off, and what can be done."""
    first = next(own for own in told if own.kind != "none")
    why = "; ".join(first.causes)
    remedy = (
        "merge levels, leave the effect out, or use a penalty or a prior (Firth 1993, "
        "doi:10.1093/biomet/80.1.27)"
    )
    if first is told[0]:
        return (
            f"Separation is {first.kind} already by {first.effects}: {why}. Estimates run off "
            f"without bound, with huge standard errors: {remedy}."
        )
    return (
        f"Separation is {fixed.kind} by {fixed.effects}: {why}. Estimates of the interaction run "
        f"off without bound, with huge standard errors; {told[0].effects} alone can be estimated. "
        f"Leave interactions out, or {remedy}."
    )


def _constant(units: Sequence[UnitCount]) -> Iterator[str]:
    """Readers and items that never differ."""
    parts = []
    for own in units:
        kinds = [(own.all_zero, "zeros"), (own.all_one, "ones")]
        for count, word in kinds if own.units > 1 else ():
            if count:
                of = f"{count:,} of {_many(own.units, UNIT_WORDS[own.unit])}"
                parts.append(f"{of} {'has' if count == 1 else 'have'} {word} only")
    if parts:
        yield f"{'; '.join(parts)}: little is learnt there of effects within."


def _unknown(counts: OutcomeCounts) -> Iterator[str]:
    """Values of which the item is not known."""
    for own in counts.units:
        lacking = int(counts.values.sum()) - int(own.values.sum())
        if lacking:
            word = UNIT_WORDS[own.unit]
            yield f"{_many(lacking, 'value')} without {word}: a formula with {own.unit} omits them."


def _slopes(facts: OutcomeReadiness) -> Iterator[str]:
    """For readers and for items, which random slopes there can be."""
    for unit in facts.units:
        own = [v for v in facts.variations if v.unit == unit.unit]
        word = UNIT_WORDS[unit.unit]
        if unit.units < 2:
            yield (f"{_many(unit.units, word)} with values: no random effects by {word}.")
            continue
        if not own:
            continue
        have = [_name(v) for v in own if v.supported]
        text = f"The design allows by-{word} slopes for {_listed(have)}" if have else ""
        lacking = [v for v in own if not v.supported and len(v.factors) == 1]
        # An interaction is told of only where the effects within it have slopes.
        have_one = {v.factors for v in own if v.supported}
        lacking += [
            v
            for v in own
            if not v.supported
            and len(v.factors) > 1
            and all(tuple(f for f in v.factors if f != g) in have_one for g in v.factors)
        ]
        for why, names in _reasons(lacking, word).items():
            listed = _listed(names)
            lead = f"; none for {listed}" if text else ""
            they = names[0] if len(names) == 1 else "these"
            verb = "does" if len(names) == 1 else "do"
            text += lead or f"The design allows no by-{word} slopes for {listed}"
            text += f": {why.format(they=they, do=verb)}"
        yield f"{text}."
        hardly = _hardly(unit, facts.total) if have else ""
        if hardly:
            yield f"{hardly}, so these by-{word} slopes will hardly be estimated."


def _hardly(unit: UnitCount, total: CellCount) -> str:
    """Why slopes that the design allows have little to go by; empty where they have something."""
    word = UNIT_WORDS[unit.unit]
    constant, value = max((unit.all_zero, "zeros"), (unit.all_one, "ones"))
    if constant * FEW_OF > unit.units:
        verb = "has" if constant == 1 else "have"
        return f"{constant:,} of {_many(unit.units, word)} {verb} {value} only"
    each = min(total.zeros, total.ones) / unit.units
    if each < 2:
        rarer = "zeros" if total.zeros < total.ones else "ones"
        return f"There are {each:.1f} {rarer} for each {word} on average"
    return ""


def _reasons(lacking: Sequence[Variation], word: str) -> dict[str, list[str]]:
    """Why slopes are not supported, and which."""
    out: dict[str, list[str]] = {}
    for own in lacking:
        if not own.several:
            why = f"each {word} has one value, so it cannot be told what varies within {word}s"
        elif own.kind == "between":
            why = f"{{they}} {{do}} not vary within {word}s"
        elif 2 * own.varying <= own.units:
            single = own.units - own.several
            why = f"{{they}} {{do}} not vary within most {word}s" + (
                f" ({single:,} of {own.units:,} have one value)" if single else ""
            )
        else:
            why = f"most {word}s have one value for each combination of levels"
        out.setdefault(why, []).append(_name(own))
    return out


def _begin(facts: OutcomeReadiness, counts: OutcomeCounts) -> Iterator[str]:
    """The maximal formula, and where to begin."""
    if not facts.ladder:
        return
    first, start = facts.ladder[0], facts.ladder[facts.start - 1]
    word = _word(counts.rarer)
    values = min(facts.total.zeros, facts.total.ones)
    text = f"The maximal formula has {_parameters(first)} on {_many(values, word[:-1])}"
    down = ""
    if start is not facts.ladder[-1]:
        down = ", and go down where it does not converge or is singular"
    if start is first and not first.expectation:
        nothing = "nothing else" if facts.verdict == "separated" else "nothing"
        yield f"{text}, and {nothing} speaks against it. Begin there{down}: {first.formula}"
        return
    yield f"{text}. {first.expectation}"
    if start is not first:
        lead = "Begin with"
        if start.expectation:
            lead = "Something speaks against every formula; the least against"
            down = ""
        yield f"{lead} step {start.number}{down}: {start.formula}"
    few = [u for u in facts.units if u.unit == "item" and 1 < u.units < FEW_LEVELS]
    for own in few:
        yield (
            f"{_many(own.units, 'item')} are too few for random effects: take item as a fixed "
            "effect, or say that the result holds for these only."
        )


def _parameters(step: Step) -> str:
    """How many parameters a formula has."""
    total = step.fixed_parameters + step.random_parameters
    parts = f"{step.fixed_parameters:,} fixed, {step.random_parameters:,} random"
    return f"{_many(total, 'parameter')} ({parts})"


def _name(variation: Variation) -> str:
    """A term in words."""
    return " × ".join(variation.factors)


def _listed(names: Sequence[str]) -> str:
    """Names with commas, and an "and" before the last."""
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def _many(count: int, word: str) -> str:
    """A count with its word."""
    return f"{count:,} {word}{'' if count == 1 else 's'}"


def _all(count: int) -> str:
    """All of so many values."""
    return f"All {count:,} values are" if count > 1 else "The only value is"
