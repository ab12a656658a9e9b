"""Readers and trials that hang most on a setting, and their traces as pages."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.report.trace_page import page
from etl.report.variants_input import Hanging
from etl.session.decisions import under_limits
from etl.session.pseudonym_record import told_study
from etl.session.reader import ReaderTables
from etl.session.tracing import Tracer, TrialKey
from etl.session.variant_hanging import (
    MOST_OFFERED,
    MOST_UNTOLD,
    HangingTrial,
    Hangs,
    ReaderHangs,
    score_of,
)
from etl.session.variant_plans import VariantPlans
from etl.session.work import ReaderTask, make_reader_work
from etl.variants.facts import Crossing
from etl.variants.sentences import variant_words

TRACES: Final = "traces"
#: How many readers are shown.
MOST_SHOWN: Final = 12
#: How many changes of a trial are spelled out.
_MOST_CHANGES: Final = 4


@dataclass(eq=False)
class VariantTraces:
    """Draws trials under chosen variants.

    Attributes
    ----------
    folder : Path
        The output folder; pages go into a folder within.
    plans : VariantPlans
        The variants.
    crossing : Crossing
        The same as numbers.
    pairs : tuple of int
        By setting, how many pairs of variants differ in it only.
    """

    folder: Path
    plans: VariantPlans
    crossing: Crossing
    pairs: tuple[int, ...]

    def __post_init__(self) -> None:
        self._done: dict[tuple[str, int], ReaderTables] = {}
        self._pages: dict[tuple[str, int, int], tuple[str, str]] = {}
        self._tasks = [own.tasks.by_name() for own in self.plans.gathered]

    def shown(
        self, readers: Sequence[ReaderHangs], trials: Sequence[HangingTrial]
    ) -> tuple[tuple[Hanging, ...], tuple[Hanging, ...]]:
        """The readers and trials that hang most, with their pages.

        Parameters
        ----------
        readers : sequence of ReaderHangs
            All readers.
        trials : sequence of HangingTrial
            Those that were offered.

        Returns
        -------
        tuple of Hanging, twice
            Readers and trials, most first; equal ones in the order of the tables.
        """
        best = sorted(readers, key=lambda own: -score_of(own.hangs, self.pairs)[0])
        some = [own for own in best if own.most is not None][:MOST_SHOWN]
        of_readers = []
        for reader in some:
            assert reader.most is not None  # noqa: S101 - chosen so
            setting = score_of(reader.hangs, self.pairs)[1]
            of_readers.append(
                self._told(reader.participant, None, reader.hangs, setting, reader.most)
            )
        of_trials = [
            self._told(one.participant, self._key(one), one.hangs, one.setting, one)
            for one in self._chosen(trials)
        ]
        return tuple(of_readers), tuple(of_trials)

    def _chosen(self, trials: Sequence[HangingTrial]) -> list[HangingTrial]:
        """For each setting the trials that hang most on it, the settings with the most first."""
        by_setting: dict[int, list[HangingTrial]] = {}
        for one in trials:
            by_setting.setdefault(one.setting, []).append(one)

        def chance(one: HangingTrial) -> float:
            if one.setting < 0:
                return one.hangs.differing / max(one.hangs.of, 1)
            return one.hangs.chances(self.pairs)[one.setting]

        best = []
        for setting, own in by_setting.items():
            most = MOST_UNTOLD if setting < 0 else MOST_OFFERED
            best.append(sorted(own, key=lambda one: -chance(one))[:most])
        best.sort(key=lambda own: -chance(own[0]))
        return [one for own in best for one in own]

    def _told(
        self,
        participant: str,
        key: TrialKey | None,
        hangs: Hangs,
        setting: int,
        trial: HangingTrial,
    ) -> Hanging:
        """A reader, or a trial where there is a key, with pages of a trial."""
        chances = hangs.chances(self.pairs)
        named = ("", "", "") if key is None else (key.session, key.trial, self._item(trial))
        pages = (
            self._page(trial, self.crossing.base),
            self._page(trial, trial.variant),
        )
        changes = self._changes(trial)
        if key is None:
            of_trial = self._key(trial)
            visit = f"session {of_trial.session}, " if of_trial.session else ""
            changes = (f"{visit}trial {of_trial.trial}: {changes[0]}", *changes[1:])
        return Hanging(participant, *named, chances, hangs.cells, hangs.of, setting, pages, changes)

    def _key(self, trial: HangingTrial) -> TrialKey:
        """What the trial is called."""
        plan = self.plans.plans[0]
        tracer = Tracer(plan.study, plan.library, self.plans.gathered[0].design)
        return tracer.key(self._tasks[0][trial.participant].trials, trial.row)

    def _item(self, trial: HangingTrial) -> str:
        """The text of the trial; empty where the study knows no items."""
        design = self.plans.gathered[0].design
        code = int(self._tasks[0][trial.participant].trials.ids["item"][trial.row])
        return design.ids["item"].values[code] if code >= 0 else ""

    def _changes(self, trial: HangingTrial) -> tuple[str, ...]:
        """What changes in the trial, in words."""
        library = self.plans.plans[0].library
        words = variant_words(self.crossing, trial.variant)
        if all(after == LEFT_OUT for *_, after in trial.changes):
            return (f"left out with {words}",)
        if all(before == LEFT_OUT for *_, before, _ in trial.changes):
            return (f"left out in the study, kept with {words}",)
        told = [
            f"{name} at {library.region_names[code]}: {_state(before)}, "
            f"with {words} {_state(after)}"
            for name, code, before, after in trial.changes[:_MOST_CHANGES]
        ]
        more = len(trial.changes) - _MOST_CHANGES
        return (*told, f"and {more} more") if more > 0 else tuple(told)

    def _page(self, trial: HangingTrial, variant: int) -> tuple[str, str]:
        """Write the page of a trial under a variant; its words and address."""
        key = (trial.participant, trial.row, variant)
        if key not in self._pages:
            name = f"{TRACES}/{len(self._pages) + 1:02d}_variant_{variant + 1}.html"
            words = variant_words(self.crossing, variant)
            base = variant == self.crossing.base
            says = f"Under {words}." if base else f"Variant {variant + 1}, with {words}."
            (self.folder / TRACES).mkdir(exist_ok=True)
            (self.folder / name).write_text(
                self._drawn(trial, variant, says), encoding="utf-8", newline="\n"
            )
            self._pages[key] = ("as in the study" if base else f"with {words}", name)
        return self._pages[key]

    def _drawn(self, trial: HangingTrial, variant: int, says: str) -> str:
        """The page of a trial under a variant."""
        plan, options = self.plans.plans[variant], self.plans.options[variant]
        gathered = self.plans.gathered[options.facts]
        design = under_limits(gathered.design, options.options.limits)
        task: ReaderTask = self._tasks[options.facts][trial.participant]
        own = (trial.participant, variant)
        if own not in self._done:
            work = make_reader_work(design, plan.library, options.options, gathered.aside)
            self._done[own] = work(task)
        tables = self._done[own]
        tracer = Tracer(told_study(plan.study, plan.pseudonyms), plan.library, design)
        traced = tracer.traced(
            tables.batches,
            trial.participant,
            tracer.key(task.trials, trial.row),
            int(task.trials.text[trial.row]),
            tables.trust,
        )
        return page(traced, remark=says)


def _state(state: int) -> str:
    """A state of a binary cell in words."""
    return {LEFT_OUT: "left out", NO_VALUE: "no value"}.get(state, str(state))
