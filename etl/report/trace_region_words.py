"""Each outcome of a region in words, straight from its definition."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Final

from etl.report.trace_phrases import (
    DURATIONS,
    Said,
    fixations,
    joined,
    quoted,
    terms,
    total_ms,
)
from etl.report.trace_story import Saccade, Story, Visit

Teller = Callable[[Story, int], Said]


def _named(story: Story, order: int) -> str:
    """A region's name, quoted."""
    return quoted(story.traced, order)


def _not_reached(story: Story) -> Said:
    """Said of a region as far as which the eyes never got."""
    furthest = story.furthest()
    if furthest is None:
        return Said(None, "not_reached", "no kept fixation is inside a region")
    name = _named(story, furthest.region_order)
    words = f"the eyes got no further than {name} (fixation {furthest.number})"
    return Said(None, "not_reached", words, (furthest,))


def _no_first_pass(story: Story, order: int) -> Said | None:
    """Said of a region without a first pass; None where it has one."""
    first = story.first_as_far_as(order)
    if first is None:
        return _not_reached(story)
    if first.region_order == order:
        return None
    name = _named(story, order)
    words = (
        f"fixation {first.number} went beyond {name}, to {_named(story, first.region_order)}, "
        f"before {name} was ever fixated"
    )
    return Said(None, "skipped", words, (first,))


def _never_fixated(story: Story, order: int) -> Said | None:
    """Said of a region without a fixation; None where it has one."""
    if story.on(order):
        return None
    first = story.first_as_far_as(order)
    if first is None:
        return _not_reached(story)
    words = (
        f"the eyes went beyond {_named(story, order)} (fixation {first.number}, on "
        f"{_named(story, first.region_order)}) and no kept fixation is on it"
    )
    return Said(None, "never_fixated", words, (first,))


def _skip(story: Story, order: int) -> Said:
    """``first_pass_skip``."""
    missing = _no_first_pass(story, order)
    if missing is not None and missing.reason == "not_reached":
        return missing
    if missing is not None:
        later = story.on(order)
        when = f"; {fixations(later[:1])} came to it only afterwards" if later else ""
        return Said(1, "", f"because {missing.words}{when}", (*missing.fixations, *later[:1]))
    first = story.first_pass(order)[:1]
    words = f"because {fixations(first)} is on {_named(story, order)} before any beyond it"
    return Said(0, "", words, first)


def _fixated(story: Story, order: int) -> Said:
    """``fixated``."""
    on = story.on(order)
    if not on:
        return Said(0, "", f"because no kept fixation is on {_named(story, order)}")
    are = "is" if len(on) == 1 else "are"
    return Said(1, "", f"because {fixations(on)} {are} on {_named(story, order)}", on)


def _refixation(story: Story, order: int) -> Said:
    """``first_pass_refixation``."""
    visit = story.first_pass(order)
    if len(visit) == 1:
        return Said(0, "", f"because the first pass is {fixations(visit)} alone", visit)
    words = f"because the first pass has {len(visit)} fixations ({fixations(visit)})"
    return Said(1, "", words, visit)


def _first_pass_regression_out(story: Story, order: int) -> Said:
    """``first_pass_regression_out``."""
    visit = story.first_pass(order)
    last, name = visit[-1], _named(story, order)
    saccade, interrupting = story.leaving(visit)
    if saccade is not None:
        landing = saccade.landing
        to = f"{_named(story, landing.region_order)} (fixation {landing.number})"
        how = "lands on" if saccade.regressive else "goes on to"
        words = f"because fixation {last.number} leaves {name} in its first pass and {how} {to}"
        return Said(int(saccade.regressive), "", words, (last, landing))
    if interrupting is not None:
        words = (
            f"because fixation {interrupting.number}, outside every region, ends the first pass "
            f"on {name} after fixation {last.number}"
        )
        return Said(0, "", words, (last, interrupting))
    words = f"because the trial ends in the first pass on {name}, with fixation {last.number}"
    return Said(0, "", words, (last,))


def _listed(story: Story, saccades: tuple[Saccade, ...]) -> str:
    """Saccades with their fixations and regions."""
    return joined(
        [
            f"{_named(story, s.launch.region_order)} (fixation {s.launch.number}) to "
            f"{_named(story, s.landing.region_order)} (fixation {s.landing.number})"
            for s in saccades
        ]
    )


