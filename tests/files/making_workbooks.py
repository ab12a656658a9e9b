"""Workbooks written cell by cell, changed part by part, and read back, for the tests of reading."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path

from openpyxl import Workbook
from openpyxl.worksheet.worksheet import Worksheet

from etl.errors import Findings
from etl.files import Cells, read_table

SHEET = "xl/worksheets/sheet1.xml"
WORKBOOK_RELATIONS = "xl/_rels/workbook.xml.rels"
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
TEXTS_RELATION = (
    '<Relationship Id="rId99" Target="sharedStrings.xml" Type="http://schemas.openxmlformats.org/'
    'officeDocument/2006/relationships/sharedStrings"/>'
)
_TEXTS_CONTENT = (
    '<Override PartName="/xl/sharedStrings.xml" ContentType="application/vnd.openxmlformats-'
    'officedocument.spreadsheetml.sharedStrings+xml"/>'
)
Change = Callable[[Worksheet], object]


def workbook_of(
    path: Path,
    rows: Iterable[Sequence[object]],
    formats: Mapping[str, str] | None = None,
    change: Change | None = None,
) -> Path:
    """Save a workbook with one sheet, Trials; ``formats`` by cell; ``change`` is made last."""
    book = Workbook()
    sheet = book.active
    assert isinstance(sheet, Worksheet)
    sheet.title = "Trials"
    for row in rows:
        sheet.append(list(row))
    for place, code in (formats or {}).items():
        sheet[place].number_format = code
    if change is not None:
        change(sheet)
    book.save(path)
    book.close()
    return path


def parts_of(path: Path) -> dict[str, bytes]:
    """The parts of a workbook's archive by name."""
    with zipfile.ZipFile(path) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def save_parts(path: Path, parts: Mapping[str, bytes]) -> None:
    """Save a workbook that has these parts."""
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in parts.items():
            archive.writestr(name, data)


def replace_in(path: Path, part: str, old: str, new: str) -> None:
    """Change text in one part of a workbook; the text must be there once."""
    parts = parts_of(path)
    text = parts[part].decode("utf-8")
    assert text.count(old) == 1, text
    parts[part] = text.replace(old, new).encode("utf-8")
    save_parts(path, parts)


def share_texts(path: Path) -> Path:
    """Move the texts of the first sheet into a list, as spreadsheet programs save them."""
    parts = parts_of(path)
    texts: list[str] = []

    def listed(cell: re.Match[str]) -> str:
        texts.append(cell["text"])
        return f'{cell["head"]} t="s"><v>{len(texts) - 1}</v></c>'

    sheet = parts[SHEET].decode("utf-8")
    inline = r'(?P<head><c r="[A-Z]+\d+"(?: s="\d+")?) t="inlineStr"><is>(?P<text>.*?)</is></c>'
    parts[SHEET] = re.sub(inline, listed, sheet, flags=re.DOTALL).encode("utf-8")
    items = "".join(f"<si>{text}</si>" for text in texts)
    parts["xl/sharedStrings.xml"] = f'<sst xmlns="{_MAIN}">{items}</sst>'.encode()
    save_parts(path, parts)
    replace_in(path, WORKBOOK_RELATIONS, "</Relationships>", f"{TEXTS_RELATION}</Relationships>")
    replace_in(path, "[Content_Types].xml", "</Types>", f"{_TEXTS_CONTENT}</Types>")
    return path


def read(path: Path, sheet: str | None = None) -> tuple[Cells | None, Findings]:
    """What is made of a workbook, and what is said of it."""
    findings = Findings()
    named = path.name if sheet is None else f"{path.name}#{sheet}"
    return read_table(path.with_name(named), named, findings), findings


def sound(path: Path, sheet: str | None = None) -> dict[str, list[str]]:
    """The columns of a workbook of which nothing at all is said."""
    cells, findings = read(path, sheet)
    assert findings.lines() == []
    assert cells is not None
    return cells.table.to_pydict()


def told(path: Path, sheet: str | None = None) -> str:
    """What is said of a workbook that is read all the same."""
    cells, findings = read(path, sheet)
    assert cells is not None, findings.text()
    return "\n".join(findings.lines())


def refused(path: Path, sheet: str | None = None) -> str:
    """What is said of a workbook that is not read."""
    cells, findings = read(path, sheet)
    assert cells is None
    assert findings.failed
    return findings.text()
