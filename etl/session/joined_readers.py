"""Groups of readers: the kept fixations and the trials of several, joined."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from etl.export.rows import TrialColumns
from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.session.kept_logs import Aside, kept_log
from etl.session.lines import NO_HAND, HandLines
from etl.session.reader import ReaderGroup, starts_of

if TYPE_CHECKING:
    from etl.session.work import ReaderTask

_PLAIN = ("onset_ms", "number", "duration_ms", "x_px", "y_px", "source_line", "blink", "recording")


def group_of(tasks: Sequence[ReaderTask], aside: Aside) -> ReaderGroup:
    """Take back the fixations of some readers.

    Parameters
    ----------
    tasks : sequence of ReaderTask
        The readers, in the order of the tables; at least one.
    aside : Aside
        Where their fixations are.

    Returns
    -------
    ReaderGroup
    """
    logs, files = [], []
    for task in tasks:
        log, part = kept_log(task.parts, aside)
        logs.append(log)
        files.append(np.asarray(task.files, dtype=np.int32)[part])
    trials = [task.trials for task in tasks]
    trial_starts = starts_of([len(own) for own in trials])
    return ReaderGroup(
        tuple(task.participant for task in tasks),
        _joined(logs),
        _end_to_end(files),
        starts_of([len(log) for log in logs]),
        TrialColumns.joined(trials),
        trial_starts,
        tuple(task.note for task in tasks),
        _joined_hand([task.hand for task in tasks], trial_starts),
        max(task.corrections for task in tasks),
        tuple(() if log.label is None else log.label.values for log in logs),
    )


def _joined(logs: Sequence[CanonicalLog]) -> CanonicalLog:
    """The logs of several readers as one; who each reader is stands elsewhere."""
    if len(logs) == 1:
        return logs[0]
    # Not every reader need have come in sessions.
    names = dict.fromkeys(name for log in logs for name in log.ids if name != "participant")
    labels = [log.label for log in logs if log.label is not None]
    return CanonicalLog(
        ids={
            name: _joined_texts([log.ids.get(name, Coded.absent(len(log))) for log in logs])
            for name in names
        },
        facts={},
        label=_joined_texts(labels) if labels else None,
        **{name: _end_to_end([getattr(log, name) for log in logs]) for name in _PLAIN},
    )


def _joined_texts(parts: Sequence[Coded]) -> Coded:
    """Columns of several readers, one below the other; those of one log share their texts."""
    if all(part.values == parts[0].values for part in parts[1:]):
        return Coded(_end_to_end([part.codes for part in parts]), parts[0].values)
    return Coded.joined(parts)


def _end_to_end(arrays: Sequence[NDArray[Any]]) -> NDArray[Any]:
    """Arrays one after the other; a single one is not copied."""
    return arrays[0] if len(arrays) == 1 else np.concatenate(arrays)


def _joined_hand(parts: Sequence[HandLines], trial_starts: NDArray[np.int64]) -> HandLines:
    """Lines set by hand, with the places of their trials in the group."""
    if not any(len(part) for part in parts):
        return NO_HAND
    return HandLines(
        np.concatenate(
            [part.trial + start for part, start in zip(parts, trial_starts[:-1], strict=True)]
        ),
        np.concatenate([part.fixation for part in parts]),
        np.concatenate([part.line for part in parts]),
        np.concatenate([part.source_line for part in parts]),
    )
