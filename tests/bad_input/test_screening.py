"""Rules of screening that cannot be applied, and facts and notes that cannot be used."""

from __future__ import annotations

import shutil

import pytest

from tests.bad_input.small_study import SmallStudy

ONE = "1 problem; nothing was written\n"
CORRECT_FACT = "    fix: correct the cell, or add the word to [logs] missing if it means no value\n"
NO_ANSWER = "this does not say whether the answer was right"
ANSWERS = "1 or 0, true or false, yes or no, correct or wrong; nothing where nothing was asked"
FACTS = 'answer_correct = "ok"\nonset = "on"\noffset = "off"\n'
TRIAL_LIST = (
    "participant,trial,cue,ok,on,off\n"
    "P01,1,early,1,1000000,1001000\nP01,2,late,0,2000000,2001000\n"
    "P02,1,late,1,1000000,1001000\nP02,2,early,,2000000,2001000\n"
)


@pytest.fixture
def screened(study: SmallStudy) -> SmallStudy:
    """A sound study with all that rules can ask for, and no rule yet."""
    study.add_tables()
    study.add("study.toml", FACTS + "[screen]\nwidth_px = 200\nheight_px = 100\n")
    study.change("study.toml", 'y = "y"\n', 'y = "y"\nblink = "blink"\n')
    study.write("trial_list.csv", TRIAL_LIST)
    for reader in ("P01", "P02"):
        name = f"logs/{reader}.tsv"
        text = (study.folder / name).read_text(encoding="utf-8")
        study.write(name, text.replace("\t25\n", "\t25\t0\n").replace("\ty\n", "\ty\tblink\n"))
    return study


def rules(study: SmallStudy, text: str) -> None:
    """Add rules."""
    study.add("study.toml", text)


EVERY_RULE = """
[screening.fixations]
outside_text_time = true
off_screen = true
first = 1
blink = "drop"
merge = { under_ms = 80, within_px = 14 }
under_ms = 80
over_ms = 800
[screening.trials]
notes = "notes.csv"
blink_in_first_pass_of = ["verb"]
answer_wrong = true
[screening.participants]
notes = "notes.csv"
correct_share_under = 0.1
fewest_trials_per_cell = 1
"""


def test_study_that_the_other_tests_spoil_is_sound(screened: SmallStudy) -> None:
    """With many rules on and notes that match nothing but themselves, it builds."""
    rules(screened, EVERY_RULE)
    screened.write("notes.csv", "participant,trial,reason\n")
    shutil.rmtree(screened.folder / "out")
    result = screened.run("build", "study.toml")
    assert (result.exit_code, result.stderr.count("fix:")) == (0, result.stderr.count("warning"))


@pytest.mark.parametrize("command", ["build", "check"])
def test_limits_that_are_impossible(screened: SmallStudy, command: str) -> None:
    """Every impossible limit is told at once, each with its line."""
    rules(
        screened,
        "[screening.fixations]\nunder_ms = 800\nover_ms = 80\nfirst = 0\n"
        "merge = { under_ms = -1, within_px = 0 }\n"
        "[screening.trials]\nduration_ms = [900, 500]\noutside_share_over = 1.5\n"
        "[screening.participants]\nfewest_trials_per_cell = 0\n",
    )
    result = screened.run(command, "study.toml")
    assert (result.exit_code, result.stdout) == (2, "")
    assert result.stderr == (
        "study.toml:32: screening.fixations.over_ms: no duration lies between under_ms and "
        'over_ms; found "80", expected a number above 800\n'
        "    fix: correct one of the two limits\n"
        'study.toml:33: screening.fixations.first: out of bounds; found "0", expected a number of '
        "1 or more\n    fix: write for example first = 1\n"
        'study.toml:34: screening.fixations.merge.under_ms: out of bounds; found "-1", expected a '
        "number above 0\n    fix: write for example under_ms = 80\n"
        'study.toml:34: screening.fixations.merge.within_px: out of bounds; found "0", expected a '
        "number above 0\n    fix: write for example within_px = 14\n"
        "study.toml:36: screening.trials.duration_ms: no duration lies between the two limits; "
        'found "[900, 500]", expected two numbers, the lower first\n'
        "    fix: write duration_ms = [500, 900]\n"
        'study.toml:37: screening.trials.outside_share_over: out of bounds; found "1.5", expected '
        "a number of 1 or less\n    fix: write for example outside_share_over = 0.3\n"
        "study.toml:39: screening.participants.fewest_trials_per_cell: out of bounds; found "
        '"0", expected a number of 1 or more\n'
        "    fix: write for example fewest_trials_per_cell = 4\n"
        "7 problems; nothing was written\n"
    )


