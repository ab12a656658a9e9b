"""What can be wrong, where it is, and how it is said.

Every room reports what it finds as a :class:`Finding` in a :class:`Findings` list, so that one run
lists every problem at once. Only this module turns findings into text.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal, TypedDict, Unpack

Severity = Literal["error", "warning", "note"]

#: How many findings of one kind (same file, same place, same problem) are spelled out. A column of
#: words where numbers belong would otherwise bury every other problem under thousands of lines.
SPELLED_OUT = 5


#: How many files with one and the same problem are spelled out; the rest are named.
FILES_SPELLED_OUT = 10
#: Lists of files are broken into lines of about this many letters.
_LIST_WIDTH = 96

#: Words that may stand for another name; see :mod:`etl.pseudonyms`.
_STANDING_FOR = re.compile(r"(?<![0-9A-Za-z])(?:log-|file-)?[0-9A-Z]{8}(?![0-9A-Za-z])")

Kind = tuple[str, str, str, str]


class Place(TypedDict, total=False):
    """Where a finding is and what belongs there; see :class:`Finding`."""

    path: str
    line: int | None
    where: str
    found: str | None
    expected: str
    fix: str
    files: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that is wrong, doubtful or worth knowing.

    Attributes
    ----------
    problem : str
        What is the matter, as a short sentence without a full stop.
    severity : {"error", "warning", "note"}
        An error stops the build; a warning and a note go into the run record.
    path : str
        The file, as the user would name it. Empty where no file is at fault.
    line : int or None
        The line in that file, from 1.
    where : str
        The column of a table (``column "dur"``) or the key of a study file (``screen.width_px``).
    found : str or None
        The value found.
    expected : str
        What was expected in its place.
    fix : str
        What to do about it.
    files : tuple of str
        All files that it is about where there are several, each perhaps with a remark in brackets;
        ``path`` is empty then.
    """

    problem: str
    severity: Severity = "error"
    path: str = ""
    line: int | None = None
    where: str = ""
    found: str | None = None
    expected: str = ""
    fix: str = ""
    files: tuple[str, ...] = ()

    @property
    def kind(self) -> Kind:
        """What makes findings alike: how grave, which file, which place, what is the matter."""
        return (self.severity, self.path, self.where, self.problem)

    def text(self) -> str:
        """The finding as one or two lines of text."""
        place = self.path + (f":{self.line}" if self.line is not None else "")
        head = ": ".join(part for part in (place, self.where, self.problem) if part)
        tail = []
        if self.found is not None:
            tail.append(f"found {shown(self.found)}")
        if self.expected:
            tail.append(f"expected {self.expected}")
        says = head + ("; " + ", ".join(tail) if tail else "")
        if self.severity != "error":
            says = f"{self.severity}: {says}"
        listed = "".join(f"\n    {line}" for line in in_lines(self.files))
        return says + listed + (f"\n    fix: {self.fix}" if self.fix else "")


def shown(value: str, most: int = 60) -> str:
    """A value in quotes, with control characters spelled and long values cut."""
    whole = "".join(c if c.isprintable() else repr(c)[1:-1] for c in value[: most + 1])
    return f'"{whole[:most]}…"' if len(value) > most or len(whole) > most else f'"{whole}"'


def in_lines(names: Sequence[str]) -> list[str]:
    """Names with commas between them, broken into lines; no name is broken.

    Examples
    --------
    >>> in_lines(["P01.tsv", "P02.tsv"])
    ['P01.tsv, P02.tsv']
    """
    lines: list[str] = []
    for place, name in enumerate(names, start=1):
        piece = name + ("," if place < len(names) else "")
        if lines and len(lines[-1]) + 1 + len(piece) <= _LIST_WIDTH:
            lines[-1] += f" {piece}"
        else:
            lines.append(piece)
    return lines


