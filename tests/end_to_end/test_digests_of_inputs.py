"""The run record tells of the very inputs that were used."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path
from typing import Any

import pytest

import etl
from etl.session import run
from tests.simulator import write_bulk_study


def recorded(folder: Path) -> dict[str, str]:
    """The digest of each input by its role."""
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    return {one["role"]: one["sha256"] for one in record["inputs"]}


def test_files_edited_meanwhile_are_not_those_of_the_record(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Study file, regions and facts: what was read counts, not what lies there at the end."""
    study_file = write_bulk_study(tmp_path, readers=2, trials=3, fixations=5).study_file
    files = {
        "study file": study_file,
        "regions": tmp_path / "regions.csv",
        "facts": tmp_path / "trial_list.csv",
    }
    used = {role: path.read_bytes() for role, path in files.items()}
    real = run.finish_groups

    def edited(*arguments: Any) -> Any:
        for path in files.values():
            path.write_bytes(path.read_bytes() + b"\n")
        return real(*arguments)

    monkeypatch.setattr(run, "finish_groups", edited)
    found = recorded(etl.build(etl.load_study(study_file)).folder)
    for role, data in used.items():
        assert found[role] == hashlib.sha256(data).hexdigest(), role
