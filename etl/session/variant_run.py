"""All variants of one study: worked on group by group, compared, written."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.errors import DataError, FaultError, Findings, Severity
from etl.export.changed_cells import changed_cell_writer
from etl.report.variants_input import VariantsInput
from etl.report.variants_page import write_variants_page
from etl.session.crew import Progress
from etl.session.examining import LogsRead
from etl.session.judging import judged
from etl.session.log_tellings import check_nothing_lost
from etl.session.outcome_work import cells_of
from etl.session.pseudonym_record import for_record
from etl.session.pseudonym_study import hidden_crossing
from etl.session.reader_groups import group_tasks, without_values
from etl.session.readiness import MOST_REGIONS
from etl.session.told import counted
from etl.session.variant_comparisons import leading_ones, named_comparisons
from etl.session.variant_counts import VariantCounts
from etl.session.variant_hanging import HangingTrial, ReaderHangs
from etl.session.variant_plans import VariantPlans, plan_variants
from etl.session.variant_results import VariantResults, results_of
from etl.session.variant_tables import VariantTables
from etl.session.variant_traces import VariantTraces
from etl.session.variant_work import VariantAnswer, VariantShape, VariantTask, VariantWork
from etl.session.varied import Varied
from etl.study import StudyVariants
from etl.tables.variants import CHANGED_CELLS, RATES, VARIANT_ROWS, rate_columns
from etl.trials.notes import Notes
from etl.variants.passages import for_paper
from etl.variants.sentences import short_keys, variant_words
from etl.variants.summaries import LEADING_RULE

#: Readers are worked on together until they have so many fixations, in all variants together: the
#: states of all their cells are in memory at once, some 25 bytes a fixation and variant.
STATES_AT_ONCE: Final = 1_500_000
FOR_PAPER: Final = "for_paper.txt"


class VariantRun:
    """All variants of one study, worked on and written.

    Parameters
    ----------
    chosen : StudyVariants
        The variants file.
    read : LogsRead
        The study as it stands, with its logs.
    findings : Findings
        Where problems are recorded.
    folder : Path
        Where the output goes.
    progress : callable
        Told how far the work is.

    Raises
    ------
    DataError
        If anything is wrong.
    """

    def __init__(
        self,
        chosen: StudyVariants,
        read: LogsRead,
        findings: Findings,
        folder: Path,
        progress: Progress,
    ) -> None:
        self.chosen = chosen
        self.read = read
        self.findings = findings
        self.folder = folder
        self.progress = progress
        self.crossing = chosen.crossing
        self.plans: VariantPlans = plan_variants(read, chosen, findings)
        pseudonyms = read.plan.pseudonyms
        self.shown, self.about = chosen.path.name, chosen.title
        if pseudonyms is not None:
            self.crossing = hidden_crossing(chosen.crossing, pseudonyms)
            self.shown = pseudonyms.shown_file(self.shown)
            self.about = pseudonyms.hidden_in_free_text(self.about)
        self.design = self.plans.gathered[self.plans.options[self.crossing.base].facts].design
        self._refuse_names()
        self.leading = named_comparisons(chosen, self.design, self._regions_read())
        self.keys = short_keys(self.crossing.settings)
        self.names = tuple(key.replace(".", "_") for key in self.keys)
        self.formats = tuple(dict.fromkeys(("parquet", *chosen.studies[0].output.formats)))
        full = self.crossing.full
        sizes = [len(setting.alternatives) for setting in self.crossing.settings]
        self.pairs = tuple(len(self.crossing) * (size - 1) // 2 * full for size in sizes)
        self.readers: list[ReaderHangs] = []
        self.trials: list[HangingTrial] = []

    def _refuse_names(self) -> None:
        """Refuse factors that are called like a column of ``rates``, which has one for each."""
        taken = {column.name for column in rate_columns({})} & set(self.design.factors)
        study = self.read.plan.study
        for name in sorted(taken):
            self.findings.error(
                "the tables about variants have a column of this name already",
                path=study.shown,
                line=study.line_of("trials", "factors"),
                where="trials.factors",
                found=name,
                fix="rename the column in its table, and in the study file",
            )
        if taken:
            raise DataError(self.findings)

    def _judge_study(self) -> None:
        """Refuse what a build would refuse, and tell what it would tell, of the study itself."""
        base = self.crossing.base
        gathered = self.plans.gathered[self.plans.options[base].facts]
        examined = (self.plans.plans[base], gathered, self.read.told, self.read.crew)
        totals = judged(examined, self.progress, self.findings)
        if self.findings.failed:
            raise DataError(self.findings)
        check_nothing_lost(self.read.told, totals.counts["fixations read"])

    def _warn(self, results: VariantResults) -> None:
        """Tell of variants that leave nothing, and of settings that do nothing."""
        losses = results.losses
        without = [variant for variant, own in enumerate(losses) if not own.trials_kept]
        bare = [variant for variant, own in enumerate(losses) if not own.fixations_kept]
        for what, empty in (
            ("trial", without),
            ("fixation", [variant for variant in bare if variant not in without]),
        ):
            if empty:
                first = variant_words(self.crossing, empty[0])
                self.findings.warning(
                    f"{counted(len(empty), 'variant')} of {len(losses):,} "
                    f"{'leaves' if len(empty) == 1 else 'leave'} no {what} of any reader",
                    path=self.chosen.shown,
                    found=f"variant {empty[0] + 1}: {first}",
                    fix="leave out the alternative that takes everything",
                )
        if not self.crossing.full:
            return
        for place, setting in enumerate(self.crossing.settings):
            if not any(own.hangs[place] for own in results.changes):
                self.findings.warning(
                    "this changes nothing: every cell is the same with each alternative",
                    path=self.chosen.shown,
                    line=self.chosen.line_of(*setting.key.split(".")),
                    where=setting.key,
                )

    def notes(self) -> list[Notes]:
        """The experimenter's notes that any variant looks at."""
        every = [notes for own in self.plans.gathered for notes in own.notes]
        return list({notes.shown: notes for notes in every}.values())

    def done(self, target: Path) -> Varied:
        """Work on all readers, and write everything but the record.

        Parameters
        ----------
        target : Path
            Where the output will be.

        Returns
        -------
        Varied

        Raises
        ------
        DataError
            If anything is wrong with the fixations of a reader.
        """
        self._judge_study()
        hangs_on = {
            f"hangs_on_{name}": setting.key
            for name, setting in zip(self.names, self.crossing.settings, strict=True)
        }
        conditions = self._conditions()
        shape = VariantShape(
            self.crossing,
            self.pairs,
            conditions,
            len(self.design.regions) > MOST_REGIONS,
            hangs_on,
            self.formats,
        )
        counts, changed = self._counted(shape)
        results = results_of(counts, self.crossing, self.design, conditions, self.pairs)
        self._warn(results)
        chosen = leading_ones(self.leading, results.summaries, self.crossing.base)
        passages = tuple(for_paper(results.summaries[place], self.crossing) for place in chosen)
        tables = VariantTables(self.folder, results, self.design, self.names, self.pairs)
        tables.write(self.readers, changed, self.formats)
        self._write_page(results, chosen, passages)
        (self.folder / FOR_PAPER).write_text(
            "\n\n".join([*passages, ""]), encoding="utf-8", newline="\n"
        )
        return Varied(
            *(target, self.crossing, results.summaries, chosen, passages),
            tables.rows,
            self.findings,
        )

    def _conditions(self) -> NDArray[np.int64]:
        """The combinations of levels that trials of the study have."""
        tasks = self.plans.gathered[0].tasks
        found = [np.zeros((0, len(self.design.factors)), dtype=np.int64)]
        for task in tasks:
            own = task.trials
            rows = np.flatnonzero(own.text >= 0)
            levels = [own.factors[name][rows].astype(np.int64) for name in self.design.factors]
            if levels:
                found.append(np.unique(np.stack(levels, axis=1), axis=0))
        if not self.design.factors:
            return np.zeros((1, 0), dtype=np.int64)
        return np.unique(np.concatenate(found), axis=0)

    def _regions_read(self) -> set[str]:
        """The regions that trials of the study have."""
        library = self.plans.plans[0].library
        texts = np.concatenate([task.trials.text for task in self.plans.gathered[0].tasks])
        codes = cells_of(texts, np.flatnonzero(texts >= 0), library).code
        return {library.region_names[code] for code in np.unique(codes).tolist()}

    def _counted(self, shape: VariantShape) -> tuple[VariantCounts, int]:
        """Work on all readers; what was counted, and how many cells change."""
        gathered = self.plans.gathered[0]
        arguments = (
            without_values(self.design),
            self.plans.plans[0].library,
            gathered.aside,
            self.plans.options,
            shape,
        )
        whole: VariantCounts | None = None
        done, total = 0, len(gathered.tasks) * len(self.crossing)
        writer = changed_cell_writer(self.folder, self.design, shape.hangs_on, self.formats)
        answer: VariantAnswer
        try:
            for answer in self.read.crew.map(VariantWork, arguments, self._tasks()):
                self.findings.extend(answer.findings)
                self.readers += answer.hangs
                self.trials += answer.hanging
                if answer.part is not None:
                    writer.add(answer.part)
                if whole is None:
                    whole = answer.counts
                elif answer.counts is not None:
                    whole.add(answer.counts)
                done += answer.readers * len(self.crossing)
                self.progress("working on variants", done, total)
            if self.findings.failed:
                raise DataError(self.findings)
            writer.close()
        finally:
            writer.abandon()
        if whole is None:
            raise FaultError("a study without readers came as far as its variants")
        return whole, writer.rows

    def _tasks(self) -> Iterator[VariantTask]:
        """Groups of readers, each with the facts that any variant looks at."""
        names = self.plans.gathered[0].tasks.participants
        sizes, held = [0], 0
        for name in names:
            own = self.plans.gathered[0].fixations[name] * len(self.crossing)
            if sizes[-1] and held + own > STATES_AT_ONCE:
                sizes.append(0)
                held = 0
            sizes[-1] += 1
            held += own
        every = [group_tasks(own.design, own.tasks, sizes) for own in self.plans.gathered]
        for groups in zip(*every, strict=True):
            yield VariantTask(groups)

    def _write_page(
        self, results: VariantResults, chosen: tuple[int, ...], passages: tuple[str, ...]
    ) -> None:
        """Write the page, and the traces that it leads to."""
        traces = VariantTraces(self.folder, self.plans, self.crossing, self.pairs)
        readers, trials = traces.shown(self.readers, self.trials)
        csv = "csv" in self.formats
        tables = [
            (f"{name}.csv" if csv or name not in (RATES, CHANGED_CELLS) else f"{name}.parquet", row)
            for name, row in VARIANT_ROWS.items()
        ]
        write_variants_page(
            self.folder,
            VariantsInput(
                self.read.plan.understood()["title"],
                self.about,
                self.read.plan.study.path.name,
                self.shown,
                self.crossing,
                results.summaries,
                chosen,
                bool(self.leading),
                LEADING_RULE,
                passages,
                self.keys,
                results.losses,
                results.changes,
                readers,
                trials,
                self._notices(),
                tuple(tables),
            ),
        )

    def _notices(self) -> tuple[str, ...]:
        """Warnings, without the word; how many more there are stands with the last of them."""
        notices: list[str] = []
        for line in self.recorded(("warning",)):
            if line.startswith(" ") and notices:
                notices[-1] += f"\n{line}"
            else:
                notices.append(line.removeprefix("warning: "))
        return tuple(notices)

    def recorded(self, severities: Sequence[Severity]) -> list[str]:
        """Findings as they may stand in the output.

        Parameters
        ----------
        severities : sequence of str
            Which.

        Returns
        -------
        list of str
        """
        own = self.findings.with_path(self.chosen.shown, self.shown)
        return for_record(own, self.read.plan).lines(severities)
