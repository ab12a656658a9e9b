"""Files that are no workbook, or a damaged, locked, foreign or oversized one."""

from __future__ import annotations

import io
import random
import zipfile
from pathlib import Path

import pytest

from etl.errors import Findings
from etl.files import read_table
from etl.files.workbook_archive import MOST_BYTES
from tests.files.making_workbooks import (
    SHEET,
    TEXTS_RELATION,
    WORKBOOK_RELATIONS,
    parts_of,
    read,
    refused,
    replace_in,
    save_parts,
    share_texts,
    workbook_of,
)

COMPOUND = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(504)
ROWS: list[list[object]] = [["participant", "trial"], ["P01", 1], ["P02", 2.5], ["P03", "3"]]


def archive(**parts: str) -> bytes:
    """A ZIP archive with some parts; a double underscore in a name stands for a slash."""
    stored = io.BytesIO()
    with zipfile.ZipFile(stored, "w") as out:
        for name, text in parts.items():
            out.writestr(name.replace("__", "/"), text)
    return stored.getvalue()


OPEN_DOCUMENT = archive(mimetype="application/vnd.oasis.opendocument.spreadsheet")


@pytest.mark.parametrize(
    ("content", "problem"),
    [
        (b"", "the file is empty"),
        (b"participant,trial\nP01,1\n", "this is no workbook, though its name ends in .xlsx"),
        (COMPOUND, "this is a workbook of the older format .xls, whatever its name says"),
        (
            COMPOUND + "EncryptedPackage".encode("utf-16-le"),
            "the workbook is protected by a password",
        ),
        (OPEN_DOCUMENT, "this is an OpenDocument file, whatever its name says"),
        (archive(letter="hello"), "the workbook cannot be read: it is damaged"),
        (b"PK\x03\x04 and no more", "the workbook cannot be read: it is damaged"),
    ],
    ids=["empty", "text", "older", "locked", "open_document", "other_archive", "cut"],
)
def test_file_that_is_no_workbook_is_told(tmp_path: Path, content: bytes, problem: str) -> None:
    """What is wrong with it is said, and what to do."""
    path = tmp_path / "lists.xlsx"
    path.write_bytes(content)
    text = refused(path)
    assert text.startswith(f"lists.xlsx: {problem}")
    assert "\n    fix: " in text


def test_workbook_that_is_not_there_is_told_with_its_sheet(tmp_path: Path) -> None:
    """The name is repeated as the study file has it."""
    text = refused(tmp_path / "lists.xlsx", "June")
    assert text.startswith("lists.xlsx#June: there is no such file")


@pytest.mark.parametrize(
    ("name", "fix"),
    [
        ("lists.csv", "rename it to lists.xlsx, here and in the study file"),
        ("lists", "rename it to lists.xlsx, here and in the study file"),
        ("lists.xlsm", "open it in the spreadsheet program and save it as .xlsx"),
    ],
)
def test_workbook_under_another_name_is_told(tmp_path: Path, name: str, fix: str) -> None:
    """Renaming a workbook to .csv makes no text file of it."""
    path = workbook_of(tmp_path / "saved.xlsx", ROWS).rename(tmp_path / name)
    text = refused(path)
    assert f"{name}: this is a spreadsheet workbook; expected delimited text" in text
    assert f"fix: {fix}" in text


@pytest.mark.parametrize(
    ("name", "content", "problem"),
    [
        ("lists.ods", OPEN_DOCUMENT, "this is a spreadsheet workbook in the OpenDocument format"),
        ("lists.xls", COMPOUND, "this is a workbook of the older format .xls, or one protected"),
        ("lists.csv", COMPOUND, "this is a workbook of the older format .xls, or one protected"),
        ("lists.csv", archive(letter="hello"), "this is no text file"),
    ],
    ids=["open_document", "older", "older_as_csv", "archive_as_csv"],
)
def test_workbook_of_another_kind_is_told(
    tmp_path: Path, name: str, content: bytes, problem: str
) -> None:
    """Kinds that are not read are named, with the way out."""
    path = tmp_path / name
    path.write_bytes(content)
    assert refused(path).startswith(f"{name}: {problem}")


def test_text_under_the_name_of_an_older_workbook_is_read(tmp_path: Path) -> None:
    """Many programs write text and call it .xls."""
    path = tmp_path / "lists.xls"
    path.write_bytes(b"participant\ttrial\nP01\t1\n")
    cells, findings = read(path)
    assert findings.lines() == []
    assert cells is not None
    assert cells.texts("participant") == ["P01"]


def test_strict_variant_is_told(tmp_path: Path) -> None:
    """The library would find no sheet in it; saving it anew helps."""
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    replace_in(
        path,
        "xl/workbook.xml",
        "http://schemas.openxmlformats.org/spreadsheetml/2006/main",
        "http://purl.oclc.org/ooxml/spreadsheetml/main",
    )
    text = refused(path)
    assert text.startswith("lists.xlsx: the workbook is saved in the strict variant of its format")


