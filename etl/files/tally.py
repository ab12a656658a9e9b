"""Where the lines of a file went, and what was mended in it: counts that balance."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(slots=True)
class Tally:
    """How often something was met, and where first.

    Attributes
    ----------
    count : int
        How often.
    first_line : int or None
        The first line on which, from 1.
    """

    count: int = 0
    first_line: int | None = None

    def add(self, count: int, first_line: int | None = None) -> None:
        """Count some more."""
        self.count += count
        if first_line is not None:
            known = self.first_line
            self.first_line = first_line if known is None else min(known, first_line)


@dataclass(slots=True)
class FileAccount:
    """What became of every line of a file.

    Attributes
    ----------
    total : int
        How many lines the file has.
    lines : dict of str to Tally
        What became of them; the counts add up to ``total``.
    repairs : dict of str to Tally
        What was mended, in words, and how often. Repairs are of cells or lines that are counted
        in ``lines`` already.

    Examples
    --------
    >>> account = FileAccount(3)
    >>> account.line("header", 1, 1)
    >>> account.line("fixations", 2, 2)
    >>> account.balances()
    True
    """

    total: int = 0
    lines: dict[str, Tally] = field(default_factory=dict)
    repairs: dict[str, Tally] = field(default_factory=dict)

    def line(self, fate: str, count: int, first_line: int | None = None) -> None:
        """Count lines of one fate."""
        if count:
            self.lines.setdefault(fate, Tally()).add(count, first_line)

    def move(self, fate: str, instead: str, count: int, first_line: int | None = None) -> None:
        """Take lines that were counted under one fate to another."""
        if count:
            self.lines[fate].count -= count
            if not self.lines[fate].count:
                del self.lines[fate]
            self.line(instead, count, first_line)

    def repaired(self, repair: str, count: int, first_line: int | None = None) -> None:
        """Count something that was mended."""
        if count:
            self.repairs.setdefault(repair, Tally()).add(count, first_line)

    def balances(self) -> bool:
        """Whether every line is accounted for once."""
        return sum(tally.count for tally in self.lines.values()) == self.total
