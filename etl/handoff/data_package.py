"""The data package: what each file of a folder is, for programs that know the standard.

References
----------
Data Package standard, version 2.0: Data Package, Data Resource, Table Dialect, Table Schema
(https://datapackage.org). Programs for version 1 find what they look for, too: names in their
narrower alphabet, ``profile``, and lists where both versions allow them.
"""

from __future__ import annotations

import hashlib
import json
import re
import unicodedata
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any, Final

from etl.cells import safe
from etl.handoff.codebook_entries import CodebookEntry, codebook_entries
from etl.handoff.codebook_study import StudyFacts
from etl.handoff.codebook_tables import ROWS, row_key
from etl.readiness.facts import VERDICT_RULES
from etl.tables import TableDesign

#: The file, which does not list itself.
DATA_PACKAGE: Final = "datapackage.json"
_PROFILE: Final = "https://datapackage.org/profiles/2.0/datapackage.json"
#: The run record holds the time that a build took, and scripts are there to be changed: of these no
#: digest is told, so that the same study gives the same bytes and a changed script is no fault.
_WITHOUT_DIGEST: Final = ("run.json", "start.R", "start.py")
_DIALECT: Final = {
    "header": True,
    "delimiter": ",",
    "lineTerminator": "\n",
    "quoteChar": '"',
    "doubleQuote": True,
}
#: Media types by the end of a file's name; of Parquet as registered with IANA.
_MEDIA_TYPES: Final = {
    "csv": "text/csv",
    "html": "text/html",
    "json": "application/json",
    "md": "text/markdown",
    "parquet": "application/vnd.apache.parquet",
    "py": "text/x-python",
    "r": "text/x-r",
}
#: The reference implementation (frictionless 5.21) opens what has the format "parquet" by way of
#: floats, then finds "nan" in columns of whole numbers, and no size and digest. What has a name
#: that it does not know it leaves closed, and holds it against its digest.
_FORMATS: Final = {"parquet": "apache-parquet"}
_MEANINGS: Final = {
    "audit.html": "The audit page: who and what was lost, and what the outcomes look like.",
    "codebook.md": "The codebook as a page.",
    "readiness.json": "What is to be known of each binary outcome before a model is fitted.",
    "run.json": "The run record: the study as understood, versions, digests of all inputs, counts. "
    "No digest is told here, for it holds the time that the build took.",
    "start.R": "A script in R that reads the tables and fits models; yours to change.",
    "start.py": "A script in Python that reads the tables; yours to change.",
    "README.md": "What lies here, and how to begin.",
}
_TYPES: Final = {
    "text": "string",
    "category": "string",
    "flag": "integer",
    "integer": "integer",
    "number": "number",
}


def write_data_package(
    folder: Path, design: TableDesign, study: StudyFacts, files: Sequence[str]
) -> None:
    """Write ``datapackage.json`` into a folder.

    Parameters
    ----------
    folder : Path
        Where the files are.
    design : TableDesign
        What the study's tables have in common.
    study : StudyFacts
        The study's decisions.
    files : sequence of str
        Names of the files to list. All must be there but ``run.json``, which may follow: of it,
        and of the scripts that people change, no size and digest are told. The same files give the
        same bytes.
    """
    listed = sorted(name for name in files if name != DATA_PACKAGE)
    tables = _Tables(design, study)
    title = study.title or "Reading outcomes"
    package = {
        "$schema": _PROFILE,
        "name": _slug(title) or "study",
        "title": title,
        "description": "Outcomes of reading, computed from logs of fixations. What every column "
        "is, and under which decisions it was computed, is told in codebook.md.",
        "profile": "data-package",
        "resources": [_resource(folder, name, tables) for name in listed],
    }
    text = json.dumps(package, ensure_ascii=False, indent=2) + "\n"
    (folder / DATA_PACKAGE).write_text(text, encoding="utf-8", newline="\n")


