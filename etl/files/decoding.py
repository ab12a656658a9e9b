"""From a file's bytes to UTF-8 text with plain line ends, whatever the lab's computer wrote."""

from __future__ import annotations

import codecs
import gzip
import hashlib
import zlib
from dataclasses import dataclass
from pathlib import Path

from etl.errors import Findings
from etl.files.text_encodings import (
    BYTE_ORDER_MARKS,
    encoding_of,
    lines_by_encoding,
    mixes_encodings,
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

#: A byte-order mark read in the other order; no character (The Unicode Standard, section 23.8).
_REVERSED_MARK = "\ufffe"


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
        stored = path.read_bytes()
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
    if not _is_text(data, shown, findings):
        return None
    if encoding is not None and _contradicted(data, encoding, shown, findings):
        return None
    found = encoding or encoding_of(data)
    if encoding is None and found == "cp1252" and mixes_encodings(data):
        _tell_mixture(data, shown, findings)
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


def tell_unreadable(path: Path, shown: str, why: OSError, findings: Findings) -> None:
    """Record why a file cannot be read."""
    if isinstance(why, FileNotFoundError):
        findings.error(
            "there is no such file",
            path=shown,
            fix="correct the name in the study file, or put the file there",
        )
    elif path.is_dir():
        # Not told from the kind of error, which differs between operating systems.
        findings.error(
            "this is a folder",
            path=shown,
            expected="a file",
            fix="name the file in it that is meant",
        )
    else:
        findings.error(
            f"the file cannot be read ({why.strerror or type(why).__name__})",
            path=shown,
            fix="check that you may read the file and that no other program holds it",
        )


def _unpacked(stored: bytes, shown: str, findings: Findings) -> bytes | None:
    """The bytes inside a gzip file, or the bytes as they are."""
    if not stored.startswith(b"\x1f\x8b"):
        if shown.endswith(".gz") and stored:
            findings.error(
                "the name ends in .gz but the file is not gzipped",
                path=shown,
                fix="rename the file, or compress it again",
            )
            return None
        return stored
    try:
        return gzip.decompress(stored)
    except (EOFError, gzip.BadGzipFile, zlib.error) as why:
        cut = isinstance(why, EOFError)
        findings.error(
            "the gzip file is cut short" if cut else f"the gzip file is damaged ({why})",
            path=shown,
            fix="copy the file again from where it was recorded",
        )
        return None


def _is_text(data: bytes, shown: str, findings: Findings) -> bool:
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


def _contradicted(data: bytes, encoding: str, shown: str, findings: Findings) -> bool:
    """Whether a byte-order mark says another encoding than the study file; says so."""
    marked = next((name for mark, name in BYTE_ORDER_MARKS if data.startswith(mark)), None)
    stated = _plain_name(encoding)
    if marked is None or stated.startswith(_plain_name(marked).removesuffix("sig")):
        return False
    findings.error(
        "the file's byte-order mark contradicts the study file",
        path=shown,
        line=1,
        found=marked.removesuffix("-sig"),
        expected=f"{encoding}, as [logs] encoding says",
        fix="correct [logs] encoding, or remove it: the encoding is then found out file by file",
    )
    return True


def _plain_name(encoding: str) -> str:
    """The name of an encoding without the signs in which its spellings differ."""
    return "".join(letter for letter in encoding.lower() if letter.isalnum())


def _decoded(
    data: bytes, encoding: str, shown: str, findings: Findings, *, stated: bool
) -> bytes | None:
    """The text in UTF-8 with plain line ends."""
    try:
        if _plain_name(encoding) in ("utf8", "utf8sig"):
            text = data.removeprefix(b"\xef\xbb\xbf")
            if not text.isascii():
                text.decode("utf-8")
        else:
            letters = data.decode(encoding).removeprefix("\ufeff")
            text = letters.encode("utf-8")
            if _REVERSED_MARK in letters:
                _tell_reversed(letters, shown, findings)
                return None
    except UnicodeError as why:
        _tell_undecodable(why, encoding, shown, findings, stated=stated)
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
        text = _with_plain_line_ends(text)
    if b"\x00" in text:
        findings.error(
            "the text holds a zero byte",
            path=shown,
            line=text.count(b"\n", 0, text.index(b"\x00")) + 1,
            expected="text only",
            fix="the file is damaged or is no text: copy or export it again",
        )
        return None
    if stated and not data.isascii() and _is_utf8_all_the_same(data, encoding):
        findings.warning(
            f"the text is valid UTF-8 and was read as {encoding}",
            path=shown,
            expected=f"{encoding}, as [logs] encoding says",
            fix="check the letters with accents; remove [logs] encoding to have it found out file "
            "by file",
        )
    return text


def _is_utf8_all_the_same(data: bytes, encoding: str) -> bool:
    """Whether bytes that are read in another encoding are valid UTF-8."""
    if codecs.lookup(encoding).name.startswith("utf"):
        return False
    try:
        data.decode("utf-8")
    except UnicodeDecodeError:
        return False
    return True


def _tell_mixture(data: bytes, shown: str, findings: Findings) -> None:
    """Record where text that is UTF-8 in part is none; of the two kinds, the rarer is at fault."""
    try:
        data.decode("utf-8")
    except UnicodeDecodeError as why:
        if why.end == len(data) and "end of data" in why.reason:
            findings.error(
                "the file ends in the middle of a letter",
                path=shown,
                line=_with_plain_line_ends(data[: why.start]).count(b"\n") + 1,
                found=f"byte {data[why.start]:#04x}",
                expected="one encoding in the whole file",
                fix="copy the file again from where it was recorded",
            )
            return
    utf8, others = lines_by_encoding(_with_plain_line_ends(data))
    foreign = not utf8 or len(others) <= len(utf8)
    odd, usual = (others, utf8) if foreign else (utf8, others)
    number, byte = odd[0]
    kind = "UTF-8" if foreign else "in another one"
    rest = ""
    if len(usual) == 1:
        rest = f": line {usual[0][0]} is {kind}"
    elif usual:
        rest = f": {len(usual):,} lines are {kind}, the first of them line {usual[0][0]}"
    findings.error(
        "the text is UTF-8 in part and in another encoding in part",
        path=shown,
        line=number,
        found=f"byte {byte:#04x}, which {'is no' if foreign else 'begins a letter of'} UTF-8",
        expected=f"one encoding in the whole file{rest}",
        fix="save every part as UTF-8 before they are put together; or, if it is a log and is in "
        "one encoding after all, state [logs] encoding",
    )


def _tell_reversed(letters: str, shown: str, findings: Findings) -> None:
    """Record where a byte-order mark stands the wrong way round."""
    before = letters[: letters.index(_REVERSED_MARK)].encode("utf-8")
    findings.error(
        "bytes of two orders stand in one file",
        path=shown,
        line=_with_plain_line_ends(before).count(b"\n") + 1,
        expected="one byte order in the whole file",
        fix="save every part as UTF-8 before they are put together",
    )


def _with_plain_line_ends(text: bytes) -> bytes:
    """The text with a line feed for every line end."""
    return text.replace(b"\r\n", b"\n").replace(b"\r", b"\n")


def _tell_undecodable(
    why: UnicodeError, encoding: str, shown: str, findings: Findings, *, stated: bool
) -> None:
    """Record which byte cannot be text in this encoding."""
    line: int | None = None
    found: str | None = None
    if isinstance(why, UnicodeDecodeError):
        before = why.object[: why.start].decode(encoding, errors="replace").encode("utf-8")
        line = _with_plain_line_ends(before).count(b"\n") + 1
        found = f"byte {why.object[why.start]:#04x}"
    findings.error(
        f"the text is not valid {encoding}"
        if stated or encoding != "cp1252"
        else "the text is neither UTF-8 nor Windows-1252",
        path=shown,
        line=line,
        found=found,
        fix="state the right encoding in [logs] encoding"
        if stated
        else "save the file as UTF-8, or, if it is a log, state its encoding in [logs] encoding",
    )
