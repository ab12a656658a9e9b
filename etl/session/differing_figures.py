"""Logs whose figures are far from the rest: trials, fixations, durations, positions."""

from __future__ import annotations

from collections.abc import Sequence

from etl.session.compared_logs import ComparedLog, Difference
from etl.session.far_off import Ranged, far_off, far_placed, off_by_factor
from etl.session.log_figures import Spread

#: A log's median duration that is more than this many times that of the rest, or less than one
#: part in this many, is doubtful: readers' means differ by less than a factor of two (Rayner 1998,
#: doi:10.1037/0033-2909.124.3.372, gives 50 to 500 ms for single fixations). The factor is ours.
_FACTOR_OF_MEDIANS = 3.0
#: The same for the number of durations from onset to onset (our choice; units differ by 1,000).
_FACTOR_OF_STEPS = 10.0
#: A log has far fewer positions than the rest where at least this share of its fixations is without
#: one and less than half of that in the middle of all logs (our choice).
_SHARE_UNPLACED = 0.5


def other_numbers(logs: Sequence[ComparedLog]) -> list[Difference]:
    """Logs with far fewer or far more trials or fixations a reader than the rest.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study, at least two.

    Returns
    -------
    list of Difference
        Empty where all are alike.
    """
    out: list[Difference] = []
    told: set[str] = set()
    for what in ("trials", "fixations"):
        numbers = [getattr(log.figures, what) / log.figures.readers for log in logs]
        middle, signs = far_off(numbers)
        for sign, word in ((-1, "fewer"), (1, "more")):
            others = [
                (log.shown, number)
                for log, number, own in zip(logs, numbers, signs, strict=True)
                # A log without many trials is without many fixations too, which needs no telling.
                if own == sign and log.shown not in told
            ]
            if not others:
                continue
            told |= {shown for shown, _ in others}
            rest = f"whose median is {middle:,.4g}"
            out.append(
                Difference(
                    "warning",
                    f"{len(others):,} of {len(logs):,} logs hold far {word} {what} a reader than "
                    f"the rest, {rest}",
                    f"the log holds far {word} {what} a reader than the rest, {rest}: "
                    f"{others[0][1]:,.4g}",
                    tuple(shown for shown, _ in others),
                    tuple(f"{number:,.4g}" for _, number in others),
                    fix="copy the log again if this is not how it was recorded",
                )
            )
    return out


def other_durations(logs: Sequence[ComparedLog]) -> list[Difference]:
    """Logs with other durations or steps from onset to onset than the rest.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study, at least two.

    Returns
    -------
    list of Difference
        Empty where all are alike.
    """
    out: list[Difference] = []
    for what, values, factor, unit in (
        ("median duration", [log.figures.median_ms for log in logs], _FACTOR_OF_MEDIANS, " ms"),
        (
            "time from onset to onset",
            [log.figures.step_ratio for log in logs],
            _FACTOR_OF_STEPS,
            " durations",
        ),
    ):
        usual, off = off_by_factor(values, factor)
        others = [(log.shown, v) for log, v, o in zip(logs, values, off, strict=True) if o]
        if others:
            rest = f"more than {factor:g} times off that of the rest, {usual:,.4g}{unit}"
            out.append(
                Difference(
                    "warning",
                    f"in {len(others):,} of {len(logs):,} logs the {what} is {rest}",
                    f"the {what} is {rest}: {others[0][1]:,.4g}{unit}",
                    tuple(shown for shown, _ in others),
                    tuple(f"{value:,.4g}{unit}" for _, value in others),
                    fix="check the units of onset and duration in these logs",
                )
            )
    return out


def other_places(logs: Sequence[ComparedLog]) -> list[Difference]:
    """Logs whose fixations lie elsewhere than in the rest, or have no position.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study, at least two.

    Returns
    -------
    list of Difference
        Empty where all are alike.
    """
    out: list[Difference] = []
    bare = [1 - log.figures.placed / log.figures.fixations for log in logs]
    middle = sorted(bare)[len(bare) // 2]
    without = [
        (log.shown, share)
        for log, share in zip(logs, bare, strict=True)
        if share >= _SHARE_UNPLACED > 2 * middle
    ]
    if without:
        rest = f"in the rest it is {middle:.0%} of them"
        out.append(
            Difference(
                "warning",
                f"in {len(without):,} of {len(logs):,} logs most fixations have no position; "
                f"{rest}",
                f"{without[0][1]:.0%} of the fixations have no position; {rest}",
                tuple(shown for shown, _ in without),
                tuple(f"{share:.0%}" for _, share in without),
                fix="check that the log was exported with its positions",
            )
        )
    for axis, where in (("x", "from left to right"), ("y", "from top to bottom")):
        spreads: list[Spread] = [getattr(log.figures, axis) for log in logs]
        placed = [log.figures.placed for log in logs]
        usual, off = far_placed(list(map(Ranged, spreads, placed)))
        others = [
            (log.shown, f"{own.low_px:,.0f} to {own.high_px:,.0f} px")
            for log, own, o in zip(logs, spreads, off, strict=True)
            if o
        ]
        if others:
            rest = f"nine in ten of theirs between {usual.low_px:,.0f} and {usual.high_px:,.0f} px"
            out.append(
                Difference(
                    "warning",
                    f"in {len(others):,} of {len(logs):,} logs the fixations lie elsewhere {where} "
                    f"than in the rest, {rest}",
                    f"the fixations lie elsewhere {where} than in the rest, {rest}: {others[0][1]}",
                    tuple(shown for shown, _ in others),
                    tuple(remark for _, remark in others),
                    fix="check that x and y are not swapped in these logs, and that they have the "
                    "unit and the origin of the others",
                )
            )
    return out
