"""Conditions that are counted and compared, against loops over combinations of levels."""

from __future__ import annotations

from itertools import product

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from etl.variants.conditions import ConditionGroups, comparisons_of, groups_of
from etl.variants.facts import Ints

Factors = dict[str, list[str]]


@st.composite
def studies(draw: st.DrawFn) -> tuple[Factors, Ints]:
    """Factors with one to three levels, and the combinations that occur; maybe none does."""
    sizes = draw(st.lists(st.integers(1, 3), max_size=3))
    # The same names of levels in several factors, as yes and no often are.
    factors = {f"factor_{at}": [f"level_{n}" for n in range(size)] for at, size in enumerate(sizes)}
    every = [*product(*map(range, sizes))]
    there = draw(st.lists(st.sampled_from(every), unique=True)) if sizes else [()]
    return factors, np.array(sorted(there), dtype=np.int64).reshape(len(there), len(sizes))


def labels_of(factors: Factors, row: tuple[int, ...]) -> tuple[str, ...]:
    """The names of the levels of a combination."""
    return tuple(levels[code] for levels, code in zip(factors.values(), row, strict=True))


def belongs(label: tuple[str, ...], combination: tuple[str, ...]) -> bool:
    """Whether a combination is one of a group."""
    return all(own in ("", other) for own, other in zip(label, combination, strict=True))


@given(studies())
def test_groups_are_those_of_a_loop(made: tuple[Factors, Ints]) -> None:
    """Which there are, what belongs to each, and with which each is compared."""
    factors, combinations = made
    rows = [labels_of(factors, tuple(row)) for row in combinations.tolist()]
    expected = [("",) * len(factors)]
    for place, levels in enumerate(factors.values()):
        expected += [("",) * place + (x,) + ("",) * (len(factors) - place - 1) for x in levels]
    if len(factors) > 1:
        expected += rows
    groups = groups_of(factors, combinations)
    assert [*groups.labels] == expected
    assert groups.members.shape == (len(expected), len(rows))
    for label, members in zip(groups.labels, groups.members.tolist(), strict=True):
        assert members == [belongs(label, row) for row in rows]
    for label, place in zip(groups.labels, groups.reference.tolist(), strict=True):
        first = tuple(
            levels[0] if own else "" for own, levels in zip(label, factors.values(), strict=True)
        )
        nothing = label == first or first not in groups.labels
        assert (None if place < 0 else groups.labels[place]) == (None if nothing else first)


@given(studies(), st.integers(0, 2**32 - 1))
def test_counts_are_added_up_as_a_loop_does(made: tuple[Factors, Ints], seed: int) -> None:
    """By group, whatever axes come before, and however many counts there are of each."""
    factors, combinations = made
    groups = groups_of(factors, combinations)
    counts = np.random.default_rng(seed).integers(0, 2**40, (2, 3, len(combinations), 4))
    counted = groups.counted(counts)
    assert counted.shape == (2, 3, len(groups.labels), 4)
    for group, members in enumerate(groups.members.tolist()):
        own = [place for place, member in enumerate(members) if member]
        for at in product(range(2), range(3), range(4)):
            whole = sum(int(counts[at[0], at[1], place, at[2]]) for place in own)
            assert counted[at[0], at[1], group, at[2]] == whole
    assert np.array_equal(groups.counted(counts[0, 0]), counted[0, 0])


@given(studies())
def test_every_level_but_the_first_is_compared(made: tuple[Factors, Ints]) -> None:
    """The groups that are told are those of the level and of the first level of its factor."""
    factors, combinations = made
    groups = groups_of(factors, combinations)
    found = comparisons_of(factors)
    if not factors:
        assert found == [("", 0, 0)]
        return
    expected = [(name, level) for name, levels in factors.items() for level in levels[1:]]
    names = [*factors]
    told = [(name, groups.labels[high][names.index(name)]) for name, high, _ in found]
    assert told == expected
    for name, high, low in found:
        for place, level in ((high, None), (low, factors[name][0])):
            label = groups.labels[place]
            at = names.index(name)
            assert label[at] == (level or label[at]) != ""
            assert all(own == "" for other, own in enumerate(label) if other != at)
        assert groups.reference[high] == low


def told(groups: ConditionGroups) -> list[tuple[str, str]]:
    """Each group in words, with what it is compared with."""
    words = [" ".join(own for own in label if own) or "all" for label in groups.labels]
    return [
        (own, words[place] if place >= 0 else "-")
        for own, place in zip(words, groups.reference.tolist(), strict=True)
    ]


FACTORS = {"cue": ["early", "late"], "fit": ["fitting", "odd"]}


def test_combinations_are_compared_with_that_of_first_levels() -> None:
    """Also where one of the others does not occur."""
    groups = groups_of(FACTORS, np.array([[0, 0], [0, 1], [1, 1]]))
    assert told(groups) == [
        ("all", "-"),
        *(("early", "-"), ("late", "early"), ("fitting", "-"), ("odd", "fitting")),
        *(("early fitting", "-"), ("early odd", "early fitting"), ("late odd", "early fitting")),
    ]


def test_combinations_have_no_reference_where_that_of_first_levels_does_not_occur() -> None:
    """They are counted all the same, and levels are compared as ever."""
    groups = groups_of(FACTORS, np.array([[0, 1], [1, 0], [1, 1]]))
    assert told(groups) == [
        ("all", "-"),
        *(("early", "-"), ("late", "early"), ("fitting", "-"), ("odd", "fitting")),
        *(("early odd", "-"), ("late fitting", "-"), ("late odd", "-")),
    ]
    assert groups.members[5:].tolist() == np.eye(3, dtype=bool).tolist()


def test_study_without_factors_has_one_group() -> None:
    """All trials, compared with nothing."""
    groups = groups_of({}, np.zeros((1, 0), dtype=np.int64))
    assert (groups.labels, groups.members.tolist(), groups.reference.tolist()) == (
        *(((),), [[True]]),
        [-1],
    )
    assert groups.counted(np.array([[1, 2, 3]])).tolist() == [[1, 2, 3]]


def test_one_factor_has_no_combinations() -> None:
    """Its levels are all that there is; one that does not occur counts nothing."""
    groups = groups_of({"cue": ["early", "late", "never"]}, np.array([[0], [1]]))
    assert told(groups) == [
        *(("all", "-"), ("early", "-"), ("late", "early"), ("never", "early")),
    ]
    assert groups.counted(np.array([[1], [10]]))[:, 0].tolist() == [11, 1, 10, 0]


def test_three_factors_are_combined_in_full() -> None:
    """Combinations of all three, not of two."""
    factors = {"a": ["0", "1"], "b": ["0", "1"], "c": ["0", "1", "2"]}
    groups = groups_of(factors, np.array([[0, 0, 0], [0, 1, 2], [1, 0, 1]]))
    assert groups.labels[8:] == (("0", "0", "0"), ("0", "1", "2"), ("1", "0", "1"))
    assert groups.reference.tolist() == [-1, -1, 1, -1, 3, -1, 5, 5, -1, 8, 8]
    assert comparisons_of(factors) == [("a", 2, 1), ("b", 4, 3), ("c", 6, 5), ("c", 7, 5)]
