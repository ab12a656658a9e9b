"""Who read what: readers, sessions and texts, from columns and from the names of the logs."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from etl.drafting.columns import PooledColumn, is_plain_number, share_of
from etl.drafting.found_logs import common_start
from etl.drafting.items import find_item
from etl.drafting.meanings import NAMED, Meaning, Understanding, counted, shortened
from etl.drafting.structure import Structure
from etl.drafting.vocabulary import likeness, sounds_like

_PIECES = re.compile(r"\d+|[^\W\d_]+|[\W_]+")
#: Letters before a number that belong to an id, as in P07, vp12 or sub-03.
_MOST_LETTERS = 4
_READER_LETTERS = frozenset(("p", "r", "s", "pp", "vp"))
#: Values of a fact that are told; with more, it is rather a covariate.
_MOST_LEVELS = 8
_MOST_FACTS = 12


@dataclass(frozen=True, slots=True)
class NamePattern:
    """What the names of the logs say.

    Attributes
    ----------
    pattern : str
        A regular expression with the group ``participant`` and perhaps others.
    said : dict of str to tuple of str
        For each group, what it finds in each name.
    """

    pattern: str
    said: dict[str, tuple[str, ...]]


def pattern_of(names: Sequence[str], known: Collection[str] = ()) -> NamePattern | None:
    r"""Find the parts of file names that differ, and a pattern that takes them out.

    Parameters
    ----------
    names : sequence of str
        The names of the logs, without folders.
    known : collection of str
        What columns of the logs say already, by canonical name.

    Returns
    -------
    NamePattern or None
        None where the names have no form in common, or do not differ.

    Examples
    --------
    >>> pattern_of(["P01.tsv", "P02.tsv"]).pattern
    '(?P<participant>P\\d+)'
    >>> known = {"trial"}
    >>> pattern_of(["vp3_1.csv", "vp3_2.csv", "vp4_1.csv", "vp4_2.csv"], known).pattern
    '(?P<participant>vp\\d+)_(?P<session>\\d+)'
    """
    stems = [_stem(name) for name in names]
    if len(set(stems)) < 2:
        return None
    cut = [_PIECES.findall(stem) for stem in stems]
    same_form = len({tuple(_form(piece) for piece in pieces) for pieces in cut}) == 1
    if not same_form:
        return _by_affixes(stems)
    varying = [i for i in range(len(cut[0])) if len({pieces[i] for pieces in cut}) > 1]
    if not varying or len(varying) > 2:
        return None
    # The sort is stable: of two parts that look alike, the first names the reader.
    varying.sort(key=lambda place: -_reader_like(cut[0], place))
    groups = {varying[0]: "participant"}
    if len(varying) == 2:
        second = _second_group(cut[0], varying[1], known)
        if second not in known:
            groups[varying[1]] = second
    return _built(cut, groups)


def _word_before(pieces: Sequence[str], place: int) -> str:
    """The word that stands before a part of a name."""
    return next((p for p in reversed(pieces[:place]) if p[0].isalpha()), "")


def _reader_like(pieces: Sequence[str], place: int) -> float:
    """How much a part of a name looks as if it named the reader."""
    word = _word_before(pieces, place)
    if not word:
        return 0.0
    said = sounds_like(word, ("participant", "session", "trial", "item"))
    if said == "participant" or word.casefold() in _READER_LETTERS:
        return 1.0
    return -1.0 if said is not None else 0.0


def _stem(name: str) -> str:
    """A name without its endings, composed."""
    return unicodedata.normalize("NFC", name).split(".")[0]


def _form(piece: str) -> str:
    """What a piece of a name consists of; signs stand for themselves."""
    if piece.isdigit():
        return "digits"
    return "letters" if piece[0].isalpha() else piece


def _second_group(pieces: Sequence[str], place: int, known: Collection[str]) -> str:
    """What the other varying part of the names is."""
    said = sounds_like(_word_before(pieces, place), ("session", "trial", "item"))
    if said is not None:
        return said
    if not pieces[place].isdigit():
        return "item"
    return "session" if "trial" in known else "trial"


def _built(cut: Sequence[Sequence[str]], groups: Mapping[int, str]) -> NamePattern | None:
    """The pattern that takes out the varying pieces, with the letters that belong to a reader."""
    pieces = cut[0]
    reader = next(place for place, name in groups.items() if name == "participant")
    lead = pieces[reader - 1] if reader else ""
    # The letters of P07 or vp12 are part of the id; a longer word only says what follows.
    with_lead = pieces[reader].isdigit() and lead.isalpha() and len(lead) <= _MOST_LETTERS
    start = min(*groups, reader - 1) if with_lead else min(groups)
    parts: list[str] = []
    for place in range(start, max(groups) + 1):
        if place in groups:
            body = r"\d+" if pieces[place].isdigit() else r"[^\W\d_]+"
            letters = re.escape(lead) if with_lead and place == reader else ""
            parts.append(f"(?P<{groups[place]}>{letters}{body})")
        elif not (with_lead and place == reader - 1):
            parts.append(re.escape(pieces[place]))
    wanted = {
        name: tuple((lead if with_lead and place == reader else "") + one[place] for one in cut)
        for place, name in groups.items()
    }
    names = ["".join(one) for one in cut]
    before = "".join(re.escape(piece) for piece in pieces[:start])
    # The whole beginning is written out only where the shorter pattern finds something else.
    candidates = ("".join(parts), f"^{before}{''.join(parts)}")
    sound = (_if_sound(candidate, names, wanted) for candidate in candidates)
    return next((pattern for pattern in sound if pattern is not None), None)


def _by_affixes(stems: Sequence[str]) -> NamePattern | None:
    """The pattern for names that only begin and end alike."""
    start = _common_start(stems)
    end = _common_start([stem[::-1] for stem in stems])[::-1]
    middle = [stem[len(start) : len(stem) - len(end)] for stem in stems]
    if not all(middle):
        return None
    pattern = f"^{re.escape(start)}(?P<participant>[^.]+?){re.escape(end)}" + r"(?:\.|$)"
    return _if_sound(pattern, stems, {"participant": tuple(middle)})


def _common_start(stems: Sequence[str]) -> str:
    """What all names begin with, up to a sign between words."""
    start = len(common_start(stems))
    while start and stems[0][start - 1].isalnum():
        start -= 1
    return stems[0][:start]


def _if_sound(
    pattern: str, names: Sequence[str], wanted: dict[str, tuple[str, ...]]
) -> NamePattern | None:
    """The pattern, if it finds in each name what it should, and tells readers apart."""
    for place, name in enumerate(names):
        match = re.search(pattern, name)
        if match is None or any(match[group] != said[place] for group, said in wanted.items()):
            return None
    return NamePattern(pattern, wanted) if len(set(wanted["participant"])) > 1 else None


def find_readers(structure: Structure, found: Understanding) -> NamePattern | None:
    """Find the columns that say who read, on which visit, and which text.

    Parameters
    ----------
    structure : Structure
        The rows.
    found : Understanding
        Where it is recorded.

    Returns
    -------
    NamePattern or None
        The pattern for file names, where only they say who read.
    """
    rows = structure.rows
    columns = {h: rows.columns[h] for h in rows.headers if h not in found.used()}
    _find_session(structure, columns, found)
    find_item(structure, columns, found)
    columns = {h: c for h, c in columns.items() if h not in found.used()}
    by_column = _find_participant(structure, columns, found)
    if by_column is not None:
        return None
    names = pattern_of(rows.names, found.meanings.keys())
    if names is None:
        found.questions["participant"] = (
            "which column says who read? If only the file's name does, remove this line and write "
            "participant_from_name in [logs], a pattern with a group named participant"
        )
        return None
    if "trial" in names.said:
        found.questions.pop("trial", None)
    return names


def _find_participant(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> str | None:
    """The column that names the reader: by its header, or because the file's name says the same."""
    rows = structure.rows
    best, best_score, evidence = None, 0.0, ""
    for header, column in columns.items():
        if not structure.constant(column) or column.absent:
            continue
        named = likeness(header, "participant")
        of_log = share_of(np.diff(column.coded.codes)[np.diff(rows.file) == 0] != 0) == 0
        told = [
            (column.coded.text(row), rows.names[int(rows.file[row])]) for row in _starts(rows.file)
        ]
        in_name = of_log and all(_stands_in(value, name) for value, name in told)
        differs = len(column.distinct) == len(rows.names) > 1
        score = named + (0.6 if in_name and not is_plain_number(told[0][0]) else 0.3 * in_name)
        score += 0.2 * (differs and of_log)
        if score > best_score:
            best, best_score = header, score
            values = counted(len(column.distinct), "value")
            evidence = f"it holds {values}: {shortened(column.distinct, 3)}"
            if of_log and len(rows.names) > 1:
                evidence += "; the same in all rows of a log"
            if in_name:
                evidence += f', and part of its name ("{told[0][0]}" in {told[0][1]})'
    if best is None or best_score < NAMED:
        return None
    found.meanings["participant"] = Meaning(best, evidence)
    return best


