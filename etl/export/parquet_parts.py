"""Parquet files put together from parts that were written elsewhere, without decoding a value.

A part is a whole Parquet file in memory, made by whichever process. Its row groups are taken over
byte by byte, and only the places named in its footer are moved by as much as the bytes are. So the
encoding and compressing of tables, a third of a build, is done by the workers, and what passes
between processes is small.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Final

from etl.export.parquet_footer import Footer

_MAGIC: Final = b"PAR1"
#: The length of the footer, and the magic number after it.
_TAIL: Final = 8


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
        self._footer: Footer | None = None
        self._groups: list[bytes] = []
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
        footer = Footer(part[end:-_TAIL])
        if self._footer is None:
            self._footer = footer
        if not footer.rows:
            return
        moved = self._at - len(_MAGIC)
        for group in footer.groups:
            self._groups.append(group.moved(moved, len(self._groups)))
        self.rows += footer.rows
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
        data = self._footer.written(self.rows, self._groups, notes)
        self._file.write(data)
        self._file.write(len(data).to_bytes(4, "little"))
        self._file.write(_MAGIC)
        self._file.close()

    def abandon(self) -> None:
        """Close the file without finishing it."""
        self._file.close()
