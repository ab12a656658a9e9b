"""The lines of a log of events, each taken by the first pattern that describes it."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

if TYPE_CHECKING:
    from etl.study.line_patterns import SearchedPattern

#: Blanks of any script, as a set of RE2.
BLANKS = r"[\s\v\x{1c}-\x{1f}\x{85}\p{Z}]"

#: What is said before the reason why a pattern cannot be matched.
_INVALID = "Invalid regular expression: "
#: Where a line begins, in RE2.
ANCHOR = r"\A"

Places = NDArray[np.int64]
Patterns = Mapping[str, Sequence["SearchedPattern"]]

#: The longest line, in bytes, that patterns are tried on. Lines of recorders and of lab scripts are
#: a hundred times shorter (our choice); matching takes time in proportion to this and to the length
#: of the pattern, at worst to their product.
LONGEST_LINE_BYTES = 100_000


@dataclass(frozen=True, slots=True)
class LogLines:
    """The lines of a text.

    Attributes
    ----------
    texts : (n,) pa.Array of text
        Without their line ends; letters composed (Unicode NFC).
    sizes : (n,) int64 array
        Their lengths in bytes.
    """

    texts: pa.Array
    sizes: Places

    def __len__(self) -> int:
        return len(self.sizes)

    def take(self, places: Places) -> pa.Array:
        """Some of the lines."""
        return self.texts if len(places) == len(self) else self.texts.take(pa.array(places))

    def text(self, place: int) -> str:
        """One line."""
        return str(self.texts[place].as_py())


def lines_of(data: bytes) -> LogLines:
    r"""Split a text into lines.

    Parameters
    ----------
    data : bytes
        UTF-8, every line end a line feed; the last line may have none.

    Returns
    -------
    LogLines

    Examples
    --------
    >>> lines_of(b"one\n\ntwo").texts.to_pylist()
    ['one', '', 'two']
    """
    if not data.isascii():
        text = data.decode("utf-8")
        if not unicodedata.is_normalized("NFC", text):
            data = unicodedata.normalize("NFC", text).encode("utf-8")
    ends = np.flatnonzero(np.frombuffer(data, dtype=np.uint8) == ord("\n"))
    if not data.endswith(b"\n"):
        ends = np.append(ends, len(data))
    # Without the line ends, line k begins k bytes earlier.
    offsets = np.zeros(len(ends) + 1, dtype=np.int64)
    offsets[1:] = ends - np.arange(len(ends))
    letters = pa.py_buffer(data.replace(b"\n", b""))
    texts = pa.LargeStringArray.from_buffers(len(ends), pa.py_buffer(offsets), letters)
    return LogLines(texts, np.diff(offsets))


@dataclass(frozen=True, slots=True)
class Told:
    """What lines of one kind tell.

    Attributes
    ----------
    lines : (n,) int64 array
        Which lines, ascending, as places from 0.
    groups : dict of str to (n,) pa.Array of text
        What each group found; empty where a line's pattern has no such group.
    """

    lines: Places
    groups: dict[str, pa.Array]

    def __len__(self) -> int:
        return len(self.lines)

    def take(self, rows: NDArray[np.bool_]) -> Told:
        """Some of them."""
        if rows.all():
            return self
        mask = pa.array(rows)
        return Told(self.lines[rows], {n: cells.filter(mask) for n, cells in self.groups.items()})


@dataclass(slots=True)
class SortedLines:
    """The lines of a log by what they are.

    Attributes
    ----------
    told : dict of str to Told
        The lines that patterns describe, for each kind of line that the study has patterns for.
    aside : dict of str to (n,) int64 array
        The lines that nothing is read from, by what became of them.
    unfit : (n,) int64 array
        The lines that no pattern describes and that cannot be left aside.
    like_lines : (n,) int64 array
        The remarks that a pattern would describe if nothing marked them as remarks.
    glued : (n,) int64 array
        The lines set aside to whose last word a line that a pattern describes is glued.
    """

    told: dict[str, Told] = field(default_factory=dict)
    aside: dict[str, Places] = field(default_factory=dict)
    unfit: Places = field(default_factory=lambda: np.zeros(0, dtype=np.int64))
    like_lines: Places = field(default_factory=lambda: np.zeros(0, dtype=np.int64))
    glued: Places = field(default_factory=lambda: np.zeros(0, dtype=np.int64))

    def of(self, kind: str) -> Told:
        """The lines of one kind; none where the study has no pattern for it."""
        return self.told.get(kind) or Told(np.zeros(0, dtype=np.int64), {})


def sort_lines(
    lines: LogLines, patterns: Patterns, remarks: Collection[str], *, leave_others: bool
) -> SortedLines:
    """Give each line to the first pattern that describes it.

    Parameters
    ----------
    lines : LogLines
        The lines of a log.
    patterns : mapping of str to sequence of SearchedPattern
        By kind of line, in the order in which they are tried; those of ``ignore`` last.
    remarks : collection of str
        What a remark begins with.
    leave_others : bool
        Whether lines that no pattern describes are left aside, but for those that begin like the
        lines of one.

    Returns
    -------
    SortedLines
        Lines that are too long for patterns are among none of them.

    Raises
    ------
    PatternError
        If a pattern cannot be matched.
    """
    found = SortedLines()
    left = _Left(lines, np.flatnonzero(lines.sizes <= LONGEST_LINE_BYTES))
    found.aside["blank lines"] = left.out(rf"{ANCHOR}{BLANKS}*\z")
    reading = [p for kind, own in patterns.items() if kind != "ignore" for p in own]
    marks = "|".join(map(_escaped, sorted({mark for mark in remarks if mark})))
    if marks:
        begin = f"{ANCHOR}{BLANKS}*(?:{marks})"
        found.aside["remarks"] = left.out(begin)
        marked = _Left(lines, found.aside["remarks"])
        marked.texts = pc.replace_substring_regex(marked.texts, f"{begin}{BLANKS}*", "")
        found.like_lines = _together(
            marked.out(pattern.whole()) for pattern in reading if len(marked.places)
        )
    for kind, own in patterns.items():
        if kind == "ignore":
            ignored = [left.out(pattern.within(), pattern.written) for pattern in own]
            found.aside["ignored lines"] = _together(ignored)
        elif own:
            found.told[kind] = _joined([left.described(pattern) for pattern in own])
    if leave_others:
        starts = [start for pattern in reading for start in pattern.beginnings()]
        damaged = [left.out(ANCHOR + start) for start in starts] if len(left.places) else []
        found.aside["other lines"] = left.places
        found.unfit = _together(damaged)
    else:
        found.unfit = left.places
    aside = _Left(lines, _together(found.aside.values()))
    found.glued = _together(aside.glued_to(pattern) for pattern in reading)
    return found


class PatternError(Exception):
    """A pattern that cannot be matched; ``written`` is the pattern, ``why`` the reason."""

    def __init__(self, written: str, why: str) -> None:
        super().__init__(written, why)
        self.written = written
        self.why = why


@dataclass(slots=True)
class _Left:
    """The lines that no pattern has described yet."""

    lines: LogLines
    places: Places
    texts: pa.Array = field(init=False)

    def __post_init__(self) -> None:
        self.texts = self.lines.take(self.places)

    def out(self, pattern: str, written: str = "") -> Places:
        """Take out the lines in which a pattern is found."""
        return self._take(_matched(self.texts, pattern, written or pattern).is_valid())

    def glued_to(self, pattern: SearchedPattern) -> Places:
        """The lines to whose last word a line that a pattern describes is glued."""
        words, glued = pattern.glued()
        # Looking for a word is many times quicker than for what may stand before it.
        holds = np.zeros(len(self.texts), dtype=bool)
        for word in words:
            found = pc.match_substring(self.texts, word, ignore_case=bool(pattern.flags))
            holds |= found.to_numpy(zero_copy_only=False)
        texts = self.texts.filter(pa.array(holds))
        fits = _matched(texts, glued, pattern.written).is_valid().to_numpy(zero_copy_only=False)
        places: Places = self.places[holds][fits]
        return places

    def described(self, pattern: SearchedPattern) -> Told:
        """Take out the lines that a pattern describes, with what its groups found."""
        found = _matched(self.texts, pattern.whole(), pattern.written)
        fits = found.is_valid()
        places = self._take(fits)
        if not len(places):
            return Told(places, {name: pa.array([], pa.string()) for name in pattern.groups})
        own = found.filter(fits)
        cells = [pc.struct_field(own, [number]) for number in range(len(pattern.groups))]
        named = zip(pattern.groups, cells, strict=True)
        return Told(places, {name: column.cast(pa.string()) for name, column in named})

    def _take(self, fits: pa.Array) -> Places:
        """Take out the lines that fit."""
        mask = fits.to_numpy(zero_copy_only=False)
        out: Places = self.places[mask]
        if out.size:
            self.places = self.places[~mask]
            self.texts = self.texts.filter(pc.invert(fits))
        return out


def _matched(texts: pa.Array, pattern: str, written: str) -> pa.Array:
    """What the groups of a pattern find in each text; null where it is not found."""
    try:
        return pc.extract_regex(texts, pattern)
    except pa.ArrowInvalid as why:
        raise PatternError(written, str(why).removeprefix(_INVALID)) from None


def _together(parts: Iterable[Places]) -> Places:
    """Places from several patterns, ascending."""
    together = np.concatenate([*parts, np.zeros(0, dtype=np.int64)])
    return np.asarray(np.sort(together), dtype=np.int64)


def _joined(parts: Sequence[Told]) -> Told:
    """Lines of one kind that several patterns describe, in the order of the log."""
    if len(parts) == 1:
        return parts[0]
    names = dict.fromkeys(name for part in parts for name in part.groups)
    lines = np.concatenate([part.lines for part in parts])
    order = np.argsort(lines, kind="stable")
    groups = {}
    for name in names:
        cells = [
            part.groups[name] if name in part.groups else pa.array([""] * len(part), pa.string())
            for part in parts
        ]
        groups[name] = pa.concat_arrays(cells).take(pa.array(order))
    return Told(lines[order], groups)


def _escaped(mark: str) -> str:
    """A text as a pattern that finds it."""
    return "".join(f"\\x{{{ord(sign):x}}}" for sign in mark)
