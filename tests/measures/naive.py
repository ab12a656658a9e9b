"""Every outcome of one trial, by loops and searches straight from the definitions.

The slow twin of the kernels: fixations are numbered from 1 as in the definitions, each quantity is
looked for where its definition says, and nothing is shared with the kernels but the names.
"""

from dataclasses import dataclass

Cell = tuple[float | None, str]


@dataclass
class Trial:
    """One trial: order (0 = outside) and duration of each fixation, and the number of regions."""

    orders: list[int]
    durations_ms: list[float]
    regions: int


@dataclass
class Naive:
    """All outcomes of a trial: each cell is a value and an empty reason, or None and a reason."""

    regions: dict[str, list[Cell]]
    trial: dict[str, Cell]
    visit: list[int]
    first_pass: list[bool]
    regressions: list[tuple[int, int, bool]]


class Reading:
    """The visits, first passes and saccades of one trial, found by going through it."""

    def __init__(self, trial: Trial, outside: str) -> None:
        self.trial = trial
        # s[i] and d[i] for i = 1..n; where[i] is the fixation's number among all, from 0.
        self.s, self.d, self.where = [0], [0.0], [-1]
        # Whether an outside fixation that matters lies between fixation i - 1 and fixation i.
        self.broken = [False]
        interrupted = False
        for number, (order, duration_ms) in enumerate(
            zip(trial.orders, trial.durations_ms, strict=True)
        ):
            if order == 0:
                interrupted = interrupted or outside == "interrupt"
                continue
            self.s.append(order)
            self.d.append(duration_ms)
            self.where.append(number)
            self.broken.append(interrupted)
            interrupted = False
        self.n = len(self.s) - 1
        self.visits = self._find_visits()
        self.saccades = [
            (i, i + 1)
            for i in range(1, self.n)
            if not self.broken[i + 1] and self.s[i] != self.s[i + 1]
        ]

    def _find_visits(self) -> list[list[int]]:
        """Maximal runs of consecutive fixations in one region, as lists of fixations."""
        visits: list[list[int]] = []
        for i in range(1, self.n + 1):
            if i > 1 and self.s[i] == self.s[i - 1] and not self.broken[i]:
                visits[-1].append(i)
            else:
                visits.append([i])
        return visits

    def furthest(self, i: int) -> int:
        """M_i, the furthest region of the first i fixations."""
        return max(self.s[1 : i + 1], default=0)

    def visits_to(self, k: int) -> list[list[int]]:
        """The visits to region k in time order."""
        return [visit for visit in self.visits if self.s[visit[0]] == k]

    def first_pass(self, k: int) -> list[int] | None:
        """The visit that starts at the smallest a with s_a = k and M_{a-1} < k."""
        for a in range(1, self.n + 1):
            if self.s[a] == k and self.furthest(a - 1) < k:
                return next(visit for visit in self.visits if visit[0] == a)
        return None

    def going_past(self, k: int, a: int) -> int:
        """The first j > a with s_j > k; n + 1 if there is none."""
        for j in range(a + 1, self.n + 1):
            if self.s[j] > k:
                return j
        return self.n + 1

    def saccade_after(self, i: int) -> tuple[int, int] | None:
        """The saccade that fixation i launches to another region, if any."""
        return next((saccade for saccade in self.saccades if saccade[0] == i), None)


DURATIONS = (
    "first_fixation_duration",
    "single_fixation_duration",
    "first_pass_time",
    "go_past_time",
    "right_bounded_time",
    "second_pass_time",
    "total_time",
)


def measure(trial: Trial, outside: str, no_opportunity: str) -> Naive:
    """Compute all outcomes of one trial."""
    reading = Reading(trial, outside)
    rows = [region_outcomes(reading, k) for k in range(1, trial.regions + 1)]
    if no_opportunity == "zero":
        rows = [{name: zeroed(name, cell) for name, cell in row.items()} for row in rows]
    regions = {name: [row[name] for row in rows] for name in rows[0]}
    visit = [0] * len(trial.orders)
    first_pass = [False] * len(trial.orders)
    for k in range(1, trial.regions + 1):
        for number, fixations in enumerate(reading.visits_to(k), start=1):
            for i in fixations:
                visit[reading.where[i]] = number
        for i in reading.first_pass(k) or []:
            first_pass[reading.where[i]] = True
    return Naive(
        regions, trial_outcomes(reading, regions), visit, first_pass, regressive_rows(reading)
    )


def zeroed(name: str, cell: Cell) -> Cell:
    """The other convention: no opportunity is 0 in binary and count outcomes."""
    if name in DURATIONS or cell[1] not in (
        "not_reached",
        "not_passed",
        "skipped",
        "never_fixated",
    ):
        return cell
    return (1, "") if name == "first_pass_skip" else (0, "")


