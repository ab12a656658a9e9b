"""The tables of the sample studies against the truth that their simulator knows."""

from __future__ import annotations

import csv
import gzip
import json
from pathlib import Path

import pytest

from tests.end_to_end.building import Row, Sample, by_trial
from tests.simulator import true_orders

#: How each sample's logs spell reader, trial and fixation; the passages name the reader elsewhere.
HEADERS = {"orchard": ("reader", "trial", "fix"), "passages": ("trial", "n")}


def raw_lines(path: Path) -> list[str]:
    """A log's lines, decoded without the program: by its byte-order mark, else as UTF-8."""
    content = path.read_bytes()
    if path.suffix == ".gz":
        content = gzip.decompress(content)
    encoding = "utf-16" if content.startswith(b"\xff\xfe") else "utf-8"
    return content.decode(encoding).splitlines()


def raw_rows(path: Path) -> dict[int, dict[str, str]]:
    """A log's rows by line number from 1, as header to cell."""
    lines = raw_lines(path)
    start = next(at for at, line in enumerate(lines) if not line.startswith("#"))
    sign = next(sign for sign in "\t;," if sign in lines[start])
    header = lines[start].split(sign)
    return {
        number: dict(zip(header, line.split(sign), strict=True))
        for number, line in enumerate(lines[start + 1 :], start=start + 2)
    }


@pytest.fixture(scope="module")
def logs(orchard: Sample, passages: Sample) -> dict[str, dict[str, dict[int, dict[str, str]]]]:
    """The rows of all logs of both samples by file and line, read without the program."""
    return {
        sample.name: {
            f"logs/{path.name}": raw_rows(path) for path in sorted(sample.folder.glob("logs/*"))
        }
        for sample in (orchard, passages)
    }


def in_study(sample: Sample) -> list[tuple[tuple[str, int], list[Row]]]:
    """The fixations of the trials that are part of the study and were not disturbed."""
    return [
        (key, rows)
        for key, rows in by_trial(sample.tables["fixations"])
        if rows[0]["left_out_by"] is None and not sample.true_trials[key].disturbed
    ]


def test_every_planned_and_recorded_trial_is_kept(sample: Sample) -> None:
    """``trials`` holds the recorded trials of the design, no practice, no filler, nothing else."""
    planned = [
        key
        for key, trial in sample.true_trials.items()
        if trial.recorded and trial.plan.facts.get("role", "target") == "target"
    ]
    assert [(r["participant"], r["trial"]) for r in sample.tables["trials"]] == sorted(planned)
    assert len(planned) == {"orchard": 767, "passages": 12}[sample.name]


def test_region_sequence_of_every_undisturbed_trial_is_the_true_one(sample: Sample) -> None:
    """Which region each fixation lies in, in time order, is what the simulated reader looked at."""
    trials = in_study(sample)
    wrong = [
        key
        for key, rows in trials
        if tuple(row["region_order"] for row in rows) != true_orders(sample.true_trials[key])
    ]
    assert wrong == []
    assert len(trials) == {"orchard": 766, "passages": 12}[sample.name]


def test_regions_bear_the_names_of_their_places(sample: Sample) -> None:
    """The name and the order of a fixation's region are those of the word looked at."""
    for key, rows in in_study(sample):
        true = [f.region for f in sample.true_trials[key].fixations]
        assert [row["region"] for row in rows] == true


def test_every_fixation_on_the_text_is_on_its_true_line(sample: Sample) -> None:
    """The line of a fixation is the line that was read; off the screen there is none to know."""
    for key, rows in in_study(sample):
        for row, fixation in zip(rows, sample.true_trials[key].fixations, strict=True):
            if fixation.line is not None:
                assert row["line"] == fixation.line


def test_disturbed_trials_stay_in_the_tables(orchard: Sample) -> None:
    """A recording that went astray is no reason to leave fixations out on the quiet."""
    disturbed = [key for key, trial in orchard.true_trials.items() if trial.disturbed]
    assert disturbed
    built = dict(by_trial(orchard.tables["fixations"]))
    for key in disturbed:
        assert len(built[key]) == len(orchard.true_trials[key].fixations)


def test_times_and_places_come_out_as_recorded(sample: Sample) -> None:
    """Onset, duration and place are exact, through seconds, decimal commas and UTF-16."""
    for key, rows in by_trial(sample.tables["fixations"]):
        true = sample.true_trials[key].fixations
        assert [(r["fixation"], r["onset_ms"], r["x_px"], r["y_px"]) for r in rows] == [
            (f.fixation, f.onset_ms, f.x_px, f.y_px) for f in true
        ]
        # Durations of the passages are differences of seconds with three decimals.
        assert [r["duration_ms"] for r in rows] == pytest.approx(
            [f.duration_ms for f in true], rel=0, abs=1e-6
        )


def test_every_fixation_names_the_line_at_which_it_was_written(sample: Sample) -> None:
    """``source_file`` and ``source_line`` are the place at which the simulator wrote it."""
    told = {
        (r["participant"], r["trial"], r["fixation"]): (r["source_file"], r["source_line"])
        for r in sample.tables["fixations"]
    }
    assert told == sample.places


