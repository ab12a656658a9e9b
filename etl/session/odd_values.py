"""Values that look like slips: levels and marks that hardly occur, or nearly are another one."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Sequence
from difflib import get_close_matches

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows
from etl.regions import RegionLibrary
from etl.study import Study
from etl.trials import KnownTrials

#: With fewer readers than this, a value that one of them has alone says nothing (our choice).
_FEWEST_READERS = 4
#: How alike two texts must be to be taken for one with a slip (our choice).
_ALIKE, _REGIONS_ALIKE = 0.8, 0.7
#: A region that is in so few of the texts is doubted if another, nearly called so, is in most.
_FEW, _MOST = 0.1, 0.5
_FEWEST_TEXTS = 4
#: Letters that are written in two ways where a keyboard lacks them (common practice, no source).
_SPELLINGS = str.maketrans({"ä": "ae", "ö": "oe", "ü": "ue", "ß": "ss", "æ": "ae", "ø": "oe"})


def notice_odd_values(
    study: Study,
    trials: KnownTrials,
    in_study: NDArray[np.bool_],
    shown: Sequence[str],
    findings: Findings,
) -> None:
    """Warn of values of factors, and of the marks of trials to skip, that look like slips.

    Parameters
    ----------
    study : Study
        As loaded. Levels that it states are never doubted.
    trials : KnownTrials
        All trials, with their facts.
    in_study : (trials,) bool array
        Which of them are part of the study.
    shown : sequence of str
        The names of the logs.
    findings : Findings
        Where it is recorded that two values are one but for the spelling, or that a value is with
        one reader alone.
    """
    for name in study.trials.factors:
        if name in trials.known and name not in study.trials.levels:
            _look(name, (), trials, in_study, shown, findings)
    for name, marks in study.trials.skip.items():
        if name in trials.known and name not in study.trials.factors:
            _look(name, marks, trials, in_study, shown, findings)


def _look(
    name: str,
    marks: Collection[str],
    trials: KnownTrials,
    in_study: NDArray[np.bool_],
    shown: Sequence[str],
    findings: Findings,
) -> None:
    """Look at the values of one fact; ``marks`` are values that are known otherwise."""
    column, readers = trials.known[name], trials.seen.ids["participant"]
    values = _values(column, in_study)
    if len(values) > len(np.unique(readers.codes)) + len(column) // 4:
        return  # a fact of its own for nearly every trial has no levels
    known = {_plain(mark): mark for mark in marks}
    whom, first, everybody = _with_whom(column, readers, in_study)
    for value in sorted(values, key=lambda value: -whom[value]):
        row = first[value]
        other = known.setdefault(_plain(value), value)
        problem = ""
        if other != value:
            problem = "differs from another one in spelling only"
        elif whom[value] == 1 and everybody >= _FEWEST_READERS:
            others = [v for v in values if v != value and whom[v] > 1]
            near = get_close_matches(value, [*others, *marks], n=1, cutoff=_ALIKE)
            problem = "occurs with one reader only" if near or len(others) > 1 else ""
            other = near[0] if near else ""
        if problem:
            findings.warning(
                f"the value of {name} {problem}",
                path=shown[int(trials.seen.file[row])],
                line=int(trials.seen.line[row]),
                found=f"{value}, of reader {readers.text(row)}",
                expected=f'perhaps "{other}"' if other else "a value that other readers have too",
                fix=f"correct it where {name} stands"
                + ("" if marks else "; if it is right, list it in [trials] levels"),
            )


def _with_whom(
    column: Coded, readers: Coded, rows: NDArray[np.bool_]
) -> tuple[dict[str, int], dict[str, int], int]:
    """How many readers have each text, in which row it comes first, and how many readers are."""
    everybody = int(np.count_nonzero(np.bincount(readers.codes[rows], minlength=1)))
    there = np.flatnonzero(rows & (column.codes >= 0))
    if not len(there):
        return {}, {}, everybody
    first, _ = group_rows([column.take(there), readers.take(there)])
    code = column.codes[there[first]]
    order = np.lexsort((first, code))
    present, starts, counts = np.unique(code[order], return_index=True, return_counts=True)
    texts = [column.values[one] for one in present.tolist()]
    return (
        dict(zip(texts, counts.tolist(), strict=True)),
        dict(zip(texts, there[first[order[starts]]].tolist(), strict=True)),
        everybody,
    )


def _values(column: Coded, rows: NDArray[np.bool_]) -> list[str]:
    """The texts that occur in some rows of a column."""
    return [column.values[code] for code in np.unique(column.codes[rows]).tolist() if code >= 0]


def _plain(text: str) -> str:
    """A text without what is easily written in two ways: case, accents, blanks, hyphens."""
    letters = unicodedata.normalize("NFKC", text).casefold().translate(_SPELLINGS)
    letters = unicodedata.normalize("NFKD", letters)
    return "".join(letter for letter in letters if letter.isalnum()) or text


def notice_odd_regions(library: RegionLibrary, file: str, findings: Findings) -> None:
    """Warn of regions that hardly any text has and that are nearly called like a usual one.

    Parameters
    ----------
    library : RegionLibrary
        The texts.
    file : str
        The definitions, for messages.
    findings : Findings
        Where they are recorded.
    """
    texts = library.texts
    if len(texts) < _FEWEST_TEXTS:
        return
    names = [set(text.regions) for text in texts]
    count: dict[str, int] = {}
    for own in names:
        for name in own:
            count[name] = count.get(name, 0) + 1
    usual = [name for name, times in count.items() if times > _MOST * len(texts)]
    for text, own in zip(texts, names, strict=True):
        for name in sorted(own):
            if count[name] > max(1, _FEW * len(texts)):
                continue
            absent = [other for other in usual if other not in own]
            near = get_close_matches(name, absent, n=1, cutoff=_REGIONS_ALIKE)
            if near:
                findings.warning(
                    "hardly any text has a region of this name, and this one lacks one that most "
                    "have",
                    path=text.path or file,
                    line=text.line,
                    found=name,
                    expected=f'perhaps "{near[0]}"',
                    fix="correct the region's name",
                )
