"""Readers, levels, sessions and recordings that screening leaves out, in studies on paper."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pyarrow.parquet as pq
import pytest

import etl
from tests.end_to_end.building import (
    PUBLISHED_WITH_CSV,
    TABLES,
    files_of,
    rows_of,
    tables_of,
)
from tests.screening.building import Built, Trial, build, recorded_ms, study
from tests.screening.checker import Published, contradictions

GOOD, SHORT = "50:200 150:200 250:200", "50:200"
CORRECT = "[screening.participants]\ncorrect_share_under = 0.5\n"


def sound(done: Built, trials: list[Trial]) -> bool:
    """Whether the checker finds nothing."""
    return contradictions(Published(done.folder, recorded_ms(trials))) == []


def test_reader_left_out_is_in_fixations_ledger_and_accounts_only(tmp_path: Path) -> None:
    """No row of a table of results is about the reader; all fixations are there, and charged."""
    trials = [Trial("R1", 1, GOOD), Trial("R2", 1, GOOD, ok="0"), Trial("R2", 2, GOOD, ok="0")]
    done = build(study(tmp_path, trials, CORRECT))
    for table in TABLES:
        readers = {row["participant"] for row in rows_of(done.folder, table)}
        assert readers == ({"R1", "R2"} if table == "fixations" else {"R1"} & readers)
    assert done.fates("R2", 2) == ["correct_share_under"] * 3
    assert done.account("trials", "R2") == {"read": 2, "correct_share_under": 2}
    assert [(row["level"], row["participant"], row["trial"]) for row in done.ledger] == [
        ("trial", "R2", "1"),
        ("trial", "R2", "2"),
        ("participant", "R2", ""),
    ]
    assert sound(done, trials)


def test_level_of_lost_readers_stays_a_level(tmp_path: Path) -> None:
    """A cue that only a reader left out was given is a level of the factor still, without rows."""
    trials = [Trial("R1", 1, GOOD, cue="early"), Trial("R2", 1, GOOD, ok="0", cue="late")]
    done = build(study(tmp_path, trials, CORRECT))
    cue = pd.read_parquet(done.folder / "outcomes.parquet")["cue"]
    assert list(cue.cat.categories) == ["early", "late"]
    assert set(cue) == {"early"}
    assert sound(done, trials)


def test_everything_left_out_is_an_error_that_shows_the_accounts(tmp_path: Path) -> None:
    """Nothing is written; the message says which rule took how much, to the last number."""
    trials = [
        Trial("R1", 1, SHORT),
        Trial("R1", 2, GOOD, ok="0"),
        Trial("R1", 3, GOOD + " 50:60", block="practice"),
        Trial("R2", 1, "50:200 150:60 250:200 50:200", ok="0"),
        Trial("R2", 2, GOOD, ok="0"),
    ]
    rules = (
        "[screening.fixations]\nunder_ms = 80\n[screening.trials]\nfewest_fixations = 2\n"
        "[screening.participants]\ncorrect_share_under = 0.75\n"
    )
    file = study(tmp_path, trials, rules)
    before = files_of(tmp_path)
    with pytest.raises(etl.DataError) as refused:
        build(file)
    said = str(refused.value)
    assert "screening leaves no trial of any reader" in said
    # R1: 1 right of 2 is under 0.75. Read 5 trials: 1 practice, 1 too short, 3 of lost readers.
    assert (
        "trials: 5 read, 0 kept; left out 1 by skip, 1 by fewest_fixations, "
        "3 by correct_share_under" in said
    )
    # 1 + 3 + 4 + 4 + 3 = 15 fixations: 4 practice, 1 short, 1 of the short trial, 9 of readers.
    assert (
        "fixations: 15 read, 0 kept; left out 4 by skip, 1 by under_ms, 1 by fewest_fixations, "
        "9 by correct_share_under" in said
    )
    assert files_of(tmp_path) == before
    checked = etl.check(etl.load_study(file))
    assert [finding.text() for finding in checked.of("error")] == [
        line for line in [said.rpartition("\n1 problem")[0]] if line
    ]


def test_everything_left_out_keeps_the_earlier_build(tmp_path: Path) -> None:
    """An earlier build stays, byte for byte."""
    file = study(tmp_path, [Trial("R1", 1, SHORT)], "")
    build(file)
    before = files_of(tmp_path / "out")
    text = file.read_text(encoding="utf-8") + "[screening.trials]\nfewest_fixations = 2\n"
    file.write_text(text, encoding="utf-8", newline="\n")
    with pytest.raises(etl.DataError, match="screening leaves no trial of any reader"):
        build(file)
    assert files_of(tmp_path / "out") == before


def test_reader_without_any_kept_fixation_may_keep_trials(tmp_path: Path) -> None:
    """Where no rule asks for fixations, a trial that has lost all of them is a trial still."""
    trials = [Trial("R1", 1, "50:60 150:60"), Trial("R2", 1, GOOD)]
    done = build(study(tmp_path, trials, "[screening.fixations]\nunder_ms = 80\n"))
    (row,) = (row for row in rows_of(done.folder, "trials") if row["participant"] == "R1")
    assert (row["fixation_count"], row["reading_time"], row["missing"]) == (
        *(0, 0.0),
        "any_regression: no_saccade; any_first_pass_regression: no_saccade",
    )
    assert done.account("fixations", "R1") == {"read": 2, "under_ms": 2}
    assert sound(done, trials)


SESSIONS = [
    Trial("R1", 1, GOOD, session="a"),
    Trial("R1", 2, SHORT, session="a"),
    Trial("R1", 1, SHORT, session="b", ok="0"),
    Trial("R1", 3, "50:60 " + GOOD, session="b"),
    Trial("R2", 1, GOOD, session="b"),
]
SESSION_RULES = """
[screening.fixations]
under_ms = 80
[screening.trials]
notes = "notes.csv"
fewest_fixations = 2
"""


def test_sessions_are_told_in_the_ledger(tmp_path: Path) -> None:
    """A trial number that comes in two sessions is two trials, in ledger, accounts and notes."""
    notes = "participant,session,trial,reason\nR1,a,1,sneezed\n"
    done = build(study(tmp_path, SESSIONS, SESSION_RULES, notes=notes))
    columns = ("level", "participant", "session", "trial", "fixation", "rule", "also")
    assert [tuple(row[c] for c in columns) for row in done.ledger] == [
        ("trial", "R1", "a", "1", "", "notes", ""),
        ("trial", "R1", "a", "2", "", "fewest_fixations", ""),
        ("trial", "R1", "b", "1", "", "fewest_fixations", ""),
        ("fixation", "R1", "b", "3", "1", "under_ms", ""),
    ]
    assert list(done.ledger[0])[:5] == ["level", "participant", "session", "trial", "item"]
    assert done.account("trials", "R1") == {"read": 4, "notes": 1, "fewest_fixations": 2, "kept": 1}
    assert sound(done, SESSIONS)


def test_note_without_a_session_is_good_where_one_trial_fits(tmp_path: Path) -> None:
    """Trial 3 of R1 came in one session only."""
    notes = "participant,trial,reason\nR1,3,sneezed\n"
    done = build(study(tmp_path, SESSIONS, SESSION_RULES, notes=notes))
    assert [r["rule"] for r in done.ledger if (r["level"], r["trial"]) == ("trial", "3")] == [
        "notes"
    ]


def test_note_without_a_session_on_a_listed_trial_that_was_not_recorded(tmp_path: Path) -> None:
    """It says why the trial is not there; that is worth a note and no error."""
    notes = "participant,trial,reason\nR1,9,cable loose\n"
    file = study(tmp_path, SESSIONS, SESSION_RULES, notes=notes)
    listed = tmp_path / "trials.csv"
    text = listed.read_text(encoding="utf-8") + "R1,b,9,early,1,,,main\n"
    listed.write_text(text, encoding="utf-8", newline="\n")
    done = build(file)
    assert (
        'note: notes.csv:2: the note is on a trial that was not recorded; found "participant R1, '
        'trial 9"' in done.findings
    )


TWICE = (GOOD + " 50:60", "50:60 150:200 250:200")


@pytest.mark.parametrize(("which", "kept"), [("first", 3), ("last", 2)])
def test_recordings_that_are_not_used_are_not_screened(
    tmp_path: Path, which: str, kept: int
) -> None:
    """They are charged to ``repeated``, whatever they are like, and no part of any share."""
    trials = [Trial("R1", 1, TWICE), Trial("R1", 2, GOOD)]
    rules = "[screening.fixations]\nunder_ms = 80\n[screening.trials]\nfewest_fixations = 2\n"
    done = build(study(tmp_path, trials, rules, repeated=which))
    assert done.account("fixations") == {
        "read": 10,
        "repeated": 3 if which == "first" else 4,
        "under_ms": 1,
        "kept": kept + 3,
    }
    assert done.account("trials") == {"read": 2, "kept": 2}
    assert sound(done, trials)


def test_several_recordings_of_a_lost_trial(tmp_path: Path) -> None:
    """The used recording goes by the rule for trials, the others by ``repeated``."""
    trials = [Trial("R1", 1, (SHORT, GOOD, GOOD)), Trial("R1", 2, GOOD)]
    rules = "[screening.trials]\nfewest_fixations = 2\n"
    done = build(study(tmp_path, trials, rules, repeated="first"))
    assert done.fates() == ["fewest_fixations"] + ["repeated"] * 6
    assert done.account("trials") == {"read": 2, "fewest_fixations": 1, "kept": 1}
    assert sound(done, trials)


@pytest.mark.slow
def test_lost_readers_and_sessions_change_no_byte_with_workers(tmp_path: Path) -> None:
    """One process or two: the same files."""
    trials = [*SESSIONS, Trial("R3", 1, GOOD, session="a", ok="0")]
    rules = "[screening.fixations]\nunder_ms = 80\n" + CORRECT
    one = build(study(tmp_path / "one", trials, rules))
    two = build(study(tmp_path / "two", trials, rules), workers=2)
    assert tables_of(one.folder) == tables_of(two.folder)
    assert set(files_of(one.folder)) == PUBLISHED_WITH_CSV


def test_reason_outlier_is_a_level_only_where_the_rule_is_on(tmp_path: Path) -> None:
    """Without ``outlier_sd`` the column ``missing`` knows nothing of it."""
    trials = [Trial("R1", 1, GOOD)]
    plain = build(study(tmp_path / "plain", trials, ""))
    strict = build(study(tmp_path / "strict", trials, "[screening.values]\noutlier_sd = 3\n"))
    reasons = [
        pq.read_table(done.folder / "outcomes.parquet")["missing"].to_pandas().cat.categories
        for done in (plain, strict)
    ]
    assert [list(named).count("outlier") for named in reasons] == [0, 1]
