"""Where each key of a TOML file stands: tomllib reads values and forgets their lines."""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right
from collections.abc import Mapping, Sequence

#: The way to a value: keys of tables, and places in arrays from 0.
KeyPath = tuple[str | int, ...]

_SPACE = re.compile(r"[ \t]*")
_GAP = re.compile(r"(?:[ \t\n]|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_BASIC = re.compile(r'"(?:\\.|[^"\\\n])*"')
_LITERAL = re.compile(r"'[^'\n]*'")
# Up to two quotes may stand right before the three that close a multi-line string.
_LONG_BASIC = re.compile(r'"""(?:\\.|[^\\])*?"""(?:"{0,2})', re.DOTALL)
_LONG_LITERAL = re.compile(r"'''.*?'''(?:'{0,2})", re.DOTALL)
# Numbers, booleans and dates; a date may have a space before the time.
_BARE_VALUE = re.compile(r"[^,\]}#\n]*")


def lines_of_keys(text: str) -> dict[KeyPath, int]:
    r"""Find the line of every key and of every element of an array.

    Parameters
    ----------
    text : str
        A TOML document that tomllib accepts.

    Returns
    -------
    dict of tuple to int
        For each path of keys (text) and places in arrays (whole numbers from 0) the line, from 1,
        where its key, its table's header or its element begins. A table that is only implied has
        the line of the first key that implies it.

    References
    ----------
    TOML 1.0.0, https://toml.io/en/v1.0.0

    Examples
    --------
    >>> lines_of_keys('[logs]\nfiles = [\n  "a.tsv",\n  "b.tsv",\n]\n')
    {('logs',): 1, ('logs', 'files'): 2, ('logs', 'files', 0): 3, ('logs', 'files', 1): 4}
    """
    return _Scanner(text.replace("\r\n", "\n")).scan()


def nearest_line(lines: Mapping[KeyPath, int], path: Sequence[str | int]) -> int | None:
    """The line of a path, or of the nearest thing around it that has one.

    Parameters
    ----------
    lines : mapping of tuple to int
        From :func:`lines_of_keys`.
    path : sequence of str and int
        Keys of tables, and places in arrays from 0.

    Returns
    -------
    int or None
        None where not even the outermost table is in the file.

    Examples
    --------
    >>> nearest_line({("screen",): 7}, ("screen", "width_px"))
    7
    """
    for length in range(len(path), 0, -1):
        line = lines.get(tuple(path[:length]))
        if line is not None:
            return line
    return None


class _Scanner:
    """Walks a valid document once, from its start to its end."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.at = 0
        self.starts = [0, *(found.end() for found in re.finditer("\n", text))]
        self.lines: dict[KeyPath, int] = {}
        self.array_tables: dict[KeyPath, int] = {}

    def scan(self) -> dict[KeyPath, int]:
        """Read statements until the end."""
        table: KeyPath = ()
        self._skip(_GAP)
        while self.at < len(self.text):
            if self.text.startswith("[", self.at):
                table = self._header()
            else:
                self._pair(table)
            self._skip(_GAP)
        return self.lines

    def _skip(self, pattern: re.Pattern[str]) -> str:
        """Go past what matches here, and return it."""
        found = pattern.match(self.text, self.at)
        if found is None:
            return ""
        self.at = found.end()
        return found.group()

    def _line(self) -> int:
        """The line of the present place."""
        return bisect_right(self.starts, self.at)

    def _note(self, path: KeyPath, line: int, *, implied: bool = False) -> None:
        """Record a line; one that only implies a table gives way to the table's own header."""
        if implied:
            self.lines.setdefault(path, line)
        else:
            self.lines[path] = line

    def _header(self) -> KeyPath:
        """Read ``[table]`` or ``[[element]]``, and return where its keys go."""
        line = self._line()
        brackets = 2 if self.text.startswith("[[", self.at) else 1
        self.at += brackets
        keys = self._keys()
        self.at += brackets
        path: KeyPath = ()
        for place, key in enumerate(keys):
            path = (*path, key)
            last = place == len(keys) - 1
            self._note(path, line, implied=not last or (brackets == 2 and path in self.lines))
            if last and brackets == 2:
                self.array_tables[path] = self.array_tables.get(path, -1) + 1
            if path in self.array_tables and (brackets == 2 or not last):
                path = (*path, self.array_tables[path])
                self._note(path, line, implied=not last)
        return path

    def _keys(self) -> list[str]:
        """Read a key, in parts where it has dots, up to what follows it."""
        keys = []
        while True:
            self._skip(_SPACE)
            written = self._skip(_BARE_KEY)
            if not written:
                quoted = self._skip(_BASIC) or self._skip(_LITERAL)
                written = tomllib.loads(f"key = {quoted}")["key"]
            keys.append(written)
            self._skip(_SPACE)
            if not self.text.startswith(".", self.at):
                return keys
            self.at += 1

    def _pair(self, table: KeyPath) -> None:
        """Read ``key = value``."""
        line = self._line()
        keys = self._keys()
        for length in range(1, len(keys)):
            self._note((*table, *keys[:length]), line, implied=True)
        path = (*table, *keys)
        self._note(path, line)
        self.at += len("=")
        self._skip(_SPACE)
        self._value(path)

    def _value(self, path: KeyPath) -> None:
        """Go past a value, noting what is inside it."""
        for opening, pattern in (
            ('"""', _LONG_BASIC),
            ("'''", _LONG_LITERAL),
            ('"', _BASIC),
            ("'", _LITERAL),
        ):
            if self.text.startswith(opening, self.at):
                self._skip(pattern)
                return
        if self.text.startswith("[", self.at):
            self._array(path)
        elif self.text.startswith("{", self.at):
            self._inline_table(path)
        else:
            self._skip(_BARE_VALUE)

    def _array(self, path: KeyPath) -> None:
        """Go past an array, noting its elements."""
        self.at += len("[")
        self._skip(_GAP)
        place = 0
        while not self.text.startswith("]", self.at):
            self._note((*path, place), self._line())
            self._value((*path, place))
            self._next()
            place += 1
        self.at += len("]")

    def _inline_table(self, path: KeyPath) -> None:
        """Go past an inline table, noting its keys."""
        self.at += len("{")
        self._skip(_GAP)
        while not self.text.startswith("}", self.at):
            self._pair(path)
            self._next()
        self.at += len("}")

    def _next(self) -> None:
        """Go past a comma and the gap around it."""
        self._skip(_GAP)
        if self.text.startswith(",", self.at):
            self.at += len(",")
            self._skip(_GAP)
