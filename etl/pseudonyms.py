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
from collections.abc import Callable, Container, Iterable, Mapping
from pathlib import Path, PurePosixPath
from typing import Any, Literal, NamedTuple

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

#: Parts of words are taken for an id in a value from this length on: with a digit in it, or of
#: letters alone. Shorter ones are in too many words: Anna in savanna, Tina in destination (our
#: choice).
_WITHIN_VALUES_FROM = 4
_LETTERS_WITHIN_VALUES_FROM = 5
#: In free text, where a word too many that is replaced does no harm, the same (our choice).
_WITHIN_FREE_TEXT_FROM = 3

#: What stands where a text is left out altogether.
WITHHELD = "withheld: pseudonyms"

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


def _is_told_within_values(text: str) -> bool:
    """Whether an id is looked for within the words of values."""
    if not any(sign.isalpha() for sign in text):
        return False
    digits = any(sign.isdigit() for sign in text)
    return len(text) >= (_WITHIN_VALUES_FROM if digits else _LETTERS_WITHIN_VALUES_FROM)


def _is_told_within_free_text(text: str) -> bool:
    """Whether an id is looked for within the words of free text."""
    return is_distinctive(text) and len(text) >= _WITHIN_FREE_TEXT_FROM


class _Found(NamedTuple):
    """What finds ids: each pattern is None where there is nothing to find."""

    #: How many readers and files were known.
    known: int
    words: re.Pattern[str] | None
    within_values: re.Pattern[str] | None
    within_free_text: re.Pattern[str] | None
    in_sentences: re.Pattern[str] | None
    logs: re.Pattern[str] | None
    #: The name that stands for each log, by its own names in small letters.
    names_of_logs: dict[str, str]
    #: The pseudonym of each reader.
    by_id: dict[str, str]


class Pseudonyms:
    """Gives pseudonyms, and remembers of whom.

    Can be pickled: a worker process has a copy, what that has learnt comes back by
    ``noted`` and :meth:`learn`.

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
        self._patterns: _Found | None = None
        #: Where what is given is noted meanwhile.
        self.noted: dict[str, str] | None = None

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
            if self.noted is not None:
                self.noted[pseudonym] = known
            if known != original:
                self.clashes.setdefault(pseudonym, (known, original))

    def readers(self) -> dict[str, str]:
        """The readers by pseudonym."""
        return {name: text for name, text in self.originals.items() if is_reader(name)}

    def files(self) -> dict[str, str]:
        """The files by the name that stands for each."""
        return {name: text for name, text in self.originals.items() if not is_reader(name)}

    def hidden(self, text: str) -> str:
        """A value of others with the ids in it replaced, as far as they are distinctive.

        Parameters
        ----------
        text : str
            A value, the name of a column.

        Returns
        -------
        str
            The text in the composed form (Unicode NFC), with a pseudonym for every id of a reader
            that is known by now and stands in it as a word of its own, and for every word that
            holds one of four characters or more with a letter and a digit, or of five letters.
        """
        found = self._finders()
        return self._replaced(text, found.within_values, found.words)

    def hidden_in_free_text(self, text: str) -> str:
        """The same for free text: any word that may tell of a reader or a log is replaced.

        Parameters
        ----------
        text : str
            What people wrote for people.

        Returns
        -------
        str
            As :meth:`hidden` gives it; besides, names of logs, with and without folder and ending,
            and words that hold an id of three characters or more with a letter, or a number of four
            digits or more. Shorter ids cannot be told from other words.
        """
        found = self._finders()
        return self._replaced(self._without_logs(text, found), found.within_free_text, found.words)

    def hidden_in_sentence(self, text: str) -> str:
        """The same for a sentence of this program: ids of four characters or more only."""
        return self._replaced(text, self._finders().in_sentences)

    def names_log(self, text: str) -> bool:
        """Whether a text holds the name of a log, with its ending."""
        found = self._finders()
        return found.logs is not None and any(
            "." in name[0] for name in found.logs.finditer(_composed(text))
        )

    def shown_file(self, name: str) -> str:
        """The name of a file that a study file names: another where an id is part of it."""
        found = self._finders()
        hidden = self._replaced(name, found.within_free_text, found.words)
        return name if hidden == _composed(name) else self.of_file(name, "file")

    def digest_of(self, sha256: str) -> str:
        """A keyed digest in place of a digest, which would let people try what a file may hold."""
        return hmac.new(self.key, f"digest\0{sha256}".encode(), hashlib.sha256).hexdigest()

    def _replaced(self, text: str, *patterns: re.Pattern[str] | None) -> str:
        """A text with what patterns find, one after the other, as pseudonyms."""
        composed = _composed(text)
        for pattern in patterns:
            if pattern is not None:
                composed = pattern.sub(self._pseudonym_of, composed)
        return composed

    def _pseudonym_of(self, found: re.Match[str]) -> str:
        """What stands for a word in which an id was found, the first group of the pattern."""
        word, text, by_id = found[0], found[1], self._finders().by_id
        # Signs of a pseudonym may be an id by chance.
        if any(f"{before}{word}" in self.originals for before in ("", "log-", "file-")):
            return word
        return by_id.get(text) or next(
            name
            for original, name in by_id.items()
            if re.fullmatch(re.escape(original), text, re.IGNORECASE)
        )

    def _without_logs(self, text: str, found: _Found) -> str:
        """A text with other names for the logs in it."""
        composed = _composed(text)
        if found.logs is None:
            return composed
        # A letter that folds in a way of its own is no key; then nothing is told at all.
        return found.logs.sub(
            lambda name: found.names_of_logs.get(name[0].casefold(), WITHHELD), composed
        )

    def _finders(self) -> _Found:
        """What finds the ids and names known by now."""
        if self._patterns is None or self._patterns.known != len(self.originals):
            by_id = {original: name for name, original in self.readers().items()}
            ids = sorted(filter(is_distinctive, by_id), key=len, reverse=True)

            def within(told: Callable[[str], bool]) -> re.Pattern[str] | None:
                return _finding(filter(told, ids), within=True)

            logs = _names_of_logs(self.files(), {text.casefold() for text in by_id})
            self._patterns = _Found(
                len(self.originals),
                _finding(ids),
                within(_is_told_within_values),
                within(_is_told_within_free_text),
                _finding(text for text in ids if len(text) >= _IN_SENTENCES_FROM),
                _names(logs),
                logs,
                by_id,
            )
        return self._patterns


def is_reader(pseudonym: str) -> bool:
    """Whether a name has the form of a reader's pseudonym."""
    return (
        len(pseudonym) == len(_READER) + READER_SIGNS
        and pseudonym.startswith(_READER)
        and set(pseudonym[1:]) <= set(SIGNS)
    )


