"""The sample studies with all of screening on: nothing contradicts anything, byte for byte."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

import etl
from tests.end_to_end.building import (
    PROJECT,
    PUBLISHED_WITH_CSV,
    Sample,
    build,
    copied_sample,
    files_of,
    tables_of,
)
from tests.screening.checker import Published, contradictions

#: Limits of common practice; no source.
ORCHARD = """
[screening.fixations]
outside_text_time = true
off_screen = true
first = 1
last = 1
blink = "drop"
merge = { under_ms = 80, within_characters = 5 }
under_ms = 80
over_ms = 800
[screening.trials]
notes = "notes.csv"
fewest_fixations = 3
outside_share_over = 0.30
duration_ms = [500, 30000]
blink_in_first_pass_of = ["verb"]
no_first_pass_on = ["verb"]
answer_wrong = true
[screening.participants]
correct_share_under = 0.75
lost_trials_share_over = 0.60
fewest_trials_per_cell = 1
[screening.values]
outlier_sd = 3
"""
PASSAGES = """
[screening.fixations]
first = 1
merge = { under_ms = 100, within_characters = 2 }
under_ms = 80
over_ms = 500
[screening.trials]
fewest_fixations = 20
outside_share_over = 0.30
duration_ms = [5000, 40000]
[screening.participants]
lost_trials_share_over = 0.60
[screening.values]
outlier_sd = 1.1
"""
RULES = {"orchard": ORCHARD, "passages": PASSAGES}


@dataclass(frozen=True)
class Screened:
    """A sample under full screening."""

    sample: Sample
    result: etl.Result
    study_file: Path

    @property
    def published(self) -> Published:
        """Its files, and the durations that the simulator wrote into the logs."""
        durations = {
            (trial.plan.participant, trial.plan.trial, f.fixation): f.duration_ms
            for trial in self.sample.truth.trials
            for f in trial.fixations
        }
        places = self.sample.places.items()
        return Published(self.result.folder, {place: durations[key] for key, place in places})


@pytest.fixture(scope="module")
def screened(tmp_path_factory: pytest.TempPathFactory) -> Callable[[Sample], Screened]:
    """Builds a sample under full screening, once."""
    done: dict[str, Screened] = {}

    def screen(sample: Sample) -> Screened:
        if sample.name not in done:
            root = tmp_path_factory.mktemp(f"screened-{sample.name}")
            study_file = copied_sample(sample.name, root, rules=RULES[sample.name])
            done[sample.name] = Screened(sample, build(study_file, root / "built"), study_file)
        return done[sample.name]

    return screen


def test_checker_finds_no_contradiction(
    sample: Sample, screened: Callable[[Sample], Screened]
) -> None:
    """Ledger, accounts, fixations, outcomes and the logs' own durations agree."""
    assert contradictions(screened(sample).published) == []


def test_sample_without_screening_has_no_contradiction_either(sample: Sample) -> None:
    """Trials that are skipped are all that is left out."""
    assert contradictions(Published(sample.result.folder)) == []


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_sample_as_committed_has_no_contradiction(tmp_path: Path, name: str) -> None:
    """With the rules that the committed study file itself names."""
    study_file = PROJECT / "sample_logs" / name / "study.toml"
    assert contradictions(Published(build(study_file, tmp_path / "built").folder)) == []


def test_place_of_the_study_changes_no_byte(
    sample: Sample, screened: Callable[[Sample], Screened], tmp_path: Path
) -> None:
    """Warnings about rules are the same on the page and elsewhere, wherever the study lies."""
    study_file = copied_sample(sample.name, tmp_path / "Bäume [2]", rules=RULES[sample.name])
    again = build(study_file, tmp_path / "built")
    assert tables_of(again.folder) == tables_of(screened(sample).result.folder)


def test_rules_find_something_to_leave_out(
    sample: Sample, screened: Callable[[Sample], Screened]
) -> None:
    """Of all rules that are on, most left something out, on every level that the sample has."""
    ledger = screened(sample).published.ledger
    expected = {
        "orchard": {
            *("skip", "outside_text_time", "off_screen", "first", "last", "blink", "merge"),
            *("under_ms", "over_ms", "notes", "outside_share_over", "blink_in_first_pass_of"),
            *("no_first_pass_on", "answer_wrong", "outlier_sd"),
        },
        "passages": {"first", "merge", "under_ms", "over_ms", "outlier_sd"},
    }
    assert {row["rule"] for row in ledger} >= expected[sample.name]


def test_trials_in_the_notes_are_left_out_for_their_reasons(
    orchard: Sample, screened: Callable[[Sample], Screened]
) -> None:
    """Each note of the sample is in the ledger word for word, but for a trial not recorded."""
    done = screened(orchard)
    told = {
        (row["participant"], row["trial"]): row["observed"]
        for row in done.published.told("trial")
        if row["rule"] == "notes"
    }
    assert told == {
        ("P02", "17"): "sneezed",
        ("P06", "14"): "somebody came in, the reader looked up",
        ("P15", "30"): "gaze all over the screen, calibrated anew afterwards",
        ("P20", "12"): 'asked aloud: "is this a mistake?"',
    }
    said = [line for line in done.result.findings.lines(("note",)) if "notes.csv" in line]
    unrecorded = "notes.csv:4: the note is on a trial that was not recorded"
    assert said == [f'note: {unrecorded}; found "participant P11, trial 23"']


def test_published_files_are_all_there(
    screened: Callable[[Sample], Screened], orchard: Sample
) -> None:
    """Screening adds no file and takes none away."""
    assert set(files_of(screened(orchard).result.folder)) == PUBLISHED_WITH_CSV


@pytest.mark.slow
@pytest.mark.parametrize("workers", [2, 3])
def test_number_of_workers_changes_no_byte(
    orchard: Sample, screened: Callable[[Sample], Screened], tmp_path: Path, workers: int
) -> None:
    """Ledger and accounts are the same bytes too, and the same is said."""
    done = screened(orchard)
    again = build(done.study_file, tmp_path / "built", workers=workers)
    assert tables_of(again.folder) == tables_of(done.result.folder)
    assert again.findings.lines() == done.result.findings.lines()
    assert again.counts == done.result.counts


def test_counts_of_the_run_record_are_those_of_the_accounts(
    sample: Sample, screened: Callable[[Sample], Screened]
) -> None:
    """Readers, trials and fixations: read and kept."""
    done = screened(sample)
    counts = done.result.counts
    rows = {row["unit"]: row for row in done.published.accounts if row["participant"] == "(all)"}
    for unit in ("trials", "fixations"):
        assert counts[f"{unit} read"] == int(rows[unit]["read"])
        assert counts[f"{unit} kept"] == int(rows[unit]["kept"])
    assert counts["trials skipped"] == int(rows["trials"].get("skip", 0))
    assert counts["readers left out"] == len(done.published.lost_readers)
    assert counts["readers"] == len({row["participant"] for row in done.published.fixations})
