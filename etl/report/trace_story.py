"""What the eyes did in one trial, worked out anew from its kept fixations.

The explanation of an outcome must not repeat what the kernels say about visits and passes: it finds
them itself, fixation by fixation, from the definitions. So words and values check one another.
"""

from __future__ import annotations

from dataclasses import dataclass

from etl.report.trace_input import TracedFixation, TracedTrial

Visit = tuple[TracedFixation, ...]


@dataclass(frozen=True, slots=True)
class Saccade:
    """A saccade from one region to another."""

    launch: TracedFixation
    landing: TracedFixation

    @property
    def regressive(self) -> bool:
        """Whether it goes to a region of lower order."""
        return self.landing.region_order < self.launch.region_order


class Story:
    """The visits, first passes and saccades of one trial.

    Parameters
    ----------
    traced : TracedTrial
        The trial; of its fixations only number, region, duration, and whether each is kept, are
        looked at.
    """

    def __init__(self, traced: TracedTrial) -> None:
        self.traced = traced
        self.kept = tuple(fixation for fixation in traced.fixations if fixation.kept)
        #: The kept fixations inside regions, in time order.
        self.inside = tuple(fixation for fixation in self.kept if fixation.region_order)
        #: The fixations inside regions that come right after one outside which breaks the step.
        self._broken: dict[int, TracedFixation] = {}
        outside: TracedFixation | None = None
        for fixation in self.kept:
            if not fixation.region_order:
                outside = outside or fixation
            else:
                if outside is not None and traced.outside == "interrupt":
                    self._broken[fixation.number] = outside
                outside = None
        # One outside after the last fixation inside ends that one's visit, too.
        self._last_outside = outside if traced.outside == "interrupt" else None
        self.visits = self._visits()
        self.saccades = tuple(
            Saccade(before, after)
            for before, after in zip(self.inside, self.inside[1:], strict=False)
            if before.region_order != after.region_order and after.number not in self._broken
        )

    def _visits(self) -> tuple[Visit, ...]:
        """Runs of fixations in one region."""
        visits: list[list[TracedFixation]] = []
        for fixation in self.inside:
            same = visits and visits[-1][-1].region_order == fixation.region_order
            if same and fixation.number not in self._broken:
                visits[-1].append(fixation)
            else:
                visits.append([fixation])
        return tuple(tuple(visit) for visit in visits)

    def on(self, order: int) -> Visit:
        """The fixations on a region."""
        return tuple(f for f in self.inside if f.region_order == order)

    def visits_to(self, order: int) -> tuple[Visit, ...]:
        """The visits to a region."""
        return tuple(visit for visit in self.visits if visit[0].region_order == order)

    def first_as_far_as(self, order: int) -> TracedFixation | None:
        """The first fixation on a region or beyond it; None where the eyes never got there."""
        return next((f for f in self.inside if f.region_order >= order), None)

    def first_pass(self, order: int) -> Visit:
        """The first pass on a region; empty where it has none."""
        start = self.first_as_far_as(order)
        if start is None or start.region_order != order:
            return ()
        return next(visit for visit in self.visits if visit[0] is start)

    def way_past(self, order: int) -> tuple[Visit, TracedFixation | None]:
        """All fixations from the first pass until the eyes go past, and the one that does."""
        start = self.first_as_far_as(order)
        if start is None or start.region_order != order:
            return (), None
        path: list[TracedFixation] = []
        for fixation in self.inside[self.inside.index(start) :]:
            if fixation.region_order > order:
                return tuple(path), fixation
            path.append(fixation)
        return tuple(path), None

    def furthest(self) -> TracedFixation | None:
        """The first fixation on the furthest region of the trial."""
        return max(self.inside, key=lambda f: f.region_order, default=None)

    def leaving(self, visit: Visit) -> tuple[Saccade | None, TracedFixation | None]:
        """The saccade that ends a visit, or the fixation outside every region that does."""
        saccade = next((s for s in self.saccades if s.launch is visit[-1]), None)
        if saccade is not None:
            return saccade, None
        place = self.inside.index(visit[-1])
        if place + 1 == len(self.inside):
            return None, self._last_outside
        return None, self._broken.get(self.inside[place + 1].number)

    def regressions_from(self, order: int) -> tuple[Saccade, ...]:
        """The regressive saccades that leave a region."""
        return tuple(s for s in self.saccades if s.regressive and s.launch.region_order == order)

    def regressions_onto(self, order: int) -> tuple[Saccade, ...]:
        """The regressive saccades that land on a region."""
        return tuple(s for s in self.saccades if s.regressive and s.landing.region_order == order)
