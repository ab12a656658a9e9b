"""Readiness made by hand, so that the page is checked against facts of every kind."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import product

from etl.readiness.facts import (
    ALL_REGIONS,
    CellCount,
    Dependence,
    OutcomeReadiness,
    Readiness,
    Separation,
    Step,
    UnitCount,
    Variation,
)
from etl.readiness.intervals import wilson_interval

FACTORS = {"cue": ("early", "late"), "fit": ("fitting", "odd")}
FEW = "With 2.0 ones a parameter it is not likely to converge, or will be singular."
SKIPPED = Dependence("first_pass_skip", "fixated", "first_pass_skip = 0 means that fixated = 1")
ON_FIRST_LOOK = "both rest on the fixations of the first pass"
DEPENDENCES = (
    SKIPPED,
    Dependence("first_pass_skip", "first_pass_time", ON_FIRST_LOOK),
    Dependence("first_pass_skip", "go_past_time", ON_FIRST_LOOK),
    Dependence("fixated", "total_time", ON_FIRST_LOOK),
)


def cell(levels: Sequence[str], zeros: int, ones: int, missing: int = 0) -> CellCount:
    """A condition with its interval."""
    n = zeros + ones
    low, high = wilson_interval(ones, n) if n else (float("nan"), float("nan"))
    return CellCount(tuple(levels), zeros, ones, missing, low, high)


def total(cells: Sequence[CellCount]) -> CellCount:
    """All conditions together."""
    return cell(
        (), *(sum(getattr(c, kind) for c in cells) for kind in ("zeros", "ones", "missing"))
    )


def four(*counts: tuple[int, ...]) -> tuple[CellCount, ...]:
    """The four conditions of the two factors: zeros, ones and missing of each."""
    return tuple(
        cell(levels, *own) for levels, own in zip(product(*FACTORS.values()), counts, strict=True)
    )


def steps(outcome: str, *expectations: str) -> tuple[Step, ...]:
    """A ladder of three formulas."""
    fixed = f"{outcome} ~ cue * fit + "
    random = "(1 + cue * fit | participant) + (1 + cue | item)"
    return (
        Step(1, fixed + random, "", 4, 13, 96, 4.5, expectations[0]),
        Step(
            2,
            fixed + "(1 + cue_late || participant) + (1 | item)",
            "without correlations",
            *(4, 3, 48, 11.0, expectations[1]),
        ),
        Step(
            3, fixed + "(1 | participant)", "without items", 4, 1, 24, 15.4, expectations[2]
        ),
    )  # fmt: skip


#: What every study of the two factors has; the second does not vary within items.
UNITS = (UnitCount("participant", 24, 3, 0), UnitCount("item", 32, 0, 0))
VARIATIONS = (
    Variation(("cue",), "participant", "within", 24, 24, repeated=True, several=24),
    Variation(("fit",), "participant", "within some", 20, 24, repeated=True, several=24),
    Variation(("cue", "fit"), "participant", "within", 24, 24, repeated=False, several=24),
    Variation(("cue",), "item", "within", 32, 32, repeated=True, several=32),
    Variation(("fit",), "item", "between", 0, 32, repeated=False, several=32),
    Variation(("cue", "fit"), "item", "between", 0, 32, repeated=False, several=32),
)

READY = OutcomeReadiness(
    "first_pass_skip",
    "verb",
    total(four((40, 20), (41, 19), (38, 21, 1), (44, 17))),
    four((40, 20), (41, 19), (38, 21, 1), (44, 17)),
    UNITS,
    VARIATIONS,
    (Separation("cue + fit", "none", ()), Separation("cue * fit", "none", ())),
    steps("first_pass_skip", "With 4.5 ones a parameter it may not converge.", "", ""),
    2,
    "ready",
    ("77 ones against 163 zeros.", "Begin with step 2."),
)
_SPARSE = four((58, 2), (57, 3), (59, 1), (56, 4))
SPARSE = replace(
    READY,
    region="place",
    total=total(_SPARSE),
    cells=_SPARSE,
    ladder=tuple(replace(step, ones_per_parameter=2.0, expectation=FEW) for step in READY.ladder),
    start=3,
    verdict="sparse",
    sentences=("10 ones against 230 zeros.",),
)
_SEPARATED = four((58, 2), (60, 0), (57, 3), (0, 0))
SEPARATED = replace(
    SPARSE,
    region="topic",
    total=total(_SEPARATED),
    cells=_SEPARATED,
    separations=(
        Separation("cue + fit", "none", ()),
        Separation(
            "cue * fit", "quasi-complete", ("cue = early × fit = odd has zeros only", "and more")
        ),
    ),
    verdict="separated",
    sentences=("Separation is quasi-complete by cue * fit.",),
)
_CONSTANT = four((60, 0), (60, 0), (59, 0, 1), (60, 0))
CONSTANT = replace(
    READY,
    region="end",
    total=total(_CONSTANT),
    cells=_CONSTANT,
    separations=(),
    ladder=(),
    start=0,
    verdict="constant",
    sentences=("All 239 values are 0: there is nothing to model.",),
)
_EMPTY = four((0, 0, 60), (0, 0, 60), (0, 0, 60), (0, 0, 60))
EMPTY = replace(
    CONSTANT,
    region="start",
    total=total(_EMPTY),
    cells=_EMPTY,
    units=(UnitCount("participant", 0, 0, 0), UnitCount("item", 0, 0, 0)),
    variations=(),
    verdict="no values",
    sentences=("None of 240 rows has a value.",),
)
OF_TRIALS = replace(
    READY, outcome="any_skip", region="", ladder=steps("any_skip", "", "", ""), start=1
)

#: One outcome of each verdict, and one of trials.
EVERY = Readiness(
    tuple(FACTORS), (READY, SPARSE, SEPARATED, CONSTANT, EMPTY, OF_TRIALS), DEPENDENCES, False
)


def without_factors(judged: OutcomeReadiness) -> OutcomeReadiness:
    """The same outcome of a study that names no factors."""
    formula = f"{judged.outcome} ~ 1 + (1 | participant)"
    return replace(
        judged,
        cells=(judged.total,),
        variations=(),
        separations=(),
        ladder=(Step(1, formula, "", 1, 1, 24, 38.5, ""),),
        start=1,
    )


def without_items(judged: OutcomeReadiness) -> OutcomeReadiness:
    """The same outcome of a study that knows no items."""
    return replace(
        judged,
        units=judged.units[:1],
        variations=tuple(v for v in judged.variations if v.unit == "participant"),
    )


#: Two outcomes over all regions together, in a study without factors and items.
TOGETHER = Readiness(
    (),
    tuple(
        without_items(without_factors(replace(READY, outcome=name, region=ALL_REGIONS)))
        for name in ("first_pass_skip", "fixated")
    ),
    (),
    True,
)


def many(regions: int, outcomes: int) -> Readiness:
    """A study of many regions and outcomes, sparse and ready in turn."""
    judged = [
        replace(
            (READY, SPARSE)[(place + number) % 2], outcome=f"outcome_{number}", region=f"w{place}"
        )
        for number in range(outcomes)
        for place in range(regions)
    ]  # fmt: skip
    return Readiness(tuple(FACTORS), tuple(judged), DEPENDENCES, False)


def named(text: str) -> Readiness:
    """A study whose factors, levels and regions are called like this."""
    levels = [(f"{text} {a}", f"{text} {b}") for a, b in product("01", "01")]
    cells = tuple(
        replace(own, levels=pair) for own, pair in zip(SEPARATED.cells, levels, strict=True)
    )
    effects = f"`{text}` * `{text}`"
    judged = replace(
        SEPARATED,
        region=f"{text} a",
        cells=cells,
        variations=(replace(VARIATIONS[0], factors=(text,)),),
        separations=(
            Separation(effects, "complete", (f"{text} = {text} 0 has zeros only",)),
        ),
        ladder=tuple(
            replace(step, formula=f"first_pass_skip ~ {effects} + (1 | participant)", change=text,
                    expectation=text)
            for step in SEPARATED.ladder
        ),
        sentences=(text,),
    )  # fmt: skip
    other = replace(judged, region=f"{text} b")
    return Readiness((text, text), (judged, other), (Dependence(text, text, text + "!"),), False)
