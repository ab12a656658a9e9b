"""No id, and no name of a log, is in anything that a build with pseudonyms writes."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import openpyxl
import pyarrow.parquet as pq
import pytest

import etl
from etl.pseudonyms import is_reader
from etl.session import Result
from tests.end_to_end.building import TABLES, build, rows_of
from tests.pseudonyms.named_study import (
    DISTINCTIVE,
    ELSEWHERE,
    NEVER,
    READERS,
    STUDY,
    log_of,
    trial_list,
    write_study,
)
from tests.pseudonyms.searching import ask_for_pseudonyms, found_in, with_ids
from tests.simulator.dialects import DIALECTS, RecordedStudy, recorded_study

#: Readers of the tables, of [logs.where] and of [trials] skip whom no log of the study shows.
OTHERS = (NEVER, ELSEWHERE, "Gone77", "Missing66")
#: Such as dialects that say the reader in the name of a log can write.
IDS = tuple(f"P7044{number}7" for number in range(1, 7))


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Result:
    """The study that names its readers wherever it can, built."""
    return build(write_study(tmp_path_factory.mktemp("named")))


def key_of(result: Result) -> dict[str, str]:
    """What each reader and each file is called, by the key file."""
    assert result.key is not None
    with result.key.open(encoding="utf-8", newline="") as file:
        return {row["stands_for"]: row["name"] for row in csv.DictReader(file) if row["name"]}


def record_of(result: Result) -> dict[str, object]:
    """The run record."""
    record: dict[str, object] = json.loads((result.folder / "run.json").read_text("utf-8"))
    return record


def test_search_finds_what_is_there(tmp_path: Path) -> None:
    """The very same search finds every id where the study asks for no pseudonyms."""
    study_file = write_study(tmp_path)
    text = study_file.read_text(encoding="utf-8")
    study_file.write_text(text.replace("pseudonyms = true", "pseudonyms = false"), encoding="utf-8")
    found = found_in(build(study_file).folder, [*DISTINCTIVE, *OTHERS])
    assert set(DISTINCTIVE) <= set(found["outcomes.parquet"]) | {"Lindqvist"}
    assert set(found["run.json"]) == {*DISTINCTIVE, *OTHERS}
    assert {"audit.html", "fixations.parquet", "log_accounts.csv", "exclusions.csv"} <= set(found)


def test_no_id_is_in_any_file(built: Result) -> None:
    """Columns, names of files, notes, lists, sheets, titles: nothing is left."""
    assert found_in(built.folder, [*DISTINCTIVE, *OTHERS]) == {}


@pytest.mark.parametrize("table", TABLES)
def test_every_reader_of_a_table_is_a_pseudonym(built: Result, table: str) -> None:
    """Also those whose ids are too short to be looked for in bytes."""
    readers = {row["participant"] for row in rows_of(built.folder, table)}
    assert readers
    assert readers <= {key_of(built)[reader] for reader in READERS}
    assert all(map(is_reader, readers))


@pytest.mark.parametrize("name", ["exclusions.csv", "accounts.csv"])
def test_every_reader_of_ledger_and_accounts_is_a_pseudonym(built: Result, name: str) -> None:
    """The ledger and the balance name the same readers."""
    with (built.folder / name).open(encoding="utf-8", newline="") as file:
        readers = {row["participant"] for row in csv.DictReader(file)}
    assert readers - {"(all)"} <= {key_of(built)[reader] for reader in READERS}


def test_logs_have_names_in_an_order_of_their_own(built: Result) -> None:
    """Accounts of the logs, the record and the dictionary of the table: sorted by the new name."""
    with (built.folder / "log_accounts.csv").open(encoding="utf-8", newline="") as file:
        accounts = list(dict.fromkeys(row["source_file"] for row in csv.DictReader(file)))
    inputs = record_of(built)["inputs"]
    assert isinstance(inputs, list)
    recorded = [one["file"] for one in inputs if one["role"] == "log"]
    expected = sorted(key_of(built)[f"logs/{reader}.tsv"] for reader in READERS)
    assert accounts == recorded == expected


def test_dictionary_of_logs_does_not_tell_their_order(built: Result) -> None:
    """The codes by which a table stores the names of logs are in the order of the new names."""
    path = built.folder / "fixations.parquet"
    with pq.ParquetFile(path, read_dictionary=["source_file"]) as file:
        stored = file.read().column("source_file").chunk(0).dictionary.to_pylist()
    assert stored == sorted(stored)


def test_record_tells_of_readers_by_pseudonym(built: Result) -> None:
    """The study as understood: readers of tables, of eyes, of skipped trials; no name of a log."""
    key, study = key_of(built), record_of(built)["study"]
    assert isinstance(study, dict)
    assert study["title"] == f"How {key['Quillfeather07']} and others read"
    assert study["logs"]["files"] == ["withheld: pseudonyms"]
    assert study["logs"]["eye"]["readers"] == dict.fromkeys(
        sorted([key["Quillfeather07"], key["Brambleton-12"]]), "L"
    )
    assert study["logs"]["where"] == {
        "reader": sorted(key[name] for name in (*READERS, "Gone77")),
    }
    assert study["trials"]["skip"]["participant"] == sorted([key["8"], key["Missing66"]])
    assert study["trials"]["skip"]["owner"] == [f"of {key['94417']}"]
    assert study["participants"]["table"] == key["readers Quillfeather07.xlsx#Brambleton-12"]
    assert study["screening"]["trials"]["notes"] == key["notes_Brambleton-12.csv"]


def test_trials_that_were_not_recorded_are_listed_by_pseudonym(built: Result) -> None:
    """In an order that is not that of the trial list."""
    key = key_of(built)
    trials = [f"participant {key['Brambleton-12']}, trial 5", f"participant {key[NEVER]}, trial 1"]
    assert record_of(built)["not_recorded"] == sorted(trials)


def test_record_has_keyed_digests_where_readers_are(built: Result) -> None:
    """Nobody can try what a list of readers holds; texts everybody may compare."""
    inputs = record_of(built)["inputs"]
    assert isinstance(inputs, list)
    plain = [one["role"] for one in inputs if "sha256" in one]
    assert plain == ["regions"]
    assert all(len(one["hmac_sha256"]) == 64 for one in inputs if one["role"] != "regions")


def test_record_names_no_line_of_a_list_of_readers(built: Result) -> None:
    """The seventh row of the table of readers may be the seventh reader."""
    key, warnings = key_of(built), record_of(built)["warnings"]
    assert isinstance(warnings, list)
    told = key["readers Quillfeather07.xlsx#Brambleton-12"]
    never = f'warning: {told}: the reader is in the table but in no log; found "{key[NEVER]}"'
    assert never in warnings
    spoken = (
        "warning: readers Quillfeather07.xlsx#Brambleton-12:8: the reader is in the table but in "
        f'no log; found "{NEVER}"'
    )
    assert spoken in built.findings.lines()


def test_what_notes_say_is_withheld(built: Result) -> None:
    """The ledger has a row for each note, with its file, and nothing of what was written."""
    with (built.folder / "exclusions.csv").open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["rule"].endswith("notes")]
    name = key_of(built)["notes_Brambleton-12.csv"]
    assert {row["rule"] for row in rows} == {"notes", "participant_notes"}
    assert {(row["observed"], row["limit"]) for row in rows} == {("withheld: pseudonyms", name)}
    assert found_in(built.folder, ["sneezed", "came in", "to stop"]) == {}


def test_console_says_once_that_reasons_of_notes_are_left_out(built: Result) -> None:
    """Nobody wonders where the reasons are."""
    said = [line for line in built.findings.lines() if "the reasons in the notes" in line]
    assert len(said) == 1
    assert said[0] == (
        "note: notes_Brambleton-12.csv: readers go by pseudonyms, so the reasons in the notes are "
        "left out of the output; the tables say which trials and readers have a note"
    )


def test_notes_that_give_no_reason_are_told_so(tmp_path: Path) -> None:
    """An empty cell hides nothing."""
    notes = {"notes_Brambleton-12.csv": "participant,trial,reason\nQuillfeather07,2,\n"}
    result = build(write_study(tmp_path, notes))
    with (result.folder / "exclusions.csv").open(encoding="utf-8", newline="") as file:
        told = [row["observed"] for row in csv.DictReader(file) if row["rule"] == "notes"]
    assert told == ["no reason given"]


def test_codebook_does_not_promise_the_notes(built: Result) -> None:
    """It says that they are left out."""
    told = (built.folder / "codebook.md").read_text(encoding="utf-8")
    assert "What the experimenter's notes say is left out of `observed`" in told
    assert "as they were written" not in told


def test_free_words_of_the_study_lose_logs_and_words_around_ids(tmp_path: Path) -> None:
    """In the title, in skipped values, in the ledger's rows of these."""
    text = STUDY.replace("How Quillfeather07 and others read", "R94417 in spare_Zorblax1.tsv")
    text = text.replace('owner = ["of 94417"]', 'owner = ["spare_Zorblax1, R94417"]')
    text = text.replace('files = ["logs', 'files = ["spare_Zorblax1.tsv", "logs')
    trials = trial_list().replace("of 94417", '"spare_Zorblax1, R94417"')
    changes = {
        "study.toml": text,
        "trial_list.csv": trials + "".join(f"Gone77,{n},late,test,all\n" for n in range(1, 5)),
        "spare_Zorblax1.tsv": log_of("Gone77"),
    }
    study_file = write_study(tmp_path, changes)
    book = openpyxl.load_workbook(tmp_path / "readers Quillfeather07.xlsx")
    book.active.append(["Gone77", "visitor", 44, ""])
    book.save(tmp_path / "readers Quillfeather07.xlsx")
    result = build(study_file)
    assert found_in(result.folder, ["Zorblax1.tsv", "spare_Zorblax1", "94417"]) == {}


