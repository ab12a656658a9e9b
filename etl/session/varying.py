"""The job of ``trialwright vary``: the same study under other decisions, side by side."""

from __future__ import annotations

import os
import time
from collections.abc import Iterator, Sequence
from contextlib import nullcontext
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Final

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
from numpy.typing import NDArray

from etl.errors import DataError, FaultError, Findings
from etl.export.changed_cells import changed_cell_writer
from etl.export.publish import published
from etl.export.run_record import RunRecord
from etl.measures import MEASURES, SELECTABLE, TRIAL_MEASURES, select
from etl.report.variants_input import VariantsInput
from etl.report.variants_page import write_variants_page
from etl.session.crew import PUBLISHED, Progress, Room, silent
from etl.session.examining import LogsRead, own_faults, read_study
from etl.session.inputs_read import inputs_read
from etl.session.kept_places import kept_folder
from etl.session.log_tellings import log_counts
from etl.session.pseudonym_key import known_by, open_key, refuse_key_inside, save_key
from etl.session.pseudonym_record import for_record
from etl.session.pseudonym_study import hidden_crossing
from etl.session.reader_groups import group_tasks, without_values
from etl.session.readiness import MOST_REGIONS
from etl.session.told import counted, near
from etl.session.variant_counts import VariantCounts
from etl.session.variant_hanging import HangingTrial, ReaderHangs
from etl.session.variant_plans import VariantPlans, plan_variants
from etl.session.variant_results import VariantResults, results_of
from etl.session.variant_tables import VariantTables
from etl.session.variant_traces import VariantTraces
from etl.session.variant_work import VariantAnswer, VariantShape, VariantTask, VariantWork
from etl.study import Study, StudyVariants, load_variants
from etl.tables.variants import CHANGED_CELLS, RATES, VARIANT_ROWS
from etl.trials.notes import Notes
from etl.variants.facts import Crossing, Summary
from etl.variants.sentences import for_paper, in_short, short_keys
from etl.variants.summaries import LEADING_RULE, leading

_MOST_LEADING: Final = 4
#: Readers are worked on together until they have so many fixations, in all variants together: the
#: states of all their cells are in memory at once, some 25 bytes a fixation and variant.
STATES_AT_ONCE: Final = 1_500_000
FOR_PAPER: Final = "for_paper.txt"


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
            lines += in_short(self.summaries[place], crossing).split("\n")
        turning = sum(not own.holds for own in self.summaries)
        whole = counted(len(self.summaries), "comparison")
        do = "does" if turning == 1 else "do"
        lines.append(f"Of {whole}, {turning:,} {do} not have the same sign in all variants.")
        lines.append(f"Written to {near(self.folder)}:")
        width = max(len(name) for name in self.rows)
        lines += [f"  {name:<{width}}  {rows:>11,} rows" for name, rows in self.rows.items()]
        lines.append("  codebook.csv, for_paper.txt, run.json, and variants.html to look at")
        return "\n".join(lines)


def vary(
    study: Study,
    variants: str | os.PathLike[str],
    *,
    into: str | os.PathLike[str] | None = None,
    workers: int | None = 1,
    progress: Progress = silent,
) -> Varied:
    """Compute the binary outcomes of a study under other decisions.

    Parameters
    ----------
    study : Study
        From :func:`etl.load_study`.
    variants : path
        The variants file: alternatives for settings of the study file.
    into : path, optional
        The output folder; beside the variants file, with its name without the ending, where
        absent. What an earlier run wrote there is replaced as a whole.
    workers : int or None
        Number of processes; None finds one out. The output is the same bytes with any number. With
        more than one, the calling script must guard its work by ``if __name__ == "__main__":``.
    progress : callable, optional
        Called with a stage's name, how much of it is done, and how much there is.

    Returns
    -------
    Varied
        Where tables and page are, and what they say.

    Raises
    ------
    StudyError
        If the variants file is wrong: all problems at once, each with its line.
    DataError
        If anything is wrong with an input, or the output folder may not be replaced.

    References
    ----------
    Steegen, Tuerlinckx, Gelman & Vanpaemel (2016). Increasing transparency through a multiverse
    analysis. Perspectives on Psychological Science, 11, 702-712. doi:10.1177/1745691616658637
    """
    started = time.perf_counter()
    chosen = _loaded(variants, study)
    path = Path(variants)
    target = Path(into) if into is not None else path.with_name(path.stem)
    refuse_key_inside(study, target)
    findings = Findings()
    built = study.folder / study.output.folder
    with (
        published(target, str(target)) as shop,
        own_faults(),
        nullcontext(open_key(study, findings, target=target)) as held,
        Room(shop.kept, workers, progress, kept_folder(built, held)) as room,
    ):
        read = read_study(study, room, findings, held, turns=len(chosen.crossing))
        if read is None or findings.failed:
            raise DataError(findings)
        _hold_kept(room, read)
        run = _Run(chosen, read, findings, shop.fresh, progress)
        varied = run.done(target)
        told = for_record(findings, read.plan).lines(("warning", "note"))
        own = {"file": run.shown, "role": "variants file", "sha256": chosen.sha256}
        RunRecord(
            read.plan.understood(),
            inputs_read(read.plan, run.notes(), read.told, [own]),
            {**log_counts(read.told), "variants": len(chosen.crossing)},
            varied.rows,
            told,
            [],
            time.perf_counter() - started,
            "" if held is None else known_by(held.pseudonyms.key),
        ).write(shop.fresh)
        progress("publishing", 1, 1)
        shop.settle()
        if held is not None:
            save_key(held)
    progress(PUBLISHED, 1, 1)
    return varied


