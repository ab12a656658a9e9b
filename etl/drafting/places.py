"""Which columns say where a fixation was: coordinates and their unit, areas, and both eyes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from etl.drafting.columns import PooledColumn, share_of, steps
from etl.drafting.meanings import NAMED, Meaning, Understanding, number, shortened
from etl.drafting.structure import Structure, side_of
from etl.drafting.vocabulary import likeness, word_set, words_of

#: Pixels lie in these bounds on any screen; beyond, numbers are something else.
_LEAST_PX, _MOST_PX = -20_000.0, 20_000.0
#: Visual angles from the middle of a screen are smaller than this, and lie on both sides of zero.
_MOST_DEG = 60.0
_READ_FORWARD = (0.5, 0.97)
#: Areas: a few names that come again and again.
_MOST_AREAS = 60
#: Words for words, which name areas only where nothing else does.
_WORDS = word_set("word words wort mot palabra palavra parola 词 section part")
#: Blinks touch few fixations; a column of 0 and 1 that holds 1 more often says something else.
_MOST_BLINKS = 0.2
#: What may be named apart for each eye, where a row holds both.
_EYE_KEYS = ("onset", "end", "duration", "x", "y", "label", "blink")


def sides(headers: Sequence[str]) -> dict[str, dict[str, str]]:
    """Columns that come in pairs, one for each eye.

    Parameters
    ----------
    headers : sequence of str
        All columns.

    Returns
    -------
    dict of str to dict of str to str
        By what the pair has in common: the column of the ``"left"`` and of the ``"right"`` eye.

    Examples
    --------
    >>> sides(["n", "x_left", "x_right"])
    {'x': {'left': 'x_left', 'right': 'x_right'}}
    """
    pairs: dict[str, dict[str, str]] = {}
    for header in headers:
        words = words_of(header)
        # A lone word is no eye: "r" by itself is anything.
        found = [(place, side_of(word)) for place, word in enumerate(words) if len(words) > 1]
        found = [(place, side) for place, side in found if side]
        if len(found) == 1:
            place, side = found[0]
            rest = " ".join(words[:place] + words[place + 1 :])
            pairs.setdefault(rest, {}).setdefault(side, header)
    return {rest: pair for rest, pair in pairs.items() if len(pair) == 2}


def find_places(structure: Structure, headers: Sequence[str], found: Understanding) -> None:
    """Find x and y, and the area that the log itself names.

    Parameters
    ----------
    structure : Structure
        The rows.
    headers : sequence of str
        The columns that are not times, ids or the like.
    found : Understanding
        Where it is recorded.
    """
    columns = {header: structure.rows.columns[header] for header in headers}
    _find_label(structure, columns, found)
    _find_blink(structure, columns, found)
    free = {h: c for h, c in columns.items() if h not in found.used() and _may_be_place(c)}
    for name in ("x", "y"):
        named = [h for h in free if likeness(h, name) >= NAMED]
        if named:
            header = max(named, key=lambda one: likeness(one, name))
            found.meanings[name] = _place(free.pop(header), f"the header says {name}; ")
    _find_unnamed_label(structure, columns, found)
    _find_unnamed(structure, free, found)
    _drop_words(found)
    _doubt_swapped(structure, found)
    _settle_units(structure, found)


def _drop_words(found: Understanding) -> None:
    """Where there are coordinates, a column of words is only the text, and no area."""
    label = found.header("label")
    placed = {"x", "y"} <= found.meanings.keys()
    if label is not None and placed and _WORDS & set(words_of(label)):
        del found.meanings["label"]


def _may_be_place(column: PooledColumn) -> bool:
    """Whether numbers can be positions."""
    if not column.numeric or column.unit in ("ms", "s", "us") or len(column.distinct) < 3:
        return False
    return column.share(0.005) >= _LEAST_PX and column.share(0.995) <= _MOST_PX


def _place(column: PooledColumn, why: str) -> Meaning:
    """A column as a position."""
    low, high = number(column.share(0.005)), number(column.share(0.995))
    return Meaning(column.header, f"{why}99 of 100 cells lie between {low} and {high}")


def _find_unnamed(
    structure: Structure, free: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """X and y by their cells alone: reading goes over a line in steps, and stays at its height."""
    wanting = [name for name in ("x", "y") if name not in found.meanings]
    if not wanting:
        return
    wide = {}
    for header, column in free.items():
        moved = steps(column.numbers, structure.group)
        if not moved.size or column.share(0.95) - column.share(0.05) <= 0:
            continue
        forward = share_of(moved[moved != 0] > 0)
        wide[header] = (forward, float(np.median(np.abs(moved))))
    readers = [h for h, (fwd, _) in wide.items() if _READ_FORWARD[0] < fwd < _READ_FORWARD[1]]
    sweeping = sorted(readers, key=lambda h: -wide[h][1])
    if "x" in wanting and len(wide) == len(free) == len(wanting) and sweeping:
        header = sweeping[0]
        told = f"its numbers go forward in {wide[header][0]:.0%} of steps, as in reading; "
        found.meanings["x"] = _place(free[header], told)
        wanting.remove("x")
    left = [header for header in free if header != found.header("x")]
    if wanting == ["y"] and len(left) == 1:
        found.meanings["y"] = _place(free[left[0]], "it is the only other column that can be; ")
        return
    if found.meanings.get("label") and len(wanting) == 2 and not left:
        return
    for name in wanting:
        across = "across" if name == "x" else "down"
        hint = f" It may be one of {shortened(left)}" if left else ""
        found.questions[name] = (
            f"which column says where a fixation was, {across} the screen?{hint}"
        )


def _doubt_swapped(structure: Structure, found: Understanding) -> None:
    """Doubt x and y where y sweeps over lines and x stays: the headers may be swapped."""
    x, y = found.header("x"), found.header("y")
    if x is None or y is None or found.samples:
        return
    extent = {}
    for header in (x, y):
        moved = steps(structure.rows.columns[header].numbers, structure.group)
        extent[header] = float(np.median(np.abs(moved))) if moved.size else 0.0
    if extent[y] > 4 * extent[x]:
        told = (
            f'from fixation to fixation "{x}" changes by {number(extent[x])} and "{y}" by '
            f"{number(extent[y])}, in the middle"
        )
        for name, column, other in (("x", x, y), ("y", y, x)):
            del found.meanings[name]
            found.questions[name] = (
                f'is it "{column}", as the header says, or "{other}"? Lines of text that run '
                f"across the screen make x change more, but {told}"
            )


def _settle_units(structure: Structure, found: Understanding) -> None:
    """Pixels or degrees, by the header or by the size of the numbers."""
    x, y = found.meanings.get("x"), found.meanings.get("y")
    both = [one for one in (x, y) if one is not None]
    if not both:
        return
    columns = [structure.rows.columns[one.header] for one in both]
    stated = {column.unit for column in columns if column.unit in ("px", "deg")}
    largest = max(max(abs(c.share(0.001)), abs(c.share(0.999))) for c in columns)
    broken = not all(column.whole for column in columns)
    question = ""
    if len(stated) == 1:
        unit = stated.pop()
    elif largest <= 1.5 and broken:
        unit = "?"
        question = (
            '"px" or "deg"? The numbers lie between 0 and 1, like shares of the screen, which '
            "are no unit of a study file: such logs must be multiplied by the screen's size first"
        )
    elif largest <= _MOST_DEG and broken and min(c.share(0.001) for c in columns) < 0:
        unit = "deg"
    elif largest <= _MOST_DEG:
        unit, question = "?", '"px" or "deg"? The numbers are small for pixels'
    else:
        unit = "px"
    for name, meaning in (("x", x), ("y", y)):
        if meaning is not None:
            found.meanings[name] = Meaning(meaning.header, meaning.evidence, unit, question)


def _find_label(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """The column in which the log itself says which area was fixated."""
    best, best_named = None, 0.0
    for header, column in columns.items():
        named = likeness(header, "label")
        few = 2 <= len(column.distinct) <= max(_MOST_AREAS, len(column.coded) // 20)
        if named >= NAMED and named > best_named and few and not structure.constant(column):
            numeric = column.numeric and not column.whole
            if not numeric:
                best, best_named = header, named
    if best is not None:
        told = f"the header says area; its cells hold {shortened(columns[best].distinct)}"
        found.meanings["label"] = Meaning(best, told)


def _find_unnamed_label(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """Where nothing is called like a coordinate or an area, the one column of changing names."""
    if found.meanings.keys() & {"x", "y", "label"}:
        return
    names = [
        header
        for header, column in columns.items()
        if header not in found.used()
        and not column.numeric
        and 2 <= len(column.distinct) <= _MOST_AREAS
        and not structure.constant(column)
    ]
    if len(names) == 1:
        held = shortened(columns[names[0]].distinct)
        told = f"it changes within trials and holds a few names: {held}"
        found.meanings["label"] = Meaning(names[0], told)


def _find_blink(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """The column that says whether a blink touches a fixation."""
    for header, column in columns.items():
        values = [value.casefold() for value in column.distinct]
        said = {"0", "1", "true", "false", "yes", "no", "y", "n", "t", "f", "0.0", "1.0"}
        if likeness(header, "blink") < NAMED or header in found.used() or not values:
            continue
        if set(values) <= said or (column.numeric and column.whole and len(values) < 10):
            told = ", ".join(
                f'"{text}" {int(column.coded.among([text]).sum()):,} times'
                for text in column.distinct[:4]
            )
            found.meanings["blink"] = Meaning(
                header, f"the header says blink, and its cells are {told}"
            )
            return
    for header, column in columns.items():
        if header in found.used() or structure.constant(column) or column.absent:
            continue
        if set(column.distinct) == {"0", "1"} and column.values.mean() < _MOST_BLINKS:
            found.perhaps_blink = header
            return


def find_both_eyes(
    pairs: Mapping[str, Mapping[str, str]],
    columns: Mapping[str, PooledColumn],
    found: Understanding,
) -> None:
    """Where a row holds both eyes, give each eye its columns.

    Parameters
    ----------
    pairs : mapping of str to mapping of str to str
        From :func:`sides`.
    columns : mapping of str to PooledColumn
        All columns.
    found : Understanding
        What was found for the left eye, which is taken over to the right one.
    """
    other = {pair["left"]: pair["right"] for pair in pairs.values()}
    left, right = {}, {}
    for name in _EYE_KEYS:
        meaning = found.meanings.get(name)
        if meaning is None or meaning.header not in other:
            continue
        own = columns[other[meaning.header]]
        left[name] = meaning
        evidence = (
            f"the other one of the pair; 99 of 100 cells lie between {number(own.share(0.005))} "
            f"and {number(own.share(0.995))}"
            if own.numeric
            else "the other one of the pair"
        )
        right[name] = Meaning(own.header, evidence, meaning.unit, meaning.question)
    if left:
        for name in left:
            del found.meanings[name]
        found.eyes = {_eye_name(left, right): left, _eye_name(right, left): right}


def _eye_name(own: Mapping[str, Meaning], other: Mapping[str, Meaning]) -> str:
    """What the headers call an eye: the word in which the columns of a pair differ."""
    first = next(iter(own))
    theirs = set(words_of(other[first].header))
    name = next(word for word in words_of(own[first].header) if word not in theirs)
    return name.upper() if len(name) == 1 else name
