"""One trial out of a reader's finished rows, with its text: what is drawn and explained."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import pyarrow as pa
import pyarrow.compute as pc

from etl.export.rows import TrialColumns
from etl.regions import RegionLibrary
from etl.regions.layout import columns, edge_px, line_extent_px
from etl.report import LineTrust
from etl.report.trace_input import (
    Cell,
    Piece,
    Regression,
    Removal,
    TracedFixation,
    TracedLines,
    TracedTrial,
    Word,
)
from etl.session.line_ledger import CORRECTED
from etl.study import Study
from etl.study.models import Lines
from etl.tables import LEDGER, LINE_RULES, TableDesign


@dataclass(frozen=True, slots=True)
class TrialKey:
    """Which trial of a reader; session is empty where the logs have none.

    Attributes
    ----------
    session, trial : str
        Its names.
    row : int
        Its place among the reader's trials.
    """

    session: str
    trial: str
    row: int


@dataclass(frozen=True, slots=True)
class Tracer:
    """Makes traced trials of one study.

    Attributes
    ----------
    study : Study
        As loaded.
    library : RegionLibrary
        Its texts.
    design : TableDesign
        Its tables.
    """

    study: Study
    library: RegionLibrary
    design: TableDesign

    def traced(
        self,
        batches: Mapping[str, pa.RecordBatch],
        participant: str,
        key: TrialKey,
        text: int,
        trust: LineTrust | None = None,
    ) -> TracedTrial:
        """Gather all about one trial of a reader.

        Parameters
        ----------
        batches : mapping of str to pa.RecordBatch
            The reader's finished rows.
        participant : str
            The reader.
        key : TrialKey
            The trial.
        text : int
            Its text in the library; -1 for a trial that is no part of the study.
        trust : LineTrust, optional
            How far the lines of the reader's trials can be trusted.

        Returns
        -------
        TracedTrial
            Without outcomes where the trial is left out.
        """
        fixations = self._rows(batches["fixations"], key)
        entries = self._rows(batches[LEDGER], key)
        # Those about lines leave nothing out.
        ledger = [row for row in entries if row["rule"] not in LINE_RULES]
        of_lines = {row["fixation"]: row for row in entries if row["rule"] in LINE_RULES}
        removals = {row["fixation"]: _removal(row) for row in ledger if row["level"] == "fixation"}
        merged = {
            row["fixation"]: int(row["action"].removeprefix("merged into "))
            for row in ledger
            if row["action"].startswith("merged into ")
        }
        of_trial = [_removal(row) for row in ledger if row["level"] == "trial"]
        of_reader = [
            _removal(row) for row in batches[LEDGER].to_pylist() if row["level"] == "participant"
        ]
        why = [*of_trial, *of_reader]
        removal = why[0] if why else None
        (facts,) = self._rows(batches["trials"], key) or [{}]
        return TracedTrial(
            participant,
            key.session,
            key.trial,
            str(fixations[0]["item"] or ""),
            {name: str(facts[name]) for name in self.design.factors if name in facts},
            *self._regions(text),
            fixations=tuple(
                _fixation(
                    row,
                    removals.get(row["fixation"], removal),
                    merged,
                    of_lines.get(row["fixation"], {}),
                )
                for row in fixations
            ),
            regressions=tuple(
                Regression(
                    row["launch_fixation"], row["landing_fixation"], bool(row["ends_first_pass"])
                )
                for row in self._rows(batches["regressions"], key)
            ),
            outcomes=self._outcomes(batches["outcomes"], key),
            trial_outcomes=self._trial_outcomes(facts),
            **self._places(text),
            outside=self.study.measures.outside,
            no_opportunity=self.study.measures.no_opportunity,
            removal=removal,
            values_set_missing={
                (row["observed"].split(" ")[0], self._order(text, row["region"])): _removal(row)
                for row in ledger
                if row["level"] == "value"
            },
            lines=self._lines(text, trust, key.row),
        )

    def _lines(self, text: int, trust: LineTrust | None, row: int) -> TracedLines | None:
        """How lines were told; None where the text has one line, or they were not told."""
        geometry = self.library.geometry
        if trust is None or geometry is None or text < 0 or geometry.line_counts[text] < 2:
            return None
        own = slice(*geometry.line_offsets[text : text + 2].tolist())
        middles = geometry.line_middles_px[own].tolist()
        told = self.study.lines or Lines()
        return TracedLines(
            told.method,
            dict(zip(geometry.line_numbers[own].tolist(), middles, strict=True)),
            float(trust.confidence[row]),
            bool(trust.sure[row]),
            told.corrections or "",
        )

    def key(self, trials: TrialColumns, row: int) -> TrialKey:
        """The key of one of a reader's trials."""
        ids = self.design.ids
        session = ""
        if "session" in ids:
            session = ids["session"].values[int(trials.ids["session"][row])]
        return TrialKey(session, ids["trial"].values[int(trials.ids["trial"][row])], row)

    def _rows(self, batch: pa.RecordBatch, key: TrialKey) -> list[dict[str, Any]]:
        """The rows of one trial."""
        wanted = None
        for name, text in (("session", key.session), ("trial", key.trial)):
            known = self.design.ids.get(name)
            if known is None:
                continue
            value = int(text) if known.type == "integer" else text
            here = pc.equal(batch.column(name).cast(pa.string()), str(value))
            wanted = here if wanted is None else pc.and_(wanted, here)
        rows: list[dict[str, Any]] = batch.filter(wanted).to_pylist()
        return rows

    def _regions(self, text: int) -> tuple[tuple[str, ...], tuple[str, ...]]:
        """Names and texts of the regions."""
        if text < 0:
            return (), ()
        shown = self.library.texts[text]
        return shown.regions, shown.region_texts

    def _order(self, text: int, region: str) -> int:
        """The order of a region in a text."""
        return self.library.texts[text].regions.index(region) + 1

    def _places(self, text: int) -> dict[str, Any]:
        """Where the text and its regions stood on the screen."""
        geometry = self.library.geometry
        if text < 0 or geometry is None:
            return {}
        where = slice(*geometry.text_offsets[text : text + 2].tolist())
        pieces = tuple(
            Piece(order, line, *extent)
            for order, line, extent in zip(
                geometry.orders[where].tolist(),
                geometry.piece_lines[where].tolist(),
                geometry.extents_px[:, where].T.tolist(),
                strict=True,
            )
        )
        layout = self.study.regions.layout
        if layout is None:
            return {"pieces": pieces}
        words = []
        for number, line in enumerate(self.library.texts[text].whole.split("\n"), start=1):
            at = columns(line)
            top, bottom = line_extent_px(layout, number)
            for found in re.finditer(r"\S+", line):
                ends = [edge_px(layout, at[place]) for place in found.span()]
                words.append(Word(number, found.group(), min(ends), top, max(ends), bottom))
        return {
            "pieces": pieces,
            "words": tuple(words),
            "right_to_left": layout.direction == "rtl",
        }

    def _outcomes(self, batch: pa.RecordBatch, key: TrialKey) -> dict[str, tuple[Cell, ...]]:
        """The outcomes of the regions, in the order of the catalogue."""
        found: dict[str, list[Cell]] = {measure.name: [] for measure in self.design.measures}
        for row in self._rows(batch, key):
            value = math.nan if row["value"] is None else row["value"]
            found[row["measure"]].append(Cell(value, row["missing"] or ""))
        return {name: tuple(cells) for name, cells in found.items() if cells}

    def _trial_outcomes(self, facts: Mapping[str, Any]) -> dict[str, Cell]:
        """The outcomes of the trial."""
        if not facts:
            return {}
        why = dict(part.split(": ") for part in (facts["missing"] or "").split("; ") if part)
        return {
            measure.name: Cell(
                math.nan if facts[measure.name] is None else float(facts[measure.name]),
                why.get(measure.name, ""),
            )
            for measure in self.design.trial_measures
        }