def test_words_for_nothing_and_for_remarks_are_withheld(tmp_path: Path) -> None:
    """A reader may be left out by them, and so be known to nobody; common marks are shown."""
    marks = (
        'missing = ["", ".", "NA", "-9999", "Absent44", "Zephyrine"]\ncomment = ["#", "Remark33"]\n'
    )
    text = STUDY.replace("\n[logs.columns]", f"{marks}\n[logs.columns]", 1)
    result = build(write_study(tmp_path, {"study.toml": text}))
    study = record_of(result)["study"]
    assert isinstance(study, dict)
    hidden = "withheld: pseudonyms"
    assert study["logs"]["missing"] == ["", ".", "NA", "-9999", hidden, hidden]
    assert study["logs"]["comment"] == ["#", hidden]
    assert found_in(result.folder, ["Absent44", "Zephyrine", "Remark33"]) == {}


def test_words_of_the_program_stay_what_they_are(tmp_path: Path) -> None:
    """A reader who is called like a key of study files does not change the record's keys."""
    changes = {
        "logs/regions.tsv": log_of("regions"),
        "trial_list.csv": trial_list()
        + "".join(f"regions,{trial},late,test,all\n" for trial in range(1, 5)),
    }
    text = STUDY.replace('"94417", 7', '"94417", "regions", 7')
    study_file = write_study(tmp_path, {**changes, "study.toml": text})
    book = openpyxl.load_workbook(tmp_path / "readers Quillfeather07.xlsx")
    book.active.append(["regions", "visitor", 44, ""])
    book.save(tmp_path / "readers Quillfeather07.xlsx")
    study = record_of(build(study_file))["study"]
    assert isinstance(study, dict)
    assert study["regions"]["kind"] == "boxes"


