"""Patterns for lines of a log: how they are read, what is refused, what the rules ask of them."""

from __future__ import annotations

import re
from collections.abc import Callable

import pyarrow as pa
import pyarrow.compute as pc
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.study import Study
from etl.study.logs import groups_in
from etl.study.pattern_reading import searched_pattern

SOUND = r"""
[logs]
files = ["logs/*.log"]
kind = "events"

[logs.patterns]
fixation = '^rested (?P<onset>\d+) to (?P<end>\d+) on (?P<x>\d+)/(?P<y>\d+)$'
trial_start = '^gate (?P<trial>\d+) opens$'
trial_end = '^gate closes$'
facts = ['^visitor (?P<participant>\w+)$', '^cue: (?P<cue>\w+)$']

[regions]
file = "boxes.csv"
kind = "boxes"
""".lstrip()


def changed(changes: dict[str, str]) -> str:
    """The sound study with some places changed, each there once."""
    text = SOUND
    for old, new in changes.items():
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return text


def found(pattern: str, line: str) -> dict[str, str] | None:
    """What the groups of a pattern find in a line that it describes; None if it does not."""
    searched = searched_pattern(pattern)
    match = pc.extract_regex(pa.array([line]), searched.whole())[0].as_py()
    if match is None:
        return None
    return dict(zip(searched.groups, match.values(), strict=True))


def test_sound_study_of_events(load: Callable[..., Study]) -> None:
    """The groups of the patterns are columns of the same names without being listed."""
    columns = load(SOUND).logs.columns
    assert {name: column.column for name, column in columns.present().items()} == {
        name: name for name in ("participant", "trial", "onset", "end", "x", "y")
    }


@pytest.mark.parametrize(
    ("pattern", "fits", "fits_not"),
    [
        pytest.param(
            r"pear (?P<a>\d+)", ["pear 12", "pear 1 "], ["a pear 12", "pear 12x"], id="whole"
        ),
        pytest.param(
            r"^pear$|^(?P<a>fig)$", ["pear", "fig\t"], ["pear fig", "figs"], id="alternatives"
        ),
        pytest.param(r"(a|b)(?P<a>c)", ["ac", "bc"], ["abc"], id="group without a name"),
        pytest.param(r"(?i)PEAR|fig", ["pear", "FIG"], ["pears"], id="flag for all"),
        pytest.param(r"(?i:P)ear", ["pear", "Pear"], ["PEAR"], id="flag for a part"),
        pytest.param(r"a{,2}b{2,}c{1}", ["bbc", "aabbbc"], ["aaabbc", "abc"], id="counted"),
        pytest.param(r"a{b}{,c}{}", ["a{b}{,c}{}"], ["ab"], id="braces that count nothing"),
        pytest.param(r"[]a-c^\-\]]+", ["]ab^-c"], ["d", "\\"], id="set"),
        pytest.param(r"[^]\s]+", ["a[b"], ["a]", "a b"], id="set of others"),
        pytest.param(r"[a\-z]+", ["a-z"], ["b"], id="hyphen after a backslash"),
        pytest.param(r"\w+ [\w.]+", ["Zoë_3 Ångström.Ж"], ["Zoë -"], id="words of any script"),
        pytest.param(r"\W+x\S+", ["- x-é"], ["éxa", "- x "], id="what is no word"),
        pytest.param(
            r"a\sb[\s,]+c", ["a b, c", "a\u00a0b\u00a0c"], ["a_b,c"], id="blanks of any script"
        ),
        pytest.param(r"\d+", ["12"], ["١٢"], id="digits are 0 to 9"),
        pytest.param(r"\x41\u00e9\N{BULLET}", ["Aé•"], ["A"], id="characters by number"),
        pytest.param(r"\.\ \#\-\é\"", ['. #-é"'], ["a"], id="signs after a backslash"),
        pytest.param(r"a(?#a remark)b", ["ab"], ["a"], id="remark"),
        pytest.param(r"(?P<größe>\d+) cm", ["12 cm"], ["12"], id="name with a letter of its own"),
        pytest.param(r"\Apear\Z", ["pear", "pear "], ["pears"], id="marks of the ends"),
        pytest.param(r"a.*?b??c+?", ["abc", "axxc"], ["ab"], id="as little as possible"),
    ],
)
def test_pattern_means_what_it_reads(pattern: str, fits: list[str], fits_not: list[str]) -> None:
    """What Python's grammar writes is matched as Python would, against the whole of a line."""
    assert [line for line in fits if found(pattern, line) is None] == []
    assert [line for line in fits_not if found(pattern, line) is not None] == []


