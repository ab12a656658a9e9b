"""Thrift's compact protocol, as far as the footers of Parquet files need it.

Footers are taken apart and put together without knowing what each field means, so that nothing of
them is lost. Written to the published specification of the protocol (Apache Thrift,
``doc/specs/thrift-compact-protocol.md``).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

_TRUE: Final = 1
_FALSE: Final = 2
_BYTE: Final = 3
_INTEGERS: Final = (4, 5, 6)
_DOUBLE: Final = 7
_BINARY: Final = 8
_LISTS: Final = (9, 10)
STRUCT: Final = 12
#: A longer list has its length after the byte that says of what it is.
_LONG: Final = 15
_LEAST_BITS: Final = 0x7F
_MORE: Final = 0x80


@dataclass(slots=True)
class Struct:
    """A struct: its fields, by their numbers, each with the protocol's code of its type."""

    fields: dict[int, tuple[int, Any]]

    def __getitem__(self, number: int) -> Any:
        return self.fields[number][1]

    def __contains__(self, number: int) -> bool:
        return number in self.fields

    def put(self, number: int, value: Any) -> None:
        """Change the value of a field that is there."""
        self.fields[number] = (self.fields[number][0], value)


@dataclass(slots=True)
class List:
    """A list, with the protocol's code of the type of its elements."""

    kind: int
    items: list[Any]


def read_struct(data: bytes) -> Struct:
    """Read one struct.

    Parameters
    ----------
    data : bytes
        From its first byte on.

    Returns
    -------
    Struct
        With all fields, also such as nobody knows.

    Raises
    ------
    ValueError
        If the bytes are no struct of this protocol.
    """
    try:
        return _Reading(data).struct()
    except IndexError as short:
        raise ValueError("the struct has no end") from short


class _Reading:
    """Reads values one after the other."""

    def __init__(self, data: bytes) -> None:
        self._data = data
        self._at = 0

    def struct(self) -> Struct:
        fields: dict[int, tuple[int, Any]] = {}
        number = 0
        data = self._data
        while True:
            head = data[self._at]
            self._at += 1
            if head == 0:
                return Struct(fields)
            kind, step = head & 0x0F, head >> 4
            number = number + step if step else _unzigzag(self._varint())
            fields[number] = (kind, kind == _TRUE if kind <= _FALSE else self._value(kind))

    def _varint(self) -> int:
        data, at = self._data, self._at
        byte = data[at]
        at += 1
        value = byte & _LEAST_BITS
        shift = 7
        while byte & _MORE:
            byte = data[at]
            at += 1
            value |= (byte & _LEAST_BITS) << shift
            shift += 7
        self._at = at
        return value

    def _value(self, kind: int) -> Any:
        if kind in _INTEGERS:
            return _unzigzag(self._varint())
        if kind == _BINARY:
            return self._bytes(self._varint())
        if kind == STRUCT:
            return self.struct()
        if kind in _LISTS:
            head = self._data[self._at]
            self._at += 1
            length, of = head >> 4, head & 0x0F
            if length == _LONG:
                length = self._varint()
            if of <= _FALSE:
                return List(of, list(self._bytes(length)))
            return List(of, [self._value(of) for _ in range(length)])
        if kind == _BYTE:
            return self._bytes(1)
        if kind == _DOUBLE:
            return self._bytes(8)
        raise ValueError(f"no type has the code {kind}")

    def _bytes(self, length: int) -> bytes:
        taken = self._data[self._at : self._at + length]
        if len(taken) < length:
            raise IndexError
        self._at += length
        return taken


def written(struct: Struct) -> bytes:
    """Write one struct.

    Parameters
    ----------
    struct : Struct
        As :func:`read_struct` gives it.

    Returns
    -------
    bytes
        In the order of the numbers of the fields.
    """
    out = bytearray()
    _write_struct(out, struct)
    return bytes(out)


def _write_struct(out: bytearray, struct: Struct) -> None:
    before = 0
    for number, (known, value) in sorted(struct.fields.items()):
        kind = known
        if kind <= _FALSE:
            kind = _TRUE if value else _FALSE
        step = number - before
        if 0 < step < 16:
            out.append(step << 4 | kind)
        else:
            out.append(kind)
            _write_varint(out, _zigzag(number))
        before = number
        if kind > _FALSE:
            _write_value(out, kind, value)
    out.append(0)


def _write_value(out: bytearray, kind: int, value: Any) -> None:
    if kind in _INTEGERS:
        _write_varint(out, _zigzag(value))
    elif kind == _BINARY:
        _write_varint(out, len(value))
        out += value
    elif kind == STRUCT:
        _write_struct(out, value)
    elif kind in _LISTS:
        length = len(value.items)
        if length < _LONG:
            out.append(length << 4 | value.kind)
        else:
            out.append(_LONG << 4 | value.kind)
            _write_varint(out, length)
        if value.kind <= _FALSE:
            out += bytes(value.items)
        else:
            for item in value.items:
                _write_value(out, value.kind, item)
    else:
        out += value


def _write_varint(out: bytearray, value: int) -> None:
    while value > _LEAST_BITS:
        out.append(value & _LEAST_BITS | _MORE)
        value >>= 7
    out.append(value)


def _zigzag(value: int) -> int:
    return value << 1 if value >= 0 else (-value << 1) - 1


def _unzigzag(value: int) -> int:
    return value >> 1 ^ -(value & 1)
