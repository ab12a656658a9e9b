"""What the page about the variants of a study is made from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from etl.variants.facts import Change, Crossing, Summary

#: Which table has in full what a list of the page may cut short. It is named only where it is
#: among the tables of the page.
FILES = {
    "variants": "variants.csv",
    "differences": "rates.csv",
    "comparisons": "comparisons.csv",
    "changes": "changes.csv",
    "readers": "readers.csv",
    "trials": "changed_cells.csv",
}


@dataclass(frozen=True, slots=True)
class VariantLoss:
    """What one variant keeps and leaves out.

    Attributes
    ----------
    readers : int
        Readers of whom any trial is kept.
    readers_lost : int
        Readers left out by rules on readers.
    trials_read, trials_kept : int
        Trials of the study.
    trials_by_rule : mapping of str to int
        How many trials each rule left out, in the order in which the rules apply.
    fixations_read, fixations_kept : int
        Fixations.
    fixations_by_rule : mapping of str to int
        How many fixations each rule left out.
    values_set_missing : int
        Values that a rule on values took.
    cells_changed : int
        Cells of ``outcomes`` that are not as in the study.
    cells_trials : int
        Trials that these are of.
    """

    readers: int
    readers_lost: int
    trials_read: int
    trials_kept: int
    trials_by_rule: Mapping[str, int]
    fixations_read: int
    fixations_kept: int
    fixations_by_rule: Mapping[str, int]
    values_set_missing: int
    cells_changed: int
    cells_trials: int


@dataclass(frozen=True, slots=True)
class Hanging:
    """How far the 0/1 outcomes of a reader, or of one trial, hang on the decisions.

    Attributes
    ----------
    participant, session, trial, item : str
        Which; session, trial and item are empty for a reader.
    hangs : tuple of float
        By setting: the chance that a cell of the binary outcomes changes when only this setting is
        chosen anew, as the mean over the cells. NaN where not every combination is there.
    cells : int
        Binary cells that are not the same in all variants.
    of : int
        Binary cells in all.
    setting : int
        The setting on which it hangs most.
    pages : tuple of (str, str)
        Words and relative address of its traces: as in the study, and in one variant in which most
        changes; for a reader those of the trial that hangs most.
    changes : tuple of str
        A few of the changes, in words.
    """

    participant: str
    session: str
    trial: str
    item: str
    hangs: tuple[float, ...]
    cells: int
    of: int
    setting: int
    pages: tuple[tuple[str, str], ...]
    changes: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class VariantsInput:
    """Everything that the page tells of, ready counted.

    Attributes
    ----------
    title : str
        Title of the study.
    about : str
        Title of the variants file; may be empty.
    study_file, variants_file : str
        As named by the user.
    crossing : Crossing
        The variants.
    summaries : tuple of Summary
        Every comparison: binary outcome by region by level against its reference.
    leading : tuple of int
        Places of those that get a curve of their own, in order.
    named : bool
        Whether the user named these; else ``rule`` chose them.
    rule : str
        By which rule, in a sentence.
    passages : tuple of str
        For each leading one the passage for a paper.
    short_keys : tuple of str
        Short name of each setting.
    losses : tuple of VariantLoss
        One a variant, in the order of the crossing.
    changes : tuple of Change
        One a measure and region.
    readers, trials : tuple of Hanging
        Those that hang most on a decision, most first.
    notices : tuple of str
        Warnings to be shown.
    tables : tuple of (str, str)
        File name of each table beside the page, and what is in it.
    """

    title: str
    about: str
    study_file: str
    variants_file: str
    crossing: Crossing
    summaries: tuple[Summary, ...]
    leading: tuple[int, ...]
    named: bool
    rule: str
    passages: tuple[str, ...]
    short_keys: tuple[str, ...]
    losses: tuple[VariantLoss, ...]
    changes: tuple[Change, ...]
    readers: tuple[Hanging, ...]
    trials: tuple[Hanging, ...]
    notices: tuple[str, ...]
    tables: tuple[tuple[str, str], ...]