PARTS = st.recursive(
    st.sampled_from(
        [
            *"ab é.1-^$_/",
            *(rf"\{sign}" for sign in "dwsSWD.-"),
            *(r"\x61", "[ab]", "[^a1]", "[a-c_]", r"[\w-]", r"[\d.]", r"[^\s/]"),
        ]
    ),
    lambda part: st.one_of(
        st.lists(part, min_size=1, max_size=3).map("".join),
        part.map("({})".format),
        part.map("(?:{})*".format),
        part.map("(?:{})?".format),
        part.map("(?:{}){{1,2}}".format),
        part.map("(?:{})+?".format),
        st.lists(part, min_size=2, max_size=2).map("(?:{0[0]}|{0[1]})".format),
    ),
    max_leaves=6,
)


@given(st.lists(PARTS, min_size=1, max_size=3), st.text("abcé 1-._/", max_size=6))
def test_patterns_agree_with_another_engine(parts: list[str], line: str) -> None:
    """Any pattern of what both engines know describes the same lines for both."""
    line = line.rstrip()  # blanks at the end are left to no pattern
    pattern = "".join(f"(?P<g{number}>{part})" for number, part in enumerate(parts))
    expected = re.fullmatch(pattern, line)
    own = found(pattern, line)
    assert (own is None) == (expected is None)


def test_groups_find_what_another_engine_finds() -> None:
    """Of several ways to describe a line, the groups take the one that comes first."""
    pattern, line = r"(?P<a>\w+?)(?P<b>\d*) (?P<c>.*?)(?P<d>x?)", "pear12 fig x"
    expected = re.fullmatch(pattern, line)
    assert expected is not None
    assert found(pattern, line) == expected.groupdict()


def test_lines_that_begin_like_those_of_a_pattern() -> None:
    """A line begins like those of a pattern where it has all before the first thing told."""
    pattern = searched_pattern(
        r"^(?P<time>\d+) pear (?P<n>\d+)$|^\s*fig(?: (?P<m>\d+))?|(?P<o>\d+)"
    )
    lines = ["12 pear x", "12 pear", "12 pears", " fig", "fig tree", "12", "pear"]
    begins = [
        any(
            pc.match_substring_regex(pa.array([line]), rf"\A{start}")[0].as_py()
            for start in pattern.beginnings()
        )
        for line in lines
    ]
    assert begins == [True, True, False, True, True, False, False]


EXPECTED = "expected a pattern that goes through a line once, so that no line can hold it up"
WAY = (
    "    fix: describe the line from left to right; lines that are to be told apart can have a "
    "pattern each, and are taken by the first that fits\n"
)


@pytest.mark.parametrize(
    ("pattern", "cannot"),
    [
        ("(?=p)pear", "look ahead"),
        ("(?!f)pear", "look ahead"),
        ("p(?<=p)ear", "look back"),
        ("p(?<!f)ear", "look back"),
        (r"(?P<a>p)ea\1", "repeat what a group found"),
        ("(?P<a>p)ea(?P=a)", "repeat what a group found"),
        ("(?P<a>p)?(?(1)ear|fig)", "depend on a group"),
        ("(?>p+)ear", "keep what it took (an atomic group)"),
        ("p++ear", "keep what it took (a possessive repetition)"),
        ("p{1,2}+ear", "keep what it took (a possessive repetition)"),
    ],
)
def test_what_could_run_away_is_refused(
    refusal: Callable[..., str], pattern: str, cannot: str
) -> None:
    """What no engine does in linear time is refused in the study file, with a way out."""
    said = refusal(changed({"trial_end = '^gate closes$'": f"trial_end = '{pattern}'"}))
    assert said == (
        f"study.toml:8: logs.patterns.trial_end: a pattern for lines cannot {cannot}; {EXPECTED}\n"
        f"{WAY}1 problem; nothing was written"
    ).replace(f"{cannot}; ", f'{cannot}; found "{pattern}", ')


