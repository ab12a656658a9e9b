"""The study file of logs that are lines of events, written from how they are understood."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Mapping, Sequence

import numpy as np

from etl.drafting.columns import share_of
from etl.drafting.event_patterns import pattern_of_line
from etl.drafting.event_roles import EventRoles, told_of
from etl.drafting.event_shapes import Shape
from etl.drafting.heads import Head
from etl.drafting.meanings import Meaning, Understanding, listed
from etl.drafting.structure import side_of
from etl.drafting.table_text import write_column, write_eyes
from etl.drafting.toml_text import StudyText

_NUMBERS = ("onset", "end", "duration", "x", "y")
_ORDER = ("fixation", *_NUMBERS, "label", "eye", "blink")
#: Further kinds of line are left to one key.
_MOST_IGNORED = 30


def write_events(out: StudyText, heads: Sequence[Head], roles: EventRoles, *, commas: bool) -> None:
    """What the lines tell, by a pattern for each.

    Parameters
    ----------
    out : StudyText
        The study file, in its table ``[logs]``.
    heads : sequence of Head
        The logs.
    roles : EventRoles
        What each shape of line was taken for.
    commas : bool
        Whether numbers have decimal commas.
    """
    encodings = Counter(head.text.encoding.removesuffix("-sig") for head in heads)
    if len(encodings) == 1:
        out.guess("encoding", next(iter(encodings)), "all letters of the logs can be read so")
    else:
        told = listed(f"{n:,} {name}" for name, n in encodings.most_common())
        out.remark(f"The logs differ in their encoding ({told}), which is found out log by log.")
    if commas:
        out.guess("decimal", ",", "numbers are written with a comma")
    remarks = {shape.sample[0] for shape in _used(roles)} & {"#"}
    if remarks:
        out.guess("comment", [], "lines that begin with # tell something and are no remarks")
    assert roles.understood is not None  # noqa: S101
    found = roles.understood.found
    groups = _groups(roles, found)
    _write_patterns(out, roles, groups)
    _write_columns(out, roles, found, groups)


def _used(roles: EventRoles) -> list[Shape]:
    """The shapes of lines that tell something."""
    named = [roles.fixation, roles.start, roles.end]
    return [
        *(shape for shape in named if shape is not None),
        *roles.blinks,
        *(shape for shape, _, _ in [*roles.facts, *roles.lasting]),
    ]


def _groups(roles: EventRoles, found: Understanding) -> dict[int, str]:
    """The name of each token of a fixation line that tells something."""
    place_of = {header: place for place, header in roles.groups.items()}
    groups = {}
    for name, meaning in found.meanings.items():
        if name in _ORDER and meaning.header in place_of:
            groups[place_of[meaning.header]] = name
    for eye, columns in found.eyes.items():
        for name, meaning in columns.items():
            groups[place_of[meaning.header]] = f"{name}_{_identifier(eye)}"
    if found.perhaps_blink in place_of:
        groups[place_of[found.perhaps_blink]] = _identifier(found.perhaps_blink)
    return groups


def _identifier(text: str) -> str:
    """A text as the name of a group."""
    name = re.sub(r"\W+", "_", text).strip("_")
    return name if name and not name[0].isdigit() else f"value_{name}"


def _write_patterns(out: StudyText, roles: EventRoles, groups: dict[int, str]) -> None:
    """All patterns."""
    out.begin(
        "logs.patterns",
        "What each line tells: a pattern (regular expression) for each kind of line. The names in "
        "(?P<name>…) say what stands there; \\d+ is a number, \\S+ a word.",
    )
    start = roles.start
    if start is None:
        out.ask(
            "trial_start",
            "which lines say that a trial starts? Write a pattern such as "
            r"'^trial (?P<trial>\d+) begins$'",
        )
    else:
        named = {roles.trial: "trial", roles.item: "item"}
        own = {place: name for place, name in named.items() if place is not None}
        told = f"fixations follow each of {told_of(start)}"
        out.guess("trial_start", pattern_of_line(start, own), told)
    if roles.end is not None:
        told = f"each comes once a trial, after its last fixation: {told_of(roles.end)}"
        out.guess("trial_end", pattern_of_line(roles.end, {}), told)
    fixation = roles.fixation
    assert fixation is not None  # noqa: S101
    told = f"their numbers are those of a fixation (see below): {told_of(fixation)}"
    out.guess("fixation", pattern_of_line(fixation, groups), told)
    _write_blinks(out, roles)
    for key, facts in (("lasting", roles.lasting), ("facts", roles.facts)):
        if facts:
            out.guess_each(
                key,
                [(pattern_of_line(s, {place: name}), told_of(s)) for s, place, name in facts],
            )
    if roles.ignored:
        shown = roles.ignored[:_MOST_IGNORED]
        ignored: dict[str, str] = {}
        for shape in shown:
            ignored.setdefault(pattern_of_line(shape, {}, whole=False), told_of(shape))
        out.remark("Lines that mean nothing here; they are counted.")
        out.guess_each("ignore", list(ignored.items()))
        rest = roles.ignored[_MOST_IGNORED:]
        if rest:
            out.ask(
                "other",
                f'what of lines of {len(rest):,} more kinds, such as "{rest[0].sample}"? "ignore" '
                'counts them; "error" makes you describe them first',
            )


def _write_blinks(out: StudyText, roles: EventRoles) -> None:
    """The patterns of blinks, with when they were where that can be told."""
    blinks = []
    for shape in roles.blinks:
        groups = _blink_groups(shape, roles)
        if groups is None:
            roles.ignored.append(shape)
            out.remark(
                f"Look: these lines seem to tell of blinks, but their times are not on the clock "
                f"of the fixations, so they are left aside: {told_of(shape)}"
            )
        else:
            blinks.append((pattern_of_line(shape, groups), told_of(shape)))
    if blinks:
        out.guess_each("blink", blinks)


def _blink_groups(shape: Shape, roles: EventRoles) -> dict[int, str] | None:
    """The names of what a blink's line tells; None where its times are on another clock."""
    groups = {
        place: "eye"
        for place in shape.variables()
        if shape.tokens[place].kind != "number" and all(map(side_of, set(shape.cells[place])))
    }
    groups |= {
        place: "eye"
        for place, token in enumerate(shape.tokens)
        if token.kind == "word"
        and place > 0
        and side_of(token.text)
        and "eye" not in groups.values()
    }
    if roles.understood is None or "eye" not in roles.understood.found.meanings:
        groups = {}
    numbers = [place for place in shape.variables() if shape.tokens[place].kind == "number"]
    values = {place: _numbers(shape.cells[place]) for place in numbers}
    if len(numbers) < 2:
        return groups
    first, second = numbers[:2]
    onsets = _onsets(roles)
    if onsets is None:
        return None
    inside = (values[first] >= onsets.min() / 2) & (values[first] <= onsets.max() * 2)
    if share_of(inside) < 0.9:
        return None
    ends = share_of(values[second] > values[first]) > 0.95
    return {**groups, first: "onset", second: "end" if ends else "duration"}