def _starts(file: np.ndarray) -> list[int]:
    """The first row of each log, in order."""
    return [0, *(np.flatnonzero(np.diff(file)) + 1).tolist()]


def _stands_in(value: str, name: str) -> bool:
    """Whether a value is a part of a file's name that does not go on with the same kind of sign."""
    if not value:
        return False
    edge = r"(?<!\d)" if value[0].isdigit() else r"(?<![^\W\d_])"
    last = r"(?!\d)" if value[-1].isdigit() else r"(?![^\W\d_])"
    return re.search(edge + re.escape(value.casefold()) + last, name.casefold()) is not None


def _find_session(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """The column that tells visits apart, where there are several."""
    for header, column in columns.items():
        if likeness(header, "session") < NAMED or not structure.constant(column):
            continue
        if 2 <= len(column.distinct) <= 50:
            told = f"the header says session, and it holds {shortened(column.distinct)}"
            found.meanings["session"] = Meaning(header, told)
            return


def find_facts(structure: Structure, found: Understanding) -> None:
    """List the other columns that are the same in all rows of a trial, as facts may be.

    Parameters
    ----------
    structure : Structure
        The rows.
    found : Understanding
        Where they are listed, with their values.
    """
    for header, column in structure.rows.columns.items():
        if header in found.used() or len(found.facts) >= _MOST_FACTS:
            continue
        if len(column.distinct) > 1 and structure.constant(column):
            found.facts[header] = column.distinct


def factors_among(facts: Mapping[str, Sequence[str]]) -> list[str]:
    """Those facts that have so few values that they may be factors."""
    return [name for name, values in facts.items() if 2 <= len(values) <= _MOST_LEVELS]
