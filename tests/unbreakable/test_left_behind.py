"""What a killed build left beside its folder: mended and tidied up by the next, nothing else."""

from __future__ import annotations

from pathlib import Path

import pytest

import etl
from tests.end_to_end.building import files_of, write
from tests.unbreakable.studies import TwoWays, beside, built, content


def left(target: Path) -> Path:
    """A folder of work as a killed build leaves it."""
    work = target.parent / f".{target.name}.trialwright-abcd_123"
    write(work, {"new/outcomes.csv": "half a tab", "kept/0.arrow": "fixations"})
    return work


def test_work_of_a_killed_build_is_removed(ways: TwoWays, tmp_path: Path) -> None:
    """The next build into the folder does that."""
    target = tmp_path / "out"
    left(target)
    built(ways.old, target)
    assert beside(target) == []


def test_refused_build_tidies_up_too(ways: TwoWays, tmp_path: Path) -> None:
    """Work of a dead build is nobody's, whatever becomes of this one."""
    target = tmp_path / "out"
    write(target, {"thesis.txt": "years of work\n"})
    left(target)
    with pytest.raises(etl.DataError, match="something else than an earlier build"):
        built(ways.old, target)
    assert beside(target) == []


def test_nothing_else_is_removed(ways: TwoWays, tmp_path: Path) -> None:
    """Folders of people, and work of builds into other folders, stay."""
    target = tmp_path / "out"
    write(
        tmp_path,
        {
            ".out.backup/outcomes.csv": "mine\n",
            ".out.trialwright-abcd_123": "a file of mine\n",
            ".out.trialwright-mine/outcomes.csv": "mine\n",
            ".out2.trialwright-abcd_123/new/outcomes.csv": "of another build\n",
        },
    )
    before = files_of(tmp_path)
    built(ways.old, target)
    assert {**files_of(tmp_path), **before} == files_of(tmp_path)


def test_earlier_build_moved_aside_is_put_back(ways: TwoWays, tmp_path: Path) -> None:
    """Where folders cannot change places, a kill may come between two renamings.

    The next build puts the earlier one back first, even if it is refused itself.
    """
    target = tmp_path / "out"
    expected = built(ways.old, target)
    target.rename(left(target) / "old")
    spoilt = ways.folder / "spoilt.toml"
    text = ways.new.read_text(encoding="utf-8")
    spoilt.write_text(text.replace("regions.csv", "nowhere.csv"), encoding="utf-8")
    with pytest.raises(etl.DataError, match=r"nowhere\.csv"):
        built(spoilt, target)
    spoilt.unlink()
    assert content(target) == expected
    assert beside(target) == []


def test_build_that_cannot_exchange_folders_gives_the_same(
    ways: TwoWays, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Two renamings, as on other systems, come to the same."""
    expected = built(ways.new, tmp_path / "undisturbed")
    target = tmp_path / "there" / "out"
    built(ways.old, target)
    monkeypatch.setattr("etl.export.swapping.exchange", lambda *_: False)
    assert built(ways.new, target) == expected
    assert beside(target) == []