def _onsets(roles: EventRoles) -> np.ndarray | None:
    """The onsets of the fixations, in the unit of the log."""
    assert roles.understood is not None  # noqa: S101
    assert roles.fixation is not None  # noqa: S101
    meaning = roles.understood.found.meanings.get("onset")
    if meaning is None:
        return None
    place = next(place for place, header in roles.groups.items() if header == meaning.header)
    return _numbers(roles.fixation.cells[place])


def _numbers(cells: Sequence[str]) -> np.ndarray:
    """Texts as numbers; NaN where one is none."""
    values = []
    for cell in cells:
        try:
            values.append(float(cell.replace(",", ".")))
        except ValueError:
            values.append(float("nan"))
    return np.array(values)


def _write_columns(
    out: StudyText, roles: EventRoles, found: Understanding, groups: dict[int, str]
) -> None:
    """The units of what fixation lines tell, and what is asked of them."""
    out.begin("logs.columns", "Our name for a thing = the name of its group in the patterns above.")
    if "participant" in found.questions and not any(n == "participant" for *_, n in roles.lasting):
        out.ask(
            "participant",
            "who read? Put (?P<participant>…) into the pattern of a line that says it (lasting), "
            "or, if only the file's name does, write participant_from_name in [logs]; then remove "
            "this line",
        )
    if roles.start is not None and roles.trial is None:
        out.ask("trial", "which part of the line of trial_start names the trial?")
    own = {roles.groups[place]: name for place, name in groups.items()}
    for name in _ORDER:
        meaning, question = found.meanings.get(name), found.questions.get(name)
        if question is not None and name in ("duration", "x", "y", "onset"):
            out.ask(name, question.replace("which column", "which part of the line"))
        elif meaning is not None:
            write_column(out, name, _renamed(meaning, name, own))
    if found.perhaps_blink:
        told = "it holds 0 and 1; if 1 marks a blink, use this"
        out.example("blink", _identifier(found.perhaps_blink), told)
    eyes = {
        eye: {n: _renamed(m, f"{n}_{_identifier(eye)}", own) for n, m in columns.items()}
        for eye, columns in found.eyes.items()
    }
    write_eyes(out, eyes, found.eye_values)


def _renamed(meaning: Meaning, group: str, own: Mapping[str, str]) -> Meaning:
    """What was found out about a token, under the name of its group."""
    evidence = meaning.evidence
    for header, name in own.items():
        evidence = evidence.replace(f'"{header}"', f'"{name}"')
    return Meaning(group, evidence, meaning.unit, meaning.question)
