"""The work on a group of readers in all variants: kept fixations in, counts and changes out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.changed_cells import LEFT_OUT, ChangedCells, ChangedRows
from etl.export.parts import Part
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import LEFT_OUT_BY
from etl.session.decisions import reasons_of
from etl.session.joined_readers import group_of
from etl.session.kept_logs import Aside
from etl.session.lines import LineWork
from etl.session.ordered import OrderedFixations
from etl.session.outcome_work import cells_of, compute_outcomes, set_far_values_missing
from etl.session.placing import Placed, place_fixations
from etl.session.reader import ReaderGroup
from etl.session.reader_groups import GroupTask
from etl.session.sound_readers import sound_readers
from etl.session.variant_counts import VariantCounts
from etl.session.variant_hanging import HangingTrial, ReaderHangs, readers_hanging
from etl.session.variant_plans import VariantOptions
from etl.session.variant_states import Changed, StateTable, Universe, changes_of, counts_of
from etl.tables import TableDesign
from etl.variants.facts import Crossing

#: Codes of what can leave something out, and one for what is kept.
_FATES: Final = len(LEFT_OUT_BY) + 1


@dataclass(frozen=True, slots=True)
class VariantTask:
    """Some readers, once for each set of facts that variants look at."""

    groups: tuple[GroupTask, ...]


@dataclass(frozen=True, slots=True, eq=False)
class VariantShape:
    """What is counted, the same for all readers.

    Attributes
    ----------
    crossing : Crossing
        The variants.
    pairs : tuple of int
        By setting, how many pairs of variants differ in it only.
    conditions : (conditions, factors) int64 array
        The combinations of levels that occur, ascending.
    together : bool
        Whether regions are counted together.
    hangs_on : dict of str to str
        For each setting, the column that says how much a cell hangs on it, and the setting's key.
    formats : tuple of str
        In which the changed cells are wanted.
    """

    crossing: Crossing
    pairs: tuple[int, ...]
    conditions: NDArray[np.int64]
    together: bool
    hangs_on: Mapping[str, str]
    formats: tuple[str, ...]


@dataclass(slots=True, eq=False)
class VariantAnswer:
    """What was found of some readers in all variants.

    Attributes
    ----------
    readers : int
        How many there are.
    findings : Findings
        What is wrong; nothing else is there then.
    counts : VariantCounts or None
        What was counted; None where there are none.
    hangs : list of ReaderHangs
        By reader.
    hanging : list of HangingTrial
        Trials that hang much on a setting.
    part : Part or None
        The rows of the changed cells.
    """

    readers: int
    findings: Findings = field(default_factory=Findings)
    counts: VariantCounts | None = None
    hangs: list[ReaderHangs] = field(default_factory=list)
    hanging: list[HangingTrial] = field(default_factory=list)
    part: Part | None = None


@dataclass(frozen=True, slots=True, eq=False)
class _Ready:
    """Readers of whom nothing is wrong, in time order."""

    group: ReaderGroup
    log: CanonicalLog
    ordered: OrderedFixations


class VariantWork:
    """Works on groups of readers in all variants.

    Parameters
    ----------
    design : TableDesign
        The study's tables, without the values that groups have of their own.
    library : RegionLibrary
        Its texts.
    aside : Aside
        Where fixations were put aside.
    options : sequence of VariantOptions
        The decisions of each variant.
    shape : VariantShape
        What is counted.
    """

    def __init__(
        self,
        design: TableDesign,
        library: RegionLibrary,
        aside: Aside,
        options: Sequence[VariantOptions],
        shape: VariantShape,
    ) -> None:
        self._design = design
        self._aside = aside
        self._options = options
        self._shape = shape
        self._library = library
        # Variants in which fixations are in the same places follow one another.
        self._order = sorted(range(len(options)), key=lambda variant: options[variant].place)
        self._libraries: dict[int, RegionLibrary] = {}
        self._lines: dict[int, LineWork | None] = {}
        for own in options:
            if own.place in self._libraries:
                continue
            self._libraries[own.place] = placing = replace(library, manner=own.manner)
            lines = own.options.lines
            self._lines[own.place] = (
                None if lines is None else LineWork(placing, lines, own.options.limits)
            )

    def __call__(self, task: VariantTask) -> VariantAnswer:
        """Work on one group."""
        answer = VariantAnswer(len(task.groups[0].readers))
        design = task.groups[0].own.design(self._design)
        ready = []
        for group in task.groups:
            told = {reader.participant: Findings() for reader in group.readers}
            ready.append(self._ready(group, design, told))
            for found in told.values():
                if found.failed:
                    answer.findings.extend(found)
            if answer.findings.failed:
                return answer
        first = ready[0].group
        universe = self._universe(first)
        table = StateTable(universe, len(self._options), design.measures)
        counts = self._filled(ready, table)
        changed: dict[str, Changed] = {}
        found_counts = []
        for measure in design.measures:
            changed[measure.name], own = changes_of(table, measure.name, self._shape.crossing)
            found_counts.append(own)
        counts.changes = tuple(found_counts)
        counts.changed = self._changed(universe, changed)
        keys, width = universe.keys, int(np.prod(universe.sizes))
        for place, name in enumerate(self._binary()):
            counts.regions[place] = counts_of(table.states[name], keys, width).reshape(
                len(self._options), *universe.sizes, 3
            )
        answer.counts = counts
        binary = {name: changed[name] for name in self._binary()}
        using = (self._shape.crossing, self._shape.pairs)
        there = np.zeros(len(universe), dtype=bool)
        for name in binary:
            there |= (table.states[name] != LEFT_OUT).any(axis=0)
        answer.hangs, answer.hanging = readers_hanging(first, universe, binary, there, using)
        cells = universe.cells
        rows = {
            name: ChangedRows(
                cells.trial[own.rows],
                cells.order[own.rows],
                cells.code[own.rows],
                own.states,
                own.pairs,
            )
            for name, own in changed.items()
        }
        shape = self._shape
        answer.part = ChangedCells(design, shape.hangs_on, shape.pairs, shape.formats).part(
            first.trials, rows, shape.crossing.base
        )
        return answer

    def _binary(self) -> list[str]:
        """The binary outcomes of regions."""
        return [m.name for m in self._design.measures if m.kind == "binary"]

    def _ready(self, task: GroupTask, design: TableDesign, told: dict[str, Findings]) -> _Ready:
        """The fixations of a group in time order."""
        group = group_of(task.readers, self._aside)
        repeated = self._options[0].options.repeated
        sound, ordered = sound_readers(group, (design, self._library, repeated), told)
        return _Ready(sound, sound.log.take(ordered.rows), ordered)

    def _universe(self, group: ReaderGroup) -> Universe:
        """The cells that there would be if nothing were left out."""
        trials = np.flatnonzero(group.trials.text >= 0)
        cells = cells_of(group.trials.text, trials, self._library)
        together = self._shape.together
        slot = np.zeros(len(cells.code), dtype=np.int64) if together else cells.code
        sizes = (
            1 if together else max(len(self._library.region_names), 1),
            len(self._shape.conditions),
        )
        return Universe(trials, cells, slot.astype(np.int64), self._conditions(group), sizes)

    def _conditions(self, group: ReaderGroup) -> NDArray[np.int64]:
        """The combination of levels of each trial; of one that is no part of the study, 0."""
        known = self._shape.conditions
        if not known.shape[1]:
            return np.zeros(len(group.trials), dtype=np.int64)
        levels = np.stack([group.trials.factors[name] for name in self._design.factors], axis=1)
        codes = np.zeros(len(levels), dtype=np.int64)
        for place, own in enumerate(known.tolist()):
            codes[(levels == own).all(axis=1)] = place
        return codes

    def _filled(self, ready: Sequence[_Ready], table: StateTable) -> VariantCounts:
        """Fill in the states variant by variant, counting what needs no states."""
        variants, universe = len(self._options), table.universe
        regions, conditions = universe.sizes
        binary = [m.name for m in self._design.trial_measures if m.kind == "binary"]
        width = len(ready[0].group.trials)
        counts = VariantCounts(
            np.zeros((len(self._binary()), variants, regions, conditions, 3), dtype=np.int64),
            np.zeros((len(binary), variants, conditions, 3), dtype=np.int64),
            np.bincount(universe.keys, minlength=regions * conditions).reshape(regions, -1),
            np.bincount(universe.condition[universe.trials], minlength=conditions),
            np.zeros((variants, _FATES), dtype=np.int64),
            np.zeros((variants, _FATES), dtype=np.int64),
            np.zeros((variants, 2), dtype=np.int64),
            np.zeros(variants, dtype=np.int64),
            np.zeros((variants, 2), dtype=np.int64),
            (),
        )
        placed: tuple[int, Placed] | None = None
        for variant in self._order:
            own = self._options[variant]
            here = ready[own.facts]
            library = self._libraries[own.place]
            if placed is None or placed[0] != own.place:
                using = (library, self._lines[own.place])
                placed = own.place, place_fixations(here.group, here.log, here.ordered, using)
            group, options = here.group, own.options
            done = compute_outcomes(group, here.log, here.ordered, placed[1], (library, options))
            values = {m.name: done.outcomes.regions[m.name].values for m in table.measures}
            if options.limits.on("outlier_sd"):
                reasons = {m.name: done.outcomes.regions[m.name].reasons for m in table.measures}
                far = set_far_values_missing(
                    cells_of(group.trials.text, done.in_study, library),
                    group.reader_of_trial,
                    table.measures,
                    reasons_of(options.limits),
                    (options.limits.outlier_sd, len(library.region_names)),
                    (values, reasons),
                )
                counts.far[variant] = len(far)
            kept = done.trial_codes < 0
            table.fill(variant, kept, values)
            counts.trials[variant] = np.bincount(done.trial_codes + 1, minlength=_FATES)
            counts.fixations[variant] = np.bincount(done.gone + 1, minlength=_FATES)
            counts.readers[variant] = (
                len(np.unique(group.reader_of_trial[done.in_study])),
                int((done.screened.readers.left_out >= 0).sum()),
            )
            condition = universe.condition[done.in_study]
            for place, name in enumerate(binary):
                own_values = done.outcomes.trials[name].values
                for slot, chosen in enumerate(
                    (own_values == 0, own_values == 1, np.ones(len(own_values), dtype=bool))
                ):
                    counts.of_trials[place, variant, :, slot] = np.bincount(
                        condition[chosen], minlength=conditions
                    )
        assert width == len(universe.condition)  # noqa: S101 - gatherings have the same trials
        return counts

    def _changed(self, universe: Universe, changed: dict[str, Changed]) -> NDArray[np.int64]:
        """Cells of any measure that are not as in the study, and their trials, by variant."""
        base, variants = self._shape.crossing.base, len(self._options)
        cells = np.zeros(variants, dtype=np.int64)
        trials = np.zeros((variants, len(universe.condition)), dtype=bool)
        for own in changed.values():
            differs = own.states != own.states[base]
            cells += differs.sum(axis=1)
            variant, cell = np.nonzero(differs)
            trials[variant, universe.cells.trial[own.rows[cell]]] = True
        return np.stack([cells, trials.sum(axis=1)], axis=1)
