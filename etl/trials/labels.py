"""Labels of the open standard (BIDS) as tables write them: with the entity before the label."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from etl.files import Coded

#: What stands before a label in ``participants.tsv`` and ``sessions.tsv`` (BIDS 1.11 schema,
#: ``objects.columns.participant_id`` and ``session_id``). A label itself has no hyphen.
PREFIXES = {"participant": "sub-", "session": "ses-"}


def labels_of(kind: str) -> Mapping[str, str]:
    """What may stand before an id in the tables of a study.

    Parameters
    ----------
    kind : {"table", "events", "bids"}
        The kind of the study's logs.

    Returns
    -------
    mapping of str to str
        By canonical name; empty where ids are written as in the logs.
    """
    return PREFIXES if kind == "bids" else {}


def without_prefix(column: Coded, prefix: str | None) -> Coded:
    """A column of labels without what stands before each.

    Parameters
    ----------
    column : Coded
        As the table has it.
    prefix : str or None
        What may stand before a label.

    Returns
    -------
    Coded

    Examples
    --------
    >>> column = Coded(np.array([0, 1, -1], dtype=np.int32), ("sub-P01", "P02"))
    >>> without_prefix(column, "sub-").values
    ('P01', 'P02')
    """
    if not prefix or not any(text.startswith(prefix) for text in column.values):
        return column
    known: dict[str, int] = {}
    for text in column.values:
        known.setdefault(text.removeprefix(prefix), len(known))
    new = [known[text.removeprefix(prefix)] for text in column.values]
    return Coded(np.array([*new, -1], dtype=np.int32)[column.codes], tuple(known))