@pytest.fixture(scope="module")
def study() -> RecordedStudy:
    """Six readers of eight texts, with ids that can be looked for."""
    return with_ids(recorded_study(), IDS)


@pytest.mark.parametrize("dialect", list(DIALECTS))
def test_no_dialect_of_logs_lets_an_id_through(
    dialect: str, study: RecordedStudy, tmp_path: Path
) -> None:
    """However logs are written, their readers and their names are in no file of the output."""
    study_file = ask_for_pseudonyms(DIALECTS[dialect](study, tmp_path))
    before = {path.relative_to(tmp_path).as_posix() for path in tmp_path.rglob("*")}
    named = {path for path in before if any(one in path for one in IDS)}
    result = build(study_file)
    readers = result.trials["participant"].unique()
    assert len(readers) == len(IDS)
    assert all(map(is_reader, readers))
    assert found_in(result.folder, [*IDS, *named]) == {}
    assert all(name.startswith("log-") for name in result.fixations["source_file"])


def spoilt(text: str, *, number: int) -> str:
    """A log with something in it that is told of."""
    rows = text.split("\n")
    if number == 0:
        return "\n".join(f"{row}\tmore" if row else row for row in rows)
    if number == 1:
        return "# a remark\n#Brambleton-12\t1\tpear\t9\t9\t9\t9\tL\n" + text
    if number == 2:
        return "\n".join([rows[0], *rows[1:9]]) + "\n"
    return text.replace("\t25\t", "\t\t", 5)


