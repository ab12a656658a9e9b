"""Whether a header can be used: unique names, every needed one among them, no row above it."""

from __future__ import annotations

import csv
from collections.abc import Collection, Sequence
from difflib import SequenceMatcher
from itertools import zip_longest

from etl.errors import Findings
from etl.files.headers import Header
from etl.files.numeric_cells import number_of
from etl.files.separators import fields_in, reader_of, spelled, split_line
from etl.files.units import bare_name, own_names

#: How much of a header a message repeats, in letters: see :func:`etl.errors.shown`.
_MOST_SHOWN = 60
#: From which likeness on (from 0 to 1, as the standard library has it) a name may be meant, and how
#: many such names are told first for each that is missing (our choice).
_NEAR, _MOST_NEAR = 0.6, 3


def header_is_usable(
    header: Header, data: bytes, shown: str, findings: Findings, needed: Sequence[str] | None
) -> bool:
    """Whether names are unique, every needed one is there and no row above; says what is wrong.

    Parameters
    ----------
    header : Header
        The header.
    data : bytes
        The text that it is from.
    shown : str
        The file's name for messages.
    findings : Findings
        Where problems are recorded.
    needed : sequence of str or None
        The columns that must be there; only they must have a name of their own then.

    Returns
    -------
    bool
    """
    named = [name for name in header.names if name]
    wanted = list(dict.fromkeys(needed or ()))
    own = own_names(wanted, named)
    if len(set(named)) < len(named):
        if header.body >= len(data):
            findings.error(
                "the whole file is one line",
                path=shown,
                line=header.line,
                found=f"{len(header.names)} fields",
                expected="a header, and below it a line for each row",
                fix="export the file again, or copy it again without a change of line ends",
            )
            return False
        if _tell_equal_names(
            header, shown, findings, set(named if needed is None else own.values())
        ):
            return False
    missing = [name for name in wanted if name not in own]
    if missing:
        _tell_missing(missing, header, (named, data), shown, findings, every=missing == wanted)
    if missing or not wanted:
        return not missing
    return not _tell_rows_above(header, data, shown, findings, list(own.values()))


def _tell_missing(
    missing: Sequence[str],
    header: Header,
    given: tuple[Sequence[str], bytes],
    shown: str,
    findings: Findings,
    *,
    every: bool,
) -> None:
    """Record the columns that a header lacks; ``given``: the names that it has, and the text."""
    named, data = given
    near = {name: _near_names(name, named) for name in missing}
    listed = ", ".join(named)
    if len(listed) > _MOST_SHOWN:
        # The message will be cut: what was meant must not be among the names that are cut off.
        ranks = zip_longest(*near.values())
        first = [other for rank in ranks for other in rank if other is not None]
        listed = ", ".join(dict.fromkeys([*first, *named]))
    quoted = ", ".join(f'"{name}"' for name in missing)
    separated = f"a header, separated by {spelled(header.separator)}, that has {quoted}"
    if every and len(missing) > 1:
        sign = next((s for name in missing for s in _before_it(name, header, data)), None)
        findings.error(
            "the header has none of the columns that the study file names",
            path=shown,
            line=header.line,
            found=listed,
            expected=separated,
            fix=f"remove the {sign} before the names: it makes a comment of the line"
            if sign
            else "write the header's own names in [logs.columns], or correct the header; if the "
            "fields are separated otherwise, state [logs] delimiter",
        )
        return
    one = len(missing) == 1
    meant = ", ".join(
        f'"{others[0]}"' if one else f'"{others[0]}" for "{name}"'
        for name, others in near.items()
        if others
    )
    findings.error(
        f"there is no column {quoted}" if one else f"there are no columns {quoted}",
        path=shown,
        line=header.line,
        found=listed,
        expected=separated,
        fix=(f"did you mean {meant}? Write" if meant else "write")
        + f" the header's own name{'' if one else 's'} in the study file, or correct the header",
    )


def _near_names(name: str, named: Sequence[str]) -> list[str]:
    """The names that are most like one, capitals and units aside; the nearest first."""
    sought = SequenceMatcher(b=name.casefold())
    likeness: dict[str, float] = {}
    for other in named:
        for form in {other.casefold(), bare_name(other).casefold()}:
            sought.set_seq1(form)
            if sought.real_quick_ratio() >= _NEAR and sought.quick_ratio() >= _NEAR:
                likeness[other] = max(likeness.get(other, 0.0), sought.ratio())
    near = [other for other, ratio in likeness.items() if ratio >= _NEAR]
    return sorted(near, key=lambda other: -likeness[other])[:_MOST_NEAR]


def _tell_rows_above(
    header: Header, data: bytes, shown: str, findings: Findings, wanted: Sequence[str]
) -> bool:
    """Record that lines above the header are rows, as where an earlier header is damaged."""
    if header.line == 1:
        return False
    places = [header.names.index(name) for name in wanted]
    above = data[: header.start].decode("utf-8", "replace").split("\n")[:-1]
    rows = [
        number
        for number, line in enumerate(above, start=1)
        if not line.lstrip().startswith(header.remarks) and _is_like_a_row(line, header, places)
    ]
    if rows:
        findings.error(
            f"{len(rows):,} lines above the header are like rows"
            if len(rows) > 1
            else "a line above the header is like a row",
            path=shown,
            line=rows[0],
            found=above[rows[0] - 1],
            expected=f"rows below line {header.line} only, which is the first to name all columns "
            "that the study file names",
            fix="correct the header above these rows, or remove what is no part of the table",
        )
    return bool(rows)


def _is_like_a_row(line: str, header: Header, places: Sequence[int]) -> bool:
    """Whether a line has as many fields as the header, and most needed cells of a row.

    A banner may have been filled up with separators to the width of the table; a row has two
    numbers at least, when its fixation was and for how long.
    """
    if fields_in(line, header.separator) < len(header.names):
        return False
    try:
        cells = next(reader_of([line], header.separator, strict=False), [])
    except csv.Error:
        cells = split_line(line, header.separator)
    if len(cells) != len(header.names):
        return False
    needed = [cells[place].strip() for place in places]
    numbers = [cell for cell in needed if number_of(cell.replace(",", ".")) is not None]
    filled = [cell for cell in needed if cell]
    return len(numbers) > 1 and 2 * len(filled) > len(needed)


def _before_it(name: str, header: Header, data: bytes) -> list[str]:
    """The sign of a remark above the header that names a column, as where # stands before it."""
    above = data[: header.start].decode("utf-8", "replace").split("\n")
    signs = []
    for line in (line.lstrip(" \t") for line in above):
        for sign in header.remarks:
            rest = line.lstrip(sign + " \t") if line.startswith(sign) else ""
            if name in rest.split(header.separator):
                signs.append(sign)
    return signs


def _tell_equal_names(
    header: Header, shown: str, findings: Findings, needed: Collection[str]
) -> bool:
    """Record every needed name that stands over two columns; False where there is none."""
    seen: dict[str, int] = {}
    told = False
    for position, name in enumerate(header.names, start=1):
        if name in needed and name in seen:
            told = True
            findings.error(
                "two columns have the same name",
                path=shown,
                line=header.line,
                where="header",
                found=name,
                expected=f"a name of its own for each of columns {seen[name]} and {position}",
                fix="rename one of them in the file's header",
            )
        seen.setdefault(name, position)
    return told
