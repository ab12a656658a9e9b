"""The canonical fixations that every kind of log is turned into."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from etl.files import Coded, FileAccount


@dataclass(frozen=True, slots=True)
class CanonicalLog:
    """The fixations of one log, or of one reader in it, in the order of the file.

    Attributes
    ----------
    ids : dict of str to Coded
        ``participant``, ``trial`` and, where the log has them, ``session`` and ``item``.
    facts : dict of str to Coded
        Facts about trials that stand in the log, by the header's own name.
    onset_ms, duration_ms : (n,) float64 array, milliseconds
        ``onset_ms`` is NaN throughout where the log has no onsets.
    number : (n,) float64 array
        The fixation's number in its trial as the log gives it; NaN throughout where it does not.
    x_px, y_px : (n,) float64 array, pixels
        From the top left corner of the screen, y downwards; NaN where the log has none.
    label : Coded or None
        The area that the log itself says was fixated.
    source_line : (n,) int32 array
        Line of the log, from 1.
    blink : (n,) bool array
        Whether a blink touches the fixation; False throughout where the log does not say.
    recording : (n,) int32 array
        Which recording of a trial the row belongs to, where the log itself says where each begins:
        a number that changes whenever a trial begins. -1 throughout where it does not say.
    """

    ids: dict[str, Coded]
    facts: dict[str, Coded]
    onset_ms: NDArray[np.float64]
    number: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    x_px: NDArray[np.float64]
    y_px: NDArray[np.float64]
    label: Coded | None
    source_line: NDArray[np.int32]
    blink: NDArray[np.bool_]
    recording: NDArray[np.int32]

    def __len__(self) -> int:
        return len(self.source_line)

    def take(self, rows: NDArray[np.int64]) -> CanonicalLog:
        """Some of the rows."""
        return CanonicalLog(
            {name: coded.take(rows) for name, coded in self.ids.items()},
            {name: coded.take(rows) for name, coded in self.facts.items()},
            self.onset_ms[rows],
            self.number[rows],
            self.duration_ms[rows],
            self.x_px[rows],
            self.y_px[rows],
            None if self.label is None else self.label.take(rows),
            self.source_line[rows],
            self.blink[rows],
            self.recording[rows],
        )


@dataclass(slots=True)
class LogNote:
    """What is told about a log that was read: how it was understood, and what was counted.

    Attributes
    ----------
    shown : str
        The log as the user would name it.
    sha256 : str
        Digest of the file.
    encoding, delimiter, decimal : str
        How it was understood; empty where that does not apply.
    columns : tuple of str
        All the columns it has, whether or not the study needs them.
    counts : dict of str to int
        What was counted, for the run record.
    asked : dict of str to tuple of str
        For each key of ``[logs.where]``, the values of that column: those asked for that occur, and
        some of the others.
    account : FileAccount
        Where every line of the log went, and what was mended.
    parts : tuple of (str, str, str)
        Further files that were read with this one: name, role and digest.
    interval_ms : float, milliseconds
        From one gaze sample to the next; 0 where the log holds fixations.
    ends_open : bool
        Whether the last line has no line end, as where a file was cut short.
    """

    shown: str
    sha256: str = ""
    encoding: str = ""
    delimiter: str = ""
    decimal: str = ""
    columns: tuple[str, ...] = ()
    counts: dict[str, int] = field(default_factory=dict)
    asked: dict[str, tuple[str, ...]] = field(default_factory=dict)
    account: FileAccount = field(default_factory=FileAccount)
    parts: tuple[tuple[str, str, str], ...] = ()
    interval_ms: float = 0.0
    ends_open: bool = False
