"""Where each key of a TOML file stands."""

import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.study.positions import KeyPath, lines_of_keys, nearest_line
from tests.study.written import EXAMPLE

ODD = '''\
# a comment with [brackets] = 1
a = 1 # = x
"q.k" = 'v#'
b.c.d = """x
[no]
y = 1 \\""" """"
date = 1979-05-27 07:32:00  # a date with a space

[t]
list = [ # [
  1,
  { k = [1,
     2], "z z" = {y=1, x.w = "}"} }, # ,
  """
a
""", 'x',
  [], {}
]
'literal.key' = '\\'
[[p.q]]
n = 1
[p.q.sub]
m = 2
[[p.q]]
n=[[1],[2]]
[[p.q.inner]]
u = \'\'\'
v = 1\'\'\'\'
[[p.q.inner]]
[x.y.z]
[x]
k=inf
"" = 1
'''


def paths_of(value: Any, path: KeyPath = ()) -> set[KeyPath]:
    """All paths of keys and places in what tomllib read."""
    if isinstance(value, dict):
        pairs = list(value.items())
    else:
        pairs = list(enumerate(value)) if isinstance(value, list) else []
    inner = [paths_of(below, (*path, key)) for key, below in pairs]
    return {(*path, key) for key, _ in pairs}.union(*inner)


@pytest.mark.parametrize(
    ("path", "line"),
    [
        pytest.param(("a",), 2, id="key"),
        pytest.param(("q.k",), 3, id="quoted key"),
        pytest.param(("b",), 4, id="table implied by a dotted key"),
        pytest.param(("b", "c", "d"), 4, id="dotted key"),
        pytest.param(("date",), 7, id="after a multi-line string"),
        pytest.param(("t",), 9, id="table header"),
        pytest.param(("t", "list", 0), 11, id="element on its own line"),
        pytest.param(("t", "list", 1, "k", 1), 13, id="element of an array in an inline table"),
        pytest.param(("t", "list", 1, "z z"), 13, id="key of an inline table in an array"),
        pytest.param(("t", "list", 1, "z z", "x", "w"), 13, id="dotted key of an inline table"),
        pytest.param(("t", "list", 2), 14, id="multi-line string in an array"),
        pytest.param(("t", "list", 3), 16, id="after a multi-line string in an array"),
        pytest.param(("t", "literal.key"), 19, id="literal key"),
        pytest.param(("p", "q", 0, "n"), 21, id="key of the first of several tables"),
        pytest.param(("p", "q", 0, "sub", "m"), 23, id="table in the first of several tables"),
        pytest.param(("p", "q", 1), 24, id="second of several tables"),
        pytest.param(("p", "q", 1, "inner", 1), 29, id="several tables in one of several"),
        pytest.param(("x", "y"), 30, id="table implied by a header"),
        pytest.param(("x",), 31, id="own header after an implying one"),
        pytest.param(("x", ""), 33, id="empty key"),
    ],
)
def test_line_of_a_key(path: KeyPath, line: int) -> None:
    """Every form of key, table and element has the line where it begins."""
    assert lines_of_keys(ODD)[path] == line


@pytest.mark.parametrize(
    "text",
    [
        pytest.param(ODD, id="every form"),
        pytest.param(EXAMPLE, id="a study file"),
        pytest.param("", id="nothing"),
        pytest.param("# only a comment", id="only a comment"),
        pytest.param("a = 1", id="no line break at the end"),
    ],
)
def test_every_key_has_a_line(text: str) -> None:
    """The paths are exactly those that tomllib reads."""
    assert set(lines_of_keys(text)) == paths_of(tomllib.loads(text))


def test_line_breaks_of_two_characters_count_once() -> None:
    """Files from different systems give the same lines."""
    assert lines_of_keys(ODD.replace("\n", "\r\n")) == lines_of_keys(ODD)


@pytest.mark.parametrize(
    ("path", "line"),
    [
        pytest.param(("a", "b", 1), 3, id="known itself"),
        pytest.param(("a", "b", 7), 2, id="element that is not there"),
        pytest.param(("a", "c", "d"), 1, id="key of a table that is not there"),
        pytest.param(("z",), None, id="nothing around it"),
        pytest.param((), None, id="the whole file"),
    ],
)
def test_nearest_line_is_that_of_what_is_around(path: KeyPath, line: int | None) -> None:
    """What is not in the file has the line of the innermost thing around it."""
    assert nearest_line({("a",): 1, ("a", "b"): 2, ("a", "b", 1): 3}, path) == line


KEYS = st.sampled_from(["a", "b-1", '"q.\\" ="', "'l#'", '"é"', '""'])
SCALARS = st.sampled_from(
    [
        "1",
        "-2.5e3",
        "true",
        "1979-05-27 07:32:00",
        '"]} #\\""',
        "'\\'",
        '"""\n[x]\n\\""""""',
        "'''\n'''",
    ]
)
GAPS = st.sampled_from(["", " ", "\n", " # [x] = {\n", "\n\n  "])


@st.composite
def values(draw: st.DrawFn, depth: int = 2) -> str:
    """A TOML value, arrays with comments and line breaks inside."""
    kind = draw(st.integers(0, 2 if depth else 0))
    if kind == 0:
        return draw(SCALARS)
    inner = [draw(values(depth=depth - 1)) for _ in range(draw(st.integers(0, 3)))]
    if kind == 1:
        return "[" + "".join(f"{draw(GAPS)}{one}{draw(GAPS)}," for one in inner) + draw(GAPS) + "]"
    keys = draw(st.lists(KEYS, min_size=len(inner), max_size=len(inner), unique=True))
    return "{" + ", ".join(f"{key} = {one}" for key, one in zip(keys, inner, strict=True)) + "}"


@given(st.lists(st.tuples(values(), GAPS), max_size=5))
def test_any_key_stands_on_its_line(written: list[tuple[str, str]]) -> None:
    """Whatever values stand before it, the line of a key is the one on which its name stands."""
    text, expected = "", {}
    for place, (value, gap) in enumerate(written):
        text += gap if gap.strip(" ") else ""
        expected[(f"key{place}",)] = text.count("\n") + 1
        text += f"key{place} = {value}\n"
    lines = lines_of_keys(text)
    assert set(lines) == paths_of(tomllib.loads(text))
    assert {path: line for path, line in lines.items() if path in expected} == expected
