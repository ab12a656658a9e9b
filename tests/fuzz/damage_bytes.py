"""Damage to the bytes of a log: cut, filled, packed or written by the wrong program."""

from __future__ import annotations

import base64
import gzip
import io
import zipfile
from random import Random

from tests.fuzz.damage import LOST_TRIALS, to_bytes
from tests.simulator.dialects.tables import zipped

_SEPARATORS = b"\t;,|"


def _places(content: bytes, signs: bytes) -> list[int]:
    """Where one of some signs stands."""
    return [place for place, sign in enumerate(content) if sign in signs]


def _a_row(content: bytes, rng: Random) -> tuple[int, int]:
    """Where some line below the first begins and ends, its line feed aside."""
    ends = _places(content, b"\n")
    at = rng.randrange(1, len(ends))
    return ends[at - 1] + 1, ends[at]


@to_bytes("cut at any byte")
def cut(content: bytes, rng: Random) -> bytes | None:
    """A copy that was broken off; where it ends between two rows nothing can tell."""
    at = rng.randrange(1, len(content))
    return None if content[at - 1 : at] == b"\n" else content[:at]


@to_bytes("cut inside a row")
def cut_inside_row(content: bytes, rng: Random) -> bytes:
    """Half a row at the end."""
    begin, end = _a_row(content, rng)
    return content[: (begin + end) // 2]


@to_bytes("cut inside the last row")
def cut_inside_last_row(content: bytes, rng: Random) -> bytes:
    """Only some bytes are lacking."""
    return content[: -rng.randrange(2, 7)]


@to_bytes("cut after a separator")
def cut_after_separator(content: bytes, rng: Random) -> bytes | None:
    """The row ends where a cell should begin."""
    places = [p for p in _places(content, _SEPARATORS) if p > len(content) // 3]
    return content[: rng.choice(places) + 1] if places else None


@to_bytes("cut at the end of a row")
def cut_at_end_of_row(content: bytes, rng: Random) -> bytes:
    """The last row is whole, but for its line feed."""
    return content[: _a_row(content[:-1], rng)[1]]


@to_bytes("last line end missing", owes="nothing")
def without_last_line_end(content: bytes, _: Random) -> bytes:
    """Many programs write no line end after the last row."""
    return content.removesuffix(b"\n")


@to_bytes("cut inside gzip", stored=True)
def cut_inside_gzip(content: bytes, rng: Random) -> bytes | None:
    """A compressed file that was broken off."""
    if not content.startswith(b"\x1f\x8b"):
        content = zipped(content)
    return content[: rng.randrange(4, len(content))]


@to_bytes("gzip damaged", stored=True)
def damage_inside_gzip(content: bytes, rng: Random) -> bytes | None:
    """A byte of a compressed file changed."""
    packed = bytearray(content if content.startswith(b"\x1f\x8b") else zipped(content))
    packed[rng.randrange(12, len(packed) - 8)] ^= 1 << rng.randrange(8)
    return bytes(packed)


@to_bytes("gzipped twice", stored=True)
def gzipped_twice(content: bytes, _: Random) -> bytes:
    """Compressed, and compressed again."""
    return zipped(content if content.startswith(b"\x1f\x8b") else zipped(content))


@to_bytes("gzipped under a plain name", owes="nothing", stored=True)
def gzipped_under_plain_name(content: bytes, _: Random) -> bytes | None:
    """The name does not say that the file is compressed."""
    return None if content.startswith(b"\x1f\x8b") else zipped(content)


@to_bytes("plain under the name of a gzip file", stored=True)
def plain_under_gzip_name(content: bytes, _: Random) -> bytes | None:
    """The name says that the file is compressed, and it is not."""
    return gzip.decompress(content) if content.startswith(b"\x1f\x8b") else None


@to_bytes("garbage after gzip", stored=True)
def garbage_after_gzip(content: bytes, _: Random) -> bytes:
    """Bytes of another file behind the end."""
    return (content if content.startswith(b"\x1f\x8b") else zipped(content)) + b"\x07orchard" * 9


@to_bytes("empty")
def empty(_: bytes, __: Random) -> bytes:
    """A file without a byte."""
    return b""


@to_bytes("first line only", told_by=LOST_TRIALS)
def first_line_only(content: bytes, _: Random) -> bytes:
    """The rest was never written."""
    return content.split(b"\n", 1)[0] + b"\n"


@to_bytes("zero bytes")
def zero_bytes(content: bytes, _: Random) -> bytes:
    """A file whose room was kept and never filled."""
    return b"\x00" * len(content)


@to_bytes("zero bytes at the end")
def zero_bytes_at_end(content: bytes, rng: Random) -> bytes:
    """Power was lost before the last block was written."""
    end = rng.randrange(len(content) // 2, len(content))
    return content[:end] + b"\x00" * (len(content) - end)


@to_bytes("a NUL")
def a_nul(content: bytes, rng: Random) -> bytes:
    """A zero byte in place of another."""
    at = rng.randrange(len(content))
    return content[:at] + b"\x00" + content[at + 1 :]


@to_bytes("end sign of an old system")
def end_sign(content: bytes, _: Random) -> bytes:
    """Old programs close a text with the character 26."""
    return content + b"\x1a"


@to_bytes("a byte with its highest bit set")
def high_bit(content: bytes, rng: Random) -> bytes:
    """One bit fell over."""
    begin, _ = _a_row(content, rng)
    return content[:begin] + bytes([content[begin] | 0x80]) + content[begin + 1 :]


@to_bytes("byte-order mark in the middle")
def mark_in_the_middle(content: bytes, rng: Random) -> bytes:
    """Two files were put together as bytes."""
    begin, _ = _a_row(content, rng)
    return content[:begin] + b"\xef\xbb\xbf" + content[begin:]


@to_bytes("mixed encodings")
def mixed_encodings(content: bytes, rng: Random) -> bytes | None:
    """One line was written by another program."""
    lines = content.split(b"\n")
    places = [n for n, line in enumerate(lines) if not line.isascii()]
    if not places:
        return None
    at = rng.choice(places)
    lines[at] = lines[at].decode("utf-8").encode("cp1252")
    return b"\n".join(lines)


@to_bytes("encoded twice")
def encoded_twice(content: bytes, _: Random) -> bytes | None:
    """UTF-8 read as Windows-1252 and written as UTF-8."""
    if content.isascii():
        return None
    return content.decode("utf-8").encode("utf-8").decode("cp1252", "replace").encode("utf-8")


@to_bytes("wrong byte order")
def wrong_byte_order(content: bytes, rng: Random) -> bytes:
    """The byte-order mark is of the other order."""
    little = rng.random() < 0.5
    mark = b"\xfe\xff" if little else b"\xff\xfe"
    return mark + content.decode("utf-8").encode("utf-16-le" if little else "utf-16-be")


@to_bytes("a byte lost from UTF-16")
def byte_lost(content: bytes, rng: Random) -> bytes:
    """From there on all pairs are wrong."""
    wide = content.decode("utf-8").encode("utf-16")
    at = rng.randrange(3, len(wide) - 1)
    return wide[:at] + wide[at + 1 :]


@to_bytes("UTF-16 after UTF-8")
def utf_16_after_utf_8(content: bytes, _: Random) -> bytes:
    """The second half was appended by a program with another encoding."""
    lines = content.decode("utf-8").split("\n")
    half = len(lines) // 2
    first, second = "\n".join(lines[:half]) + "\n", "\n".join(lines[half:])
    return first.encode("utf-8") + second.encode("utf-16-le")


@to_bytes("carriage returns added", owes="nothing")
def carriage_returns(content: bytes, _: Random) -> bytes:
    """Copied as text to another system."""
    return content.replace(b"\n", b"\r\n")


@to_bytes("line ends of two systems", owes="nothing")
def mixed_line_ends(content: bytes, rng: Random) -> bytes:
    """Some lines were written on another system."""
    return b"".join(
        line + rng.choice([b"\n", b"\r\n"]) for line in content.removesuffix(b"\n").split(b"\n")
    )


@to_bytes("line ends doubled")
def doubled_line_ends(content: bytes, _: Random) -> bytes:
    """Each line feed got a carriage return, twice: blank lines for some readers."""
    return content.replace(b"\n", b"\r\r\n")


@to_bytes("a line of 10 MB")
def long_line(content: bytes, rng: Random) -> bytes:
    """The line ends of a whole recording are lost, or a picture got in."""
    begin, _ = _a_row(content, rng)
    return content[:begin] + b"P01 200 " * 1_300_000 + b"\n" + content[begin:]


@to_bytes("a very long cell")
def long_cell(content: bytes, rng: Random) -> bytes:
    """One cell holds a novel."""
    begin, _ = _a_row(content, rng)
    return content[:begin] + b"x" * 1_500_000 + content[begin:]


@to_bytes("all line ends lost")
def no_line_ends(content: bytes, _: Random) -> bytes:
    """One line is left."""
    return content.replace(b"\n", b" ")


@to_bytes("a hole")
def hole(content: bytes, rng: Random) -> bytes:
    """A block is lost, from within a row to right behind the first letter of another one."""
    ends = _places(content, b"\n")
    starts = [_first_sign(content, end + 1) for end in ends[:-1]]
    at = rng.randrange(len(starts) - 2)
    # Two beginnings of numbers would make a number.
    line = content[starts[at] : ends[at + 1]]
    first = min((line.find(sign) for sign in _SEPARATORS + b" " if sign in line), default=2)
    begin = starts[at] + rng.randrange(min(first + 1, len(line) - 1), len(line))
    return content[:begin] + content[starts[rng.randrange(at + 1, len(starts))] + 1 :]


def _first_sign(content: bytes, place: int) -> int:
    """The first place from there on that is no blank."""
    while content[place : place + 1] == b" ":
        place += 1
    return place


@to_bytes("blocks in the wrong order")
def swapped_blocks(content: bytes, rng: Random) -> bytes | None:
    """Two blocks of the disk changed places."""
    size = 512
    if len(content) < 3 * size:
        return None
    at = rng.randrange(len(content) // size - 1) * size
    one, other = content[at : at + size], content[at + size : at + 2 * size]
    return content[:at] + other + one + content[at + 2 * size :]


@to_bytes("a picture")
def picture(_: bytes, rng: Random) -> bytes:
    """A picture under the name of a log."""
    return b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR" + rng.randbytes(400)


@to_bytes("an archive")
def archive(content: bytes, _: Random) -> bytes:
    """The log lies in an archive under its own name."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as packed:
        packed.writestr("P01.tsv", content)
    return buffer.getvalue()


@to_bytes("a page of the network")
def network_page(_: bytes, __: Random) -> bytes:
    """Not the log came from the server, but a page that asks for a password."""
    return (
        b"<!DOCTYPE html>\n<html><head><title>Sign in</title></head>\n<body>\n"
        b'<form action="/login"><p>Please sign in, then try again.</p>\n</form></body></html>\n'
    )


@to_bytes("a pointer in place of the file")
def pointer(_: bytes, __: Random) -> bytes:
    """Large files were left elsewhere, and only what points to them was copied."""
    return b"version 1\nobject sha256:" + b"ab" * 32 + b"\nsize 48213\n"


@to_bytes("random bytes")
def random_bytes(content: bytes, rng: Random) -> bytes:
    """An encrypted or a binary file."""
    return rng.randbytes(len(content))


@to_bytes("a block of random bytes")
def random_block(content: bytes, rng: Random) -> bytes:
    """A bad block of the disk."""
    at = rng.randrange(len(content) - 64)
    return content[:at] + rng.randbytes(64) + content[at + 64 :]


@to_bytes("written for the mail")
def for_the_mail(content: bytes, _: Random) -> bytes:
    """An attachment that was never turned back."""
    return base64.encodebytes(content)
