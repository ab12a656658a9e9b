"""The codebook: what every column and every outcome is, for programs and for people."""

from __future__ import annotations

from pathlib import Path

from etl.cells import write_csv
from etl.handoff.codebook_entries import codebook_entries
from etl.handoff.codebook_page import codebook_page
from etl.handoff.codebook_study import StudyFacts
from etl.handoff.codebook_tables import CODEBOOK, codebook_columns
from etl.tables import TableDesign

#: The codebook as a page.
PAGE = f"{CODEBOOK}.md"


def write_codebook(folder: Path, design: TableDesign, study: StudyFacts) -> None:
    """Write ``codebook.csv`` and ``codebook.md`` into a folder.

    Parameters
    ----------
    folder : Path
        Where they go.
    design : TableDesign
        What the study's tables have in common.
    study : StudyFacts
        The study's decisions. The same design and decisions give the same bytes.
    """
    entries = codebook_entries(design, study)
    header = [column.name for column in codebook_columns()]
    write_csv(folder / f"{CODEBOOK}.csv", header, (entry.cells() for entry in entries))
    page = codebook_page(design, study, entries)
    (folder / PAGE).write_text(page, encoding="utf-8", newline="\n")
