"""All rules of screening for one reader, by loops over one trial at a time.

The slow twin of the kernels, written from the definitions and not from the code; first passes are
found by the naive reading of ``tests/measures/naive.py``. A rule that is not named is off.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from tests.measures.naive import Reading
from tests.measures.naive import Trial as NaiveTrial

FIXATION_RULES = (
    *("outside_text_time", "off_screen", "first", "last", "blink", "undersweep"),
    *("merge", "under_ms", "over_ms"),
)
TRIAL_RULES = (
    *("notes", "fewest_fixations", "line_confidence_under", "outside_share_over", "duration_ms"),
    *("blink_in_first_pass_of", "no_first_pass_on", "answer_wrong"),
)
READER_RULES = (
    *("participant_notes", "correct_share_under"),
    *("lost_trials_share_over", "fewest_trials_per_cell"),
)
Rules = Mapping[str, Any]


@dataclass
class Fixation:
    """One fixation: as logged, then what screening makes of it.

    ``order`` is that of its region, 0 outside; ``aside`` says that it is of a recording not used.
    """

    number: int
    onset_ms: float
    duration_ms: float
    x_px: float | None
    y_px: float | None
    blink: bool
    order: int
    aside: bool = False
    undersweep: bool = False
    left_out: str = ""
    into: int = 0
    against: list[str] = field(default_factory=list)


@dataclass
class Trial:
    """One trial with what is known of it; ``regions`` names those of its text in order.

    ``confidence`` says how sure its lines are; None where no method tells.
    """

    fixations: list[Fixation]
    regions: tuple[str, ...]
    came_ms: float | None = None
    went_ms: float | None = None
    answer: bool | None = None
    note: str = ""
    cell: tuple[Any, ...] = ()
    skipped: bool = False
    confidence: float | None = None
    left_out: str = ""
    against: list[str] = field(default_factory=list)


@dataclass
class Reader:
    """A reader's trials, the note on the reader, and the verdict."""

    trials: list[Trial]
    note: str = ""
    left_out: str = ""
    against: list[str] = field(default_factory=list)


def kept(trial: Trial) -> list[Fixation]:
    """The fixations that no rule for fixations has left out."""
    return [f for f in trial.fixations if not f.left_out]


def screen(reader: Reader, rules: Rules, screen_px: tuple[int, int], outside: str) -> None:
    """Apply all rules to a reader; the verdicts are written into it."""
    for trial in reader.trials:
        if trial.skipped:
            trial.left_out = "skip"
            for fixation in trial.fixations:
                fixation.left_out = "skip"
            continue
        screen_fixations(trial, rules, screen_px)
        for rule in TRIAL_RULES:
            if rule in rules and speaks_against_trial(rule, rules[rule], trial, outside):
                trial.against.append(rule)
        trial.left_out = trial.against[0] if trial.against else ""
    for rule in READER_RULES:
        if rule in rules and speaks_against_reader(rule, rules[rule], reader):
            reader.against.append(rule)
    reader.left_out = reader.against[0] if reader.against else ""


def screen_fixations(trial: Trial, rules: Rules, screen_px: tuple[int, int]) -> None:
    """The rules for fixations, one after the other."""
    for fixation in trial.fixations:
        if fixation.aside:
            fixation.left_out = "repeated"
    recording = [f for f in trial.fixations if not f.aside]
    for rule in FIXATION_RULES:
        if rule not in rules:
            continue
        if rule == "merge":
            merge(trial, *rules["merge"])
            continue
        for place, fixation in enumerate(recording):
            from_end = len(recording) - 1 - place
            if speaks_against(rule, rules[rule], fixation, trial, (place, from_end), screen_px):
                fixation.against.append(rule)
                fixation.left_out = fixation.left_out or rule


def speaks_against(
    rule: str,
    limit: Any,
    fixation: Fixation,
    trial: Trial,
    place: tuple[int, int],
    screen_px: tuple[int, int],
) -> bool:
    """Whether one rule speaks against one fixation."""
    f = fixation
    if rule == "outside_text_time":
        early = trial.came_ms is not None and f.onset_ms < trial.came_ms
        return early or (trial.went_ms is not None and f.onset_ms > trial.went_ms)
    if rule == "off_screen":
        wide = f.x_px is not None and not 0 <= f.x_px < screen_px[0]
        return wide or (f.y_px is not None and not 0 <= f.y_px < screen_px[1])
    if rule == "first":
        return place[0] < limit
    if rule == "last":
        return place[1] < limit
    if rule == "blink":
        return f.blink
    if rule == "undersweep":
        return f.undersweep
    return f.duration_ms < limit if rule == "under_ms" else f.duration_ms > limit


def squared_distance(one: Fixation, other: Fixation) -> float | None:
    """How far two fixations are from each other; None where that is not known."""
    if one.x_px is None or other.x_px is None:
        return None
    if one.y_px is None or other.y_px is None:
        return (one.x_px - other.x_px) ** 2
    return (one.x_px - other.x_px) ** 2 + (one.y_px - other.y_px) ** 2


