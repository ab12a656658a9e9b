"""Detection of fixations sample by sample, in exact fractions, written from the papers alone.

Engbert, R., & Kliegl, R. (2003), doi:10.1016/S0042-6989(03)00084-1, and Salvucci, D. D., &
Goldberg, J. H. (2000), doi:10.1145/355017.355028; what these leave open is as the key reference and
the docstrings of ``etl.parsers.detection`` say.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from statistics import median

#: Time, x and y; None where there is no position.
Sample = tuple[Fraction, Fraction | None, Fraction | None]
Placed = tuple[Fraction, Fraction, Fraction]
#: Onset, duration, x and y.
Fixation = tuple[Fraction, Fraction, Fraction, Fraction]


def stretches_of(
    samples: Sequence[Sample], interval: Fraction, longest_gap: Fraction
) -> list[list[Placed]]:
    """The samples that have a position, broken at every hole that is too long."""
    stretches: list[list[Placed]] = []
    missing_between = True
    for time, x, y in samples:
        if x is None or y is None:
            missing_between = True
            continue
        before = stretches[-1][-1][0] if stretches else None
        hole = before is None or missing_between or time - before > Fraction(3, 2) * interval
        bridged = before is not None and longest_gap > 0 and time - before - interval <= longest_gap
        if hole and not bridged:
            stretches.append([])
        stretches[-1].append((time, x, y))
        missing_between = False
    return stretches


def fixation_of(samples: Sequence[Placed], interval: Fraction) -> Fixation:
    """Onset, duration and mean place of neighbouring samples."""
    times, xs, ys = zip(*samples, strict=True)
    size = len(samples)
    return times[0], times[-1] - times[0] + interval, sum(xs) / size, sum(ys) / size


def velocities(stretch: Sequence[Placed], axis: int) -> list[Fraction | None]:
    """The moving average over five samples; None where a neighbour is lacking."""
    found: list[Fraction | None] = []
    for n in range(len(stretch)):
        if n < 2 or n + 2 >= len(stretch):
            found.append(None)
            continue
        ahead, behind = (stretch[n + 2], stretch[n + 1]), (stretch[n - 1], stretch[n - 2])
        moved = sum(s[axis] for s in ahead) - sum(s[axis] for s in behind)
        found.append(moved / (sum(s[0] for s in ahead) - sum(s[0] for s in behind)))
    return found


def spans_of(flags: Sequence[bool]) -> list[tuple[int, int]]:
    """First and last place of every run of true flags."""
    spans: list[tuple[int, int]] = []
    for n, flag in enumerate(flags):
        if flag and n and flags[n - 1]:
            spans[-1] = (spans[-1][0], n)
        elif flag:
            spans.append((n, n))
    return spans


def by_velocity(
    samples: Sequence[Sample],
    interval: Fraction,
    *,
    factor: Fraction = Fraction(6),
    shortest_saccade: Fraction = Fraction(12),
    shortest_fixation: Fraction = Fraction(50),
    longest_gap: Fraction = Fraction(0),
) -> list[Fixation]:
    """The fixations of one trial by Engbert and Kliegl."""
    stretches = stretches_of(samples, interval, longest_gap)
    velocity = {axis: [velocities(stretch, axis) for stretch in stretches] for axis in (1, 2)}
    threshold_squared = {}
    for axis, of_stretches in velocity.items():
        known = [v for own in of_stretches for v in own if v is not None]
        spread = median([v * v for v in known]) - median(known) ** 2 if known else 0
        threshold_squared[axis] = factor**2 * spread

    def is_fast(place: int, n: int) -> bool:
        criterion = Fraction(0)
        for axis in (1, 2):
            v = velocity[axis][place][n]
            if v is None:
                return False
            if v != 0 and threshold_squared[axis] == 0:
                return True
            criterion += v * v / threshold_squared[axis] if v else 0
        return criterion > 1

    fixations = []
    for place, stretch in enumerate(stretches):
        moving = [False] * len(stretch)
        for begin, end in spans_of([is_fast(place, n) for n in range(len(stretch))]):
            if stretch[end][0] - stretch[begin][0] + interval >= shortest_saccade:
                moving[begin : end + 1] = [True] * (end + 1 - begin)
        if len(stretch) >= 5:
            moving[:2] = [moving[2]] * 2
            moving[-2:] = [moving[-3]] * 2
        for begin, end in spans_of([not one for one in moving]):
            fixation = fixation_of(stretch[begin : end + 1], interval)
            if fixation[1] >= shortest_fixation:
                fixations.append(fixation)
    return fixations


def by_dispersion(
    samples: Sequence[Sample],
    interval: Fraction,
    *,
    dispersion: Fraction,
    shortest_fixation: Fraction = Fraction(50),
    longest_gap: Fraction = Fraction(0),
) -> list[Fixation]:
    """The fixations of one trial by the paper's I-DT."""

    def spread(window: Sequence[Placed]) -> Fraction:
        xs, ys = [s[1] for s in window], [s[2] for s in window]
        return (max(xs) - min(xs)) + (max(ys) - min(ys))

    fixations = []
    for points in stretches_of(samples, interval, longest_gap):
        while points:
            size = 1
            while size < len(points) and points[size - 1][0] - points[0][0] + interval < (
                shortest_fixation
            ):
                size += 1
            if points[size - 1][0] - points[0][0] + interval < shortest_fixation:
                break
            if spread(points[:size]) > dispersion:
                points = points[1:]
                continue
            while size < len(points) and spread(points[: size + 1]) <= dispersion:
                size += 1
            fixations.append(fixation_of(points[:size], interval))
            points = points[size:]
    return fixations
