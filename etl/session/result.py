"""What a build gives back to a Python program."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import pyarrow.parquet as pq

from etl.errors import Findings
from etl.readiness.facts import Readiness
from etl.tables import TABLES

if TYPE_CHECKING:
    # Whoever asks for a frame gets it loaded then; a check, and every worker, does without it.
    import pandas as pd


@dataclass(frozen=True, slots=True)
class Result:
    """A finished build.

    Attributes
    ----------
    folder : Path
        Where the tables are.
    counts : mapping of str to int
        Readers, trials and fixations: read, left out, kept.
    rows : mapping of str to int
        Rows of each table.
    findings : Findings
        Warnings and notes.
    readiness : Readiness
        What is told of the binary outcomes before a model is fitted.
    key : Path or None
        The file that says whose the pseudonyms are; None where readers go by their ids.
    """

    folder: Path
    counts: Mapping[str, int]
    rows: Mapping[str, int]
    findings: Findings
    readiness: Readiness
    key: Path | None = None

    def table(self, name: str) -> pd.DataFrame:
        """Read one table as a pandas frame.

        Parameters
        ----------
        name : str
            One of ``outcomes``, ``outcomes_wide``, ``trials``, ``regressions``, ``fixations``.

        Raises
        ------
        KeyError
            If there is no table of that name.
        """
        if name not in TABLES:
            raise KeyError(f"{name}: the tables are {', '.join(TABLES)}")
        with pq.ParquetFile(self.folder / f"{name}.parquet") as file:
            frame: pd.DataFrame = file.read().to_pandas()
        return frame

    @property
    def outcomes(self) -> pd.DataFrame:
        """One row a participant × trial × region × measure."""
        return self.table("outcomes")

    @property
    def outcomes_wide(self) -> pd.DataFrame:
        """One row a participant × trial × region, one column a measure."""
        return self.table("outcomes_wide")

    @property
    def trials(self) -> pd.DataFrame:
        """One row a kept trial."""
        return self.table("trials")

    @property
    def regressions(self) -> pd.DataFrame:
        """One row a regressive saccade."""
        return self.table("regressions")

    @property
    def fixations(self) -> pd.DataFrame:
        """Every fixation read."""
        return self.table("fixations")
