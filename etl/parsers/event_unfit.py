"""What is said of lines that no pattern describes: where they leave the pattern that is nearest."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from etl.errors import SPELLED_OUT, Findings
from etl.parsers.event_lines import ANCHOR, LONGEST_LINE_BYTES, LogLines, Patterns, SortedLines

if TYPE_CHECKING:
    from etl.study.line_patterns import SearchedPattern

#: How many letters of a line are looked at and shown.
_LOOKED_AT = 1000
_FIX = (
    "correct the line, or the pattern (.* stands for what does not matter); or add a pattern for "
    "such lines, to ignore where they mean nothing"
)


def tell_unfit(
    lines: LogLines, found: SortedLines, patterns: Patterns, shown: str, findings: Findings
) -> None:
    """Record the lines that no pattern describes, those too long for any, and those run together.

    Parameters
    ----------
    lines : LogLines
        The lines of the log.
    found : SortedLines
        What they were taken for.
    patterns : mapping of str to sequence of SearchedPattern
        By kind of line.
    shown : str
        The log's name for messages.
    findings : Findings
        Where they are recorded.
    """
    for place in np.flatnonzero(lines.sizes > LONGEST_LINE_BYTES).tolist():
        findings.error(
            "the line is too long to tell of an event",
            path=shown,
            line=place + 1,
            where="logs.patterns",
            found=_begins(lines, place),
            expected=f"at most {LONGEST_LINE_BYTES:,} bytes, not {int(lines.sizes[place]):,}",
            fix="open the file in a text editor: line ends may be lost, or the file is no such log",
        )
    for place in found.glued.tolist():
        findings.error(
            "two lines are run together",
            path=shown,
            line=place + 1,
            where="logs.patterns",
            found=lines.text(place),
            expected="a line end before what a pattern describes",
            fix="put the line end back; a line that is not read hides one that is",
        )
    unfit = found.unfit
    for place in unfit[:SPELLED_OUT].tolist():
        findings.error(
            "no pattern describes this line",
            path=shown,
            line=place + 1,
            where="logs.patterns",
            found=_begins(lines, place),
            expected=_nearest(_begins(lines, place), patterns),
            fix=_FIX,
        )
    if len(unfit) > SPELLED_OUT:
        # A log of another kind has a million of them, which need not be looked at one by one.
        findings.more[findings.items[-1].kind] += len(unfit) - SPELLED_OUT


def _begins(lines: LogLines, place: int) -> str:
    """The beginning of a line."""
    return str(pc.utf8_slice_codeunits(lines.texts.slice(place, 1), 0, _LOOKED_AT)[0].as_py())


def _nearest(line: str, patterns: Patterns) -> str:
    """Where a line leaves the patterns that describe most of its beginning."""
    best = (0, 0)
    names: list[str] = []
    text = pa.array([line], pa.string())
    for kind, own in patterns.items():
        for number, pattern in enumerate(own if kind != "ignore" else ()):
            name = kind if len(own) == 1 else f"{kind} (entry {number + 1})"
            for branch, worded in enumerate(pattern.worded()):
                agrees = _agrees(text, pattern, branch, len(worded))
                if any(worded[: agrees[0]]) and agrees >= best:
                    names = [*names, name] if agrees == best else [name]
                    best = agrees
    if not names:
        return "a line that begins like those of a pattern"
    said = f"a line as {' or '.join(dict.fromkeys(names))} describes it"
    rest = line[best[1] :]
    if not rest:
        return f"{said}, of which this is only the beginning"
    return f'{said}, which this one leaves at "{_cut(rest)}"'


def _agrees(text: pa.Array, pattern: SearchedPattern, branch: int, most: int) -> tuple[int, int]:
    """How many pieces of a pattern a line begins with, and how many letters those describe."""
    low, length = 0, 0
    high = most
    while low < high:
        # Whatever begins with some pieces of a pattern begins with fewer of them too.
        middle = (low + high + 1) // 2
        start = f"{ANCHOR}(?P<all>{pattern.start(branch, middle)})"
        found = pc.extract_regex(text, start)[0].as_py()
        if found is None:
            high = middle - 1
        else:
            low, length = middle, len(found["all"])
    return low, length


def _cut(text: str, most: int = 30) -> str:
    """A text for the middle of a sentence."""
    plain = "".join(sign if sign.isprintable() else repr(sign)[1:-1] for sign in text)
    return plain if len(plain) <= most else f"{plain[:most]}…"
