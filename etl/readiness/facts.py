"""What is told of an outcome before anybody fits a model to it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

#: What can be the matter with a cell of the design; empty where it has zeros and ones.
CellState = Literal["", "empty", "all 0", "all 1"]
#: How far an outcome in a region can be taken, from worst to best.
Verdict = Literal["no values", "constant", "separated", "sparse", "ready"]
VERDICTS: tuple[Verdict, ...] = ("no values", "constant", "separated", "sparse", "ready")
#: By which rule a verdict is given.
VERDICT_RULES: dict[Verdict, str] = {
    "no values": "no row has a value",
    "constant": "every value is 0, or every value is 1",
    "separated": "the fixed effects of the ladder predict the outcome without error somewhere",
    "sparse": "something speaks against every step of the ladder",
    "ready": "there is a step of the ladder that nothing speaks against",
}
#: What regions are called where they are counted together.
ALL_REGIONS = "(all regions)"
#: What holds of the rows of every outcome.
ROWS_REMARK = (
    "Rows of one reader are not independent, nor are rows of one item, nor the regions of one "
    "trial, which rest on the same fixations: random effects by reader and by item allow for the "
    "first two, and nothing in a formula for one region allows for the third, so effects found in "
    "several regions or outcomes of the same trials are not separate pieces of evidence."
)


@dataclass(frozen=True, slots=True)
class CellCount:
    """Zeros and ones in one combination of the factors, or in all of them.

    Attributes
    ----------
    levels : tuple of str
        A level of each factor; empty for all combinations together.
    zeros, ones, missing : int
        Rows by their value; missing ones have a reason in place of a value.
    low, high : float
        Wilson's interval of 95 % for the rate; NaN where there is no value.
    """

    levels: tuple[str, ...]
    zeros: int
    ones: int
    missing: int
    low: float
    high: float

    @property
    def values(self) -> int:
        """How many values there are."""
        return self.zeros + self.ones

    @property
    def rate(self) -> float:
        """Share of ones; NaN where there is no value."""
        return self.ones / self.values if self.values else float("nan")

    @property
    def state(self) -> CellState:
        """What is the matter with the cell."""
        if not self.values:
            return "empty"
        if not self.ones:
            return "all 0"
        return "" if self.zeros else "all 1"


@dataclass(frozen=True, slots=True)
class UnitCount:
    """Readers, or items, with values of an outcome.

    Attributes
    ----------
    unit : {"participant", "item"}
        What is counted.
    units : int
        How many have any value.
    all_zero, all_one : int
        How many of them have one value only.
    """

    unit: str
    units: int
    all_zero: int
    all_one: int


@dataclass(frozen=True, slots=True)
class Variation:
    """Whether a factor, or an interaction, varies within readers or within items.

    Attributes
    ----------
    factors : tuple of str
        One factor, or those of an interaction.
    unit : {"participant", "item"}
        Within what.
    kind : {"within", "between", "within some"}
        Varies within all of them, within none, within some.
    varying, units : int
        In how many it varies, of all that have a value.
    repeated : bool
        Whether units have more values than combinations of levels, so that a slope can be told
        from the scatter of single values.
    several : int
        How many of them have two values or more: within the others nothing can vary. Where none
        has, nothing varies within, but whether it would cannot be told.
    """

    factors: tuple[str, ...]
    unit: str
    kind: Literal["within", "between", "within some"]
    varying: int
    units: int
    repeated: bool
    several: int

    @property
    def supported(self) -> bool:
        """Whether the design allows a random slope: within all or most units, and repeated."""
        return self.repeated and 2 * self.varying > self.units


@dataclass(frozen=True, slots=True)
class Separation:
    """Whether a model's fixed effects predict the outcome without error somewhere.

    Attributes
    ----------
    effects : str
        The fixed effects, as in a formula: ``cue + fit``, ``cue * fit``.
    kind : {"none", "quasi-complete", "complete"}
        Where it is not none, some estimates run off to infinity.
    causes : tuple of str
        What does it, in words: cells and levels that have zeros only, or ones only.
    """

    effects: str
    kind: Literal["none", "quasi-complete", "complete"]
    causes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Step:
    """One formula of the ladder.

    Attributes
    ----------
    number : int
        From 1, the maximal one.
    formula : str
        As lme4 writes it.
    change : str
        What was taken away from the step before.
    fixed_parameters, random_parameters : int
        Coefficients; variances with their correlations.
    random_effects : int
        The largest number of random effects that one grouping has: units times coefficients.
        More than there are values cannot be told apart.
    ones_per_parameter : float
        Ones (or zeros, where they are rarer) for each parameter.
    expectation : str
        What to expect of it, in a sentence or two; empty where nothing speaks against it.
    """

    number: int
    formula: str
    change: str
    fixed_parameters: int
    random_parameters: int
    random_effects: int
    ones_per_parameter: float
    expectation: str


@dataclass(frozen=True, slots=True)
class OutcomeReadiness:
    """One binary outcome in one region.

    Attributes
    ----------
    outcome : str
        Its name.
    region : str
        The region; empty for an outcome of trials.
    total : CellCount
        All combinations together.
    cells : tuple of CellCount
        Every combination of the factors' levels, also empty ones.
    units : tuple of UnitCount
        Readers; items where the study knows them.
    variations : tuple of Variation
        Factors and interactions, within readers and within items.
    separations : tuple of Separation
        Main effects first, all interactions last.
    ladder : tuple of Step
        From the maximal formula down; empty where nothing can be fitted.
    start : int
        Number of the first step that nothing speaks against. Where there is none, of the simplest
        one that keeps all groupings, or of the last where these have too few levels; 0 without a
        ladder. Separation by the fixed effects counts for nothing here: it is there at every step.
    verdict : {"no values", "constant", "separated", "sparse", "ready"}
        The worst that can be said.
    sentences : tuple of str
        What to expect, in plain sentences.
    cell_units : tuple of tuple of UnitCount
        For each of ``cells``, readers (and items) with values there.
    why : str
        What the verdict rests on, in a sentence.
    separated : str
        With what the expectation of each step ends where its fixed effects separate the outcome;
        else empty.
    """

    outcome: str
    region: str
    total: CellCount
    cells: tuple[CellCount, ...]
    units: tuple[UnitCount, ...]
    variations: tuple[Variation, ...]
    separations: tuple[Separation, ...]
    ladder: tuple[Step, ...]
    start: int
    verdict: Verdict
    sentences: tuple[str, ...]
    cell_units: tuple[tuple[UnitCount, ...], ...] = ()
    why: str = ""
    separated: str = ""


@dataclass(frozen=True, slots=True)
class Dependence:
    """Two outcomes that share fixations by design.

    Attributes
    ----------
    first, second : str
        Names of outcomes.
    why : str
        What they share, in a sentence.
    """

    first: str
    second: str
    why: str


@dataclass(frozen=True, slots=True)
class Readiness:
    """All binary outcomes of a study.

    Attributes
    ----------
    factors : tuple of str
        The factors by which cells are made, in the order of ``CellCount.levels``.
    outcomes : tuple of OutcomeReadiness
        Outcomes of regions in the order of the catalogue, each over the study's regions;
        then those of trials.
    dependences : tuple of Dependence
        Among all outcomes that the study asks for.
    together : bool
        Whether regions are so many that they are counted together, as "(all regions)".
    """

    factors: tuple[str, ...]
    outcomes: tuple[OutcomeReadiness, ...]
    dependences: tuple[Dependence, ...]
    together: bool
