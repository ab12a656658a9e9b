"""The text of a file in blocks is the text of the file, wherever it is cut."""

from __future__ import annotations

import gzip
import os
from collections.abc import Callable
from itertools import pairwise
from pathlib import Path
from typing import Any, BinaryIO

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import read_text
from etl.files.blocks import Survey, text_at, texts
from etl.files.pieces import WholeNeededError, cut_at_line_ends
from etl.files.steady import ChangedError, Sight
from etl.files.surveying import survey

Change = Callable[[Path], None]
Read = Callable[..., Any]

#: Texts of what matters: line ends of all kinds, letters, quotes, marks, zeros.
TEXTS = st.lists(
    st.sampled_from(
        ["a", "bb;c", '"', "\n", "\r\n", "\r", "\n\n", "é", "ß–", "\ufeff", "\u0100", "Я", "\x00"]
    ),
    max_size=40,
).map("".join)
ENCODINGS = ["utf-8", "utf-8-sig", "cp1252", "utf-16", "utf-16-le", "utf-16-be", "utf-32", "koi8-r"]


def surveyed(path: Path, findings: Findings, encoding: str | None, size: int) -> Survey | None:
    """The survey of a file in small blocks."""
    return survey(path, path.name, findings, encoding=encoding, block_bytes=size)


@given(
    text=TEXTS,
    written=st.sampled_from(ENCODINGS),
    spoiled=st.binary(max_size=2),
    stated=st.sampled_from([None, None, "utf-8", "cp1252", "utf-16", "latin-1", "no such"]),
    size=st.integers(1, 30),
    packed=st.booleans(),
)
def test_blocks_are_the_text(
    tmp_path_factory: pytest.TempPathFactory,
    text: str,
    written: str,
    spoiled: bytes,
    stated: str | None,
    size: int,
    packed: bool,
) -> None:
    """Whatever is in the file: the same text, or the same complaint, or it must be read whole."""
    stored = text.encode(written, "ignore") + spoiled
    path = tmp_path_factory.getbasetemp() / ("log.txt.gz" if packed else "log.txt")
    path.write_bytes(gzip.compress(stored) if packed else stored)
    whole, own = Findings(), Findings()
    expected = read_text(path, path.name, whole, encoding=stated, tell_guess=False)
    try:
        made = surveyed(path, own, stated, size)
    except WholeNeededError:
        return
    assert own.text() == whole.text()
    assert (made is None) == (expected is None)
    if made is None or expected is None:
        return
    assert (made.sha256, made.encoding) == (expected.sha256, expected.encoding)
    parts = list(texts(made))
    assert b"".join(part for _, part in parts) == expected.data
    assert made.ends_open == (not expected.data.endswith(b"\n"))
    line = 1
    for place, (block, part) in enumerate(parts):
        assert block.first == line
        line += block.height
        if place + 1 < len(parts):
            assert part.endswith(b"\n")
            assert part.count(b"\n") == block.height
        if made.alone:
            assert text_at(made, place) == part
    assert line - 1 == expected.data.count(b"\n") + made.ends_open


@given(text=TEXTS, size=st.integers(1, 30), chunk=st.integers(1, 9))
def test_cuts_do_not_depend_on_chunks(text: str, size: int, chunk: int) -> None:
    """A block ends with the first line end beyond its length, however the bytes come."""
    stored = text.encode("utf-8")
    chunks = [stored[at : at + chunk] for at in range(0, len(stored), chunk)]
    pieces = list(cut_at_line_ends(chunks, size))
    assert b"".join(pieces) == stored
    assert pieces == list(cut_at_line_ends([stored], size))
    for piece, following in pairwise(pieces):
        assert len(piece) >= size
        assert piece.endswith((b"\n", b"\r"))
        assert not (piece.endswith(b"\r") and following.startswith(b"\n"))
        # No line end stands earlier at which it might have been cut.
        assert len((piece[size - 1 :].replace(b"\r\n", b"\n") + b"x").splitlines()) <= 2


ROWS = b"".join(b"P01\t%d\t200\n" % row for row in range(400))


@pytest.fixture
def log(tmp_path: Path) -> Path:
    """A log of some blocks."""
    path = tmp_path / "log.tsv"
    path.write_bytes(ROWS)
    return path


def appended(path: Path) -> None:
    """More rows are written."""
    with path.open("ab") as file:
        file.write(b"P01\t999\t200\n")


def cut_short(path: Path) -> None:
    """The file loses its end."""
    os.truncate(path, 900)


def rewritten(path: Path) -> None:
    """Other content of the same length."""
    status = path.stat()
    path.write_bytes(ROWS.replace(b"200", b"300"))
    os.utime(path, ns=(status.st_atime_ns, status.st_mtime_ns + 1))


def rewritten_with_old_time(path: Path) -> None:
    """Other content of the same length, and a clock set back: only the digest tells."""
    status = path.stat()
    path.write_bytes(ROWS.replace(b"200", b"300"))
    os.utime(path, ns=(status.st_atime_ns, status.st_mtime_ns))


def replaced(path: Path) -> None:
    """Another file of the same size takes its name."""
    other = path.with_name("other")
    other.write_bytes(ROWS.replace(b"200", b"300"))
    other.replace(path)


CHANGES = [appended, cut_short, rewritten, rewritten_with_old_time, replaced]


@pytest.mark.parametrize("change", CHANGES)
@pytest.mark.parametrize("packed", [False, True])
def test_change_between_two_blocks_is_noticed(change: Change, packed: bool, tmp_path: Path) -> None:
    """A log that is not the surveyed one any more is read no further."""
    path = tmp_path / "log.tsv"
    path.write_bytes(gzip.compress(ROWS) if packed else ROWS)
    made = surveyed(path, Findings(), None, 1000)
    assert made is not None
    assert len(made.blocks) > 4
    reading = texts(made)
    next(reading)
    if packed and change is not replaced:
        path.write_bytes(gzip.compress(ROWS.replace(b"200", b"300")))
    else:
        change(path)
    if change is not rewritten_with_old_time:
        # What was taken before the change is what was surveyed.
        with pytest.raises((ChangedError, EOFError)):
            list(reading)
    if made.alone:
        with pytest.raises(ChangedError):
            text_at(made, len(made.blocks) - 1)


@pytest.mark.parametrize("change", [appended, cut_short, rewritten, replaced])
@pytest.mark.parametrize("read", [read_text, survey])
def test_change_during_reading_is_told(
    change: Change, read: Read, log: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A log that changes while its bytes are taken is an error, read whole or surveyed."""
    real = Sight.of
    looks: list[BinaryIO] = []

    def of(file: BinaryIO) -> Sight:
        if looks:  # all bytes were read since the first look
            change(log)
        looks.append(file)
        return real(file)

    monkeypatch.setattr(Sight, "of", of)
    findings = Findings()
    assert read(log, "log.tsv", findings) is None
    assert len(looks) == 2
    assert [finding.problem for finding in findings] == ["the file changed while it was read"]
