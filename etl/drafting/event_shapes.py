"""The shapes of the lines of a log of events: what stays the same, and what changes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from etl.drafting.event_tokens import Token, first_word

_VALUE_FOLLOWS = (":", "=")


@dataclass(slots=True)
class Shape:
    """Lines that are alike but for numbers and words that change.

    Attributes
    ----------
    tokens : list of Token
        Those of its first line; the kind of each is that of all its cells.
    lines : list of int
        Where its lines stand, by their place in all that was looked at.
    cells : list of list of str
        For each token its text in each of the lines.
    sample : str
        Its first line.
    """

    tokens: list[Token]
    lines: list[int] = field(default_factory=list)
    cells: list[list[str]] = field(default_factory=list)
    sample: str = ""

    def __len__(self) -> int:
        return len(self.lines)

    def kind(self, place: int) -> str:
        """The kind of a token."""
        return self.tokens[place].kind

    def varies(self, place: int) -> bool:
        """Whether a token changes from line to line; numbers and ids are taken to, always."""
        kind = self.kind(place)
        if kind in ("blank", "sign"):
            return False
        return kind in ("number", "rest") or len(set(self.cells[place])) > 1 or self._is_id(place)

    def _is_id(self, place: int) -> bool:
        """Whether a word is a value: it has a digit, or a sign says that a value follows."""
        before, after = self.sign_beside(place, -1), self.sign_beside(place, 1)
        if after in _VALUE_FOLLOWS or place == 0:
            return False
        told = before == "=" or (before in _VALUE_FOLLOWS and place == len(self.tokens) - 1)
        return told or any(sign.isdigit() for sign in self.tokens[place].text)

    def variables(self) -> list[int]:
        """The places of the tokens that change."""
        return [place for place in range(len(self.tokens)) if self.varies(place)]

    def numbers(self) -> list[int]:
        """The places of the numbers."""
        return [place for place, token in enumerate(self.tokens) if token.kind == "number"]

    def constants(self) -> dict[int, str]:
        """The words that stand in each of its lines, by their places."""
        return {
            place: token.text
            for place, token in enumerate(self.tokens)
            if token.kind in ("word", "quoted") and not self.varies(place)
        }

    def words(self) -> list[str]:
        """The words that stand in each of its lines."""
        return list(self.constants().values())

    def first_word(self) -> int | None:
        """The place of its first word; None where it has none."""
        return first_word(self.tokens)

    def word_before(self, place: int) -> str:
        """The word that stands before a token in each line, up to the last token that changes."""
        words: list[str] = []
        for earlier in range(place - 1, -1, -1):
            if self.kind(earlier) in ("word", "quoted", "number", "rest"):
                if self.varies(earlier):
                    break
                words.append(self.tokens[earlier].text)
        return words[0] if words else ""

    def sign_beside(self, place: int, step: int) -> str:
        """The sign that stands beside a token, blanks aside; empty where something else does."""
        place += step
        while 0 <= place < len(self.tokens) and self.kind(place) == "blank":
            place += step
        inside = 0 <= place < len(self.tokens) and self.kind(place) == "sign"
        return self.tokens[place].text if inside else ""

    def only(self, rows: Sequence[int]) -> Shape:
        """Some of its lines."""
        cells = [[own[row] for row in rows] for own in self.cells]
        tokens = [Token(t.kind, own[0]) for t, own in zip(self.tokens, cells, strict=True)]
        return Shape(tokens, [self.lines[row] for row in rows], cells, joined(tokens))

    def whole(self, row: int) -> str:
        """One of its lines, from its tokens."""
        kinds = (token.kind for token in self.tokens)
        return joined([Token(k, own[row]) for k, own in zip(kinds, self.cells, strict=True)])

    def is_like(self, other: Shape) -> bool:
        """Whether its lines are those of another shape but for what varies and for their ends.

        One may go on where the other ends; up to there both have the same signs, and the same words
        wherever both have words that stay, at least one.
        """
        shared = 0
        mine, theirs = self.constants(), other.constants()
        for place, (own, their) in enumerate(zip(self.tokens, other.tokens, strict=False)):
            flat = ("blank", "sign")
            if own.kind in flat or their.kind in flat:
                if own.kind != their.kind or (own.kind == "sign" and own.text != their.text):
                    return False
            elif place in mine and place in theirs:
                if mine[place] != theirs[place]:
                    return False
                shared += 1
        first = other.first_word()
        return shared > 0 and first is not None and mine.get(first) == theirs.get(first)


def joined(tokens: Sequence[Token]) -> str:
    """Tokens as the line that they are from."""
    return "".join(f'"{token.text}"' if token.kind == "quoted" else token.text for token in tokens)
