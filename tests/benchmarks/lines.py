"""How well lines are found, on real trials and over the phenomena, and how long that takes.

Run ``python tests/benchmarks/lines.py`` in a checkout. It writes ``line_accuracy.svg`` beside
itself: for every phenomenon of Carr et al. (2022, doi:10.3758/s13428-021-01554-0), over its
published range, the mean percentage of fixations that each method and the consensus put on the
right line. It prints the same for the 24 real trials where they are beside the checkout, and times
on one core.
"""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from pathlib import Path

# Threads of the linear algebra would make one core look faster than it is.
os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import numpy as np

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT))

import etl  # noqa: E402
from etl.lines import METHODS, MethodSettings, Passage  # noqa: E402
from etl.lines.consensus import assign_by_consensus  # noqa: E402
from tests.benchmarks.curves import Panel, drawn  # noqa: E402
from tests.lines.corrected import ABSENT, PASSAGES, corrected_trials  # noqa: E402
from tests.lines.simulated import (  # noqa: E402
    Layout,
    Manner,
    Trial,
    make_passage,
    read,
    trials_at,
    trials_together,
)

FIGURE = Path(__file__).with_name("line_accuracy.svg")
SAMPLE = ROOT / "sample_logs" / "passages" / "study.toml"
SEED = 404
#: Phenomenon, what stands under its axis, and the values tried.
PHENOMENA = (
    ("noise_px", "noise, standard deviation (px)", np.linspace(0, 40, 9)),
    ("slope", "slope (px per px)", np.linspace(-0.1, 0.1, 11)),
    ("shift", "shift (px per px from the first line)", np.linspace(-0.2, 0.2, 11)),
    ("within", "regressions within lines (probability)", np.linspace(0, 1, 9)),
    ("between", "regressions between lines (probability)", np.linspace(0, 1, 9)),
    ("together", "all at once (share of each range)", np.linspace(0, 1, 9)),
)
#: The speed that is asked for: lines, fixations.
LINES, FIXATIONS = 13, 280


def right_shares(trial: Trial) -> list[float]:
    """The percentage of right fixations of every method, and last of the consensus."""
    x, y, passage = trial.x_px, trial.y_px, trial.passage
    found = [method(x, y, passage, MethodSettings()) + 1 for method in METHODS.values()]
    found.append(assign_by_consensus(x, y, trial.duration_ms, passage).line)
    return [100 * float(np.mean(lines == trial.line)) for lines in found]


def panels(count: int) -> Iterator[Panel]:
    """One panel for every phenomenon."""
    for name, title, values in PHENOMENA:
        rows = []
        for value in values.tolist():
            if name == "together":
                trials = trials_together(value, SEED, count)
            else:
                trials = trials_at(name, value, SEED, count)
            rows.append(np.mean([right_shares(trial) for trial in trials], axis=0))
        curves = dict(zip([*METHODS, "consensus"], np.array(rows).T.tolist(), strict=True))
        yield Panel(title, values.tolist(), curves)


def tell_panels(made: list[Panel]) -> None:
    """Print the mean of every curve."""
    print("mean percentage of right fixations over the published range, made-up trials")
    print(f"{'':10s}" + "".join(f"{name:>10s}" for name, _, _ in PHENOMENA))
    for method in made[0].curves:
        means = "".join(f"{np.mean(panel.curves[method]):10.2f}" for panel in made)
        print(f"{method:10s}{means}")


def tell_corrected() -> None:
    """Print how every method does on the real trials."""
    if not PASSAGES.is_dir():
        print(ABSENT)
        return
    print("24 real trials; percentage of right fixations: of those kept by hand, of all")
    print(f"{'':10s}{'mean':>8s}{'worst':>8s}{'mean':>8s}{'median':>8s}{'worst':>8s}")
    trials = list(corrected_trials())
    answers = [assign_by_consensus(t.x_px, t.y_px, t.duration_ms, t.passage) for t in trials]
    found = {
        name: [method(t.x_px, t.y_px, t.passage, MethodSettings()) + 1 for t in trials]
        for name, method in METHODS.items()
    }
    found["consensus"] = [answer.line for answer in answers]
    for name, lines in found.items():
        pairs = list(zip(trials, lines, strict=True))
        kept = [100 * np.mean((got == t.line)[t.kept]) for t, got in pairs]
        every = [100 * np.mean(got == t.line) for t, got in pairs]
        print(
            f"{name:10s}{np.mean(kept):8.2f}{min(kept):8.1f}"
            f"{np.mean(every):8.2f}{np.median(every):8.1f}{min(every):8.1f}"
        )
    print("trials by confidence: sure, chance, right of kept, right of all")
    for t, got in sorted(zip(trials, answers, strict=True), key=lambda p: p[1].trial_confidence):
        print(
            f"  {t.name:8s}{'sure' if got.sure else '-':>6s}{got.trial_confidence:8.3f}"
            f"{100 * np.mean((got.line == t.line)[t.kept]):8.1f}"
            f"{100 * np.mean(got.line == t.line):8.1f}"
        )


def large_trial() -> tuple[Trial, Passage]:
    """A trial on 13 lines with at least 280 fixations."""
    rng = np.random.default_rng(SEED)
    passage = make_passage(rng, Layout(LINES))
    return read(rng, passage, Manner(noise_px=15, slope=0.03, within=1, readings=2)), passage


def milliseconds(job: Callable[[], object], rounds: int = 15) -> float:
    """The median time of a job, of this process alone."""
    times = []
    for _ in range(rounds):
        started = time.process_time()
        job()
        times.append(time.process_time() - started)
    return 1000 * float(np.median(times))


def tell_speed() -> None:
    """Print how long each method and everything takes."""
    trial, passage = large_trial()
    x, y, lasted = (v[:FIXATIONS] for v in (trial.x_px, trial.y_px, trial.duration_ms))
    print(f"milliseconds of one core, {LINES} lines, {x.size} fixations")
    for name, method in METHODS.items():
        print(
            f"  {name:28s}{milliseconds(lambda m=method: m(x, y, passage, MethodSettings())):8.1f}"
        )
    whole = milliseconds(lambda: assign_by_consensus(x, y, lasted, passage))
    print(f"  {'consensus with all methods':28s}{whole:8.1f}")


def tell_share_of_build() -> None:
    """Print what part of building the sample study the consensus takes."""
    spent = [0.0, 0]

    def timed(*given: object, **named: object) -> object:
        started = time.process_time()
        answer = assign_by_consensus(*given, **named)
        spent[0] += time.process_time() - started
        spent[1] += 1
        return answer

    for module in list(sys.modules.values()):
        if module.__name__.startswith("etl.") and hasattr(module, "assign_by_consensus"):
            module.assign_by_consensus = timed
    with tempfile.TemporaryDirectory() as folder:
        started = time.process_time()
        etl.build(etl.load_study(SAMPLE), into=Path(folder) / "out", workers=1)
        whole = time.process_time() - started
    share = 100 * spent[0] / whole
    print(f"build of {SAMPLE.parent.name}: {whole:.2f} s, of which the consensus {share:.0f} %")
    print(f"  ({spent[1]} trials)")


def main() -> None:
    """Measure, print, draw."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--trials", type=int, default=20, help="made-up trials for each value")
    parser.add_argument("--figure", type=Path, default=FIGURE)
    given = parser.parse_args()
    tell_corrected()
    tell_speed()
    tell_share_of_build()
    made = list(panels(given.trials))
    tell_panels(made)
    given.figure.write_text(drawn(made, "consensus"), encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main()
