"""The key lies beside the study, is its owner's alone, stays what it is, and any change is seen."""

from __future__ import annotations

import json
import os
import re
import stat
import types
from collections.abc import Callable
from pathlib import Path

import pytest

import etl
from etl.pseudonyms import signs_of
from etl.session import pseudonym_owner
from etl.session.pseudonym_key import KeyFile, open_key, save_key
from tests.bad_input.small_study import SmallStudy
from tests.end_to_end.building import build, tables_of

KEY = "study_pseudonyms.csv"
on_posix = pytest.mark.skipif(os.name != "posix", reason="permissions as POSIX knows them")


@pytest.fixture
def study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> SmallStudy:
    """A tiny sound study of two readers that asks for pseudonyms."""
    made = SmallStudy.sound(tmp_path)
    made.change("study.toml", "[regions]", "[output]\npseudonyms = true\n\n[regions]")
    monkeypatch.chdir(tmp_path)
    return made


def rows_of(study: SmallStudy) -> list[list[str]]:
    """The rows of the key file."""
    text = (study.folder / KEY).read_text(encoding="utf-8")
    return [line.split(",") for line in text.splitlines()]


def mode_of(path: Path) -> int:
    """Who may do what with a file."""
    return stat.S_IMODE(path.stat().st_mode)


def test_key_file_says_whose_the_pseudonyms_are(study: SmallStudy) -> None:
    """A row a reader and a row a log, between the key and their number."""
    result = build(study.folder / "study.toml")
    header, key, *rows, end = rows_of(study)
    assert header == ["kind", "name", "stands_for"]
    assert key[0] == "key"
    assert re.fullmatch("[0-9a-f]{64}", key[2])
    assert [(kind, stands_for) for kind, _, stands_for in rows] == [
        ("reader", "P01"),
        ("reader", "P02"),
        ("log", "logs/P01.tsv"),
        ("log", "logs/P02.tsv"),
    ]
    assert end == ["end", "4", ""]
    fixations = result.fixations
    assert set(fixations["participant"]) == {rows[0][1], rows[1][1]}
    assert set(fixations["source_file"]) == {rows[2][1], rows[3][1]}
    assert result.key == study.folder / KEY


def test_two_studies_have_different_keys(study: SmallStudy, tmp_path: Path) -> None:
    """The key is drawn at random, once for each study."""
    other = SmallStudy.sound(tmp_path / "other")
    other.write("study.toml", (study.folder / "study.toml").read_bytes())
    build(study.folder / "study.toml")
    build(other.folder / "study.toml")
    assert rows_of(study)[1] != rows_of(other)[1]
    assert rows_of(study)[2][1] != rows_of(other)[2][1]


@on_posix
def test_its_owner_alone_may_read_the_key(study: SmallStudy) -> None:
    """Whatever the folder and the habits of the system are."""
    before = os.umask(0)
    try:
        build(study.folder / "study.toml")
    finally:
        os.umask(before)
    assert mode_of(study.folder / KEY) == 0o600


