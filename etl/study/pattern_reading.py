r"""Patterns for the lines of a log of events read from the grammar of Python into that of RE2.

Patterns are written as Python writes regular expressions and matched by RE2, whose time never runs
away: it cannot look around and cannot refer back. What it cannot do is refused; what the two spell
or mean differently is spelled here as RE2 does, so that a pattern finds what its author means.
"""

from __future__ import annotations

import re
import unicodedata
import warnings
from dataclasses import dataclass, field

from etl.study.line_patterns import CLASSES, Piece, SearchedPattern, spelled
from etl.study.values import refusal

#: RE2 repeats nothing more often than this (re2/re2.h, "maximum repeat count").
MOST_REPEATS = 1000
#: Escapes that both grammars read alike.
_ALIKE = frozenset("AbBdDafnrtvz")
_BEGINNINGS_REFUSED = {
    "(?=": "look ahead",
    "(?!": "look ahead",
    "(?<=": "look back",
    "(?<!": "look back",
    "(?P=": "repeat what a group found",
    "(?(": "depend on a group",
    "(?>": "keep what it took (an atomic group)",
}
_GROUP = re.compile(r"\(\?P<(\w+)>")
_FLAGS = re.compile(r"\(\?([a-zA-Z]*(?:-[a-zA-Z]+)?)([:)])")
_COUNTED = re.compile(r"\{([0-9]*)(?:(,)([0-9]*))?\}")
_CODE = re.compile(r"x([0-9a-fA-F]{2})|u([0-9a-fA-F]{4})|U([0-9a-fA-F]{8})|0([0-7]{0,2})")
_NAMED = re.compile(r"N\{([^}]+)\}")


def sound_pattern(pattern: str) -> str:
    """Refuse a pattern that is no regular expression, or one that RE2 cannot do.

    Parameters
    ----------
    pattern : str

    Returns
    -------
    str
        The same, with its letters composed (Unicode NFC) as those of the logs are.

    Raises
    ------
    PydanticCustomError
        With what is wrong, for the message.
    """
    pattern = unicodedata.normalize("NFC", pattern)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error", FutureWarning)
            re.compile(pattern)
        searched_pattern(pattern)
    except FutureWarning:
        raise _unclear(
            "a sign in brackets that may be read in two ways",
            r"put a backslash before [, &, ~, | and - within brackets",
        ) from None
    except (re.error, RecursionError, OverflowError) as error:
        raise refusal(
            f"this is no regular expression: {error}",
            expected="a regular expression with named groups",
            fix=r"""write for example fixation = '^fix (?P<onset>\d+) (?P<duration>\d+)$'""",
        ) from None
    return pattern


def searched_pattern(pattern: str) -> SearchedPattern:
    r"""Read a pattern, which Python's own grammar accepts, for RE2.

    Parameters
    ----------
    pattern : str
        With named groups for what it tells; other groups only group.

    Returns
    -------
    SearchedPattern

    Raises
    ------
    PydanticCustomError
        If RE2 cannot do what the pattern asks for.

    References
    ----------
    Grammar and meaning of RE2: github.com/google/re2, "Syntax"; of Python: library reference,
    ``re``.

    Examples
    --------
    >>> searched_pattern(r"(a|\u00e9){,2}(?P<name>\w)").within()
    '(?:(?:a|\\x{e9}){0,2}(?P<g0>[\\p{L}\\p{M}\\p{N}_]))'
    """
    reading = _Reading(pattern)
    branches = reading.branches()
    return SearchedPattern(
        pattern, tuple(reading.groups), reading.flags, tuple(tuple(b) for b in branches)
    )


def _refused(what: str) -> Exception:
    """The refusal of a pattern for something that RE2 does not do."""
    return refusal(
        f"a pattern for lines cannot {what}",
        expected="a pattern that goes through a line once, so that no line can hold it up",
        fix="describe the line from left to right; lines that are to be told apart can have a "
        "pattern each, and are taken by the first that fits",
    )


def _unclear(what: str, fix: str) -> Exception:
    """The refusal of a pattern for something that is not certain to be meant as it reads."""
    return refusal(f"the pattern has {what}", expected="a pattern that reads in one way", fix=fix)


