"""Pseudonyms for readers and files: keyed, so that only who has the key can tell whose they are.

A pseudonym takes the place of an id where the id enters, in the readers of logs and tables, so that
nothing behind them ever holds the id itself. What is told to the laboratory is turned back by
:attr:`Pseudonyms.originals`.
"""

from __future__ import annotations

import hashlib
import hmac
import os
import re
import unicodedata
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any, Literal

import numpy as np

from etl.files import Coded

#: Bytes of a key: as many as the digest has, which RFC 2104, section 3, asks for at least.
KEY_BYTES = 32
#: Digits and capital letters but for I, L, O and U, which are taken for others (our choice; 32
#: signs, five bits each).
SIGNS = "0123456789ABCDEFGHJKMNPQRSTVWXYZ"
#: How many signs a pseudonym of a reader has behind its R. With 35 bits, two of 1,000 readers share
#: one in a build out of 70,000; that is found out and said.
READER_SIGNS = 7
#: How many signs the name of a file has behind its kind.
FILE_SIGNS = 8
_READER = "R"
#: A letter or digit of any script, for the ends of an id within a text.
_INNER = r"[^\W_]"
#: Ids shorter than this are found in a text only as they are written: "no" is not "NO" (our
#: choice).
_ANY_CASE_FROM = 4
#: Numbers with fewer digits than this are too common to be taken for an id in a text.
_NUMBER_DIGITS = 4
#: In sentences of this program only ids as long as this are looked for (our choice): "no" or "at",
#: somebody's initials, would be found in every sentence.
_IN_SENTENCES_FROM = 4

FileKind = Literal["log", "file"]
FILE_KINDS: tuple[FileKind, ...] = ("log", "file")


def signs_of(key: bytes, kind: str, text: str, count: int) -> str:
    """The signs that stand for a text.

    Parameters
    ----------
    key : bytes
        The secret.
    kind : str
        What the text is, so that a reader and a file of one name have different signs.
    text : str
        The text.
    count : int
        How many signs, five bits each.

    Returns
    -------
    str
        From the first bits of the digest.

    References
    ----------
    Krawczyk, Bellare & Canetti (1997). HMAC: Keyed-hashing for message authentication. RFC 2104,
    doi:10.17487/RFC2104; with SHA-256 (FIPS 180-4), cut short as its section 5 allows.

    Examples
    --------
    >>> signs_of(b"k" * 32, "reader", "P01", 7), signs_of(b"k" * 32, "file", "P01", 7)
    ('PKKEK6J', '0CXC6B2')
    """
    digest = hmac.new(key, f"{kind}\0{text}".encode(), hashlib.sha256).digest()
    bits = int.from_bytes(digest, "big")
    return "".join(SIGNS[bits >> (8 * len(digest) - 5 * (i + 1)) & 31] for i in range(count))


def is_distinctive(text: str) -> bool:
    """Whether an id that is found in a text can hardly be there by chance.

    Parameters
    ----------
    text : str
        An id.

    Returns
    -------
    bool
        True for two characters or more with a letter among them, and for a number of four digits or
        more.

    Examples
    --------
    >>> [is_distinctive(text) for text in ("P7", "7", "P", "2041", "204")]
    [True, False, False, True, False]
    """
    if any(sign.isalpha() for sign in text):
        return len(text) > 1
    return sum(sign.isdigit() for sign in text) >= _NUMBER_DIGITS