def test_line_named_by_a_fixation_holds_it(
    sample: Sample, logs: dict[str, dict[str, dict[int, dict[str, str]]]]
) -> None:
    """The named line of the log itself, read without the program, has that very fixation."""
    headers = HEADERS[sample.name]
    for row in sample.tables["fixations"]:
        raw = logs[sample.name][row["source_file"]][row["source_line"]]
        told = [row["participant"], str(row["trial"]), str(row["fixation"])]
        assert [raw[header] for header in headers] == told[-len(headers) :]


def test_every_fixation_of_the_logs_is_there_exactly_once(
    sample: Sample, logs: dict[str, dict[str, dict[int, dict[str, str]]]]
) -> None:
    """Nothing is lost or doubled between the logs and ``fixations``."""
    asked_for = sorted(
        (file, line)
        for file, rows in logs[sample.name].items()
        for line, raw in rows.items()
        if raw.get("eye", "R") == "R"
    )
    told = [(r["source_file"], r["source_line"]) for r in sample.tables["fixations"]]
    assert sorted(told) == asked_for
    assert len(told) > 1000


def test_facts_of_a_trial_are_those_planned(orchard: Sample) -> None:
    """Factors and covariates are joined from list, readers and items to the right trial."""
    facts = {r.plan.participant: r.plan.facts for r in orchard.truth.readers}
    for row in orchard.tables["trials"]:
        plan = orchard.true_trials[row["participant"], row["trial"]].plan
        of_reader = facts[plan.participant]
        assert (row["item"], row["cue"], row["fit"]) == (
            plan.item,
            plan.facts["cue"],
            plan.facts["fit"],
        )
        assert (row["group"], row["age"]) == (of_reader["group"], of_reader["age"])


def test_first_pass_regressions_are_those_that_the_reader_made(orchard: Sample) -> None:
    """The outcome on the critical regions is what the true sequence of regions says.

    Read from the definition here, on the truth, without the program: the first pass on k starts at
    the first fixation on k if nothing further right came before; the next region tells the way.
    """
    told = {
        (r["participant"], r["trial"], r["region_order"]): r["value"]
        for r in orchard.tables["outcomes"]
        if r["measure"] == "first_pass_regression_out"
    }
    compared = 0
    for (who, number), trial in orchard.true_trials.items():
        if (who, number, 1) not in told or trial.disturbed:
            continue
        orders = [order for order in true_orders(trial) if order is not None]
        for k in range(2, orchard.region_count(who, number) + 1):
            true = None
            if k in orders and max(orders[: orders.index(k)], default=0) < k:
                onward = [order for order in orders[orders.index(k) :] if order != k]
                true = float(bool(onward) and onward[0] < k)
            assert told[who, number, k] == true
            compared += 1
    assert compared > 3000


def test_counts_of_the_run_record_balance(sample: Sample) -> None:
    """Read = kept + skipped + repeated, for trials and fixations, and equal to the tables' rows."""
    record = json.loads((sample.result.folder / "run.json").read_text(encoding="utf-8"))
    counts, fixations = record["counts"], sample.tables["fixations"]
    assert counts["fixations read"] == len(fixations) == counts["log fixations"]
    assert counts["fixations read"] == (
        counts["fixations kept"]
        + counts["fixations of skipped trials"]
        + counts["fixations of repeated trials"]
    )
    assert counts["fixations kept"] == sum(row["kept"] for row in fixations)
    assert counts["fixations of skipped trials"] == sum(
        row["left_out_by"] == "skip" for row in fixations
    )
    assert counts["fixations kept outside every region"] == sum(
        row["kept"] and row["region"] is None for row in fixations
    )
    assert counts["trials read"] == counts["trials kept"] + counts["trials skipped"]
    assert counts["trials read"] == len({(r["participant"], r["trial"]) for r in fixations})
    assert counts["trials kept"] == len(sample.tables["trials"])
    with (sample.result.folder / "exclusions.csv").open(encoding="utf-8", newline="") as file:
        ledger = len(list(csv.DictReader(file)))
    tables = {name: len(rows) for name, rows in sample.tables.items()}
    assert record["rows"] == {**tables, "exclusions": ledger}


def test_trial_that_no_log_has_is_warned_of(orchard: Sample) -> None:
    """A planned trial without a recording is named with its line in the trial list."""
    [key] = [key for key, trial in orchard.true_trials.items() if not trial.recorded]
    listed = (orchard.folder / "trial_list.csv").read_text(encoding="utf-8").splitlines()
    [line] = [n for n, row in enumerate(listed, 1) if row.startswith(f"{key[0]},{key[1]},")]
    warned = [f for f in orchard.result.findings if f.severity == "warning"]
    assert [(f.path, f.line, f.found) for f in warned] == [
        ("trial_list.csv", line, f"participant {key[0]}, trial {key[1]}")
    ]
    record = json.loads((orchard.result.folder / "run.json").read_text(encoding="utf-8"))
    assert warned[0].text() in record["warnings"]
    assert record["not_recorded"] == [f"participant {key[0]}, trial {key[1]}"]


def test_study_without_oddities_gives_no_warning(passages: Sample) -> None:
    """Nothing is warned of where nothing is wrong."""
    assert [f.text() for f in passages.result.findings] == []