def test_workbook_that_would_fill_the_memory_is_refused(tmp_path: Path) -> None:
    """A small file can unpack to a huge one; its size is known before it is unpacked."""
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    with (
        zipfile.ZipFile(path, "a", zipfile.ZIP_DEFLATED) as out,
        out.open("xl/big.xml", "w") as big,
    ):
        for _ in range(MOST_BYTES // 1_000_000 + 1):
            big.write(bytes(1_000_000))
    assert path.stat().st_size < 1_000_000
    text = refused(path)
    assert text.startswith("lists.xlsx: the workbook is too large to be a table of a study")
    assert "expected at most 100 MB" in text


@pytest.mark.parametrize(
    ("old", "new", "why"),
    [
        ('<row r="3">', '<row r="1">', "row 1 stands after row 2"),
        ('<row r="4">', '<row r="9999999999">', "row 9999999999 stands after row 3"),
        ('<c r="A3"', '<c r="A4"', "cell A4 stands in row 3"),
        ('<c r="B3"', '<c r="A3"', "a cell of row 3 is out of its place"),
        ('<c r="B3"', '<c r="ZZZ3"', "a cell of row 3 is out of its place"),
        ('<c r="B3"', '<c r="3B"', "'3B' is no cell"),
    ],
)
def test_cells_out_of_their_place_are_damage(tmp_path: Path, old: str, new: str, why: str) -> None:
    """Where rows or cells contradict their references, none can be relied on."""
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    replace_in(path, SHEET, old, new)
    text = refused(path)
    assert text.startswith(f'lists.xlsx: the workbook cannot be read: it is damaged; found "{why}"')


@pytest.mark.parametrize("part", ["xl/workbook.xml", SHEET, "xl/styles.xml", "_rels/.rels"])
@pytest.mark.parametrize("kept", [0.0, 0.5], ids=["emptied", "cut"])
def test_part_that_is_cut_short_is_damage(tmp_path: Path, part: str, kept: float) -> None:
    """Whatever part is damaged, it is said."""
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    parts = parts_of(path)
    parts[part] = parts[part][: int(len(parts[part]) * kept)]
    save_parts(path, parts)
    assert refused(path).startswith("lists.xlsx: the workbook cannot be read: it is damaged")


def test_list_of_texts_may_be_left_out_where_there_is_no_text(tmp_path: Path) -> None:
    """Some programs name the part that holds texts, but write it only where there is a text."""
    path = workbook_of(tmp_path / "lists.xlsx", [[1, 2], [3, 4]])
    replace_in(path, WORKBOOK_RELATIONS, "</Relationships>", f"{TEXTS_RELATION}</Relationships>")
    cells, findings = read(path)
    assert findings.lines() == []
    assert cells is not None
    assert cells.table.to_pydict() == {"1": ["3"], "2": ["4"]}


def test_list_of_texts_that_is_lost_is_damage(tmp_path: Path) -> None:
    """Without it, cells of text say nothing."""
    path = share_texts(workbook_of(tmp_path / "lists.xlsx", ROWS))
    parts = parts_of(path)
    del parts["xl/sharedStrings.xml"]
    save_parts(path, parts)
    assert refused(path).startswith("lists.xlsx: the workbook cannot be read: it is damaged")


@pytest.mark.parametrize("seed", range(40))
def test_any_damage_to_the_bytes_is_told_or_changes_nothing(tmp_path: Path, seed: int) -> None:
    """Bytes that are changed, cut off or doubled: a refusal or the same table, never a fault."""
    drawn = random.Random(seed)
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    whole = read_table(path, path.name, Findings())
    assert whole is not None
    stored = bytearray(path.read_bytes())
    at = drawn.randrange(len(stored))
    kind = seed % 3
    if kind == 0:
        stored[at] ^= 1 << drawn.randrange(8)
    elif kind == 1:
        del stored[at:]
    else:
        stored[at:at] = stored[max(0, at - 50) : at]
    path.write_bytes(bytes(stored))
    cells, findings = read(path)
    assert findings.failed if cells is None else cells.table.equals(whole.table)


@pytest.mark.parametrize("seed", range(40))
def test_any_damage_to_the_text_of_a_sheet_is_no_fault(tmp_path: Path, seed: int) -> None:
    """Letters of the sheet's own text that are changed or lost never end in a fault."""
    drawn = random.Random(seed)
    path = workbook_of(tmp_path / "lists.xlsx", ROWS)
    parts = parts_of(path)
    text = bytearray(parts[SHEET])
    at = drawn.randrange(len(text))
    text[at : at + drawn.randrange(1, 9)] = bytes(
        drawn.choices(b'0123456789<>"/rcv =t', k=seed % 4)
    )
    parts[SHEET] = bytes(text)
    save_parts(path, parts)
    cells, findings = read(path)
    assert (cells is None) == findings.failed
