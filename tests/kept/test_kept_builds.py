"""Builds that find what earlier ones kept: the same bytes, and no more work than is needed."""

from __future__ import annotations

import itertools
import json
import os
import pickle
import random
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import CliRunner

import etl
from etl.cli import main
from etl.parsers.table_log import TableReader
from etl.session import group_work, reader_groups, work
from etl.session.bench import Bench
from etl.session.kept_store import GROUP, LOG, KeptStore, head_of
from etl.session.reader import GroupTables, ReaderGroup
from tests.simulator import write_bulk_study

Files = dict[str, bytes]


@pytest.fixture
def study_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A study of twelve readers, in groups of about three."""
    monkeypatch.setattr(reader_groups, "FIXATIONS_A_GROUP", 150)
    made = write_bulk_study(tmp_path / "lab", readers=12, trials=5, fixations=9, regions=4)
    return made.study_file


@pytest.fixture
def parsed(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The names of the logs that are parsed."""
    names: list[str] = []
    real = TableReader.read

    def read(self: TableReader, path: Path, *rest: object) -> object:
        names.append(path.name)
        return real(self, path, *rest)  # type: ignore[arg-type]

    monkeypatch.setattr(TableReader, "read", read)
    return names


@pytest.fixture
def worked_on(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The readers that are worked on for the tables."""
    names: list[str] = []
    real = Bench.tables

    def tables(self: Bench, group: ReaderGroup, *, page: bool = True) -> GroupTables:
        if page:
            names.extend(group.participants)
        return real(self, group, page=page)

    monkeypatch.setattr(Bench, "tables", tables)
    return names


def files_of(folder: Path) -> Files:
    """All files of a folder; how long a build took is no part of it."""
    found = {}
    for path in sorted(folder.rglob("*")):
        if path.is_file():
            data = path.read_bytes()
            if path.name == "run.json":
                record = json.loads(data)
                del record["elapsed_s"]
                for name in [name for name in record["sha256"] if name.endswith("run.json")]:
                    del record["sha256"][name]
                data = json.dumps(record).encode()
            found[path.relative_to(folder).as_posix()] = data
    return found


def build(study_file: Path, **options: object) -> Files:
    """Build into the usual place, where earlier builds have left what they keep."""
    study = etl.load_study(study_file)
    return files_of(etl.build(study, **options).folder)  # type: ignore[arg-type]


def fresh(study_file: Path, into: Path) -> Files:
    """Build into a new place, without anything kept."""
    study = etl.load_study(study_file)
    made = files_of(etl.build(study, into=into, keep=False).folder)
    shutil.rmtree(into)
    return made


def kept_of(study_file: Path) -> Path:
    """Where builds keep what they keep."""
    return study_file.parent / "out.kept"


def names_in(folder: Path) -> set[str]:
    """What lies in a folder."""
    return {path.name for path in folder.iterdir()}


def edit(path: Path, before: str, after: str) -> None:
    """Change a text file."""
    text = path.read_text(encoding="utf-8")
    assert before in text
    path.write_text(text.replace(before, after, 1), encoding="utf-8")


def add_limit(study_file: Path, under_ms: int) -> None:
    """A screening limit."""
    text = study_file.read_text(encoding="utf-8").split("[screening")[0]
    study_file.write_text(f"{text}[screening.fixations]\nunder_ms = {under_ms}\n", encoding="utf-8")


def add_reader(study_file: Path, like: str, new: str) -> None:
    """One reader more, with the trials of another."""
    log = study_file.parent / "logs" / f"{like}.tsv"
    text = log.read_text(encoding="utf-8").replace(like, new)
    log.with_name(f"{new}.tsv").write_text(text, encoding="utf-8")
    trials = study_file.parent / "trial_list.csv"
    lines = trials.read_text(encoding="utf-8").splitlines(keepends=True)
    more = [line.replace(like, new) for line in lines if like in line]
    trials.write_text("".join([*lines, *more]), encoding="utf-8")


def test_same_study_again_parses_and_computes_nothing(
    study_file: Path, parsed: list[str], worked_on: list[str], tmp_path: Path
) -> None:
    """And gives the same bytes, as a build without anything kept does."""
    first = build(study_file)
    assert len(parsed) == len(worked_on) == 12
    parsed.clear()
    worked_on.clear()
    assert build(study_file) == first
    assert (parsed, worked_on) == ([], [])
    assert fresh(study_file, tmp_path / "other") == first


def test_screening_limit_changed_parses_no_log(
    study_file: Path, parsed: list[str], worked_on: list[str], tmp_path: Path
) -> None:
    """Everybody is worked on again, from kept fixations."""
    build(study_file)
    parsed.clear()
    worked_on.clear()
    add_limit(study_file, 100)
    made = build(study_file)
    assert parsed == []
    assert len(worked_on) == 12
    assert made == fresh(study_file, tmp_path / "other")


@pytest.mark.parametrize("new", ["R05a", "A001", "Z001"])
def test_one_reader_more_is_the_only_one_parsed(
    study_file: Path, parsed: list[str], worked_on: list[str], tmp_path: Path, new: str
) -> None:
    """Of the others only those of the group are worked on."""
    build(study_file)
    parsed.clear()
    worked_on.clear()
    add_reader(study_file, "R05", new)
    made = build(study_file)
    assert parsed == [f"{new}.tsv"]
    assert new in worked_on
    assert len(worked_on) <= 8, "the group of the reader, and what is cut anew beside it"
    worked_on.clear()
    assert made == fresh(study_file, tmp_path / "other")
    assert len(worked_on) == 13


def test_large_readers_are_worked_on_alone(
    study_file: Path,
    worked_on: list[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A reader who fills a group shares it with nobody."""
    monkeypatch.setattr(reader_groups, "FIXATIONS_A_GROUP", 30)
    build(study_file)
    worked_on.clear()
    add_reader(study_file, "R05", "R05a")
    build(study_file)
    assert worked_on == ["R05a"]


def test_log_of_the_same_size_and_time_but_other_content_is_read_again(
    study_file: Path, parsed: list[str], tmp_path: Path
) -> None:
    """By content, not by what the file system says."""
    first = build(study_file)
    parsed.clear()
    log = study_file.parent / "logs" / "R03.tsv"
    before = log.stat()
    lines = log.read_text(encoding="utf-8").splitlines(keepends=True)
    cells = lines[3].split("\t")
    cells[4] = str(int(cells[4]) + (1 if cells[4][-1] != "9" else -1))
    lines[3] = "\t".join(cells)
    log.write_text("".join(lines), encoding="utf-8")
    os.utime(log, ns=(before.st_atime_ns, before.st_mtime_ns))
    assert log.stat().st_size == before.st_size
    made = build(study_file)
    assert parsed == ["R03.tsv"]
    assert made != first
    assert made == fresh(study_file, tmp_path / "other")


DAMAGES: dict[str, Callable[[bytes], bytes]] = {
    "cut": lambda data: data[: len(data) // 2],
    "empty": lambda _: b"",
    "a byte changed": lambda data: data[:-9] + bytes([data[-9] ^ 1]) + data[-8:],
    "head changed": lambda data: data[:100] + bytes([data[100] ^ 1]) + data[101:],
    "something else": lambda _: b"PAR1" * 100,
}


@pytest.mark.parametrize("how", DAMAGES)
@pytest.mark.parametrize("ending", [LOG, GROUP])
def test_damaged_entries_count_as_none(study_file: Path, ending: str, how: str) -> None:
    """Whatever happened to them, the build is the same, and they are whole again after it."""
    first = build(study_file)
    sound = files_of(kept_of(study_file))
    for path in kept_of(study_file).glob(f"*{ending}"):
        path.write_bytes(DAMAGES[how](path.read_bytes()))
    assert build(study_file) == first
    assert files_of(kept_of(study_file)) == sound


def test_entries_under_each_others_names_count_as_none(study_file: Path, parsed: list[str]) -> None:
    """As a careless copy may leave them: whole, but not what their names say."""
    first = build(study_file)
    for ending in (LOG, GROUP):
        one, other, *_ = sorted(kept_of(study_file).glob(f"*{ending}"))
        here, there = one.read_bytes(), other.read_bytes()
        one.write_bytes(there)
        other.write_bytes(here)
    parsed.clear()
    assert build(study_file) == first
    assert len(parsed) == 2


def test_kept_folder_may_be_deleted(study_file: Path, parsed: list[str]) -> None:
    """It says so itself."""
    first = build(study_file)
    assert "safe to delete" in (kept_of(study_file) / "README.txt").read_text(encoding="utf-8")
    tag = (kept_of(study_file) / "CACHEDIR.TAG").read_text(encoding="utf-8")
    # Cache Directory Tagging Specification, https://bford.info/cachedir/ (from memory).
    assert tag.startswith("Signature: 8a477f597d28d172789f06886806bc55")
    shutil.rmtree(kept_of(study_file))
    parsed.clear()
    assert build(study_file) == first
    assert len(parsed) == 12


def test_only_what_the_last_build_used_is_kept(study_file: Path) -> None:
    """The folder does not grow."""
    build(study_file)
    names = names_in(kept_of(study_file))
    for limit in (90, 100, 110):
        add_limit(study_file, limit)
        build(study_file)
    after = names_in(kept_of(study_file))
    assert {name for name in after if name.endswith(LOG)} == {
        name for name in names if name.endswith(LOG)
    }
    assert len(after) == len(names)


def test_build_that_fails_keeps_nothing_new(study_file: Path) -> None:
    """What was kept stays as it was, and where nothing was, nothing is written."""
    log = study_file.parent / "logs" / "R03.tsv"
    sound = log.read_text(encoding="utf-8")
    log.write_text(sound.replace("\t1\t1\t", "\t1\tone\t", 1), encoding="utf-8")
    with pytest.raises(etl.DataError):
        build(study_file)
    assert not kept_of(study_file).exists()
    log.write_text(sound, encoding="utf-8")
    build(study_file)
    before = files_of(kept_of(study_file))
    log.write_text(sound.replace("\t1\t1\t", "\t1\tone\t", 1), encoding="utf-8")
    with pytest.raises(etl.DataError):
        build(study_file)
    assert files_of(kept_of(study_file)) == before


def test_keep_can_be_refused(study_file: Path) -> None:
    """Nothing is kept, nothing that was is used."""
    build(study_file, keep=False)
    assert not kept_of(study_file).exists()
    ran = CliRunner().invoke(main, ["build", str(study_file), "--no-keep"])
    assert ran.exit_code == 0, ran.output
    assert not kept_of(study_file).exists()


def test_check_writes_nothing(study_file: Path) -> None:
    """Nor does it keep anything."""
    before = set(study_file.parent.rglob("*"))
    etl.check(etl.load_study(study_file))
    assert set(study_file.parent.rglob("*")) == before


def test_where_readers_have_pseudonyms_kept_logs_lie_with_the_key(
    study_file: Path, tmp_path: Path, parsed: list[str]
) -> None:
    """What is kept names readers by id; the place of the output is for who must not know them."""
    into = tmp_path / "sent"
    etl.build(etl.load_study(study_file), into=into)
    assert names_in(tmp_path) == {"lab", "sent", "sent.kept"}
    edit(study_file, "[output]\n", "[output]\npseudonyms = true\n")
    study = etl.load_study(study_file)
    first = files_of(etl.build(study, into=into).folder)
    assert names_in(tmp_path) == {"lab", "sent"}, "what was kept without pseudonyms is gone"
    assert (study_file.parent / "sent.kept").is_dir()
    parsed.clear()
    assert files_of(etl.build(study, into=into).folder) == first
    assert parsed == []


class Harmful:
    """What runs code where it is unpickled without care."""

    def __reduce__(self) -> tuple[object, tuple[str]]:
        return os.mkdir, ("/nonexistent/harm",)


def test_no_code_runs_from_a_kept_entry(tmp_path: Path) -> None:
    """Whoever can write the folder can only spoil it."""
    store = KeptStore(tmp_path / "earlier", tmp_path)
    path = store.put(f"a{LOG}", Harmful())
    with pytest.raises(pickle.UnpicklingError, match="names"):
        head_of(path)
    assert store.head(f"a{LOG}") is None


@pytest.mark.parametrize("seed", range(4))
def test_any_edits_give_what_a_fresh_build_gives(
    study_file: Path, tmp_path: Path, seed: int
) -> None:
    """Readers come and go, logs, facts, texts and settings change, one after the other."""
    source = random.Random(seed)
    folder, numbers = study_file.parent, itertools.count()
    build(study_file)

    def readers() -> list[str]:
        return sorted(path.stem for path in (folder / "logs").iterdir())

    def come() -> None:
        add_reader(study_file, source.choice(readers()), f"{source.choice('AQRZ')}{next(numbers)}x")

    def go() -> None:
        gone = source.choice(readers())
        (folder / "logs" / f"{gone}.tsv").unlink()
        trials = folder / "trial_list.csv"
        lines = trials.read_text(encoding="utf-8").splitlines(keepends=True)
        rest = [line for line in lines if not line.startswith(f"{gone},")]
        trials.write_text("".join(rest), encoding="utf-8")

    def limit() -> None:
        add_limit(study_file, source.choice([80, 100, 120]))

    def cut() -> None:
        log = folder / "logs" / f"{source.choice(readers())}.tsv"
        lines = log.read_text(encoding="utf-8").splitlines(keepends=True)
        del lines[source.randrange(2, len(lines) - 1)]
        log.write_text("".join(lines), encoding="utf-8")

    def layout() -> None:
        text = study_file.read_text(encoding="utf-8")
        old = next(line for line in text.splitlines() if line.startswith("left_px"))
        edit(study_file, old, f"left_px = {source.choice([190, 200, 205])}")

    def outcomes() -> None:
        text = study_file.read_text(encoding="utf-8")
        old = next(line for line in text.splitlines() if line.startswith("outcomes"))
        some = source.choice(['["binary"]', '["binary", "count", "duration"]', '["count"]'])
        edit(study_file, old, f"outcomes = {some}")

    for step in range(6):
        source.choice([come, go, limit, cut, layout, outcomes])()
        made = build(study_file, workers=1)
        assert made == fresh(study_file, tmp_path / "other"), step


def test_groups_are_named_by_all_that_they_hang_on(study_file: Path) -> None:
    """Another program, other libraries: other names."""
    build(study_file)
    names = names_in(kept_of(study_file))
    shutil.rmtree(kept_of(study_file))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(group_work, "program_digest", lambda: "another")
        build(study_file)
    other = names_in(kept_of(study_file))
    assert not {name for name in names & other if name.endswith(GROUP)}


def test_pseudonyms_are_known_from_whichever_log_is_left(study_file: Path, tmp_path: Path) -> None:
    """A reader with two logs, of which the first goes: the entry of the other names the reader."""
    edit(study_file, "[output]\n", "[output]\npseudonyms = true\n")
    logs = study_file.parent / "logs"
    whole = (logs / "R05.tsv").read_text(encoding="utf-8").splitlines(keepends=True)
    half = next(row for row, line in enumerate(whole) if line.startswith("R05\t3\t"))
    (logs / "R05.tsv").write_text("".join(whole[:half]), encoding="utf-8")
    (logs / "R05b.tsv").write_text("".join([whole[0], *whole[half:]]), encoding="utf-8")
    build(study_file)
    key = study_file.with_name("study_pseudonyms.csv")
    assert ",R05" in key.read_text(encoding="utf-8")
    (logs / "R05.tsv").unlink()
    trials = study_file.parent / "trial_list.csv"
    lines = trials.read_text(encoding="utf-8").splitlines(keepends=True)
    gone = ("R05,1,", "R05,2,")
    trials.write_text("".join(x for x in lines if not x.startswith(gone)), encoding="utf-8")
    answers: list[dict[str, str]] = []
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(
            work.LogWork,
            "__call__",
            lambda self, tasks, real=work.LogWork.__call__: [
                answers.append(answer.originals) or answer for answer in real(self, tasks)
            ],
        )
        made = build(study_file)
    assert made == fresh(study_file, tmp_path / "other")
    assert sum("R05" in given.values() for given in answers) == 1
