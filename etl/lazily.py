"""Names of a package that are loaded when somebody asks for them.

A worker process needs a part of the program only, and starts in half the time without the rest.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib import import_module
from typing import Any


def loader(package: str, homes: Mapping[str, str]) -> Callable[[str], Any]:
    """What a package may have as its ``__getattr__`` (PEP 562).

    Parameters
    ----------
    package : str
        The name of the package.
    homes : mapping of str to str
        For each name that it offers, the module where it is at home.

    Returns
    -------
    callable
        Gives the object of a name; raises AttributeError for any other name.
    """

    def load(name: str) -> Any:
        if name not in homes:
            raise AttributeError(f"module {package!r} has no attribute {name!r}")
        return getattr(import_module(homes[name]), name)

    return load
