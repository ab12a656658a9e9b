"""Bytes into text: encodings, byte-order marks, line ends, compression."""

import codecs
import gzip
import hashlib
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import read_text
from tests.files.reading import text_of

TEXT = "reader\tsatz\nP01\tDie Bäume blühen, fünf zählte er.\nP02\tà côté\n"
#: Bytes for each way in which a lab's file may be written, with Python's own codecs.
WRITTEN = {
    "UTF-8": (TEXT.encode("utf-8"), "utf-8"),
    "UTF-8 with mark": (codecs.BOM_UTF8 + TEXT.encode("utf-8"), "utf-8-sig"),
    "UTF-16 LE": (TEXT.encode("utf-16-le"), "utf-16-le"),
    "UTF-16 BE": (TEXT.encode("utf-16-be"), "utf-16-be"),
    "UTF-16 LE with mark": (codecs.BOM_UTF16_LE + TEXT.encode("utf-16-le"), "utf-16"),
    "UTF-16 BE with mark": (codecs.BOM_UTF16_BE + TEXT.encode("utf-16-be"), "utf-16"),
    "UTF-32 LE with mark": (codecs.BOM_UTF32_LE + TEXT.encode("utf-32-le"), "utf-32"),
    "UTF-32 BE with mark": (codecs.BOM_UTF32_BE + TEXT.encode("utf-32-be"), "utf-32"),
    "UTF-32 LE": (TEXT.encode("utf-32-le"), "utf-32-le"),
    "UTF-32 BE": (TEXT.encode("utf-32-be"), "utf-32-be"),
    "Windows-1252": (TEXT.encode("cp1252"), "cp1252"),
}
#: Letters of several scripts, without the signs that are line ends or no characters.
WRITING = st.text(
    st.characters(
        exclude_categories=("Cs", "Cc", "Cn"), exclude_characters="\ufeff", max_codepoint=0xFFFF
    ),
    min_size=1,
)


@pytest.mark.parametrize("name", WRITTEN)
def test_encoding_is_found_out(tmp_path: Path, name: str) -> None:
    """Text in any usual encoding is read without being told which."""
    content, encoding = WRITTEN[name]
    text = text_of(tmp_path / "log.tsv", content)
    assert text.data.decode("utf-8") == TEXT
    assert text.encoding == encoding


@pytest.mark.parametrize(
    "encoding",
    [
        *("utf-8", "UTF_8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "utf-32"),
        *("utf-32-le", "utf-32-be", "cp1252", "windows-1252", "latin-1", "iso8859-15", "cp850"),
    ],
)
def test_stated_encoding_is_used(tmp_path: Path, encoding: str) -> None:
    """A stated encoding reads what Python's codec of that name wrote."""
    text = text_of(tmp_path / "log.tsv", TEXT.encode(encoding), encoding)
    assert text.data.decode("utf-8") == TEXT


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(WRITING, st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "utf-16-be", "utf-32"]))
def test_any_writing_is_read_as_written(tmp_path: Path, writing: str, encoding: str) -> None:
    """Whatever is written in a stated encoding is read back letter by letter."""
    line = "reader " + writing
    text = text_of(tmp_path / "log.tsv", line.encode(encoding), encoding)
    assert text.data.decode("utf-8") == line


def test_letter_with_a_low_zero_byte_in_utf16(tmp_path: Path) -> None:
    """A letter whose zero byte is on the other side (U+0100) does not hide UTF-16."""
    written = "reader\titem\nP01\tĀbols un bumbieris\n"
    text = text_of(tmp_path / "log.tsv", written.encode("utf-16-le"))
    assert (text.data.decode("utf-8"), text.encoding) == (written, "utf-16-le")


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"], ids=["LF", "CRLF", "CR"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-16", "utf-32-be", "cp1252"])
def test_line_ends_become_line_feeds(tmp_path: Path, end: str, encoding: str) -> None:
    """The line ends of any operating system are read alike."""
    content = TEXT.replace("\n", end).encode(encoding)
    assert text_of(tmp_path / "log.tsv", content).data.decode("utf-8") == TEXT


