"""Footers of Parquet files: which bytes say where pages are, so that these can be moved.

A footer is a struct in Thrift's compact protocol (Apache Thrift,
``doc/specs/thrift-compact-protocol.md``) by the definitions of Apache Parquet (``parquet.thrift``).
It is not decoded but walked over: all bytes stay as they are but those of the numbers that must
change. So nothing is lost that a writer puts there, and a footer takes a fraction of a millisecond.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Final

# The protocol's codes of types. Booleans have no bytes of their own in a struct.
_NO_BYTES: Final = (1, 2)
_BYTE: Final = 3
_INTEGERS: Final = (4, 5, 6)
_DOUBLE: Final = 7
_TEXT: Final = 8
_LISTS: Final = (9, 10)
_LIST: Final = 9
_STRUCT: Final = 12
#: A list of more has its length after the byte that says of what it is.
_LONG: Final = 15
_BITS: Final = 0x7F
_MORE: Final = 0x80

# Fields of FileMetaData …
ROWS: Final = 3
GROUPS: Final = 4
NOTES: Final = 5
# … of RowGroup: its columns, where it begins, which one it is …
_COLUMNS, _GROUP_AT, _ORDINAL = 1, 5, 7
# … of ColumnChunk: where it begins, what is told of it, where its indexes are …
_CHUNK_PLACES, _META = frozenset({2, 4, 6}), 3
# … and of ColumnMetaData: data, index and dictionary pages, and the Bloom filter.
_PAGE_PLACES: Final = frozenset({9, 10, 11, 14})


@dataclass(frozen=True, slots=True)
class GroupBytes:
    """What a footer says of a row group.

    Attributes
    ----------
    between : list of bytes
        What stays as it is, before, between and after the places.
    places : list of int
        Where things are in the file.
    ordinal : int
        Which of the places is the number of the row group among all instead; -1 for none.
    """

    between: list[bytes]
    places: list[int]
    ordinal: int

    def moved(self, by: int, ordinal: int) -> bytes:
        """The same, of a row group that lies elsewhere.

        Parameters
        ----------
        by : int
            How many bytes further on it lies.
        ordinal : int
            Its number among the row groups. The field has 16 bits; what is beyond that is written
            as the last number there is, which no reader looks at.

        Returns
        -------
        bytes
        """
        out = [self.between[0]]
        for number, place in enumerate(self.places):
            if number == self.ordinal:
                value = min(ordinal, 2**15 - 1)
            else:
                # 0 is where writers leave a place that the format does without by now.
                value = place + by if place else 0
            out.append(_varint(value << 1))
            out.append(self.between[number + 1])
        return b"".join(out)


class Footer:
    """A footer taken apart as far as parts of files need it.

    Parameters
    ----------
    data : bytes
        The footer.

    Raises
    ------
    ValueError
        If it is none.
    """

    def __init__(self, data: bytes) -> None:
        self._data = data
        #: The fields by number: the type, and the bytes.
        self._fields: dict[int, tuple[int, bytes]] = {}
        self.groups: list[GroupBytes] = []
        self.rows = 0
        try:
            self._walk(0, self._field)
        except IndexError as short:
            raise ValueError("the footer has no end") from short

    def _field(self, number: int, kind: int, at: int) -> int:
        """Take a field of the footer."""
        end = self._items(at, self._group) if number == GROUPS else self._skip(kind, at)
        self._fields[number] = (kind, self._data[at:end])
        if number == ROWS:
            self.rows = self._number(at)[0] >> 1
        return end

    def _group(self, at: int) -> int:
        """Take a row group."""
        places: list[tuple[int, int, int]] = []
        ordinal: list[int] = []

        def place(at: int) -> int:
            value, end = self._number(at)
            places.append((at, end, value >> 1))
            return end

        def of_meta(number: int, kind: int, at: int) -> int:
            return place(at) if number in _PAGE_PLACES else self._skip(kind, at)

        def of_chunk(number: int, kind: int, at: int) -> int:
            if number in _CHUNK_PLACES:
                return place(at)
            return self._walk(at, of_meta) if number == _META else self._skip(kind, at)

        def of_group(number: int, kind: int, at: int) -> int:
            if number == _COLUMNS:
                return self._items(at, lambda at: self._walk(at, of_chunk))
            if number == _ORDINAL:
                ordinal.append(len(places))
            return place(at) if number in (_GROUP_AT, _ORDINAL) else self._skip(kind, at)

        end = self._walk(at, of_group)
        between, before = [], at
        for start, stop, _ in places:
            between.append(self._data[before:start])
            before = stop
        between.append(self._data[before:end])
        values = [value for _, _, value in places]
        self.groups.append(GroupBytes(between, values, ordinal[0] if ordinal else -1))
        return end

    def _walk(self, at: int, take: Callable[[int, int, int], int]) -> int:
        """Go through the fields of a struct; ``take`` says where each ends."""
        data, number = self._data, 0
        while True:
            head = data[at]
            at += 1
            if head == 0:
                return at
            kind, step = head & 0x0F, head >> 4
            if step:
                number += step
            else:
                coded, at = self._number(at)
                number = coded >> 1
            at = take(number, kind, at)

    def _items(self, at: int, take: Callable[[int], int]) -> int:
        """Go through the structs of a list."""
        length, _, at = self._list_head(at)
        for _ in range(length):
            at = take(at)
        return at

    def _list_head(self, at: int) -> tuple[int, int, int]:
        """How many elements, of which type, and where the first begins."""
        head = self._data[at]
        at += 1
        length = head >> 4
        if length == _LONG:
            length, at = self._number(at)
        return length, head & 0x0F, at

    def _number(self, at: int) -> tuple[int, int]:
        """A number of variable length, and where it ends."""
        data = self._data
        byte = data[at]
        at += 1
        value, shift = byte & _BITS, 7
        while byte & _MORE:
            byte = data[at]
            at += 1
            value |= (byte & _BITS) << shift
            shift += 7
        return value, at

    def _skip(self, kind: int, at: int) -> int:
        """Where a value ends."""
        data = self._data
        if kind in _INTEGERS:
            while data[at] & _MORE:
                at += 1
            return at + 1
        if kind == _TEXT:
            length, at = self._number(at)
            return at + length
        if kind in _NO_BYTES:
            return at
        if kind == _STRUCT:
            return self._walk(at, lambda _, kind, at: self._skip(kind, at))
        if kind in _LISTS:
            length, kind, at = self._list_head(at)
            if kind in (*_NO_BYTES, _BYTE):
                return at + length
            for _ in range(length):
                at = self._skip(kind, at)
            return at
        if kind in (_BYTE, _DOUBLE):
            return at + (1 if kind == _BYTE else 8)
        raise ValueError(f"no type has the code {kind}")

    def written(self, rows: int, groups: list[bytes], notes: Mapping[str, str]) -> bytes:
        """The same footer of another file.

        Parameters
        ----------
        rows : int
            How many the file has.
        groups : list of bytes
            Its row groups, from :meth:`GroupBytes.moved`.
        notes : mapping of str to str
            The metadata of the file.

        Returns
        -------
        bytes
        """
        entries = [
            b"\x18" + _text(key) + b"\x18" + _text(value) + b"\x00" for key, value in notes.items()
        ]
        fields = {
            **self._fields,
            ROWS: (_INTEGERS[-1], _varint(rows << 1)),
            GROUPS: (_LIST, _structs(groups)),
            NOTES: (_LIST, _structs(entries)),
        }
        out, before = [], 0
        for number, (kind, data) in sorted(fields.items()):
            out.append(bytes([(number - before) << 4 | kind]))
            out.append(data)
            before = number
        return b"".join([*out, b"\x00"])


def _structs(items: list[bytes]) -> bytes:
    """A list of structs."""
    head = (
        bytes([len(items) << 4 | _STRUCT])
        if len(items) < _LONG
        else bytes([_LONG << 4 | _STRUCT]) + _varint(len(items))
    )
    return b"".join([head, *items])


def _text(text: str) -> bytes:
    """A text with its length."""
    data = text.encode("utf-8")
    return _varint(len(data)) + data


def _varint(value: int) -> bytes:
    """A number of variable length."""
    out = bytearray()
    while value > _BITS:
        out.append(value & _BITS | _MORE)
        value >>= 7
    out.append(value)
    return bytes(out)
