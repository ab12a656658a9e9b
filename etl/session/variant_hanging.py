"""Readers and trials whose binary outcomes hang on a setting, and what changes there."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.session.reader import ReaderGroup
from etl.session.variant_states import Changed, Universe
from etl.variants.facts import Crossing

#: So many trials of a group are offered for each setting, besides one of each reader; and so many
#: where it cannot be told on which setting they hang.
MOST_OFFERED: Final = 4
MOST_UNTOLD: Final = 12


@dataclass(frozen=True, slots=True)
class Hangs:
    """How much some binary cells hang on each setting.

    Attributes
    ----------
    pairs : tuple of int
        By setting: pairs of variants that differ in it only and in which a cell differs, over all
        cells; 0 where not every combination is there.
    differing : int
        Cells that are not as in the study as it stands, over all variants.
    cells : int
        Cells that are not the same in all variants.
    of : int
        Cells in all that are there in any variant.
    """

    pairs: tuple[int, ...]
    differing: int
    cells: int
    of: int

    def chances(self, pairs: Sequence[int]) -> tuple[float, ...]:
        """How often a cell changes when only one setting is chosen anew, by setting.

        Parameters
        ----------
        pairs : sequence of int
            By setting, how many pairs of variants differ in it only.

        Returns
        -------
        tuple of float
            From 0 to 1; NaN where there are no such pairs, or no cells.
        """
        return tuple(
            own / (self.of * all_) if self.of * all_ else math.nan
            for own, all_ in zip(self.pairs, pairs, strict=True)
        )


@dataclass(frozen=True, slots=True)
class ReaderHangs:
    """A reader, and the trial that hangs most on the same setting; None where none does."""

    participant: str
    hangs: Hangs
    most: HangingTrial | None


@dataclass(frozen=True, slots=True)
class HangingTrial:
    """A trial whose outcomes hang on a setting.

    Attributes
    ----------
    participant : str
        The reader.
    row : int
        Its place among the reader's trials.
    hangs : Hangs
        How much.
    setting : int
        On which it hangs most; -1 where that cannot be told. Of a reader's trial, the setting on
        which the reader hangs most.
    variant : int
        The variant to be shown beside the study as it stands: one that differs from it in that
        setting only, in which most of the cells change; else one that differs in others too; or
        the one in which most do.
    changes : tuple of (str, int, int, int)
        What changes there: measure, code of the region, states in the study and in the variant.
    """

    participant: str
    row: int
    hangs: Hangs
    setting: int
    variant: int
    changes: tuple[tuple[str, int, int, int], ...]


def score_of(hangs: Hangs, pairs: tuple[int, ...]) -> tuple[float, int]:
    """How much something hangs on the setting it hangs most on, and which that is.

    Parameters
    ----------
    hangs : Hangs
        Of a reader or trial.
    pairs : tuple of int
        By setting, how many pairs of variants differ in it only.

    Returns
    -------
    float and int
        From 0 to 1; where not every combination is there the mean number of cells that differ, and
        -1.
    """
    if not any(hangs.pairs):
        return hangs.differing / max(hangs.of, 1), -1
    chances = hangs.chances(pairs)
    setting = int(np.argmax(chances))
    return chances[setting], setting


def readers_hanging(
    group: ReaderGroup,
    universe: Universe,
    changed: Mapping[str, Changed],
    there: NDArray[np.bool_],
    using: tuple[Crossing, tuple[int, ...]],
) -> tuple[list[ReaderHangs], list[HangingTrial]]:
    """How much readers hang on settings, and the trials that do most.

    Parameters
    ----------
    group : ReaderGroup
        The readers.
    universe : Universe
        Their cells.
    changed : mapping of str to Changed
        The binary outcomes by name.
    there : (cells,) bool array
        Whether each cell is there in any variant.
    using : tuple
        The variants, and by setting how many pairs of them differ in it only.

    Returns
    -------
    list of ReaderHangs and list of HangingTrial
        All readers; and for each setting in turn, of the trials that hang on it more than on any
        other, those that do most, most first.
    """
    crossing, pairs = using
    width, settings = len(group.trials), len(crossing.settings)
    by_trial = np.zeros((width, settings), dtype=np.int64)
    differing = np.zeros(width, dtype=np.int64)
    cells = np.zeros(width, dtype=np.int64)
    for own in changed.values():
        trial = universe.cells.trial[own.rows]
        np.add.at(by_trial, trial, own.pairs)
        np.add.at(differing, trial, (own.states != own.states[crossing.base]).sum(axis=0))
        cells += np.bincount(trial, minlength=width)
    of = np.bincount(universe.cells.trial[there], minlength=width) * len(changed)

    def hangs(trials: NDArray[np.int64]) -> Hangs:
        return Hangs(
            tuple(by_trial[trials].sum(axis=0).tolist()),
            *(int(own[trials].sum()) for own in (differing, cells, of)),
        )

    def offered(trial: int, setting: int) -> HangingTrial:
        reader = int(group.reader_of_trial[trial])
        told = hangs(np.array([trial]))
        states = _states_of(trial, universe, changed)
        variant = _telling(states, setting, crossing)
        return HangingTrial(
            group.participants[reader],
            trial - int(group.trial_starts[reader]),
            told,
            setting,
            variant,
            tuple(
                (name, code, int(own[crossing.base]), int(own[variant]))
                for name, code, own in states
                if own[crossing.base] != own[variant]
            ),
        )

    readers = []
    for reader, participant in enumerate(group.participants):
        own_trials = np.arange(*group.trial_starts[reader : reader + 2].tolist())
        told = hangs(own_trials)
        setting = score_of(told, pairs)[1]
        # The trial to be shown of a reader is the one that hangs most on what the reader hangs on.
        chances = _chances(setting, by_trial, differing, of)
        best = int(own_trials[np.argmax(chances[own_trials])]) if told.cells else -1
        readers.append(
            ReaderHangs(participant, told, offered(best, setting) if told.cells else None)
        )
    trials = []
    # Each trial once, for the setting it hangs most on: the first of equal ones.
    mainly = np.argmax(by_trial / np.maximum(pairs, 1), axis=1)
    for setting in range(settings) if crossing.full else (-1,):
        chances = _chances(setting, by_trial, differing, of)
        if setting >= 0:
            chances = np.where(mainly == setting, chances, 0.0)
        most = MOST_UNTOLD if setting < 0 else MOST_OFFERED
        order = np.argsort(-chances, kind="stable")[:most].tolist()
        trials += [offered(trial, setting) for trial in order if chances[trial] > 0]
    return readers, trials


def _chances(
    setting: int,
    by_trial: NDArray[np.int64],
    differing: NDArray[np.int64],
    of: NDArray[np.int64],
) -> NDArray[np.float64]:
    """How much each trial hangs on a setting, or on all for -1, up to a factor."""
    counted = differing if setting < 0 else by_trial[:, setting]
    chances: NDArray[np.float64] = counted / np.maximum(of, 1)
    return chances


def _states_of(
    trial: int, universe: Universe, changed: Mapping[str, Changed]
) -> list[tuple[str, int, NDArray[np.int8]]]:
    """The cells of a trial that change: measure, region, states by variant."""
    return [
        (name, int(universe.cells.code[own.rows[at]]), own.states[:, at])
        for name, own in changed.items()
        for at in np.flatnonzero(universe.cells.trial[own.rows] == trial).tolist()
    ]


def _telling(
    states: list[tuple[str, int, NDArray[np.int8]]], setting: int, crossing: Crossing
) -> int:
    """The variant to be shown beside the study."""
    differs = sum((own != own[crossing.base]).astype(np.int64) for _, _, own in states) + np.zeros(
        len(crossing), dtype=np.int64
    )
    if setting >= 0:
        same = crossing.choices == crossing.choices[crossing.base]
        chosen_anew = ~same[:, setting]
        alone = chosen_anew & np.delete(same, setting, axis=1).all(axis=1)
        # What the setting does may show only where others are chosen anew too.
        for among in (alone, chosen_anew):
            if differs[among].any():
                differs = np.where(among, differs, 0)
                break
    return int(np.argmax(differs))
