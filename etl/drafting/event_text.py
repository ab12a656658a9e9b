"""The study file of logs that are lines of events, written from how they are understood."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Mapping, Sequence

from etl.drafting.event_clock import blink_groups
from etl.drafting.event_ignored import ignoring, slips_in
from etl.drafting.event_patterns import pattern_of_line
from etl.drafting.event_roles import EventRoles, Telling, told_of
from etl.drafting.event_shapes import Shape
from etl.drafting.heads import Head
from etl.drafting.meanings import Meaning, Understanding, listed
from etl.drafting.table_text import write_column, write_eyes
from etl.drafting.toml_text import StudyText

_NUMBERS = ("onset", "end", "duration", "x", "y")
_ORDER = ("fixation", *_NUMBERS, "label", "eye", "blink")
#: Further kinds of line are left to one key.
_MOST_IGNORED = 30
_MOST_SHOWN = 3


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
    if any(shape.sample.lstrip().startswith("#") for shape in roles.used()):
        out.guess("comment", [], "lines that begin with # tell something and are no remarks")
    assert roles.understood is not None  # noqa: S101
    found = roles.understood.found
    groups = _groups(roles, found)
    _write_patterns(out, roles, groups)
    _write_columns(out, roles, found, groups)


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
    if found.clock:
        groups[place_of[found.clock]] = "time"
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
    _write_bounds(out, roles)
    fixation = roles.fixation
    assert fixation is not None  # noqa: S101
    told = "their numbers are those of a fixation (see below)"
    of_fixations = [(pattern_of_line(fixation, groups), f"{told}: {told_of(fixation)}")]
    of_fixations += [
        (pattern_of_line(shape, groups), f"they begin like others: {told_of(shape)}")
        for shape in roles.more_fixations
    ]
    _guess_patterns(out, "fixation", of_fixations)
    _write_blinks(out, roles)
    for key, facts in (("lasting", roles.lasting), ("facts", roles.facts)):
        if facts:
            told_each = [(_pattern(telling), told_of(telling.shape)) for telling in facts]
            out.guess_each(key, told_each)
    _write_ignored(out, roles)


def _write_bounds(out: StudyText, roles: EventRoles) -> None:
    """The patterns of lines with which trials start and end."""
    if not roles.starts:
        out.ask(
            "trial_start",
            "which lines say that a trial starts? Write a pattern such as "
            r"'^trial (?P<trial>\d+) begins$'",
        )
    else:
        starts = [(_pattern(one), _told_of_start(one)) for one in roles.starts]
        _guess_patterns(out, "trial_start", starts)
    if roles.ends:
        told = "each comes once a trial, after its last fixation"
        ends = [(_pattern(one), f"{told}: {told_of(one.shape)}") for one in roles.ends]
        _guess_patterns(out, "trial_end", ends)


def _told_of_start(telling: Telling) -> str:
    """Why lines were taken for those with which trials start."""
    facts = [name for name in telling.names.values() if name not in ("trial", "item")]
    told = f"fixations follow each of {told_of(telling.shape)}"
    if telling.wide:
        told += ". The number alone is that of another trial too"
    return f"{told}. What may be facts: {listed(facts)}" if facts else told


def _pattern(telling: Telling) -> str:
    """The pattern of lines that tell of trials."""
    return pattern_of_line(telling.shape, telling.names, wide=telling.wide)


def _guess_patterns(out: StudyText, key: str, patterns: Sequence[tuple[str, str]]) -> None:
    """A pattern, or a list of several."""
    if len(patterns) == 1:
        out.guess(key, *patterns[0])
    else:
        out.guess_each(key, patterns)


def _write_blinks(out: StudyText, roles: EventRoles) -> None:
    """The patterns of blinks, with when they were where that can be told."""
    blinks = []
    for shape in list(roles.blinks):
        told = blink_groups(shape, roles)
        if told is None:
            roles.blinks.remove(shape)
            roles.others.append(shape)
            out.remark(
                f"Look: these lines seem to tell of blinks, but their times are not on the clock "
                f"of the fixations, so they are left aside: {told_of(shape)}"
            )
        else:
            groups, doubt = told
            evidence = f"{told_of(shape)}. Look: {doubt}" if doubt else told_of(shape)
            blinks.append((pattern_of_line(shape, groups), evidence))
    if blinks:
        out.guess_each("blink", blinks)


def _write_ignored(out: StudyText, roles: EventRoles) -> None:
    """The patterns of lines that mean nothing, and what is asked of lines that may mean something.

    Lines that begin like those that tell something, and those that only a pattern could describe
    that also describes such lines when they are damaged, are never left aside unasked.
    """
    telling = roles.used()
    slips = slips_in(telling)
    ignored: dict[str, str] = {}
    asked: list[Shape] = []
    for shape in roles.others:
        pattern = None if any(shape.is_like(one) for one in telling) else ignoring(shape, slips)
        if pattern is None or len(ignored) >= _MOST_IGNORED:
            asked.append(shape)
        else:
            ignored.setdefault(pattern, told_of(shape))
    if ignored:
        out.remark("Lines that mean nothing here; they are counted.")
        out.guess_each("ignore", list(ignored.items()))
    if asked:
        samples = "; ".join(told_of(shape) for shape in asked[:_MOST_SHOWN])
        kinds = "one more kind" if len(asked) == 1 else f"{len(asked):,} more kinds"
        out.ask(
            "other",
            f"what of lines of {kinds}? {samples}. Describe them with a pattern of their own, "
            'and write "error" here; "ignore" counts all lines that no pattern describes',
        )


def _write_columns(
    out: StudyText, roles: EventRoles, found: Understanding, groups: dict[int, str]
) -> None:
    """The units of what fixation lines tell, and what is asked of them."""
    out.begin("logs.columns", "Our name for a thing = the name of its group in the patterns above.")
    if "participant" in found.questions and "participant" not in roles.names():
        out.ask(
            "participant",
            "who read? Put (?P<participant>…) into the pattern of a line that says it (lasting), "
            "or, if only the file's name does, write participant_from_name in [logs]; then remove "
            "this line",
        )
    if roles.starts and not all("trial" in one.names.values() for one in roles.starts):
        out.ask("trial", "which part of the line of trial_start names the trial?")
    if "item" in roles.questions:
        out.ask("item", roles.questions["item"])
    own = {roles.groups[place]: name for place, name in groups.items()}
    for name in _ORDER:
        meaning, question = found.meanings.get(name), found.questions.get(name)
        if question is not None and name in ("duration", "x", "y", "onset"):
            told = question.replace("which column", "which part of the line")
            out.ask(name, _under_groups(told, own))
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
    evidence = _under_groups(meaning.evidence, own)
    return Meaning(group, evidence, meaning.unit, meaning.question)


def _under_groups(text: str, own: Mapping[str, str]) -> str:
    """A text with the names of groups in place of the headers of tokens."""
    for header, name in own.items():
        text = text.replace(f'"{header}"', f'"{name}"')
    return text.replace("the header says", "the words before it say")