class _Tables:
    """The schemas of tables."""

    def __init__(self, design: TableDesign, study: StudyFacts) -> None:
        self._design, self._study = design, study
        self._entries: dict[str, list[CodebookEntry]] = {name: [] for name in ROWS}
        for entry in codebook_entries(design, study):
            if not (entry.table == "outcomes" and entry.outcome):
                self._entries[entry.table].append(entry)
        rules = {rule.name: rule.meaning for rule in study.rules}
        self._labels: dict[str, Mapping[str, str]] = {
            "missing": study.reasons,
            "left_out_by": rules,
            "rule": rules,
            "verdict": {str(name): rule for name, rule in VERDICT_RULES.items()},
        }

    def __contains__(self, table: str) -> bool:
        return table in self._entries

    def schema(self, table: str, spelled: Callable[[str], str]) -> dict[str, Any]:
        """The schema of one table, its texts spelled as its file has them."""
        fields = [self._field(entry, spelled) for entry in self._entries[table]]
        key = [spelled(name) for name in row_key(self._design, table, self._study)]
        return {
            "fields": fields,
            **({"primaryKey": key} if key else {}),
            "missingValues": [""],
        }

    def _field(self, entry: CodebookEntry, spelled: Callable[[str], str]) -> dict[str, Any]:
        """One column."""
        column = entry.column
        limits: dict[str, Any] = {} if column.nullable else {"required": True}
        limits |= _range_of(entry)
        field: dict[str, Any] = {
            "name": spelled(column.name),
            "type": _TYPES[column.type],
            "description": _described(entry),
        }
        if column.levels:
            limits["enum"] = [spelled(level) for level in column.levels]
            labels = self._labels.get(column.name, {})
            field["categories"] = _categories(column.levels, labels, spelled)
            field["categoriesOrdered"] = False
        return field | ({"constraints": limits} if limits else {})


def _range_of(entry: CodebookEntry) -> dict[str, int]:
    """Between what the values of a column must lie."""
    column = entry.column
    if column.type == "flag" or column.unit == "share":
        return {"minimum": 0, "maximum": 1}
    # Times of onset may be negative: where a log begins to count is its own affair.
    if column.unit == "count" or (column.unit == "ms" and column.name != "onset_ms"):
        return {"minimum": 0}
    return {}


def _categories(
    levels: Sequence[str], labels: Mapping[str, str], spelled: Callable[[str], str]
) -> list[str] | list[dict[str, str]]:
    """Levels in order, with what each means where that is known of all."""
    if all(level in labels for level in levels):
        return [{"value": spelled(level), "label": labels[level]} for level in levels]
    return [spelled(level) for level in levels]


def _described(entry: CodebookEntry) -> str:
    """What a column is, in its unit, and when a cell of it is empty."""
    column = entry.column
    unit = f" ({column.unit})" if column.unit and column.type != "flag" else ""
    parts = [f"{column.meaning.rstrip('.')}{unit}."]
    if entry.when_missing:
        parts.append(f"Empty: {entry.when_missing.rstrip('.')}.")
    if entry.source:
        parts.append(f"Source: {entry.source.rstrip('.')}.")
    return " ".join(parts)


def _resource(folder: Path, name: str, tables: _Tables) -> dict[str, Any]:
    """One file."""
    stem, _, ending = name.rpartition(".")
    ending = ending.lower()
    is_table = stem in tables and ending in ("csv", "parquet")
    resource: dict[str, Any] = {
        # A table in both formats is two resources, and names are unique.
        "name": stem if is_table and ending == "csv" else name.lower(),
        "path": name,
        "description": _MEANINGS.get(name, ""),
        "format": _FORMATS.get(ending, ending),
        "mediatype": _MEDIA_TYPES.get(ending, "application/octet-stream"),
    }
    if is_table:
        resource["description"] = f"One row is {ROWS[stem]}."
    if not resource["description"]:
        del resource["description"]
    if ending != "parquet":
        resource["encoding"] = "utf-8"
    if name not in _WITHOUT_DIGEST:
        resource |= _digest(folder / name)
    if is_table and ending == "csv":
        resource |= {"type": "table", "profile": "tabular-data-resource", "dialect": _DIALECT}
        resource["schema"] = tables.schema(stem, safe)
    elif is_table:
        resource["schema"] = tables.schema(stem, str)
    return resource


def _digest(path: Path) -> Mapping[str, Any]:
    """Size and digest of a file."""
    with path.open("rb") as file:
        digest = hashlib.file_digest(file, "sha256").hexdigest()
    return {"bytes": path.stat().st_size, "hash": f"sha256:{digest}"}


def _slug(title: str) -> str:
    """A title in the letters that names of packages have in both versions of the standard.

    >>> _slug("Notes about a café: Part 2")
    'notes-about-a-cafe-part-2'
    """
    plain = unicodedata.normalize("NFKD", title).encode("ascii", "ignore").decode("ascii")
    return re.sub(r"[^a-z0-9]+", "-", plain.lower()).strip("-")