def test_warnings_about_messy_logs_name_nobody(tmp_path: Path) -> None:
    """What is told of logs that differ stands in the record without ids and names of logs."""
    messy = {
        f"logs/{reader}.tsv": spoilt(log_of(reader), number=place)
        for place, reader in enumerate(READERS[:4])
    }
    result = build(write_study(tmp_path, messy))
    spoken = "\n".join(result.findings.lines())
    assert "logs/Quillfeather07.tsv" in spoken
    assert "logs/Brambleton-12.tsv" in spoken
    assert len(result.findings) > 15
    assert found_in(result.folder, [*DISTINCTIVE, *OTHERS]) == {}


def test_readers_alike_in_letter_case_are_told_apart_from_pseudonyms(tmp_path: Path) -> None:
    """The ids are compared, not what stands for them; the console has the ids."""
    changes = {
        "logs/p.tsv": log_of("quillfeather07"),
        "trial_list.csv": trial_list()
        + "".join(f"quillfeather07,{trial},late,test,all\n" for trial in range(1, 5)),
    }
    study_file = write_study(tmp_path, changes)
    text = study_file.read_text(encoding="utf-8")
    text = text.replace('["Quillfeather07", "Br', '["Quillfeather07", "quillfeather07", "Br')
    text = text.replace("[participants]\ntable", "[items]\ntable").replace(
        'column = "better"\n', ""
    )
    text = text.replace('"readers Quillfeather07.xlsx#Brambleton-12"', '"items.csv"')
    text = text.replace('"cue", "group"', '"cue"').replace('covariates = ["age"]\n', "")
    study_file.write_text(text, encoding="utf-8")
    (tmp_path / "items.csv").write_text("item\npear\nplum\n", encoding="utf-8")
    result = build(study_file)
    (told,) = [line for line in result.findings.lines() if "letter case" in line]
    assert told == (
        "warning: logs/p.tsv:3: two readers' ids differ in letter case or leading zeros only; "
        'found "quillfeather07", expected "Quillfeather07" as in logs/Quillfeather07.tsv:2, '
        "if this is the same reader"
    )
    warnings = record_of(result)["warnings"]
    assert isinstance(warnings, list)
    assert any("letter case" in line for line in warnings)
    assert found_in(result.folder, DISTINCTIVE) == {}


def test_python_gives_the_same_names_as_the_files(built: Result) -> None:
    """A program that asks for a table gets pseudonyms; findings are turned back as text only."""
    assert set(built.outcomes["participant"]) <= set(key_of(built).values())
    names = [finding.found or "" for finding in built.findings]
    assert not any("Quillfeather" in name for name in names if name)
    assert isinstance(built.findings, etl.Findings)
