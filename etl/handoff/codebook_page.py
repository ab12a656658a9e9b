"""The codebook as a page for people: facts for its template."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from functools import cache
from typing import Any, Final

from jinja2 import Environment, PackageLoader, StrictUndefined

from etl.coding import Coding
from etl.handoff.codebook_entries import CodebookEntry
from etl.handoff.codebook_study import StudyFacts
from etl.handoff.codebook_tables import ROWS, row_key
from etl.tables import MeasureColumn, TableDesign

#: A column with more levels than this has them counted on the page; ``codebook.csv`` has them all.
_MOST_LEVELS: Final = 12
_OUTSIDE: Final = {
    "ignore": "A fixation outside every region is passed over: it neither ends a visit to a region "
    "nor comes between two fixations (outside = ignore).",
    "interrupt": "A fixation outside every region ends the visit in progress (outside = "
    "interrupt).",
}
_NO_OPPORTUNITY: Final = {
    "missing": "Where the reader had no chance of an outcome, it is missing, with the reason "
    "(no_opportunity = missing).",
    "zero": "Where the reader had no chance of a binary outcome or a count, because the region was "
    "not reached, not passed, skipped or never fixated, it is 0; times stay missing, and so does "
    "what a text leaves no room for: a region without an earlier one, or a later one, and a trial "
    "of fewer than two fixations (no_opportunity = zero).",
}
_KINDS: Final = {
    "treatment": "treatment contrasts: each level against the first",
    "sum": "sum contrasts: each level but the last against the mean of all",
    "helmert": "Helmert contrasts: each level after the first against the mean of those before it",
    "polynomial": "polynomial contrasts over equally spaced levels",
    "given": "numbers that the study gives",
}
_UNITS: Final = {"binary": "binary, 0 or 1", "count": "a count", "duration": "a duration in ms"}
#: Signs that Markdown would take for more than themselves; an underscore within a word, or an
#: ampersand that begins no entity, it would not.
_SPECIAL: Final = re.compile(r"([\\`*\[\]<|~]|(?<![^\W_])_|_(?![^\W_])|&(?=#?\w+;)|^[#>+-])")


def codebook_page(design: TableDesign, study: StudyFacts, entries: Sequence[CodebookEntry]) -> str:
    """The codebook as Markdown.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    study : StudyFacts
        The study's decisions.
    entries : sequence of CodebookEntry
        All entries of the codebook.

    Returns
    -------
    str
        The whole page; the same facts give the same text.
    """
    page = (
        _pages()
        .get_template("codebook.md")
        .render(
            title=study.title,
            decisions=_decisions(study),
            rules=study.rules,
            factors=[
                {"name": name, "levels": levels, "origin": study.origins.get(name, "")}
                for name, levels in design.factors.items()
            ],
            codings=[_coding(coding) for coding in design.codings.values()],
            covariates=[
                {
                    "name": name,
                    "type": known.type,
                    "origin": study.origins.get(name, ""),
                    "mean": repr(design.centred[name]) if name in design.centred else "",
                }
                for name, known in design.covariates.items()
            ],
            centred=bool(design.centred),
            zeros_only_by_chance=study.no_opportunity == "missing",
            reasons=[(reason, study.reasons[reason]) for reason in _reasons(design)],
            measures=[
                (level, [_outcome(measure) for measure in own])
                for level, own in (("regions", design.measures), ("trials", design.trial_measures))
                if own
            ],
            tables=[_table(name, design, study, entries) for name in ROWS],
            pseudonyms=study.pseudonyms,
        )
    )
    return page.rstrip("\n") + "\n"


@cache
def _pages() -> Environment:
    """The template, compiled once for all codebooks of a process."""
    pages = Environment(
        loader=PackageLoader("etl.handoff", "templates"),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        autoescape=False,  # noqa: S701 - Markdown is escaped by the filters below
    )
    pages.filters |= {"words": _words, "code": _code, "codes": _codes}
    return pages


def _decisions(study: StudyFacts) -> list[str]:
    """What the study decided, in sentences."""
    lines = [_OUTSIDE[study.outside], _NO_OPPORTUNITY[study.no_opportunity]]
    if study.line_method == "consensus":
        lines.append(
            "Which line of a text a fixation belongs to is told by all published methods together "
            "(method = consensus)."
        )
    elif study.line_method:
        lines.append(
            f"Which line of a text a fixation belongs to is told by the method {study.line_method}."
        )
    return lines


def _reasons(design: TableDesign) -> list[str]:
    """The reasons for which some outcome of the study can be missing, in their own order."""
    used = {r for m in (*design.measures, *design.trial_measures) for r in m.reasons}
    return [reason for reason in design.reasons if reason in used]


def _coding(coding: Coding) -> dict[str, Any]:
    """A factor as numbers, row by row."""
    return {
        "factor": coding.factor,
        "kind": _KINDS[coding.name],
        "columns": coding.columns,
        "rows": [
            (level, [f"{number:.10g}" for number in numbers])
            for level, numbers in zip(coding.levels, coding.matrix, strict=True)
        ],
    }


def _outcome(measure: MeasureColumn) -> dict[str, Any]:
    """One outcome as the page tells of it."""
    return {
        "name": measure.name,
        "kind": _UNITS[measure.kind],
        "definition": measure.definition,
        "reasons": measure.reasons,
        "source": measure.source.rstrip("."),
    }


def _table(
    name: str, design: TableDesign, study: StudyFacts, entries: Sequence[CodebookEntry]
) -> dict[str, Any]:
    """One table with its columns."""
    return {
        "name": name,
        "row": ROWS[name],
        "key": row_key(design, name, study),
        # The outcomes in the column of values are told of once, above.
        "columns": [
            _column(entry)
            for entry in entries
            if entry.table == name and not (name == "outcomes" and entry.outcome)
        ],
    }


def _column(entry: CodebookEntry) -> dict[str, Any]:
    """One column of a table; an outcome is told of above."""
    column = entry.column
    meaning = "the outcome of this name, above" if entry.outcome else column.meaning
    levels = column.levels
    if len(levels) > _MOST_LEVELS:
        meaning += f" (one of {len(levels)} levels, which codebook.csv lists)"
        levels = ()
    return {
        "name": column.name,
        "type": column.type,
        "unit": column.unit,
        "meaning": meaning,
        "levels": levels,
        "empty": "it is missing, for one of its reasons"
        if entry.outcome and entry.when_missing
        else entry.when_missing,
    }


def _words(text: str) -> str:
    r"""Text in which nothing is taken for a sign of Markdown.

    >>> print(_words("skip_it | _c"))
    skip_it \| \_c
    """
    return " ".join(_SPECIAL.sub(r"\\\1", text).split())


def _code(text: str) -> str:
    """A name as code; a bar would end a table's cell, and a run of backticks the code."""
    text = " ".join(text.split()) or " "
    longest = max((len(run) for run in re.findall("`+", text)), default=0)
    fence, pad = "`" * (longest + 1), " " if "`" in text else ""
    return f"{fence}{pad}{text}{pad}{fence}".replace("|", "\\|")


def _codes(texts: Iterable[str]) -> str:
    """Names as code with commas between them."""
    return ", ".join(map(_code, texts))
