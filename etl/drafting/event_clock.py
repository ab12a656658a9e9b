"""The times in lines of events: when blinks were, and whether fixations begin or end at a time."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from etl.drafting.columns import Floats, share_of
from etl.drafting.event_roles import EventRoles
from etl.drafting.event_shapes import Shape
from etl.drafting.meanings import Meaning
from etl.drafting.structure import side_of

#: How long blinks last, in ms; wide bounds (common practice, no source).
_BLINK_MS = (20.0, 2000.0)
#: A time in a line lies at most this far from the fixation whose line is nearest, in ms.
_NEAR_MS = 60_000.0
_PER_MS = {"ms": 1.0, "s": 0.001, "us": 1000.0}
_NEARLY_ALL = 0.9
#: From this share of trials on, a fixation that reaches over their bounds is no slip.
_CONTRADICTED = 0.05


def numbers_of(cells: Sequence[str]) -> Floats:
    """Texts as numbers; NaN where one is none."""
    values = []
    for cell in cells:
        try:
            values.append(float(cell.replace(",", ".")))
        except ValueError:
            values.append(float("nan"))
    return np.array(values, dtype=np.float64)


def settle_clock(roles: EventRoles) -> None:
    """Find out from the lines around trials whether fixations begin or end at an open time.

    Parameters
    ----------
    roles : EventRoles
        Where fixations would begin before their trial does if they ended at the time, they begin
        at it; where they would reach beyond the end of their trial if they began at it, they end.
    """
    assert roles.understood is not None  # noqa: S101
    found = roles.understood.found
    duration = found.meanings.get("duration")
    if not found.clock or duration is None or found.clock_unit == "?" or duration.unit == "?":
        return
    place_of = {header: place for place, header in roles.groups.items()}
    shape = roles.fixation
    assert shape is not None  # noqa: S101
    factor = _PER_MS[found.clock_unit] / _PER_MS[duration.unit]
    lasted = numbers_of(shape.cells[place_of[duration.header]]) * factor
    time = numbers_of(shape.cells[place_of[found.clock]])
    lines = np.asarray(shape.lines)
    too_early = too_late = 0.0
    for telling in roles.starts:
        stamps, own = _stamps(telling.shape), np.asarray(telling.shape.lines)
        first = np.searchsorted(lines, own)
        known = first < len(lines)
        if stamps is not None and known.any():
            first = first[known]
            too_early = max(too_early, share_of(time[first] - lasted[first] < stamps[known]))
    for telling in roles.ends:
        stamps, own = _stamps(telling.shape), np.asarray(telling.shape.lines)
        last = np.searchsorted(lines, own) - 1
        known = last >= 0
        if stamps is not None and known.any():
            last = last[known]
            too_late = max(too_late, share_of(time[last] + lasted[last] > stamps[known]))
    begins, ends = too_early > _CONTRADICTED, too_late > _CONTRADICTED
    if begins == ends:
        return
    share = too_early if begins else too_late
    told = (
        f"fixations begin at these times: if they ended then, {share:.0%} of the first ones of a "
        "trial would begin before it"
        if begins
        else f"fixations end at these times: if they began then, {share:.0%} of the last ones of a "
        "trial would reach beyond it"
    )
    meaning = Meaning(found.clock, told, found.clock_unit)
    found.meanings["onset" if begins else "end"] = meaning
    found.questions.pop("onset", None)
    found.clock = ""


def _stamps(shape: Shape) -> Floats | None:
    """The time with which lines begin; None where they do not."""
    first = shape.first_word()
    places = [place for place in shape.numbers() if first is None or place < first]
    if not places and first is not None and shape.sign_beside(first, 1) == "=":
        places = [place for place in shape.numbers() if place > first][:1]
    return numbers_of(shape.cells[places[0]]) if places else None


def blink_groups(shape: Shape, roles: EventRoles) -> tuple[dict[int, str], str] | None:
    """The names of what a blink's line tells.

    Parameters
    ----------
    shape : Shape
        The lines.
    roles : EventRoles
        How fixations are understood.

    Returns
    -------
    tuple of dict of int to str and str, or None
        Names by places, and what is to be said of times that were left out. None where the lines
        have times on a clock that is not that of the fixations.
    """
    groups = _eye_of(shape, roles)
    numbers = {place: numbers_of(shape.cells[place]) for place in shape.numbers()}
    clock = _clock_of_fixations(roles)
    if clock is None or not numbers:
        return groups, ""
    times, unit = clock
    shortest, longest = (bound * _PER_MS[unit] for bound in _BLINK_MS)
    nearest = np.searchsorted(roles.fixation_lines(), np.asarray(shape.lines))
    around = times[np.clip(nearest, 0, len(times) - 1)]
    near = {
        place: share_of(np.abs(values - around) <= _NEAR_MS * _PER_MS[unit]) >= _NEARLY_ALL
        for place, values in numbers.items()
    }
    near = {
        place: own and not _lasts(numbers[place], shortest, longest, around)
        for place, own in near.items()
    }
    first_word = shape.first_word() or 0
    # The time with which a line begins comes last: it may be when the line was written.
    places = sorted((p for p in numbers if near[p]), key=lambda place: place < first_word)
    for onset in places:
        for end in places:
            lasted = numbers[end] - numbers[onset]
            if share_of((lasted >= shortest) & (lasted <= longest)) >= _NEARLY_ALL:
                return {**groups, onset: "onset", end: "end"}, ""
    durations = [
        p for p, v in numbers.items() if p not in places and _lasts(v, shortest, longest, around)
    ]
    if not places:
        return None if len(numbers) >= 2 and not durations else (groups, "")
    if not durations:
        return groups, ""
    ends = roles.understood is not None and "end" in _stamp_names(roles)
    if ends and places[0] < first_word:
        return groups, (
            "the times of these lines seem to be when blinks were over, like those of the "
            "fixations; a blink touches the fixation before its line and the one after it"
        )
    return {**groups, places[0]: "onset", durations[0]: "duration"}, ""


def _lasts(values: Floats, shortest: float, longest: float, around: Floats) -> bool:
    """Whether numbers are as large as durations of blinks, and no times among the fixations'."""
    fits = (values >= shortest) & (values <= longest)
    return share_of(fits) >= _NEARLY_ALL and share_of(around > longest) >= 0.5