NOTES = {
    "unknown reader": (
        "participant,trial,reason\nP09,1,sneezed\n",
        (
            'notes.csv:2: the note is on a reader that no log has; found "participant P09, trial 1"'
            ", expected a reader of the logs\n    fix: correct the row, or remove it\n" + ONE
        ),
    ),
    "unknown reader left out as a whole": (
        "participant,trial,reason\nP09,,asleep\n",
        (
            'notes.csv:2: the note is on a reader that no log has; found "participant P09", '
            "expected a reader of the logs\n    fix: correct the row, or remove it\n" + ONE
        ),
    ),
    "unknown trial": (
        "participant,trial,reason\nP01,1,sneezed\nP01,7,sneezed\n",
        (
            'notes.csv:3: the note is on a trial that no log has; found "participant P01, trial 7"'
            ", expected a trial of the logs\n    fix: correct the row, or remove it\n" + ONE
        ),
    ),
    "no reader in a row": (
        "participant,trial,reason\n,1,sneezed\n",
        (
            'notes.csv:2: column "participant": the note does not say which reader; expected a '
            "reader of the logs\n    fix: fill in the cell, or remove the row\n" + ONE
        ),
    ),
    "columns of other names": (
        "who,number,why\nP01,1,sneezed\n",
        (
            'notes.csv:1: there is no column "participant"; found "who, number, why", expected '
            "columns participant, trial and reason\n    fix: rename or add the column\n"
            'notes.csv:1: there is no column "trial"; found "who, number, why", expected columns '
            "participant, trial and reason\n    fix: rename or add the column\n"
            'notes.csv:1: there is no column "reason"; found "who, number, why", expected columns '
            "participant, trial and reason\n    fix: rename or add the column\n"
            "3 problems; nothing was written\n"
        ),
    ),
    "a row too short": (
        "participant,trial,reason\nP01,1\n",
        (
            'notes.csv:2: the row has too few fields; found "2 fields", expected 3 fields, as in '
            "the header\n    fix: complete the row, or remove what is too much; a cell that holds "
            "the separator must stand in quotes\n" + ONE
        ),
    ),
    "nothing at all": (
        "",
        (
            "notes.csv: the file is empty\n    fix: remove it from the folder, or copy it again\n"
            + ONE
        ),
    ),
}


@pytest.mark.parametrize("name", NOTES)
def test_notes_that_cannot_be_used(screened: SmallStudy, name: str) -> None:
    """A note that matches nothing, or a file that is none, is an error with its line."""
    text, expected = NOTES[name]
    rules(
        screened,
        '[screening.trials]\nnotes = "notes.csv"\n[screening.participants]\nnotes = "notes.csv"\n',
    )
    screened.write("notes.csv", text)
    assert screened.refusal() == expected


def test_notes_that_are_not_there(screened: SmallStudy) -> None:
    """A file of notes that does not exist is named as the study file names it, once."""
    rules(
        screened,
        '[screening.trials]\nnotes = "notes.csv"\n[screening.participants]\nnotes = "notes.csv"\n',
    )
    assert screened.refusal() == (
        "notes.csv: there is no such file\n"
        "    fix: correct the name in the study file, or put the file there\n" + ONE
    )


@pytest.mark.parametrize(
    ("key", "text", "what", "expected", "other"),
    [
        (
            "trials",
            "P01,1,x\nP01,,y",
            "a reader",
            "notes on trials, each with its trial",
            "participants",
        ),
        ("participants", "P01,,x\nP01,1,y", "a trial", "notes on readers only", "trials"),
    ],
)
def test_note_that_no_rule_asks_for(
    screened: SmallStudy, key: str, text: str, what: str, expected: str, other: str
) -> None:
    """A note on a reader in a file that only serves trials is not passed over in silence."""
    rules(screened, f'[screening.{key}]\nnotes = "notes.csv"\n')
    screened.write("notes.csv", f"participant,trial,reason\n{text}\n")
    assert screened.refusal() == (
        f"notes.csv:3: the note is on {what}, which the study file does not ask this file for; "
        f"expected {expected}\n"
        f'    fix: add notes = "notes.csv" to [screening.{other}], or correct the row\n' + ONE
    )


