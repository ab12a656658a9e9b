"""Output folders that may not be replaced, and what a refused build leaves behind."""

import shutil
from pathlib import Path

from tests.bad_input.small_study import SmallStudy

NOT_OURS = (
    "{0}: the output folder holds something else than an earlier build; expected a new or empty "
    "folder, or one that trialwright wrote (it has a run.json)\n"
    "    fix: name another folder, by [output] folder or --into, or empty this one yourself\n"
    "1 problem; nothing was written\n"
)


def test_folder_of_somebody_else(study: SmallStudy) -> None:
    """A folder with other contents is never replaced."""
    Path("out/run.json").unlink()
    assert study.refusal() == NOT_OURS.format("out")


def test_folder_with_another_run_json(study: SmallStudy) -> None:
    """A run.json that another program wrote does not make a folder ours."""
    study.write("out/run.json", '{"program": "another"}\n')
    assert study.refusal() == NOT_OURS.format("out")


def test_folder_given_on_the_command_line(study: SmallStudy) -> None:
    """The folder of --into is named as it was given."""
    study.write("notes/diary.txt", "not to be lost\n")
    assert study.refusal("--into", "notes") == NOT_OURS.format("notes")


def test_file_in_place_of_the_folder(study: SmallStudy) -> None:
    """A file is not replaced by a folder."""
    study.write("tables", "a file\n")
    assert study.refusal("--into", "tables") == (
        "tables: the output folder is a file\n"
        "    fix: name a folder, by [output] folder or --into\n"
        "1 problem; nothing was written\n"
    )


def test_refused_build_makes_no_folder(study: SmallStudy) -> None:
    """Where there was no output folder, a refused build leaves none, nor anything beside it."""
    shutil.rmtree("out")
    study.write("logs/P01.tsv", "")
    study.refusal()
    assert sorted(path.name for path in Path().iterdir()) == ["logs", "regions.csv", "study.toml"]


def test_refusal_late_in_the_work_keeps_the_earlier_build(study: SmallStudy) -> None:
    """An error in the last reader's fixations leaves the earlier build as it was."""
    study.change("logs/P02.tsv", "2000500\t200", "2000100\t200")
    assert study.refusal().startswith("logs/P02.tsv:7: the fixation begins before the one above")
    assert Path("out/outcomes.csv").read_text(encoding="utf-8") == "an earlier build\n"
