"""Work shared by test processes is done once, and a failure is known to all."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.recovery.shared_work import share


def test_a_piece_is_done_once(tmp_path: Path) -> None:
    """Whoever comes later finds the work done."""
    done: list[str] = []
    for _ in range(2):
        share(tmp_path, {name: lambda name=name: done.append(name) for name in ("one", "two")})
    assert done == ["one", "two"]


def test_work_that_others_began_is_left_to_them(tmp_path: Path) -> None:
    """What is begun is not begun again; only the rest is done."""
    (tmp_path / "one.begun").mkdir()
    (tmp_path / "one.done").touch()
    done: list[str] = []
    share(tmp_path, {name: lambda name=name: done.append(name) for name in ("one", "two")})
    assert done == ["two"]


def test_a_failure_is_told_to_all(tmp_path: Path) -> None:
    """The one who fails sees why, and so does everybody who waits."""

    def fail() -> None:
        raise ValueError("no such orchard")

    with pytest.raises(ValueError, match="no such orchard"):
        share(tmp_path, {"one": fail})
    with pytest.raises(RuntimeError, match=r"^one failed: ValueError: no such orchard$"):
        share(tmp_path, {"one": fail})