def _ends(saccades: tuple[Saccade, ...]) -> Visit:
    """The fixations before and after saccades."""
    return tuple(f for s in saccades for f in (s.launch, s.landing))


def _regressions_out(story: Story, order: int) -> tuple[tuple[Saccade, ...], str]:
    """The regressions out of a region, and the words."""
    found = story.regressions_from(order)
    if not found:
        return found, f"no saccade goes from {_named(story, order)} to an earlier region"
    return found, f"a saccade goes back from {_listed(story, found)}"


def _regressions_in(story: Story, order: int) -> tuple[tuple[Saccade, ...], str]:
    """The regressions into a region, and the words."""
    found = story.regressions_onto(order)
    if not found:
        return found, f"no saccade lands on {_named(story, order)} from a later region"
    return found, f"a saccade comes back from {_listed(story, found)}"


def _regression_out(story: Story, order: int) -> Said:
    """``regression_out``."""
    found, words = _regressions_out(story, order)
    return Said(int(bool(found)), "", f"because {words}", _ends(found))


def _regression_out_count(story: Story, order: int) -> Said:
    """``regression_out_count``."""
    found, words = _regressions_out(story, order)
    return Said(len(found), "", words, _ends(found))


def _regression_in(story: Story, order: int) -> Said:
    """``regression_in``."""
    found, words = _regressions_in(story, order)
    return Said(int(bool(found)), "", f"because {words}", _ends(found))


def _regression_in_count(story: Story, order: int) -> Said:
    """``regression_in_count``."""
    found, words = _regressions_in(story, order)
    return Said(len(found), "", words, _ends(found))


def _reread(story: Story, order: int) -> Said:
    """``reread``."""
    later, name = story.visits_to(order)[1:], _named(story, order)
    first = story.first_pass(order)
    if not later:
        return Said(0, "", f"because {name} is not visited again after its first pass", first)
    words = (
        f"because {name} is visited again after its first pass ({fixations(first)}), from "
        f"fixation {later[0][0].number} on"
    )
    return Said(1, "", words, (*first, later[0][0]))


def _fixation_count(story: Story, order: int) -> Said:
    """``fixation_count``."""
    on, name = story.on(order), _named(story, order)
    return Said(len(on), "", fixations(on) if on else f"no kept fixation is on {name}", on)


def _first_pass_fixation_count(story: Story, order: int) -> Said:
    """``first_pass_fixation_count``."""
    visit = story.first_pass(order)
    return Said(len(visit), "", f"the first pass is {fixations(visit)}", visit)


def _visit_count(story: Story, order: int) -> Said:
    """``visit_count``."""
    visits, name = story.visits_to(order), _named(story, order)
    if not visits:
        return Said(0, "", f"{name} is never visited")
    words = "; ".join(
        f"visit {number} is {fixations(visit)}" for number, visit in enumerate(visits, start=1)
    )
    return Said(len(visits), "", words, story.on(order))


def _first_fixation(story: Story, order: int) -> Said:
    """``first_fixation_duration``."""
    first = story.first_pass(order)[0]
    words = f"= {terms([first])}, the first of the first pass"
    return Said(first.duration_ms, "", words, (first,))


def _single_fixation(story: Story, order: int) -> Said:
    """``single_fixation_duration``."""
    visit = story.first_pass(order)
    if len(visit) > 1:
        words = f"the first pass has {len(visit)} fixations ({fixations(visit)})"
        return Said(None, "refixated", words, visit)
    words = f"= {terms(visit)}, the only one of the first pass"
    return Said(visit[0].duration_ms, "", words, visit)


def _first_pass_time(story: Story, order: int) -> Said:
    """``first_pass_time``."""
    visit = story.first_pass(order)
    return Said(total_ms(visit), "", f"= {terms(visit)}, the first pass", visit)


def _until(story: Story, order: int) -> str:
    """What ends the time before the eyes go past a region."""
    past = story.way_past(order)[1]
    if past is None:
        return f"the eyes never go beyond {_named(story, order)}"
    return f"fixation {past.number}, on {_named(story, past.region_order)}, goes beyond"


def _go_past(story: Story, order: int) -> Said:
    """``go_past_time``."""
    path = story.way_past(order)[0]
    return Said(total_ms(path), "", f"= {terms(path)}; {_until(story, order)}", path)


