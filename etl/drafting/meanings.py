"""What the columns of a log were taken for, and what nobody but the lab can say."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

#: From here on a header is a name for a meaning; below, it only holds a word that could be one.
NAMED = 0.5


@dataclass(frozen=True, slots=True)
class Meaning:
    """A column that was taken for something.

    Attributes
    ----------
    header : str
        The column.
    evidence : str
        Why, as a clause.
    unit : str
        Its unit; ``"?"`` where that is a question, empty where it has none.
    question : str
        What is asked about its unit.
    """

    header: str
    evidence: str
    unit: str = ""
    question: str = ""


@dataclass(slots=True)
class Understanding:
    """How the columns of a log are understood.

    Attributes
    ----------
    meanings : dict of str to Meaning
        Columns by canonical name.
    questions : dict of str to str
        What is asked, by canonical name, where no column could be told.
    remarks : list of str
        What else should be looked at.
    eyes : dict of str to dict of str to Meaning
        The columns of each eye, where a row holds both.
    eye_values : dict of str to int
        How many rows there are of each eye, where each row is of one and there are several.
    where : tuple of str and str, or None
        A column and its value of the rows that are fixations, where other rows stand between them.
    samples : str
        Evidence that the rows are samples of gaze; empty where they are fixations.
    perhaps_blink : str
        A column that holds 0 and 1 and may say whether a blink touches a fixation; or empty.
    facts : dict of str to tuple of str
        Columns that are the same in all rows of a trial, with their values.
    missing : tuple of str
        Marks for no value that occur in columns of numbers.
    clock : str
        A column of times of which nothing says whether fixations begin or end at them; or empty.
    clock_unit : str
        Its unit.
    """

    meanings: dict[str, Meaning] = field(default_factory=dict)
    questions: dict[str, str] = field(default_factory=dict)
    remarks: list[str] = field(default_factory=list)
    eyes: dict[str, dict[str, Meaning]] = field(default_factory=dict)
    eye_values: dict[str, int] = field(default_factory=dict)
    where: tuple[str, str] | None = None
    samples: str = ""
    perhaps_blink: str = ""
    facts: dict[str, tuple[str, ...]] = field(default_factory=dict)
    missing: tuple[str, ...] = ()
    clock: str = ""
    clock_unit: str = ""

    def header(self, name: str) -> str | None:
        """The column that was taken for something."""
        found = self.meanings.get(name)
        return None if found is None else found.header

    def used(self) -> set[str]:
        """All columns that were taken for something."""
        both = {one.header for columns in self.eyes.values() for one in columns.values()}
        return {one.header for one in self.meanings.values()} | both


def counted(count: int, thing: str, ending: str = "s") -> str:
    """A number of things, in the right number.

    Examples
    --------
    >>> counted(1, "log"), counted(5312, "cell"), counted(2, "guess", "es")
    ('1 log', '5,312 cells', '2 guesses')
    """
    return f"{count:,} {thing}{'' if count == 1 else ending}"


def listed(words: Iterable[str], last: str = "and") -> str:
    """Words with commas, and a word before the last.

    Examples
    --------
    >>> listed(["a", "b", "c"]), listed(["a"])
    ('a, b and c', 'a')
    """
    every = list(words)
    return f" {last} ".join(part for part in (", ".join(every[:-1]), *every[-1:]) if part)


def shortened(values: Sequence[str], most: int = 6) -> str:
    """Some of many values, in quotes."""
    told = ", ".join(f'"{value}"' for value in values[:most])
    return f"{told}, …" if len(values) > most else told


def number(value: float) -> str:
    """A number as one would say it: four digits, thousands apart.

    Examples
    --------
    >>> number(5312.0), number(218.25), number(0.2184)
    ('5,312', '218.2', '0.2184')
    """
    if value == int(value) or abs(value) >= 10_000:
        return f"{value:,.0f}"
    return f"{value:,.4g}" if abs(value) < 1000 else f"{value:,.1f}"