def test_notes_and_other_mistakes_are_told_together(screened: SmallStudy) -> None:
    """Every row that matches nothing is told, besides cells that cannot be read."""
    rules(
        screened,
        '[screening.trials]\nnotes = "notes.csv"\nanswer_wrong = true\n'
        '[screening.participants]\nnotes = "notes.csv"\n',
    )
    screened.write("notes.csv", "participant,trial,reason\nP09,1,x\nP01,7,x\nP08,,x\n")
    screened.change("trial_list.csv", "late,0,", "late,perhaps,")
    remove = "    fix: correct the row, or remove it\n"
    assert screened.refusal() == (
        f'trial_list.csv:3: column "ok": {NO_ANSWER}; found "perhaps", expected {ANSWERS}\n'
        f"{CORRECT_FACT}"
        'notes.csv:2: the note is on a reader that no log has; found "participant P09, trial 1", '
        f"expected a reader of the logs\n{remove}"
        'notes.csv:3: the note is on a trial that no log has; found "participant P01, trial 7", '
        f"expected a trial of the logs\n{remove}"
        'notes.csv:4: the note is on a reader that no log has; found "participant P08", expected a '
        f"reader of the logs\n{remove}"
        "4 problems; nothing was written\n"
    )


def test_region_that_no_text_has(screened: SmallStudy) -> None:
    """A misspelt region of a rule is told with the nearest one, for each rule."""
    rules(
        screened,
        '[measures]\noutcomes = ["duration"]\n'
        '[screening.trials]\nblink_in_first_pass_of = ["verbs", "who"]\n'
        'no_first_pass_on = ["spillover"]\n',
    )
    assert screened.refusal() == (
        "study.toml:33: screening.trials.blink_in_first_pass_of: no text has a region of this "
        'name; found "verbs", expected one of who, verb\n    fix: did you mean "verb"?\n'
        "study.toml:34: screening.trials.no_first_pass_on: no text has a region of this name; "
        'found "spillover", expected one of who, verb\n    fix: correct the name\n'
        "2 problems; nothing was written\n"
    )


@pytest.mark.parametrize(
    "rule",
    [
        "[screening.trials]\nanswer_wrong = true\n",
        "[screening.participants]\ncorrect_share_under = 0.5\n",
    ],
)
def test_answers_that_cannot_be_read(screened: SmallStudy, rule: str) -> None:
    """A word that says neither right nor wrong is told where it stands, whichever rule asks."""
    rules(screened, rule)
    screened.change("trial_list.csv", "late,0,", "late,perhaps,")
    screened.change("trial_list.csv", "late,1,", "late,2,")
    assert screened.refusal() == (
        f'trial_list.csv:3: column "ok": {NO_ANSWER}; found "perhaps", expected {ANSWERS}\n'
        f"{CORRECT_FACT}"
        f'trial_list.csv:4: column "ok": {NO_ANSWER}; found "2", expected {ANSWERS}\n{CORRECT_FACT}'
        "2 problems; nothing was written\n"
    )


def test_answers_are_not_read_where_no_rule_asks(screened: SmallStudy) -> None:
    """The same word without such a rule is no reason to refuse."""
    rules(screened, "[screening.fixations]\nunder_ms = 80\n")
    screened.change("trial_list.csv", "late,0,", "late,perhaps,")
    assert screened.run("check", "study.toml").exit_code == 0


TEXT_TIME = "[screening.fixations]\noutside_text_time = true\n"


@pytest.mark.parametrize("cell", ["soon", "nan", "inf", "1_000", "1e999", "0x10", "12:30", "1,5,5"])
def test_text_times_that_are_no_numbers(screened: SmallStudy, cell: str) -> None:
    """Whatever Python itself would take for a number, only plain decimal numbers are."""
    rules(screened, TEXT_TIME)
    quoted = f'"{cell}"' if "," in cell else cell
    screened.change("trial_list.csv", "late,0,2000000,", f"late,0,{quoted},")
    assert screened.refusal() == (
        f'trial_list.csv:3: column "on": this is no number; found "{cell}", expected a time in log '
        f"time\n{CORRECT_FACT}{ONE}"
    )


def test_text_times_with_thousands_signs(screened: SmallStudy) -> None:
    """A comma that could be either sign is not guessed at, in any row."""
    rules(screened, TEXT_TIME)
    text = TRIAL_LIST.replace(",1000000,", ',"1,000,000",').replace(",2000000,", ',"2,000,000",')
    screened.write("trial_list.csv", text)
    said = screened.refusal()
    assert said.startswith(
        'trial_list.csv:2: column "on": the comma could be a decimal sign or a thousands sign; '
        'found "1,000,000", expected numbers that can be read in one way only\n'
        '    fix: state decimal = "," in [logs] if it is the decimal sign; otherwise write the '
        "numbers without thousands signs\n"
    )
    assert said.endswith("\n4 problems; nothing was written\n")