def test_mixed_line_ends_are_read_alike(tmp_path: Path) -> None:
    """A file put together on two computers has line ends of both."""
    content = b"reader\r\nP01\nP02\r\nP03\rP04"
    assert text_of(tmp_path / "log.tsv", content).data == b"reader\nP01\nP02\nP03\nP04"


def test_gzip_is_read_as_it_is(tmp_path: Path) -> None:
    """A compressed file gives the same text; its digest is that of the file on the disk."""
    packed = gzip.compress(TEXT.encode("utf-8"))
    text = text_of(tmp_path / "log.tsv.gz", packed)
    assert text.data.decode("utf-8") == TEXT
    assert text.sha256 == hashlib.sha256(packed).hexdigest()


def test_gzip_without_its_name_is_read(tmp_path: Path) -> None:
    """What is compressed is known by its bytes, not by its name."""
    content = gzip.compress(TEXT.encode("utf-16"))
    assert text_of(tmp_path / "log.tsv", content).data.decode("utf-8") == TEXT


def test_windows_1252_is_said(tmp_path: Path) -> None:
    """A guess that can spoil letters is a warning."""
    (tmp_path / "log.tsv").write_bytes(TEXT.encode("cp1252"))
    findings = Findings()
    read_text(tmp_path / "log.tsv", "log.tsv", findings)
    assert findings.text() == (
        "warning: log.tsv: the text is not UTF-8 and was read as Windows-1252\n"
        "    fix: check the letters with accents, and save the file as UTF-8"
    )


def test_windows_1252_is_not_said_where_it_is_told_elsewhere(tmp_path: Path) -> None:
    """Of logs it is told once for all; the encoding of each says that it was found out."""
    (tmp_path / "log.tsv").write_bytes(TEXT.encode("cp1252"))
    findings = Findings()
    text = read_text(tmp_path / "log.tsv", "log.tsv", findings, tell_guess=False)
    assert text is not None
    assert (text.encoding, findings.items) == ("cp1252", [])


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"], ids=["LF", "CRLF", "CR"])
@pytest.mark.parametrize("mark", [b"", codecs.BOM_UTF8], ids=["no mark", "mark"])
def test_wrong_byte_is_named_with_its_line(tmp_path: Path, end: str, mark: bytes) -> None:
    """The first byte that is no text is named, whatever the line ends and marks before it."""
    lines = ["reader", "P01", "P02"]
    content = mark + end.join(lines).encode("utf-8") + b"\xe4bc" + end.encode("utf-8")
    (tmp_path / "log.tsv").write_bytes(content)
    findings = Findings()
    assert read_text(tmp_path / "log.tsv", "log.tsv", findings, encoding="utf-8") is None
    assert findings.items[0].line == 3
    assert findings.items[0].found == "byte 0xe4"


def test_odd_byte_in_utf16_is_named(tmp_path: Path) -> None:
    """UTF-16 that ends in half a character is refused."""
    (tmp_path / "log.tsv").write_bytes(TEXT.encode("utf-16") + b"x")
    findings = Findings()
    assert read_text(tmp_path / "log.tsv", "log.tsv", findings) is None
    assert findings.text() == (
        'log.tsv:4: the text is not valid utf-16; found "byte 0x78"\n'
        "    fix: save the file as UTF-8, or, if it is a log, state its encoding in [logs] "
        "encoding\n"
        "1 problem; nothing was written"
    )


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.binary(max_size=300))
def test_no_bytes_end_in_a_fault(tmp_path: Path, content: bytes) -> None:
    """Any bytes are read, or refused with a reason."""
    (tmp_path / "log.tsv").write_bytes(content)
    findings = Findings()
    text = read_text(tmp_path / "log.tsv", "log.tsv", findings)
    assert (text is None) == findings.failed