def _stamp_names(roles: EventRoles) -> set[str]:
    """What the times are called with which fixation lines begin."""
    assert roles.understood is not None  # noqa: S101
    assert roles.fixation is not None  # noqa: S101
    first = roles.fixation.first_word() or 0
    early = {header for place, header in roles.groups.items() if place < first}
    meanings = roles.understood.found.meanings
    return {name for name, meaning in meanings.items() if meaning.header in early}


def _clock_of_fixations(roles: EventRoles) -> tuple[Floats, str] | None:
    """Times of the fixations, and their unit."""
    assert roles.understood is not None  # noqa: S101
    assert roles.fixation is not None  # noqa: S101
    found = roles.understood.found
    meaning = found.meanings.get("onset") or found.meanings.get("end")
    header = found.clock if meaning is None else meaning.header
    unit = found.clock_unit if meaning is None else meaning.unit
    place = next((place for place, own in roles.groups.items() if own == header), None)
    if place is None or unit not in _PER_MS:
        return None
    shapes = [roles.fixation, *roles.more_fixations]
    every = np.concatenate([numbers_of(shape.cells[place]) for shape in shapes])
    order = np.argsort(np.concatenate([np.asarray(shape.lines) for shape in shapes]))
    return every[order], unit


def _eye_of(shape: Shape, roles: EventRoles) -> dict[int, str]:
    """The token that says whose blink it is, where fixations say whose they are."""
    if roles.understood is None or "eye" not in roles.understood.found.meanings:
        return {}
    for place, token in enumerate(shape.tokens):
        if token.kind in ("word", "quoted") and all(map(side_of, set(shape.cells[place]))):
            return {place: "eye"}
    return {}
