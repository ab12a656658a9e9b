"""The script a lab would write: pandas, ``groupby`` over trials, a function for each trial.

It is the yardstick of the benchmark, written as a fair programmer would: logs joined to the trial
list, regions by cut points, one pass over the regions of a trial. It knows one layout, checks
nothing, and leaves the regressions and the fixation table out.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pandas as pd

LEFT_PX, REGION_PX, REGIONS = 200, 140, 6


def outcomes_of(study: Path, logs: Sequence[Path]) -> pd.DataFrame:
    """All outcomes of all regions of some readers, wide."""
    trials = pd.read_csv(study.parent / "trial_list.csv")
    done = []
    for log in logs:
        fixations = pd.read_csv(log, sep="\t")
        fixations["participant"] = fixations["reader"]
        fixations = fixations.merge(trials, on=["participant", "trial"], how="left")
        fixations = fixations.sort_values(["trial", "start_ms"])
        facts = ["participant", "trial", "item", "cue", "fit"]
        done.append(fixations.groupby(facts)[["gaze_x", "dur_ms"]].apply(outcomes_of_trial))
    return pd.concat(done).reset_index()


def outcomes_of_trial(trial: pd.DataFrame) -> pd.DataFrame:
    """The outcomes of every region of one trial."""
    region = np.ceil((trial["gaze_x"].to_numpy() - LEFT_PX + 0.001) / REGION_PX).astype(int)
    duration = trial["dur_ms"].to_numpy()
    inside = (region >= 1) & (region <= REGIONS)
    region, duration = region[inside], duration[inside]
    rows = []
    for number in range(1, REGIONS + 1):
        here = np.flatnonzero(region == number)
        beyond = np.flatnonzero(region > number)
        row: dict[str, float] = {
            "region_order": number,
            "fixated": float(len(here) > 0),
            "fixation_count": float(len(here)),
            "total_time": float(duration[here].sum()) if len(here) else np.nan,
        }
        first = len(here) > 0 and (len(beyond) == 0 or here[0] < beyond[0])
        if len(here) or len(beyond):
            row["first_pass_skip"] = float(not first)
        starts = here[np.flatnonzero(np.diff(here, prepend=-9) > 1)]
        row["visit_count"] = float(len(starts))
        if first:
            start = here[0]
            stop = start
            while stop < len(region) and region[stop] == number:
                stop += 1
            past = beyond[0] if len(beyond) else len(region)
            row["first_fixation_duration"] = float(duration[start])
            row["first_pass_fixation_count"] = float(stop - start)
            row["first_pass_time"] = float(duration[start:stop].sum())
            row["first_pass_refixation"] = float(stop - start > 1)
            row["go_past_time"] = float(duration[start:past].sum())
            row["right_bounded_time"] = float(
                duration[start:past][region[start:past] == number].sum()
            )
            row["second_pass_time"] = row["total_time"] - row["first_pass_time"]
            row["reread"] = float(len(starts) > 1)
            if stop - start == 1:
                row["single_fixation_duration"] = float(duration[start])
            if number > 1:
                row["first_pass_regression_out"] = float(
                    stop < len(region) and region[stop] < number
                )
        if number > 1 and len(here):
            after = here[here + 1 < len(region)] + 1
            row["regression_out_count"] = float((region[after] < number).sum())
            row["regression_out"] = float(row["regression_out_count"] > 0)
        if number < REGIONS and len(beyond):
            before = here[here > 0] - 1
            row["regression_in_count"] = float((region[before] > number).sum())
            row["regression_in"] = float(row["regression_in_count"] > 0)
        rows.append(row)
    return pd.DataFrame(rows)
