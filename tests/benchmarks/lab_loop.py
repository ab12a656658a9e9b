"""The script a lab would write: pandas, ``groupby`` over trials, a function for each trial.

Two yardsticks of the benchmark. ``in_pandas`` is what most such scripts look like: rows of a frame
picked by conditions, region by region. ``in_numpy`` is what a good programmer makes of it without
leaving the loop. Both join logs to the trial list and find regions by cut points; they know one
layout, check nothing, and leave the regressions and the fixation table out.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np
import pandas as pd

REGIONS = 6
#: The first region is a word of nine characters; the others have the space before their word too.
EDGES_PX = [200, *(326 + 140 * number for number in range(REGIONS))]


def outcomes_of(
    study: Path, logs: Sequence[Path], one_trial: Callable[[pd.DataFrame], pd.DataFrame]
) -> pd.DataFrame:
    """All outcomes of all regions of some readers, wide."""
    trials = pd.read_csv(study.parent / "trial_list.csv")
    done = []
    for log in logs:
        fixations = pd.read_csv(log, sep="\t")
        fixations["participant"] = fixations["reader"]
        fixations = fixations.merge(trials, on=["participant", "trial"], how="left")
        fixations = fixations.sort_values(["trial", "start_ms"])
        cut = pd.cut(fixations["gaze_x"], EDGES_PX, right=False, labels=False)
        fixations["region"] = cut.fillna(-1).astype(int) + 1
        facts = ["participant", "trial", "item", "cue", "fit"]
        done.append(fixations.groupby(facts)[["region", "dur_ms"]].apply(one_trial))
    return pd.concat(done).reset_index()


def in_pandas(trial: pd.DataFrame) -> pd.DataFrame:
    """The outcomes of every region of one trial, by conditions on its frame."""
    trial = trial[trial["region"] > 0].reset_index(drop=True)
    trial["before"] = trial["region"].shift(1)
    trial["after"] = trial["region"].shift(-1)
    trial["visit"] = (trial["region"] != trial["before"]).cumsum()
    rows = []
    for number in range(1, REGIONS + 1):
        here = trial[trial["region"] == number]
        beyond = trial[trial["region"] > number]
        row: dict[str, float] = {
            "region_order": number,
            "fixated": float(len(here) > 0),
            "fixation_count": float(len(here)),
            "visit_count": float(here["visit"].nunique()),
        }
        first = len(here) > 0 and (len(beyond) == 0 or here.index[0] < beyond.index[0])
        if len(here) > 0 or len(beyond) > 0:
            row["first_pass_skip"] = float(not first)
        if len(here) > 0:
            row["total_time"] = float(here["dur_ms"].sum())
        if first:
            one = here[here["visit"] == here["visit"].iloc[0]]
            past = trial.loc[here.index[0] :]
            if len(beyond) > 0:
                past = past.loc[: beyond.index[0] - 1]
            row["first_fixation_duration"] = float(one["dur_ms"].iloc[0])
            row["first_pass_fixation_count"] = float(len(one))
            row["first_pass_time"] = float(one["dur_ms"].sum())
            row["first_pass_refixation"] = float(len(one) > 1)
            row["go_past_time"] = float(past["dur_ms"].sum())
            row["right_bounded_time"] = float(past[past["region"] == number]["dur_ms"].sum())
            row["second_pass_time"] = row["total_time"] - row["first_pass_time"]
            row["reread"] = float(row["visit_count"] > 1)
            if len(one) == 1:
                row["single_fixation_duration"] = float(one["dur_ms"].iloc[0])
            if number > 1:
                row["first_pass_regression_out"] = float(one["after"].iloc[-1] < number)
        elif len(here) > 0:
            row["second_pass_time"] = row["total_time"]
        if number > 1 and len(here) > 0:
            row["regression_out_count"] = float((here["after"] < number).sum())
            row["regression_out"] = float(row["regression_out_count"] > 0)
        if number < REGIONS and len(beyond) > 0:
            row["regression_in_count"] = float((here["before"] > number).sum())
            row["regression_in"] = float(row["regression_in_count"] > 0)
        rows.append(row)
    return pd.DataFrame(rows)


def in_numpy(trial: pd.DataFrame) -> pd.DataFrame:
    """The outcomes of every region of one trial, by arrays."""
    region, duration = trial["region"].to_numpy(), trial["dur_ms"].to_numpy()
    inside = region > 0
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
        elif len(here):
            row["second_pass_time"] = row["total_time"]
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
