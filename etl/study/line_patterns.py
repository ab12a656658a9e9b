"""A pattern for lines of a log of events, as matched: whole, within a line, or its beginning."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

#: What ``\w`` and ``\s`` stand for within brackets: letters, marks and digits of every script, as a
#: name must not be cut at a letter with an accent; and the blanks of every script. RE2's own know
#: ASCII alone.
CLASSES = {"w": r"\p{L}\p{M}\p{N}_", "s": r"\t\n\v\f\r\x{1c}-\x{1f}\x{85}\p{Z}"}
#: Blanks may end a line whatever its pattern says.
_END = rf"[{CLASSES['s']}]*\z"
#: From how many letters on a pattern is said to begin with a word (our choice).
_WORD = 3
#: Signs that no line holds, as a damaged line end may be one; a tab may stand in a line.
_CONTROLS = r"\x{1}-\x{8}\x{b}-\x{1f}"
_BLANK_OR_END = rf"(?:[{CLASSES['s']}]|\z)"


@dataclass(frozen=True, slots=True)
class Piece:
    """A part of a pattern that stands at its outermost level, with its repetition.

    Attributes
    ----------
    text : str
        As RE2 spells it.
    literal : str or None
        The characters it stands for, where those are certain; empty for a mark such as ``^``.
    groups : int
        How many named groups it holds.
    worded : bool
        Whether it names a letter or a digit itself.
    """

    text: str
    literal: str | None = None
    groups: int = 0
    worded: bool = False


Branch = tuple[Piece, ...]


@dataclass(frozen=True, slots=True)
class SearchedPattern:
    r"""A pattern as it is matched.

    Attributes
    ----------
    written : str
        As the study file writes it.
    groups : tuple of str
        The names of its groups; RE2 is given ``g0``, ``g1``, … in their place.
    flags : str
        The flags that hold for all of it.
    branches : tuple of tuple of Piece
        Its alternatives.

    Examples
    --------
    >>> pear = Piece("pear ", "pear ", worded=True)
    >>> branch = (pear, Piece("(?P<g0>.)", groups=1))
    >>> pattern = SearchedPattern("pear (?P<number>.)$", ("number",), "", (branch,))
    >>> pattern.within(), pattern.beginnings()
    ('(?:pear (?P<g0>.))', ('(?:pear )',))
    """

    written: str
    groups: tuple[str, ...]
    flags: str
    branches: tuple[Branch, ...]

    def whole(self) -> str:
        """The pattern of a whole line; blanks may follow."""
        return rf"\A{self.flags}(?:{'|'.join(spelled(_endless(b)) for b in self.branches)}){_END}"

    def within(self) -> str:
        """The pattern to be found anywhere in a line."""
        return f"{self.flags}(?:{'|'.join(spelled(branch) for branch in self.branches)})"

    def start(self, branch: int, pieces: int) -> str:
        """The first pieces of a branch, to be found where a line begins."""
        return f"{self.flags}(?:{spelled(_endless(self.branches[branch])[:pieces])})"

    def worded(self) -> tuple[tuple[bool, ...], ...]:
        """For each branch, whether each of its pieces names a letter or a digit itself."""
        return tuple(tuple(piece.worded for piece in _endless(b)) for b in self.branches)

    def beginnings(self) -> tuple[str, ...]:
        """For each branch what a line of it begins with: all up to the first thing it tells.

        A beginning has a letter or a digit of its own; a branch without any has none. Where it
        closes with a blank, a line may end in place of that.
        """
        found = []
        for number, branch in enumerate(self.branches):
            worded = False
            for count, piece in enumerate((*_endless(branch), Piece("", groups=1))):
                if worded and piece.groups:
                    kept = count
                    while (branch[kept - 1].literal or "-").isspace():
                        kept -= 1
                    closes = "" if kept == count else _BLANK_OR_END
                    found.append(self.start(number, kept) + closes)
                    break
                worded = worded or piece.worded
        return tuple(found)

    def glued(self) -> tuple[tuple[str, ...], str]:
        """The pattern of a whole line that is glued to another one whose line end is lost.

        Returns
        -------
        words : tuple of str
            The words of which a text must hold one for the pattern to be found, in either case
            where there are flags; none where no branch begins with a word of its own, as too much
            would look like its lines.
        pattern : str
        """
        own = [branch for branch in map(_unbegun, self.branches) if _begins_with_word(branch)]
        words = ["".join(piece.literal or "" for piece in branch[:_WORD]) for branch in own]
        joined = "|".join(spelled(_endless(branch)) for branch in own)
        return tuple(words), rf"{self.flags}[{CLASSES['w']}{_CONTROLS}](?:{joined}){_END}"

    def first_characters(self) -> tuple[str, ...]:
        """For each branch the characters with which its lines certainly begin."""
        found = []
        for branch in self.branches:
            text = ""
            for piece in branch:
                if piece.literal is None:
                    break
                text += piece.literal
            found.append(text)
        return tuple(found)


def spelled(pieces: Sequence[Piece]) -> str:
    """Pieces as one text.

    Parameters
    ----------
    pieces : sequence of Piece

    Returns
    -------
    str
    """
    return "".join(piece.text for piece in pieces)


def _endless(branch: Branch) -> Branch:
    """A branch without the marks of the line's end."""
    while branch and branch[-1].text in ("$", r"\z"):
        branch = branch[:-1]
    return branch


def _unbegun(branch: Branch) -> Branch:
    """A branch without the marks of the line's beginning."""
    while branch and branch[0].text in ("^", r"\A"):
        branch = branch[1:]
    return branch


def _begins_with_word(branch: Branch) -> bool:
    """Whether a branch certainly begins with several letters."""
    return len(branch) > _WORD and all((p.literal or "-").isalpha() for p in branch[:_WORD])
