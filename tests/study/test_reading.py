"""From a file's bytes to TOML: what stands in the way, and where."""

import os
from collections.abc import Callable
from pathlib import Path

import pytest

from etl.errors import StudyError
from etl.study import Study, load_study
from tests.study.written import SOUND


def test_missing_file_is_named(tmp_path: Path) -> None:
    """A file that is not there is named as the user named it."""
    path = tmp_path / "none.toml"
    with pytest.raises(StudyError) as caught:
        load_study(path)
    assert str(caught.value) == (
        f"{path}: there is no such file; expected a study file\n"
        "    fix: correct the name, or change to the folder that holds it\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    "name", [pytest.param("a\0b.toml", id="no name"), pytest.param("x.toml/y.toml", id="in a file")]
)
def test_impossible_name_is_no_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    """A name that no file can have is a file that is not there."""
    monkeypatch.chdir(tmp_path)
    Path("x.toml").write_text(SOUND, encoding="utf-8")
    with pytest.raises(StudyError, match="there is no such file"):
        load_study(name)


def test_folder_is_no_study_file(tmp_path: Path) -> None:
    """A folder is refused as such."""
    with pytest.raises(StudyError) as caught:
        load_study(tmp_path)
    assert str(caught.value) == (
        f"{tmp_path}: this is a folder; expected a study file\n"
        "    fix: name the study file in it, for example study.toml\n"
        "1 problem; nothing was written"
    )


@pytest.mark.skipif(
    os.name == "nt" or getattr(os, "geteuid", lambda: 1)() == 0,
    reason="this user may read every file",
)
def test_file_that_may_not_be_read_is_named(tmp_path: Path) -> None:
    """A file without permission is refused with what the system says."""
    path = tmp_path / "study.toml"
    path.write_text(SOUND, encoding="utf-8")
    path.chmod(0)
    with pytest.raises(StudyError, match="the file cannot be read: Permission denied"):
        load_study(path)