def _removal(row: Mapping[str, Any]) -> Removal:
    """Why something was left out, from its row of the ledger."""
    return Removal(row["rule"], row["limit"] or "", row["observed"] or "", row["also"] or "")


def _fixation(
    row: Mapping[str, Any],
    removal: Removal | None,
    merged: Mapping[int, int],
    of_line: Mapping[str, Any],
) -> TracedFixation:
    """A row of the table of fixations, with what the ledger says of its line."""

    def number(name: str) -> float:
        return math.nan if row.get(name) is None else float(row[name])

    observed = of_line.get("observed") or ""
    by_hand = of_line.get("rule") == CORRECTED
    return TracedFixation(
        row["fixation"],
        number("onset_ms"),
        row["duration_ms"],
        number("x_px"),
        number("y_px"),
        row["line"] or 0,
        row["region_order"] or 0,
        row["visit"] or 0,
        bool(row["first_pass"]),
        row["source_file"],
        row["source_line"],
        None if row["kept"] else removal or Removal(row["left_out_by"]),
        merged.get(row["fixation"], 0),
        line_confidence=number("line_confidence"),
        return_sweep=bool(row.get("return_sweep")),
        undersweep=bool(row.get("undersweep")),
        on_none="" if by_hand else observed.split(",")[0],
        line_told=_line_in(observed) if by_hand else None,
    )


def _line_in(observed: str) -> int:
    """The line that a row of the ledger found: ``line 3``, or ``no line``."""
    found = re.fullmatch(r"line (\d+)", observed)
    return int(found[1]) if found else 0
