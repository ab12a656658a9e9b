"""What can be wrong with a file before it is text, and how it is said."""

from __future__ import annotations

import codecs
from pathlib import Path

from etl.errors import Findings
from etl.files.steady import ChangedError
from etl.files.text_encodings import BYTE_ORDER_MARKS, lines_by_encoding

#: A byte-order mark read in the other order; no character (The Unicode Standard, section 23.8).
REVERSED_MARK = "\ufffe"


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
    elif isinstance(why, ChangedError):
        findings.error(
            "the file changed while it was read",
            path=shown,
            expected="a file that nobody writes to",
            fix="wait until whatever writes it is done, such as a recording or a copy, and start "
            "again",
        )
    else:
        findings.error(
            f"the file cannot be read ({why.strerror or type(why).__name__})",
            path=shown,
            fix="check that you may read the file and that no other program holds it",
        )


def is_misnamed(shown: str, findings: Findings) -> bool:
    """Whether a file that is not gzipped has a name that says so; tells it."""
    if shown.endswith(".gz"):
        findings.error(
            "the name ends in .gz but the file is not gzipped",
            path=shown,
            fix="rename the file, or compress it again",
        )
        return True
    return False


def tell_damaged(why: Exception, shown: str, findings: Findings) -> None:
    """Record why a gzip file cannot be unpacked."""
    cut = isinstance(why, EOFError)
    # What the library says besides differs between its ways of unpacking.
    said = str(why).split(" 0x")[0]
    findings.error(
        "the gzip file is cut short" if cut else f"the gzip file is damaged ({said})",
        path=shown,
        fix="copy the file again from where it was recorded",
    )


def is_contradicted(data: bytes, encoding: str, shown: str, findings: Findings) -> bool:
    """Whether a byte-order mark says another encoding than the study file; says so."""
    marked = next((name for mark, name in BYTE_ORDER_MARKS if data.startswith(mark)), None)
    stated = plain_name(encoding)
    if marked is None or stated.startswith(plain_name(marked).removesuffix("sig")):
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


def plain_name(encoding: str) -> str:
    """The name of an encoding without the signs in which its spellings differ."""
    return "".join(letter for letter in encoding.lower() if letter.isalnum())


def tell_zero(line: int, shown: str, findings: Findings) -> None:
    """Record where a zero byte stands."""
    findings.error(
        "the text holds a zero byte",
        path=shown,
        line=line,
        expected="text only",
        fix="the file is damaged or is no text: copy or export it again",
    )


def warn_of_utf8(encoding: str, shown: str, findings: Findings) -> None:
    """Warn of text that is valid UTF-8 and was read in the encoding that the study states."""
    findings.warning(
        f"the text is valid UTF-8 and was read as {encoding}",
        path=shown,
        expected=f"{encoding}, as [logs] encoding says",
        fix="check the letters with accents; remove [logs] encoding to have it found out file "
        "by file",
    )


def is_utf8_all_the_same(data: bytes, encoding: str) -> bool:
    """Whether bytes that are read in another encoding are valid UTF-8."""
    if codecs.lookup(encoding).name.startswith("utf"):
        return False
    try:
        data.decode("utf-8")
    except UnicodeDecodeError:
        return False
    return True


def tell_mixture(data: bytes, shown: str, findings: Findings) -> None:
    """Record where text that is UTF-8 in part is none; of the two kinds, the rarer is at fault."""
    try:
        data.decode("utf-8")
    except UnicodeDecodeError as why:
        if why.end == len(data) and "end of data" in why.reason:
            findings.error(
                "the file ends in the middle of a letter",
                path=shown,
                line=with_plain_line_ends(data[: why.start]).count(b"\n") + 1,
                found=f"byte {data[why.start]:#04x}",
                expected="one encoding in the whole file",
                fix="copy the file again from where it was recorded",
            )
            return
    utf8, others = lines_by_encoding(with_plain_line_ends(data))
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


def tell_reversed(letters: str, shown: str, findings: Findings) -> None:
    """Record where a byte-order mark stands the wrong way round."""
    before = letters[: letters.index(REVERSED_MARK)].encode("utf-8")
    findings.error(
        "bytes of two orders stand in one file",
        path=shown,
        line=with_plain_line_ends(before).count(b"\n") + 1,
        expected="one byte order in the whole file",
        fix="save every part as UTF-8 before they are put together",
    )


def with_plain_line_ends(text: bytes) -> bytes:
    """The text with a line feed for every line end."""
    return text.replace(b"\r\n", b"\n").replace(b"\r", b"\n")


def tell_undecodable(
    why: UnicodeError, encoding: str, shown: str, findings: Findings, *, stated: bool
) -> None:
    """Record which byte cannot be text in this encoding."""
    line: int | None = None
    found: str | None = None
    if isinstance(why, UnicodeDecodeError):
        before = why.object[: why.start].decode(encoding, errors="replace").encode("utf-8")
        line = with_plain_line_ends(before).count(b"\n") + 1
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