@on_posix
def test_nobody_else_may_read_the_key_while_it_is_written(
    study: SmallStudy, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The file is made for its owner alone, before the first byte is in it."""
    seen = []
    held = open_key(etl.load_study("study.toml"), etl.Findings(), target=study.folder / "out")
    assert held is not None

    def watched(descriptor: int) -> None:
        seen.extend((path.name, mode_of(path)) for path in study.folder.glob(f"*{KEY}*"))
        seen.append(("open file", stat.S_IMODE(os.fstat(descriptor).st_mode)))

    monkeypatch.setattr(os, "fsync", watched)
    before = os.umask(0)
    try:
        save_key(held)
    finally:
        os.umask(before)
    assert seen == [(f".{KEY}.new", 0o600), ("open file", 0o600)]


@on_posix
def test_wider_permission_is_told_and_narrowed(study: SmallStudy) -> None:
    """The next build takes from others what somebody gave them."""
    build(study.folder / "study.toml")
    (study.folder / KEY).chmod(0o644)
    result = build(study.folder / "study.toml")
    assert (
        f"warning: {KEY}: others on this computer could read the key to the pseudonyms; that is "
        "taken from them now; expected a file that its owner alone may read\n"
        "    fix: find out who may have read it; with the key every pseudonym can be told"
    ) in result.findings.lines()
    assert mode_of(study.folder / KEY) == 0o600


def refuse(*_given: object) -> None:
    """What the system says of somebody else's file."""
    raise PermissionError(1, "Operation not permitted")


@on_posix
def test_permission_that_is_not_ours_to_narrow_is_told(
    study: SmallStudy, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A key that somebody else shares with a group is read; the build goes on."""
    build(study.folder / "study.toml")
    (study.folder / KEY).chmod(0o640)
    monkeypatch.setattr(Path, "chmod", refuse)
    ran = study.run("build", "study.toml")
    assert ran.exit_code == 0
    assert (
        f"warning: {KEY}: others on this computer could read the key to the pseudonyms, and you "
        "may not take that from them; expected a file that its owner alone may read\n"
        "    fix: ask the owner of the file who may read it; with the key every pseudonym can be "
        "told\n"
    ) in ran.stdout
    assert f"stands in {KEY}; others may read it, too." in ran.stdout
    assert mode_of(study.folder / KEY) == 0o640


@on_posix
def test_key_of_somebody_else_stays_theirs(
    study: SmallStudy, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where a reader is added and the new file cannot be its owner's, the build is refused."""
    build(study.folder / "study.toml")
    before = (study.folder / KEY).read_bytes()
    text = (study.folder / "logs/P01.tsv").read_text(encoding="utf-8")
    study.write("logs/P00.tsv", text.replace("P01", "P00"))
    whose = os.fstat

    def somebody_else(descriptor: int) -> os.stat_result:
        """The state of an open file, as if another user had made it."""
        seen = whose(descriptor)
        return os.stat_result([*seen[:4], seen.st_uid + 1, *seen[5:10]])

    monkeypatch.setattr("etl.session.pseudonym_owner.os.fstat", somebody_else)
    monkeypatch.setattr("etl.session.pseudonym_owner.os.fchown", refuse)
    assert (
        f"{KEY}: the key to the pseudonyms cannot be written (Operation not permitted); expected a "
        "file of your own, in a folder in which you may write: readers or logs were added\n"
        "    fix: let the owner of the file build the study, or see that you may write in its "
        "folder, and close the key in other programs\n"
    ) in study.refusal()
    assert (study.folder / KEY).read_bytes() == before
    assert [path.name for path in study.folder.glob(f"*{KEY}*")] == [KEY]


@pytest.mark.parametrize("how", ["gone", "another"])
def test_build_that_gives_other_pseudonyms_than_the_last_says_so(
    study: SmallStudy, how: str
) -> None:
    """A key that was moved or mixed up is missed before the tables are handed on."""
    build(study.folder / "study.toml")
    (study.folder / KEY).unlink()
    if how == "another":
        build(study.folder / "study.toml", study.folder / "elsewhere")
    said = study.run("build", "study.toml").stdout
    assert (
        f"warning: {KEY}: the last build in the output folder had another key, so every reader and "
        "log has another pseudonym now; expected the key of the last build\n"
        "    fix: if the key was moved, renamed or lost, put it back under this name and build "
        "again before you hand tables on: they do not go with those handed on before\n"
    ) in said
    assert "another key" not in study.run("build", "study.toml").stdout


def test_key_put_back_gives_the_first_pseudonyms_again(study: SmallStudy) -> None:
    """What the warning advises helps."""
    build(study.folder / "study.toml")
    first = (study.folder / "out/outcomes.parquet").read_bytes()
    key = (study.folder / KEY).read_bytes()
    (study.folder / KEY).unlink()
    build(study.folder / "study.toml")
    assert (study.folder / "out/outcomes.parquet").read_bytes() != first
    study.write(KEY, key)
    build(study.folder / "study.toml")
    assert (study.folder / "out/outcomes.parquet").read_bytes() == first


def test_record_knows_the_key_again_and_tells_nothing_of_it(study: SmallStudy) -> None:
    """Sixteen signs of a keyed digest; none where readers go by their ids."""
    record = json.loads((build(study.folder / "study.toml").folder / "run.json").read_text("utf-8"))
    key = bytes.fromhex(rows_of(study)[1][2])
    assert record["pseudonyms_of_key"] == signs_of(key, "record", "", 16)
    assert record["pseudonyms_of_key"][:8] != rows_of(study)[1][1]
    study.change("study.toml", "pseudonyms = true", "pseudonyms = false")
    record = json.loads((build(study.folder / "study.toml").folder / "run.json").read_text("utf-8"))
    assert "pseudonyms_of_key" not in record


@on_posix
def test_check_tells_of_a_wider_permission_and_changes_nothing(study: SmallStudy) -> None:
    """A check writes nothing, permissions among it."""
    build(study.folder / "study.toml")
    (study.folder / KEY).chmod(0o640)
    findings = etl.check(etl.load_study("study.toml"))
    assert any("could read the key to the pseudonyms; expected" in f for f in findings.lines())
    assert mode_of(study.folder / KEY) == 0o640


def test_pseudonyms_stay_and_new_readers_are_added(study: SmallStudy) -> None:
    """Another build gives the same pseudonyms; a reader who comes later gets one too."""
    build(study.folder / "study.toml")
    before = rows_of(study)
    first = tables_of(study.folder / "out")
    build(study.folder / "study.toml")
    assert rows_of(study) == before
    assert tables_of(study.folder / "out") == first
    study.write("logs/P00.tsv", (study.folder / "logs/P01.tsv").read_text().replace("P01", "P00"))
    build(study.folder / "study.toml")
    after = rows_of(study)
    assert [row for row in before[:-1] if row not in after] == []
    assert {row[2] for row in after[2:-1]} - {row[2] for row in before} == {"P00", "logs/P00.tsv"}


def test_readers_who_are_gone_stay_in_the_key(study: SmallStudy) -> None:
    """Whose a pseudonym of an earlier build is can still be told."""
    build(study.folder / "study.toml")
    before = rows_of(study)
    (study.folder / "logs/P02.tsv").unlink()
    build(study.folder / "study.toml")
    assert rows_of(study) == before


def test_build_that_fails_writes_no_key(study: SmallStudy) -> None:
    """The key is written when everything else is done."""
    study.add("logs/P01.tsv", "P01\t2\tplum\tsoon\t200\t50\t25\n")
    study.refusal()
    assert not (study.folder / KEY).exists()


def test_check_needs_and_writes_no_key(study: SmallStudy) -> None:
    """A check works before the first build, and twice says the same."""
    one = study.run("check", "study.toml")
    assert (one.exit_code, (study.folder / KEY).exists()) == (0, False)
    assert study.run("check", "study.toml").stdout == one.stdout


def test_without_the_key_in_the_study_file_no_key_is_written(study: SmallStudy) -> None:
    """Where readers go by their ids there is nothing to keep."""
    study.change("study.toml", "pseudonyms = true", "pseudonyms = false")
    result = build(study.folder / "study.toml")
    assert not (study.folder / KEY).exists()
    assert result.key is None
    assert set(result.fixations["participant"]) == {"P01", "P02"}


def changed(text: str, number: int, old: str, new: str) -> str:
    """A text with one of its lines changed."""
    lines = text.split("\n")
    assert old in lines[number - 1]
    lines[number - 1] = lines[number - 1].replace(old, new)
    return "\n".join(lines)


def with_last_digit(text: str, digit: str) -> str:
    """A key file with another last digit of the key."""
    header, key, rest = text.split("\n", 2)
    return "\n".join([header, key[:-1] + digit, rest])


@pytest.mark.parametrize(
    ("damage", "line", "problem"),
    [
        pytest.param(lambda t: t[:0], 1, "the header is not as it was written", id="emptied"),
        pytest.param(lambda t: t[:30], 2, "the key is not as it was written", id="cut in the key"),
        pytest.param(
            lambda t: changed(t, 1, "kind", "Kind"),
            1,
            "the header is not as it was written",
            id="another header",
        ),
        pytest.param(
            lambda t: with_last_digit(t, "g"),
            2,
            "the key is not as it was written",
            id="no digit of a key",
        ),
        pytest.param(
            lambda t: with_last_digit(t, "1" if t.split("\n")[1].endswith("0") else "0"),
            2,
            "the key is not as it was written",
            id="another key",
        ),
        pytest.param(
            lambda t: changed(t, 3, ",P01", ",P03"),
            3,
            "this row is not as it was written",
            id="another reader",
        ),
        pytest.param(
            lambda t: changed(t, 4, "reader,R", "reader,S"),
            4,
            "this row is not as it was written",
            id="another pseudonym",
        ),
        pytest.param(
            lambda t: changed(t, 5, "log,", "file,"),
            5,
            "this row is not as it was written",
            id="another kind",
        ),
        pytest.param(
            lambda t: changed(t, 6, ",logs/P02.tsv", ""),
            6,
            "this row is not as it was written",
            id="a cell is gone",
        ),
        pytest.param(
            lambda t: "".join(line for line in t.splitlines(True) if "P02" not in line),
            5,
            "rows were added or are missing, or the last one is",
            id="rows are gone",
        ),
        pytest.param(
            lambda t: t.rpartition("end")[0],
            6,
            "rows were added or are missing, or the last one is",
            id="the end is gone",
        ),
        pytest.param(lambda t: t.replace("P02", '"P02', 1), 4, "this row is damaged", id="quote"),
    ],
)
def test_changed_key_file_is_refused_with_its_line(
    study: SmallStudy, damage: Callable[[str], str], line: int, problem: str
) -> None:
    """Never is a new key taken silently: every pseudonym would be another."""
    build(study.folder / "study.toml")
    path = study.folder / KEY
    path.write_text(damage(path.read_text(encoding="utf-8")), encoding="utf-8", newline="\n")
    for command in ("build", "check", "trace"):
        before = study.content()
        words = ["P01", "1"] if command == "trace" else []
        result = study.run(command, "study.toml", *words)
        assert result.exit_code == 2
        assert result.stderr.splitlines()[0] == (
            f"{KEY}:{line}: in the key to the pseudonyms, {problem}"
        )
        assert study.content() == before


def test_refusal_repeats_nothing_of_the_key(study: SmallStudy) -> None:
    """What is said of a damaged file may be copied to others."""
    build(study.folder / "study.toml")
    key = rows_of(study)[1][2]
    study.write(KEY, (study.folder / KEY).read_text().replace(key, key[:-2] + "zz"))
    assert key[:8] not in study.run("build", "study.toml").stderr


def test_key_file_that_is_no_text_is_refused(study: SmallStudy) -> None:
    """Bytes that are no UTF-8 are told with their line."""
    build(study.folder / "study.toml")
    study.write(KEY, (study.folder / KEY).read_bytes().replace(b"P02", b"P\xff2", 1))
    refused = study.run("build", "study.toml").stderr
    assert f"{KEY}:4: in the key to the pseudonyms, this is no text in UTF-8" in refused


def test_key_file_that_a_spreadsheet_saved_is_read(study: SmallStudy) -> None:
    """A byte-order mark and other line ends change nothing; the next build writes it anew."""
    build(study.folder / "study.toml")
    plain = (study.folder / KEY).read_bytes()
    study.write(KEY, b"\xef\xbb\xbf" + plain.replace(b"\n", b"\r\n"))
    build(study.folder / "study.toml")
    assert (study.folder / KEY).read_bytes() == plain


def test_id_that_a_spreadsheet_would_run_is_kept(study: SmallStudy) -> None:
    """An id that looks like a formula is made safe in the file, and read back as it was."""
    text = (study.folder / "logs/P02.tsv").read_text(encoding="utf-8")
    study.write("logs/P02.tsv", text.replace("P02", "=P02"))
    build(study.folder / "study.toml")
    assert [row[2] for row in rows_of(study)[2:4]] == ["'=P02", "P01"]
    first = tables_of(study.folder / "out")
    build(study.folder / "study.toml")
    assert tables_of(study.folder / "out") == first


@pytest.mark.parametrize("into", [".", "..", "../.."])
def test_output_folder_that_would_hold_the_key_is_refused(study: SmallStudy, into: str) -> None:
    """The output folder is handed on as a whole."""
    assert (
        f"{into}: the key to the pseudonyms would lie in the output folder; expected an output "
        "folder that does not hold the study file\n"
        "    fix: name another folder, by [output] folder or --into\n"
    ) in study.refusal("--into", into)


def test_folder_of_the_study_as_output_folder_is_refused(study: SmallStudy) -> None:
    """Also where the study file names it."""
    study.change("study.toml", "pseudonyms = true", 'pseudonyms = true\nfolder = "../x/.."')
    assert "the key to the pseudonyms would lie in the output folder" in study.refusal()


def test_key_is_no_log(study: SmallStudy) -> None:
    """Where logs lie beside the study file, the key is not read, and not told of either."""
    for name in ("P01", "P02"):
        (study.folder / f"logs/{name}.tsv").rename(study.folder / f"{name}.csv")
    study.change("study.toml", "logs/*.tsv", "*0*.csv")
    build(study.folder / "study.toml")
    study.change("study.toml", "*0*.csv", "P*.csv")
    build(study.folder / "study.toml")
    study.change("study.toml", "P*.csv", "[Ps]*.csv")
    assert study.run("check", "study.toml").exit_code == 0
    study.change("study.toml", "pseudonyms = true", "pseudonyms = false")
    result = study.run("check", "study.toml")
    assert (result.exit_code, KEY in result.stdout) == (0, False)


def test_two_first_builds_do_not_part_ways(study: SmallStudy) -> None:
    """A build whose key somebody else has written meanwhile stops: its pseudonyms are others."""
    loaded, none = etl.load_study("study.toml"), etl.Findings()
    one = open_key(loaded, none, target=study.folder / "out")
    other = open_key(loaded, none, target=study.folder / "out")
    assert isinstance(one, KeyFile)
    assert isinstance(other, KeyFile)
    save_key(one)
    with pytest.raises(etl.DataError, match="another build has written the key"):
        save_key(other)


def test_key_file_that_cannot_be_read_is_refused(study: SmallStudy) -> None:
    """A folder in its place, say."""
    (study.folder / KEY).mkdir()
    assert f"{KEY}: the key to the pseudonyms cannot be read (" in study.refusal()


def test_key_file_that_cannot_be_written_is_refused(
    study: SmallStudy, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Then nothing is published, and no part of the file is left behind."""

    def full(_descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    # For this file only: the output is brought to the disk before.
    own = types.SimpleNamespace(**{**vars(os), "fsync": full})
    monkeypatch.setattr(pseudonym_owner, "os", own)
    assert (
        f"{KEY}: the key to the pseudonyms cannot be written (No space left on device)"
    ) in study.refusal()


def test_build_says_where_the_key_is(study: SmallStudy) -> None:
    """The last lines of a build tell of the key, and who may read it."""
    said = study.run("build", "study.toml").stdout.splitlines()[-2:]
    alone = "its owner alone may read it" if os.name == "posix" else "its folder says who may"
    assert said == [
        f"Whose the pseudonyms are stands in {KEY}; {alone}.",
        "Keep it apart from the tables.",
    ]
