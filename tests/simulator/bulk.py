"""Large studies in a moment, for benchmarks: whole arrays instead of word-by-word reading."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pyarrow as pa
from pyarrow import csv

from tests.simulator.writing import put, table

LEFT_PX, TOP_PX, CHARACTER_PX, LINE_PX = 200, 500, 14, 60
#: Letters of the one word in each region; with its space a region is ten characters wide.
REGION_LETTERS = 9
POOL = ("medlarpie", "hazelnuts", "applecart", "pearstone", "plumtrees", "quincejam")
CONDITIONS = (("early", "fitting"), ("early", "odd"), ("late", "fitting"), ("late", "odd"))
#: Steps of a fixation in regions, and how likely each is: about 12 % of saccades go back.
STEPS = np.array([-2, -1, 0, 1, 2])
STEP_SHARES = np.array([0.03, 0.09, 0.45, 0.37, 0.06])


@dataclass(frozen=True, slots=True)
class BulkStudy:
    """Where a large study lies, and the true region order of each of its fixations.

    Attributes
    ----------
    study_file : Path
        The study file.
    orders : (readers, trials, fixations) int8 array
        Region orders from 1.
    durations_ms : (readers, trials, fixations) int32 array
        Fixation durations.
    """

    study_file: Path
    orders: np.ndarray
    durations_ms: np.ndarray


def write_bulk_study(
    folder: Path,
    *,
    readers: int = 500,
    trials: int = 100,
    fixations: int = 20,
    regions: int = 6,
    seed: int = 1,
) -> BulkStudy:
    """Write a large single-line study: one log a reader, trial list, region file, study file.

    Parameters
    ----------
    folder : Path
        Made where it is missing.
    readers, trials, fixations, regions : int
        Readers, trials a reader, fixations a trial, regions a text (at most 12 fit the screen).
    seed : int
        The same seed gives the same study.

    Returns
    -------
    BulkStudy

    Raises
    ------
    ValueError
        If the regions do not fit the screen.
    """
    if not 1 <= regions <= 12:
        raise ValueError(f"1 to 12 regions fit the screen, not {regions}")
    rng = np.random.Generator(np.random.PCG64(seed))
    names = [f"R{number:0{len(str(readers))}d}" for number in range(1, readers + 1)]
    orders = np.empty((readers, trials, fixations), dtype=np.int8)
    durations = np.empty((readers, trials, fixations), dtype=np.int32)
    spans = np.empty((readers, trials, 2), dtype=np.int64)
    (folder / "logs").mkdir(parents=True, exist_ok=True)
    for number, name in enumerate(names):
        orders[number] = random_orders(rng, trials, fixations, regions)
        log, spans[number] = reader_log(rng, name, orders[number])
        durations[number] = log["dur_ms"].to_numpy().reshape(trials, fixations)
        write_rows(log, folder / "logs" / f"{name}.tsv", "\t")
    trial_list = trial_table(rng, names, spans)
    write_rows(trial_list, folder / "trial_list.csv", ",")
    put(folder / "regions.csv", region_table(trials, regions).encode("utf-8"))
    put(folder / "study.toml", STUDY_FILE.encode("utf-8"))
    return BulkStudy(folder / "study.toml", orders, durations)


def random_orders(
    rng: np.random.Generator, trials: int, fixations: int, regions: int
) -> np.ndarray:
    """Region orders of every fixation: a walk to the right with steps back, held in the text."""
    steps = rng.choice(STEPS, size=(trials, fixations), p=STEP_SHARES)
    # The walk has to be held fixation by fixation, but all trials go together.
    orders = np.empty((trials, fixations), dtype=np.int8)
    at = np.ones(trials, dtype=np.int64)
    for number in range(fixations):
        orders[:, number] = at
        at = np.clip(at + steps[:, number], 1, regions)
    return orders


def reader_log(
    rng: np.random.Generator, name: str, orders: np.ndarray
) -> tuple[pa.Table, np.ndarray]:
    """One reader's log, and when each trial's text came up and went away."""
    trials, fixations = orders.shape
    durations = np.clip(rng.lognormal(np.log(208.0), 0.36, orders.shape), 50, 950).astype(np.int64)
    gaps = rng.integers(20, 41, orders.shape)
    gaps[:, -1] = rng.integers(2400, 5200, trials)
    ends = 50_000 + np.cumsum(durations + gaps).reshape(orders.shape)
    onsets = ends - durations - gaps
    # The space before a word belongs to it, so every region but the first starts one to the left.
    left = LEFT_PX + ((REGION_LETTERS + 1) * (orders.astype(np.int64) - 1) - (orders > 1)) * (
        CHARACTER_PX
    )
    width = (REGION_LETTERS + (orders > 1)) * CHARACTER_PX
    # In tenths of a pixel, and none on the right edge, which belongs to the next region.
    x_tenths = left * 10 + (rng.random(orders.shape) * width * 10).astype(np.int64)
    y_tenths = rng.integers((TOP_PX + 10) * 10, (TOP_PX + LINE_PX - 10) * 10, orders.shape)
    log = pa.table(
        {
            "reader": pa.array([name] * orders.size),
            "trial": np.repeat(np.arange(1, trials + 1), fixations),
            "fix": np.tile(np.arange(1, fixations + 1), trials),
            "start_ms": onsets.ravel(),
            "dur_ms": durations.ravel(),
            "gaze_x": x_tenths.ravel() / 10,
            "gaze_y": y_tenths.ravel() / 10,
            "blink": (rng.random(orders.size) < 0.01).astype(np.int8),
        }
    )
    span = np.stack([onsets[:, 0] - 5, onsets[:, -1] + durations[:, -1] + 5], axis=1)
    return log, span


def trial_table(rng: np.random.Generator, names: list[str], spans: np.ndarray) -> pa.Table:
    """The trial list, with the facts about readers as further columns."""
    readers, trials, _ = spans.shape
    number = np.tile(np.arange(trials), readers)
    reader = np.repeat(np.arange(readers), trials)
    condition = (number + reader) % 4
    ages = rng.integers(19, 72, readers)
    return pa.table(
        {
            "participant": np.array(names)[reader],
            "trial": number + 1,
            "item": np.char.add("i", np.char.zfill((number + 1).astype(str), 4)),
            "cue": np.array([cue for cue, _ in CONDITIONS])[condition],
            "fit": np.array([fit for _, fit in CONDITIONS])[condition],
            "group": np.array(["volunteer", "visitor"])[reader // 4 % 2],
            "age": ages[reader],
            "answer_ok": (rng.random(reader.size) < 0.92).astype(np.int8),
            "text_on_ms": spans[:, :, 0].ravel(),
            "text_off_ms": spans[:, :, 1].ravel(),
        }
    )


def region_table(trials: int, regions: int) -> str:
    """The region definitions: one text an item, one word a region."""
    rows = []
    for number in range(trials):
        words = [POOL[(number + k) % len(POOL)] for k in range(regions)]
        text = " ".join(f"{{r{k}: {word}}}" for k, word in enumerate(words, start=1))
        rows.append([f"i{number + 1:04d}", text])
    return table(["item", "text"], rows)


def write_rows(rows: pa.Table, path: Path, delimiter: str) -> None:
    """Write a table with bare headers and plain line ends."""
    options = csv.WriteOptions(include_header=False, delimiter=delimiter, quoting_style="none")
    with path.open("wb") as stream:
        stream.write((delimiter.join(rows.column_names) + "\n").encode("utf-8"))
        csv.write_csv(rows, stream, options)


STUDY_FILE = """\
title = "A large study"

[logs]
files = ["logs/*.tsv"]
kind = "table"

[logs.columns]
participant = "reader"
trial = "trial"
fixation = "fix"
onset = { column = "start_ms", unit = "ms" }
duration = { column = "dur_ms", unit = "ms" }
x = { column = "gaze_x", unit = "px" }
y = { column = "gaze_y", unit = "px" }
blink = "blink"

[trials]
table = "trial_list.csv"
keys = ["participant", "trial"]
factors = ["cue", "fit", "group"]
covariates = ["age"]
answer_correct = "answer_ok"
onset = "text_on_ms"
offset = "text_off_ms"

[screen]
width_px = 1920
height_px = 1080

[regions]
file = "regions.csv"
kind = "marked_text"

[regions.layout]
left_px = 200
top_px = 500
character_width_px = 14
line_height_px = 60

[measures]
outcomes = ["binary", "count", "duration"]

[output]
folder = "out"
formats = ["parquet"]
"""
