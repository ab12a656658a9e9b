"""Where the trials and fixations went: in all, by reader, by condition."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from etl.report import charts
from etl.report.comparing import RANDOM_TABLES, loss_p_value
from etl.report.counts import conditions
from etl.report.inputs import AccountRow, AuditInput
from etl.report.rules import rule_level, rule_meaning
from etl.report.wording import count, counted, listed, name, percent, probability

#: What is no loss: such trials are no part of the study.
OUTSIDE_THE_STUDY = ("skip", "repeated")
#: Below this, loss is said to differ between levels of a factor (common practice, no source).
ALPHA = 0.05
#: With more readers than this, only those who lost most are drawn.
MOST_BARS = 60


@dataclass(frozen=True, slots=True)
class Rule:
    """A rule of screening that left something out, or could have.

    Attributes
    ----------
    name : str
        As in the accounts.
    level : str
        What it judges.
    meaning : str
        In words.
    swatch : Markup
        Its hatching; empty where it left nothing out.
    trials, fixations : int
        How many it left out.
    """

    name: str
    level: str
    meaning: str
    swatch: Markup
    trials: int
    fixations: int


@dataclass(frozen=True, slots=True)
class Balance:
    """The whole account of one unit.

    Attributes
    ----------
    unit : str
        ``trials`` or ``fixations``.
    read, outside, kept, lost : int
        ``outside`` are no part of the study; lost = read - outside - kept.
    share : str
        The lost in percent of those of the study.
    bar : Markup
        Kept, then lost by rule, of those of the study.
    """

    unit: str
    read: int
    outside: int
    kept: int
    lost: int
    share: str
    bar: Markup


@dataclass(frozen=True, slots=True)
class LossRow:
    """Kept and lost trials of a reader, or of a level of a factor.

    Attributes
    ----------
    name : str
        Of the reader or the level.
    bar : Markup
        By rule.
    kept, lost, read : int
        Trials of the study.
    share : str
        Lost in percent.
    by_rule : str
        How many each rule left out.
    not_recorded : int
        Trials of the trial list that no log has.
    """

    name: str
    bar: Markup
    kept: int
    lost: int
    read: int
    share: str
    by_rule: Markup
    not_recorded: int = 0


@dataclass(frozen=True, slots=True)
class FactorLoss:
    """Loss at the levels of one factor.

    Attributes
    ----------
    factor : str
        Its name.
    rows : tuple of LossRow
        One a level that has trials.
    axis : Markup
        Of the bars.
    test : str
        The p value with the name of the test, or why there is none.
    p : float or None
        The p value.
    differs : bool
        Whether it is below :data:`ALPHA`.
    """

    factor: str
    rows: tuple[LossRow, ...]
    axis: Markup
    test: str
    p: float | None
    differs: bool


@dataclass(frozen=True, slots=True)
class Legend:
    """What the parts of bars mean.

    Attributes
    ----------
    kept : Markup
        The swatch of what was kept.
    rules : tuple of Rule
        Those that left something out.
    """

    kept: Markup
    rules: tuple[Rule, ...]


@dataclass(frozen=True, slots=True)
class Losses:
    """All that the page says of loss.

    Attributes
    ----------
    trials, fixations : Balance
        In all.
    rules : tuple of Rule
        Those of the study, in order of application.
    legend : Legend or None
        Of the bars; None where nothing was lost.
    readers : tuple of LossRow
        Those that are drawn.
    undrawn : int
        Readers who are not drawn, of very many, since they lost less or nothing.
    squares, any_absent : bool
        Whether each trial is a square, and whether there are trials that no log has.
    factors : tuple of FactorLoss
        One a factor.
    """

    trials: Balance
    fixations: Balance
    rules: tuple[Rule, ...]
    legend: Legend | None
    readers: tuple[LossRow, ...]
    undrawn: int
    squares: bool
    any_absent: bool
    factors: tuple[FactorLoss, ...]


def collect_losses(given: AuditInput) -> Losses:
    """Count what was lost and draw it.

    Parameters
    ----------
    given : AuditInput
        What the page is made from.
    """
    rows = {u: [r for r in given.accounts if r.unit == u] for u in ("trials", "fixations")}
    names = list(dict.fromkeys(rule for row in given.accounts for rule in row.left_out))
    sums = {u: {n: sum(r.left_out.get(n, 0) for r in rows[u]) for n in names} for u in rows}
    striking = [n for n in names if n not in OUTSIDE_THE_STUDY and any(sums[u][n] for u in sums)]
    slots = {n: slot for slot, n in enumerate(striking)}
    rules = tuple(
        Rule(
            n,
            rule_level(n),
            rule_meaning(n, given.study),
            charts.swatch(slots[n]) if n in slots else Markup(),
            sums["trials"][n],
            sums["fixations"][n],
        )
        for n in names
    )
    absent = Counter(one.participant for one in given.not_recorded)
    whole = max((of_study(r) + absent[r.participant] for r in rows["trials"]), default=0)
    # Of very many readers only those are drawn that will be shown.
    drawn = rows["trials"]
    if len(drawn) > MOST_BARS:
        harmed = [r for r in drawn if of_study(r) > r.kept or absent[r.participant]]
        drawn = sorted(harmed, key=lambda r: r.kept - of_study(r))[:MOST_BARS]
    return Losses(
        _balance("trials", rows["trials"], slots),
        _balance("fixations", rows["fixations"], slots),
        rules,
        Legend(charts.swatch(None), tuple(r for r in rules if r.swatch)) if striking else None,
        tuple(_reader_row(row, absent[row.participant], whole, slots) for row in drawn),
        len(rows["trials"]) - len(drawn),
        whole <= charts.MOST_UNITS,
        bool(absent),
        tuple(_factor_loss(given, place, slots) for place in range(len(given.design.factors))),
    )


def of_study(row: AccountRow) -> int:
    """How many of those read are part of the study.

    Parameters
    ----------
    row : AccountRow
        Of a reader.

    Examples
    --------
    >>> of_study(AccountRow("P1", "trials", 44, {"skip": 12, "notes": 1}, 31))
    32
    """
    return row.read - sum(row.left_out.get(rule, 0) for rule in OUTSIDE_THE_STUDY)


def _balance(unit: str, rows: Sequence[AccountRow], slots: dict[str, int]) -> Balance:
    """The account of all readers together."""
    kept, study = sum(r.kept for r in rows), sum(map(of_study, rows))
    read = sum(r.read for r in rows)
    left = {n: sum(r.left_out.get(n, 0) for r in rows) for n in slots}
    return Balance(
        unit,
        read,
        read - study,
        kept,
        study - kept,
        percent((study - kept) / study if study else None),
        charts.share_bar(_parts(kept, left, slots), study, height=30),
    )


def _parts(kept: int, left: dict[str, int], slots: dict[str, int]) -> list[charts.Part]:
    """Kept first, then what each rule left out."""
    lost = [charts.Part(slots[n], amount) for n, amount in left.items() if n in slots]
    return [charts.Part(None, kept), *lost]


def _by_rule(left: dict[str, int]) -> Markup:
    """How many each rule left out, in words."""
    parts = [Markup("{} {}").format(count(n), rule) for rule, n in left.items() if n]
    return listed(parts, most=len(parts) or 1)


def _reader_row(row: AccountRow, missing: int, whole: int, slots: dict[str, int]) -> LossRow:
    """The bar of one reader."""
    left = {n: k for n, k in row.left_out.items() if n not in OUTSIDE_THE_STUDY}
    read = of_study(row)
    parts = [*_parts(row.kept, left, slots), charts.Part("absent", missing)]
    return LossRow(
        row.participant,
        charts.unit_bar(parts, whole),
        row.kept,
        read - row.kept,
        read,
        percent((read - row.kept) / read if read else None),
        _by_rule(left),
        missing,
    )


def _factor_loss(given: AuditInput, place: int, slots: dict[str, int]) -> FactorLoss:
    """Loss at the levels of one factor, with a test."""
    factor = list(given.design.factors)[place]
    combinations = conditions(given.design)
    levels = given.design.factors[factor]
    kept = [0] * len(levels)
    left: list[dict[str, int]] = [{} for _ in levels]
    for (condition, rule), trials in sorted(given.profiles.counts.trials.items()):
        level = combinations[condition][place]
        if rule < 0:
            kept[level] += trials
        else:
            known = given.design.left_out_by[rule]
            left[level][known] = left[level].get(known, 0) + trials
    left = [{n: own[n] for n in slots if n in own} for own in left]
    lost = [sum(own.values()) for own in left]
    shares = [n / (n + k) for n, k in zip(lost, kept, strict=True) if n + k]
    scale = charts.round_scale(0, 100 * max(max(shares, default=0), 0.05), most=4)
    scale = charts.Scale(0, scale.high, tuple(t for t in scale.ticks if t >= 0))
    rows = tuple(
        LossRow(
            level,
            charts.share_bar(
                [charts.Part(slots[n], amount) for n, amount in own.items()],
                (n_lost + n_kept) * scale.high / 100,
            ),
            n_kept,
            n_lost,
            n_lost + n_kept,
            percent(n_lost / (n_lost + n_kept)),
            _by_rule(own),
        )
        for level, own, n_lost, n_kept in zip(levels, left, lost, kept, strict=True)
        if n_lost + n_kept
    )
    p = loss_p_value(lost, kept)
    return FactorLoss(
        factor,
        rows,
        charts.axis(scale, "%"),
        _test(p, lost, len(rows)),
        p,
        p is not None and p < ALPHA,
    )


def _test(p: float | None, lost: Sequence[int], levels: int) -> str:
    """The outcome of the test in words."""
    if p is None:
        return "nothing to compare: " + (
            "no trial was lost" if not sum(lost) else "one level only, or no trial was kept"
        )
    how = f" on {RANDOM_TABLES:,} random tables" if levels > 2 else ""
    return f"Fisher’s exact test{how}: {probability(p)}"


def differing(loss: FactorLoss) -> Markup:
    """Why loss that differs matters, in words.

    Parameters
    ----------
    loss : FactorLoss
        Of a factor with a small p.
    """
    rates = [
        Markup("{} of {} at {}").format(row.share, counted(row.read, "trial"), name(row.name))
        for row in loss.rows
    ]
    return Markup("{}: {} ({}).").format(name(loss.factor), listed(rates), loss.test)