@dataclass(slots=True)
class _Reading:
    """Goes through a pattern from left to right."""

    pattern: str
    at: int = 0
    flags: str = ""
    groups: list[str] = field(default_factory=list)

    def branches(self) -> list[list[Piece]]:
        """The alternatives up to the end, or up to the bracket that closes this group."""
        found: list[list[Piece]] = [[]]
        while self.at < len(self.pattern) and self.pattern[self.at] != ")":
            if self.pattern[self.at] == "|":
                self.at += 1
                found.append([])
                continue
            piece = self._piece()
            if piece.text:
                found[-1].append(self._repeated(piece))
        return found

    def _piece(self) -> Piece:
        """The next character, set or group."""
        sign = self.pattern[self.at]
        if sign == "(":
            return self._group()
        if sign == "[":
            return Piece(self._set())
        self.at += 1
        if sign == "\\":
            return self._escape()
        if sign in "^$":
            return Piece(sign, "")
        if sign == ".":
            return Piece(sign)
        return _character(sign)

    def _group(self) -> Piece:
        """A group; a remark or a flag for the whole pattern leaves nothing."""
        rest = self.pattern[self.at : self.at + 4]
        for beginning, what in _BEGINNINGS_REFUSED.items():
            if rest.startswith(beginning):
                raise _refused(what)
        if rest.startswith("(?#"):
            self.at = self.pattern.index(")", self.at) + 1
            return Piece("")
        opening = "(?:"
        before = len(self.groups)
        if named := _GROUP.match(self.pattern, self.at):
            opening = f"(?P<g{before}>"
            self.groups.append(named[1])
            self.at = named.end()
        elif flagged := _FLAGS.match(self.pattern, self.at):
            if strange := set(flagged[1]) - set("ims-"):
                raise _unclear(
                    f"the flag {min(strange)}", "of flags, only i (either case) makes a difference"
                )
            opening = flagged[0]
            self.at = flagged.end()
            if flagged[2] == ")":
                self.flags += opening
                return Piece("")
        else:
            self.at += 1
        inner = self.branches()
        self.at += 1
        text = "|".join(spelled(branch) for branch in inner)
        worded = any(piece.worded for branch in inner for piece in branch)
        return Piece(f"{opening}{text})", None, len(self.groups) - before, worded)

    def _repeated(self, piece: Piece) -> Piece:
        """The piece with the repetition that follows it."""
        sign = self.pattern[self.at : self.at + 1]
        counted = _COUNTED.match(self.pattern, self.at) if sign == "{" else None
        if sign and sign in "*+?":
            self.at += 1
            repetition = sign
        elif counted and counted[0] != "{}":
            self.at = counted.end()
            if max(int(counted[1] or 0), int(counted[3] or 0)) > MOST_REPEATS:
                raise _unclear(
                    f"a repetition of more than {MOST_REPEATS}", "use * or + in its place"
                )
            repetition = f"{{{counted[1] or 0}{counted[2] or ''}{counted[3] or ''}}}"
        else:
            return piece
        follows = self.pattern[self.at : self.at + 1]
        if follows == "+":
            raise _refused("keep what it took (a possessive repetition)")
        if follows == "?":
            self.at += 1
            repetition += "?"
        return Piece(piece.text + repetition, None, piece.groups, piece.worded)

    def _escape(self) -> Piece:
        """What a backslash stands before, outside brackets."""
        sign = self.pattern[self.at]
        if sign in "wWsS":
            self.at += 1
            inverse = "^" if sign.isupper() else ""
            return Piece(f"[{inverse}{CLASSES[sign.lower()]}]")
        if sign == "Z":
            self.at += 1
            return Piece(r"\z", "")
        if sign in _ALIKE:
            self.at += 1
            return Piece(f"\\{sign}", "" if sign in "AbBz" else None)
        return _character(self._one_character())

    def _one_character(self) -> str:
        """The character that an escape stands for."""
        sign = self.pattern[self.at]
        if code := _CODE.match(self.pattern, self.at):
            self.at = code.end()
            octal = code[4]
            if octal is not None:
                return chr(int(octal or "0", 8))
            return chr(int(next(digits for digits in code.groups() if digits), 16))
        if named := _NAMED.match(self.pattern, self.at):
            self.at = named.end()
            return unicodedata.lookup(named[1])
        if sign.isdecimal():
            raise _refused("repeat what a group found")
        self.at += 1
        return sign

    def _set(self) -> str:
        """A set of characters in brackets."""
        start = self.at
        self.at += 1
        out = "["
        if self.pattern.startswith("^", self.at):
            self.at += 1
            out += "^"
        first = self.at
        while self.pattern[self.at] != "]" or self.at == first:
            sign = self.pattern[self.at]
            self.at += 1
            if sign == "[" and self.pattern.startswith(":", self.at):
                raise _unclear(
                    f'"{self.pattern[start : self.at + 1]}" in it',
                    r"write the characters themselves, such as [A-Za-z], or \w",
                )
            # A hyphen that no backslash stands before may mark a range.
            out += self._member() if sign == "\\" else sign if sign == "-" else _certain(sign)
        self.at += 1
        return f"{out}]"

    def _member(self) -> str:
        """What a backslash stands before within brackets."""
        sign = self.pattern[self.at]
        if sign in "WS":
            raise _unclear(
                rf"\{sign} within brackets",
                f"write the characters that are meant, or \\{sign} alone",
            )
        if sign in "ws":
            self.at += 1
            return CLASSES[sign]
        if sign == "b":
            self.at += 1
            return r"\x{8}"
        if sign in _ALIKE:
            self.at += 1
            return f"\\{sign}"
        return _certain(self._one_character())


def _character(sign: str) -> Piece:
    """A character that stands for itself."""
    return Piece(_certain(sign), sign, 0, sign.isalnum())


def _certain(sign: str) -> str:
    """A character so spelled that it means only itself, within brackets too."""
    return sign if sign == " " or (sign.isascii() and sign.isalnum()) else f"\\x{{{ord(sign):x}}}"
