"""A study file written line by line: values, remarks, guesses, questions and examples."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

Value = str | int | float | bool | Sequence["Value"] | Mapping[str, "Value"]
KeyPath = tuple[str, ...]

_WIDTH = 98
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_SHORT_ESCAPES = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def value_text(value: Value) -> str:
    r"""A value as TOML writes it, whatever signs a text holds.

    Parameters
    ----------
    value : str, int, float, bool, sequence or mapping

    Returns
    -------
    str

    Examples
    --------
    >>> print(value_text({"column": 'the "x"', "unit": "px"}))
    { column = "the \"x\"", unit = "px" }
    >>> print(value_text("^fix [0-9]+ \\S$"))
    '^fix [0-9]+ \S$'
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, (int, float)):
        return str(value)
    if isinstance(value, Mapping):
        pairs = ", ".join(f"{key_text(key)} = {value_text(one)}" for key, one in value.items())
        return f"{{ {pairs} }}"
    return f"[{', '.join(value_text(one) for one in value)}]"


def key_text(key: str) -> str:
    """A key, in quotes where TOML needs them.

    Examples
    --------
    >>> key_text("left_px"), key_text("the eye")
    ('left_px', '"the eye"')
    """
    return key if _BARE_KEY.fullmatch(key) else _basic(key)


def _quoted(text: str) -> str:
    """A text in quotes: single ones where it has backslashes and no sign that they cannot hold."""
    if "\\" in text and "'" not in text and text.isprintable():
        return f"'{text}'"
    return _basic(text)


def _basic(text: str) -> str:
    """A text in double quotes, with every sign escaped that cannot be seen."""
    return f'"{"".join(_escaped(sign) for sign in text)}"'


def _escaped(sign: str) -> str:
    """A sign as it stands in double quotes."""
    if sign in _SHORT_ESCAPES:
        return _SHORT_ESCAPES[sign]
    if sign.isprintable():
        return sign
    return f"\\u{ord(sign):04X}" if ord(sign) < 0x10000 else f"\\U{ord(sign):08X}"


def plain(text: str) -> str:
    """A text of one line for a remark: signs that cannot be seen are spelled out."""
    return "".join(sign if sign.isprintable() else repr(sign)[1:-1] for sign in text)


@dataclass(frozen=True, slots=True)
class Question:
    """Something that only the lab can answer.

    Attributes
    ----------
    key : str
        The key of the study file whose value is ``"?"``, dotted.
    text : str
        What is asked.
    line : int
        The line of the key, from 1.
    """

    key: str
    text: str
    line: int


@dataclass(slots=True)
class StudyText:
    """A study file in the making.

    Attributes
    ----------
    lines : list of str
        Its lines.
    questions : list of Question
        What is asked in it.
    guesses : int
        How many guesses it holds.
    table : str
        The table under way.
    """

    lines: list[str] = field(default_factory=list)
    questions: list[Question] = field(default_factory=list)
    guesses: int = 0
    table: str = ""

    def text(self) -> str:
        """The whole file."""
        return "\n".join(self.lines) + "\n"

    def gap(self) -> None:
        """An empty line."""
        if self.lines and self.lines[-1]:
            self.lines.append("")

    def section(self, title: str) -> None:
        """A heading."""
        self.gap()
        self.lines.append(f"# ---- {title} ".ljust(_WIDTH, "-"))

    def begin(self, table: str, remark: str = "") -> None:
        """Begin a table."""
        self.gap()
        self.remark(remark)
        self.table = table
        self.lines.append(f"[{table}]")

    def remark(self, text: str) -> None:
        """Explain something."""
        if text:
            self.lines += textwrap.wrap(
                plain(text),
                _WIDTH,
                initial_indent="# ",
                subsequent_indent="# ",
                break_long_words=False,
                break_on_hyphens=False,
            )

    def guess(self, key: str, value: Value, evidence: str) -> None:
        """A key whose value was guessed, with the evidence above it."""
        self.guesses += 1
        self._explained("guess", evidence)
        self.lines.append(f"{key_text(key)} = {value_text(value)}")

    def guess_each(self, key: str, values: Sequence[tuple[str, str]]) -> None:
        """A list of texts, each with its evidence above it."""
        self.guesses += 1
        self.lines.append(f"{key_text(key)} = [")
        for value, evidence in values:
            self.lines += [
                *textwrap.wrap(
                    plain(f"guess: {evidence}"),
                    _WIDTH,
                    initial_indent="  # ",
                    subsequent_indent="  #   ",
                    break_long_words=False,
                    break_on_hyphens=False,
                ),
                f"  {value_text(value)},",
            ]
        self.lines.append("]")

    def ask(self, key: str, question: str) -> None:
        """A key whose value only the lab knows."""
        self.ask_within(key, "?", question)

    def ask_within(self, key: str, value: Value, question: str, evidence: str = "") -> None:
        """A key part of whose value is a question, such as the unit of a column."""
        if evidence:
            self._explained("guess", evidence)
        self._explained("question", question)
        self.lines.append(f"{key_text(key)} = {value_text(value)}")
        inner = [part for part in ("unit",) if isinstance(value, Mapping)]
        name = ".".join(part for part in (self.table, key_text(key), *inner) if part)
        self.questions.append(Question(name, question, len(self.lines)))

    def say(self, key: str, value: Value, remark: str = "") -> None:
        """A key that is neither guessed nor asked."""
        self.remark(remark)
        self.lines.append(f"{key_text(key)} = {value_text(value)}")

    def example(self, key: str, value: Value, remark: str = "") -> None:
        """A key that does nothing until the # before it is removed."""
        line = f"# {key_text(key)} = {value_text(value)}"
        self.lines.append(f"{line:<40}  # {plain(remark)}" if remark else line)

    def example_table(self, table: str, remark: str = "") -> None:
        """The header of a table that does nothing until the # before it is removed."""
        self.gap()
        self.remark(remark)
        self.lines.append(f"# [{table}]")

    def _explained(self, word: str, text: str) -> None:
        """A remark that begins with a word and hangs below it."""
        self.lines += textwrap.wrap(
            plain(text),
            _WIDTH,
            initial_indent=f"# {word}: ",
            subsequent_indent="#   ",
            break_long_words=False,
            break_on_hyphens=False,
        )
