"""What is counted of readers in all variants, and added up over all readers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.session.variant_states import ChangeCounts

Counts = NDArray[np.int64]


@dataclass(slots=True, eq=False)
class VariantCounts:
    """Counts over some readers. V variants, R regions, C combinations of levels, F fates.

    Attributes
    ----------
    regions : (measures, V, R, C, 3) int64 array
        Zeros, ones and rows of the binary outcomes of regions, in the order of the catalogue.
    of_trials : (measures, V, C, 3) int64 array
        The same for those of trials.
    read_rows : (R, C) int64 array
        Rows that there would be if nothing were left out.
    read_trials : (C,) int64 array
        The same for trials.
    trials, fixations : (V, F) int64 array
        What became of them: kept, then by the codes of rules.
    readers : (V, 2) int64 array
        Readers of whom a trial is kept, and readers left out by rules on readers.
    far : (V,) int64 array
        Values set missing.
    changed : (V, 2) int64 array
        Cells that are not as in the study as it stands, and trials that these are of.
    changes : tuple of ChangeCounts
        By measure, in the order of the catalogue.
    """

    regions: Counts
    of_trials: Counts
    read_rows: Counts
    read_trials: Counts
    trials: Counts
    fixations: Counts
    readers: Counts
    far: Counts
    changed: Counts
    changes: tuple[ChangeCounts, ...]

    def add(self, other: VariantCounts) -> None:
        """Add those of other readers."""
        for name in (
            *("regions", "of_trials", "read_rows", "read_trials", "trials", "fixations"),
            *("readers", "far", "changed"),
        ):
            setattr(self, name, getattr(self, name) + getattr(other, name))
        for own, more in zip(self.changes, other.changes, strict=True):
            own.add(more)