def _finding(ids: Iterable[str], *, within: bool = False) -> re.Pattern[str] | None:
    """A pattern that finds ids as words of their own, or words that hold one; longer ones first."""
    spelled = []
    for text in ids:
        one = f"(?i:{re.escape(text)})" if len(text) >= _ANY_CASE_FROM else re.escape(text)
        if within:
            # P01 is not in P012, which is another number.
            one = (r"(?<!\d)" if text[0].isdigit() else "") + one
            one += r"(?!\d)" if text[-1].isdigit() else ""
        spelled.append(one)
    if not spelled:
        return None
    either = f"({'|'.join(spelled)})"
    if within:
        return re.compile(f"(?<!{_INNER}){_INNER}*?{either}{_INNER}*")
    return re.compile(f"(?<!{_INNER}){either}(?!{_INNER})")


def _names_of_logs(files: Mapping[str, str], readers: Container[str]) -> dict[str, str]:
    """What stands for each log, by all that it may be called: longer names first.

    What is the id of a reader as well is left to that one.
    """
    called: dict[str, str] = {}
    for name, original in files.items():
        if name.startswith("log-"):
            own = PurePosixPath(original)
            bare = {own.stem, own.name.partition(".")[0]}
            for text in (original, own.name, *filter(is_distinctive, bare)):
                if text.casefold() not in readers:
                    called.setdefault(text.casefold(), name)
    return dict(sorted(called.items(), key=lambda pair: -len(pair[0])))


def _names(called: Iterable[str]) -> re.Pattern[str] | None:
    """A pattern that finds names of files, in any letter case."""
    either = "|".join(map(re.escape, called))
    if not either:
        return None
    return re.compile(f"(?<!{_INNER})(?:{either})(?!{_INNER})", re.IGNORECASE)


def _composed(text: str) -> str:
    """Letters with accents in one form (Unicode NFC), as cells are compared."""
    return unicodedata.normalize("NFC", text)
