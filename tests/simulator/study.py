"""A whole study is read: readers and items with their own effects, one clock a reader, the mess."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from tests.simulator.draws import chance, normal, pick, probability, uniform, whole
from tests.simulator.reading import Look, Reading, State, inside
from tests.simulator.spec import (
    Effects,
    PlannedReader,
    PlannedTrial,
    SimulatedFixation,
    SimulatedReader,
    SimulatedStudy,
    SimulatedTrial,
    StudySpec,
)

#: A blink with the moments before and after it in which no gaze is found, in ms.
BLINK_MS = (120, 260)


def simulate_study(spec: StudySpec, rng: np.random.Generator) -> SimulatedStudy:
    """Let every reader of a study read every trial planned for them.

    Parameters
    ----------
    spec : StudySpec
        Who reads what, how, under which effects, and what goes wrong.
    rng : numpy.random.Generator
        Spawns one generator for the items and one for each reader, so that a reader's log does not
        depend on how much the others read.

    Returns
    -------
    SimulatedStudy
        Trials in the order of ``spec.trials``.
    """
    of_items, *of_readers = rng.spawn(1 + len(spec.readers))
    # In the order in which items are first met; every item is drawn, also those without a region.
    items = dict.fromkeys(trial.item for trial in spec.trials)
    item_intercepts = {item: normal(of_items, 0.0, spec.effects.item_sd) for item in items}
    planned: dict[str, list[PlannedTrial]] = {reader.participant: [] for reader in spec.readers}
    for trial in spec.trials:
        planned[trial.participant].append(trial)
    readers, read = [], {}
    for plan, own in zip(spec.readers, of_readers, strict=True):
        reader = draw_reader(plan, spec, own)
        readers.append(reader)
        clock_ms = whole(own, 40_000, 90_000)
        for trial in planned[plan.participant]:
            done = read_trial(spec, reader, trial, item_intercepts[trial.item], clock_ms, own)
            read[plan.participant, trial.trial] = done
            # A question, its answer, the starting mark of the next trial.
            clock_ms = done.text_off_ms + whole(own, 2_400, 5_200)
    trials = tuple(read[trial.participant, trial.trial] for trial in spec.trials)
    return SimulatedStudy(spec, tuple(readers), item_intercepts, trials)


def draw_reader(plan: PlannedReader, spec: StudySpec, rng: np.random.Generator) -> SimulatedReader:
    """A reader's random effects."""
    effects = spec.effects
    intercept = normal(rng, 0.0, effects.reader_sd)
    slopes = {term: normal(rng, 0.0, sd) for term, sd in effects.reader_slope_sd.items()}
    return SimulatedReader(plan, intercept, slopes, normal(rng, 0.0, spec.habits.reader_pace_sd))


def holds(term: str, facts: Mapping[str, str | int]) -> bool:
    """Whether a term such as ``"cue=late:fit=odd"`` applies to these facts.

    Examples
    --------
    >>> holds("cue=late:fit=odd", {"cue": "late", "fit": "odd"})
    True
    >>> holds("cue=late:fit=odd", {"cue": "late", "fit": "fitting"})
    False
    """
    pairs = [part.split("=") for part in term.split(":")]
    return all(str(facts.get(name, "")) == level for name, level in pairs)


def exit_log_odds(
    effects: Effects,
    region: str,
    reader: SimulatedReader,
    trial: PlannedTrial,
    item_intercept: float,
) -> float:
    """The log-odds that the first pass on a region ends with a regression."""
    facts = {**reader.plan.facts, **trial.facts}
    total = effects.intercepts[region] + reader.intercept + item_intercept
    total += sum(change for term, change in effects.levels.items() if holds(term, facts))
    total += sum(slope for term, slope in reader.slopes.items() if holds(term, facts))
    for covariate, (centre, per_unit) in effects.covariates.items():
        total += per_unit * (float(facts[covariate]) - centre)
    return total


