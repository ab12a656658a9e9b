"""The first trial of the first log, read as a build would read it by the draft."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import group_rows
from etl.parsers import CanonicalLog, reader_for
from etl.study.examine import examine
from etl.study.models import Logs
from etl.study.questions import OPEN

#: Larger logs are not read as a whole, so that a draft takes seconds.
_MOST_BYTES = 40_000_000
_MOST_ROWS = 12
_MOST_TOLD = 3
_NEEDED = ("participant", "trial")


def first_trial(text: str, log: Path, shown: str, eye: str, findings: Findings) -> str:
    """Read the first log by a draft, and show its first trial.

    Parameters
    ----------
    text : str
        The study file.
    log : Path
        The first log.
    shown : str
        Its name for messages.
    eye : str
        The eye that is shown where the draft asks which one counts; empty where it does not.
    findings : Findings
        Where it is recorded that the log does not read as the draft says.

    Returns
    -------
    str
        A table with a line of explanation above it; empty where too much is still open.
    """
    if log.stat().st_size > _MOST_BYTES:
        return ""
    data = tomllib.loads(text)
    in_degrees = _made_readable(data, eye)
    study = examine(data, None).draft
    if not _says_enough(study.logs):
        return ""
    reader = reader_for(study.logs, study.screen)
    own = Findings()
    read = reader.read(log, shown, own)
    if read is None:
        _tell_unread(own, shown, findings)
        return ""
    rows, _ = read
    if not len(rows) or not all(name in rows.ids for name in _NEEDED):
        return ""
    return _shown(rows, shown, "deg" if in_degrees else "px", eye)


def _made_readable(data: dict[str, Any], eye: str) -> bool:
    """Answer for now which eye counts; take degrees as they are, and say whether there are any."""
    logs = data["logs"]
    if eye and logs.get("eye", {}).get("use") == OPEN:
        logs["eye"]["use"] = eye
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
    return bool(lasts and (columns.onset or columns.fixation))


def _tell_unread(own: Findings, shown: str, findings: Findings) -> None:
    """Warn of what stands in the way, with the first problems as they were found."""
    findings.warning(
        "the first log does not read as the draft says",
        path=shown,
        fix="correct the draft; these are the first problems:",
    )
    for problem in own.of("error")[:_MOST_TOLD]:
        findings.add(replace(problem, severity="warning"))


def _shown(rows: CanonicalLog, shown: str, unit: str, eye: str) -> str:
    """The first fixations of the first trial as a table."""
    _, group = group_rows([rows.ids[name] for name in _NEEDED])
    own = np.flatnonzero(group == group[0])
    trial = rows.take(own)
    count = len(trial)
    head = ", ".join(f"{name} {coded.text(int(own[0]))}" for name, coded in rows.ids.items())
    columns = _columns(trial, unit)
    width = {name: max(len(name), *map(len, cells)) for name, cells in columns.items()}
    lines = ["  ".join(f"{name:>{width[name]}}" for name in columns)]
    lines += [
        "  ".join(f"{cells[row]:>{width[name]}}" for name, cells in columns.items())
        for row in range(min(count, _MOST_ROWS))
    ]
    if count > _MOST_ROWS:
        lines.append(f"… and {count - _MOST_ROWS:,} more")
    about = f", eye {eye}" if eye else ""
    top = f"The first trial as it is understood ({head}{about}; {shown}):"
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