def test_system_error_is_a_finding(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Whatever the system says against reading is passed on, without a traceback."""

    def fails(_: Path) -> bytes:
        raise OSError(5, "Input/output error")

    monkeypatch.setattr(Path, "read_bytes", fails)
    with pytest.raises(StudyError, match="the file cannot be read: Input/output error"):
        load_study(tmp_path / "study.toml")


@pytest.mark.parametrize(
    "raw",
    [
        pytest.param(SOUND.encode("utf-8"), id="plain"),
        pytest.param(b"\xef\xbb\xbf" + SOUND.encode("utf-8"), id="byte-order mark"),
        pytest.param(SOUND.replace("\n", "\r\n").encode("utf-8"), id="line breaks of two"),
        pytest.param(
            b"\xef\xbb\xbf" + SOUND.replace("\n", "\r\n").encode("utf-8"), id="mark and breaks"
        ),
    ],
)
def test_every_editor_is_understood(load: Callable[..., Study], raw: bytes) -> None:
    """A byte-order mark and the line breaks of any system change neither values nor lines."""
    study = load(raw)
    assert (study.regions.file, study.line_of("regions", "file")) == ("boxes.csv", 13)


@pytest.mark.parametrize(
    ("raw", "expected"),
    [
        pytest.param(
            SOUND.replace("reader", "lectriçe").encode("windows-1252"),
            'study.toml:5: this is no UTF-8 text; found "byte E7", expected UTF-8 text',
            id="one byte a character",
        ),
        pytest.param(
            SOUND.encode("utf-16"),
            "study.toml: the file is UTF-16 text; expected UTF-8 text",
            id="two bytes a character",
        ),
    ],
)
def test_other_encoding_is_refused(refusal: Callable[..., str], raw: bytes, expected: str) -> None:
    """A file that is no UTF-8 is refused with the line of the first odd byte."""
    assert refusal(raw) == (
        f"{expected}\n    fix: save the file as UTF-8 in your editor\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    ("line", "expected"),
    [
        pytest.param("a =", "this is no value", id="no value"),
        pytest.param("a = yes", "this is no value", id="bare word"),
        pytest.param("a", "a key has no value", id="no equals sign"),
        pytest.param("a = 1,5", "something follows the value", id="decimal comma"),
        pytest.param('a = "P\\d"', "a backslash in double quotes begins", id="backslash"),
        pytest.param('a = "C:\\Users"', "a backslash in double quotes begins", id="drive"),
        pytest.param('a = "\\ud800"', "a backslash in double quotes begins", id="no character"),
        pytest.param("[[a]]\n[a]", "this table is begun", id="one and many"),
        pytest.param("[z]\na.b = 1\n[z.a]", "this table is begun", id="key and table"),
        pytest.param('a = "b', "a text has no closing quote", id="open double quote"),
        pytest.param("a = 'b", "a text has no closing quote", id="open single quote"),
        pytest.param('kind = "words"', "this key is given a second", id="twice"),
        pytest.param("[logs]", "this table is begun a second time", id="table twice"),
        pytest.param("a = [1 2]", "a list has no closing bracket", id="open list"),
        pytest.param("a = {b = 1", "a table in braces", id="open braces"),
        pytest.param("a = {}\na.b = 1", "this adds to what is", id="added to"),
        pytest.param("a = 2024-02-30", "there is no such date", id="no date"),
        pytest.param("= 1", "this is no line of a study file", id="no key"),
        pytest.param("[a", "the name of a table has no closing bracket", id="open table"),
        pytest.param(",a = 1", "this is no line of a study file", id="comma first"),
        pytest.param("a.[b] = 1", "this is no key", id="bracket in a key"),
        pytest.param("a = {b=1, b=2}", "this key is given a second", id="twice in braces"),
        pytest.param('a = "\x01"', "illegal character", id="not in our words"),
        pytest.param("a = " + "[" * 5000, "lists or tables stand too deep", id="too deep"),
        pytest.param("a = " + "9" * 5000, "a number has too many digits", id="too many digits"),
        pytest.param('a = """', "a text has no closing quote", id="end of file"),
    ],
)
def test_mistake_in_toml_is_put_in_plain_words(
    refusal: Callable[..., str], line: str, expected: str
) -> None:
    """What is no TOML is refused in plain words."""
    first = refusal(f"{SOUND}{line}\n").splitlines()[0]
    assert first.split("; ")[0].split(": ", 2)[-1].startswith(expected)


@pytest.mark.parametrize(
    ("ending", "place"),
    [
        pytest.param("a = yes\n", "15: column 5", id="in a line"),
        pytest.param("b = 1\n\na = [1,\n2\n\n", "18: end of file", id="at the end"),
        pytest.param('a = """\n', "15: end of file", id="in the last text"),
    ],
)
def test_mistake_in_toml_has_its_place(
    refusal: Callable[..., str], ending: str, place: str
) -> None:
    """What is no TOML has its line and column, or the last line that is not empty."""
    assert refusal(SOUND + ending).startswith(f"study.toml:{place}: ")


def test_mistake_in_toml_says_what_to_do(refusal: Callable[..., str]) -> None:
    """The whole message about a mistake in the TOML."""
    assert refusal(SOUND + 'participant_from_name = "P\\d"\n') == (
        "study.toml:15: column 29: a backslash in double quotes begins a special character; "
        "expected TOML\n"
        "    fix: write the text in single quotes, where a backslash is only itself\n"
        "1 problem; nothing was written"
    )


def test_empty_file_lacks_its_tables(refusal: Callable[..., str]) -> None:
    """An empty file is TOML, and is told what a study needs."""
    assert refusal("") == (
        "study.toml: logs: this table is missing; expected [logs]\n"
        "    fix: add [logs] with files and columns\n"
        "study.toml: regions: this table is missing; expected [regions]\n"
        "    fix: add [regions] with file and kind\n"
        "2 problems; nothing was written"
    )
