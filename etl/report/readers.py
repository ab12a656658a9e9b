"""The readers beside one another: measures of reading, who stands out, the table of readers."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from markupsafe import Markup, escape

from etl.report import charts
from etl.report.compared_by import RAYNER, Measure, Reader, measures_of
from etl.report.comparing import FENCE, FEWEST_TO_COMPARE, robust_fence
from etl.report.inputs import AuditInput
from etl.report.losses import of_study
from etl.report.strips import Dot, strip
from etl.report.wording import NOTHING, count, counted, listed, name, number

#: This many readers who stand out are named below a strip.
MOST_NAMED = 12
#: This many readers have a row in the table, and a dot on each strip: a page of very many more
#: could not be opened. Of more readers those who were left out or stand out come first.
MOST_ROWS = 1000
#: This many of those who stand out have a dot then.
MOST_STRANGE = 200


@dataclass(frozen=True, slots=True)
class Strip:
    """One measure over all readers.

    Attributes
    ----------
    measure : Measure
        Which.
    svg : Markup
        The drawing; empty where no reader has a value.
    n : int
        Readers with a value.
    median : str
        Of the readers.
    band : str
        Below or above what a reader stands out; empty where nobody is judged.
    published : str
        The published range with its source; empty where there is none.
    outliers : Markup
        Who stands out, with the value; of very many, the first few are named.
    """

    measure: Measure
    svg: Markup
    n: int
    median: str
    band: str
    published: str
    outliers: Markup


@dataclass(frozen=True, slots=True)
class Cell:
    """A cell of the table of readers.

    Attributes
    ----------
    text : str
        As shown.
    value : str
        What it is sorted by; empty where there is no value.
    strange : bool
        Whether the reader stands out by it.
    """

    text: str
    value: str
    strange: bool = False


@dataclass(frozen=True, slots=True)
class TableRow:
    """A reader in the table.

    Attributes
    ----------
    anchor, name : str
        Where and who.
    levels : tuple of str
        Of the factors that differ between readers.
    trials : Cell
        Kept of read.
    quantiles : Markup
        Of fixation durations.
    cells : tuple of Cell
        A measure each.
    remark : Markup
        Why the reader stands out or was left out.
    stands_out, lost : bool
        For the filter.
    """

    anchor: str
    name: str
    levels: tuple[str, ...]
    trials: Cell
    quantiles: Markup
    cells: tuple[Cell, ...]
    remark: Markup
    stands_out: bool
    lost: bool


@dataclass(frozen=True, slots=True)
class Comparison:
    """All that the page says of readers.

    Attributes
    ----------
    strips : tuple of Strip
        A measure each.
    rows : tuple of TableRow
        A reader each; of very many, some.
    unlisted : int
        How many readers have no row.
    groups : tuple of str
        Factors that differ between readers.
    axis : Markup
        Of the quantiles of durations.
    standing_out : tuple of Markup
        Each reader who stands out, with every reason.
    left_out : tuple of Markup
        Each reader who was left out, with the rule.
    judged : bool
        Whether there are readers enough to compare.
    measures : tuple of Measure
        What they are compared by.
    """

    strips: tuple[Strip, ...]
    rows: tuple[TableRow, ...]
    unlisted: int
    groups: tuple[str, ...]
    axis: Markup
    standing_out: tuple[Markup, ...]
    left_out: tuple[Markup, ...]
    judged: bool
    measures: tuple[Measure, ...]


def collect_readers(given: AuditInput, levels: Mapping[str, str]) -> Comparison:
    """Compare the readers.

    Parameters
    ----------
    given : AuditInput
        What the page is made from.
    levels : mapping of str to str
        What each rule judges; those that judge readers name readers left out.
    """
    readers = _with_trials(given, levels)
    reasons: dict[str, list[Markup]] = {}
    strange: set[tuple[str, str]] = set()
    measures = measures_of(given.profiles.readers)
    strips = tuple(_strip(measure, readers, reasons, strange) for measure in measures)
    groups = tuple(
        factor
        for factor in given.design.factors
        if readers and all(factor in r.numbers.levels for r in readers)
    )
    every = [r.numbers.durations.quantiles_ms for r in readers if r.numbers.durations]
    ends = [q for own in every for q in own]
    scale = charts.round_scale(min(ends, default=0), max(ends, default=1), most=3)
    rows = tuple(
        _row((place + 1, readers[place]), measures, groups, scale, (reasons, strange))
        for place in _listed(readers, reasons)
    )
    named = {r.numbers.participant: r for r in readers}
    return Comparison(
        strips,
        rows,
        len(readers) - len(rows),
        groups,
        charts.axis(scale, ""),
        tuple(
            Markup("{}: {}").format(_link(place, r), listed(reasons[r.numbers.participant]))
            for place, r in enumerate(named.values(), start=1)
            if r.numbers.participant in reasons
        ),
        tuple(
            Markup("{} ({})").format(_link(place, r), r.left_out)
            for place, r in enumerate(named.values(), start=1)
            if r.left_out
        ),
        len(readers) >= FEWEST_TO_COMPARE,
        measures,
    )


def _listed(readers: Sequence[Reader], reasons: Mapping[str, Sequence[Markup]]) -> list[int]:
    """The places of the readers who have a row: of very many, the most remarkable and the first."""
    if len(readers) <= MOST_ROWS:
        return list(range(len(readers)))
    lost = [place for place, r in enumerate(readers) if r.left_out]
    out = [place for place, r in enumerate(readers) if r.numbers.participant in reasons]
    half = MOST_ROWS // 2
    order = [*lost[:half], *out[:half], *lost[half:], *out[half:], *range(len(readers))]
    return sorted(list(dict.fromkeys(order))[:MOST_ROWS])


def _link(place: int, reader: Reader) -> Markup:
    """A reader's name that leads to the reader's row."""
    return Markup('<a href="#reader-{}">{}</a>').format(place, name(reader.numbers.participant))


def _with_trials(given: AuditInput, levels: Mapping[str, str]) -> list[Reader]:
    """Each reader with the trials of the account."""
    accounts = {row.participant: row for row in given.accounts if row.unit == "trials"}
    out = []
    for numbers in given.profiles.readers:
        row = accounts[numbers.participant]
        rule = next((n for n, k in row.left_out.items() if k and levels.get(n) == "reader"), "")
        out.append(Reader(numbers, of_study(row), row.kept, rule))
    return out


def _strip(
    measure: Measure,
    readers: Sequence[Reader],
    reasons: dict[str, list[Markup]],
    strange: set[tuple[str, str]],
) -> Strip:
    """One measure over all readers; notes who stands out."""
    known = [(r.numbers.participant, v) for r in readers if (v := measure.value(r)) is not None]
    values = [value for _, value in known]
    fence = robust_fence(values)
    band: tuple[float, float] | None = None
    outliers = []
    if fence is not None:
        median, deviation = fence
        band = median - FENCE * deviation, median + FENCE * deviation
        for who, value in known:
            if not band[0] <= value <= band[1]:
                away = abs(value - median) / deviation
                strange.add((who, measure.key))
                side = "above" if value > median else "below"
                reasons.setdefault(who, []).append(
                    Markup("{} {}, {} deviations {} the readers’ median of {}").format(
                        measure.title[0].lower() + measure.title[1:],
                        measure.shown(value),
                        number(away, 1),
                        side,
                        measure.shown(median),
                    )
                )
                outliers.append(Markup("{} {}").format(name(who), measure.shown(value)))
    middle = _median(values)
    return Strip(
        measure,
        _drawn(measure, known, band, {w for w, k in strange if k == measure.key}),
        len(known),
        measure.shown(middle),
        "" if band is None else _limits(measure, band),
        "" if measure.published is None else _published(measure, values),
        listed(outliers, MOST_NAMED),
    )


def _limits(measure: Measure, band: tuple[float, float]) -> str:
    """Where standing out begins."""
    above = f"above {measure.shown(band[1])}"
    if band[0] < 0 and not measure.negative:
        return above
    return f"below {measure.shown(band[0])} or {above}"


def _median(values: Sequence[float]) -> float | None:
    """The median; None where there is no value."""
    if not values:
        return None
    ordered, half = sorted(values), len(values) // 2
    return ordered[half] if len(values) % 2 else (ordered[half - 1] + ordered[half]) / 2


def _published(measure: Measure, values: Sequence[float]) -> str:
    """The published range, and how many readers are within."""
    low, high = measure.published or (0, 0)
    within = sum(low <= value * measure.factor <= high for value in values)
    unit = measure.unit.replace(" ", "\N{NO-BREAK SPACE}")
    return (
        f"{low:g} to {high:g}{unit} in silent reading ({RAYNER}); "
        f"{count(within)} of {counted(len(values), 'reader')} within"
    )


def _drawn(
    measure: Measure,
    known: Sequence[tuple[str, float]],
    band: tuple[float, float] | None,
    strange: set[str],
) -> Markup:
    """The strip of one measure."""
    if not known:
        return Markup()
    factor = measure.factor
    every = sorted((value * factor, who) for who, value in known)
    shown = _some(every, strange)
    ends = [shown[0][0], shown[-1][0], *(measure.published or ())]
    scale = charts.round_scale(min(ends), max(ends), most=6)
    middle = _median([value for value, _ in every])
    return strip(
        [Dot(value, who if who in strange else "") for value, who in shown],
        scale,
        measure.unit,
        fence=None if band is None else (band[0] * factor, band[1] * factor),
        published=measure.published,
        median=middle,
    )


def _some(every: Sequence[tuple[float, str]], strange: set[str]) -> Sequence[tuple[float, str]]:
    """The readers who have a dot: of very many those farthest out, and as many evenly spread."""
    if len(every) <= MOST_ROWS:
        return every
    out = [place for place, (_, who) in enumerate(every) if who in strange]
    low = [place for place in out if place < len(every) // 2][: MOST_STRANGE // 2]
    high = [place for place in out if place >= len(every) // 2][-(MOST_STRANGE // 2) :]
    rest = [place for place, (_, who) in enumerate(every) if who not in strange]
    wanted = min(MOST_ROWS - len(low) - len(high), len(rest))
    step = (len(rest) - 1) / max(wanted - 1, 1)
    spread = [rest[round(step * number)] for number in range(wanted)]
    return [every[place] for place in sorted({*low, *high, *spread})]


def _row(
    which: tuple[int, Reader],
    measures: Sequence[Measure],
    groups: Sequence[str],
    scale: charts.Scale,
    noted: tuple[Mapping[str, Sequence[Markup]], set[tuple[str, str]]],
) -> TableRow:
    """A reader in the table."""
    place, reader = which
    reasons, strange = noted
    who = reader.numbers.participant
    remarks = [f"left out by {reader.left_out}"] if reader.left_out else []
    own = [*remarks, *reasons.get(who, ())]
    cells = []
    for measure in measures:
        value = measure.value(reader)
        cells.append(
            Cell(
                measure.shown(value),
                "" if value is None else f"{value * measure.factor:.6g}",
                (who, measure.key) in strange,
            )
        )
    durations = reader.numbers.durations
    return TableRow(
        f"reader-{place}",
        who,
        tuple(reader.numbers.levels[group] for group in groups),
        Cell(f"{count(reader.kept)} of {count(reader.read)}", str(reader.kept)),
        charts.quantile_bar(durations.quantiles_ms, scale) if durations else escape(NOTHING),
        tuple(cells),
        listed(own, most=len(own) or 1),
        who in reasons,
        reader.kept < reader.read,
    )
