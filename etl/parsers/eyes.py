"""Which eye counts, where both were recorded: in rows of their own, or in one row."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, marks_of
from etl.parsers.canonical import LogNote

if TYPE_CHECKING:
    from etl.study.models import Logs


@dataclass(frozen=True, slots=True)
class ChosenEye:
    """The rows and columns of the eye that counts.

    Attributes
    ----------
    rows : (n,) bool array
        Whether each row is of that eye.
    columns : dict of str to (n,) pa.Array of text
        Columns put together from those of both eyes, by header.
    headers : dict of str to str
        The header of each column that is read, by canonical name.
    """

    rows: NDArray[np.bool_]
    columns: dict[str, pa.Array]
    headers: dict[str, str]


@dataclass(frozen=True, slots=True)
class EyeChoice:
    """Which eye counts for each reader.

    Attributes
    ----------
    use : str
        The eye of every reader of whom nothing else is said; empty where there is none.
    readers : mapping of str to str
        The eye of single readers.

    Examples
    --------
    >>> choice = EyeChoice("R", {"P02": "L"})
    >>> choice.of_reader("P01"), choice.of_reader("P02")
    ('R', 'L')
    """

    use: str = ""
    readers: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, logs: Logs, table: Mapping[str, str] | None = None) -> EyeChoice:
        """The choice of a study.

        Parameters
        ----------
        logs : Logs
            The study's ``[logs]``.
        table : mapping of str to str, optional
            What the reader table says of each reader.

        Returns
        -------
        EyeChoice
        """
        eye = logs.eye
        if eye is None:
            return cls()
        return cls(eye.use or "", {**(table or {}), **eye.readers})

    def of_reader(self, participant: str) -> str:
        """The eye that counts for a reader; empty where nothing says so."""
        return self.readers.get(participant, self.use)

    def headers(self, logs: Logs) -> list[str]:
        """The headers of the columns of both eyes, where a row holds both."""
        if logs.eye is None:
            return []
        every = (getattr(c, n) for c in logs.eye.columns.values() for n in type(c).model_fields)
        return [column.column for column in every if column is not None]

    def choose(
        self,
        cells: Mapping[str, pa.Array],
        lines: NDArray[np.int32],
        headers: Mapping[str, str],
        ids: Mapping[str, Coded],
        logs: Logs,
        note: LogNote,
        findings: Findings,
    ) -> ChosenEye | None:
        """The rows and columns of the eye that counts.

        Parameters
        ----------
        cells : mapping of str to (n,) pa.Array of text
            The cells by header.
        lines : (n,) int32 array
            Line of each row.
        headers : mapping of str to str
            The header of each column that is read, by canonical name.
        ids : mapping of str to Coded
            Who read each row.
        logs : Logs
            The study's ``[logs]``.
        note : LogNote
            The log.
        findings : Findings
            Where it is recorded for whom no eye is chosen, or whose chosen eye has no row.

        Returns
        -------
        ChosenEye or None
            None where a problem was recorded.
        """
        reader = ids["participant"]
        wanted = [self.of_reader(name) for name in reader.values]
        before = findings.count("error")
        for code, eye in enumerate(wanted):
            rows = np.flatnonzero(reader.codes == code)
            if rows.size and not eye:
                findings.error(
                    "nothing says which eye of this reader counts",
                    path=note.shown,
                    line=int(lines[rows[0]]),
                    where="logs.eye",
                    found=reader.values[code],
                    expected="an eye",
                    fix='add the reader to [logs.eye] readers, or add use = "…"',
                )
        if findings.count("error") > before or logs.eye is None:
            return None
        if logs.eye.columns:
            chosen = self._columns(cells, headers, reader, wanted, logs)
        else:
            chosen = ChosenEye(self._rows(cells, headers, reader, wanted, logs), {}, dict(headers))
        for code, eye in enumerate(wanted):
            own = reader.codes == code
            if own.any() and not chosen.rows[own].any():
                findings.error(
                    "the log has nothing of the eye that counts for this reader",
                    path=note.shown,
                    line=int(lines[np.flatnonzero(own)[0]]),
                    where="logs.eye",
                    found=reader.values[code],
                    expected=f"fixations of the eye {eye}",
                    fix="name the other eye for this reader in [logs.eye] readers, or correct the "
                    "name of the eye",
                )
        return None if findings.count("error") > before else chosen

    def _rows(
        self,
        cells: Mapping[str, pa.Array],
        headers: Mapping[str, str],
        reader: Coded,
        wanted: list[str],
        logs: Logs,
    ) -> NDArray[np.bool_]:
        """Which rows are of the eye that counts, where each row is of one."""
        eye = Coded.of(cells[headers["eye"]], marks_of(logs.missing))
        code_of = {text: code for code, text in enumerate(eye.values)}
        codes = np.array([*(code_of.get(one, -2) for one in wanted), -2], dtype=np.int32)
        return np.asarray(eye.codes == codes[reader.codes])

    def _columns(
        self,
        cells: Mapping[str, pa.Array],
        headers: Mapping[str, str],
        reader: Coded,
        wanted: list[str],
        logs: Logs,
    ) -> ChosenEye:
        """The columns of the eye that counts, where a row holds both."""
        assert logs.eye is not None  # noqa: S101
        by_eye = logs.eye.columns
        names = list(by_eye)
        code_of = {name: code for code, name in enumerate(names)}
        eye = np.array([code_of.get(one, -1) for one in wanted], dtype=np.int32)[reader.codes]
        present = np.unique(eye).tolist()
        own = dict(headers)
        merged: dict[str, pa.Array] = {}
        seen = np.zeros(len(eye), dtype=bool)
        missing = marks_of(logs.missing)
        for key in type(by_eye[names[0]]).model_fields:
            columns = [getattr(by_eye[name], key) for name in names]
            if columns[0] is None:
                continue
            used = [columns[code].column for code in present if code >= 0]
            if len(present) == 1 and used:
                own[key] = used[0]
                cell = cells[used[0]]
            else:
                own[key] = " or ".join(used)
                cell = _picked([cells[column.column] for column in columns], eye)
                merged[own[key]] = cell
            seen |= Coded.of(cell, missing).codes >= 0
        return ChosenEye(seen & (eye >= 0), merged, own)


def _picked(columns: list[pa.Array], which: NDArray[np.int32]) -> pa.Array:
    """From several columns the cell of the one that is named for each row; empty for none."""
    length = len(which)
    joined = pa.concat_arrays([*columns, pa.array([""], pa.string())])
    places = np.where(which < 0, len(columns) * length, which * length + np.arange(length))
    return joined.take(pa.array(places.astype(np.int64)))
