"""How often binary outcomes were 1, by condition and region, with intervals; missing values."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from markupsafe import Markup

from etl.readiness.intervals import wilson_interval
from etl.report import charts
from etl.report.counts import Ints, binary_measures, conditions
from etl.report.inputs import AuditInput
from etl.report.wording import NOTHING, count, percent

#: With more region names than this they are taken together: a study in which every word is a
#: region has more rows than anybody looks at, and "w17" is another word in every text.
MOST_REGIONS = 20
#: With more combinations of levels than this only the levels of each factor are shown.
MOST_COMBINATIONS = 12
ALL_REGIONS = "all regions"
ALL_TRIALS = "all trials"


@dataclass(frozen=True, slots=True)
class Rate:
    """How often an outcome was 1 somewhere.

    Attributes
    ----------
    ones, n : int
        Values that are 1, and all values.
    share : str
        In percent; a dash where there is no value.
    interval : str
        Wilson's, 95 %, in percent; empty where there is no value.
    low, high : float
        Its limits, as shares.
    """

    ones: int
    n: int
    share: str
    interval: str
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class RateRow:
    """A region of an outcome.

    Attributes
    ----------
    region : str
        Its name.
    drawings : tuple of Markup
        A panel each.
    rates : tuple of Rate
        A level of a factor each, panels one after the other.
    combined : tuple of Rate
        A combination of levels each.
    """

    region: str
    drawings: tuple[Markup, ...]
    rates: tuple[Rate, ...]
    combined: tuple[Rate, ...]


@dataclass(frozen=True, slots=True)
class OutcomeRates:
    """One binary outcome.

    Attributes
    ----------
    name, definition : str
        From the catalogue.
    rows : tuple of RateRow
        A region each.
    axis : Markup
        Of the panels.
    """

    name: str
    definition: str
    rows: tuple[RateRow, ...]
    axis: Markup


@dataclass(frozen=True, slots=True)
class Panel:
    """The levels that are drawn beside one another.

    Attributes
    ----------
    factor : str
        The factor.
    levels : tuple of (Markup, str)
        Shape and name of each level.
    """

    factor: str
    levels: tuple[tuple[Markup, str], ...]


@dataclass(frozen=True, slots=True)
class MissingRow:
    """How many cells of an outcome have a value, and how many have none for which reason.

    Attributes
    ----------
    name : str
        Of the outcome.
    counts : tuple of str
        With a value first, then by reason; a dash for 0.
    values : tuple of int
        The same in figures.
    """

    name: str
    counts: tuple[str, ...]
    values: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Rates:
    """All that the page says of outcomes.

    Attributes
    ----------
    panels : tuple of Panel
        A factor each; one of all trials in a study without factors.
    combinations : tuple of str
        Names of combinations of levels; empty with fewer than two factors, or too many of them.
    outcomes : tuple of OutcomeRates
        The binary outcomes asked for.
    pooled : int
        How many region names were taken together; 0 where each has a row.
    reasons : tuple of (str, str)
        Reasons for missing values that occur, with their meaning.
    missing : tuple of MissingRow
        An outcome each.
    """

    panels: tuple[Panel, ...]
    combinations: tuple[str, ...]
    outcomes: tuple[OutcomeRates, ...]
    pooled: int
    reasons: tuple[tuple[str, str], ...]
    missing: tuple[MissingRow, ...]


@dataclass(frozen=True, slots=True)
class _Grid:
    """Counts by region, group of conditions and outcome."""

    ones: Ints
    n: Ints


def collect_rates(given: AuditInput) -> Rates:
    """Work out rates and their intervals.

    Parameters
    ----------
    given : AuditInput
        What the page is made from.
    """
    design = given.design
    factors = design.factors
    pooled = len(design.regions) if len(design.regions) > MOST_REGIONS else 0
    panels = tuple(_panel(name, levels) for name, levels in factors.items())
    if not panels:
        panels = (Panel("", ((charts.marker(0), ALL_TRIALS),)),)
    every = conditions(design)
    groups = [
        [i for i, cell in enumerate(every) if cell[place] == level]
        for place, levels in enumerate(factors.values())
        for level in range(len(levels))
    ] or [[0]]
    combine = len(factors) > 1 and len(every) <= MOST_COMBINATIONS
    names = [" · ".join(cell) for cell in product(*factors.values())] if combine else []
    by_level = _grid(given, groups, pooled=bool(pooled))
    combined = _grid(given, [[i] for i in range(len(names))], pooled=bool(pooled))
    regions = (ALL_REGIONS,) if pooled else design.regions
    definitions = {m.name: m.definition for m in design.measures}
    outcomes = tuple(
        _outcome(
            (name, definitions[name]),
            regions,
            panels,
            tuple(_rates(grid, column) for grid in (by_level, combined)),
        )
        for column, name in enumerate(binary_measures(design))
    )
    return Rates(panels, tuple(names), outcomes, pooled, *_missing(given))


def _panel(factor: str, levels: Sequence[str]) -> Panel:
    """The legend of one factor."""
    return Panel(factor, tuple((charts.marker(i), level) for i, level in enumerate(levels)))


def _grid(given: AuditInput, groups: Sequence[Sequence[int]], *, pooled: bool) -> _Grid:
    """Sum the counts over groups of conditions, and over regions where they are pooled."""
    rates, width = given.profiles.counts.rates, len(given.design.regions)
    outcomes = len(binary_measures(given.design))
    shape = (1 if pooled else width, len(groups), outcomes)
    ones, n = np.zeros(shape, dtype=np.int64), np.zeros(shape, dtype=np.int64)
    if len(rates.keys):
        region = np.zeros_like(rates.keys) if pooled else rates.keys % width
        for place, members in enumerate(groups):
            rows = np.flatnonzero(np.isin(rates.keys // width, members))
            np.add.at(ones[:, place], region[rows], rates.ones[rows])
            np.add.at(n[:, place], region[rows], rates.n[rows])
    return _Grid(ones, n)


def _rates(grid: _Grid, column: int) -> list[list[Rate]]:
    """The rates of one outcome: a list a region."""
    return [
        [_rate(int(a), int(b)) for a, b in zip(ones, n, strict=True)]
        for ones, n in zip(grid.ones[:, :, column], grid.n[:, :, column], strict=True)
    ]


def _rate(ones: int, n: int) -> Rate:
    """A rate with its interval."""
    if n == 0:
        return Rate(0, 0, NOTHING, "", 0.0, 0.0)
    low, high = wilson_interval(ones, n)
    return Rate(ones, n, percent(ones / n), f"{100 * low:.1f}–{100 * high:.1f}", low, high)


def _outcome(
    told: tuple[str, str],
    regions: Sequence[str],
    panels: Sequence[Panel],
    rates: tuple[list[list[Rate]], ...],
) -> OutcomeRates:
    """One outcome with a row a region; regions in which it never has a value are left out."""
    by_level, combined = rates
    highest = max((one.high for row in by_level for one in row), default=0.0)
    scale = charts.round_scale(0, 100 * min(1.0, max(highest, 0.05)), most=4)
    scale = charts.Scale(0, min(100.0, scale.high), tuple(t for t in scale.ticks if 0 <= t <= 100))
    rows = []
    for place, region in enumerate(regions):
        if not any(one.n for one in by_level[place]):
            continue
        drawings, done = [], 0
        for panel in panels:
            own = by_level[place][done : done + len(panel.levels)]
            done += len(panel.levels)
            drawings.append(
                charts.estimate_row([_estimate(i, r) for i, r in enumerate(own)], scale)
            )
        rows.append(
            RateRow(region, tuple(drawings), tuple(by_level[place]), tuple(combined[place]))
        )
    return OutcomeRates(*told, tuple(rows), charts.axis(scale, "%"))


def _estimate(shape: int, rate: Rate) -> charts.Estimate | None:
    """A rate for the drawing, in percent; None where there is no value."""
    if rate.n == 0:
        return None
    return charts.Estimate(shape, 100 * rate.ones / rate.n, 100 * rate.low, 100 * rate.high)


def _missing(given: AuditInput) -> tuple[tuple[tuple[str, str], ...], tuple[MissingRow, ...]]:
    """Cells with and without values, by outcome; reasons that never occur have no column."""
    table, design = given.profiles.counts.missing, given.design
    if table.size == 0:
        return (), ()
    shown = [i for i in range(1, table.shape[1]) if table[:, i].any()]
    meanings: Mapping[str, str] = given.reasons
    reasons = tuple((design.reasons[i], meanings.get(design.reasons[i], "")) for i in shown)
    rows = []
    for measure, own in zip(design.measures, table, strict=True):
        values = [int(own[0]), *(int(own[i]) for i in shown)]
        texts = tuple(count(v) if v else NOTHING for v in values)
        rows.append(MissingRow(measure.name, texts, tuple(values)))
    return reasons, tuple(rows)
