"""Texts in CSV files, so that no spreadsheet program runs one as a formula.

A spreadsheet takes a cell that begins with a sign such as ``=`` for a formula, also where a file
has it in quotes, and a formula may fetch what it likes from anywhere. An apostrophe in front makes
the cell text again. It goes where we read such a file ourselves, and the codebook says so to
others. Numbers are no texts: ``-5`` stays as it is.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import Final

import pyarrow as pa

#: A cell that begins with one of these may be run: the signs of formulas in either width, the tab
#: and the ends of lines, which some programs skip before they look.
SIGNS: Final = "=+-@\uff1d\uff0b\uff0d\uff20\t\r\n"
#: What is put in front.
MARK: Final = "'"
#: A text to which the mark belongs, or that has it, as a regular expression from the beginning of
#: the text: any marks, then a sign and something after it that do not make a number. It means the
#: same in Python and, with ``perl = TRUE``, in R; for the end of a text each would write its own
#: sign, so that here nothing may follow.
MARKED: Final = (
    r"^'*(?![+-](?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?(?![\s\S]))"
    f"[{SIGNS.replace('-', '')}-]"
    r"[\s\S]"
)
_MARKED: Final = re.compile(MARKED)
_TO_QUOTE: Final = re.compile(r'["\r\n]')

Cell = str | int | float | None


def safe(text: str) -> str:
    """A text as it may stand in a CSV file.

    Parameters
    ----------
    text : str
        Any text: a cell or a header.

    Returns
    -------
    str
        The text with an apostrophe in front if it has two characters or more, begins with one of
        ``SIGNS`` and is no number; so, too, if it begins with apostrophes followed by such a text,
        so that :func:`plain` can tell the two. Else the text as it is.

    References
    ----------
    OWASP Foundation, "CSV Injection" (https://owasp.org/www-community/attacks/CSV_Injection):
    signs, and the apostrophe. We differ in leaving numbers alone, and a sign by itself, which is
    often a level's name and computes nothing.

    Examples
    --------
    >>> [safe(text) for text in ("=1+2", "-", "-5", "+49 30", "'=x", "early")]
    ["'=1+2", '-', '-5', "'+49 30", "''=x", 'early']
    """
    return MARK + text if _MARKED.match(text) else text


def plain(text: str) -> str:
    """A text as it was before :func:`safe`.

    Parameters
    ----------
    text : str
        A cell of a CSV file that was written by this package.

    Returns
    -------
    str
        The text without one apostrophe where :func:`safe` has put it.

    Examples
    --------
    >>> [plain(text) for text in ("'=1+2", "-", "'-5", "''=x", "early")]
    ['=1+2', '-', "'-5", "'=x", 'early']
    """
    return text[1:] if text.startswith(MARK) and _MARKED.match(text) else text


def safe_array(texts: pa.Array) -> pa.Array:
    """All texts of a column as they may stand in a CSV file; see :func:`safe`.

    Parameters
    ----------
    texts : pa.Array
        Texts, or codes with a dictionary of texts, of which only the dictionary is looked at.

    Returns
    -------
    pa.Array
        Of the same type; the very same array where nothing is to be done.
    """
    return _each(texts, safe)


def plain_array(texts: pa.Array) -> pa.Array:
    """All texts of a column as they were before :func:`safe_array`.

    Parameters
    ----------
    texts : pa.Array
        Texts, or codes with a dictionary of texts.

    Returns
    -------
    pa.Array
        Of the same type; the very same array where nothing is to be done.
    """
    return _each(texts, plain)


def _each(texts: pa.Array, change: Callable[[str], str]) -> pa.Array:
    """Change each distinct text of a column once."""
    coded = pa.types.is_dictionary(texts.type)
    codes = texts if coded else texts.dictionary_encode()
    old = codes.dictionary.to_pylist()
    new = [None if text is None else change(text) for text in old]
    if new == old:
        return texts
    values = pa.array(new, codes.dictionary.type)
    changed = pa.DictionaryArray.from_arrays(codes.indices, values)
    return changed if coded else changed.dictionary_decode()


def csv_text(rows: Iterable[Sequence[Cell]], delimiter: str = ",") -> str:
    r"""Rows as the text of a CSV file.

    Parameters
    ----------
    rows : iterable of sequence of str, int, float or None
        Texts are made safe; numbers are spelled with all their digits; what is None or NaN is an
        empty cell.
    delimiter : str
        One character between fields.

    Returns
    -------
    str
        Lines that end in ``\n``. A field with a delimiter, a quote or an end of line is in quotes,
        and a quote within it is doubled.

    References
    ----------
    Shafranovich (2005). Common format and MIME type for comma-separated values (CSV) files.
    RFC 4180, section 2.

    Examples
    --------
    >>> csv_text([["cue", "rate"], ["=late", 0.5], ['6" tree, old', None]])
    'cue,rate\n\'=late,0.5\n"6"" tree, old",\n'
    """
    return "".join(_line(row, delimiter) for row in rows)


def write_csv(path: Path, header: Sequence[str], rows: Iterable[Sequence[Cell]]) -> None:
    r"""Write a CSV file: UTF-8, lines that end in ``\n``, safe cells; see :func:`csv_text`.

    Parameters
    ----------
    path : Path
        The file.
    header : sequence of str
        Names of the columns.
    rows : iterable of sequence of str, int, float or None
        As many cells in each.
    """
    with path.open("w", encoding="utf-8", newline="") as file:
        file.write(csv_text([header]))
        file.writelines(_line(row, ",") for row in rows)


def _line(row: Sequence[Cell], delimiter: str) -> str:
    """One line; a line of a single empty cell is in quotes, or readers would skip it."""
    fields = [_field(cell, delimiter) for cell in row]
    return (delimiter.join(fields) if fields != [""] else '""') + "\n"


def _field(cell: Cell, delimiter: str) -> str:
    """One cell."""
    if cell is None or cell != cell:  # only NaN differs from itself
        return ""
    if isinstance(cell, float):
        return float.__repr__(cell)
    text = safe(cell) if isinstance(cell, str) else str(cell)
    if delimiter in text or _TO_QUOTE.search(text):
        return '"' + text.replace('"', '""') + '"'
    return text