def region_outcomes(reading: Reading, k: int) -> dict[str, Cell]:
    """All outcomes of region k."""
    s, d, n = reading.s, reading.d, reading.n
    on_k = [i for i in range(1, n + 1) if s[i] == k]
    visits = reading.visits_to(k)
    reached, passed = reading.furthest(n) >= k, reading.furthest(n) > k
    pass_1 = reading.first_pass(k)
    out = sum(1 for i, j in reading.saccades if s[i] == k and s[j] < k)
    into = sum(1 for i, j in reading.saccades if s[j] == k and s[i] > k)
    total_ms = sum(d[i] for i in on_k)

    unless_reached = "" if reached else "not_reached"
    no_first_pass = "" if pass_1 else unless_reached or "skipped"
    not_fixated = "" if on_k else unless_reached or "never_fixated"
    no_way_out = "no_earlier_region" if k == 1 else not_fixated
    no_way_in = unless_reached or ("" if passed else "not_passed")
    if k == reading.trial.regions:
        no_way_in = "no_later_region"

    cells: dict[str, Cell] = {
        "first_pass_skip": (None, "not_reached"),
        "fixated": (int(len(on_k) > 0), ""),
        "first_pass_refixation": (None, no_first_pass),
        "first_pass_regression_out": (None, no_first_pass),
        "regression_out": (None, no_way_out) if no_way_out else (int(out > 0), ""),
        "regression_in": (None, no_way_in) if no_way_in else (int(into > 0), ""),
        "reread": (None, no_first_pass),
        "fixation_count": (len(on_k), ""),
        "first_pass_fixation_count": (None, no_first_pass),
        "visit_count": (len(visits), ""),
        "regression_out_count": (None, no_way_out) if no_way_out else (out, ""),
        "regression_in_count": (None, no_way_in) if no_way_in else (into, ""),
        "first_fixation_duration": (None, no_first_pass),
        "single_fixation_duration": (None, no_first_pass),
        "first_pass_time": (None, no_first_pass),
        "go_past_time": (None, no_first_pass),
        "right_bounded_time": (None, no_first_pass),
        "second_pass_time": (None, not_fixated),
        "total_time": (None, not_fixated),
    }
    if passed and not pass_1:
        cells["first_pass_skip"] = (1, "")
    if on_k:
        first_pass_ms = sum(d[i] for i in pass_1) if pass_1 else 0.0
        cells["total_time"] = (total_ms, "")
        cells["second_pass_time"] = (total_ms - first_pass_ms, "")
    if pass_1:
        cells.update(first_pass_outcomes(reading, k, pass_1))
    if k == 1:
        cells["first_pass_regression_out"] = (None, "no_earlier_region")
    return cells


def first_pass_outcomes(reading: Reading, k: int, pass_1: list[int]) -> dict[str, Cell]:
    """The outcomes that a region has because it has a first pass."""
    s, d = reading.s, reading.d
    a = pass_1[0]
    interval = range(a, reading.going_past(k, a))
    end = reading.saccade_after(pass_1[-1])
    visited_later = any(visit[0] > pass_1[-1] for visit in reading.visits_to(k))
    return {
        "first_pass_skip": (0, ""),
        "first_pass_refixation": (int(len(pass_1) >= 2), ""),
        "first_pass_regression_out": (int(end is not None and s[end[1]] < k), ""),
        "reread": (int(visited_later), ""),
        "first_pass_fixation_count": (len(pass_1), ""),
        "first_fixation_duration": (d[a], ""),
        "single_fixation_duration": (d[a], "") if len(pass_1) == 1 else (None, "refixated"),
        "first_pass_time": (sum(d[i] for i in pass_1), ""),
        "go_past_time": (sum(d[i] for i in interval), ""),
        "right_bounded_time": (sum(d[i] for i in interval if s[i] == k), ""),
    }


def trial_outcomes(reading: Reading, regions: dict[str, list[Cell]]) -> dict[str, Cell]:
    """All outcomes of the trial."""
    s = reading.s
    lower = sum(1 for i, j in reading.saccades if s[j] < s[i])
    higher = sum(1 for i, j in reading.saccades if s[j] > s[i])
    any_out = any(cell[0] == 1 for cell in regions["first_pass_regression_out"])
    any_skip = any(cell[0] == 1 for cell in regions["first_pass_skip"])
    no_saccade = reading.n < 2
    cells: dict[str, Cell] = {
        "any_regression": (None, "no_saccade") if no_saccade else (int(lower > 0), ""),
        "any_first_pass_regression": (None, "no_saccade") if no_saccade else (int(any_out), ""),
        "any_skip": (int(any_skip), ""),
        "fixation_count": (reading.n, ""),
        "outside_fixation_count": (reading.trial.orders.count(0), ""),
        "regression_count": (lower, ""),
        "progression_count": (higher, ""),
        "regions_reached": (reading.furthest(reading.n), ""),
        "reading_time": (sum(reading.d[1:]), ""),
    }
    if reading.trial.regions == 1:
        cells["any_first_pass_regression"] = (None, "no_earlier_region")
    return cells


def regressive_rows(reading: Reading) -> list[tuple[int, int, bool]]:
    """Launch and landing fixation (from 0, among all) and whether the first pass ends with it."""
    rows = []
    for i, j in reading.saccades:
        if reading.s[j] < reading.s[i]:
            pass_1 = reading.first_pass(reading.s[i])
            ends = pass_1 is not None and pass_1[-1] == i
            rows.append((reading.where[i], reading.where[j], ends))
    return rows
