"""What would tell of whom a row is although readers go by pseudonyms, and is refused."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.errors import DataError, Findings
from etl.files import Coded, number_of
from etl.pseudonyms import Pseudonyms, is_reader
from etl.trials import KnownTrials

if TYPE_CHECKING:
    from etl.session.plan import Plan

#: With fewer readers a column may hold their ids by chance: two readers 1 and 2, in groups 1 and 2
#: (our choice).
_FEWEST_READERS = 3
#: What is said of a value, or of a whole column.
_ONE = "holds the id of a reader"
_ALL = "is that of the readers' ids"
_LOG = "holds the name of a log"
#: Keys of [trials] that name columns of the tables, and columns that are called so by us.
_COLUMNS = ("factors", "covariates")
_OWN = frozenset({"participant", "session", "trial", "item"})
_FIX = (
    "rename the values in all files in which they stand; or leave the column out of the study, "
    "or set pseudonyms = false"
)


def refuse_clashes(pseudonyms: Pseudonyms) -> None:
    """Stop where two readers, or two files, have one pseudonym.

    Parameters
    ----------
    pseudonyms : Pseudonyms
        When the logs and tables are read.

    Raises
    ------
    DataError
        If there are such.
    """
    findings = Findings()
    for name, (one, other) in pseudonyms.clashes.items():
        findings.error(
            f"two {'readers' if is_reader(name) else 'files'} would have the same pseudonym",
            found=f"{one} and {other}",
            fix="move the key to the pseudonyms away and build again: everybody gets a new one",
        )
    if findings.failed:
        raise DataError(findings)


def hide_in_reasons(trials: KnownTrials, pseudonyms: Pseudonyms | None) -> None:
    """Take ids out of the values by which trials are skipped, which the ledger repeats.

    Parameters
    ----------
    trials : KnownTrials
        All trials; ``skipped_by`` is changed.
    pseudonyms : Pseudonyms or None
        Those of the study, when all readers are known.
    """
    if pseudonyms is None:
        return
    readers = trials.seen.ids["participant"]
    hidden = lru_cache(None)(pseudonyms.hidden_in_free_text)
    rows = np.flatnonzero(trials.skipped)
    # A reader's own id may be the value, so each reason is looked at once for each reader.
    reason = trials.skipped_by.codes[rows].astype(np.int64)
    pair = reason * (len(readers.values) + 1) + readers.codes[rows]
    _, first, which = np.unique(pair, return_index=True, return_inverse=True)
    texts = []
    for row in rows[first].tolist():
        name, _, value = trials.skipped_by[row].partition(" = ")
        own = readers.text(row)
        same = value == pseudonyms.originals.get(own)
        texts.append(f"{pseudonyms.hidden(name)} = {own if same else hidden(value)}")
    trials.skipped_by.put(rows, texts, which)


def refuse_ids_in_values(
    plan: Plan,
    known: tuple[KnownTrials, NDArray[np.int32]],
    shown: Sequence[str],
    findings: Findings,
) -> None:
    """Record values of facts and names of regions that hold the id of a reader.

    Parameters
    ----------
    plan : Plan
        The study's tables and texts.
    known : tuple of KnownTrials and (trials,) int32 array
        All trials, and the text of each, -1 for those that are no part of the study.
    shown : sequence of str
        The names of the logs, for messages.
    findings : Findings
        Where an error is recorded for each such value: the tables would carry it as it is.
    """
    pseudonyms = plan.pseudonyms
    if pseudonyms is None:
        return
    trials, text = known
    design = (*plan.study.trials.factors, *plan.study.trials.covariates)
    every = np.ones(len(trials), dtype=bool)
    for name, rows in (
        *((name, every) for name in ("session", "trial", "item")),
        *((name, text >= 0) for name in design),
    ):
        column = trials.known.get(name)
        if column is None:
            continue
        if _are_the_readers(column, trials, rows, pseudonyms):
            for row in np.flatnonzero(rows & (column.codes >= 0))[:1].tolist():
                _tell(plan, name, (trials, text, row), shown, _ALL, findings)
            continue
        for row, what in _telling(column, rows, pseudonyms):
            _tell(plan, name, (trials, text, row), shown, what, findings)
    for name in plan.library.region_names:
        if pseudonyms.hidden(name) != name:
            findings.error(
                "the name of a region holds the id of a reader",
                path=plan.study.regions.file,
                found=name,
                expected="names that tell of no reader, since readers go by pseudonyms",
                fix="rename the region",
            )


def refuse_ids_in_names(plan: Plan, findings: Findings) -> None:
    """Record columns of the study that are called like a reader.

    Parameters
    ----------
    plan : Plan
        The study, when all readers of the logs are known.
    findings : Findings
        Where an error is recorded for each name: the tables have columns of these names.
    """
    pseudonyms, study = plan.pseudonyms, plan.study
    if pseudonyms is None:
        return
    named: list[tuple[str, tuple[str, ...]]] = [
        (name, ("trials", key)) for key in _COLUMNS for name in getattr(study.trials, key)
    ]
    for factor, contrast in study.output.contrasts.items():
        if isinstance(contrast, Mapping):
            named += [(name, ("output", "contrasts", factor)) for name in contrast]
    known = {name for name, _ in named}
    named += [(key, ("regions", "file")) for key in plan.library.keys if key not in known | _OWN]
    readers = {text.casefold() for text in pseudonyms.readers().values()}
    for name, keys in named:
        if name.casefold() in readers or pseudonyms.hidden(name) != name:
            findings.error(
                "a column is called like a reader, and readers go by pseudonyms",
                path=study.shown,
                line=study.line_of(*keys),
                where=".".join(keys),
                found=name,
                expected="names that tell of no reader",
                fix="rename the column in all files in which it stands; or leave it out of the "
                "study, or set pseudonyms = false",
            )


def _telling(
    column: Coded, rows: NDArray[np.bool_], pseudonyms: Pseudonyms
) -> Iterator[tuple[int, str]]:
    """The first row of each value that holds an id or the name of a log, and which it is."""
    for code in np.unique(column.codes[rows]).tolist():
        value = "" if code < 0 else column.values[code]
        # A number by itself is a number: trial 2041 has nothing to do with reader 2041.
        if not value or number_of(value) is not None:
            continue
        named = pseudonyms.hidden(value) != value
        if named or pseudonyms.names_log(value):
            row = int(np.flatnonzero(rows & (column.codes == code))[0])
            yield row, _ONE if named else _LOG


def _are_the_readers(
    column: Coded, trials: KnownTrials, rows: NDArray[np.bool_], pseudonyms: Pseudonyms
) -> bool:
    """Whether a column says of each trial who read it: by id, or by the number in the id."""
    readers = trials.seen.ids["participant"]
    said_of = rows & (column.codes >= 0)
    width = max(len(readers.values), 1)
    pairs = np.unique(column.codes[said_of].astype(np.int64) * width + readers.codes[said_of])
    said = [(column.values[v // width], readers.values[v % width]) for v in pairs.tolist()]
    if any(value == reader for value, reader in said):
        return True
    if len({reader for _, reader in said}) < _FEWEST_READERS:
        return False
    return all(
        value.lstrip("0") in _spellings(pseudonyms.originals[reader]) for value, reader in said
    )


def _spellings(original: str) -> set[str]:
    """An id, and the number in it, without zeros before it."""
    return {original.lstrip("0"), "".join(re.findall("[0-9]+", original)).lstrip("0")} - {""}


def _tell(
    plan: Plan,
    name: str,
    place: tuple[KnownTrials, NDArray[np.int32], int],
    shown: Sequence[str],
    what: str,
    findings: Findings,
) -> None:
    """Record a value that would tell of whom a row is."""
    trials, text, row = place
    if plan.facts.sources.get(name) == "regions":
        definition = plan.library.texts[int(text[row])]
        path, line = definition.path, definition.line
    else:
        table, listed, lines = plan.facts.origins(name, trials, np.array([row]))
        path = table if listed[0] else shown[int(trials.seen.file[row])]
        line = int(lines[0])
    findings.error(
        f"the column {name} {what}, and readers go by pseudonyms"
        if what == _ALL
        else f"a value of {name} {what}, and readers go by pseudonyms",
        path=path,
        line=line,
        where=f'column "{name}"',
        found=trials.known[name].text(row),
        expected="values that tell of no reader",
        fix=_FIX,
    )