@pytest.mark.parametrize(
    ("pattern", "has", "fix"),
    [
        ("p{1001}", "a repetition of more than 1000", "use * or + in its place"),
        ("(?x)p ear", "the flag x", "of flags, only i (either case) makes a difference"),
        (r"[\W]", r"\W within brackets", r"write the characters that are meant, or \W alone"),
        (
            "[[a]",
            "a sign in brackets that may be read in two ways",
            "put a backslash before [, &, ~, | and - within brackets",
        ),
    ],
)
def test_what_is_not_certain_to_be_meant_is_refused(
    refusal: Callable[..., str], pattern: str, has: str, fix: str
) -> None:
    """What the two grammars read differently is refused."""
    said = refusal(changed({"trial_end = '^gate closes$'": f"trial_end = '{pattern}'"}))
    assert said == (
        f'study.toml:8: logs.patterns.trial_end: the pattern has {has}; found "{pattern}", '
        f"expected a pattern that reads in one way\n    fix: {fix}\n1 problem; nothing was written"
    )


def test_faulty_pattern_is_told_alone(refusal: Callable[..., str]) -> None:
    """What a faulty pattern would have said is not complained about besides."""
    said = refusal(changed({"'^gate (?P<trial>\\d+) opens$'": "'^gate (?P<trial>.+'"}))
    assert said == (
        "study.toml:7: logs.patterns.trial_start: this is no regular expression: missing ), "
        'unterminated subpattern at position 6; found "^gate (?P<trial>.+", '
        "expected a regular expression with named groups\n"
        r"    fix: write for example fixation = '^fix (?P<onset>\d+) (?P<duration>\d+)$'"
        "\n1 problem; nothing was written"
    )


@pytest.mark.parametrize("value", ["3", "[3]", "{}", "true"])
def test_pattern_of_another_kind_of_value(refusal: Callable[..., str], value: str) -> None:
    """A value that is no text is told in plain words."""
    said = refusal(changed({"trial_end = '^gate closes$'": f"trial_end = {value}"}))
    assert said.startswith("study.toml:8: logs.patterns.trial_end")
    assert said.endswith("1 problem; nothing was written")


