"""Tables of facts that are wrong, or that do not fit the logs."""

from pathlib import Path

import pytest

from tests.bad_input.small_study import SmallStudy, log


@pytest.fixture
def tabled(study: SmallStudy) -> SmallStudy:
    """A sound study with a trial list and a table of readers."""
    study.add_tables()
    return study


def one_problem(*lines: str) -> str:
    """The whole message about a single problem."""
    return "\n".join([*lines, "1 problem; nothing was written", ""])


def test_table_that_is_not_there(tabled: SmallStudy) -> None:
    """A missing table is named as the study file names it."""
    Path("trial_list.csv").unlink()
    assert tabled.refusal() == one_problem(
        "trial_list.csv: there is no such file",
        "    fix: correct the name in the study file, or put the file there",
    )


def test_folder_in_place_of_a_table(tabled: SmallStudy) -> None:
    """A folder is no table, on any operating system."""
    Path("trial_list.csv").unlink()
    Path("trial_list.csv").mkdir()
    assert tabled.refusal() == one_problem(
        "trial_list.csv: this is a folder; expected a file",
        "    fix: name the file in it that is meant",
    )


def test_table_without_its_key(tabled: SmallStudy) -> None:
    """A table that cannot be joined names the column that is wanted."""
    tabled.change("trial_list.csv", "participant,trial,", "participant,triall,")
    assert tabled.refusal() == one_problem(
        'trial_list.csv:1: there is no column "trial"; found "participant, triall, cue", expected '
        'a column "trial" to join the table by',
        '    fix: did you mean "triall"? Rename the column, or correct the keys in the study file',
    )


def test_table_with_an_empty_key(tabled: SmallStudy) -> None:
    """A row that can be joined to nothing is an error."""
    tabled.change("trial_list.csv", "P01,2,late", "P01,,late")
    assert tabled.refusal() == one_problem(
        'trial_list.csv:3: column "trial": the trial is missing; expected a value to join the row '
        "by",
        "    fix: fill in the cell, or remove the row",
    )


def test_table_with_a_row_twice(tabled: SmallStudy) -> None:
    """Two rows for one trial contradict each other or are a slip."""
    tabled.add("trial_list.csv", "P01,2,early\n")
    assert tabled.refusal() == one_problem(
        'trial_list.csv:6: two rows have the same participant and trial; found "participant P01, '
        'trial 2", expected one row for each; line 3 holds the other',
        "    fix: remove one of the two rows, or add a column to [trials] keys",
    )


def test_table_with_a_header_only(tabled: SmallStudy) -> None:
    """A table without a row says nothing about any trial."""
    tabled.write("participants.csv", "participant,group\n")
    assert tabled.refusal() == one_problem(
        "participants.csv:1: the table has a header but no row",
        "    fix: fill the table, or take it out of the study file",
    )


def test_reader_who_is_not_in_the_table(tabled: SmallStudy) -> None:
    """A reader without facts is reported once, not once a trial."""
    tabled.change("participants.csv", "P02,visitor\n", "")
    assert tabled.refusal() == one_problem(
        'logs/P02.tsv:2: participants.csv has no row for this participant; found "participant '
        'P02", expected a row of participants.csv for every trial of the logs',
        "    fix: add the row to participants.csv, or leave the trial out by [trials] skip or "
        "[logs.where]",
    )


def test_trial_that_is_not_in_the_list(tabled: SmallStudy) -> None:
    """A trial of the logs without a row in the list names both."""
    tabled.change("trial_list.csv", "P01,2,late\n", "")
    assert tabled.refusal() == one_problem(
        "logs/P01.tsv:5: trial_list.csv has no row for this participant and trial; found "
        '"participant P01, trial 2", expected a row of trial_list.csv for every trial of the logs',
        "    fix: add the row to trial_list.csv, or leave the trial out by [trials] skip or "
        "[logs.where]",
    )


def test_fact_that_is_nowhere(tabled: SmallStudy) -> None:
    """A factor that no file has is refused with the nearest column."""
    tabled.change("study.toml", '"group"', '"grup"')
    assert tabled.refusal() == one_problem(
        'study.toml:22: trials.factors: no table, log or region file has a column "grup"; found '
        '"grup", expected one of bottom, cue, dur_ms, group, item, left, order, participant, '
        "reader, region, right, sentence, start_ms, top, trial, x, y",
        '    fix: did you mean "group"?',
    )


