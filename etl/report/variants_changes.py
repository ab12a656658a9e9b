"""What of the page about variants is told of cells: by measure, by reader, by trial."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_curve import chance_bar
from etl.report.variants_input import Hanging, VariantsInput
from etl.report.variants_words import code, fine_share_words, more_in, share_words
from etl.report.wording import count, counted, name
from etl.variants.facts import Change, Floats

#: Regions of a measure, readers and trials that are shown at most.
MOST_REGIONS = 15
MOST_HANGING = 60
#: The kinds of measures in the order of the page, with what they are called there.
_KINDS = {"binary": "0 or 1", "count": "count", "duration": "duration"}


@dataclass(frozen=True, slots=True)
class Chance:
    """How far something hangs on a decision.

    Attributes
    ----------
    text : str
        In percent; a dash where it is not known.
    value : str
        As a number, for sorting; empty where it is not known.
    bar : Markup
        Drawn.
    most : bool
        Whether it hangs on no other decision more.
    """

    text: str
    value: str
    bar: Markup
    most: bool


@dataclass(frozen=True, slots=True)
class ChangeRow:
    """Cells of a measure, or of a measure in a region.

    Attributes
    ----------
    label : Markup
        The measure, or the region.
    kind : str
        What its values are.
    cells, changed, trials : str
        In words.
    values : tuple of float
        Cells, the share of them that change, trials; for sorting.
    hangs : tuple of Chance
        By setting.
    """

    label: Markup
    kind: str
    cells: str
    changed: str
    trials: str
    values: tuple[float, ...]
    hangs: tuple[Chance, ...]


@dataclass(frozen=True, slots=True)
class MeasureChange:
    """A measure over its regions.

    Attributes
    ----------
    row : ChangeRow
        All regions together.
    spoken : str
        Its name, for programs that read aloud.
    regions : tuple of ChangeRow
        Region by region, those first in which most changes; empty where there is one.
    left : Markup
        What is said of regions that are not shown.
    """

    row: ChangeRow
    spoken: str
    regions: tuple[ChangeRow, ...]
    left: Markup


@dataclass(frozen=True, slots=True)
class Changes:
    """All cells.

    Attributes
    ----------
    says : str
        How many change.
    hint : Markup
        On which decision binary cells hang most; empty where that is not known.
    no_chances : str
        Why it is not known on what cells hang; empty where it is.
    measures : tuple of MeasureChange
        Binary ones first; those first in which the greatest share changes.
    unchanged : Markup
        Measures in which nothing changes.
    """

    says: str
    hint: Markup
    no_chances: str
    measures: tuple[MeasureChange, ...]
    unchanged: Markup


@dataclass(frozen=True, slots=True)
class HangingRow:
    """A reader or a trial.

    Attributes
    ----------
    labels : tuple of str
        Reader; for a trial also session, trial and item, as far as any trial has them.
    setting : Markup
        On what it hangs most; a dash where that is not known.
    share : float
        Share of its cells that change.
    cells : str
        The same in words.
    hangs : tuple of Chance
        By setting.
    changes : tuple of str
        A few changes.
    pages : tuple of (str, str)
        Words and address of its traces.
    """

    labels: tuple[str, ...]
    setting: Markup
    share: float
    cells: str
    hangs: tuple[Chance, ...]
    changes: tuple[str, ...]
    pages: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class HangingTable:
    """Readers or trials.

    Attributes
    ----------
    heads : tuple of str
        Of the labels.
    rows : tuple of HangingRow
        Those that hang most first.
    left : Markup
        What is said of those that are not shown.
    """

    heads: tuple[str, ...]
    rows: tuple[HangingRow, ...]
    left: Markup


def collect_changes(facts: VariantsInput) -> Changes:
    """Gather which cells of ``outcomes`` are not the same in all variants.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.

    Returns
    -------
    Changes
        By measure, with its regions.
    """
    by_measure: dict[tuple[str, str], list[Change]] = {}
    for one in facts.changes:
        by_measure.setdefault((one.kind, one.measure), []).append(one)
    order = list(_KINDS)
    found = sorted(
        by_measure.items(),
        key=lambda own: (
            order.index(own[0][0]) if own[0][0] in order else len(order),
            -_share(own[1]),
            own[0][1],
        ),
    )
    changing = [(key, own) for key, own in found if any(one.changed for one in own)]
    still = [measure for (_, measure), own in found if not any(one.changed for one in own)]
    cells = sum(one.cells for one in facts.changes)
    changed = sum(one.changed for one in facts.changes)
    binary = [one for one in facts.changes if one.kind == "binary"]
    chances = np.array([one.hangs for one in facts.changes if one.changed])
    widest = float(np.nanmax(chances)) if np.isfinite(chances).any() else 0.0
    return Changes(
        _changes_say(changed, cells, binary),
        _hint(facts, binary),
        ""
        if facts.crossing.full
        else "Not every combination of the alternatives is among the variants, so it cannot be "
        "told on which decision a cell hangs.",
        tuple(_measure(facts, key, own, widest) for key, own in changing),
        Markup(", ").join(map(code, still)),
    )


def _share(changes: Sequence[Change]) -> float:
    """The share of cells that change."""
    cells = sum(one.cells for one in changes)
    return sum(one.changed for one in changes) / cells if cells else 0.0


def _changes_say(changed: int, cells: int, binary: Sequence[Change]) -> str:
    """How many cells change, and how many of the binary ones."""
    if not cells:
        return "There are no cells."
    if not changed:
        return f"All {count(cells)} cells of outcomes are the same in all variants."
    said = (
        f"{count(changed)} of {count(cells)} cells ({fine_share_words(changed / cells)}) are not "
        "the same in all variants"
    )
    zeros_and_ones = sum(one.cells for one in binary)
    if zeros_and_ones:
        own = sum(one.changed for one in binary)
        said += (
            f"; of the cells of 0/1 outcomes {count(own)} of {count(zeros_and_ones)} "
            f"({fine_share_words(own / zeros_and_ones)})"
        )
    return f"{said}."


def _hint(facts: VariantsInput, binary: Sequence[Change]) -> Markup:
    """On which decision binary cells hang most."""
    hangs = _together(binary, len(facts.crossing.settings))
    if not np.isfinite(hangs).all() or not len(hangs) or not hangs.max():
        return Markup()
    most = int(hangs.argmax())
    return Markup(
        "Cells of 0/1 outcomes hang most on {}: where it alone is chosen anew, {} of them change."
    ).format(code(facts.short_keys[most]), _chance(float(hangs[most])))


def _together(changes: Sequence[Change], settings: int) -> Floats:
    """Chances over several regions: every cell counts alike."""
    cells = sum(one.cells for one in changes)
    if not cells:
        return np.full(settings, math.nan)
    weighted: Floats = np.sum([one.hangs * one.cells for one in changes], axis=0)
    return weighted / cells


def _chance(chance: float) -> str:
    """A chance in percent, to one place where it is small."""
    if 0 < chance < 0.0995:
        return fine_share_words(chance)
    return share_words(chance)


def _chances(hangs: Sequence[float], widest: float) -> tuple[Chance, ...]:
    """Chances by setting, with bars of which the longest fills its place."""
    known = [chance for chance in hangs if not math.isnan(chance)]
    most = max(known, default=0.0)
    return tuple(
        Chance(
            _chance(chance),
            "" if math.isnan(chance) else f"{chance:.6g}",
            chance_bar(chance / widest if widest else chance),
            not math.isnan(chance) and chance > 0 and chance == most,
        )
        for chance in hangs
    )


def _measure(
    facts: VariantsInput, own: tuple[str, str], changes: Sequence[Change], widest: float
) -> MeasureChange:
    """A measure with its regions."""
    kind, measure = own
    settings = len(facts.crossing.settings)
    cells, changed = sum(one.cells for one in changes), sum(one.changed for one in changes)
    trials = max(one.trials for one in changes)
    row = ChangeRow(
        code(measure),
        _KINDS.get(kind, kind),
        count(cells),
        f"{count(changed)} ({fine_share_words(changed / cells)})",
        count(trials),
        (cells, changed / cells, trials),
        _chances([float(one) for one in _together(changes, settings)], widest),
    )
    regions = sorted(changes, key=lambda one: -one.changed) if len(changes) > 1 else []
    shown = tuple(_region(one, widest) for one in regions[:MOST_REGIONS])
    left = more_in(facts, "changes", len(regions) - len(shown))
    return MeasureChange(row, measure, shown, left)


def _region(change: Change, widest: float) -> ChangeRow:
    """A measure in a region."""
    share = change.changed / change.cells if change.cells else 0.0
    return ChangeRow(
        name(change.region) if change.region else Markup("whole trials"),
        "",
        count(change.cells),
        f"{count(change.changed)} ({fine_share_words(share)})",
        count(change.trials),
        (change.cells, share, change.trials),
        _chances([float(one) for one in change.hangs], widest),
    )


def collect_hanging(facts: VariantsInput, kind: str) -> HangingTable:
    """Gather the readers or the trials that hang most on a decision.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.
    kind : {"readers", "trials"}
        Which.

    Returns
    -------
    HangingTable
        Columns that are empty for all are left out.
    """
    entries = facts.readers if kind == "readers" else facts.trials
    columns = [("Reader", [one.participant for one in entries])]
    columns += [
        (head, texts)
        for head, texts in (
            ("Session", [one.session for one in entries]),
            ("Trial", [one.trial for one in entries]),
            ("Item", [one.item for one in entries]),
        )
        if any(texts)
    ]
    shown = entries[:MOST_HANGING]
    widest = max((c for one in shown for c in one.hangs if not math.isnan(c)), default=0.0)
    return HangingTable(
        tuple(head for head, _ in columns),
        tuple(
            _hanging(facts, one, tuple(texts[at] for _, texts in columns), widest)
            for at, one in enumerate(shown)
        ),
        more_in(facts, kind, len(entries) - len(shown)),
    )


def _hanging(
    facts: VariantsInput, one: Hanging, labels: tuple[str, ...], widest: float
) -> HangingRow:
    """A reader or a trial."""
    most = Markup("–")
    if 0 <= one.setting < len(one.hangs) and one.hangs[one.setting] > 0:
        most = code(facts.short_keys[one.setting])
    share = one.cells / one.of if one.of else 0.0
    return HangingRow(
        labels,
        most,
        share,
        f"{count(one.cells)} of {counted(one.of, 'cell')}",
        _chances(one.hangs, widest),
        one.changes,
        tuple((words, _relative(href)) for words, href in one.pages),
    )


def _relative(href: str) -> str:
    """An address that no browser takes for one outside: a colon in a file name is no scheme."""
    return f"./{href}" if ":" in href.partition("/")[0] else href
