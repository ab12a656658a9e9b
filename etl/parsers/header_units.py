"""The columns of one log under its own names, and units in them that contradict the study's."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Final

from etl.errors import Findings
from etl.files.units import own_names, unit_in
from etl.parsers.log_rows import RowReading

if TYPE_CHECKING:
    from etl.study.models import Column

#: The units that the study file knows for the columns that have one.
_TIMES: Final = ("ms", "s", "us")
_PLACES: Final = ("px", "deg")
_KNOWN: Final = {"onset": _TIMES, "end": _TIMES, "duration": _TIMES, "x": _PLACES, "y": _PLACES}


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
    told: set[str] = set()
    for key, name, column in _measured(reading):
        found = unit_in(own.get(column.column, ""))
        if found is None or found == column.unit or column.column in told:
            continue
        told.add(column.column)
        where = f'column "{own[column.column]}"'
        if "unit" in column.model_fields_set:
            findings.warning(
                "the header names another unit than the study file",
                path=place[0],
                line=place[1],
                where=where,
                found=found,
                expected=f"{column.unit}, as [{key}] says",
                fix=f"correct the unit in [{key}], unless the header is wrong",
            )
            continue
        entry = f'{name} = {{ column = "{column.column}", unit = "'
        findings.error(
            "the header names a unit, and the study file leaves it at another",
            path=place[0],
            line=place[1],
            where=where,
            found=found,
            expected=f"{column.unit}, which {name} has where no unit is stated",
            fix=f'write {entry}{found}" }} in [{key}]; or, if the header is wrong, '
            f'unit = "{column.unit}"'
            if found in _KNOWN[name]
            else f"name a column in {' or '.join(_KNOWN[name])}; or, if the header is wrong, "
            f'write {entry}{column.unit}" }} in [{key}]',
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
