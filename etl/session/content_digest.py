"""A digest of what values hold, whoever made them and wherever they lie in memory.

It tells whether work that was done before was the same work. What it does not know how to look into
it refuses, so that nothing which matters can go by unseen.
"""

from __future__ import annotations

import hashlib
import re
import sys
from collections.abc import Mapping, Set
from enum import Enum
from functools import cache
from importlib import metadata, resources
from importlib.resources.abc import Traversable
from pathlib import Path, PurePath
from typing import Any, Final

import numpy as np

from etl.pseudonyms import Pseudonyms

#: Libraries by which the same inputs could give other results or other bytes.
LIBRARIES: Final = ("numpy", "pandas", "pyarrow", "pydantic", "scipy", "shapely")
_PLAIN: Final = (str, bytes, int, float, bool, complex, type(None))


def content_digest(*values: object) -> str:
    """The digest of some values.

    Parameters
    ----------
    *values : object
        Texts, numbers, arrays, containers, and objects of this program or of pydantic's made of
        such. The order of mappings counts.

    Returns
    -------
    str
        SHA-256 in hexadecimal signs.

    Raises
    ------
    TypeError
        If there is something among them of which it is not known what it holds.

    Examples
    --------
    >>> content_digest("a", [1, 2.0]) == content_digest("a", [1, 2.0])
    True
    >>> content_digest(1) == content_digest(1.0)
    False
    """
    digest = hashlib.sha256()
    _feed(digest, values)
    return digest.hexdigest()


def _feed(digest: Any, value: object) -> None:
    """Add a value, with its type and its length, so that no two run into each other."""
    kind = type(value)
    if kind in _PLAIN:
        data = value if isinstance(value, bytes) else repr(value).encode("utf-8", "surrogatepass")
        _mark(digest, kind.__name__, len(data))
        digest.update(data)
    elif isinstance(value, np.ndarray | np.generic):
        _feed_array(digest, np.asarray(value))
    elif isinstance(value, tuple | list):
        _mark(digest, kind.__qualname__, len(value))
        if all(type(item) is str for item in value):  # many and short: all at once
            _feed(digest, repr(value))
            return
        for item in value:
            _feed(digest, item)
    elif isinstance(value, Mapping):
        _mark(digest, "mapping", len(value))
        for key, item in value.items():
            _feed(digest, key)
            _feed(digest, item)
    elif isinstance(value, Set):
        _mark(digest, "set", len(value))
        for one in sorted(content_digest(item) for item in value):
            digest.update(one.encode("ascii"))
    else:
        _feed_object(digest, value)


def _feed_array(digest: Any, array: np.ndarray[Any, Any]) -> None:
    """Add an array of numbers or of shapes."""
    _mark(digest, f"array {array.dtype.str} {array.shape}", array.nbytes)
    if array.dtype.hasobject:
        for item in np.ravel(array).tolist():
            well_known = getattr(item, "wkb", None)
            if not isinstance(well_known, bytes):
                raise TypeError(f"it is not known what a {type(item).__qualname__} holds")
            _feed(digest, well_known)
    else:
        digest.update(np.ascontiguousarray(array).data)


def _feed_object(digest: Any, value: object) -> None:
    """Add an object by its type and what it is made of."""
    kind = type(value)
    name = f"{kind.__module__}.{kind.__qualname__}"
    if isinstance(value, Pseudonyms):
        # What it has learnt so far is no part of what it does.
        parts: object = (value.key, value.folder)
    elif isinstance(value, PurePath):
        name, parts = "path", str(value)
    elif isinstance(value, Enum):
        parts = value.name
    elif isinstance(value, re.Pattern):
        parts = (value.pattern, value.flags)
    elif isinstance(value, type) or (callable(value) and hasattr(value, "__qualname__")):
        parts = (value.__module__, value.__qualname__)
    elif kind.__module__.split(".")[0] == "etl":
        parts = value.__getstate__()
    else:
        raise TypeError(f"it is not known what a {name} holds")
    _mark(digest, name, 1)
    _feed(digest, parts)


def _mark(digest: Any, name: str, length: int) -> None:
    """Say what comes, and how much of it."""
    digest.update(f"{name}:{length};".encode())


@cache
def program_digest() -> str:
    """The digest of this program, of Python and of the libraries by which results could differ.

    Returns
    -------
    str
        SHA-256 in hexadecimal signs.
    """
    digest = hashlib.sha256(sys.version.encode())
    for name in LIBRARIES:
        digest.update(f"{name} {metadata.version(name)};".encode())
    for path, data in sorted(_files(resources.files("etl"), "")):
        _mark(digest, path, len(data))
        digest.update(data)
    return digest.hexdigest()


def _files(folder: Traversable, before: str) -> list[tuple[str, bytes]]:
    """The files of the program, with their contents."""
    found = []
    for path in folder.iterdir():
        name = f"{before}{path.name}"
        if path.is_dir():
            if path.name != "__pycache__":
                found += _files(path, f"{name}/")
        elif Path(name).suffix != ".pyc":
            found.append((name, path.read_bytes()))
    return found