def test_text_times_with_commas_and_points(screened: SmallStudy) -> None:
    """Where some cells have points, the one with a comma is no number."""
    rules(screened, TEXT_TIME)
    screened.write(
        "trial_list.csv",
        TRIAL_LIST.replace("late,0,2000000,", 'late,0,"2000000,5",').replace(
            "early,,2000000,", "early,,2000000.5,"
        ),
    )
    assert screened.refusal() == (
        'trial_list.csv:3: column "on": this is no number; found "2000000,5", expected a time in '
        f"log time\n{CORRECT_FACT}{ONE}"
    )


def test_text_times_that_are_missing_are_counted(screened: SmallStudy) -> None:
    """A trial without the time is not judged on that side; that is a warning, not an error."""
    rules(screened, TEXT_TIME)
    screened.change("trial_list.csv", "late,0,2000000,", "late,0,NA,")
    result = screened.run("check", "study.toml")
    assert result.exit_code == 0
    assert (
        'warning: study.toml:31: column "on": 1 trial has no time here and is not judged by it'
        in result.stdout
    )


def test_blinks_that_cannot_be_read(screened: SmallStudy) -> None:
    """A cell that is no number and no word for yes or no is told with its line."""
    rules(screened, '[screening.fixations]\nblink = "drop"\n')
    name = "logs/P01.tsv"
    screened.change(name, "1000250\t200\t50\t25\t0", "1000250\t200\t50\t25\tperhaps")
    assert screened.refusal() == (
        'logs/P01.tsv:3: column "blink": this does not say whether a blink touches the fixation; '
        'found "perhaps", expected a number (0 for no blink), or a word for yes or no\n'
        "    fix: correct the cells, or take blink out of [logs.columns]\n" + ONE
    )


def test_rules_without_what_they_need(study: SmallStudy) -> None:
    """Each rule is told with the column that it lacks, all at once."""
    rules(
        study,
        '[screening.fixations]\noutside_text_time = true\noff_screen = true\nblink = "drop"\n'
        "merge = { under_ms = 80, within_deg = 1 }\n[screening.trials]\n"
        'blink_in_first_pass_of = ["verb"]\nanswer_wrong = true\n[screening.participants]\n'
        "correct_share_under = 0.75\nfewest_trials_per_cell = 4\n",
    )
    column = "with the header of the column, or remove this rule\n"
    fact = "with the name of the column, or remove this rule\n"
    blink = (
        "nothing says which fixations a blink touches; expected logs.columns.blink\n"
        f'    fix: add blink = "…" to [logs.columns] {column}'
    )
    answer = (
        "nothing says whether an answer was correct; expected trials.answer_correct\n"
        f'    fix: add answer_correct = "…" to [trials] {fact}'
    )
    assert study.refusal() == (
        "study.toml:17: screening.fixations.outside_text_time: nothing says when the text was on "
        "the screen; expected trials.onset or trials.offset\n"
        f'    fix: add onset = "…" or offset = "…" to [trials] {fact}'
        "study.toml:18: screening.fixations.off_screen: nothing says how large the screen is; "
        "expected [screen]\n    fix: add [screen] with width_px and height_px, or remove this "
        "rule\n"
        f"study.toml:19: screening.fixations.blink: {blink}"
        "study.toml:20: screening.fixations.merge.within_deg: a distance in degrees needs the size "
        "and the distance of the screen; expected [screen]\n    fix: add [screen] with width_px, "
        "height_px, width_cm and distance_cm, or give within_px in place of within_deg\n"
        f"study.toml:22: screening.trials.blink_in_first_pass_of: {blink}"
        f"study.toml:23: screening.trials.answer_wrong: {answer}"
        f"study.toml:25: screening.participants.correct_share_under: {answer}"
        "study.toml:26: screening.participants.fewest_trials_per_cell: without factors there are "
        "no cells in which to count trials; expected trials.factors\n"
        '    fix: add factors = ["…"] to [trials] with the names of their columns, or remove this '
        "rule\n8 problems; nothing was written\n"
    )


def test_column_of_answers_that_is_nowhere(screened: SmallStudy) -> None:
    """A participants rule whose column no table has names the column and where it is asked for."""
    rules(screened, "[screening.participants]\ncorrect_share_under = 0.75\n")
    screened.change("study.toml", 'answer_correct = "ok"', 'answer_correct = "okay"')
    assert screened.refusal() == (
        'study.toml:24: trials.answer_correct: no table, log or region file has a column "okay"; '
        'found "okay", expected one of blink, bottom, cue, dur_ms, group, item, left, off, ok, on, '
        "order, participant, reader, region, right, sentence, start_ms, top, trial, x, y\n"
        '    fix: did you mean "ok"?\n' + ONE
    )
