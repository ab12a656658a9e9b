r"""Texts with their regions marked in braces: ``{verb: watered} the trees``.

A brace opens a region, the name stands before the first colon, one space after the colon takes no
room, a brace closes the region. ``{{`` and ``}}`` are braces that are shown. A line break in the
cell, or the two characters ``\n``, is a line break on the screen.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, field

TOKEN = re.compile(r"\{\{|\}\}|\\n|\n|[{}\\]|[^{}\\\n]+")
NAME = re.compile(r"[^{}:\n]*")

#: What a pair of braces, or a line break spelled as two characters, shows.
SHOWN = {"{{": "{", "}}": "}", "\\n": "\n"}


@dataclass(frozen=True, slots=True)
class MarkProblem:
    """Something wrong in a marked text.

    Attributes
    ----------
    problem, found, expected, fix : str
        As in :class:`etl.errors.Finding`.
    line_breaks : int
        Line breaks in the cell before the fault, so that the file's own line can be named.
    """

    problem: str
    found: str
    expected: str
    fix: str
    line_breaks: int


@dataclass(slots=True)
class MarkedText:
    r"""A text as shown on the screen, and which region each character belongs to.

    Attributes
    ----------
    text : str
        The text without braces and names; ``\n`` between lines.
    owners : list of int
        For each character of ``text`` the order of its region, from 1; 0 outside.
    names : list of str
        The regions' names, in order of appearance.
    region_texts : list of str
        Each region's own text, white space and line breaks included.
    problems : list of MarkProblem
        What is wrong; the rest is only to be used where this is empty.
    """

    text: str = ""
    owners: list[int] = field(default_factory=list)
    names: list[str] = field(default_factory=list)
    region_texts: list[str] = field(default_factory=list)
    problems: list[MarkProblem] = field(default_factory=list)


def screen_text(cell: str) -> str:
    r"""The text of a plain cell as shown: every spelling of a line break becomes ``\n``.

    Examples
    --------
    >>> screen_text("one\\ntwo\r\nthree")
    'one\ntwo\nthree'
    """
    return cell.replace("\r\n", "\n").replace("\r", "\n").replace("\\n", "\n")


def parse_marked_text(cell: str) -> MarkedText:
    """Read a text whose regions are marked in braces.

    Parameters
    ----------
    cell : str
        The cell as it stands in the file, line breaks included.

    Returns
    -------
    MarkedText
        The text as shown and its regions. Faults are listed in ``problems``, never raised.

    Examples
    --------
    >>> marked = parse_marked_text("{who: She} {verb: watered} them.")
    >>> marked.text, marked.names
    ('She watered them.', ['who', 'verb'])
    >>> marked.owners[:5]
    [1, 1, 1, 0, 2]
    """
    return _Scanner(cell.replace("\r\n", "\n").replace("\r", "\n")).scan()


def _excerpt(raw: str, at: int, most: int = 30) -> str:
    """The line's text from a position on, cut."""
    rest = raw[at:].split("\n", 1)[0]
    return rest if len(rest) <= most else rest[:most] + "…"


class _Scanner:
    """Goes through a cell once; recovers after each fault so that all are found."""

    def __init__(self, raw: str) -> None:
        self.raw = raw
        self.out = MarkedText()
        self.pieces: list[str] = []
        self.opened: int | None = None  # where the open region's brace stands
        self.own: list[str] = []
        self.forgiven = 0  # closing braces that a reported nesting leaves over

    def scan(self) -> MarkedText:
        at = 0
        while at < len(self.raw):
            match = TOKEN.match(self.raw, at)
            assert match is not None  # noqa: S101 - the pattern matches any character
            mark = match.group()
            if mark == "{":
                at = self._open(at)
                continue
            if mark == "}":
                self._close(at)
            else:
                self._show(SHOWN.get(mark, mark))
            at = match.end()
        if self.opened is not None:
            self._fault(
                "a brace is never closed",
                self.opened,
                "} after the region's text",
                "close the region with }; for a brace that is shown write {{ or }}",
            )
        elif not self.out.names:
            self._fault(
                "this text marks no region",
                0,
                "at least one {name: text}",
                "mark the regions in the text: {name: text}",
            )
        self.out.text = "".join(self.pieces)
        return self.out

    def _fault(self, problem: str, at: int, expected: str, fix: str) -> None:
        self.out.problems.append(
            MarkProblem(problem, _excerpt(self.raw, at), expected, fix, self.raw.count("\n", 0, at))
        )

    def _show(self, text: str) -> None:
        self.pieces.append(text)
        inside = self.opened is not None
        self.out.owners.extend([len(self.out.names) if inside else 0] * len(text))
        if inside:
            self.own.append(text)

    def _open(self, at: int) -> int:
        """Start a region at the brace; return where its text starts."""
        if self.opened is not None:
            self._fault(
                "a brace opens inside a region",
                at,
                "} first, for regions do not nest",
                "close the region before with }; for a brace that is shown write {{",
            )
            self.forgiven += 1
            self._finish(self.opened, check=False)
        self.opened = at
        match = NAME.match(self.raw, at + 1)
        assert match is not None  # noqa: S101 - the pattern matches the empty string
        name, end = match.group(), match.end()
        if self.raw[end : end + 1] != ":" or "\\n" in name:
            self._fault(
                "a region has no colon after its name",
                at,
                "{name: text}",
                "write the region's name and a colon after {; for a brace that is shown write {{",
            )
            self.out.names.append("")
            return at + 1
        name = unicodedata.normalize("NFC", name.strip())
        if not name:
            self._fault("a region has no name", at, "{name: text}", "write a name before the colon")
        elif name in self.out.names:
            self._fault(
                "a region is named twice in one text",
                at,
                f'a name other than "{name}"',
                "give every region of a text a name of its own",
            )
        self.out.names.append(name)
        return end + 2 if self.raw[end + 1 : end + 2] == " " else end + 1

    def _close(self, at: int) -> None:
        if self.opened is not None:
            self._finish(self.opened, check=True)
        elif self.forgiven:
            self.forgiven -= 1
        else:
            self._fault(
                "a brace closes no region",
                at,
                "{ and a name before it",
                "open the region with {name: or remove the brace; "
                "for a brace that is shown write }}",
            )

    def _finish(self, opened: int, *, check: bool) -> None:
        own = "".join(self.own)
        if check and not own.strip():
            self._fault(
                "a region has no text",
                opened,
                "{name: text}",
                "write the region's text, or remove it",
            )
        self.out.region_texts.append(own)
        self.own = []
        self.opened = None
