"""Random readers under random rules, for the naive screening and for the program's own."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np

from etl.export.rows import TrialColumns
from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import Limits
from etl.screening.rules import LEFT_OUT_BY
from etl.session.lines import ReaderLines
from etl.session.ordered import OrderedFixations
from etl.session.reader import Options
from etl.session.screening import Unscreened
from tests.screening import naive_screening as naive

SCREEN_PX = (60, 40)
#: Three texts; names recur in other places, and the second text lacks two of them.
TEXTS = (("who", "verb", "fruit"), ("who", "place"), ("verb", "who", "place", "fruit"))
NAMES = ("who", "verb", "fruit", "place")
NAN = float("nan")

LIBRARY = RegionLibrary(
    keys=(),
    supplies=(),
    texts=(),
    region_names=NAMES,
    region_count=np.array([len(text) for text in TEXTS], np.int32),
    region_offsets=np.cumsum([0, *(len(text) for text in TEXTS)]),
    region_code=np.array([NAMES.index(name) for text in TEXTS for name in text], np.int32),
    text_of={},
    geometry=None,
    manner=None,
    labels=None,
)


def one_of(rng: np.random.Generator, *values: Any) -> Any:
    """One of some values, each as likely."""
    return values[rng.integers(len(values))]


def random_rules(rng: np.random.Generator) -> dict[str, object]:
    """Some rules, with limits near what the readers are like."""
    one = partial(one_of, rng)
    names = [["who"], ["verb"], ["fruit", "place"], ["verb", "who", "place"]]
    every = {
        "outside_text_time": True,
        "off_screen": True,
        "first": one(1, 2, 3),
        "last": one(1, 2, 3),
        "blink": "drop",
        "undersweep": "drop",
        "merge": (one(60, 80, 120, 200), one(3.0, 7.5, 14.0, 60.0)),
        "under_ms": one(40, 80, 100),
        "over_ms": one(180, 250, 400),
        "notes": True,
        "fewest_fixations": one(1, 2, 4),
        "line_confidence_under": one(0.5, 0.9, 1.0),
        "outside_share_over": one(0.0, 0.2, 0.3, 1 / 3, 0.5),
        "duration_ms": one((0, 500), (200, 1000), (300.5, 5000)),
        "blink_in_first_pass_of": names[rng.integers(4)],
        "no_first_pass_on": names[rng.integers(4)],
        "answer_wrong": True,
        "participant_notes": True,
        "correct_share_under": one(0.5, 2 / 3, 1.0),
        "lost_trials_share_over": one(0.0, 0.3, 0.5, 0.75),
        "fewest_trials_per_cell": one(1, 2),
    }
    share = rng.choice([0.2, 0.5, 0.9])
    return {name: limit for name, limit in every.items() if rng.random() < share}


def random_reader(rng: np.random.Generator) -> tuple[naive.Reader, list[int]]:
    """A reader with a few trials, and the text of each trial."""
    trials, texts = [], []
    has_y = rng.random() < 0.8
    has_lines = rng.random() < 0.7
    clock_ms = 1000
    for _ in range(rng.integers(1, 6)):
        text = int(rng.integers(3))
        fixations = []
        begin_ms = clock_ms
        second = int(rng.integers(0, 5)) if rng.random() < 0.2 else 0
        count = int(rng.integers(1, 10))
        which = rng.random() < 0.5
        for number in range(1, count + second + 1):
            lost = rng.random() < 0.08
            duration = int(rng.choice([20, 30, 40, 40, 50, 60, 79, 80, 100, 150, 200, 300]))
            fixations.append(
                naive.Fixation(
                    number,
                    clock_ms,
                    duration,
                    None if lost else int(rng.integers(-3, 64)),
                    None if lost or not has_y else int(rng.integers(-2, 42)),
                    bool(rng.random() < 0.15),
                    int(rng.integers(0, len(TEXTS[text]) + 1)),
                    aside=bool(second) and (number <= count) == which,
                    undersweep=has_lines and bool(rng.random() < 0.12),
                )
            )
            clock_ms += duration + int(rng.integers(0, 40))
        answer = [None, True, True, False][rng.integers(4)]
        late, early = begin_ms + int(rng.integers(-20, 150)), clock_ms - int(rng.integers(-20, 200))
        trials.append(
            naive.Trial(
                fixations,
                TEXTS[text],
                late if rng.random() < 0.7 else None,
                early if rng.random() < 0.7 else None,
                answer,
                "sneezed" if rng.random() < 0.1 else "",
                (int(rng.integers(2)), int(rng.integers(2))),
                skipped=bool(rng.random() < 0.1),
                confidence=one_of(rng, None, 0.5, 0.7, 0.9, 0.95, 1.0) if has_lines else None,
            )
        )
        texts.append(text)
        clock_ms += 1000
    return naive.Reader(trials, "asleep" if rng.random() < 0.1 else ""), texts


def unscreened(reader: naive.Reader, texts: list[int]) -> Unscreened:
    """The same reader as the program has it before screening."""
    every = [f for trial in reader.trials for f in trial.fixations]
    trial = np.repeat(np.arange(len(texts)), [len(t.fixations) for t in reader.trials])

    def floats(values: list[float | None]) -> np.ndarray:
        return np.array([NAN if value is None else value for value in values], np.float64)

    def coded(values: list[int]) -> np.ndarray:
        return np.array(values, np.int32)

    trials = reader.trials
    columns = TrialColumns(
        ids={"trial": coded(list(range(len(texts))))},
        factors={
            "cue": coded([-1 if t.skipped else t.cell[0] for t in trials]),
            "fit": coded([-1 if t.skipped else t.cell[1] for t in trials]),
        },
        covariates={},
        text=coded([-1 if t.skipped else text for t, text in zip(trials, texts, strict=True)]),
        came_ms=floats([t.came_ms for t in trials]),
        went_ms=floats([t.went_ms for t in trials]),
        answer=floats([None if t.answer is None else float(t.answer) for t in trials]),
        notes=tuple(t.note for t in trials),
        skipped_by=tuple("block = practice" if t.skipped else "" for t in trials),
    )
    log = CanonicalLog(
        ids={"trial": Coded.absent(len(every))},
        facts={},
        onset_ms=floats([f.onset_ms for f in every]),
        number=np.full(len(every), NAN),
        duration_ms=floats([f.duration_ms for f in every]),
        x_px=floats([f.x_px for f in every]),
        y_px=floats([f.y_px for f in every]),
        label=None,
        source_line=np.arange(2, len(every) + 2, dtype=np.int32),
        blink=np.array([f.blink for f in every], bool),
        recording=np.full(len(every), -1, dtype=np.int32),
    )
    ordered = OrderedFixations(
        np.arange(len(every)),
        trial,
        np.array([f.number for f in every]),
        np.array([f.aside for f in every], bool),
        *np.zeros((3, len(every)), bool),
    )
    order = coded([f.order for f in every])
    nobody_else = np.zeros(len(texts), np.int64)
    notes = (reader.note,)
    return Unscreened(columns, nobody_else, log, ordered, order, notes, lines_of(reader))


def lines_of(reader: naive.Reader) -> ReaderLines | None:
    """What is known of the reader's lines, as far as screening asks; None where nothing is."""
    every = [f for trial in reader.trials for f in trial.fixations]
    confidence = [NAN if t.confidence is None else t.confidence for t in reader.trials]
    undersweep = np.array([f.undersweep for f in every], bool)
    if not undersweep.any() and np.isnan(confidence).all():
        return None
    count = len(every)
    return ReaderLines(
        line=np.zeros(count, np.int32),
        confidence=np.full(count, NAN),
        trial_confidence=np.array(confidence, np.float64),
        sure=np.zeros(len(confidence), bool),
        by_hand=np.zeros(count, bool),
        reason=np.zeros(count, np.int8),
        before=np.full(count, -1, np.int32),
        return_sweep=undersweep,
        undersweep=undersweep,
    )


def options(rules: dict[str, object], outside: str) -> Options:
    """The rules as the program has them."""
    given = {
        name: rules[name] for name in ("first", "last", "under_ms", "over_ms") if name in rules
    }
    for name in (
        "fewest_fixations",
        "line_confidence_under",
        "outside_share_over",
        "duration_ms",
        *naive.READER_RULES[1:],
    ):
        if name in rules:
            given[name] = rules[name]
    if "merge" in rules:
        given["merge_under_ms"], given["merge_within_px"] = rules["merge"]
    used = ("skip", "repeated", *(name for name in LEFT_OUT_BY if name in rules))
    limits = Limits(
        used=used,
        screen_px=SCREEN_PX,
        blink_regions=tuple(rules.get("blink_in_first_pass_of", ())),
        first_pass_regions=tuple(rules.get("no_first_pass_on", ())),
        **given,
    )
    return Options("first", outside, "missing", limits, None)