def _hold_kept(room: Room, read: LogsRead) -> None:
    """Keep what a build of the study has kept from going while it is used."""
    names = [name for answer in read.answers for name, _ in answer.entries()]
    try:
        room.store.hold(names)
    except OSError as gone:
        findings = Findings()
        findings.error(
            "what the study's build has kept is being removed by another build",
            path=room.store.earlier.name,
            fix="wait until the build of the study is done, and try again",
        )
        raise DataError(findings) from gone


def _loaded(variants: str | os.PathLike[str], study: Study) -> StudyVariants:
    """The variants file, read with the outcomes that there are."""
    chosen = select(study.measures.outcomes)
    return load_variants(
        Path(variants),
        study,
        region_outcomes=[name for name in chosen if MEASURES[name].kind == "binary"],
        trial_outcomes=[m.name for m in TRIAL_MEASURES.values() if m.kind == "binary"],
        known_outcomes=SELECTABLE,
    )


class _Run:
    """All variants of one study, worked on and written."""

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
        self.plans: VariantPlans = plan_variants(read, chosen.studies, findings)
        pseudonyms = read.plan.pseudonyms
        self.shown, self.about = chosen.path.name, chosen.title
        if pseudonyms is not None:
            self.crossing = hidden_crossing(chosen.crossing, pseudonyms)
            self.shown = pseudonyms.shown_file(self.shown)
            self.about = pseudonyms.hidden_in_free_text(self.about)
        self.design = self.plans.gathered[self.plans.options[self.crossing.base].facts].design
        self.leading = self._leading_named()
        self.keys = short_keys(self.crossing.settings)
        self.names = tuple(key.replace(".", "_") for key in self.keys)
        self.formats = tuple(dict.fromkeys(("parquet", *chosen.studies[0].output.formats)))
        full = self.crossing.full
        sizes = [len(setting.alternatives) for setting in self.crossing.settings]
        self.pairs = tuple(len(self.crossing) * (size - 1) // 2 * full for size in sizes)
        self.readers: list[ReaderHangs] = []
        self.trials: list[HangingTrial] = []

    def notes(self) -> list[Notes]:
        """The experimenter's notes that any variant looks at."""
        every = [notes for own in self.plans.gathered for notes in own.notes]
        return list({notes.shown: notes for notes in every}.values())

    def done(self, target: Path) -> Varied:
        """Work on all readers, and write everything but the record."""
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
        chosen = self._leading(results.summaries)
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

    def _leading_named(self) -> list[tuple[str, str, str, str]]:
        """The comparisons that the user names, by outcome, region, factor and level."""
        wanted = []
        regions, wrong = self.design.regions, Findings()
        for own in self.chosen.comparisons:
            levels = self.design.factors.get(own.factor, ())
            level = own.level or (levels[1] if len(levels) == 2 else "")
            if own.region and own.region not in regions:
                self._tell(
                    wrong, own.line, "no text has a region of this name", own.region, regions
                )
            elif own.region and len(regions) > MOST_REGIONS:
                wrong.error(
                    f"with more than {MOST_REGIONS} regions all are counted together",
                    path=self.chosen.shown,
                    line=own.line,
                    found=own.region,
                    fix="leave out the comparison",
                )
            elif own.factor and level not in levels[1:]:
                self._tell(
                    wrong,
                    own.line,
                    f"no level of {own.factor} that can be compared is named so"
                    if level
                    else f"{own.factor} has {len(levels)} levels: say which is compared with "
                    f"{levels[0] if levels else 'the first'}",
                    level,
                    levels[1:],
                )
            wanted.append((own.outcome, own.region, own.factor, level))
        if wrong.failed:
            raise DataError(wrong)
        return wanted

    def _tell(
        self, wrong: Findings, line: int | None, problem: str, found: str, there: Sequence[str]
    ) -> None:
        """Say that a name in the variants file is not known."""
        near = get_close_matches(found, there, n=1) if found else []
        listed = ", ".join(there[:12]) + (" …" if len(there) > 12 else "")
        wrong.error(
            problem,
            path=self.chosen.shown,
            line=line,
            where="comparisons",
            found=found or None,
            expected=f"one of {listed}",
            fix=f'did you mean "{near[0]}"?' if near else "correct the comparison",
        )

    def _leading(self, summaries: Sequence[Summary]) -> tuple[int, ...]:
        """Which comparisons the page begins with."""
        if not self.leading:
            return leading(summaries, _MOST_LEADING, self.crossing.base)
        place = {}
        for number, summary in enumerate(summaries):
            own = summary.compared.comparison
            place[own.outcome, own.region, own.factor, own.level] = number
        return tuple(place[own] for own in self.leading)

    def _write_page(
        self, results: VariantResults, chosen: tuple[int, ...], passages: tuple[str, ...]
    ) -> None:
        """Write the page, and the traces that it leads to."""
        traces = VariantTraces(self.folder, self.plans, self.crossing, self.keys, self.pairs)
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
                tuple(for_record(self.findings, self.read.plan).lines(("warning",))),
                tuple(tables),
            ),
        )
