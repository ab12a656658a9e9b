"""Writes the tables that tell of variants, and what their columns mean."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import astuple
from pathlib import Path
from typing import Final

import numpy as np

from etl.cells import Cell, write_csv
from etl.export.variant_rates import write_rates
from etl.screening import LEFT_OUT_BY
from etl.session.variant_hanging import ReaderHangs
from etl.session.variant_results import VariantResults
from etl.tables import Column, TableDesign
from etl.tables.variants import (
    CHANGED_CELLS,
    CHANGES,
    CHANGES_BY_VARIANT,
    COMPARISONS,
    DECISIONS,
    RATES,
    READERS,
    VARIANT_ACCOUNTS,
    VARIANT_ROWS,
    VARIANTS,
    change_by_variant_columns,
    change_columns,
    changed_cell_columns,
    comparison_columns,
    decision_columns,
    rate_columns,
    reader_columns,
    variant_account_columns,
    variant_columns,
)
from etl.variants.facts import Summary
from etl.variants.shares import turning

CODEBOOK: Final = "codebook"
_CODEBOOK_COLUMNS: Final = (
    Column("table", "text", "name of a table"),
    Column("row_is", "text", "what one row of it is"),
    Column("column", "text", "one of its columns"),
    Column("holds", "text", "text, category, flag (0 or 1), integer or number"),
    Column("meaning", "text", "what it means"),
    Column("may_be_empty", "flag", "1 if cells may be empty"),
    Column("levels", "text", "levels of a category, in order", nullable=True),
)


class VariantTables:
    """Writes all tables of one run.

    Parameters
    ----------
    folder : Path
        Where they go.
    results : VariantResults
        What is known of all variants.
    design : TableDesign
        The tables of the study.
    names : sequence of str
        By setting, the name that its columns have.
    pairs : sequence of int
        By setting, how many pairs of variants differ in it only.
    """

    def __init__(
        self,
        folder: Path,
        results: VariantResults,
        design: TableDesign,
        names: Sequence[str],
        pairs: Sequence[int],
    ) -> None:
        self._folder = folder
        self._results = results
        self._design = design
        self._pairs = pairs
        settings = results.crossing.settings
        self._keys = [setting.key for setting in settings]
        self._names = dict(zip(names, self._keys, strict=True))
        self.rows: dict[str, int] = {}
        self._columns: dict[str, tuple[Column, ...]] = {}

    def write(self, readers: Sequence[ReaderHangs], changed: int, formats: Sequence[str]) -> None:
        """Write everything but the changed cells, which were written reader by reader.

        Parameters
        ----------
        readers : sequence of ReaderHangs
            How much each reader hangs on each setting.
        changed : int
            How many rows the changed cells have.
        formats : sequence of str
            In which formats the large tables are wanted.
        """
        results = self._results
        self._csv(VARIANTS, variant_columns(self._names), self._variants())
        rules = self._rules()
        self._csv(VARIANT_ACCOUNTS, variant_account_columns(rules), self._accounts(rules))
        self._columns[RATES] = rate_columns(self._design.factors)
        self.rows[RATES] = write_rates(
            self._folder, self._design.factors, results.groups, results.rates, formats
        )
        self._csv(COMPARISONS, comparison_columns(), map(self._comparison, results.summaries))
        self._csv(DECISIONS, decision_columns(), self._decisions())
        self._csv(CHANGES, change_columns(), self._changes())
        self._csv(CHANGES_BY_VARIANT, change_by_variant_columns(), self._changes_by_variant())
        self._csv(READERS, reader_columns(), self._readers(readers))
        hangs = {f"hangs_on_{name}": key for name, key in self._names.items()}
        self._columns[CHANGED_CELLS] = changed_cell_columns(self._design, hangs)
        self.rows[CHANGED_CELLS] = changed
        rows = list(self._codebook())
        write_csv(self._folder / f"{CODEBOOK}.csv", [one.name for one in _CODEBOOK_COLUMNS], rows)

    def _csv(self, name: str, columns: tuple[Column, ...], rows: Iterable[Sequence[Cell]]) -> None:
        made = list(rows)
        write_csv(self._folder / f"{name}.csv", [column.name for column in columns], made)
        self.rows[name] = len(made)
        self._columns[name] = columns

    def _variants(self) -> Iterable[list[Cell]]:
        crossing = self._results.crossing
        for number, loss in enumerate(self._results.losses):
            own = zip(crossing.settings, crossing.choices[number].tolist(), strict=True)
            yield [
                number + 1,
                crossing.names[number],
                int(number == crossing.base),
                *(setting.alternatives[choice] for setting, choice in own),
                loss.readers,
                loss.readers_lost,
                loss.trials_read,
                loss.trials_kept,
                loss.fixations_read,
                loss.fixations_kept,
                loss.values_set_missing,
                loss.cells_changed,
                loss.cells_trials,
            ]

    def _rules(self) -> list[str]:
        """The rules that leave something out in any variant, in order of application."""
        order: dict[str, None] = {}
        for loss in self._results.losses:
            order.update(dict.fromkeys((*loss.fixations_by_rule, *loss.trials_by_rule)))
        return [rule for rule in LEFT_OUT_BY if rule in order]

    def _accounts(self, rules: Sequence[str]) -> Iterable[list[Cell]]:
        for number, loss in enumerate(self._results.losses, start=1):
            for unit, read, by_rule, kept in (
                ("trials", loss.trials_read, loss.trials_by_rule, loss.trials_kept),
                ("fixations", loss.fixations_read, loss.fixations_by_rule, loss.fixations_kept),
            ):
                yield [number, unit, read, *(by_rule.get(rule, 0) for rule in rules), kept]

    def _comparison(self, summary: Summary) -> list[Cell]:
        crossing, compared = self._results.crossing, summary.compared
        base = crossing.base
        with_one = [
            own for own in summary.order.tolist() if not math.isnan(compared.difference[own])
        ]
        ends: list[Cell] = [None] * 4
        if with_one:
            low, high = with_one[0], with_one[-1]
            ends = [
                float(compared.difference[low]),
                low + 1,
                float(compared.difference[high]),
                high + 1,
            ]
        most = summary.matters
        return [
            *astuple(compared.comparison),
            *(_or_none(own[base]) for own in (compared.difference, compared.low, compared.high)),
            *ends,
            *self._signs(summary),
            None if most is None else self._keys[most],
            None if most is None else summary.shares[most].together,
            *(
                None if place is None else self._keys[place]
                for place in (summary.turns, summary.clears)
            ),
        ]

    def _signs(self, summary: Summary) -> list[Cell]:
        """How many variants have which sign; rates have none."""
        if not summary.compared.comparison.factor:
            return [None, None, None, summary.without, None, None, None]
        return [
            summary.positive,
            summary.negative,
            summary.zero,
            summary.without,
            summary.same_sign,
            summary.clear,
            summary.apart,
        ]

    def _decisions(self) -> Iterable[list[Cell]]:
        crossing = self._results.crossing
        for summary in self._results.summaries:
            compared = summary.compared
            turns = turning(compared.difference, crossing).tolist()
            clears = turning(summary.side, crossing).tolist()
            shares = {own.setting: own for own in summary.shares}
            for number, setting in enumerate(crossing.settings):
                share = shares.get(number)
                for place, alternative in enumerate(setting.alternatives):
                    own = crossing.choices[:, number] == place
                    values = compared.difference[own]
                    values = values[~np.isnan(values)]
                    signed: list[Cell] = [None, None, None]
                    if compared.comparison.factor:
                        apart = int((np.abs(summary.side[own]) > 0).sum())
                        signed = [turns[number], apart, clears[number]]
                    yield [
                        *astuple(compared.comparison),
                        setting.key,
                        alternative,
                        int(place == setting.base),
                        int(own.sum()),
                        int(own.sum()) - len(values),
                        float(values.mean()) if len(values) else None,
                        None if share is None else share.alone,
                        None if share is None else share.together,
                        *signed,
                    ]

    def _changes(self) -> Iterable[list[Cell]]:
        for own in self._results.changes:
            chances = own.hangs.tolist()
            whole = sum(chances)
            for key, chance in zip(self._keys, chances, strict=True):
                yield [
                    own.measure,
                    own.kind,
                    own.region,
                    own.cells,
                    own.changed,
                    own.trials,
                    key,
                    _or_none(chance),
                    chance / whole if whole > 0 else None,
                ]

    def _changes_by_variant(self) -> Iterable[list[Cell]]:
        for variant in range(len(self._results.crossing)):
            for own in self._results.changes:
                yield [
                    variant + 1,
                    own.measure,
                    own.region,
                    int(own.changed_by[variant]),
                    int(own.trials_by[variant]),
                ]

    def _readers(self, readers: Sequence[ReaderHangs]) -> Iterable[list[Cell]]:
        for reader in readers:
            own = reader.hangs
            for key, chance in zip(self._keys, own.chances(self._pairs), strict=True):
                yield [reader.participant, own.of, own.cells, key, _or_none(chance)]

    def _codebook(self) -> Iterable[list[Cell]]:
        tables: Mapping[str, str] = {
            **VARIANT_ROWS,
            CODEBOOK: "a column of a table",
        }
        columns = {**self._columns, CODEBOOK: _CODEBOOK_COLUMNS}
        for table, row in tables.items():
            for column in columns[table]:
                yield [
                    table,
                    row,
                    column.name,
                    column.type,
                    column.meaning,
                    int(column.nullable),
                    ", ".join(column.levels) or None,
                ]


def _or_none(value: float) -> float | None:
    """A number; none for what is not there."""
    return None if math.isnan(value) else float(value)