def test_groups_of_faulty_tables() -> None:
    """Columns are taken from the patterns that are sound, whatever else the table holds."""
    patterns = {
        "fixation": ["(?P<x>.)", 3, "("],
        "facts": 3,
        "blink": "(?P<end>.)",
        "odd": "(?P<y>.)",
    }
    assert groups_in(patterns) == ["x"]


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {"(?P<participant>": "("},
            "study.toml:5: logs.patterns: nothing says who read; expected participant\n"
            "    fix: put (?P<participant>…) around it in a pattern of [logs.patterns], or "
            "participant_from_name to [logs] where the file's name says it\n"
            "study.toml:9: logs.patterns.facts, entry 1: the pattern has no named group, so its "
            r'lines tell nothing; found "^visitor (\w+)$", expected a group such as (?P<cue>…)'
            "\n    fix: put a named group around what the line tells, or move the pattern to "
            "ignore\n2 problems",
            id="no reader",
        ),
        pytest.param(
            {"(?P<trial>": "("},
            "study.toml:5: logs.patterns: nothing says which trial a fixation belongs to; expected "
            "trial\n    fix: put (?P<trial>…) around it in a pattern of [logs.patterns]\n1 problem",
            id="no trial",
        ),
        pytest.param(
            {"(?P<onset>": "(", "(?P<end>": "(?P<duration>"},
            "study.toml:5: logs.patterns: nothing says in which order the fixations were made; "
            "expected onset or fixation\n"
            "    fix: put (?P<onset>…) around it in a pattern of [logs.patterns]\n1 problem",
            id="no order",
        ),
        pytest.param(
            {"(?P<end>": "("},
            "study.toml:5: logs.patterns: nothing says how long a fixation lasted; expected "
            "duration or end\n    fix: put (?P<duration>…) around it in a pattern of "
            "[logs.patterns]\n1 problem",
            id="no duration",
        ),
        pytest.param(
            {"[regions]": '[logs.columns]\ntrial = "gate"\n\n[regions]'},
            'study.toml:12: logs.columns.trial: no pattern has a group of this name; found "gate", '
            "expected one of onset, end, x, y, trial, participant, cue\n"
            "    fix: put (?P<gate>…) around that part of the pattern, or correct the name\n"
            "1 problem",
            id="column that is no group",
        ),
        pytest.param(
            {"[regions]": '[logs.columns]\nx = "cue"\n\n[regions]'},
            "study.toml:12: logs.columns.x: no pattern for fixations has a group of this name; "
            'found "cue", expected one of onset, end, x, y\n'
            "    fix: put (?P<cue>…) around that part of the pattern, or correct the name\n"
            "1 problem",
            id="position that no fixation has",
        ),
        pytest.param(
            {"[regions]": '[logs.where]\nblock = ["main"]\n\n[regions]'},
            'study.toml:12: logs.where.block: no pattern has a group of this name; found "block", '
            "expected one of onset, end, x, y, trial, participant, cue\n"
            "    fix: put (?P<block>…) around that part of the pattern, or correct the name\n"
            "1 problem",
            id="rows asked for by what is no group",
        ),
        pytest.param(
            {"opens$": "opens at (?P<onset>.*)$"},
            "study.toml:7: logs.patterns.trial_start: a group is called onset, which is of a "
            r'fixation; found "^gate (?P<trial>\d+) opens at (?P<onset>.*)$", expected facts '
            "about trials"
            "\n    fix: give the group another name, such as trial_onset\n1 problem",
            id="onset of a trial",
        ),
        pytest.param(
            {
                "fixation = '": "fixation = ['^lost (?P<onset>\\d+)$', '",
                "(?P<y>\\d+)$'": "(?P<y>\\d+)$']",
            },
            "study.toml:6: logs.patterns.fixation, entry 1: this pattern for fixations has no "
            r'group end, which another one has; found "^lost (?P<onset>\d+)$", expected the end of '
            "every fixation\n    fix: put (?P<end>…) around that part of the pattern\n1 problem",
            id="fixation that does not end",
        ),
        pytest.param(
            {"trial_end": "blink = '^shut (?P<end>\\d+) (?P<side>.)$'\ntrial_end"},
            "study.toml:8: logs.patterns.blink: a blink has a group that means nothing; found "
            '"side", expected groups named onset, end, duration or eye\n'
            "    fix: rename the group, or write (?:…) where it only groups\n"
            "study.toml:8: logs.patterns.blink: these groups do not say when a blink was; found "
            '"end", expected onset with end or duration, or none of them\n'
            "    fix: name the groups onset and end, or onset and duration\n2 problems",
            id="blink",
        ),
        pytest.param(
            {
                "'^gate closes$'": "'^# ?gate closes$'",
                "trial_end": "unfinished = 'keep'\ntrial_end",
            },
            'study.toml:9: logs.patterns.trial_end: its lines begin with "#", which marks a '
            'remark; found "^# ?gate closes$", expected lines that are read\n'
            '    fix: take "#" out of [logs] comment (comment = [] for none)\n1 problem',
            id="lines that are remarks",
        ),
        pytest.param(
            {"trial_end = '^gate closes$'": "unfinished = 'keep'"},
            "study.toml:8: logs.patterns.unfinished: this means nothing where no line says that a "
            'trial ends; found "keep", expected trial_end\n'
            "    fix: remove the key, or add trial_end\n1 problem",
            id="nothing to be unfinished",
        ),
        pytest.param(
            {'kind = "events"': 'kind = "events"\ndelimiter = ";"'},
            'study.toml:4: logs.delimiter: this means nothing with kind = "events"; found ";", '
            "expected lines that [logs.patterns] describes\n    fix: remove the key\n1 problem",
            id="delimiter",
        ),
    ],
)
def test_rules_about_patterns(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """What the patterns must tell, and by which names."""
    assert refusal(changed(changes)).startswith(expected)


@pytest.mark.parametrize(
    "changes",
    [
        pytest.param(
            {"[regions]": '[logs.columns]\nitem = "cue"\n\n[regions]'},
            id="group under another name",
        ),
        pytest.param({"trial_end = '^gate closes$'\n": ""}, id="trials without an end"),
        pytest.param({"trial_end": "blink = '^shut$'\ntrial_end"}, id="blink without times"),
        pytest.param(
            {
                "trial_end": "blink = '^shut$'\ntrial_end",
                "[regions]": "[screening.fixations]\nblink = 'drop'\n[regions]",
            },
            id="rule about blinks that have lines of their own",
        ),
        pytest.param(
            {
                "'^gate closes$'": "'^#gate closes$'",
                "[logs.patterns]": "comment = []\n[logs.patterns]",
            },
            id="no remarks",
        ),
        pytest.param(
            {
                "fixation = '": "fixation = ['^lost (?P<onset>\\d+) (?P<end>\\d+)$', '",
                "(?P<y>\\d+)$'": "(?P<y>\\d+)$']",
            },
            id="fixation without a position",
        ),
    ],
)
def test_sound_combination_is_accepted(load: Callable[..., Study], changes: dict[str, str]) -> None:
    """What does not contradict itself passes."""
    assert load(changed(changes)).logs.kind == "events"
