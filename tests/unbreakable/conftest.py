"""A small study in two ways, and small disks where the machine allows them."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.unbreakable.studies import TwoWays, two_ways


class SmallDisk:
    """A file system in memory whose size can be set."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def mount(self, options: str = "") -> None:
        """Mount it, or mount it anew with other options."""
        again = "remount," if self.folder.is_mount() else ""
        subprocess.run(
            ["mount", "-t", "tmpfs", "-o", f"{again}{options}", "tmpfs", str(self.folder)],
            check=True,
            capture_output=True,
        )

    def leave_free(self, size: int) -> None:
        """Leave so many bytes free."""
        used = shutil.disk_usage(self.folder).used
        self.mount(f"size={used + size}")


@pytest.fixture
def disk(tmp_path: Path) -> Iterator[SmallDisk]:
    """A small disk, mounted."""
    if not sys.platform.startswith("linux") or shutil.which("mount") is None:
        pytest.skip("small file systems in memory are made on Linux only")
    if os.geteuid() != 0:
        pytest.skip("this user may mount no file system")
    small = SmallDisk(tmp_path / "disk")
    small.folder.mkdir()
    try:
        small.mount("size=64m")
    except subprocess.CalledProcessError:
        pytest.skip("this machine allows no file system to be mounted")
    yield small
    subprocess.run(["umount", str(small.folder)], check=True)


@pytest.fixture(scope="session")
def ways(tmp_path_factory: pytest.TempPathFactory) -> TwoWays:
    """A small study of several logs, and two ways of building it."""
    return two_ways(tmp_path_factory.mktemp("ways"), readers=4, trials=8)
