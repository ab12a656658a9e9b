"""A study file that is wrong: the command says where and what to do, and writes nothing."""

from pathlib import Path

from tests.bad_input.small_study import SmallStudy


def test_sound_study_builds(study: SmallStudy) -> None:
    """The study that the other tests spoil is sound, with tables and without."""
    plain = study.run("build", "study.toml", "--into", "plain")
    study.add_tables()
    with_tables = study.run("build", "study.toml", "--into", "with_tables")
    assert (plain.exit_code, plain.stderr) == (0, "")
    assert (with_tables.exit_code, with_tables.stderr) == (0, "")


def test_missing_study_file_is_named(study: SmallStudy) -> None:
    """A study file that is not there is no fault of the program."""
    Path("study.toml").unlink()
    assert study.refusal() == (
        "study.toml: there is no such file; expected a study file\n"
        "    fix: correct the name, or change to the folder that holds it\n"
        "1 problem; nothing was written\n"
    )


def test_folder_in_place_of_study_file_is_named(study: SmallStudy) -> None:
    """A folder is no study file."""
    Path("study.toml").unlink()
    Path("study.toml").mkdir()
    assert study.refusal() == (
        "study.toml: this is a folder; expected a study file\n"
        "    fix: name the study file in it, for example study.toml\n"
        "1 problem; nothing was written\n"
    )


def test_unknown_key_is_refused_with_the_nearest(study: SmallStudy) -> None:
    """A key that the study file does not know is an error, not a remark."""
    study.change("study.toml", "duration =", "durration =")
    assert study.refusal() == (
        'study.toml:9: logs.columns.durration: unknown key\n    fix: did you mean "duration"?\n'
        "1 problem; nothing was written\n"
    )


def test_wrong_type_is_refused(study: SmallStudy) -> None:
    """A number in quotes is text."""
    study.add("study.toml", 'tolerance_px = "20"\n')
    assert study.refusal() == (
        'study.toml:16: regions.tolerance_px: this is text; found "20", expected a number\n'
        "    fix: write tolerance_px = 20\n"
        "1 problem; nothing was written\n"
    )


def test_check_refuses_in_the_same_words(study: SmallStudy) -> None:
    """The command check says of a wrong study what build says."""
    study.add("study.toml", 'tolerance_px = "20"\n')
    said = study.refusal()
    result = study.run("check", "study.toml")
    assert (result.exit_code, result.stdout, result.stderr) == (2, "", said)
