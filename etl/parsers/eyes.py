"""Which eye counts, where both were recorded: in rows of their own, or in one row."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Finding, Findings
from etl.files import Coded, marks_of
from etl.parsers.canonical import LogNote
from etl.parsers.parts import EyeRows, Part
from etl.parsers.time_checks import WAY_OUT
from etl.pseudonyms import Pseudonyms

if TYPE_CHECKING:
    from etl.study.models import Logs


#: What tells that an eye has a fixation in a row that holds both: one of these columns of its own.
_TIMES = ("onset", "end", "duration")
#: Rows of an eye that nothing names are doubtful where they are fewer than this share of a reader's
#: rows: two eyes that are recorded give about as many rows each (our choice).
_FEW = 0.1


@dataclass(frozen=True, slots=True)
class ChosenEye:
    """The rows and columns of the eye that counts.

    Attributes
    ----------
    rows : (n,) bool array
        Whether each row is of that eye.
    columns : dict of str to (n,) pa.Array of text
        Columns put together from those of both eyes, by a header that names both.
    headers : dict of str to str
        The header of each column that is read, by canonical name.
    own : dict of str to dict of int to str
        For each header that names both: the header of each row, by line.
    """

    rows: NDArray[np.bool_]
    columns: dict[str, pa.Array]
    headers: dict[str, str]
    own: dict[str, dict[int, str]] = field(default_factory=dict)

    def under_own_headers(self, findings: Findings) -> Findings:
        """The same findings, those about a column of both eyes under the header of their row's eye.

        Parameters
        ----------
        findings : Findings
            What was found in the rows.

        Returns
        -------
        Findings
            Of those of a kind that were only counted, none can be told to be of either eye; they
            stay with the first.
        """
        joint = {f'column "{header}"': by_line for header, by_line in self.own.items()}
        if not any(finding.where in joint for finding in findings):
            return findings
        renamed = Findings()
        more = findings.more.copy()
        first: dict[tuple[str, str, str, str], Finding] = {}
        for finding in findings:
            own = joint.get(finding.where, {}).get(finding.line or 0)
            named = finding if own is None else replace(finding, where=f'column "{own}"')
            first.setdefault(finding.kind, named)
            renamed.add(named)
            more[finding.kind] -= 1
        for kind, count in more.items():
            if count > 0 and kind in first:
                renamed.more[first[kind].kind] += count
        return renamed


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
    def of(
        cls,
        logs: Logs,
        table: Mapping[str, str] | None = None,
        pseudonyms: Pseudonyms | None = None,
    ) -> EyeChoice:
        """The choice of a study.

        Parameters
        ----------
        logs : Logs
            The study's ``[logs]``.
        table : mapping of str to str, optional
            What the reader table says of each reader.
        pseudonyms : Pseudonyms, optional
            By which readers go; those of the table do so already.

        Returns
        -------
        EyeChoice
        """
        eye = logs.eye
        if eye is None:
            return cls()
        hide = str if pseudonyms is None else pseudonyms.of_reader
        own = {hide(name): which for name, which in eye.readers.items()}
        return cls(eye.use or "", {**(table or {}), **own})

    def of_reader(self, participant: str) -> str:
        """The eye that counts for a reader; empty where nothing says so."""
        return self.readers.get(participant) or self.use

    def known(self, logs: Logs, header: str) -> set[str]:
        """The eyes that the study names, where each row is of one eye."""
        listed = [v for name, vs in logs.where.items() if name in ("eye", header) for v in vs]
        return {self.use, *self.readers.values(), *listed}

    def headers(self, logs: Logs) -> list[str]:
        """The headers of the columns of both eyes, where a row holds both."""
        if logs.eye is None:
            return []
        every = (getattr(c, n) for c in logs.eye.columns.values() for n in type(c).model_fields)
        return [column.column for column in every if column is not None]

    def choose(
        self,
        rows: tuple[Mapping[str, pa.Array], NDArray[np.int32]],
        headers: Mapping[str, str],
        ids: Mapping[str, Coded],
        logs: Logs,
        note: LogNote,
        findings: Findings,
        part: Part | None = None,
    ) -> ChosenEye | None:
        """The rows and columns of the eye that counts.

        Parameters
        ----------
        rows : tuple of mapping of str to (n,) pa.Array of text, and (n,) int32 array
            The cells by header, and the line of each row.
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
        part : Part, optional
            The part of the log that the rows are. How many rows each eye has is put down there.

        Returns
        -------
        ChosenEye or None
            None where a problem was recorded.
        """
        (cells, lines), reader = rows, ids["participant"]
        wanted = [self.of_reader(name) for name in reader.values]
        before = findings.count("error")
        for code, eye in enumerate(wanted):
            own = np.flatnonzero(reader.codes == code)
            if own.size and not eye:
                findings.error(
                    "nothing says which eye of this reader counts",
                    path=note.shown,
                    line=int(lines[own[0]]),
                    where="logs.eye",
                    found=reader.values[code],
                    expected="an eye",
                    fix='add the reader to [logs.eye] readers, or add use = "…"',
                )
        if findings.count("error") > before or logs.eye is None:
            return None
        if logs.eye.columns:
            chosen = _of_columns(cells, (lines, reader, wanted), headers, logs, note, findings)
        else:
            chosen = self._of_rows(
                cells, (lines, reader, wanted), headers, logs, note, findings, part
            )
        if chosen is None:
            return None
        for code, eye in enumerate(wanted):
            own = reader.codes == code
            if part is not None:
                if own.any():
                    part.chosen[reader.values[code]] = bool(chosen.rows[own].any())
            elif own.any() and not chosen.rows[own].any():
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

    def _of_rows(
        self,
        cells: Mapping[str, pa.Array],
        who: _Who,
        headers: Mapping[str, str],
        logs: Logs,
        note: LogNote,
        findings: Findings,
        part: Part | None,
    ) -> ChosenEye | None:
        """The rows of the eye that counts, where each row is of one eye."""
        lines, reader, wanted = who
        header = headers["eye"]
        eye = Coded.of(cells[header], marks_of(logs.missing))
        sound = True
        for row in np.flatnonzero(eye.codes < 0).tolist():
            sound = False
            findings.error(
                "the row does not say which eye it is of",
                path=note.shown,
                line=int(lines[row]),
                where=f'column "{header}"',
                found=cells[header][row].as_py(),
                expected="an eye",
                fix=WAY_OUT,
            )
        known = self.known(logs, header)
        for code in range(len(reader.values)):
            own = np.flatnonzero(reader.codes == code)
            rows_of = _rows_of_eyes(eye, own)
            if part is not None:
                part.eyes[reader.values[code]] = {
                    eye.values[which]: EyeRows(count, int(lines[row]))
                    for which, (count, row) in rows_of.items()
                }
                continue
            by_name = {eye.values[which]: found for which, found in rows_of.items()}
            for row in doubtful(by_name, len(own), known):
                sound = False
                findings.error(
                    "few rows of this reader are of an eye that nothing names",
                    path=note.shown,
                    line=int(lines[row]),
                    where=f'column "{header}"',
                    found=eye.text(row),
                    expected=f"{wanted[code]}, or the other eye in about as many rows",
                    fix=f'{WAY_OUT}; where = {{ "{header}" = […] }} with all eyes keeps them',
                )
        code_of = {text: code for code, text in enumerate(eye.values)}
        codes = np.array([*(code_of.get(one, -2) for one in wanted), -2], dtype=np.int32)
        return ChosenEye(eye.codes == codes[reader.codes], {}, dict(headers)) if sound else None


#: Line of each row, who read it, and the eye that counts for each reader.
_Who = tuple[NDArray[np.int32], Coded, list[str]]


def _rows_of_eyes(eye: Coded, own: NDArray[np.int64]) -> dict[int, tuple[int, int]]:
    """For each eye of a reader how many rows name it, and the first of them."""
    codes, first, counts = np.unique(eye.codes[own], return_index=True, return_counts=True)
    return {
        int(code): (int(count), int(own[place]))
        for code, place, count in zip(codes, first, counts, strict=True)
        if code >= 0
    }


def doubtful(
    eyes: Mapping[str, tuple[int, int]], rows: int, known: Collection[str]
) -> Iterator[int]:
    """The first row of each eye of a reader that can hardly be the reader's other eye.

    Parameters
    ----------
    eyes : mapping of str to (int, int)
        For each eye how many rows name it, and the first of them.
    rows : int
        How many rows the reader has.
    known : collection of str
        The eyes that the study names.

    Yields
    ------
    int
        A row.
    """
    strange = [found for name, found in eyes.items() if name not in known]
    named = len(eyes) - len(strange)
    # A reader has two eyes: besides those that are named, the most frequent one may be the other.
    for count, row in sorted(strange, reverse=True)[: 2 - named if named < 2 else 0]:
        if count < _FEW * rows:
            yield row
    for _, row in sorted(strange, reverse=True)[max(2 - named, 0) :]:
        yield row


def _of_columns(
    cells: Mapping[str, pa.Array],
    who: _Who,
    headers: Mapping[str, str],
    logs: Logs,
    note: LogNote,
    findings: Findings,
) -> ChosenEye | None:
    """The columns of the eye that counts, where a row holds both."""
    lines, reader, wanted = who
    assert logs.eye is not None  # noqa: S101
    by_eye = logs.eye.columns
    names = list(by_eye)
    sound = True
    for code, one in enumerate(wanted):
        rows = np.flatnonzero(reader.codes == code)
        if rows.size and one not in by_eye:
            sound = False
            findings.error(
                "the eye that counts for this reader has no columns",
                path=note.shown,
                line=int(lines[rows[0]]),
                where="logs.eye",
                found=f"{one} for {reader.values[code]}",
                expected="one of " + ", ".join(names),
                fix="correct the name of the eye, or add its columns to [logs.eye.columns]",
            )
    if not sound:
        return None
    eye = np.array([names.index(one) if one in by_eye else -1 for one in wanted])[reader.codes]
    present = np.unique(eye).tolist()
    chosen = ChosenEye(np.ones(len(eye), dtype=bool), {}, dict(headers))
    missing = marks_of(logs.missing)
    filled = np.zeros((len(names), len(eye)), dtype=bool)
    timed = False
    for key in type(by_eye[names[0]]).model_fields:
        columns = [getattr(by_eye[name], key) for name in names]
        if columns[0] is None:
            continue
        every = [cells[column.column] for column in columns]
        if key in (*_TIMES, "x", "y"):
            filled |= np.array([Coded.of(one, missing).codes >= 0 for one in every])
            timed |= key in _TIMES
        used = [columns[code].column for code in present]
        chosen.headers[key] = joint = " or ".join(used)
        if len(present) > 1:
            chosen.columns[joint] = _picked(every, eye)
            own = [columns[code].column for code in eye.tolist()]
            chosen.own[joint] = dict(zip(lines.tolist(), own, strict=True))
    if not timed:
        # When and for how long is said once for both eyes: every row is a fixation of both.
        return chosen
    # A row that holds nothing of either eye stays, for what is wrong with it.
    own_filled = filled[eye, np.arange(len(eye))]
    return replace(chosen, rows=own_filled | ~filled.any(axis=0))


def _picked(columns: list[pa.Array], which: NDArray[np.integer]) -> pa.Array:
    """From several columns the cell of the one that is named for each row."""
    places = which * len(which) + np.arange(len(which))
    return pa.concat_arrays(columns).take(pa.array(places.astype(np.int64)))
