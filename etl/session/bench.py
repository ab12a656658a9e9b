"""Some readers: canonical fixations in, finished rows of every table out. A pure function.

All readers of a group are worked on at once; nothing that is told of a reader depends on who else
is in the group.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.arrays import Fact
from etl.export.rows import (
    CellMeasures,
    FixationColumns,
    LineColumns,
    RegressionColumns,
    RowMaker,
)
from etl.measures import Outcomes
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import LEFT_OUT_BY
from etl.screening.entries import Entry, Screened
from etl.screening.ledger import FarValue, entries_of, with_values
from etl.session.line_ledger import with_lines
from etl.session.lines import LineWork, ReaderLines
from etl.session.ordered import OrderedFixations
from etl.session.outcome_work import cells_of, compute_outcomes, set_far_values_missing
from etl.session.placing import Placed, place_fixations
from etl.session.reader import GroupTables, Options, ReaderGroup, ReaderTables, starts_of
from etl.session.sound_readers import sound_readers
from etl.session.telling import Worked, told_of
from etl.tables import LEDGER, TableDesign

_PX_DIGITS = 6


class Bench:
    """What the work on any reader needs, set up once in a process.

    Parameters
    ----------
    design : TableDesign
        The tables of the study.
    library : RegionLibrary
        Its texts.
    options : Options
        Its decisions.
    """

    def __init__(
        self,
        design: TableDesign,
        library: RegionLibrary,
        options: Options,
    ) -> None:
        self.design = design
        self.library = library
        self.options = options
        self.rows = RowMaker(design)
        self._lines = (
            None if options.lines is None else LineWork(library, options.lines, options.limits)
        )
        used = {rule: code for code, rule in enumerate(design.left_out_by)}
        # From a rule's code among all rules to its place among those of this study; -1 stays -1.
        self._named = np.array([*(used.get(rule, -1) for rule in LEFT_OUT_BY), -1], dtype=np.int32)

    def tables(self, group: ReaderGroup, *, page: bool = True) -> GroupTables:
        """Compute all rows of some readers.

        Parameters
        ----------
        group : ReaderGroup
            Fixations and trials.
        page : bool
            Whether the summaries for the audit page are wanted too; they take a fifth of the time.

        Returns
        -------
        GroupTables
            Without rows of readers of whom a problem was found.
        """
        told = {participant: Findings() for participant in group.participants}
        sound, ordered = sound_readers(
            group, (self.design, self.library, self.options.repeated), told
        )
        worked = self._worked(sound, ordered) if len(sound) else None
        known = {} if worked is None else told_of(self, worked, told, page=page)
        return self._put_together(group, worked, told, known)

    def _put_together(
        self,
        group: ReaderGroup,
        worked: Worked | None,
        told: Mapping[str, Findings],
        known: Mapping[str, ReaderTables],
    ) -> GroupTables:
        """The answer, with the readers of whom problems were found in their places."""
        readers = [
            known[one] if one in known else ReaderTables(one, {}, {}, findings=told[one])
            for one in group.participants
        ]
        if worked is None:
            return GroupTables(readers)
        own = [one in known for one in group.participants]
        starts = {}
        for name, rows in worked.row_starts.items():
            counts = np.zeros(len(group), dtype=np.int64)
            counts[own] = np.diff(rows)
            starts[name] = starts_of(counts)
        return GroupTables(readers, worked.batches, starts)

    def _worked(self, group: ReaderGroup, ordered: OrderedFixations) -> Worked:
        """All rows of readers of whom nothing is wrong."""
        in_order = bool((ordered.rows[1:] > ordered.rows[:-1]).all())
        log = group.log if in_order else group.log.take(ordered.rows)
        file = group.file if in_order else group.file[ordered.rows]
        texts = group.trials.text.astype(np.int64)
        placed = place_fixations(group, log, ordered, (self.library, self._lines))
        order = placed.order
        done = compute_outcomes(group, log, ordered, placed, (self.library, self.options))
        screened, trial_codes, gone = done.screened, done.trial_codes, done.gone
        kept, in_study, outcomes = done.kept, done.in_study, done.outcomes
        place = done.place
        every = len(in_study) == len(texts)
        own = self.rows.facts(group.trials if every else group.trials.take(in_study))
        code = self._region_codes(texts[ordered.trial], order)
        source = (file, log.source_line)
        entries = entries_of(
            screened,
            self.options.limits,
            (group.trials.skipped_by, group.trials.notes, group.notes),
            np.searchsorted(ordered.trial, np.arange(len(texts))),
        )
        batches, far = self._outcome_rows(
            own, (texts, in_study, group.reader_of_trial), outcomes, placed.lines
        )
        entries = with_values(entries, far, self.options.limits)
        entries = with_lines(entries, screened, placed.lines)
        batches["regressions"] = self._regression_rows(
            own, place, ordered, (screened, log.x_px, kept), (order, code), outcomes
        )
        batches["fixations"] = self.rows.fixations(
            own if every else self.rows.ids(group.trials),
            self._fixation_columns((screened, gone, kept), log, (placed, code), outcomes, source),
        )
        ranks = self.design.ids["participant"].ranks
        batches[LEDGER] = self.rows.ledger(
            np.array([ranks[one] for one in group.participants], dtype=np.int32),
            group.trials,
            entries,
            source,
        )
        return Worked(
            *(group, ordered, log, file, placed, screened),
            *(trial_codes, gone, kept, outcomes, entries, batches),
            self._row_starts(group, in_study, outcomes, kept, ordered, entries),
        )

    def _row_starts(
        self,
        group: ReaderGroup,
        in_study: NDArray[np.int64],
        outcomes: Outcomes,
        kept: NDArray[np.int64],
        ordered: OrderedFixations,
        entries: list[Entry],
    ) -> dict[str, NDArray[np.int64]]:
        """For each table where the rows of each reader begin."""
        readers = np.arange(len(group) + 1)
        of_trials = np.searchsorted(group.reader_of_trial[in_study], readers)
        of_cells = outcomes.cell_offsets[of_trials]
        landing = ordered.trial[kept[outcomes.regressions.landing]]
        return {
            "outcomes": of_cells * len(self.design.measures),
            "outcomes_wide": of_cells,
            "trials": of_trials,
            "regressions": np.searchsorted(group.reader_of_trial[landing], readers),
            "fixations": group.row_starts,
            LEDGER: np.searchsorted([entry.reader for entry in entries], readers),
        }

    def _region_codes(self, text: NDArray[np.int64], order: NDArray[np.int32]) -> NDArray[np.int32]:
        """The region of each fixation among all regions; -1 outside."""
        code = np.full(len(order), -1, dtype=np.int32)
        inside = order > 0
        code[inside] = self.library.region_code[
            self.library.region_offsets[text[inside]] + order[inside] - 1
        ]
        return code

    def _fixation_columns(
        self,
        fates: tuple[Screened, NDArray[np.int8], NDArray[np.int64]],
        log: CanonicalLog,
        places: tuple[Placed, NDArray[np.int32]],
        outcomes: Outcomes,
        source: tuple[NDArray[np.int32], NDArray[np.int32]],
    ) -> FixationColumns:
        """The columns of ``fixations``: as recorded where left out, as used where kept."""
        screened, gone, kept = fates
        visit, first_pass = _spread(outcomes, kept, len(gone))
        placed, code = places
        lines = placed.lines
        return FixationColumns(
            screened.recorded.trial,
            screened.number,
            np.where(gone < 0, screened.fixations.onset_ms, log.onset_ms),
            np.where(gone < 0, screened.fixations.duration_ms, log.duration_ms),
            log.x_px,
            log.y_px,
            placed.line,
            code,
            placed.order,
            visit,
            first_pass,
            self._named[gone],
            *source,
            None
            if lines is None
            else LineColumns(lines.confidence, lines.return_sweep, lines.undersweep),
        )

    def _outcome_rows(
        self,
        facts: Mapping[str, Fact],
        trials: tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]],
        outcomes: Outcomes,
        lines: ReaderLines | None,
    ) -> tuple[dict[str, pa.RecordBatch], list[FarValue]]:
        """Rows of the three tables of outcomes, and the values that were set missing."""
        every_text, in_study, reader = trials
        own = cells_of(every_text, in_study, self.library)
        cells = (own.counts, own.order, own.code)
        values = {m.name: outcomes.regions[m.name].values for m in self.design.measures}
        reasons = {m.name: outcomes.regions[m.name].reasons for m in self.design.measures}
        far: list[FarValue] = []
        if self.options.limits.on("outlier_sd"):
            far = set_far_values_missing(
                own,
                reader,
                self.design.measures,
                self.design.reasons,
                (self.options.limits.outlier_sd, len(self.library.region_names)),
                (values, reasons),
            )
        regions = CellMeasures(values, reasons)
        of_trials = CellMeasures(
            {m.name: outcomes.trials[m.name].values for m in self.design.trial_measures},
            {m.name: outcomes.trials[m.name].reasons for m in self.design.trial_measures},
        )
        batches = {
            "outcomes": self.rows.outcomes(facts, cells, regions),
            "outcomes_wide": self.rows.outcomes_wide(facts, cells, regions),
            "trials": self.rows.trials(
                facts, of_trials, None if lines is None else lines.trial_confidence[in_study]
            ),
        }
        return batches, far

    def _regression_rows(
        self,
        facts: Mapping[str, Fact],
        place: NDArray[np.int64],
        ordered: OrderedFixations,
        fixations: tuple[Screened, NDArray[np.float64], NDArray[np.int64]],
        regions: tuple[NDArray[np.int32], NDArray[np.int32]],
        outcomes: Outcomes,
    ) -> pa.RecordBatch:
        """One row a regressive saccade."""
        order, code = regions
        screened, x_px, kept = fixations
        launch = kept[outcomes.regressions.launch]
        landing = kept[outcomes.regressions.landing]
        return self.rows.regressions(
            facts,
            RegressionColumns(
                place[ordered.trial[launch]],
                code[launch],
                order[launch],
                code[landing],
                order[landing],
                outcomes.regressions.ends_first_pass,
                ordered.number[launch],
                ordered.number[landing],
                screened.fixations.onset_ms[landing],
                # Positions have a tenth of a pixel at best; what is beyond is noise of subtracting.
                np.round(x_px[landing] - x_px[launch], _PX_DIGITS),
            ),
        )


def _spread(
    outcomes: Outcomes, kept: NDArray[np.int64], count: int
) -> tuple[NDArray[np.int32], NDArray[np.bool_]]:
    """Visit and first pass of the kept fixations among all fixations."""
    visit = np.zeros(count, dtype=np.int32)
    first_pass = np.zeros(count, dtype=bool)
    visit[kept] = outcomes.visit
    first_pass[kept] = outcomes.first_pass
    return visit, first_pass