def test_level_that_is_not_listed(tabled: SmallStudy) -> None:
    """Where the levels of a factor are stated, another one is an error in its table."""
    tabled.add("study.toml", '\n[trials.levels]\ncue = ["early", "middle", "later"]\n')
    tabled.write(
        "trial_list.csv",
        "participant,trial,cue\nP01,1,early\nP01,2,late\nP02,1,later\nP02,2,middle\n",
    )
    assert tabled.refusal() == one_problem(
        'trial_list.csv:3: column "cue": the factor cue has a level that is not listed; found '
        '"late", expected one of early, middle, later',
        "    fix: correct the cell, or add the level to [trials] levels; trials that are no part "
        "of the study belong in [trials] skip",
    )


def test_factor_without_a_value(tabled: SmallStudy) -> None:
    """Every trial of the study has a level of every factor."""
    tabled.change("trial_list.csv", "P01,2,late", "P01,2,")
    assert tabled.refusal() == one_problem(
        'trial_list.csv:3: column "cue": the factor cue has no value; expected a level',
        "    fix: correct the cell, or take a word that is a level out of [logs] missing; trials "
        "that are no part of the study belong in [trials] skip",
    )


def test_factor_that_varies_within_a_trial(study: SmallStudy) -> None:
    """A fact that stands in the log is the same in all rows of a trial."""
    study.add("study.toml", '\n[trials]\nfactors = ["mood"]\n')
    for reader in ("P01", "P02"):
        text = log(reader).replace("\n", "\tcalm\n").replace("y\tcalm", "y\tmood")
        study.write(f"logs/{reader}.tsv", text)
    study.change("logs/P01.tsv", "1000250\t200\t50\t25\tcalm", "1000250\t200\t50\t25\ttense")
    assert study.refusal() == one_problem(
        'logs/P01.tsv:3: column "mood": mood varies within a trial; found "tense", expected '
        '"calm" in all rows of trial 1 of reader P01, as in logs/P01.tsv:2',
        "    fix: correct the cells; if these are two trials, number them apart or name a session "
        "column",
    )


def test_log_and_list_that_name_different_items(tabled: SmallStudy) -> None:
    """Where both say which item a trial shows, they agree."""
    tabled.write(
        "trial_list.csv",
        "participant,trial,cue,item\nP01,1,early,pear\nP01,2,late,pear\n"
        "P02,1,late,pear\nP02,2,early,plum\n",
    )
    assert tabled.refusal() == one_problem(
        'logs/P01.tsv:5: the log and trial_list.csv name different items; found "plum", expected '
        '"pear" as in trial_list.csv:3',
        "    fix: correct one of the two, or take item out of [logs.columns]",
    )


def test_item_table_that_nothing_joins(study: SmallStudy) -> None:
    """An item table needs to know the item of each trial."""
    study.change("study.toml", 'item = "sentence"\n', "")
    study.add("study.toml", '\n[items]\ntable = "items.csv"\n')
    study.write("items.csv", "item,letters\npear,4\nplum,4\n")
    study.write("regions.csv", "region,order,left,top,right,bottom\nwho,1,0,0,100,50\n")
    assert study.refusal() == one_problem(
        "study.toml:17: items.table: nothing says which item a trial shows, so the item table "
        'cannot be joined; found "items.csv", expected item in [logs.columns], or a column item '
        "in the trial list",
        '    fix: add item = "…" to [logs.columns] with the header of the column, add a column '
        "item to the trial list, or remove [items]",
    )


def test_trial_list_joined_by_what_the_logs_do_not_say(tabled: SmallStudy) -> None:
    """A key that no log has is found in the study file, not once for every trial."""
    tabled.change("study.toml", "factors = [", 'keys = ["participant", "session"]\nfactors = [')
    tabled.write("trial_list.csv", "participant,session,cue\nP01,a,early\nP02,a,late\n")
    assert tabled.refusal() == one_problem(
        "study.toml:22: trials.keys: the trial list is joined by session, which the logs do not "
        'say; found "participant, session", expected session in [logs.columns], or other keys',
        '    fix: add session = "…" to [logs.columns] with the header of the column, or remove it '
        "from keys",
    )


def test_unreadable_log_is_no_missing_trial(tabled: SmallStudy) -> None:
    """What stands in a log that cannot be read is not called missing."""
    tabled.write("logs/P01.tsv", "")
    assert tabled.refusal() == one_problem(
        "logs/P01.tsv: the file is empty",
        "    fix: remove it from the folder, or copy it again",
    )
