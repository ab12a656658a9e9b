"""Labels of the logs that no region definition lists: where they are, and what they may mean."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.session.listing import first_few

#: How many labels a message lists.
_LISTED = 12


@dataclass(slots=True)
class Unlisted:
    """A label that no definition lists.

    Attributes
    ----------
    count : int
        How many fixations bear it.
    file, line : int
        The log, by its place among the study's, and the line of the first.
    """

    count: int
    file: int
    line: int

    def add(self, other: Unlisted) -> None:
        """Count some more."""
        self.count += other.count


def unlisted_labels(
    log: CanonicalLog,
    file: NDArray[np.int32],
    in_study: NDArray[np.bool_],
    known: Collection[str],
    readers: tuple[NDArray[np.int64], Sequence[Sequence[str]]],
) -> list[dict[str, Unlisted]]:
    """The labels of fixations that no definition lists.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of some readers, one reader after the other.
    file : (n,) int32 array
        The log of each, by its place among the study's.
    in_study : (n,) bool array
        Whether each belongs to a trial of the study.
    known : collection of str
        The labels that are listed.
    readers : tuple of (n,) int64 array and sequence of sequence of str
        The reader of each fixation, and the labels of each reader's logs, in their order.

    Returns
    -------
    list of dict of str to Unlisted
        For each reader, by label.
    """
    reader, labels = readers
    found: list[dict[str, Unlisted]] = [{} for _ in labels]
    if log.label is None:
        return found
    values, codes = log.label.values, log.label.codes
    strange = ~log.label.among(known) & (codes >= 0) & in_study
    rows = np.flatnonzero(strange)
    places, first, counts = np.unique(
        reader[rows] * len(values) + codes[rows], return_index=True, return_counts=True
    )
    for place, row, count in zip(
        places.tolist(), rows[first].tolist(), counts.tolist(), strict=True
    ):
        own, code = divmod(place, len(values))
        found[own][values[code]] = Unlisted(count, int(file[row]), int(log.source_line[row]))
    # In the order of the reader's own logs, whoever the other readers are.
    return [
        {label: own[label] for label in listed if label in own} if own else own
        for own, listed in zip(found, labels, strict=True)
    ]


def tell_unlisted(
    unlisted: Mapping[str, Unlisted],
    known: Collection[str],
    logs: Sequence[str],
    region_file: str,
    findings: Findings,
) -> None:
    """Tell of labels that no definition lists: their fixations are outside every region.

    Parameters
    ----------
    unlisted : mapping of str to Unlisted
        By label.
    known : collection of str
        The labels that are listed.
    logs : sequence of str
        The names of the logs.
    region_file : str
        The definitions, for messages.
    findings : Findings
        A label that differs from a listed one by letter case or blanks only is an error, one that
        is nearly a listed one a warning, the rest are one note.
    """
    plain = {_plain(label): label for label in known}
    others: list[str] = []
    for label, where in unlisted.items():
        same = plain.get(_plain(label))
        near = get_close_matches(label, list(known), n=1, cutoff=0.8)
        if same is None and not near:
            others.append(label)
            continue
        tell = findings.warning if same is None else findings.error
        tell(
            f"no row of {region_file} lists this label, so that it is outside every region",
            path=logs[where.file],
            line=where.line,
            found=f"{label}, of {where.count:,} fixation{'' if where.count == 1 else 's'}",
            expected=f'perhaps "{same or near[0]}"',
            fix=f"correct the log, or list the label in {region_file}, with the region it is for "
            "or with a region of its own",
        )
    if others:
        count = sum(unlisted[label].count for label in others)
        findings.note(
            (f"{count:,} fixations bear labels" if count > 1 else "1 fixation bears a label")
            + f" that {region_file} does not list, outside every region: "
            + first_few(others, _LISTED)
        )


def _plain(label: str) -> str:
    """A label without what is easily written in two ways."""
    return "".join(unicodedata.normalize("NFKC", label).casefold().split())
