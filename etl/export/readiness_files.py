"""Readiness as files: a table of counts, a table of formulas, and everything as JSON."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator, Mapping
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any, Final

from etl.cells import Cell, write_csv
from etl.readiness.facts import (
    ROWS_REMARK,
    VERDICT_RULES,
    CellCount,
    OutcomeReadiness,
    Readiness,
    UnitCount,
)

COUNTS: Final = "readiness.csv"
FORMULAS: Final = "formulas.csv"
EVERYTHING: Final = "readiness.json"
FORMULA_COLUMNS: Final = (
    "outcome",
    "region",
    "step",
    "formula",
    "change",
    "fixed_parameters",
    "random_parameters",
    "random_effects",
    "ones_per_parameter",
    "expectation",
    "start",
)
_UNITS: Final = (("participant", "readers"), ("item", "items"))


def count_columns(readiness: Readiness) -> tuple[str, ...]:
    """The columns of ``readiness.csv``: one for each factor stands after the region."""
    units = [f"{word}{end}" for _, word in _UNITS for end in ("", "_all_zero", "_all_one")]
    counted = ("zeros", "ones", "missing", "rate", "rate_low", "rate_high", "state")
    return ("outcome", "region", *readiness.factors, *counted, *units, "verdict", "why")


def count_rows(readiness: Readiness) -> Iterator[list[Cell]]:
    """The rows of ``readiness.csv``.

    Parameters
    ----------
    readiness : Readiness
        All binary outcomes.

    Yields
    ------
    list of str, int, float or None
        For each outcome and region first the row for all conditions, which names no levels and has
        the verdict and why; then, in a study with factors, one for each condition.
    """
    none = ("",) * len(readiness.factors)
    for own in readiness.outcomes:
        yield [*_counted(own, own.total, none), *_units(own.units), own.verdict, own.why]
        if readiness.factors:
            for cell, units in zip(own.cells, own.cell_units, strict=True):
                yield [*_counted(own, cell, cell.levels), *_units(units), None, None]


def _counted(own: OutcomeReadiness, cell: CellCount, levels: tuple[str, ...]) -> list[Cell]:
    """What is counted in one row."""
    rates = (cell.rate, cell.low, cell.high)
    values = (cell.zeros, cell.ones, cell.missing, *rates, cell.state)
    return [own.outcome, own.region, *levels, *values]


def _units(units: tuple[UnitCount, ...]) -> list[Cell]:
    """Readers and items; empty cells where the study knows none."""
    known = {own.unit: (own.units, own.all_zero, own.all_one) for own in units}
    return [count for unit, _ in _UNITS for count in known.get(unit, (None,) * 3)]


def formula_rows(readiness: Readiness) -> Iterator[list[Cell]]:
    """The rows of ``formulas.csv``.

    Parameters
    ----------
    readiness : Readiness
        All binary outcomes.

    Yields
    ------
    list of str, int or float
        A step of a ladder each.
    """
    for own in readiness.outcomes:
        for step in own.ladder:
            yield [
                own.outcome,
                own.region,
                step.number,
                step.formula,
                step.change,
                step.fixed_parameters,
                step.random_parameters,
                step.random_effects,
                step.ones_per_parameter,
                step.expectation,
                int(step.number == own.start),
            ]


def as_json(readiness: Readiness) -> dict[str, Any]:
    """Everything as plain lists and mappings, for JSON.

    Parameters
    ----------
    readiness : Readiness
        All binary outcomes.

    Returns
    -------
    dict
        The fields of :class:`etl.readiness.facts.Readiness`, with ``null`` for what is not a
        number, after what verdicts mean and what holds of all rows.
    """
    told: dict[str, Any] = _plain(readiness)
    for own, facts in zip(told["outcomes"], readiness.outcomes, strict=True):
        cells = zip((own["total"], *own["cells"]), (facts.total, *facts.cells), strict=True)
        for cell, fact in cells:
            cell["rate"], cell["state"] = _plain(fact.rate), fact.state
        for variation, known in zip(own["variations"], facts.variations, strict=True):
            variation["supported"] = known.supported
    return {"verdicts": dict(VERDICT_RULES), "rows": ROWS_REMARK, **told}


def _plain(value: Any) -> Any:
    """Mappings for facts, lists for tuples; None for numbers that are none."""
    if is_dataclass(value):
        return {one.name: _plain(getattr(value, one.name)) for one in fields(value)}
    if isinstance(value, tuple):
        return [_plain(own) for own in value]
    return None if isinstance(value, float) and not math.isfinite(value) else value


def write_readiness_files(readiness: Readiness, folder: Path) -> None:
    """Write the three files.

    Parameters
    ----------
    readiness : Readiness
        All binary outcomes.
    folder : Path
        Where they go; files of these names are replaced.
    """
    write_csv(folder / COUNTS, count_columns(readiness), count_rows(readiness))
    write_csv(folder / FORMULAS, FORMULA_COLUMNS, formula_rows(readiness))
    (folder / EVERYTHING).write_text(_laid_out(as_json(readiness)), encoding="utf-8", newline="\n")


def _laid_out(told: Mapping[str, Any]) -> str:
    """JSON with a line for each entry of a list: an indented text takes five times as long."""
    write = json.JSONEncoder(ensure_ascii=False).encode
    parts = []
    for name, value in told.items():
        listed = isinstance(value, list) and value
        text = "[\n" + ",\n".join(map(write, value)) + "\n]" if listed else write(value)
        parts.append(f"{write(name)}: {text}")
    return "{\n" + ",\n".join(parts) + "\n}\n"