def merge(trial: Trial, under_ms: float, within_px: float) -> None:
    """Merge the shortest candidate, look again, until there is none."""
    while True:
        still = kept(trial)
        near: dict[int, list[tuple[float, float, int]]] = {}
        for place, fixation in enumerate(still):
            if fixation.duration_ms >= under_ms:
                continue
            for beside in (place - 1, place + 1):
                if 0 <= beside < len(still):
                    apart = squared_distance(fixation, still[beside])
                    if apart is not None and apart <= within_px**2:
                        choice = (apart, -still[beside].duration_ms, beside)
                        near.setdefault(place, []).append(choice)
        if not near:
            return
        place = min(near, key=lambda at: (still[at].duration_ms, at))
        other = min(near[place])[2]
        earlier, later = sorted((place, other))
        gone, stays = still[later], still[earlier]
        if still[later].duration_ms > still[earlier].duration_ms:
            gone, stays = stays, gone
        stays.duration_ms += gone.duration_ms
        stays.onset_ms = min(stays.onset_ms, gone.onset_ms)
        stays.blink = stays.blink or gone.blink
        gone.left_out, gone.into = "merge", stays.number
        gone.against.append("merge")


def first_pass(
    fixations: Sequence[Fixation], trial: Trial, name: str, outside: str
) -> list[Fixation] | None:
    """The first pass on a region; None where there is none."""
    orders = [f.order for f in fixations]
    durations = [f.duration_ms for f in fixations]
    reading = Reading(NaiveTrial(orders, durations, len(trial.regions)), outside)
    found = reading.first_pass(trial.regions.index(name) + 1)
    return None if found is None else [fixations[reading.where[i]] for i in found]


def speaks_against_trial(rule: str, limit: Any, trial: Trial, outside: str) -> bool:
    """Whether one rule speaks against one trial."""
    still = kept(trial)
    if rule == "notes":
        return bool(trial.note)
    if rule == "fewest_fixations":
        return len(still) < limit
    if rule == "line_confidence_under":
        return trial.confidence is not None and trial.confidence < limit
    if rule == "outside_share_over":
        return bool(still) and sum(f.order == 0 for f in still) / len(still) > limit
    if rule == "duration_ms":
        lasted = still[-1].onset_ms + still[-1].duration_ms - still[0].onset_ms if still else 0
        return not limit[0] <= lasted <= limit[1]
    if rule == "answer_wrong":
        return trial.answer is False
    named = [name for name in limit if name in trial.regions]
    if rule == "no_first_pass_on":
        return any(first_pass(still, trial, name, outside) is None for name in named)
    # A fixation that a blink left out is looked at as if it were in.
    as_if = [f for f in trial.fixations if f.left_out in ("", "blink")]
    passes = [first_pass(as_if, trial, name, outside) or [] for name in named]
    return any(f.blink for one in passes for f in one)


def speaks_against_reader(rule: str, limit: Any, reader: Reader) -> bool:
    """Whether one rule speaks against the reader."""
    read = [trial for trial in reader.trials if not trial.skipped]
    if rule == "participant_notes":
        return bool(reader.note)
    if rule == "correct_share_under":
        answers = [trial.answer for trial in read if trial.answer is not None]
        return bool(answers) and sum(answers) / len(answers) < limit
    if rule == "lost_trials_share_over":
        return bool(read) and sum(bool(t.left_out) for t in read) / len(read) > limit
    cells = {trial.cell for trial in read}
    good = [sum(t.cell == cell and not t.left_out for t in read) for cell in cells]
    return bool(good) and min(good) < limit


Told = tuple[str, int, int, str, str, str]


def ledger(reader: Reader) -> list[Told]:
    """The ledger: level, trial from 1, fixation, rule, action, also; 0 where it does not apply."""
    rows: list[Told] = []
    above = list(reader.against)
    for at, trial in enumerate(reader.trials, start=1):
        for f in trial.fixations:
            if f.left_out == "repeated":
                rows.append(("fixation", at, f.number, "repeated", "left out", ""))
            elif f.left_out in FIXATION_RULES:
                later = FIXATION_RULES[FIXATION_RULES.index(f.left_out) + 1 :]
                also = [rule for rule in f.against if rule in later] + trial.against + above
                action = f"merged into {f.into}" if f.into else "left out"
                rows.append(("fixation", at, f.number, f.left_out, action, " ".join(also)))
        if trial.skipped:
            rows.append(("trial", at, 0, "skip", "left out", ""))
        elif trial.left_out:
            also = trial.against[1:] + above
            rows.append(("trial", at, 0, trial.left_out, "left out", " ".join(also)))
        elif reader.left_out:
            also = reader.against[1:]
            rows.append(("trial", at, 0, reader.left_out, "left out", " ".join(also)))
    if reader.left_out:
        also = reader.against[1:]
        rows.append(("participant", 0, 0, reader.left_out, "left out", " ".join(also)))
    return rows


def charged(reader: Reader) -> tuple[list[str], list[str]]:
    """What each trial and each fixation is charged to; empty where kept."""
    trials = [trial.left_out or reader.left_out for trial in reader.trials]
    fixations = [
        f.left_out or rule
        for trial, rule in zip(reader.trials, trials, strict=True)
        for f in trial.fixations
    ]
    return trials, fixations
