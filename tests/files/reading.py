"""Files written byte for byte and read back, for the tests of reading."""

from __future__ import annotations

from pathlib import Path

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of, read_text


def text_of(path: Path, content: bytes, encoding: str | None = None) -> RawText:
    """The text of a file that has these bytes and nothing wrong."""
    path.write_bytes(content)
    findings = Findings()
    text = read_text(path, path.name, findings, encoding=encoding)
    assert text is not None, findings.text()
    return text


def cells_in(content: str, delimiter: str | None = None) -> Cells:
    """The cells of a text with nothing wrong."""
    findings = Findings()
    text = RawText("log.tsv", content.encode("utf-8"), "", "utf-8")
    cells = cells_of(text, findings, delimiter=delimiter)
    assert cells is not None, findings.text()
    return cells


def rows_in(cells: Cells) -> list[tuple[str, ...]]:
    """The rows of cells, a text a cell."""
    columns = [cells.column(name).to_pylist() for name in cells.header]
    return list(zip(*columns, strict=True))


def problems_in(content: str) -> str:
    """What is said of a text that cannot be split into cells."""
    findings = Findings()
    assert cells_of(RawText("log.tsv", content.encode("utf-8"), "", "utf-8"), findings) is None
    return findings.text()
