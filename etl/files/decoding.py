"""From a file's bytes to UTF-8 text with plain line ends, whatever the lab's computer wrote."""

from __future__ import annotations

import gzip
import hashlib
import zlib
from dataclasses import dataclass
from pathlib import Path

from etl.errors import Findings
from etl.files.steady import read_steady
from etl.files.text_encodings import encoding_of, mixes_encodings
from etl.files.text_faults import (
    REVERSED_MARK,
    is_contradicted,
    is_misnamed,
    is_utf8_all_the_same,
    plain_name,
    tell_damaged,
    tell_mixture,
    tell_reversed,
    tell_undecodable,
    tell_unreadable,
    tell_zero,
    warn_of_utf8,
    with_plain_line_ends,
)

#: Files that are no text, known by their first bytes (each signature is in the format's own
#: standard: PNG ISO/IEC 15948, JPEG ISO/IEC 10918, GIF89a, TIFF 6.0, PDF ISO 32000, ZIP
#: APPNOTE).
_SIGNATURES = (
    (b"\x89PNG\r\n\x1a\n", "a picture (PNG)"),
    (b"\xff\xd8\xff", "a picture (JPEG)"),
    (b"GIF87a", "a picture (GIF)"),
    (b"GIF89a", "a picture (GIF)"),
    (b"BM", "a picture (BMP)"),
    (b"II*\x00", "a picture (TIFF)"),
    (b"MM\x00*", "a picture (TIFF)"),
    (b"%PDF-", "a PDF document"),
    (b"PK\x03\x04", "a ZIP archive or a spreadsheet workbook"),
    (b"PAR1", "a Parquet file"),
)


@dataclass(frozen=True, slots=True)
class RawText:
    """The text of a file.

    Attributes
    ----------
    shown : str
        The file as the user would name it.
    data : bytes
        The text in UTF-8, without byte-order mark, every line end a line feed.
    sha256 : str
        Digest of the file as it lies on the disk (compressed where it is compressed), in hex.
    encoding : str
        The encoding it was read with.
    """

    shown: str
    data: bytes
    sha256: str
    encoding: str


def read_text(
    path: Path,
    shown: str,
    findings: Findings,
    *,
    encoding: str | None = None,
    tell_guess: bool = True,
) -> RawText | None:
    """Read a text file, plain or gzipped, in its own encoding.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    findings : Findings
        Where problems are recorded.
    encoding : str, optional
        The encoding the study file states. Where it is absent, a byte-order mark decides, then
        the pattern of zero bytes (UTF-16, UTF-32), then whether the bytes are valid UTF-8; what
        is left is read as Windows-1252, unless some of it is UTF-8.
    tell_guess : bool
        Whether it is warned of that a text was read as Windows-1252 for want of anything else. Of
        logs it is told once for all of them, by the encoding of each (``"cp1252"`` where none is
        stated).

    Returns
    -------
    RawText or None
        None where a problem was recorded.

    References
    ----------
    Byte-order marks: The Unicode Standard, section 23.8.
    """
    try:
        stored = read_steady(path)
    except OSError as why:
        tell_unreadable(path, shown, why, findings)
        return None
    data = _unpacked(stored, shown, findings)
    if data is None:
        return None
    digest = hashlib.sha256(stored).hexdigest()
    return text_of(data, shown, findings, encoding=encoding, digest=digest, tell_guess=tell_guess)


def text_of(
    data: bytes,
    shown: str,
    findings: Findings,
    *,
    encoding: str | None = None,
    digest: str = "",
    tell_guess: bool = True,
) -> RawText | None:
    """Bytes into text, by the encoding that is stated or that they suggest themselves.

    Parameters
    ----------
    data : bytes
        The bytes, not compressed.
    shown : str
        The file's name for messages.
    findings : Findings
        Where problems are recorded.
    encoding : str, optional
        As in :func:`read_text`.
    digest : str, optional
        Digest of the file that the bytes are from.
    tell_guess : bool
        As in :func:`read_text`.

    Returns
    -------
    RawText or None
        None where a problem was recorded.
    """
    if not is_text(data, shown, findings):
        return None
    if encoding is not None and is_contradicted(data, encoding, shown, findings):
        return None
    found = encoding or encoding_of(data)
    if encoding is None and found == "cp1252" and mixes_encodings(data):
        tell_mixture(data, shown, findings)
        return None
    text = _decoded(data, found, shown, findings, stated=encoding is not None)
    if text is None:
        return None
    if tell_guess and encoding is None and found == "cp1252":
        findings.warning(
            "the text is not UTF-8 and was read as Windows-1252",
            path=shown,
            fix="check the letters with accents, and save the file as UTF-8",
        )
    return RawText(shown, text, digest, found)


def _unpacked(stored: bytes, shown: str, findings: Findings) -> bytes | None:
    """The bytes inside a gzip file, or the bytes as they are."""
    if not stored.startswith(b"\x1f\x8b"):
        return None if stored and is_misnamed(shown, findings) else stored
    try:
        return gzip.decompress(stored)
    except (EOFError, gzip.BadGzipFile, zlib.error) as why:
        tell_damaged(why, shown, findings)
        return None


def is_text(data: bytes, shown: str, findings: Findings) -> bool:
    """Whether the bytes can be text at all."""
    if not data.strip(b"\xef\xbb\xbf\xff\xfe\x00 \t\r\n"):
        lost = data.count(0) > len(data) // 2 + 1
        findings.error(
            "the file holds nothing but zero bytes" if lost else "the file is empty",
            path=shown,
            fix="copy it again from where it was recorded"
            if lost
            else "remove it from the folder, or copy it again",
        )
        return False
    for signature, what in _SIGNATURES:
        if data.startswith(signature) and (len(signature) > 2 or b"\x00" in data[:64]):
            findings.error(
                f"this is no text file: it begins like {what}",
                path=shown,
                expected="delimited text",
                fix="export the table as text; or name another file, or another pattern, in the "
                "study file",
            )
            return False
    return True


def _decoded(
    data: bytes, encoding: str, shown: str, findings: Findings, *, stated: bool
) -> bytes | None:
    """The text in UTF-8 with plain line ends."""
    try:
        if plain_name(encoding) in ("utf8", "utf8sig"):
            text = data.removeprefix(b"\xef\xbb\xbf")
            if not text.isascii():
                text.decode("utf-8")
        else:
            letters = data.decode(encoding).removeprefix("\ufeff")
            text = letters.encode("utf-8")
            if REVERSED_MARK in letters:
                tell_reversed(letters, shown, findings)
                return None
    except UnicodeError as why:
        tell_undecodable(why, encoding, shown, findings, stated=stated)
        return None
    except LookupError:
        findings.error(
            "this encoding is not known",
            path=shown,
            found=encoding,
            expected='a name such as "utf-8", "utf-16" or "cp1252"',
            fix="correct [logs] encoding in the study file",
        )
        return None
    if b"\r" in text:
        text = with_plain_line_ends(text)
    if b"\x00" in text:
        tell_zero(text.count(b"\n", 0, text.index(b"\x00")) + 1, shown, findings)
        return None
    if stated and not data.isascii() and is_utf8_all_the_same(data, encoding):
        warn_of_utf8(encoding, shown, findings)
    return text