@dataclass(slots=True)
class Findings:
    """Findings in the order in which they were made; of a kind, only the first few are kept.

    Examples
    --------
    >>> findings = Findings()
    >>> findings.error("this is no number", path="p1.tsv", line=3, where='column "dur"',
    ...                found="abc", expected="a number in ms", fix="correct the cell")
    >>> print(findings.text())
    p1.tsv:3: column "dur": this is no number; found "abc", expected a number in ms
        fix: correct the cell
    1 problem; nothing was written
    """

    items: list[Finding] = field(default_factory=list)
    more: Counter[Kind] = field(default_factory=Counter)
    #: What names that stand for others are turned back into where findings become text; empty for
    #: records that travel.
    names: Mapping[str, str] = field(default_factory=dict)

    def add(self, finding: Finding) -> None:
        """Record a finding; of a kind that has been spelled out often enough it is only counted."""
        kind = finding.kind
        self.more[kind] += 1
        if self.more[kind] <= SPELLED_OUT:
            self.items.append(finding)

    def error(self, problem: str, **place: Unpack[Place]) -> None:
        """Record an error; see :class:`Finding` for the parameters."""
        self.add(Finding(problem, "error", **place))

    def warning(self, problem: str, **place: Unpack[Place]) -> None:
        """Record a warning; see :class:`Finding` for the parameters."""
        self.add(Finding(problem, "warning", **place))

    def note(self, problem: str, **place: Unpack[Place]) -> None:
        """Record something worth knowing; see :class:`Finding` for the parameters."""
        self.add(Finding(problem, "note", **place))

    def extend(self, others: Findings) -> None:
        """Take over all that another list holds, in its order."""
        told: Counter[Kind] = Counter()
        self.names = self.names or others.names
        for finding in others.items:
            self.add(finding)
            told[finding.kind] += 1
        for kind, count in told.items():
            self.more[kind] += others.more[kind] - count

    def with_path(self, path: str, instead: str) -> Findings:
        """The same findings with one file under another name, for records that travel."""
        renamed = Findings([replace(f, path=instead) if f.path == path else f for f in self.items])
        for (severity, own, where, problem), count in self.more.items():
            renamed.more[severity, instead if own == path else own, where, problem] += count
        return renamed

    def __iter__(self) -> Iterator[Finding]:
        return iter(self.items)

    def __len__(self) -> int:
        return len(self.items)

    def of(self, severity: Severity) -> list[Finding]:
        """The findings of one severity."""
        return [finding for finding in self.items if finding.severity == severity]

    def count(self, severity: Severity) -> int:
        """How many there are of one severity, those not spelled out included."""
        return sum(times for kind, times in self.more.items() if kind[0] == severity)

    @property
    def failed(self) -> bool:
        """Whether there is any error."""
        return self.count("error") > 0

    def lines(self, severities: Iterable[Severity] = ("error", "warning", "note")) -> list[str]:
        """Each finding as text, followed by how many more of its kind there were.

        Of one problem that many files have, the first few files are spelled out and the others
        named.
        """
        wanted = set(severities)
        left = Counter(finding.kind for finding in self.items)
        files: dict[tuple[str, str, str], dict[str, int]] = {}
        out = []
        for finding in self.items:
            if finding.severity not in wanted:
                continue
            kind = finding.kind
            own = files.setdefault((finding.severity, finding.where, finding.problem), {})
            own[finding.path] = self.more[kind]
            if len(own) > FILES_SPELLED_OUT:
                continue
            out.append(finding.text())
            left[kind] -= 1
            more = self.more[kind] - self._spelled(kind)
            if left[kind] == 0 and more > 0:
                out.append(f"    … and {more:,} more like this in {finding.path or 'this study'}")
        for (_, where, problem), own in files.items():
            rest = list(own.items())[FILES_SPELLED_OUT:]
            if rest:
                place = f"{where}: " if where else ""
                count = sum(times for _, times in rest)
                what = "file" if len(rest) == 1 else "files"
                out.append(
                    f"    … and {count:,} more in {len(rest):,} more {what}: {place}{problem}"
                    + "".join(f"\n    {line}" for line in in_lines([path for path, _ in rest]))
                )
        return [self._turned_back(line) for line in out]

    def _turned_back(self, text: str) -> str:
        """A text with the names that stand for others turned back."""
        if not self.names:
            return text
        return _STANDING_FOR.sub(lambda found: self.names.get(found[0], found[0]), text)

    def _spelled(self, kind: Kind) -> int:
        """How many findings of a kind are spelled out."""
        return min(self.more[kind], sum(finding.kind == kind for finding in self.items))

    def text(self) -> str:
        """The whole list as text, closed by a count of the problems."""
        errors = self.count("error")
        closing = f"{errors} problem{'' if errors == 1 else 's'}; nothing was written"
        return "\n".join([*self.lines(), closing] if errors else self.lines())


class TrialwrightError(Exception):
    """The common parent of all errors that this package raises on purpose."""


class InputError(TrialwrightError):
    """The study file or an input is wrong; ``findings`` says where and what to do.

    Attributes
    ----------
    findings : Findings
        All problems of the run, in the order of the files.
    """

    def __init__(self, findings: Findings) -> None:
        super().__init__(findings)
        self.findings = findings

    def __str__(self) -> str:
        return self.findings.text()


class StudyError(InputError):
    """The study file itself is wrong."""


class DataError(InputError):
    """A log, a table or a region definition is wrong, or does not fit the others."""


class ClusterError(InputError):
    """The cluster that was to do the work cannot do it, or was lost in the middle."""


class FaultError(TrialwrightError):
    """The program contradicts itself: a fault of ours, never of the input."""
