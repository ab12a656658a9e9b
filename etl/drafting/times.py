"""Which columns say when a fixation began, how long it lasted and when it ended; their units."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from etl.drafting.columns import Floats, PooledColumn, share_of, steps
from etl.drafting.meanings import NAMED, Meaning, Understanding, counted, number, shortened
from etl.drafting.structure import Structure
from etl.drafting.vocabulary import likeness, word_set, words_of

Unit = Literal["ms", "s", "us"]

#: Bounds of the median duration of fixations, in each unit. In reading it is 200 to 250 ms (Rayner
#: 1998, doi:10.1037/0033-2909.124.3.372); the bounds are wide enough for any task.
_MEDIAN_DURATION = {"ms": (40.0, 2000.0), "s": (0.04, 2.0), "us": (40_000.0, 2_000_000.0)}
_PER_MS = {"ms": 1.0, "s": 0.001, "us": 1000.0}
#: Times of samples are at most this far apart, in ms; trackers take 25 to 2000 samples a second.
_LONGEST_INTERVAL_MS = 45.0
#: From which share of rows on something holds of a column.
_NEARLY_ALL = 0.98
_MOST = 0.9
#: A fixation fills at least this share of the time to the next one, in the middle of all pairs.
_LEAST_FILLED = 0.35
#: Of two readings of a column, one is clearly the better one from this difference in rows on.
_CLEARLY = 0.02
#: Words for times that leave open what happens at them.
_NEUTRAL = word_set("time t timestamp stamp zeit temps tiempo tempo clock value 2 3 4 ms s")


@dataclass(frozen=True, slots=True)
class _Fit:
    """How well a duration goes with a column of times, at which fixations begin or end."""

    time: str
    duration: str
    factor: float
    fits: float
    filled: float
    ends: bool

    @property
    def pair(self) -> tuple[str, str, float]:
        """What goes together."""
        return (self.time, self.duration, self.factor)

    @property
    def named(self) -> float:
        """How much the names say so."""
        as_onset, as_end = likeness(self.time, "onset"), likeness(self.time, "end")
        if set(words_of(self.time)) <= _NEUTRAL:
            as_onset, as_end = 0.2, 0.2
        own, other = (as_end, as_onset) if self.ends else (as_onset, as_end)
        return own - 0.5 * other + likeness(self.duration, "duration")

    @property
    def quality(self) -> float:
        """How much of the time is filled, without reaching beyond the next fixation."""
        return self.fits + min(self.filled, 1.0)


def find_times(structure: Structure, headers: Sequence[str], found: Understanding) -> None:
    """Find the columns of times among some columns.

    Parameters
    ----------
    structure : Structure
        The rows.
    headers : sequence of str
        The columns that may be times.
    found : Understanding
        Where it is recorded.
    """
    columns = {h: structure.rows.columns[h] for h in headers if structure.rows.columns[h].numeric}
    _find_number(structure, columns, found)
    number_header = found.header("fixation")
    times = [
        h
        for h, column in columns.items()
        if h != number_header and _is_time(column.numbers, structure.group)
    ]
    durations = [
        h
        for h, column in columns.items()
        if h not in times and h != number_header and _may_be_duration(column)
    ]
    if _are_samples(structure, columns, times, found):
        return
    fits = _fits(structure, columns, times, durations)
    if fits:
        _take_pair(columns, fits, found)
    elif not _take_ends(structure, columns, times, found):
        _take_alone(structure, columns, times, durations, found)
    _compare_end(columns, times, found)


def _find_number(
    structure: Structure, columns: dict[str, PooledColumn], found: Understanding
) -> None:
    """The column that numbers the fixations of a trial: 1, 2, 3, … from its beginning."""
    best: tuple[float, str, str] | None = None
    begins = np.concatenate(([True], np.diff(structure.run) != 0))
    for header, column in columns.items():
        if not column.whole or header == found.header("trial"):
            continue
        moved = steps(column.numbers, structure.group)
        by_one = share_of(moved == 1)
        # Rows may be left out, so that numbers skip; they never stay or fall.
        if not moved.size or share_of(moved > 0) < _NEARLY_ALL or by_one < 0.6:
            continue
        first = column.numbers[begins]
        restarts = share_of(np.isin(first, (0.0, 1.0)))
        named = likeness(header, "fixation")
        again = restarts >= _MOST and len(first) > 1
        if named < NAMED and not (again and by_one >= _MOST):
            continue
        how = "begins anew with each trial" if again else "runs on over the whole log"
        told = f"its number grows by one from row to row and {how}"
        score = named + by_one + restarts
        if best is None or score > best[0]:
            best = (score, header, told)
    if best is not None:
        found.meanings["fixation"] = Meaning(best[1], best[2])


def _is_time(values: Floats, group: NDArray[np.int64]) -> bool:
    """Whether numbers never fall within a trial, and do not stand still."""
    moved = steps(values, group)
    return bool(moved.size) and share_of(moved >= 0) >= _NEARLY_ALL and share_of(moved > 0) > 0.5


def _may_be_duration(column: PooledColumn) -> bool:
    """Whether numbers are above zero, as durations are."""
    if column.unit in ("px", "deg"):
        return False
    return share_of(column.values > 0) >= _NEARLY_ALL and len(column.distinct) > 1


def _fits(
    structure: Structure,
    columns: dict[str, PooledColumn],
    times: Sequence[str],
    durations: Sequence[str],
) -> list[_Fit]:
    """The pairs of a time and a duration by which no fixation reaches into another one."""
    order = np.argsort(structure.group, kind="stable")
    same = np.diff(structure.group[order]) == 0
    found = []
    for onset in times:
        gap = np.diff(columns[onset].numbers[order])[same]
        for duration in durations:
            ordered = columns[duration].numbers[order]
            # From an onset a fixation lasts until the next one; up to an end, since the last one.
            for ends, lasted in ((False, ordered[:-1][same]), (True, ordered[1:][same])):
                known = ~np.isnan(gap) & ~np.isnan(lasted) & (gap > 0)
                if not known.any():
                    continue
                share = lasted[known] / gap[known]
                for factor in (1.0, 1000.0, 0.001, 1e6, 1e-6):
                    # Times are rounded: a fixation may reach the next one by a sample.
                    fits = share_of(share * factor <= 1.05)
                    filled = float(np.median(share * factor))
                    if fits >= _MOST and filled >= _LEAST_FILLED:
                        found.append(_Fit(onset, duration, factor, fits, filled, ends))
    return found


def _take_pair(
    columns: dict[str, PooledColumn], fits: Sequence[_Fit], found: Understanding
) -> None:
    """Take the onset and the duration that go together best."""
    best = max(fits, key=lambda fit: fit.quality + fit.named)
    if best.ends:
        # Where some times go with the durations as onsets, others that do so as ends are the ends.
        onsets = [f for f in fits if not f.ends and f.fits >= best.fits - _CLEARLY]
        alike = [f for f in onsets if f.named >= best.named - NAMED]
        best = max(alike, key=lambda fit: fit.quality + fit.named, default=best)
    duration, time = columns[best.duration], columns[best.time]
    spread = f"numbers between {number(duration.share(0))} and {number(duration.share(1))}"
    unit, question = _unit_of_durations(duration.values, duration.unit)
    told = (
        f"{len(duration.values):,} of {counted(len(duration.numbers), 'cell')} are {spread}, "
        f"median {number(duration.median)}, as durations in {unit} are"
        if unit != "?"
        else f"{spread}, median {number(duration.median)}"
    )
    found.meanings["duration"] = Meaning(best.duration, told, unit, question)
    own_unit = _unit_by_factor(unit, best.factor)
    if own_unit == "?":
        settled = ("?", f'"ms", "s" or "us"? It is that of "{best.duration}"')
    else:
        settled = _settled(time.unit, own_unit, "its times", time.header)
    if _could_be_either(best, fits):
        found.clock, found.clock_unit = best.time, settled[0]
        found.questions["onset"] = (
            f'is "{best.time}" when a fixation begins, or when it is over? With the durations both '
            f'would do. Write {{ column = "{best.time}", unit = "{settled[0]}" }} here, or name '
            "this line end in place of onset and write the same"
        )
    else:
        told = (
            "end - duration comes after the end before it"
            if best.ends
            else "onset + duration comes before the next onset"
        )
        told = f"times that never fall within a trial; {told} in {best.fits:.0%} of rows"
        found.meanings["end" if best.ends else "onset"] = Meaning(best.time, told, *settled)
    others = {
        fit.time
        for fit in fits
        if fit.time != best.time and fit.ends == best.ends and likeness(fit.time, "end") < NAMED
    }
    if others and not best.ends:
        found.remarks.append(
            f"the onset could also be {shortened(sorted(others))}, which goes with the duration as "
            f'well; "{best.time}" was taken. If texts have an onset in log time (trials.onset), '
            "both must be on the same clock"
        )
    own = {"duration": best.duration, "onset": best.time}
    for name, header in own.items() if not best.ends else ():
        for other in columns:
            if likeness(header, name) < NAMED <= likeness(other, name) and other != header:
                found.remarks.append(
                    f'column "{other}" is called like the {name}, but its cells are not; those of '
                    f'"{header}" are'
                )


def _could_be_either(best: _Fit, fits: Sequence[_Fit]) -> bool:
    """Whether fixations might as well end at the times at which they begin, or the reverse."""
    same = [f for f in fits if f.pair == best.pair and f.ends != best.ends]
    other = next(iter(same), None)
    if other is None or best.fits - other.fits > _CLEARLY:
        return False
    return best.named - other.named < NAMED


def _unit_of_durations(values: Floats, stated: str | None) -> tuple[str, str]:
    """The unit of durations by their size, and what is asked where the header says otherwise."""
    median = float(np.median(values)) if len(values) else float("nan")
    by_size = [u for u, (low, high) in _MEDIAN_DURATION.items() if low <= median < high]
    if not by_size:
        if stated in _MEDIAN_DURATION:
            return str(stated), ""
        return "?", f'"ms", "s" or "us"? Their median is {number(median)}'
    return _settled(stated, by_size[0], f"a median of {number(median)}", "")


def _settled(stated: str | None, by_size: str, what: str, header: str) -> tuple[str, str]:
    """The unit, and what is asked about it where its header contradicts the size of its numbers."""
    if stated in _PER_MS and by_size != "?" and stated != by_size:
        whose = f' of "{header}"' if header else ""
        return "?", f"the header{whose} says {stated}, but {what} would fit {by_size}; which is it?"
    return (stated if stated in _PER_MS and by_size == "?" else by_size), ""


def _unit_by_factor(unit: str, factor: float) -> str:
    """The unit of onsets, given that of durations and how many of it go into one of theirs."""
    if unit == "?":
        return "?"
    wanted = _PER_MS[unit] * factor
    return next((name for name, per_ms in _PER_MS.items() if np.isclose(per_ms, wanted)), "?")


def _take_ends(
    structure: Structure,
    columns: dict[str, PooledColumn],
    times: Sequence[str],
    found: Understanding,
) -> bool:
    """Take an onset and an end, where no column holds durations."""
    order = np.argsort(structure.group, kind="stable")
    same = np.diff(structure.group[order]) == 0
    best: tuple[float, str, str] | None = None
    for onset in times:
        for end in times:
            begun, ended = columns[onset].numbers[order], columns[end].numbers[order]
            lasted = ended - begun
            if onset == end or share_of(lasted > 0) < _NEARLY_ALL:
                continue
            before = share_of(ended[:-1][same] <= begun[1:][same] + 0.05 * lasted[:-1][same])
            usual = float(np.median(lasted[~np.isnan(lasted)]))
            plausible = any(low <= usual < high for low, high in _MEDIAN_DURATION.values())
            if before < _MOST or not plausible:
                continue
            score = before + likeness(onset, "onset") + likeness(end, "end")
            if best is None or score > best[0]:
                best = (score, onset, end)
    if best is None:
        return False
    _, onset, end = best
    lasted = columns[end].numbers - columns[onset].numbers
    lasted = lasted[~np.isnan(lasted)]
    unit, question = _unit_of_durations(lasted, columns[end].unit or columns[onset].unit)
    told = (
        f'it follows "{onset}" in all rows and comes before the next one; what lies between has '
        f"a median of {number(float(np.median(lasted)))}"
    )
    told += f", as durations in {unit} have" if unit != "?" else ""
    found.meanings["end"] = Meaning(end, told, unit, question)
    found.meanings["onset"] = Meaning(
        onset, f'times that never fall within a trial; "{end}" follows in each row', unit, question
    )
    return True


def _are_samples(
    structure: Structure,
    columns: dict[str, PooledColumn],
    times: Sequence[str],
    found: Understanding,
) -> bool:
    """Whether rows follow each other at the pace of a tracker; then they are samples."""
    for header in sorted(times, key=lambda one: -likeness(one, "onset")):
        moved = steps(columns[header].numbers, structure.group)
        usual = float(np.median(moved)) if moved.size else 0.0
        # Rounding to whole milliseconds makes 3, 3, 4 of 300 samples a second.
        if usual <= 0 or share_of(np.abs(moved - usual) <= 0.34 * usual) < _MOST:
            continue
        units = [
            u for u, per_ms in _PER_MS.items() if 0.4 <= usual / per_ms <= _LONGEST_INTERVAL_MS
        ]
        if not units:
            continue
        unit, question = _settled(columns[header].unit, units[0], "the pace of its rows", "")
        pace = 1000 / (usual / _PER_MS[units[0]])
        found.samples = (
            f"the rows follow each other every {number(usual)} {units[0]}, as samples of gaze do "
            f"at {pace:,.0f} a second, and no column holds durations"
        )
        told = f"times that grow by {number(usual)} from row to row"
        found.meanings["onset"] = Meaning(header, told, unit, question)
        found.meanings.pop("fixation", None)
        return True
    return False


def _take_alone(
    structure: Structure,
    columns: dict[str, PooledColumn],
    times: Sequence[str],
    durations: Sequence[str],
    found: Understanding,
) -> None:
    """Take a duration or an onset by its name, where no two columns go together."""
    named = sorted(times, key=lambda one: likeness(one, "end") - likeness(one, "onset"))
    if named and (likeness(named[0], "onset") >= NAMED or len(times) == 1):
        # Fixations follow each other a little more slowly than they last.
        gaps = steps(columns[named[0]].numbers, structure.group)
        unit, question = _unit_of_durations(gaps, columns[named[0]].unit)
        told = (
            "times that never fall within a trial; from one to the next it is "
            f"{number(float(np.median(gaps)))} in the middle"
        )
        found.meanings["onset"] = Meaning(named[0], told, unit, question)
    sized = [
        one
        for one in durations
        if any(lo <= columns[one].median < hi for lo, hi in _MEDIAN_DURATION.values())
        and not any(likeness(one, other) >= NAMED for other in ("x", "y", "fixation"))
    ]
    by_name = [one for one in sized if likeness(one, "duration") >= NAMED]
    if by_name:
        header = max(by_name, key=lambda one: likeness(one, "duration"))
        column = columns[header]
        unit, question = _unit_of_durations(column.values, column.unit)
        told = (
            f"numbers between {number(column.share(0))} and {number(column.share(1))}, median "
            f"{number(column.median)}"
        )
        found.meanings["duration"] = Meaning(header, told, unit, question)
        return
    hint = f" It may be one of {shortened(sized)}" if sized else ""
    found.questions["duration"] = f"which column says how long a fixation lasted?{hint}"


def _compare_end(
    columns: dict[str, PooledColumn], times: Sequence[str], found: Understanding
) -> None:
    """Say of a column of ends whether it agrees with onset and duration."""
    onset, duration = found.meanings.get("onset"), found.meanings.get("duration")
    ends = [h for h in times if likeness(h, "end") >= NAMED and h not in found.used()]
    if onset is None or duration is None or "?" in (onset.unit, duration.unit):
        return
    for header in ends:
        in_ms = [
            columns[h].numbers / _PER_MS[unit]
            for h, unit in ((onset.header, onset.unit), (duration.header, duration.unit))
        ]
        gap = columns[header].numbers / _PER_MS[onset.unit] - in_ms[0] - in_ms[1]
        agrees = share_of(np.abs(gap[~np.isnan(gap)]) <= 1.5)
        found.remarks.append(
            f'column "{header}" is the end: onset + duration, to about a millisecond, in '
            f"{agrees:.0%} of rows; the duration was taken"
        )
