"""Files that were put together: headers among the rows, byte-order marks within the text."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of, header_of, read_text

NEEDED = ("reader", "trial", "dur")
HEADER = "reader\ttrial\tdur\tspare\n"
ROW = "P01\t1\t200\tx\n"
MARK = "\ufeff"


def read(content: str, needed: tuple[str, ...] = NEEDED) -> tuple[Cells | None, Findings]:
    """The cells of a log, and all that was found."""
    findings = Findings()
    text = RawText("log.tsv", content.encode("utf-8"), "", "utf-8")
    return cells_of(text, findings, needed=needed, wary=True), findings


@pytest.mark.parametrize(
    "again",
    [
        HEADER,
        " reader\ttrial \tdur\tspare\n",
        '"reader"\t"trial"\t"dur"\t"spare"\n',
        MARK + HEADER,
        MARK * 2 + HEADER,
        MARK + '"reader"\t"trial"\t"dur"\t"spare"\n',
    ],
    ids=[
        "the same",
        "with blanks",
        "with quotes",
        "with a mark",
        "with two marks",
        "with a mark and quotes",
    ],
)
@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_repeated_header_is_left_out(again: str, quote: str) -> None:
    """A row that is the header is no row, and is counted."""
    row = ROW.replace("x", f"{quote}x{quote}")
    cells, findings = read(HEADER + row + again + again + row)
    assert cells is not None, findings.text()
    assert cells.column("dur").to_pylist() == ["200", "200"]
    assert cells.lines.tolist() == [2, 5]
    tally = cells.account.lines["repeated headers"]
    assert (tally.count, tally.first_line) == (2, 3)


def test_repeated_header_with_decomposed_letters() -> None:
    """Equal letters are equal, whichever way they are stored."""
    cells, findings = read(
        "lecteur\tdur\u00e9e\nP01\t200\nlecteur\tdure\u0301e\nP02\t210\n", ("lecteur", "durée")
    )
    assert cells is not None, findings.text()
    assert cells.column("durée").to_pylist() == ["200", "210"]


@pytest.mark.parametrize(
    "other",
    [
        "trial\treader\tdur\tspare\n",
        "dur\tspare\treader\ttrial\n",
        "reader\ttrial\tdur_ms\tspare\n",
        "reader\ttrial\tdur\tother\n",
        "reader\tspare\tms\ttime\n",
    ],
    ids=["two swapped", "all moved", "one name new", "a spare name new", "two names known"],
)
@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_other_header_is_an_error(other: str, quote: str) -> None:
    """A second table in the same file is never read under the first one's header."""
    row = ROW.replace("x", f"{quote}x{quote}")
    cells, findings = read(HEADER + row + other + row)
    assert cells is None
    assert findings.text() == (
        "log.tsv:3: a second header differs from the first; found "
        f'"{other.strip().replace(chr(9), ", ")}", expected the header of line 1 again, or rows\n'
        "    fix: these are two tables in one file: give each a file of its own\n"
        "1 problem; nothing was written"
    )


def test_words_that_are_names_of_columns() -> None:
    """A row with numbers is a row, also where words of a text are names of columns."""
    content = "reader\ttrial\tword\tlabel\tdur\nP01\t1\ttrial\tword\t200\nword\t1\tdur\tdur\t1\n"
    cells, findings = read(content, ("reader", "trial", "word", "label", "dur"))
    assert cells is not None, findings.text()
    assert len(cells) == 2


def test_fact_tables_may_hold_names() -> None:
    """In a table of words, a row may be like the header."""
    findings = Findings()
    text = RawText("items.csv", b"item,word\nitem,word\n", "", "utf-8")
    cells = cells_of(text, findings)
    assert cells is not None, findings.text()
    assert len(cells) == 1


def test_marks_are_counted_as_repairs() -> None:
    """A mark before a repeated header or a remark is where another file begins."""
    content = f"{MARK}{HEADER}{ROW}{MARK}# of June\n{HEADER}{ROW}{MARK}{HEADER}{ROW}"
    cells, findings = read(content)
    assert cells is not None, findings.text()
    repair = cells.account.repairs["byte-order marks within the file"]
    assert (repair.count, repair.first_line) == (3, 1)
    assert cells.column("reader").to_pylist() == ["P01"] * 3


@pytest.mark.parametrize(
    "row",
    [
        MARK + ROW,
        ROW.replace("1", MARK + "1", 1),
        ROW.replace("\n", MARK + "\n"),
        HEADER.replace("trial", MARK + "trial"),
    ],
    ids=["before a row", "in a cell", "at a line's end", "within a header"],
)
def test_other_marks_are_errors(row: str) -> None:
    """A mark that begins no file is not understood."""
    cells, findings = read(HEADER + ROW + row)
    assert cells is None
    assert findings.text() == (
        "log.tsv:3: a byte-order mark stands in the middle of the file; expected one at the file's "
        "beginning, or before a header that is repeated\n"
        "    fix: remove the mark; if files were put together, give each a file of its own\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16"])
def test_whole_files_put_together(tmp_path: Path, encoding: str) -> None:
    """Two files as they are, one behind the other, are read as one."""
    path = tmp_path / "log.tsv"
    path.write_bytes((HEADER + ROW).encode(encoding) * 2)
    findings = Findings()
    text = read_text(path, path.name, findings)
    assert text is not None, findings.text()
    assert header_of(text, needed=NEEDED) == ("reader", "trial", "dur", "spare")
    cells = cells_of(text, findings, needed=NEEDED, wary=True)
    assert cells is not None, findings.text()
    assert cells.column("reader").to_pylist() == ["P01", "P01"]


def test_files_of_two_byte_orders_put_together(tmp_path: Path) -> None:
    """A mark the wrong way round shows that what follows cannot be read."""
    path = tmp_path / "log.tsv"
    one = (HEADER + ROW).encode("utf-16-le")
    other = (HEADER + ROW).encode("utf-16-be")
    path.write_bytes(b"\xff\xfe" + one + b"\xfe\xff" + other)
    findings = Findings()
    assert read_text(path, path.name, findings) is None
    assert findings.text() == (
        "log.tsv:3: bytes of two orders stand in one file; expected one byte order in the whole "
        "file\n"
        "    fix: save every part as UTF-8 before they are put together\n"
        "1 problem; nothing was written"
    )
