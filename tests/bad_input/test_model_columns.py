"""Centred covariates and contrasts that only the tables and logs show to be wrong."""

import pytest

from tests.bad_input.small_study import SmallStudy

PARTICIPANTS = "participant,group,age\nP01,volunteer,20\nP02,visitor,{}\n"


def one_problem(*lines: str) -> str:
    """The whole message about a single problem."""
    return "\n".join([*lines, "1 problem; nothing was written", ""])


@pytest.fixture
def centred(study: SmallStudy) -> SmallStudy:
    """A study with a covariate that is to be centred."""
    study.add_tables()
    study.add("study.toml", 'covariates = ["age"]\n[output]\ncentred = ["age"]\n')
    return study


@pytest.mark.parametrize(
    "cell", [pytest.param("old", id="word"), pytest.param("021", id="zeros before a number")]
)
def test_covariate_that_is_no_number(centred: SmallStudy, cell: str) -> None:
    """What cannot be subtracted from is told at the first such cell."""
    centred.write("participants.csv", PARTICIPANTS.format(cell))
    assert centred.refusal() == one_problem(
        'participants.csv:3: column "age": the covariate age is to be centred, and this is no '
        f'number; found "{cell}", expected a number without zeros before it',
        "    fix: correct the cell, add the word to [logs] missing if it stands for no value, or "
        "remove the covariate from [output] centred",
    )


def test_covariate_of_words_only(centred: SmallStudy) -> None:
    """A covariate that is text has no mean."""
    centred.write("participants.csv", PARTICIPANTS.format("old").replace(",20", ",young"))
    message = centred.refusal()
    assert message.startswith(
        'participants.csv:2: column "age": the covariate age is to be centred'
    )
    assert 'found "young"' in message
    assert message.endswith("1 problem; nothing was written\n")


def test_covariate_without_any_value(centred: SmallStudy) -> None:
    """The mean of nothing is nothing."""
    centred.write("participants.csv", PARTICIPANTS.format("").replace(",20", ","))
    assert centred.refusal() == one_problem(
        "study.toml:25: output.centred: the covariate age is to be centred, and no trial has a "
        'value of it; found "age"',
        "    fix: fill in the column, or remove the covariate from the list",
    )


def test_missing_value_is_no_mistake(centred: SmallStudy) -> None:
    """A covariate may be missing for some: they have no centred value either."""
    centred.write("participants.csv", PARTICIPANTS.format(""))
    assert centred.run("check", "study.toml").exit_code == 0


def test_found_level_gives_a_name_that_is_taken(study: SmallStudy) -> None:
    """Levels that are not stated show only in the tables: the clash is told at its key."""
    study.add_tables()
    study.change("study.toml", '"cue", "group"]', '"cue", "group"]\ncovariates = ["cue_late"]')
    study.add("study.toml", '[output]\ncontrasts = { cue = "treatment" }\n')
    study.write(
        "trial_list.csv",
        "participant,trial,cue,cue_late\nP01,1,early,1\nP01,2,late,1\nP02,1,late,1\nP02,2,early,1\n",
    )
    study.write("participants.csv", "participant,group\nP01,volunteer\nP02,visitor\n")
    assert study.refusal() == one_problem(
        "study.toml:25: output.contrasts.cue: the new column would be called cue_late, and a "
        'column of the tables has that name; found "cue_late in the table outcomes", expected a '
        "name that no column of the tables has",
        "    fix: rename the factor or the level, or give the numbers with names for their columns",
    )


def test_found_levels_of_two_factors_run_together(study: SmallStudy) -> None:
    """Two new columns of one name are told once."""
    study.add_tables()
    study.change("study.toml", 'factors = ["cue", "group"]', 'factors = ["cue", "cue_x"]')
    study.add("study.toml", '[output]\ncontrasts = { cue = "treatment", cue_x = "treatment" }\n')
    study.write(
        "trial_list.csv",
        "participant,trial,cue,cue_x\nP01,1,a,a\nP01,2,x_b,b\nP02,1,x_b,b\nP02,2,a,a\n",
    )
    message = study.refusal()
    assert "output.contrasts.cue: the new column would be called cue_x_b" in message
    assert message.endswith("1 problem; nothing was written\n")
