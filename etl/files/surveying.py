"""What must be known of a whole file before its blocks are read."""

from __future__ import annotations

import codecs
import gzip
import zlib
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import BinaryIO, Final

from etl.errors import Findings
from etl.files.blocks import MARK, Block, Survey, digest_of, raw_blocks
from etl.files.decoding import is_text
from etl.files.pieces import (
    HashedFile,
    WholeNeededError,
    begun_with,
    cut_at_line_ends,
    decoded_wide,
    first_of,
    unpacked,
)
from etl.files.steady import Sight, steady
from etl.files.text_encodings import PROBE_BYTES, EncodingSigns, encoding_of_prefix
from etl.files.text_faults import (
    REVERSED_MARK,
    is_contradicted,
    is_misnamed,
    plain_name,
    tell_damaged,
    tell_undecodable,
    tell_unreadable,
    tell_zero,
    warn_of_utf8,
    with_plain_line_ends,
)

#: How many bytes of text a block has, and how many a file that is read in blocks. A block of rows
#: takes five times its size while it is read, and twenty times where its cells stand in quotes.
BLOCK_BYTES: Final = 16 * 1024 * 1024
BIG_BYTES: Final = 32 * 1024 * 1024
#: How many times smaller than its text a gzipped file may be: the usual log, three to six times.
_MOST_PACKED: Final = 8
_GZIP: Final = b"\x1f\x8b"
#: How the names of encodings begin in which a line end is one byte that stands for nothing else.
_NARROW: Final = ("utf-8", "ascii", "cp125", "iso8859", "koi8", "mac-", "latin")


def may_be_big(path: Path, big_bytes: int = BIG_BYTES) -> bool:
    """Whether a file may hold so much text that it should be read in blocks.

    Parameters
    ----------
    path : Path
        The file.
    big_bytes : int
        How much that is.

    Returns
    -------
    bool
        By its size on the disk; a file that cannot be looked at is not big.
    """
    try:
        size = path.stat().st_size
        if size >= big_bytes:
            return True
        if size < big_bytes // _MOST_PACKED:
            return False
        with path.open("rb") as file:
            return file.read(len(_GZIP)) == _GZIP
    except OSError:
        return False


def survey(
    path: Path,
    shown: str,
    findings: Findings,
    *,
    encoding: str | None = None,
    block_bytes: int = BLOCK_BYTES,
) -> Survey | None:
    """Find out what must be known of a whole text file before its blocks are read.

    Parameters
    ----------
    path : Path
        The file, plain or gzipped.
    shown : str
        Its name for messages.
    findings : Findings
        Where it is recorded why the file is no text.
    encoding : str, optional
        As for :func:`etl.files.read_text`.
    block_bytes : int
        How long blocks are at least, but for the last.

    Returns
    -------
    Survey or None
        None where a problem was recorded.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole file.
    """
    try:
        with steady(path) as (file, sight):
            surveyor = _Surveyor(path, shown, sight, findings, encoding)
            return surveyor.survey(file, block_bytes)
    except OSError as why:  # damaged gzip files are told apart before
        tell_unreadable(path, shown, why, findings)
        return None


@dataclass(slots=True)
class _Surveyor:
    """Goes through a file once."""

    path: Path
    shown: str
    sight: Sight
    findings: Findings
    stated: str | None
    blocks: list[Block] = field(default_factory=list)
    lines: int = 0
    content: bool = False
    zero: int | None = None
    marked: bool = False
    ends_open: bool = False

    def survey(self, file: BinaryIO, block_bytes: int) -> Survey | None:
        """Look at all blocks and judge what was seen."""
        source = HashedFile(file)
        packed = source.begins_with(_GZIP)
        if not packed and self.sight.size and is_misnamed(self.shown, self.findings):
            return None
        chunks = unpacked(source, packed=packed)
        try:
            prefix = b"".join(first_of(chunks, PROBE_BYTES))
            if not is_text(prefix + b"?", self.shown, Findings()):
                raise WholeNeededError
            encoding = self.stated or encoding_of_prefix(prefix)
            if self.stated and is_contradicted(prefix, self.stated, self.shown, Findings()):
                raise WholeNeededError
            wide = encoding is not None and not _is_narrow(encoding)
            every: Iterator[bytes] = begun_with(prefix, chunks)
            signs = EncodingSigns()
            for raw in cut_at_line_ends(
                decoded_wide(every, encoding) if wide else every, block_bytes
            ):
                if not wide and not raw.isascii():
                    signs.add(raw)
                self._add(raw)
            digest = source.finish()
        except (EOFError, gzip.BadGzipFile, zlib.error) as why:
            tell_damaged(why, self.shown, self.findings)
            return None
        if not self.content:
            raise WholeNeededError
        found = encoding or ("utf-8" if signs.is_utf8 else "cp1252")
        if encoding is None and found == "cp1252" and signs.mixes():
            raise WholeNeededError
        made = Survey(
            self.path,
            self.shown,
            self.sight,
            digest,
            found,
            packed,
            wide,
            tuple(self.blocks),
            self.ends_open,
            self.marked,
        )
        if not wide and not self._can_be_decoded(made, signs):
            return None
        if self.zero is not None:
            tell_zero(self.zero, self.shown, self.findings)
            return None
        if self.stated and not wide and signs.some and signs.is_utf8 and not _is_utf(found):
            warn_of_utf8(self.stated, self.shown, self.findings)
        return made

    def _add(self, raw: bytes) -> None:
        """Look at one block."""
        start = self.blocks[-1].stop if self.blocks else 0
        first = self.lines + 1
        ends = raw.count(b"\n")
        if b"\r" in raw:
            ends += raw.count(b"\r") - raw.count(b"\r\n")
        self.ends_open = not raw.endswith((b"\n", b"\r"))
        height = ends + self.ends_open
        self.lines += height
        self.blocks.append(Block(start, start + len(raw), first, height, digest_of(raw)))
        if not self.content:
            self.content = bool(raw.strip(b"\xef\xbb\xbf\xff\xfe\x00 \t\r\n"))
        if self.zero is None and b"\x00" in raw:
            before = with_plain_line_ends(raw[: raw.index(b"\x00")])
            self.zero = first + before.count(b"\n")
        own = raw.removeprefix(MARK) if start == 0 else raw
        self.marked = self.marked or MARK in own

    def _can_be_decoded(self, made: Survey, signs: EncodingSigns) -> bool:
        """Whether the text is valid in its encoding; says where it is not."""
        utf8 = plain_name(made.encoding) in ("utf8", "utf8sig")
        if not signs.some or (utf8 and signs.is_utf8):
            return True
        for block, raw in raw_blocks(made):
            try:
                if REVERSED_MARK in raw.decode(made.encoding):
                    raise WholeNeededError
            except UnicodeDecodeError as why:
                own = Findings()
                stated = self.stated is not None
                tell_undecodable(why, made.encoding, self.shown, own, stated=stated)
                for finding in own:
                    line = None if finding.line is None else finding.line + block.first - 1
                    self.findings.add(replace(finding, line=line))
                return False
        return True


def _is_narrow(encoding: str) -> bool:
    """Whether line ends are single bytes in an encoding, which occur in nothing else."""
    try:
        return codecs.lookup(encoding).name.startswith(_NARROW)
    except LookupError:
        raise WholeNeededError from None


def _is_utf(encoding: str) -> bool:
    return codecs.lookup(encoding).name.startswith("utf")
