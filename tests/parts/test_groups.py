"""Readers sorted into groups: by what belongs to each, not by who else is there."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import etl
from etl.session import reader_groups
from etl.session.reader_groups import FIXATIONS_A_GROUP, group_sizes
from etl.tables import TABLES
from tests.simulator import write_bulk_study

readers = st.dictionaries(
    st.text("abcdefgh0123456789", min_size=1, max_size=6),
    st.one_of(st.integers(0, 9000), st.integers(0, 200_000)),
    min_size=1,
    max_size=120,
)


def cut(own: dict[str, int]) -> list[tuple[str, ...]]:
    """The groups."""
    names = sorted(own)
    sizes = group_sizes(names, [own[name] for name in names])
    assert sum(sizes) == len(names)
    assert min(sizes) > 0
    ends = np.cumsum(sizes).tolist()
    return [tuple(names[end - size : end]) for end, size in zip(ends, sizes, strict=True)]


@given(readers)
def test_no_group_of_several_is_too_large(own: dict[str, int]) -> None:
    """Only a reader alone may have more than twice the usual."""
    for group in cut(own):
        assert len(group) == 1 or sum(own[name] for name in group) <= 2 * FIXATIONS_A_GROUP


def test_groups_have_about_the_size_that_was_chosen() -> None:
    """2,000 readers of one session each."""
    own = {f"R{number:04}": 2000 for number in range(2000)}
    sizes = [sum(own[name] for name in group) for group in cut(own)]
    assert 0.5 * FIXATIONS_A_GROUP < np.mean(sizes) < 1.5 * FIXATIONS_A_GROUP


@pytest.mark.parametrize("new", ["R0000a", "R1000a", "R1999a", "A", "Z"])
def test_one_reader_more_leaves_nearly_all_groups_as_they_are(new: str) -> None:
    """The group where the reader belongs is another; perhaps the next few, never the rest."""
    own = {f"R{number:04}": 1500 + number % 1000 for number in range(2000)}
    before, after = set(cut(own)), set(cut({**own, new: 1700}))
    assert len(before - after) <= 3
    assert len(after - before) <= 3
    assert len(before) > 50


def test_groups_of_any_size_give_the_same_rows(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One reader a group, some, all: every table holds the same."""
    made = write_bulk_study(tmp_path, readers=7, trials=6, fixations=9, regions=4)
    study = etl.load_study(made.study_file)
    found = []
    for size in (1, 100, 10**9):
        monkeypatch.setattr(reader_groups, "FIXATIONS_A_GROUP", size)
        result = etl.build(study, into=tmp_path / f"out{size}")
        found.append({name: result.table(name) for name in TABLES})
    for name, first in found[0].items():
        for other in found[1:]:
            assert first.equals(other[name]), name
