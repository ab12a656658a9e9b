"""What holds of every crossing, whatever varies."""

from __future__ import annotations

from itertools import product
from math import prod
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.errors import StudyError
from etl.study import Study, StudyVariants
from etl.study.rules import broken_rules
from etl.study.shape import known_keys
from etl.study.variant_keys import VARYING
from etl.study.variant_values import meaning, spelled, value_at, with_value
from etl.study.wording import toml_text
from tests.study.test_any_input import VALUES as ANY_VALUE
from tests.study.test_any_input import words
from tests.study.variants_written import study_of, variants_of

#: For some keys values of which any may go with any other, but for limits of durations.
VALUES: dict[str, list[Any]] = {
    "regions.tolerance_px": [0, 5, 20.5],
    "screening.fixations.first": [False, 1, 2],
    "screening.fixations.merge": [
        False,
        {"under_ms": 80, "within_px": 14},
        {"under_ms": 60, "within_px": 7.25},
    ],
    "screening.fixations.under_ms": [False, 40, 80, 500],
    "screening.fixations.over_ms": [False, 300, 800, 1200],
    "screening.trials.duration_ms": [False, [500, 30000], [0, 10.5]],
    "measures.outside": ["ignore", "interrupt"],
    "measures.no_opportunity": ["missing", "zero"],
}

SOME = st.lists(st.sampled_from(sorted(VALUES)), min_size=1, max_size=4, unique=True).flatmap(
    lambda keys: st.fixed_dictionaries(
        {key: st.lists(st.sampled_from(VALUES[key]), min_size=1, unique_by=repr) for key in keys}
    )
)


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> Study:
    """The study whose decisions vary."""
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(tmp_path_factory.mktemp("study"))
        return study_of()


def read(listed: dict[str, list[Any]], study: Study) -> StudyVariants | str:
    """The variants, or the message by which they are refused."""
    written = "".join(f"{key} = {toml_text(values)}\n" for key, values in listed.items())
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(study.folder)
        try:
            return variants_of(written, study)
        except StudyError as error:
            return str(error)


def with_own(key: str, values: list[Any], study: Study) -> list[Any]:
    """The values, with the study's own in front where they lack it."""
    own = value_at(study, tuple(key.split(".")))
    there = any(meaning(value) == meaning(own) for value in values)
    return values if there else [own, *values]


@given(SOME)
def test_crossing_is_every_combination_once(study: Study, listed: dict[str, list[Any]]) -> None:
    """Sound files give the whole product, with the study first; others say why not."""
    found = read(listed, study)
    whole = {key: with_own(key, values, study) for key, values in listed.items()}
    if isinstance(found, str):
        alone = any(len(values) == 1 for values in whole.values())
        limits = (
            whole.get("screening.fixations.under_ms", [80]),
            whole.get("screening.fixations.over_ms", [800]),
        )
        crossing = any(low and high and low >= high for low, high in product(*limits))
        assert alone or crossing
        assert ("nothing to vary" in found) == alone
        assert alone or "no duration lies between" in found
        return
    choices, settings = found.crossing.choices, found.crossing.settings
    order = [".".join(map(str, key)) for key in VARYING]
    assert [one.key for one in settings] == sorted(listed, key=order.index)
    assert [one.alternatives for one in settings] == [
        tuple(map(spelled, whole[one.key])) for one in settings
    ]
    assert len(found.studies) == len(choices) == prod(map(len, whole.values()))
    assert len(np.unique(choices, axis=0)) == len(choices)
    assert choices[0].tolist() == [one.base for one in settings]
    assert found.studies[0] is study
    assert found.crossing.full


@given(SOME)
def test_each_variant_holds_its_values(study: Study, listed: dict[str, list[Any]]) -> None:
    """A study has the alternatives of its row, what is not varied as it was, and no rule broken."""
    found = read(listed, study)
    if isinstance(found, str):
        return
    for made, chosen in zip(found.studies, found.crossing.choices.tolist(), strict=True):
        for setting, place in zip(found.crossing.settings, chosen, strict=True):
            key = tuple(setting.key.split("."))
            assert spelled(value_at(made, key)) == setting.alternatives[place]
        for key in VARYING:
            if (
                key[:3] != ("screening", "fixations", "merge")
                and ".".join(map(str, key)) not in listed
            ):
                assert value_at(made, key) == value_at(study, key)
        again = Study.model_validate(made.model_dump(exclude_unset=True))
        assert again.understood() == made.understood()
        assert list(broken_rules(made, ())) == []


@given(st.data())
def test_value_is_put_in_its_place_only(study: Study, data: st.DataObject) -> None:
    """A changed study has the value, and the study it was made of has not."""
    key = data.draw(st.sampled_from(sorted(VALUES)))
    path = tuple(key.split("."))
    own = value_at(study, path)
    other = with_value(study, path, "a value")
    assert value_at(other, path) == "a value"
    assert value_at(study, path) == own
    assert with_value(other, path, own).model_dump() == study.model_dump()


#: Any key that a variants file or a study file may have, and some that neither has.
PATHS = [
    *VARYING,
    *(path for path, _ in known_keys()),
    *(("comparisons",), ("variants",), ("title",), ("zzz",), ("screening", "zzz")),
]
IN_A_COMPARISON = st.sampled_from(["outcome", "region", "factor", "level", "facter", "zz"])
IN_A_VARIANT = st.sampled_from(["name", "regions", "screening", "measures", "lines", "zz"])
NESTED = st.recursive(
    ANY_VALUE | st.sampled_from(["skipped", "cue", "late", "off", "consensus", "interrupt", "?"]),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3),
        st.dictionaries(
            st.sampled_from(["under_ms", "within_px", "fixations", "tolerance_px", "[key]", ""]),
            inner,
            max_size=3,
        ),
    ),
    max_leaves=5,
)


@settings(max_examples=100, deadline=None)
@given(
    st.lists(st.tuples(st.sampled_from(PATHS), st.lists(NESTED, max_size=4) | NESTED), max_size=4),
    st.lists(st.dictionaries(IN_A_COMPARISON, NESTED, max_size=4), max_size=2),
    st.lists(st.dictionaries(IN_A_VARIANT, NESTED, max_size=4), max_size=3),
)
def test_any_file_is_read_or_refused_in_plain_words(
    study: Study,
    changes: list[tuple[tuple[str, ...], Any]],
    compared: list[dict[str, Any]],
    named: list[dict[str, Any]],
) -> None:
    """Whatever stands in the file: variants that are sound studies, or problems with a fix each."""
    data: dict[str, Any] = {}
    if compared:
        data["comparisons"] = compared
    if named:
        data["variants"] = named
    for path, value in changes:
        inner = data
        for key in path[:-1]:
            if not isinstance(inner.get(key), dict):
                inner[key] = {}
            inner = inner[key]
        inner[path[-1]] = value
    found = read(data, study)
    if not isinstance(found, str):
        assert len(found.studies) == len(found.crossing) > 1
        assert all(not list(broken_rules(made, ())) for made in found.studies)
        return
    *told, count = found.split("\n")
    problems = [line for line in told if not line.startswith("    ")]
    fixes = [line for line in told if line.startswith("    fix: ")]
    assert len(problems) == len(fixes) >= 1, found
    assert count.endswith("nothing was written")
    assert not {*words(found)} & {"pydantic", "dict", "tuple", "str", "none"}, found
