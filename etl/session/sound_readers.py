"""Which readers of a group nothing is wrong with, so that their rows can be computed."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.regions import RegionLibrary
from etl.session.ordered import OrderedFixations
from etl.session.ordering import ReaderLog, TrialNames, order_fixations
from etl.session.placing import refuse_hand_lines
from etl.session.reader import ReaderGroup
from etl.tables import TableDesign


def sound_readers(
    group: ReaderGroup,
    study: tuple[TableDesign, RegionLibrary, str],
    told: Mapping[str, Findings],
) -> tuple[ReaderGroup, OrderedFixations]:
    """The readers of whose fixations nothing is wrong, and the fixations in time order.

    Parameters
    ----------
    group : ReaderGroup
        Some readers.
    study : tuple
        The study's tables and texts, and what is done with a trial that was recorded more than
        once.
    told : mapping of str to Findings
        For each reader, where is recorded what is wrong or doubtful.

    Returns
    -------
    ReaderGroup and OrderedFixations
        Without readers of whom an error was recorded.
    """
    design, library, repeated = study
    using = (design, repeated)
    sound, ordered = _ordered(group, using, told)
    refuse_hand_lines(sound, ordered, library, told)
    good = [at for at, one in enumerate(sound.participants) if not told[one].failed]
    if len(good) < len(sound):
        sound = sound.of(good)
        # Everything has been told.
        aside = {participant: Findings() for participant in sound.participants}
        sound, ordered = _ordered(sound, using, aside)
    return sound, ordered


def _ordered(
    group: ReaderGroup, using: tuple[TableDesign, str], told: Mapping[str, Findings]
) -> tuple[ReaderGroup, OrderedFixations]:
    """The readers whose fixations have an order, and that order."""
    if len(group) == 1:
        found = [_order(group, using, told[group.participants[0]])]
    else:
        if _logs_alike(group):
            # Mostly there is nothing to tell, and then all are done.
            findings = Findings()
            together = _order(group, using, findings)
            if not len(findings):
                return group, together
        every = [group.of([place]) for place in range(len(group))]
        found = [_order(one, using, told[one.participants[0]]) for one in every]
    good = [at for at, one in enumerate(group.participants) if not told[one].failed]
    sound = group.of(good)
    if not good:
        return sound, found[0]
    starts = sound.trial_starts[:-1].tolist()
    return sound, OrderedFixations.joined([found[at] for at in good], starts)


def _order(
    group: ReaderGroup, using: tuple[TableDesign, str], findings: Findings
) -> OrderedFixations:
    """The fixations in time order."""
    design, repeated = using
    part = group.reader_of_row * len(design.files) + group.file
    log = ReaderLog(group.log, group.file, design.files, _trial_of(group, design), part)
    trials = TrialNames(group.trials.text >= 0, lambda trial: _spelled(group, design, trial))
    return order_fixations(log, trials, repeated, findings)


def _spelled(group: ReaderGroup, design: TableDesign, index: int) -> str:
    """A trial in words, for messages."""
    return ", ".join(
        f"{name} {design.ids[name].values[int(group.trials.ids[name][index])]}"
        for name in ("trial", "session")
        if name in design.ids
    )


def _logs_alike(group: ReaderGroup) -> bool:
    """Whether the logs of all readers hold the same kinds of facts about order."""
    if not np.diff(group.row_starts).all():
        return False
    first, log = group.row_starts[:-1], group.log
    told = np.minimum.reduceat(log.recording, first) >= 0
    kinds = np.stack([np.isnan(log.number[first]), np.isnan(log.onset_ms[first]), told])
    return bool((kinds == kinds[:, :1]).all())


def _trial_of(group: ReaderGroup, design: TableDesign) -> NDArray[np.int64]:
    """Index of each fixation's trial into the group's trials."""
    ids, own = group.log.ids, group.trials.ids

    def places(name: str) -> NDArray[np.int64]:
        ranks = design.ids[name].ranks
        # A log may name trials of readers of other groups. The last place is for a reader without
        # sessions, among others who have them.
        table = np.array([*(ranks.get(text, -1) for text in ids[name].values), -1], dtype=np.int64)
        return table[ids[name].codes]

    width = len(design.ids["trial"].values)
    keys, wanted = own["trial"].astype(np.int64), places("trial")
    span = width
    if "session" in ids:
        keys = keys + own["session"] * width
        wanted += places("session") * width
        span = width * (len(design.ids["session"].values) + 1)
    keys = keys + group.reader_of_trial * span
    wanted += group.reader_of_row * span
    # The trials are sorted by reader, session and trial, so their keys ascend.
    return np.searchsorted(keys, wanted).astype(np.int64)