def read_trial(
    spec: StudySpec,
    reader: SimulatedReader,
    plan: PlannedTrial,
    item_intercept: float,
    clock_ms: int,
    rng: np.random.Generator,
) -> SimulatedTrial:
    """One trial from the starting mark to the answer."""
    layout = spec.layouts[plan.text]
    exits = {
        region: probability(exit_log_odds(spec.effects, region, reader, plan, item_intercept))
        for region in layout.regions
        if region in spec.effects.intercepts and region != layout.regions[0]
    }
    facts = {**reader.plan.facts, **plan.facts}
    slower = sum(d for term, d in spec.effects.durations.items() if holds(term, facts))
    state = State(reader.log_pace, exits, slower)
    looks = Reading(layout, spec.habits, state, rng).run()
    looks = with_mess(looks, spec, plan, rng)
    answer_ok = chance(rng, probability(reader.plan.answer_log_odds))
    fixations = timed(looks, clock_ms)
    # With mess, places change but not times: what came before and after the text stays so.
    read = [f for f, look in zip(fixations, looks, strict=True) if not look.aside]
    return SimulatedTrial(
        plan=plan,
        answer_ok=answer_ok,
        text_on_ms=read[0].onset_ms - whole(rng, 2, 12),
        text_off_ms=read[-1].end_ms + whole(rng, 2, 12),
        recorded=(plan.participant, plan.trial) not in spec.mess.unrecorded,
        exit_probability=exits,
        fixations=tuple(fixations),
    )


def with_mess(
    looks: list[Look], spec: StudySpec, plan: PlannedTrial, rng: np.random.Generator
) -> list[Look]:
    """The fixations of a trial with all that went wrong in it."""
    mess, (width, height) = spec.mess, spec.screen_px
    out: list[Look] = []
    for look, following in zip(looks, [*looks[1:], None], strict=True):
        out.append(look)
        if following is None:
            break
        if chance(rng, mess.blink_share):
            look.gap_ms = whole(rng, *BLINK_MS)
            look.blink = following.blink = True
        if chance(rng, mess.off_screen_share):
            beyond, beside = uniform(rng, 15.0, 90.0), uniform(rng, 100.0, height - 100.0)
            x_px, y_px = pick(
                rng, [(-beyond, beside), (width + beyond, beside), (width / 3, height + beyond)]
            )
            place = round(x_px, 1), round(y_px, 1)
            out.append(Look(None, *place, whole(rng, 120, 420), 40, mess="off_screen"))
    last = out[-1]
    if chance(rng, mess.before_text_share):
        # The starting mark stands where the first letter will appear.
        opening = spec.layouts[plan.text].words[0]
        x_px = inside(opening, opening.left_px + uniform(rng, 1.0, 13.0))
        y_px = spec.layouts[plan.text].line_centre_px(1) + whole(rng, -6, 6)
        mark = Look(opening, x_px, y_px, whole(rng, 250, 600), 30, mess="before_text", aside=True)
        out.insert(0, mark)
    if chance(rng, mess.after_text_share):
        last.gap_ms = 30
        place = last.x_px, last.y_px
        after = whole(rng, 90, 260)
        out.append(Look(last.word, *place, after, 0, mess="after_text", aside=True))
    if (plan.participant, plan.trial) in mess.scattered:
        for look in out:
            look.word, look.mess, look.regressive = None, "scattered", False
            look.x_px = round(uniform(rng, 0.0, width - 1.0), 1)
            look.y_px = round(uniform(rng, 0.0, height - 1.0), 1)
    return out


def timed(looks: list[Look], clock_ms: int) -> list[SimulatedFixation]:
    """The fixations of a trial with the times at which the log would have them."""
    fixations = []
    for number, look in enumerate(looks, start=1):
        word = look.word
        fixations.append(
            SimulatedFixation(
                fixation=number,
                onset_ms=clock_ms,
                duration_ms=look.duration_ms,
                x_px=look.x_px,
                y_px=look.y_px,
                blink=look.blink,
                word=None if word is None else word.number,
                region=None if word is None else word.region,
                region_order=None if word is None else word.region_order,
                line=None if word is None else word.line,
                regressive=look.regressive,
                mess=look.mess,
            )
        )
        clock_ms += look.duration_ms + look.gap_ms
    return fixations
