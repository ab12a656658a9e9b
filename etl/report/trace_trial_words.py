"""Each outcome of a trial in words, straight from its definition."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Final

from etl.report.trace_phrases import Said, fixations, joined, ms, quoted, total_ms
from etl.report.trace_region_words import tell_region
from etl.report.trace_story import Saccade, Story

Teller = Callable[[Story], Said]


def _no_saccade(story: Story) -> Said | None:
    """Said of a trial with fewer than two fixations inside regions."""
    inside = story.inside
    if len(inside) >= 2:
        return None
    words = f"only {fixations(inside)} is inside a region" if inside else "no kept fixation is"
    return Said(None, "no_saccade", words if inside else f"{words} inside a region", inside)


def _steps(story: Story, saccades: tuple[Saccade, ...]) -> str:
    """Saccades by their fixations and regions."""
    return joined(
        [
            f"{s.launch.number} to {s.landing.number} "
            f"({quoted(story.traced, s.launch.region_order)} to "
            f"{quoted(story.traced, s.landing.region_order)})"
            for s in saccades
        ]
    )


def _of_kind(story: Story, *, regressive: bool) -> Said:
    """The saccades in one direction, counted."""
    found = tuple(s for s in story.saccades if s.regressive == regressive)
    which = "an earlier" if regressive else "a later"
    words = (
        f"fixation {_steps(story, found)}" if found else f"no saccade lands on {which} region than "
    )
    words += "" if found else "it left"
    return Said(len(found), "", words, tuple(f for s in found for f in (s.launch, s.landing)))


def _any_regression(story: Story) -> Said:
    """``any_regression``."""
    missing = _no_saccade(story)
    if missing is not None:
        return missing
    said = _of_kind(story, regressive=True)
    if not said.value:
        return Said(0, "", f"because {said.words}")
    first = next(s for s in story.saccades if s.regressive)
    words = f"because a saccade goes back from fixation {_steps(story, (first,))}"
    return Said(1, "", words, (first.launch, first.landing))


def _regions_with(story: Story, measure: str) -> list[tuple[int, Said]]:
    """The regions for which a binary outcome is 1, by order, with what is said of them."""
    told = [
        (order, tell_region(story, measure, order))
        for order in range(1, len(story.traced.region_names) + 1)
    ]
    return [(order, said) for order, said in told if said.value == 1]


def _any_first_pass_regression(story: Story) -> Said:
    """``any_first_pass_regression``."""
    if len(story.traced.region_names) == 1:
        return Said(None, "no_earlier_region", "the text has one region only")
    missing = _no_saccade(story)
    return missing or _any_region(story, "first_pass_regression_out")


def _any_region(story: Story, measure: str) -> Said:
    """Whether a binary outcome is 1 for any region."""
    found = _regions_with(story, measure)
    if not found:
        return Said(0, "", f"because {measure} is 1 for no region")
    names = joined([quoted(story.traced, order) for order, _ in found])
    words = f"because {measure} is 1 for {names}"
    return Said(1, "", words, tuple(f for _, said in found for f in said.fixations))


def _any_skip(story: Story) -> Said:
    """``any_skip``."""
    return _any_region(story, "first_pass_skip")


def _fixation_count(story: Story) -> Said:
    """``fixation_count``."""
    inside = story.inside
    words = f"{fixations(inside)}, inside regions" if inside else "no kept fixation is inside one"
    return Said(len(inside), "", words, inside)


def _outside_fixation_count(story: Story) -> Said:
    """``outside_fixation_count``."""
    outside = tuple(f for f in story.kept if not f.region_order)
    words = fixations(outside) if outside else "every kept fixation is inside a region"
    return Said(len(outside), "", words, outside)


def _regression_count(story: Story) -> Said:
    """``regression_count``."""
    return _of_kind(story, regressive=True)


def _progression_count(story: Story) -> Said:
    """``progression_count``."""
    return _of_kind(story, regressive=False)


def _regions_reached(story: Story) -> Said:
    """``regions_reached``."""
    furthest = story.furthest()
    if furthest is None:
        return Said(0, "", "no kept fixation is inside a region")
    order = furthest.region_order
    words = (
        f"fixation {furthest.number} is the first on {quoted(story.traced, order)}, region {order} "
        f"of {len(story.traced.region_names)}, the furthest fixated"
    )
    return Said(order, "", words, (furthest,))


def _reading_time(story: Story) -> Said:
    """``reading_time``: the total times of the regions, added up."""
    orders = sorted({f.region_order for f in story.inside})
    if not orders:
        return Said(0.0, "", "because no kept fixation is inside a region")
    sums = " + ".join(
        f"{ms(total_ms(story.on(order)))} ({quoted(story.traced, order)})" for order in orders
    )
    return Said(total_ms(story.inside), "", f"= {sums}", story.inside)


#: How each outcome of a trial is told.
TRIAL_TELLERS: Final[Mapping[str, Teller]] = {
    "any_regression": _any_regression,
    "any_first_pass_regression": _any_first_pass_regression,
    "any_skip": _any_skip,
    "fixation_count": _fixation_count,
    "outside_fixation_count": _outside_fixation_count,
    "regression_count": _regression_count,
    "progression_count": _progression_count,
    "regions_reached": _regions_reached,
    "reading_time": _reading_time,
}


def tell_trial(story: Story, measure: str) -> Said:
    """One outcome of the trial.

    Parameters
    ----------
    story : Story
        What the eyes did.
    measure : str
        Name of the outcome.

    Returns
    -------
    Said
    """
    return TRIAL_TELLERS[measure](story)