class Pseudonyms:
    """Gives pseudonyms, and remembers of whom.

    Can be pickled: a worker process has a copy, what that has learnt comes back by
    :meth:`learnt_since` and :meth:`learn`.

    Parameters
    ----------
    key : bytes
        The secret.
    folder : Path
        Files are named as seen from this folder, that of the study file.

    Examples
    --------
    >>> hidden = Pseudonyms(b"k" * 32)
    >>> hidden.of_reader("P01"), hidden.of_reader("P02")
    ('RPKKEK6J', 'RPEFRDHJ')
    >>> hidden.originals["RPKKEK6J"]
    'P01'
    """

    def __init__(self, key: bytes, folder: Path | None = None) -> None:
        self.key = key
        self.folder = folder or Path()
        #: What each pseudonym stands for: readers and files.
        self.originals: dict[str, str] = {}
        #: Pseudonyms that stand for two: the pseudonym, and both.
        self.clashes: dict[str, tuple[str, str]] = {}
        self._patterns: tuple[int, re.Pattern[str] | None, re.Pattern[str] | None] | None = None

    def __getstate__(self) -> dict[str, Any]:
        """All but what can be made again."""
        return {**self.__dict__, "_patterns": None}

    def of_reader(self, text: str) -> str:
        """The pseudonym of a reader."""
        pseudonym = _READER + signs_of(self.key, "reader", _composed(text), READER_SIGNS)
        self.learn({pseudonym: _composed(text)})
        return pseudonym

    def of_either(self, text: str) -> str:
        """The pseudonym of a reader who is named by id, or by pseudonym already."""
        return text if is_reader(text) and text in self.originals else self.of_reader(text)

    def of_file(self, path: str | Path, kind: FileKind = "log") -> str:
        """The name that stands for a file, the same for all who see it from the study's folder."""
        whole = os.path.join(self.folder, path)  # noqa: PTH118  (an absolute path stays what it is)
        try:
            seen = Path(os.path.relpath(whole, self.folder)).as_posix()
        except ValueError:  # another drive on Windows
            seen = Path(whole).as_posix()
        seen = _composed(seen)
        name = f"{kind}-{signs_of(self.key, 'file', seen, FILE_SIGNS)}"
        self.learn({name: seen})
        return name

    def readers_of(self, column: Coded, *, either: bool = False) -> Coded:
        """A column of ids as pseudonyms; with ``either``, some may be pseudonyms already."""
        one = self.of_either if either else self.of_reader
        known: dict[str, int] = {}
        new = [known.setdefault(one(text), len(known)) for text in column.values]
        # An id and its pseudonym become one; two ids do where they clash, which is said elsewhere.
        return Coded(np.array([*new, -1], dtype=np.int32)[column.codes], tuple(known))

    def learn(self, others: Mapping[str, str]) -> None:
        """Take over what others have given."""
        for pseudonym, original in others.items():
            known = self.originals.setdefault(pseudonym, original)
            if known != original:
                self.clashes.setdefault(pseudonym, (known, original))

    def learnt_since(self, before: int) -> dict[str, str]:
        """What was added since ``originals`` had so many entries."""
        return dict(list(self.originals.items())[before:])

    def readers(self) -> dict[str, str]:
        """The readers by pseudonym."""
        return {name: text for name, text in self.originals.items() if is_reader(name)}

    def files(self) -> dict[str, str]:
        """The files by the name that stands for each."""
        return {name: text for name, text in self.originals.items() if not is_reader(name)}

    def hidden(self, text: str) -> str:
        """A text of others with the ids in it replaced, as far as they are distinctive.

        Parameters
        ----------
        text : str
            Free text, a value, the name of a file.

        Returns
        -------
        str
            The text in the composed form (Unicode NFC), with a pseudonym for every id of a reader
            that is known by now and stands in it as a word of its own.
        """
        return self._replaced(text, self._pattern(within_sentences=False))

    def hidden_in_sentence(self, text: str) -> str:
        """The same for a sentence of this program: ids of four characters or more only."""
        return self._replaced(text, self._pattern(within_sentences=True))

    def shown_file(self, name: str) -> str:
        """The name of a file that a study file names: another where an id is part of it."""
        return name if self.hidden(name) == _composed(name) else self.of_file(name, "file")

    def digest_of(self, sha256: str) -> str:
        """A keyed digest in place of a digest, which would let people try what a file may hold."""
        return hmac.new(self.key, f"digest\0{sha256}".encode(), hashlib.sha256).hexdigest()

    def _replaced(self, text: str, pattern: re.Pattern[str] | None) -> str:
        """A text with what a pattern finds as pseudonyms."""
        composed = _composed(text)
        if pattern is None or not pattern.search(composed):
            return composed
        by_id = {original: name for name, original in self.readers().items()}

        def pseudonym(found: re.Match[str]) -> str:
            return by_id.get(found[0]) or next(
                name
                for original, name in by_id.items()
                if re.fullmatch(re.escape(original), found[0], re.IGNORECASE)
            )

        return pattern.sub(pseudonym, composed)

    def _pattern(self, *, within_sentences: bool) -> re.Pattern[str] | None:
        """What finds the distinctive ids known by now; None where there is none."""
        if self._patterns is None or self._patterns[0] != len(self.originals):
            ids = sorted(filter(is_distinctive, self.readers().values()), key=len, reverse=True)
            long = [text for text in ids if len(text) >= _IN_SENTENCES_FROM]
            self._patterns = len(self.originals), _finding(ids), _finding(long)
        _, anywhere, of_sentences = self._patterns
        return of_sentences if within_sentences else anywhere


def is_reader(pseudonym: str) -> bool:
    """Whether a name has the form of a reader's pseudonym."""
    return (
        len(pseudonym) == len(_READER) + READER_SIGNS
        and pseudonym.startswith(_READER)
        and set(pseudonym[1:]) <= set(SIGNS)
    )


def _finding(ids: Iterable[str]) -> re.Pattern[str] | None:
    """A pattern that finds some ids as words of their own; longer ones must come first."""
    spelled = [
        f"(?i:{re.escape(text)})" if len(text) >= _ANY_CASE_FROM else re.escape(text)
        for text in ids
    ]
    if not spelled:
        return None
    return re.compile(f"(?<!{_INNER})(?:{'|'.join(spelled)})(?!{_INNER})")


def _composed(text: str) -> str:
    """Letters with accents in one form (Unicode NFC), as cells are compared."""
    return unicodedata.normalize("NFC", text)
