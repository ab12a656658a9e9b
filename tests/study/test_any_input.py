"""Whatever stands in a study file, it is accepted or refused in plain words."""

import copy
import tomllib
from collections.abc import Iterator
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from etl.study.examine import examine
from etl.study.shape import known_keys
from etl.study.wording import dotted
from tests.study.written import EXAMPLE

JARGON = ("input should", "valid ", "pydantic", "dict", "tuple", "str", "literal", "none", "float")
SOUND = tomllib.loads(EXAMPLE)
VALUES = st.recursive(
    st.one_of(
        st.booleans(),
        st.integers(-5, 2000),
        st.floats(),
        st.sampled_from(["", "x", "ms", "deg", "labels", "any", "wkt", "binary", "a\\b", "(", "é"]),
        st.dates(),
        st.times(),
    ),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3),
        st.dictionaries(st.sampled_from(["", "column", "unit", "eye", "[key]"]), inner, max_size=3),
    ),
    max_leaves=4,
)
PATHS = [path for path, _ in known_keys()]


def table_around(data: dict[str, Any], path: tuple[str | int, ...]) -> dict[str, Any]:
    """The table that holds a key, made where there is none."""
    for key in path[:-1]:
        if not isinstance(data.get(str(key)), dict):
            data[str(key)] = {}
        data = data[str(key)]
    return data


def words(text: str) -> Iterator[str]:
    """The words of a message, in small letters."""
    yield from text.lower().replace(",", " ").split()


@settings(max_examples=300, deadline=None)
@given(
    st.lists(st.tuples(st.sampled_from(PATHS), VALUES | st.none()), min_size=1, max_size=4),
    st.lists(st.tuples(st.sampled_from(PATHS), st.sampled_from("aeiz")), max_size=2),
)
def test_any_value_is_accepted_or_refused(
    changes: list[tuple[tuple[str, ...], Any]], slips: list[tuple[tuple[str, ...], str]]
) -> None:
    """Any value at any key, any key gone or misspelt: never a crash, never another's words."""
    data = copy.deepcopy(SOUND)
    for path, value in changes:
        table = table_around(data, path)
        if value is None:
            table.pop(path[-1], None)
        else:
            table[path[-1]] = value
    for path, letter in slips:
        table = table_around(data, path)
        if path[-1] in table:
            table[path[-1] + letter] = table.pop(path[-1])
    for problem in examine(data, ["reread"]).problems:
        assert problem.problem
        assert problem.fix
        assert not {*words(problem.problem), *words(problem.fix)} & set(JARGON), dotted(
            problem.path
        )
