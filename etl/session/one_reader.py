"""One reader: canonical fixations in, finished rows of every table out. A pure function."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import (
    CellMeasures,
    FixationColumns,
    LineColumns,
    RegressionColumns,
    RowMaker,
    TrialColumns,
)
from etl.measures import Outcomes, Sequences, compute
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.report import LineTrust, ReaderProfile, TrialFates, profile_of
from etl.screening import LEFT_OUT_BY, outlying
from etl.screening.ledger import (
    Accounts,
    FarValue,
    Screened,
    check_balance,
    entries_of,
    with_values,
)
from etl.screening.rules import OUTLIER
from etl.session.gallery import candidates
from etl.session.labels import Unlisted, unlisted_labels
from etl.session.line_ledger import check_lines, counts_of_lines, with_lines
from etl.session.line_trust import trust_of
from etl.session.lines import LineWork, ReaderLines
from etl.session.misplaced import outside_by_log
from etl.session.ordering import OrderedFixations, ReaderLog, TrialNames, order_fixations
from etl.session.placing import Placed, place_fixations
from etl.session.reader import Options, Reader, ReaderTables
from etl.session.screening import Unscreened, screen
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

    def ordered(self, reader: Reader, findings: Findings) -> OrderedFixations:
        """The reader's fixations in time order."""
        trial = _trial_of(reader, self.design)
        log = ReaderLog(reader.log, reader.file, self.design.files, trial)
        trials = TrialNames(reader.trials.text >= 0, lambda t: self._spelled(reader.trials, t))
        return order_fixations(log, trials, self.options.repeated, findings)

    def _spelled(self, trials: TrialColumns, index: int) -> str:
        """A trial in words, for messages."""
        return ", ".join(
            f"{name} {self.design.ids[name].values[int(trials.ids[name][index])]}"
            for name in ("trial", "session")
            if name in self.design.ids
        )

    def tables(self, reader: Reader, *, page: bool = True) -> ReaderTables:
        """Compute all rows of one reader.

        Parameters
        ----------
        reader : Reader
            Fixations and trials.
        page : bool
            Whether the summary for the audit page is wanted too; it takes a fifth of the time.

        Returns
        -------
        ReaderTables
            Without rows where a problem was found.
        """
        findings = Findings()
        ordered = self.ordered(reader, findings)
        if findings.failed:
            return ReaderTables(reader.participant, {}, {}, findings=findings)
        in_order = bool((ordered.rows[1:] > ordered.rows[:-1]).all())
        log = reader.log if in_order else reader.log.take(ordered.rows)
        texts = reader.trials.text.astype(np.int64)
        placed = place_fixations(reader, log, ordered, (self.library, self._lines), findings)
        if findings.failed:
            return ReaderTables(reader.participant, {}, {}, findings=findings)
        order = placed.order
        screened = screen(
            Unscreened(reader.trials, log, ordered, order, reader.note, placed.lines),
            self.library,
            self.options,
        )
        gone = screened.fixation_codes()
        kept = np.flatnonzero(gone < 0)
        in_study = np.flatnonzero(screened.trial_codes() < 0)
        place = np.zeros(len(texts), dtype=np.int64)
        place[in_study] = np.arange(len(in_study))
        outcomes = compute(
            Sequences(
                place[ordered.trial[kept]],
                order[kept],
                screened.fixations.duration_ms[kept],
                self.library.region_count[texts[in_study]].astype(np.int32),
            ),
            outside=self.options.outside,
            no_opportunity=self.options.no_opportunity,
        )
        every = len(in_study) == len(texts)
        own = self.rows.facts(reader.trials if every else reader.trials.take(in_study))
        code = self._region_codes(texts[ordered.trial], order)
        source = (reader.file[ordered.rows], log.source_line)
        entries = entries_of(
            screened,
            self.options.limits,
            (reader.trials.skipped_by, reader.trials.notes, reader.note),
            np.searchsorted(ordered.trial, np.arange(len(texts))),
        )
        batches, far = self._outcome_rows(own, (texts, in_study), outcomes, placed.lines)
        entries = with_values(entries, far, self.options.limits)
        entries = with_lines(entries, screened, placed.lines)
        batches["regressions"] = self._regression_rows(
            own, place, ordered, (screened, log.x_px, kept), (order, code), outcomes
        )
        batches["fixations"] = self.rows.fixations(
            own if every else self.rows.ids(reader.trials),
            self._fixation_columns(screened, log, (placed, code), outcomes, source),
        )
        batches[LEDGER] = self.rows.ledger(
            self.design.ids["participant"].ranks[reader.participant],
            reader.trials,
            entries,
            source,
        )
        accounts = {
            "trials": Accounts.of(screened.trial_codes()),
            "fixations": Accounts.of(gone),
        }
        fixations = batches["fixations"]
        check_balance(
            accounts,
            entries,
            {
                "trials": batches["trials"].num_rows,
                "fixations": pc.sum(fixations.column("kept")).as_py() or 0,
            },
        )
        check_lines(entries, screened, placed.lines, fixations)
        counts = {
            "readers left out": int(screened.reader.left_out[0] >= 0),
            "fixations read": len(order),
            "fixations of skipped trials": accounts["fixations"].by_rule["skip"],
            "fixations of repeated trials": accounts["fixations"].by_rule["repeated"],
            "fixations kept": len(kept),
            "fixations kept outside every region": int((order[kept] == 0).sum()),
            "overlaps taken for rounding": ordered.overlaps,
            "trials read": len(texts),
            "trials skipped": accounts["trials"].by_rule["skip"],
            "trials kept": len(in_study),
            "trials kept without a fixation": len(in_study) - len(np.unique(ordered.trial[kept])),
            **counts_of_lines(entries, placed.lines),
        }
        outside = np.zeros(len(order), dtype=bool)
        outside[kept] = order[kept] == 0
        trust = trust_of(placed.lines, ordered.trial)
        return ReaderTables(
            reader.participant,
            batches,
            counts,
            accounts,
            self._profile(reader, screened, batches, trust) if page else None,
            candidates(
                reader.participant,
                screened,
                outside,
                np.bincount(ordered.trial[kept[outcomes.regressions.launch]], minlength=len(texts)),
                trust,
            ),
            findings,
            outside_by_log(reader, ordered.trial, source[0], (order, self._placed(log))),
            ordered.moved,
            ordered.gaps,
            self._unlisted(reader, ordered),
            trust,
        )

    def _profile(
        self,
        reader: Reader,
        screened: Screened,
        batches: Mapping[str, pa.RecordBatch],
        trust: LineTrust | None,
    ) -> ReaderProfile:
        """The summary of the reader for the audit page."""
        read = reader.trials.text >= 0
        return profile_of(
            reader.participant,
            batches,
            TrialFates(
                {name: levels[read] for name, levels in reader.trials.factors.items()},
                self._named[screened.trial_codes()[read]],
                None if trust is None else trust.of(read),
            ),
            self.design,
            outside=self.options.outside,
            grid=self.options.grid,
        )

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
        screened: Screened,
        log: CanonicalLog,
        places: tuple[Placed, NDArray[np.int32]],
        outcomes: Outcomes,
        source: tuple[NDArray[np.int32], NDArray[np.int32]],
    ) -> FixationColumns:
        """The columns of ``fixations``: as recorded where left out, as used where kept."""
        gone = screened.fixation_codes()
        kept = np.flatnonzero(gone < 0)
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

    def _unlisted(self, reader: Reader, ordered: OrderedFixations) -> dict[str, Unlisted]:
        """Labels that no region definition lists, of trials of the study."""
        if self.library.labels is None:
            return {}
        in_study = np.empty(len(reader.log), dtype=bool)
        in_study[ordered.rows] = reader.trials.text[ordered.trial] >= 0
        return unlisted_labels(reader.log, reader.file, in_study, self.library.labels.codes)

    def _placed(self, log: CanonicalLog) -> NDArray[np.bool_]:
        """Whether each fixation says where it is."""
        if self.library.labels is not None and log.label is not None:
            return np.asarray(log.label.codes >= 0)
        return ~np.isnan(log.x_px)

    def _outcome_rows(
        self,
        facts: Mapping[str, pa.Array],
        trials: tuple[NDArray[np.int64], NDArray[np.int64]],
        outcomes: Outcomes,
        lines: ReaderLines | None,
    ) -> tuple[dict[str, pa.RecordBatch], list[FarValue]]:
        """Rows of the three tables of outcomes, and the values that were set missing."""
        every_text, in_study = trials
        texts = every_text[in_study]
        counts = np.diff(outcomes.cell_offsets)
        trial = np.repeat(np.arange(len(texts)), counts)
        within = np.arange(len(trial)) - np.repeat(outcomes.cell_offsets[:-1], counts)
        code = self.library.region_code[self.library.region_offsets[texts][trial] + within]
        cells = (trial, (within + 1).astype(np.int32), code)
        values = {m.name: outcomes.regions[m.name].values for m in self.design.measures}
        reasons = {m.name: outcomes.regions[m.name].reasons for m in self.design.measures}
        far: list[FarValue] = []
        if self.options.limits.on("outlier_sd"):
            for measure in self.design.measures:
                if measure.kind == "duration":
                    name = measure.name
                    away = outlying(values[name], code, self.options.limits.outlier_sd)
                    far += [
                        FarValue(int(in_study[trial[c]]), int(code[c]), name, values[name][c])
                        for c in np.flatnonzero(away).tolist()
                    ]
                    values[name] = np.where(away, np.nan, values[name])
                    outlier = self.design.reasons.index(OUTLIER)
                    reasons[name] = np.where(away, outlier, reasons[name]).astype(np.uint8)
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
        facts: Mapping[str, pa.Array],
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
