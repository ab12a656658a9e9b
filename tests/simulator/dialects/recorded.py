"""A small orchard study as it was recorded, before anybody has written it in any dialect."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from tests.simulator.layout import Layout
from tests.simulator.orchard import CONDITIONS, orchard_spec, region_table
from tests.simulator.spec import Mess, SimulatedStudy, SimulatedTrial
from tests.simulator.study import simulate_study
from tests.simulator.writing import table

#: Much goes wrong, so that a study of few trials has some of everything.
MESS = Mess(blink_share=0.06, off_screen_share=0.03, before_text_share=0.25, after_text_share=0.2)
#: From which gap between two fixations on the simulator's reader blinked, in ms.
_BLINK_GAP_MS = 100
#: How long before and after a blink the gaze is still found, in ms.
_BLINK_EDGE_MS = 12
#: In long trials this fixation has no position.
_WITHOUT_POSITION, _LONG = 5, 9
#: What a log of areas writes for a fixation outside every region.
NOWHERE = "elsewhere"
SESSIONS = ("autumn", "spring")


def in_unit(milliseconds: int, unit: str) -> str:
    """A time in its unit, exact.

    Examples
    --------
    >>> in_unit(61005, "ms"), in_unit(61005, "s"), in_unit(61005, "us")
    ('61005', '61.005', '61005000')
    """
    if unit == "s":
        return f"{milliseconds // 1000}.{milliseconds % 1000:03d}"
    return f"{milliseconds}000" if unit == "us" else str(milliseconds)


def off_edge(px: float) -> float:
    """A place that is on no whole pixel, where the edges of regions are.

    A place on an edge that is written in degrees may come back a millionth of a pixel before it.
    """
    return px + 0.1 if px == round(px) else px


@dataclass(frozen=True, slots=True)
class Fixated:
    """A fixation of the eye that counts.

    Attributes
    ----------
    number : int
        Its number in the trial, from 1.
    onset_ms, duration_ms : int
        In log time.
    x_px, y_px : float or None
        With one decimal, from the top left corner; None where the recorder lost the position.
    blink : bool
        Whether a blink stands right before or after it.
    label : str
        The area that was fixated.
    """

    number: int
    onset_ms: int
    duration_ms: int
    x_px: float | None
    y_px: float | None
    blink: bool
    label: str

    @property
    def end_ms(self) -> int:
        """When it ends, in log time."""
        return self.onset_ms + self.duration_ms

    def by_other_eye(self) -> Fixated:
        """The same fixation by the other eye: later, shorter, and on the line below."""
        away = {"x_px": None, "y_px": None}
        if self.x_px is not None and self.y_px is not None:
            away = {"x_px": round(self.x_px + 90.3, 1), "y_px": round(self.y_px + 60.4, 1)}
        return replace(
            self,
            onset_ms=self.onset_ms + 4,
            duration_ms=self.duration_ms - 7,
            blink=False,
            label=NOWHERE,
            **away,
        )


@dataclass(frozen=True, slots=True)
class ReadTrial:
    """A trial that was read, and the blinks in it as pairs of onset and end."""

    participant: str
    trial: int
    item: str
    cue: str
    fit: str
    answer_ok: int
    text_on_ms: int
    text_off_ms: int
    fixations: tuple[Fixated, ...]
    blinks: tuple[tuple[int, int], ...]


@dataclass(frozen=True, slots=True)
class Reader:
    """A reader, with the eye that counts."""

    participant: str
    group: str
    age: int
    eye: str


@dataclass(frozen=True, slots=True)
class RecordedStudy:
    """All that is known of a study, whatever its logs look like.

    Attributes
    ----------
    readers : tuple of Reader
        Who read.
    trials : tuple of ReadTrial
        By reader, in the order in which they were read.
    marked_text : str
        Region definitions of kind ``marked_text``, as comma-separated text.
    labels : str
        Region definitions of kind ``labels``.
    """

    readers: tuple[Reader, ...]
    trials: tuple[ReadTrial, ...]
    marked_text: str
    labels: str

    def of(self, participant: str) -> tuple[ReadTrial, ...]:
        """The trials of one reader, in order."""
        return tuple(trial for trial in self.trials if trial.participant == participant)

    def reader(self, participant: str) -> Reader:
        """One reader by id."""
        return next(one for one in self.readers if one.participant == participant)

    def session_of(self, trial: ReadTrial) -> str:
        """In which of two sessions a trial was read, where readers came twice."""
        return SESSIONS[self._place(trial) >= self._in_first()]

    def number_in_session(self, trial: ReadTrial) -> int:
        """A trial's number where every session begins with number 1."""
        return self._place(trial) % self._in_first() + 1

    def number_before(self, session: str, number: int) -> int:
        """A trial's number where sessions do not begin anew, from its number where they do."""
        return self.trials[number - 1 + SESSIONS.index(session) * self._in_first()].trial

    def _in_first(self) -> int:
        """How many trials the first session has."""
        return (len(self.of(self.readers[0].participant)) + 1) // 2

    def _place(self, trial: ReadTrial) -> int:
        """How many trials of its reader come before a trial."""
        return [one.trial for one in self.of(trial.participant)].index(trial.trial)

    def trial_rows(self, *, unit: str = "ms", sessions: bool = False) -> list[list[str | int]]:
        """The trial list, its header first; times in the unit of the log."""
        names = ["participant", "trial", "item", "cue", "fit", "answer_ok", "text_on", "text_off"]
        rows: list[list[str | int]] = []
        for t in self.trials:
            number = self.number_in_session(t) if sessions else t.trial
            times = [in_unit(time, unit) for time in (t.text_on_ms, t.text_off_ms)]
            row = [t.participant, number, t.item, t.cue, t.fit, t.answer_ok, *times]
            rows.append([self.session_of(t), *row] if sessions else row)
        return [["session", *names] if sessions else list(names), *rows]

    def placed(self) -> RecordedStudy:
        """The study as it would be had every fixation without a position not been made.

        In gaze samples no such fixation can be found, and a blink beside one is beside the next.
        """
        trials = []
        for trial in self.trials:
            fixations = tuple(f for f in trial.fixations if f.x_px is not None)
            beside = set()
            for onset, end in trial.blinks:
                beside.add(max((f.end_ms for f in fixations if f.end_ms <= onset), default=0))
                beside.add(min((f.onset_ms for f in fixations if f.onset_ms >= end), default=0))
            fixations = tuple(
                replace(f, number=number, blink=f.onset_ms in beside or f.end_ms in beside)
                for number, f in enumerate(fixations, start=1)
            )
            trials.append(replace(trial, fixations=fixations))
        return replace(self, trials=tuple(trials))

    def reader_rows(self) -> list[list[str | int]]:
        """The table of readers, its header first."""
        rows: list[list[str | int]] = [[r.participant, r.group, r.age, r.eye] for r in self.readers]
        return [["participant", "group", "age", "better_eye"], *rows]


