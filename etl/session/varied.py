"""What is known of all variants of a study, for Python programs and for the console."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import pyarrow.parquet as pq

from etl.errors import Findings
from etl.report.variants_comparisons import comparisons_say
from etl.session.told import counted, near
from etl.tables.variants import CHANGED_CELLS, RATES, VARIANT_ROWS
from etl.variants.facts import Crossing, Summary
from etl.variants.in_short import in_short

if TYPE_CHECKING:
    import pandas as pd


@dataclass(frozen=True, slots=True, eq=False)
class Varied:
    """What is known of all variants of a study.

    Attributes
    ----------
    folder : Path
        Where tables and page are.
    crossing : Crossing
        The variants.
    summaries : tuple of Summary
        Every comparison: binary outcome × region × level against the reference level.
    leading : tuple of int
        Which of these the page begins with.
    passages : tuple of str
        For each of these, what can go into a paper.
    rows : mapping of str to int
        Rows of each table.
    findings : Findings
        Warnings and notes.
    """

    folder: Path
    crossing: Crossing
    summaries: tuple[Summary, ...]
    leading: tuple[int, ...]
    passages: tuple[str, ...]
    rows: dict[str, int]
    findings: Findings

    def table(self, name: str) -> pd.DataFrame:
        """Read one table as a pandas frame.

        Parameters
        ----------
        name : str
            As the file without its ending: ``rates``, ``variants``, ``changed_cells``, ….

        Raises
        ------
        KeyError
            If there is no table of that name.
        """
        if name not in VARIANT_ROWS:
            raise KeyError(f"{name}: the tables are {', '.join(VARIANT_ROWS)}")
        if name in (RATES, CHANGED_CELLS):
            with pq.ParquetFile(self.folder / f"{name}.parquet") as file:
                frame: pd.DataFrame = file.read().to_pandas()
            return frame
        import pandas as pd  # noqa: PLC0415  (only for those who ask for a frame)

        return pd.read_csv(self.folder / f"{name}.csv", encoding="utf-8")

    def told(self) -> str:
        """What the command says: how far outcomes hang on decisions, and what was written.

        Returns
        -------
        str
            Some lines.
        """
        crossing = self.crossing
        settings = ", ".join(setting.key for setting in crossing.settings)
        every = "all combinations of alternatives for" if crossing.full else "which differ in"
        number = crossing.base + 1
        head = f"{counted(len(crossing), 'variant')}, {every} {settings}"
        lines = [f"{head}; variant {number} is the study as it stands"]
        for place in self.leading:
            first, *more = in_short(self.summaries[place], crossing).split("\n")
            lines += [first, *(f"  {line}" for line in more)]
        rate = all(not own.compared.comparison.factor for own in self.summaries)
        lines.append(comparisons_say(self.summaries, rate=rate))
        lines.append(f"Written to {near(self.folder)}:")
        width = max(len(name) for name in self.rows)
        lines += [f"  {name:<{width}}  {rows:>11,} rows" for name, rows in self.rows.items()]
        lines.append("  codebook.csv, for_paper.txt, run.json, and variants.html to look at")
        # Not every pipe takes a minus sign.
        return "\n".join(lines).replace("\N{MINUS SIGN}", "-")
