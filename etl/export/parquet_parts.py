"""Parquet files put together from parts that were written elsewhere, without decoding a value.

A part is a whole Parquet file in memory, made by whichever process. Its row groups are taken over
byte by byte, and only the places named in its footer are moved by as much as the bytes are (Apache
Parquet format, ``parquet.thrift``). So the encoding and compressing of tables, a third of a build,
is done by the workers, and what passes between processes is small.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Final

from etl.export.thrift_compact import STRUCT, List, Struct, read_struct, written

_MAGIC: Final = b"PAR1"
#: The length of the footer, and the magic number after it.
_TAIL: Final = 8
_STRUCTS: Final = 9  # the protocol's code of a list
_TEXT: Final = 8  # and of a text
# Fields of FileMetaData …
_ROWS, _GROUPS, _NOTES = 3, 4, 5
# … of RowGroup …
_COLUMNS, _GROUP_AT, _ORDINAL = 1, 5, 7
# … of ColumnChunk, the places only, and where its ColumnMetaData is …
_CHUNK_AT, _META, _CHUNK_PLACES = 2, 3, (4, 6)
# … and of ColumnMetaData: data, index and dictionary pages, and the Bloom filter.
_PLACES: Final = (9, 10, 11, 14)
_MOST_ORDINAL: Final = 2**15


class ParquetParts:
    """A Parquet file to which parts are added.

    Parameters
    ----------
    path : Path
        The file.
    """

    def __init__(self, path: Path) -> None:
        self._file = path.open("wb")
        self._at = self._file.write(_MAGIC)
        self._footer: Struct | None = None
        self._groups: list[Struct] = []
        self.rows = 0

    def add(self, part: bytes) -> None:
        """Take over the row groups of a part; all parts have the same schema.

        Parameters
        ----------
        part : bytes
            A Parquet file; without rows only its schema is taken.
        """
        length = int.from_bytes(part[-_TAIL:-4], "little")
        end = len(part) - _TAIL - length
        footer = read_struct(part[end:-_TAIL])
        if self._footer is None:
            self._footer = footer
        if not footer[_ROWS]:
            return
        moved = self._at - len(_MAGIC)
        for group in footer[_GROUPS].items:
            _move_group(group, moved, len(self._groups))
            self._groups.append(group)
        self.rows += footer[_ROWS]
        self._at += self._file.write(memoryview(part)[len(_MAGIC) : end])

    def close(self, notes: Mapping[str, str]) -> None:
        """Write the footer.

        Parameters
        ----------
        notes : mapping of str to str
            The metadata of the file.
        """
        if self._footer is None:
            raise ValueError("a Parquet file is made of one part at least")
        footer = self._footer
        footer.put(_ROWS, self.rows)
        footer.put(_GROUPS, List(STRUCT, self._groups))
        entries = [
            Struct({1: (_TEXT, key.encode("utf-8")), 2: (_TEXT, value.encode("utf-8"))})
            for key, value in notes.items()
        ]
        footer.fields[_NOTES] = (_STRUCTS, List(STRUCT, entries))
        data = written(footer)
        self._file.write(data)
        self._file.write(len(data).to_bytes(4, "little"))
        self._file.write(_MAGIC)
        self._file.close()

    def abandon(self) -> None:
        """Close the file without finishing it."""
        self._file.close()


def _move_group(group: Struct, moved: int, ordinal: int) -> None:
    """Move every place that a row group names."""
    if _GROUP_AT in group:
        group.put(_GROUP_AT, group[_GROUP_AT] + moved)
    if _ORDINAL in group:
        # The field has 16 bits and may be absent.
        if ordinal < _MOST_ORDINAL:
            group.put(_ORDINAL, ordinal)
        else:
            del group.fields[_ORDINAL]
    for chunk in group[_COLUMNS].items:
        if chunk[_CHUNK_AT]:  # 0 where writers leave it, as the format now asks
            chunk.put(_CHUNK_AT, chunk[_CHUNK_AT] + moved)
        for place in _CHUNK_PLACES:
            if place in chunk:
                chunk.put(place, chunk[place] + moved)
        meta = chunk[_META]
        for place in _PLACES:
            if place in meta:
                meta.put(place, meta[place] + moved)
