"""The rows of a log that the study asks for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.parts import Part

#: How many values of a column that [logs.where] does not ask for are remembered, to tell a slip;
#: and how many a message lists where none that is asked for occurs.
MOST_OTHERS = 20
_LISTED = 5

#: For each key of ``[logs.where]``: header and values.
Where = Sequence[tuple[str, Sequence[str]]]


def rows_asked_for(
    columns: Mapping[str, pa.Array],
    where: Where,
    shown: str,
    findings: Findings,
    part: Part | None,
) -> tuple[NDArray[np.bool_], list[tuple[str, ...]]] | None:
    """Find the rows that ``[logs.where]`` asks for.

    Parameters
    ----------
    columns : mapping of str to (n,) pa.Array of text
        The cells by header.
    where : sequence of (str, sequence of str)
        For each key the header, and the values asked for.
    shown : str
        The log's name for messages.
    findings : Findings
        Where it is recorded that no row has a value asked for.
    part : Part or None
        The part of the log that the rows are; nothing is recorded then but in it.

    Returns
    -------
    mask and values, or None
        Whether each row is asked for; and of the column of each key the values asked for that
        occur, and some of the others. None where a problem was recorded.
    """
    mask: NDArray[np.bool_] | None = None
    occurring = []
    before = findings.count("error")
    for place, (header, values) in enumerate(where):
        coded = Coded.of(columns[header], ())
        asked = coded.among(values)
        others = [text for text in coded.values if text not in values][:MOST_OTHERS]
        occurring.append((*(v for v in values if v in coded.values), *others))
        if part is not None:
            part.asked[str(place)] = (bool(asked.any()), coded.values[:_LISTED])
        elif not asked.any():
            tell_none(shown, header, coded.values, values, findings)
        mask = asked if mask is None else mask & asked
    if mask is None or findings.count("error") > before:
        return None
    if part is None and not mask.any():
        tell_none_left(shown, where, findings)
        return None
    return mask, occurring


def tell_none(
    shown: str, header: str, there: Sequence[str], asked: Sequence[str], findings: Findings
) -> None:
    """Record that no row of a log has a value asked for.

    Parameters
    ----------
    shown : str
        The log's name.
    header : str
        The column.
    there : sequence of str
        The values that it has, or the first few.
    asked : sequence of str
        Those asked for.
    findings : Findings
        Where it is recorded.
    """
    findings.error(
        "no row has the value asked for",
        path=shown,
        where=f'column "{header}"',
        found=", ".join(there[:_LISTED]),
        expected=" or ".join(asked),
        fix="correct [logs.where] in the study file, or remove the log",
    )


def tell_none_left(shown: str, where: Where, findings: Findings) -> None:
    """Record that no row of a log has all that is asked for.

    Parameters
    ----------
    shown : str
        The log's name.
    where : sequence of (str, sequence of str)
        For each key the header, and the values asked for.
    findings : Findings
        Where it is recorded.
    """
    findings.error(
        "no row is left by [logs.where]",
        path=shown,
        expected="a row that has "
        + " and ".join(f"{header} {' or '.join(values)}" for header, values in where),
        fix="correct [logs.where] in the study file, or remove the log",
    )
