"""Rules about ``[screening]``: what its rules need, and limits that contradict one another."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from etl.study.models import StudyFile
from etl.study.place_rules import TEXT_KINDS, absent_positions, in_degrees
from etl.study.rule import Problem, Rule, rule

_MERGE = "screening.fixations.merge"
_WITHIN = ("within_px", "within_deg", "within_characters")
_UNITS = ("logs.columns.x.unit", "logs.columns.y.unit")


def _at(study: StudyFile, key: str) -> Any:
    """What a key holds; None also where a table around it is absent."""
    inner: Any = study
    for part in key.split("."):
        inner = None if inner is None else getattr(inner, part)
    return inner


def _path(key: str) -> tuple[str, ...]:
    """A dotted key as a path."""
    return tuple(key.split("."))


def _is_on(study: StudyFile, key: str) -> bool:
    """Whether a rule of screening is on."""
    limit = _at(study, key)
    return limit is not None and limit is not False


def _blinks_are_told(study: StudyFile) -> bool:
    """Whether blinks have lines or rows of their own."""
    return study.logs.kind == "bids" or bool(_at(study, "logs.patterns.blink"))


def _needs(key: str, needed: tuple[str, ...], problem: str) -> Rule:
    """Make the rule that a rule of screening needs one of some keys."""
    of_blinks = needed == ("logs.columns.blink",)
    of_onsets = needed == ("logs.columns.onset",)
    instead: tuple[str, ...] = ("logs.kind", "logs.patterns.blink") if of_blinks else ()
    if of_onsets:
        instead = ("logs.columns.end", "logs.columns.duration")
    table = needed[0].rpartition(".")[0]
    holds = "header" if table == "logs.columns" else "name"
    keys = " or ".join(f'{other.rpartition(".")[2]} = "…"' for other in needed)

    @rule(key, *needed, *instead)
    def rule_has_what_it_needs(study: StudyFile) -> Iterator[Problem]:
        if of_blinks and _blinks_are_told(study):
            return
        if of_onsets and study.logs.columns.clock is not None:
            return
        if _is_on(study, key) and all(_at(study, other) is None for other in needed):
            yield Problem(
                _path(key),
                problem,
                expected=" or ".join(needed),
                fix=f"add {keys} to [{table}] with the {holds} of the column, or remove this rule",
            )

    return rule_has_what_it_needs


_NO_ONSET = "nothing says when a fixation began"
_NO_BLINK = "nothing says which fixations a blink touches"
_NO_ANSWER = "nothing says whether an answer was correct"

text_time_has_limits = _needs(
    "screening.fixations.outside_text_time",
    ("trials.onset", "trials.offset"),
    "nothing says when the text was on the screen",
)
text_time_has_onsets = _needs(
    "screening.fixations.outside_text_time", ("logs.columns.onset",), _NO_ONSET
)
blink_has_its_column = _needs("screening.fixations.blink", ("logs.columns.blink",), _NO_BLINK)
first_pass_blink_has_its_column = _needs(
    "screening.trials.blink_in_first_pass_of", ("logs.columns.blink",), _NO_BLINK
)
duration_of_trial_has_onsets = _needs(
    "screening.trials.duration_ms", ("logs.columns.onset",), _NO_ONSET
)
wrong_answer_is_known = _needs(
    "screening.trials.answer_wrong", ("trials.answer_correct",), _NO_ANSWER
)
correct_share_is_known = _needs(
    "screening.participants.correct_share_under", ("trials.answer_correct",), _NO_ANSWER
)


@rule("screening.participants.fewest_trials_per_cell", "trials.factors")
def cells_have_factors(study: StudyFile) -> Iterator[Problem]:
    """A cell is a combination of factors."""
    key = "screening.participants.fewest_trials_per_cell"
    if _is_on(study, key) and not study.trials.factors:
        yield Problem(
            _path(key),
            "without factors there are no cells in which to count trials",
            expected="trials.factors",
            fix='add factors = ["…"] to [trials] with the names of their columns, or remove this '
            "rule",
        )


def _needs_positions(key: str, *, y_always: bool) -> Rule:
    """Make the rule that a rule of screening needs positions.

    What the regions need already is asked for by :func:`etl.study.place_rules.place_is_known`.
    """

    @rule(key, "regions.kind", "regions.vertical", "logs.columns.x", "logs.columns.y")
    def positions_are_known(study: StudyFile) -> Iterator[Problem]:
        if not _is_on(study, key):
            return
        needed = ["x", "y"] if y_always or study.regions.vertical == "box" else ["x"]
        asked_for = absent_positions(study)
        absent = [
            name
            for name in needed
            if getattr(study.logs.columns, name) is None and name not in asked_for
        ]
        if absent:
            keys = " and ".join(f'{name} = "…"' for name in absent)
            yield Problem(
                _path(key),
                "nothing says where each fixation was",
                expected=" and ".join(f"logs.columns.{name}" for name in absent),
                fix=f"add {keys} to [logs.columns] with the header of the column, or remove this "
                "rule",
            )

    return positions_are_known


off_screen_has_positions = _needs_positions("screening.fixations.off_screen", y_always=True)
merge_has_positions = _needs_positions(_MERGE, y_always=False)


@rule("screening.fixations.off_screen", "screen", *_UNITS)
def off_screen_has_a_screen(study: StudyFile) -> Iterator[Problem]:
    """Only a screen has edges; one for positions in degrees is asked for already."""
    key = "screening.fixations.off_screen"
    if _is_on(study, key) and study.screen is None and not in_degrees(study):
        yield Problem(
            _path(key),
            "nothing says how large the screen is",
            expected="[screen]",
            fix="add [screen] with width_px and height_px, or remove this rule",
        )


@rule(*(f"{_MERGE}.{name}" for name in _WITHIN))
def merge_has_one_distance(study: StudyFile) -> Iterator[Problem]:
    """How near a neighbour must be is said once."""
    if not _is_on(study, _MERGE):
        return
    given = [name for name in _WITHIN if _is_on(study, f"{_MERGE}.{name}")]
    expected = f"one of {', '.join(_WITHIN[:-1])} and {_WITHIN[-1]}"
    if not given:
        yield Problem(
            _path(_MERGE),
            "nothing says how near the other fixation must be",
            expected=expected,
            fix="add for example within_px = 14",
        )
    elif len(given) > 1:
        yield Problem(
            (*_path(_MERGE), given[-1]),
            "how near the other fixation must be is said more than once",
            found=", ".join(given),
            expected=expected,
            fix="keep one of them",
        )


@rule(f"{_MERGE}.within_deg", "screen", *_UNITS)
def merge_in_degrees_has_a_screen(study: StudyFile) -> Iterator[Problem]:
    """Degrees become pixels only by the size and the distance of the screen."""
    key = f"{_MERGE}.within_deg"
    if _is_on(study, key) and study.screen is None and not in_degrees(study):
        yield Problem(
            _path(key),
            "a distance in degrees needs the size and the distance of the screen",
            expected="[screen]",
            fix="add [screen] with width_px, height_px, width_cm and distance_cm, or give "
            "within_px in place of within_deg",
        )


def _needed_for_merging(size: str) -> Rule:
    """Make the rule that merging by angle needs a size of the screen, or the distance from it."""

    @rule(f"{_MERGE}.within_deg", f"screen.{size}", *_UNITS)
    def merge_in_degrees_has_a_size(study: StudyFile) -> Iterator[Problem]:
        if not _is_on(study, f"{_MERGE}.within_deg") or in_degrees(study):
            return
        if study.screen is not None and getattr(study.screen, size) is None:
            yield Problem(
                ("screen", size),
                "this key is missing, and within_deg in screening.fixations.merge needs it",
                expected="a number of centimetres",
                fix=f"add {size} = … to [screen], or give within_px in place of within_deg",
            )

    return merge_in_degrees_has_a_size


merge_in_degrees_has_a_width = _needed_for_merging("width_cm")
merge_in_degrees_has_a_distance = _needed_for_merging("distance_cm")


@rule(f"{_MERGE}.within_characters", "regions.kind", "regions.layout")
def merge_in_characters_has_a_layout(study: StudyFile) -> Iterator[Problem]:
    """The layout says how wide a character is; kinds given by text are asked for one already."""
    key, regions = f"{_MERGE}.within_characters", study.regions
    if _is_on(study, key) and regions.layout is None and regions.kind not in TEXT_KINDS:
        yield Problem(
            _path(key),
            f'nothing says how wide a character is: regions.kind = "{regions.kind}" has no layout',
            expected="within_px or within_deg",
            fix="give within_px in place of within_characters",
        )


def _needs_lines(key: str) -> Rule:
    """Make the rule that a rule of screening needs lines that can be told apart."""

    @rule(key, "regions.kind", "regions.vertical")
    def lines_can_be_told_apart(study: StudyFile) -> Iterator[Problem]:
        if not _is_on(study, key):
            return
        if study.regions.kind == "labels":
            yield Problem(
                _path(key),
                'regions.kind = "labels" has no lines',
                expected="a kind of regions that have positions",
                fix="remove this rule, or correct kind",
            )
        elif study.regions.vertical == "any":
            yield Problem(
                _path(key),
                'with regions.vertical = "any" no line can be told from another',
                expected='vertical = "box"',
                fix='remove this rule for texts of one line, or write vertical = "box"',
            )

    return lines_can_be_told_apart


undersweep_has_lines = _needs_lines("screening.fixations.undersweep")
confidence_has_lines = _needs_lines("screening.trials.line_confidence_under")


@rule("screening.trials.line_confidence_under", "lines.method")
def confidence_has_its_method(study: StudyFile) -> Iterator[Problem]:
    """Only all methods together tell how sure the lines of a trial are."""
    key = "screening.trials.line_confidence_under"
    if _is_on(study, key) and study.lines is not None and study.lines.method != "consensus":
        yield Problem(
            _path(key),
            f'lines.method = "{study.lines.method}" does not tell how sure the lines are',
            expected='method = "consensus"',
            fix='write method = "consensus" in [lines], or remove this rule',
        )


@rule("screening.fixations.under_ms", "screening.fixations.over_ms")
def some_duration_is_kept(study: StudyFile) -> Iterator[Problem]:
    """The limits of a fixation's duration leave room between them."""
    under = _at(study, "screening.fixations.under_ms")
    over = _at(study, "screening.fixations.over_ms")
    if under is not None and over is not None and under >= over:
        yield Problem(
            ("screening", "fixations", "over_ms"),
            "no duration lies between under_ms and over_ms",
            found=_written(over),
            expected=f"a number above {_written(under)}",
            fix="correct one of the two limits",
        )


@rule("screening.trials.duration_ms")
def some_trial_is_kept(study: StudyFile) -> Iterator[Problem]:
    """The limits of a trial's duration leave room between them."""
    limits = _at(study, "screening.trials.duration_ms")
    if limits is not None and limits[0] >= limits[1]:
        low, high = (_written(limit) for limit in limits)
        yield Problem(
            ("screening", "trials", "duration_ms"),
            "no duration lies between the two limits",
            found=f"[{low}, {high}]",
            expected="two numbers, the lower first",
            fix="correct one of the two limits"
            if limits[0] == limits[1]
            else f"write duration_ms = [{high}, {low}]",
        )


def _written(number: float) -> str:
    """A number with the digits it needs."""
    return f"{number:.15g}"
