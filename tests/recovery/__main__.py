"""The figures of the recovery check for several seeds: ``python -m tests.recovery 1 2 3``."""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

from tests.recovery.fitting import (
    STUDIES,
    Built,
    Fits,
    build_study,
    differences,
    drawn_study,
    fit,
    models,
    read_fits,
    why_no_r,
    with_truth,
)
from tests.recovery.judging import bias, covered, found_deviation, share_within
from tests.recovery.truth import TERMS, TRUTHS


def report(studies: list[Built], fits: Fits) -> None:
    """Print what was found beside what is true."""
    for truth in TRUTHS:
        print(f"  {truth.formula}")
        table = with_truth(fits, studies, truth.outcome)
        print(f"    rate {table['value'].mean():.3f}, {len(table) / len(studies):.0f} trials")
        for term in TERMS:
            off, error = bias(fits, truth, term)
            print(
                f"    {term:12} true {truth.effects[term]:+.2f}  covered "
                f"{covered(fits, truth, term)} of {len(studies)}  bias {off:+.3f} ± {error:.3f}"
            )
        for term, true in truth.deviations.items():
            found = found_deviation(fits, truth, term)
            print(f"    readers' sd of {term}: true {true:.2f}, found {found:.3f}")
        fitted, bins = share_within(table, "value", "fitted")
        known, _ = share_within(table, "value", "true")
        print(f"    binned residuals within 2 se: fitted {fitted:.3f}, true {known:.3f} ({bins})")
    counts = [covered(fits, truth, term) for truth in TRUTHS for term in TERMS]
    print(f"  covered in all: {sum(counts)} of {len(counts) * len(studies)}")


def main(words: list[str]) -> int:
    """Run the check for each seed given; with ``agq=0`` by the faster approximation."""
    if why_no_r():
        print(why_no_r(), file=sys.stderr)
        return 2
    agq = 0 if "agq=0" in words else 1
    for seed in [int(word) for word in words if word.isdigit()] or [1]:
        with tempfile.TemporaryDirectory() as folder:
            started = time.perf_counter()
            at = Path(folder)
            for number in range(STUDIES):
                build_study(seed, number, at / str(number))
            studies = [drawn_study(seed, n, at / str(n)) for n in range(STUDIES)]
            built = time.perf_counter()
            wrong = [line for study in studies for line in differences(study)]
            fit(models(studies, agq=agq), at / "fits")
            fits = read_fits(at / "fits")
            done = time.perf_counter()
            print(
                f"seed {seed}: {STUDIES} studies built in {built - started:.0f} s, fitted in "
                f"{done - built:.0f} s; {len(wrong)} outcomes differ; notes: "
                f"{fits.notes['note'].value_counts().to_dict()}"
            )
            report(studies, fits)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
