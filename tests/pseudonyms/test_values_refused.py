"""Values that would tell of whom a row is are refused, with their place and a way out."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.bad_input.small_study import REGIONS, SmallStudy, log

WAY_OUT = (
    "    fix: rename the values in all files in which they stand; or leave the column out of the "
    "study, or set pseudonyms = false\n"
)
#: Four readers with an id that can be found in a text.
READERS = ("Quillfeather07", "Brambleton12", "95123", "7")


@pytest.fixture
def study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> SmallStudy:
    """A tiny study of four readers, with a table of readers, that asks for pseudonyms."""
    made = SmallStudy.sound(tmp_path)
    for name in ("P01", "P02"):
        (tmp_path / f"logs/{name}.tsv").unlink()
    for reader in READERS:
        made.write(f"logs/{reader}.tsv", log(reader))
    made.change("study.toml", "[regions]", "[output]\npseudonyms = true\n\n[regions]")
    monkeypatch.chdir(tmp_path)
    return made


def give_fact(study: SmallStudy, values: tuple[str, ...], *, key: str = "covariates") -> None:
    """A fact about each reader, as a factor or a covariate."""
    study.add(
        "study.toml", f'\n[participants]\ntable = "who.csv"\n[trials]\n{key} = ["nickname"]\n'
    )
    rows = [f"{reader},{value}" for reader, value in zip(READERS, values, strict=True)]
    study.write("who.csv", "\n".join(["participant,nickname", *rows, ""]))


@pytest.mark.parametrize("key", ["factors", "covariates"])
@pytest.mark.parametrize(
    "value",
    [
        "Quillfeather07",
        "quillfeather07",
        "friend of Brambleton12",
        "room_95123",
        "likeBRAMBLETON12x",
    ],
    ids=["the id", "in other letters", "of another reader", "a number in a text", "in a word"],
)
def test_fact_that_holds_an_id_is_refused(study: SmallStudy, key: str, value: str) -> None:
    """A level or a covariate would carry the id into every table."""
    give_fact(study, ("tall", value, "short", "tall"), key=key)
    assert study.refusal() == (
        'who.csv:3: column "nickname": a value of nickname holds the id of a reader, and readers '
        f'go by pseudonyms; found "{value}", expected values that tell of no reader\n'
        f"{WAY_OUT}1 problem; nothing was written\n"
    )


@pytest.mark.parametrize(
    "values",
    [("tall", "95123", "8", "7"), ("9", "8", "6", "5"), ("Quillfeather071", "a", "b", "c")],
    ids=["a number by itself", "other numbers", "another number"],
)
def test_fact_that_holds_no_id_is_taken(study: SmallStudy, values: tuple[str, ...]) -> None:
    """A number by itself is a number, and a longer one is another."""
    give_fact(study, values)
    assert study.run("build", "study.toml").exit_code == 0


@pytest.mark.parametrize(
    "values",
    [READERS, ("007", "012", "95123", "07")],
    ids=["ids", "the number in each id"],
)
def test_fact_that_is_the_id_is_refused(study: SmallStudy, values: tuple[str, ...]) -> None:
    """Also where single values could be anything: 7 is reader 7, in all rows."""
    values = tuple(value.removeprefix("Quillfeather") for value in values)
    give_fact(study, values)
    said = study.refusal()
    assert 'column "nickname": the column nickname is that of the readers\' ids' in said
    assert said.startswith("who.csv:")
    assert WAY_OUT in said


def test_readers_column_as_a_fact_is_refused(study: SmallStudy) -> None:
    """The column of the log that names the readers would be a second column of readers."""
    study.add("study.toml", '\n[trials]\ncovariates = ["reader"]\n')
    assert 'column "reader": the column reader is that of the readers\' ids' in study.refusal()


def test_fact_that_holds_the_name_of_a_log_is_refused(study: SmallStudy) -> None:
    """Logs have other names in the tables, too."""
    (study.folder / "logs/7.tsv").rename(study.folder / "logs/monday_Zorblax.tsv")
    give_fact(study, ("tall", "see monday_zorblax.tsv", "short", "tall"))
    said = study.refusal()
    assert said.startswith(
        'who.csv:3: column "nickname": a value of nickname holds the name of a log, and readers go '
        'by pseudonyms; found "see monday_zorblax.tsv"'
    )


@pytest.mark.parametrize("key", ["factors", "covariates"])
@pytest.mark.parametrize("name", ["Brambleton12", "brambleton12", "isBrambleton12", "95123"])
def test_column_that_is_called_like_a_reader_is_refused(
    study: SmallStudy, key: str, name: str
) -> None:
    """Its name heads a column of every table."""
    give_fact(study, ("tall", "short", "tall", "short"), key=key)
    study.change("who.csv", "nickname", name)
    study.change("study.toml", '["nickname"]', f'["{name}"]')
    said = study.refusal()
    assert f"trials.{key}: a column is called like a reader, and readers go by pseudonyms" in said
    assert f'found "{name}", expected names that tell of no reader' in said
    assert "fix: rename the column in all files in which it stands" in said


def test_contrast_that_is_called_like_a_reader_is_refused(study: SmallStudy) -> None:
    """Its name is part of that of a column."""
    give_fact(study, ("tall", "short", "tall", "short"), key="factors")
    study.add(
        "study.toml",
        'levels.nickname = ["tall", "short"]\n[output.contrasts.nickname]\nBrambleton12 = [0, 1]\n',
    )
    said = study.refusal()
    assert "output.contrasts.nickname: a column is called like a reader" in said
    assert 'found "Brambleton12"' in said


def test_item_that_holds_an_id_is_refused(study: SmallStudy) -> None:
    """Items, trials and sessions are in every table as they are."""
    study.write("regions.csv", REGIONS.replace("plum", "plum 95123"))
    for reader in READERS:
        study.write(f"logs/{reader}.tsv", log(reader).replace("plum", "plum 95123"))
    said = study.refusal()
    assert 'column "item": a value of item holds the id of a reader' in said
    assert 'found "plum 95123"' in said
    assert "logs/" in said.splitlines()[0]


def test_trial_that_holds_an_id_is_refused(study: SmallStudy) -> None:
    """A lab may name its trials by reader and number."""
    text = log("Quillfeather07").replace("\t2\tplum", "\tQuillfeather07-2\tplum")
    study.write("logs/Quillfeather07.tsv", text)
    said = study.refusal()
    assert said.startswith(
        'logs/Quillfeather07.tsv:5: column "trial": a value of trial holds the id of a reader'
    )
    assert 'found "Quillfeather07-2"' in said


def test_region_that_is_called_like_a_reader_is_refused(study: SmallStudy) -> None:
    """Names of regions are in every table, too."""
    study.write("regions.csv", REGIONS.replace("verb", "Brambleton12"))
    assert study.refusal() == (
        'regions.csv: the name of a region holds the id of a reader; found "Brambleton12", '
        "expected names that tell of no reader, since readers go by pseudonyms\n"
        "    fix: rename the region\n1 problem; nothing was written\n"
    )


def test_without_pseudonyms_every_value_is_taken(study: SmallStudy) -> None:
    """Where readers go by their ids nothing is hidden."""
    study.change("study.toml", "pseudonyms = true", "pseudonyms = false")
    give_fact(study, READERS, key="factors")
    assert study.run("build", "study.toml").exit_code == 0


def test_two_readers_of_one_pseudonym_stop_the_build(
    study: SmallStudy, monkeypatch: pytest.MonkeyPatch
) -> None:
    """With pseudonyms of one sign two of fifty readers must share one."""
    monkeypatch.setattr("etl.pseudonyms.READER_SIGNS", 1)
    for number in range(50):
        study.write(f"logs/{number}.tsv", log(str(100 + number)))
    said = study.refusal()
    assert "two readers would have the same pseudonym; found " in said
    assert "fix: move the key to the pseudonyms away and build again" in said
