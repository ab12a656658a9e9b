"""Region definition files written and read in one line."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tests.regions.reading import Read, read_file


@pytest.fixture
def read(tmp_path: Path) -> Callable[..., Read]:
    """Write a definition file and read it: ``read(kind, content, option=...)``."""

    def write_and_read(kind: str, content: str, **options: Any) -> Read:
        path = tmp_path / "regions.csv"
        path.write_bytes(content.encode("utf-8"))
        return read_file(path, kind, **options)

    return write_and_read