def _right_bounded(story: Story, order: int) -> Said:
    """``right_bounded_time``."""
    path = tuple(f for f in story.way_past(order)[0] if f.region_order == order)
    words = f"= {terms(path)}, on {_named(story, order)} itself; {_until(story, order)}"
    return Said(total_ms(path), "", words, path)


def _second_pass(story: Story, order: int) -> Said:
    """``second_pass_time``."""
    on, first = story.on(order), story.first_pass(order)
    later = on[len(first) :]
    if not later:
        words = f"because {_named(story, order)} has no fixation after its first pass"
        return Said(0.0, "", words, first)
    what = "all after the first pass" if first else "all that it has, for it has no first pass"
    return Said(total_ms(later), "", f"= {terms(later)}, {what}", later)


def _total(story: Story, order: int) -> Said:
    """``total_time``."""
    on = story.on(order)
    return Said(total_ms(on), "", f"= {terms(on)}, all on {_named(story, order)}", on)


def _unless(*missing: Callable[[Story, int], Said | None]) -> Callable[[Teller], Teller]:
    """Tell first of what makes an outcome missing, in order of precedence."""

    def wrap(teller: Teller) -> Teller:
        def tell(story: Story, order: int) -> Said:
            for check in missing:
                said = check(story, order)
                if said is not None:
                    return said
            return teller(story, order)

        return tell

    return wrap


def _is_first(story: Story, order: int) -> Said | None:
    """Said of the first region of a text."""
    if order > 1:
        return None
    words = f"{_named(story, order)} is the first region; there is none before it to go back to"
    return Said(None, "no_earlier_region", words)


def _is_last(story: Story, order: int) -> Said | None:
    """Said of the last region of a text."""
    if order < len(story.traced.region_names):
        return None
    words = f"{_named(story, order)} is the last region; there is none after it to come back from"
    return Said(None, "no_later_region", words)


def _not_passed(story: Story, order: int) -> Said | None:
    """Said of a region beyond which the eyes never went."""
    furthest = story.furthest()
    if furthest is None or furthest.region_order < order:
        return _not_reached(story)
    if furthest.region_order > order:
        return None
    words = f"the eyes got as far as {_named(story, order)} (fixation {furthest.number}) and no "
    return Said(None, "not_passed", words + "further", (furthest,))


_with_first_pass = _unless(_no_first_pass)
_with_fixation = _unless(_never_fixated)
_with_way_out = _unless(_is_first, _never_fixated)
_with_way_in = _unless(_is_last, _not_passed)

#: How each outcome of a region is told.
REGION_TELLERS: Final[Mapping[str, Teller]] = {
    "first_pass_skip": _skip,
    "fixated": _fixated,
    "first_pass_refixation": _with_first_pass(_refixation),
    "first_pass_regression_out": _unless(_is_first, _no_first_pass)(_first_pass_regression_out),
    "regression_out": _with_way_out(_regression_out),
    "regression_in": _with_way_in(_regression_in),
    "reread": _with_first_pass(_reread),
    "fixation_count": _fixation_count,
    "first_pass_fixation_count": _with_first_pass(_first_pass_fixation_count),
    "visit_count": _visit_count,
    "regression_out_count": _with_way_out(_regression_out_count),
    "regression_in_count": _with_way_in(_regression_in_count),
    "first_fixation_duration": _with_first_pass(_first_fixation),
    "single_fixation_duration": _with_first_pass(_single_fixation),
    "first_pass_time": _with_first_pass(_first_pass_time),
    "go_past_time": _with_first_pass(_go_past),
    "right_bounded_time": _with_first_pass(_right_bounded),
    "second_pass_time": _with_fixation(_second_pass),
    "total_time": _with_fixation(_total),
}

#: The reasons that ``no_opportunity = "zero"`` turns into a value.
_ZEROED: Final = frozenset({"not_reached", "not_passed", "skipped", "never_fixated"})


def tell_region(story: Story, measure: str, order: int) -> Said:
    """One outcome of one region, under the trial's conventions.

    Parameters
    ----------
    story : Story
        What the eyes did.
    measure : str
        Name of the outcome.
    order : int
        The region.

    Returns
    -------
    Said
    """
    said = REGION_TELLERS[measure](story, order)
    if (
        story.traced.no_opportunity == "missing"
        or measure in DURATIONS
        or said.reason not in _ZEROED
    ):
        return said
    value = int(measure == "first_pass_skip")
    words = f'by no_opportunity = "zero" ({said.reason}): {said.words}'
    return Said(value, "", words, said.fixations)
