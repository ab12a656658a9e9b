"""The columns of one log under its own names, and units of them that contradict the study's."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Final

from etl.errors import Findings
from etl.files import Cells
from etl.files.units import own_names, unit_in, units_in_row
from etl.parsers.log_rows import RowReading

if TYPE_CHECKING:
    from etl.study.models import Column

#: The units that the study file knows for the columns that have one.
_TIMES: Final = ("ms", "s", "us")
_PLACES: Final = ("px", "deg")
_KNOWN: Final = {"onset": _TIMES, "end": _TIMES, "duration": _TIMES, "x": _PLACES, "y": _PLACES}
#: The columns that hold numbers, with a unit or without one.
_NUMBERS: Final = (*_KNOWN, "fixation")


def own_reading(reading: RowReading, header: tuple[str, ...]) -> RowReading:
    """The reading of one log, with the log's own names of the columns.

    Parameters
    ----------
    reading : RowReading
        The reading of all logs, with the names that the study file gives.
    header : tuple of str
        The names of the log. One may have a known unit in brackets that the study leaves out.

    Returns
    -------
    RowReading
        The same one where the log has the study's names.
    """
    own = own_names(reading.needed(), header)
    if all(name == asked for asked, name in own.items()):
        return reading

    def renamed(column: Column) -> Column:
        return column.model_copy(update={"column": own.get(column.column, column.column)})

    logs = reading.logs
    columns = {name: renamed(column) for name, column in logs.columns.present().items()}
    changed: dict[str, object] = {"columns": logs.columns.model_copy(update=columns)}
    if logs.eye is not None:
        by_eye = {
            eye: each.model_copy(
                update={
                    name: renamed(column)
                    for name in type(each).model_fields
                    if (column := getattr(each, name)) is not None
                }
            )
            for eye, each in logs.eye.columns.items()
        }
        changed["eye"] = logs.eye.model_copy(update={"columns": by_eye})
    return replace(reading, logs=logs.model_copy(update=changed))


def check_units(
    reading: RowReading, header: tuple[str, ...], place: tuple[str, int], findings: Findings
) -> None:
    """Hold the units in a log's header against those of the study.

    Parameters
    ----------
    reading : RowReading
        The reading of all logs, with the names that the study file gives.
    header : tuple of str
        The names of the log.
    place : tuple of (str, int)
        The log's name for messages, and the line of its header.
    findings : Findings
        Where contradictions are recorded: a warning where the study states the unit, an error
        where it leaves it to the default.
    """
    own = own_names(reading.needed(), header)
    units = {name: unit for name in own.values() if (unit := unit_in(name)) is not None}
    _hold(reading, (own, units), "header", place, findings)


def without_unit_rows(reading: RowReading, cells: Cells, findings: Findings) -> Cells:
    """Set aside the rows of units below a log's header, and hold them against those of the study.

    Parameters
    ----------
    reading : RowReading
        The reading of all logs, with the names that the study file gives.
    cells : Cells
        The log. Only the first rows below its header, and below one that is repeated, can be rows
        of units: see :func:`etl.files.units.units_in_row`.
    findings : Findings
        Where contradictions are recorded, as by :func:`check_units`.

    Returns
    -------
    Cells
        The log without these rows, which are counted as ``"row of units"``.
    """
    own = own_names(reading.needed(), cells.header)
    numeric = {own[header] for header in _headers_of_numbers(reading) if header in own}
    missing = reading.missing()
    columns = {name: cells.table.column(name) for name in cells.table.column_names}
    rows: list[int] = []
    for row in cells.below_headers:
        if rows and row <= rows[-1]:
            continue
        while row < len(cells):
            texts = {name: column[row].as_py() for name, column in columns.items()}
            units = units_in_row(texts, numeric, missing)
            if not units:
                break
            _hold(reading, (own, units), "row", (cells.shown, int(cells.lines[row])), findings)
            rows.append(row)
            row += 1
    return cells.without(rows, "row of units")


def _headers_of_numbers(reading: RowReading) -> set[str]:
    """The study's names of the columns that hold numbers, those of both eyes included."""
    eye = reading.logs.eye
    by_eye: Mapping[str, object] = {} if eye is None else eye.columns
    every = [reading.columns().get(name) for name in _NUMBERS]
    every += [getattr(each, name, None) for each in by_eye.values() for name in _NUMBERS]
    return {column.column for column in every if column is not None}


def _hold(
    reading: RowReading,
    stated: tuple[Mapping[str, str], Mapping[str, str]],
    source: str,
    place: tuple[str, int],
    findings: Findings,
) -> None:
    """Record units that contradict the study's.

    ``stated``: the log's names by those of the study, and units by the log's names; ``source``:
    whether the header or a row names them.
    """
    own, units = stated
    what = "header" if source == "header" else "row of units"
    told: set[str] = set()
    for key, name, column in _measured(reading):
        found = units.get(own.get(column.column, ""))
        if found is None or found == column.unit or column.column in told:
            continue
        told.add(column.column)
        where = f'column "{own[column.column]}"'
        if "unit" in column.model_fields_set:
            findings.warning(
                f"the {what} names another unit than the study file",
                path=place[0],
                line=place[1],
                where=where,
                found=found,
                expected=f"{column.unit}, as [{key}] says",
                fix=f"correct the unit in [{key}], unless the {source} is wrong; or, if only this "
                "log says so, export it again",
            )
            continue
        entry = f'{name} = {{ column = "{column.column}", unit = "'
        way = (
            f'write {entry}{found}" }} in [{key}]; or, if only this log says so, export it again; '
            f'or, if the {source} is wrong, state unit = "{column.unit}"'
        )
        other = (
            f"name a column in {' or '.join(_KNOWN[name])}, or export the log again; or, if the "
            f'{source} is wrong, write {entry}{column.unit}" }} in [{key}]'
        )
        findings.error(
            f"the {what} names a unit, and the study file leaves it at another",
            path=place[0],
            line=place[1],
            where=where,
            found=found,
            expected=f"{column.unit}, which {name} has where no unit is stated",
            fix=way if found in _KNOWN[name] else other,
        )


def _measured(reading: RowReading) -> Iterator[tuple[str, str, Column]]:
    """Table of the study file, canonical name and description of each column with a unit."""
    eye = reading.logs.eye
    by_eye: Mapping[str, object] = {} if eye is None else eye.columns
    for one, each in by_eye.items():
        for name in _KNOWN:
            column = getattr(each, name)
            if column is not None:
                yield f"logs.eye.columns.{one}", name, column
    for name, column in reading.columns().items():
        if name in _KNOWN:
            yield "logs.columns", name, column
