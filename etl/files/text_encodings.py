"""Which encoding bytes of text are in, as far as they tell it themselves."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final

#: The Unicode Standard, section 23.8.
BYTE_ORDER_MARKS: Final = (
    (b"\xff\xfe\x00\x00", "utf-32"),
    (b"\x00\x00\xfe\xff", "utf-32"),
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe", "utf-16"),
    (b"\xfe\xff", "utf-16"),
)
#: How much of a file is looked at to tell UTF-16 and UTF-32 without a mark from other text.
PROBE_BYTES = 4096
_ASCII: Final = bytes(range(0x80))
#: Letters of more than one byte in UTF-8: The Unicode Standard, table 3-7, surrogates aside.
_LETTER = re.compile(
    rb"[\xc2-\xdf][\x80-\xbf]|\xe0[\xa0-\xbf][\x80-\xbf]|[\xe1-\xef][\x80-\xbf]{2}"
    rb"|\xf0[\x90-\xbf][\x80-\xbf]{2}|[\xf1-\xf3][\x80-\xbf]{3}|\xf4[\x80-\x8f][\x80-\xbf]{2}"
)
#: Those that make no sense in Windows-1252, where they would be a capital A with circumflex or
#: tilde before a sign, or a small one with circumflex before the sign of the euro or the like.
_PLAIN_LETTER = re.compile(rb"[\xc2\xc3][\x80-\xbf]|\xe2[\x80-\x84][\x80-\xbf]")
#: Of the other ones, single ones occur in Windows-1252 by chance (a letter with an accent before a
#: closing quotation mark). From so many on, and for each so many bytes that are none, they are
#: taken for UTF-8 (our choice).
_LETTERS_BY_CHANCE, _BYTES_A_LETTER = 3, 4


def encoding_of(data: bytes) -> str:
    r"""The encoding that bytes of text suggest.

    Parameters
    ----------
    data : bytes
        The text.

    Returns
    -------
    str
        By the byte-order mark, by the pattern of zero bytes (UTF-16 and UTF-32), UTF-8 where the
        bytes are valid, else Windows-1252.

    Examples
    --------
    >>> encoding_of("crème".encode("utf-8")), encoding_of("crème".encode("cp1252"))
    ('utf-8', 'cp1252')
    """
    found = encoding_of_prefix(data)
    if found is not None:
        return found
    return "utf-8" if is_utf8(data) else "cp1252"


def encoding_of_prefix(data: bytes) -> str | None:
    """The encoding that the beginning of a text tells.

    Parameters
    ----------
    data : bytes
        The beginning.

    Returns
    -------
    str or None
        By the byte-order mark, or by the pattern of zero bytes; None where it is UTF-8 or not as
        the whole text shows.
    """
    for mark, name in BYTE_ORDER_MARKS:
        if data.startswith(mark):
            return name
    return _wide_encoding_of(data[:PROBE_BYTES])


def is_utf8(data: bytes) -> bool:
    """Whether bytes are valid UTF-8."""
    if data.isascii():
        return True
    try:
        data.decode("utf-8")
    except UnicodeDecodeError:
        return False
    return True


def _wide_encoding_of(probe: bytes) -> str | None:
    """UTF-16 or UTF-32, by where zero bytes stand."""
    zeros = [probe[place::4].count(0) for place in range(4)]
    fours = len(probe) // 4
    if fours and zeros[2] >= fours and zeros[3] >= fours and zeros[0] <= fours // 10:
        return "utf-32-le"
    if fours and zeros[0] >= fours and zeros[1] >= fours and zeros[3] <= fours // 10:
        return "utf-32-be"
    even, odd = zeros[0] + zeros[2], zeros[1] + zeros[3]
    # Text of any Latin script in UTF-16 has a zero in nearly every other byte, and nearly always
    # on one side: a few letters, such as the A with macron (U+0100), have theirs on the other.
    if odd > len(probe) // 4 and even < odd // 10:
        return "utf-16-le"
    if even > len(probe) // 4 and odd < even // 10:
        return "utf-16-be"
    return None


def mixes_encodings(data: bytes) -> bool:
    """Whether text that is not valid UTF-8 is UTF-8 all the same in part.

    Parameters
    ----------
    data : bytes
        The text.

    Returns
    -------
    bool
        Whether it holds letters that only UTF-8 writes so, or many that UTF-8 may.

    Examples
    --------
    >>> mixes_encodings("crème, ".encode("utf-8") + "crème".encode("cp1252"))
    True
    >>> mixes_encodings("« crème »".encode("cp1252"))
    False
    """
    signs = EncodingSigns()
    signs.add(data)
    return signs.mixes()


@dataclass(slots=True)
class EncodingSigns:
    """What bytes of text beyond ASCII tell of their encoding, piece by piece.

    Attributes
    ----------
    some : bool
        Whether there was any piece.
    is_utf8 : bool
        Whether all pieces are valid UTF-8.
    """

    some: bool = False
    is_utf8: bool = True
    _plain: bool = False
    _letters: int = 0
    _others: int = 0

    def add(self, data: bytes) -> None:
        """Look at a piece, which is cut at no letter."""
        self.some = True
        self.is_utf8 = self.is_utf8 and is_utf8(data)
        self._plain = self._plain or _PLAIN_LETTER.search(data) is not None
        if not self._plain:
            # Where there is a plain letter, nobody asks for the others.
            rest, letters = _LETTER.subn(b"", data)
            self._letters += letters
            self._others += len(rest.translate(None, delete=_ASCII))

    def mixes(self) -> bool:
        """Whether text that is not valid UTF-8 is UTF-8 all the same in part."""
        if self._plain:
            return True
        many = self._letters >= _LETTERS_BY_CHANCE
        return many and self._letters * _BYTES_A_LETTER >= self._others


def lines_by_encoding(data: bytes) -> tuple[list[tuple[int, int]], list[tuple[int, int]]]:
    r"""The lines of a text that are UTF-8, and those that are not.

    Parameters
    ----------
    data : bytes
        The text, its line ends line feeds.

    Returns
    -------
    utf8 : list of (int, int)
        Number, from 1, and first byte beyond ASCII of each line of UTF-8 that has such a byte.
    others : list of (int, int)
        Number of each line that is no valid UTF-8, and the first byte of it that is none.

    Examples
    --------
    >>> lines_by_encoding(b"a\n" + "è\n".encode("utf-8") + "è".encode("cp1252"))
    ([(2, 195)], [(3, 232)])
    """
    utf8: list[tuple[int, int]] = []
    others: list[tuple[int, int]] = []
    for number, line in enumerate(data.split(b"\n"), start=1):
        if line.isascii():
            continue
        try:
            line.decode("utf-8")
        except UnicodeDecodeError as why:
            others.append((number, line[why.start]))
        else:
            utf8.append((number, line.translate(None, delete=_ASCII)[0]))
    return utf8, others
