"""One reader: canonical fixations in, finished rows of every table out. A pure function."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import (
    CellMeasures,
    FixationColumns,
    RegressionColumns,
    RowMaker,
    TrialColumns,
)
from etl.measures import NoOpportunity, Outcomes, Outside, Sequences, compute
from etl.parsers import CanonicalLog
from etl.regions import Assigned, RegionLibrary
from etl.session.ordering import OrderedFixations, ReaderLog, TrialNames, order_fixations
from etl.tables import TableDesign

#: What leaves a fixation out, in the order of :attr:`TableDesign.left_out_by`.
SKIP, REPEATED = 0, 1
LEFT_OUT_BY = ("skip", "repeated")


@dataclass(frozen=True, slots=True)
class Options:
    """The decisions of the study that the work on a reader depends on."""

    repeated: str
    outside: Outside
    no_opportunity: NoOpportunity


@dataclass(frozen=True, slots=True)
class Reader:
    """All that is known of one reader before the work begins.

    Attributes
    ----------
    participant : str
        The reader's id.
    log : CanonicalLog
        The fixations, in the order of the logs.
    file : (n,) int32 array
        Index of each fixation's log into the study's logs.
    trials : TrialColumns
        The trials that were recorded, in the order of the tables.
    """

    participant: str
    log: CanonicalLog
    file: NDArray[np.int32]
    trials: TrialColumns


@dataclass(slots=True)
class ReaderTables:
    """The finished rows of one reader, and what was counted on the way."""

    participant: str
    batches: dict[str, pa.RecordBatch]
    counts: dict[str, int]
    findings: Findings = field(default_factory=Findings)


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

    def ordered(self, reader: Reader, findings: Findings) -> tuple[ReaderLog, OrderedFixations]:
        """The reader's fixations in time order."""
        trial = _trial_of(reader, self.design)
        log = ReaderLog(reader.log, reader.file, self.design.files, trial)
        trials = TrialNames(reader.trials.text >= 0, lambda t: self._spelled(reader.trials, t))
        return log, order_fixations(log, trials, self.options.repeated, findings)

    def _spelled(self, trials: TrialColumns, index: int) -> str:
        """A trial in words, for messages."""
        return ", ".join(
            f"{name} {self.design.ids[name].values[int(trials.ids[name][index])]}"
            for name in ("trial", "session")
            if name in self.design.ids
        )

    def tables(self, reader: Reader) -> ReaderTables:
        """Compute all rows of one reader.

        Parameters
        ----------
        reader : Reader
            Fixations and trials.

        Returns
        -------
        ReaderTables
            Without rows where a problem was found.
        """
        findings = Findings()
        _, ordered = self.ordered(reader, findings)
        if findings.failed:
            return ReaderTables(reader.participant, {}, {}, findings)
        in_order = bool((ordered.rows[1:] > ordered.rows[:-1]).all())
        log = reader.log if in_order else reader.log.take(ordered.rows)
        texts = reader.trials.text.astype(np.int64)
        text = texts[ordered.trial]
        skipped = text < 0
        left_out_by = np.where(skipped, SKIP, np.where(ordered.repeated, REPEATED, -1))
        kept = np.flatnonzero(left_out_by < 0)
        line, order = self._assigned(log, text, skipped)
        in_study = np.flatnonzero(texts >= 0)
        place = np.zeros(len(texts), dtype=np.int64)
        place[in_study] = np.arange(len(in_study))
        region_count = self.library.region_count[texts[in_study]]
        outcomes = compute(
            Sequences(
                place[ordered.trial[kept]],
                order[kept],
                log.duration_ms[kept],
                region_count.astype(np.int32),
            ),
            outside=self.options.outside,
            no_opportunity=self.options.no_opportunity,
        )
        every = len(in_study) == len(texts)
        own = self.rows.facts(reader.trials if every else reader.trials.take(in_study))
        batches = self._outcome_rows(own, texts[in_study], outcomes)
        code = np.full(len(order), -1, dtype=np.int32)
        inside = order > 0
        code[inside] = self.library.region_code[
            self.library.region_offsets[text[inside]] + order[inside] - 1
        ]
        batches["regressions"] = self._regression_rows(
            own, place, ordered, log, kept, (order, code), outcomes
        )
        visit, first_pass = _spread(outcomes, kept, len(order))
        batches["fixations"] = self.rows.fixations(
            own if every else self.rows.ids(reader.trials),
            FixationColumns(
                ordered.trial,
                ordered.number,
                log.onset_ms,
                log.duration_ms,
                log.x_px,
                log.y_px,
                line,
                code,
                order,
                visit,
                first_pass,
                left_out_by.astype(np.int32),
                reader.file[ordered.rows],
                log.source_line,
            ),
        )
        counts = {
            "fixations read": len(order),
            "fixations of skipped trials": int(skipped.sum()),
            "fixations of repeated trials": int((ordered.repeated & ~skipped).sum()),
            "fixations kept": len(kept),
            "fixations kept outside every region": int((order[kept] == 0).sum()),
            "overlaps taken for rounding": ordered.overlaps,
            "trials read": len(texts),
            "trials skipped": int((texts < 0).sum()),
            "trials kept": len(in_study),
        }
        return ReaderTables(reader.participant, batches, counts, findings)

    def _assigned(
        self, log: CanonicalLog, text: NDArray[np.int64], skipped: NDArray[np.bool_]
    ) -> tuple[NDArray[np.int32], NDArray[np.int32]]:
        """Line and region order of every fixation; 0 where there is none."""
        line = np.zeros(len(text), dtype=np.int32)
        order = np.zeros(len(text), dtype=np.int32)
        rows = np.flatnonzero(~skipped)
        found: Assigned
        if self.library.labels is not None and log.label is not None:
            found = self.library.assign_labels(text[rows], log.label.codes[rows], log.label.values)
        else:
            found = self.library.assign_points(text[rows], log.x_px[rows], log.y_px[rows])
        line[rows], order[rows] = found.line, found.order
        return line, order

    def _outcome_rows(
        self,
        facts: Mapping[str, pa.Array],
        texts: NDArray[np.int64],
        outcomes: Outcomes,
    ) -> dict[str, pa.RecordBatch]:
        """Rows of the three tables of outcomes."""
        counts = np.diff(outcomes.cell_offsets)
        trial = np.repeat(np.arange(len(texts)), counts)
        within = np.arange(len(trial)) - np.repeat(outcomes.cell_offsets[:-1], counts)
        code = self.library.region_code[self.library.region_offsets[texts][trial] + within]
        cells = (trial, (within + 1).astype(np.int32), code)
        regions = CellMeasures(
            {m.name: outcomes.regions[m.name].values for m in self.design.measures},
            {m.name: outcomes.regions[m.name].reasons for m in self.design.measures},
        )
        trials = CellMeasures(
            {m.name: outcomes.trials[m.name].values for m in self.design.trial_measures},
            {m.name: outcomes.trials[m.name].reasons for m in self.design.trial_measures},
        )
        return {
            "outcomes": self.rows.outcomes(facts, cells, regions),
            "outcomes_wide": self.rows.outcomes_wide(facts, cells, regions),
            "trials": self.rows.trials(facts, trials),
        }

    def _regression_rows(
        self,
        facts: Mapping[str, pa.Array],
        place: NDArray[np.int64],
        ordered: OrderedFixations,
        log: CanonicalLog,
        kept: NDArray[np.int64],
        regions: tuple[NDArray[np.int32], NDArray[np.int32]],
        outcomes: Outcomes,
    ) -> pa.RecordBatch:
        """One row a regressive saccade."""
        order, code = regions
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
                log.onset_ms[landing],
                log.x_px[landing] - log.x_px[launch],
            ),
        )


def _trial_of(reader: Reader, design: TableDesign) -> NDArray[np.int64]:
    """Index of each fixation's trial into the reader's trials."""
    ids, own = reader.log.ids, reader.trials.ids

    def places(name: str) -> NDArray[np.int64]:
        ranks = design.ids[name].ranks
        table = np.array([ranks[text] for text in ids[name].values], dtype=np.int64)
        return table[ids[name].codes]

    keys, wanted = own["trial"].astype(np.int64), places("trial")
    if "session" in ids:
        width = len(design.ids["trial"].values)
        keys = keys + own["session"] * width
        wanted += places("session") * width
    # The trials are sorted by session and trial, so their keys ascend.
    return np.searchsorted(keys, wanted).astype(np.int64)


def _spread(
    outcomes: Outcomes, kept: NDArray[np.int64], count: int
) -> tuple[NDArray[np.int32], NDArray[np.bool_]]:
    """Visit and first pass of the kept fixations among all fixations."""
    visit = np.zeros(count, dtype=np.int32)
    first_pass = np.zeros(count, dtype=bool)
    visit[kept] = outcomes.visit
    first_pass[kept] = outcomes.first_pass
    return visit, first_pass
