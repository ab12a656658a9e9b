"""The first trial of the first log, and how many there are, read as by a build of the draft."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from etl.drafting.made import Made
from etl.drafting.meanings import counted
from etl.errors import Findings
from etl.files import group_rows
from etl.parsers import CanonicalLog, reader_for
from etl.parsers.readers import LogReader
from etl.study.examine import examine
from etl.study.models import Logs
from etl.study.questions import OPEN

#: Larger logs are not read as a whole, so that a draft takes seconds.
_MOST_BYTES = 40_000_000
_MOST_ROWS = 12
_MOST_TOLD = 3
#: So many logs are read to count readers and trials.
_MOST_LOGS = 60
#: With fewer trials nothing tells practice; it is at most this share of a reader's trials.
_FEWEST_TRIALS, _FEW = 6, 0.25
_NEEDED = ("participant", "trial")


def first_trial(text: str, made: Made, findings: Findings) -> str:
    """Read logs by a draft, and show the first trial and how many there are.

    Parameters
    ----------
    text : str
        The study file.
    made : Made
        The logs, and the eye that is shown where the draft asks which one counts.
    findings : Findings
        Where it is recorded that the first log does not read as the draft says.

    Returns
    -------
    str
        Tables with a line of explanation above each; empty where too much is still open. Where the
        first trial looks like practice, another one from the middle follows.
    """
    log, shown = made.logs[0], made.logs[0].as_posix()
    if log.stat().st_size > _MOST_BYTES:
        return ""
    data = tomllib.loads(text)
    in_degrees = _made_readable(data, made.eye)
    study = examine(data, None).draft
    if not _says_enough(study.logs):
        return ""
    own = Findings()
    reader = reader_for(study.logs, study.screen)
    with_facts = reader_for(study.logs, study.screen, made.facts)
    read = with_facts.read(log, shown, Findings()) or reader.read(log, shown, own)
    if read is None:
        _tell_unread(own, shown, findings)
        return ""
    rows, _ = read
    if not len(rows) or not all(name in rows.ids for name in _NEEDED):
        return ""
    showing = _Showing(rows, shown, "deg" if in_degrees else "px", made.eye)
    trials = trials_in_order(rows)
    parts = [showing.trial(trials[0], "The first trial as it is understood")]
    if looks_like_practice(rows, trials):
        own_trials = [t for t in trials if _reader(rows, t) == _reader(rows, trials[0])]
        middle = own_trials[len(own_trials) // 2]
        parts.append(showing.trial(middle, "The first looks like practice; one from the middle"))
    parts.append(_counted(reader, rows, made.logs))
    return "\n\n".join(parts)


def _reader(rows: CanonicalLog, trial: NDArray[np.int64]) -> str:
    """Who read a trial."""
    return rows.ids["participant"].text(int(trial[0]))


def trials_in_order(rows: CanonicalLog) -> list[NDArray[np.int64]]:
    """The rows of each trial, in the order in which the trials begin.

    Parameters
    ----------
    rows : CanonicalLog
        The fixations of a log.

    Returns
    -------
    list of int64 array
    """
    named = [rows.ids[name] for name in (*_NEEDED, "session") if name in rows.ids]
    _, group = group_rows(named)
    order = np.argsort(group, kind="stable")
    bounds = np.flatnonzero(np.diff(group[order])) + 1
    return sorted(np.split(order, bounds), key=lambda own: int(own[0]))


def looks_like_practice(rows: CanonicalLog, trials: Sequence[NDArray[np.int64]]) -> bool:
    """Whether the first trials of a reader are few, and called otherwise than all others.

    Parameters
    ----------
    rows : CanonicalLog
        The fixations of a log.
    trials : sequence of int64 array
        The rows of each trial, in order.

    Returns
    -------
    bool
        Whether they have a level of a factor, or a form of name, that only they have.
    """
    first = [int(own[0]) for own in trials if _reader(rows, own) == _reader(rows, trials[0])]
    if len(first) < _FEWEST_TRIALS:
        return False
    said = [[_form(coded.text(row)) for row in first] for coded in rows.ids.values()]
    said += [[coded.text(row) for row in first] for coded in rows.facts.values()]
    for values in said:
        count = values.count(values[0])
        few = count <= _FEW * len(values) and len(set(values)) <= len(values) / 3
        if few and values[:count] == [values[0]] * count:
            return True
    return False


def _form(text: str) -> str:
    """What a name consists of."""
    return re.sub(r"[^\W\d_]+", "a", re.sub(r"\d+", "0", text))


def _counted(reader: LogReader, rows: CanonicalLog, logs: Sequence[Path]) -> str:
    """How many readers and trials are understood in the logs, or in the first ones of many."""
    trials: set[tuple[str, ...]] = set()
    size, unread, looked_at = 0, 0, 0
    for number, log in enumerate(logs[:_MOST_LOGS]):
        size += log.stat().st_size
        if number and size > _MOST_BYTES:
            break
        looked_at += 1
        read = (rows, None) if number == 0 else reader.read(log, log.as_posix(), Findings())
        if read is None or not all(name in read[0].ids for name in _NEEDED):
            unread += 1
            continue
        named = [n for n in (*_NEEDED, "session") if n in read[0].ids]
        firsts = [int(own[0]) for own in trials_in_order(read[0])] if len(read[0]) else []
        trials |= {tuple(read[0].ids[n].text(row) for n in named) for row in firsts}
    readers = counted(len({trial[0] for trial in trials}), "reader")
    where = f"{looked_at:,} of " if looked_at < len(logs) else ""
    told = f"Understood so: {readers} and {counted(len(trials), 'trial')} in "
    told += f"{where}{counted(len(logs), 'log')}"
    return told + (f"; {counted(unread, 'log')} cannot be read so." if unread else ".")


def _made_readable(data: dict[str, Any], eye: str) -> bool:
    """Answer for now which eye counts; take degrees as they are, and say whether there are any."""
    logs = data["logs"]
    if eye and logs.get("eye", {}).get("use") == OPEN:
        logs["eye"]["use"] = eye
    if logs.get("patterns", {}).get("other") == OPEN:
        logs["patterns"]["other"] = "ignore"
    in_degrees = False
    tables = [logs.get("columns", {}), *logs.get("eye", {}).get("columns", {}).values()]
    for columns in tables:
        for name in ("x", "y"):
            column = columns.get(name)
            if isinstance(column, dict) and column.get("unit") == "deg":
                # Without the screen's size they cannot become pixels yet.
                columns[name] = {**column, "unit": "px"}
                in_degrees = True
    if in_degrees:
        data.pop("screen", None)
    elif data.get("screen", {}).get("y_axis") == OPEN:
        # It changes where a fixation is, and not whether the log can be read.
        data["screen"]["y_axis"] = "down"
    return in_degrees


def _says_enough(logs: Logs) -> bool:
    """Whether fixations can be read though some questions are open."""
    columns = logs.columns
    lasts = columns.duration or columns.end or logs.samples
    return bool(lasts and (columns.clock or columns.fixation))


def _tell_unread(own: Findings, shown: str, findings: Findings) -> None:
    """Warn of what stands in the way, with the first problems as they were found."""
    findings.warning(
        "the first log does not read as the draft says",
        path=shown,
        fix="correct the draft; these are the first problems:",
    )
    for problem in own.of("error")[:_MOST_TOLD]:
        findings.add(replace(problem, severity="warning"))


@dataclass(frozen=True, slots=True)
class _Showing:
    """Shows trials of a log as tables."""

    rows: CanonicalLog
    shown: str
    unit: str
    eye: str

    def trial(self, own: NDArray[np.int64], title: str) -> str:
        """The first fixations of a trial as a table."""
        trial = self.rows.take(own)
        count = len(trial)
        ids = self.rows.ids.items()
        head = ", ".join(f"{name} {coded.text(int(own[0]))}" for name, coded in ids)
        columns = _columns(trial, self.unit)
        width = {name: max(len(name), *map(len, cells)) for name, cells in columns.items()}
        lines = ["  ".join(f"{name:>{width[name]}}" for name in columns)]
        lines += [
            "  ".join(f"{cells[row]:>{width[name]}}" for name, cells in columns.items())
            for row in range(min(count, _MOST_ROWS))
        ]
        if count > _MOST_ROWS:
            lines.append(f"… and {count - _MOST_ROWS:,} more")
        about = f", eye {self.eye}" if self.eye else ""
        top = f"{title} ({head}{about}; {self.shown}):"
        return "\n".join([top, "", *(f"  {line.rstrip()}" for line in lines)])


def _columns(trial: CanonicalLog, unit: str) -> Mapping[str, list[str]]:
    """The canonical columns that hold anything, as text."""
    count = min(len(trial), _MOST_ROWS)
    columns: dict[str, list[str]] = {}
    numbered = not np.isnan(trial.number).all()
    columns["fixation"] = (
        _told(trial.number[:count]) if numbered else [str(i + 1) for i in range(count)]
    )
    numbers: dict[str, NDArray[np.float64]] = {
        "onset_ms": trial.onset_ms,
        "duration_ms": trial.duration_ms,
        f"x_{unit}": trial.x_px,
        f"y_{unit}": trial.y_px,
    }
    for name, values in numbers.items():
        if not np.isnan(values).all():
            columns[name] = _told(values[:count])
    if trial.label is not None:
        columns["label"] = [trial.label.text(row) for row in range(count)]
    if trial.blink.any():
        columns["blink"] = ["yes" if touched else "" for touched in trial.blink[:count].tolist()]
    columns["line"] = [str(line) for line in trial.source_line[:count].tolist()]
    return columns


def _told(values: NDArray[np.float64]) -> list[str]:
    """Numbers with as many decimals as they need, and at most two."""
    return ["" if np.isnan(v) else f"{v:.2f}".rstrip("0").rstrip(".") for v in values.tolist()]