def recorded_study(readers: int = 6, items: int = 8, *, seed: int = 20) -> RecordedStudy:
    """Let some readers read some sentences of the orchard study.

    Parameters
    ----------
    readers, items : int
        How many; every reader reads every sentence once.
    seed : int
        Of the simulator.

    Returns
    -------
    RecordedStudy
        With blinks, fixations past the screen, before and after the text, and without a position.
    """
    rng = np.random.default_rng(seed)
    spec = orchard_spec(rng, readers=readers, items=items, with_fillers=False, mess=MESS)
    study = simulate_study(spec, rng)
    people = tuple(
        Reader(
            r.plan.participant, str(r.plan.facts["group"]), int(r.plan.facts["age"]), "RL"[n % 2]
        )
        for n, r in enumerate(study.readers)
    )
    trials = tuple(_read(trial, spec.layouts[trial.plan.text]) for trial in study.trials)
    marked = region_table(study)
    for number in range(1, items + 1):
        marked = marked.replace(f"i{number:02d},", f"{_named(f'i{number:02d}')},")
    return RecordedStudy(people, trials, marked, _label_table(study))


def _named(item: str) -> str:
    """An item's name with letters that not every encoding writes with the same bytes."""
    return f"pré-{item}-Äpfel"


def _read(trial: SimulatedTrial, layout: Layout) -> ReadTrial:
    """A simulated trial as it was recorded."""
    gaps = [
        (one.end_ms + _BLINK_EDGE_MS, following.onset_ms - _BLINK_EDGE_MS)
        for one, following in pairwise(trial.fixations)
        if following.onset_ms - one.end_ms >= _BLINK_GAP_MS
    ]
    blinking = {edge for gap in gaps for edge in gap}
    fixations = []
    for f in trial.fixations:
        x_px, y_px = off_edge(f.x_px), off_edge(f.y_px)
        word = layout.word_at(x_px, y_px)
        lost = f.fixation == _WITHOUT_POSITION and len(trial.fixations) >= _LONG
        place = (None, None) if lost else (x_px, y_px)
        beside = {f.end_ms + _BLINK_EDGE_MS, f.onset_ms - _BLINK_EDGE_MS}
        label = NOWHERE if lost or word is None or word.region is None else area(word.region)
        fixations.append(
            Fixated(f.fixation, f.onset_ms, f.duration_ms, *place, bool(beside & blinking), label)
        )
    plan = trial.plan
    return ReadTrial(
        plan.participant,
        plan.trial,
        _named(plan.item),
        plan.facts["cue"],
        plan.facts["fit"],
        int(trial.answer_ok),
        trial.text_on_ms,
        trial.text_off_ms,
        tuple(fixations),
        tuple(gaps),
    )


def area(region: str) -> str:
    """The name that a log of areas has for a region."""
    return f"area of {region}"


def _label_table(study: SimulatedStudy) -> str:
    """Region definitions of kind ``labels``, a row an area of each version of a sentence."""

    def rows() -> Iterator[list[object]]:
        for item in sorted({trial.plan.item for trial in study.trials}):
            for cue, fit in CONDITIONS:
                regions = study.spec.layouts[f"{item}-{cue}-{fit}"].regions
                for order, region in enumerate(regions, start=1):
                    yield [_named(item), cue, fit, area(region), region, order]

    return table(["item", "cue", "fit", "label", "region", "order"], rows())
