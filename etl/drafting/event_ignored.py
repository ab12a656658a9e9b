"""Patterns for lines that mean nothing, so narrow that no damaged line of another kind fits one."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable, Iterator, Sequence

from etl.drafting.event_patterns import pattern_of_line
from etl.drafting.event_shapes import Shape
from etl.drafting.event_tokens import is_word

#: Of each kind of line so many are damaged to see whether a pattern would swallow them.
_TRIED = 12
#: Words of which there are more are not written out one by one.
_MOST_VALUES = 12


def ignoring(shape: Shape, slips: Collection[str]) -> str | None:
    r"""The pattern for lines that mean nothing.

    Parameters
    ----------
    shape : Shape
        The lines.
    slips : collection of str
        Lines that may not be taken for them, from :func:`slips_in`.

    Returns
    -------
    str or None
        It describes whole lines and holds a word. None where lines have no word that stays, or
        where a damaged line that tells something would fit.

    Examples
    --------
    >>> from etl.drafting.event_clusters import shapes_of
    >>> noise, fixation = shapes_of(["drift 12", "drift 15", "fix 3 4"])
    >>> ignoring(noise, slips_in([fixation]))
    '^drift \\d+$'
    """
    written_out = [
        place
        for place in shape.variables()
        if shape.kind(place) in ("word", "quoted", "rest")
        and len(set(shape.cells[place])) <= _MOST_VALUES
        and "" not in shape.cells[place]
    ]
    narrower = [pattern_of_line(shape, {})]
    if written_out:
        narrower.append(pattern_of_line(shape, {}, spelled_out=written_out))
    if not any(any(map(str.isalpha, word)) for word in shape.words()):
        narrower = narrower[1:] if _has_words(shape, written_out) else []
    for pattern in narrower:
        found = re.compile(pattern)
        if not any(found.search(line) for line in slips):
            return pattern
    return None


def _has_words(shape: Shape, places: Sequence[int]) -> bool:
    """Whether there are words in all lines at one of some places."""
    return any(all(map(is_word, shape.cells[place])) for place in places)


def slips_in(telling: Iterable[Shape]) -> list[str]:
    """Some lines of each shape that tells something, each damaged in many ways, and as they are.

    Parameters
    ----------
    telling : iterable of Shape
        Lines that tell something.

    Returns
    -------
    list of str
    """
    slips: dict[str, None] = {}
    for shape in telling:
        step = max(1, len(shape) // _TRIED)
        for row in range(0, len(shape), step):
            line = shape.whole(row)
            slips[line] = None
            slips |= dict.fromkeys(damaged(line))
    return list(slips)


def damaged(line: str) -> Iterator[str]:
    """A line with one slip in it: its end lost, a letter lost, changed or doubled, another sign.

    Parameters
    ----------
    line : str
        The line.

    Yields
    ------
    str

    Examples
    --------
    >>> "fixaton 1.5" in damaged("fixation 1.5"), "fixation" in damaged("fixation 1.5")
    (True, True)
    """
    for match in re.finditer(r"\s+|(?<=\W)(?=\w)", line):
        yield line[: match.start()].rstrip()
    for place, sign in enumerate(line):
        if sign.isalpha():
            yield line[:place] + line[place + 1 :]
            yield line[:place] + ("x" if sign != "x" else "y") + line[place + 1 :]
            yield line[:place] + sign + line[place:]
        elif sign in ".,":
            yield line[:place] + ("," if sign == "." else ".") + line[place + 1 :]
