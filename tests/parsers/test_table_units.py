"""Units in the header of a log: held against those of the study, never ignored."""

from pathlib import Path
from typing import Any

import pytest

from etl.errors import Findings
from etl.parsers import LogReader
from tests.parsers.reading import HEADER, read, reader_of, refusal

ROW = "P01\t1\t1000\t200\t10\t20\n"


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a log is written."""
    return tmp_path / "P01.tsv"


def warnings_of(path: Path, content: str, reader: LogReader) -> list[str]:
    """What is said of a log in which nothing stops the build."""
    path.write_text(content, encoding="utf-8")
    findings = Findings()
    assert reader.read(path, path.name, findings) is not None, findings.text()
    return findings.lines()


def columns(**changed: Any) -> LogReader:
    """A reader of logs with some columns described otherwise."""
    return reader_of(columns=changed)


@pytest.mark.parametrize("name", ["dur [s]", "dur (sec)", "dur/s"])
def test_unit_that_the_study_leaves_to_the_default(path: Path, name: str) -> None:
    """A header in another unit than the default stops the build: the study must say it."""
    said = refusal(path, HEADER.replace("dur", name) + ROW, columns(duration=name))
    assert said == (
        f'P01.tsv:1: column "{name}": the header names a unit, and the study file leaves it at '
        'another; found "s", expected ms, which duration has where no unit is stated\n'
        f'    fix: write duration = {{ column = "{name}", unit = "s" }} in [logs.columns]; or, if '
        "only this log says so, export it again; or, if the header is wrong, state "
        'unit = "ms"\n'
        "1 problem; nothing was written"
    )


def test_unit_that_the_study_states_otherwise(path: Path) -> None:
    """A header that contradicts what the study states is a warning: the study is believed."""
    reader = columns(duration={"column": "dur [s]", "unit": "ms"})
    assert warnings_of(path, HEADER.replace("dur", "dur [s]") + ROW, reader) == [
        (
            'warning: P01.tsv:1: column "dur [s]": the header names another unit than the study '
            'file; found "s", expected ms, as [logs.columns] says\n'
            "    fix: correct the unit in [logs.columns], unless the header is wrong; or, if only "
            "this log says so, export it again"
        )
    ]


@pytest.mark.parametrize(
    ("name", "entry"),
    [
        ("dur [ms]", "dur [ms]"),
        ("dur [ms]", "dur"),
        ("dur [s]", {"column": "dur [s]", "unit": "s"}),
        ("dur [s]", {"column": "dur", "unit": "s"}),
        ("dur [fast]", "dur [fast]"),
        ("dur_s", "dur_s"),
    ],
    ids=["the default", "bare, the default", "stated", "bare, stated", "no unit", "no brackets"],
)
def test_units_that_agree_are_not_spoken_of(path: Path, name: str, entry: object) -> None:
    """Nothing is said where header and study agree, or the header names no known unit."""
    assert warnings_of(path, HEADER.replace("dur", name) + ROW, columns(duration=entry)) == []


def test_bare_name_with_another_unit(path: Path) -> None:
    """A name without its unit is held against the header's unit just so."""
    said = refusal(path, HEADER.replace("gx", "gx [deg]") + ROW)
    assert 'column "gx [deg]": the header names a unit' in said
    assert 'write x = { column = "gx", unit = "deg" } in [logs.columns]' in said


@pytest.mark.parametrize("unit", ["mm", "ms"])
def test_unit_that_the_study_could_not_state(path: Path, unit: str) -> None:
    """Positions in millimetres are not read as pixels, nor are times."""
    said = refusal(path, HEADER.replace("gx", f"gx [{unit}]") + ROW)
    assert said == (
        f'P01.tsv:1: column "gx [{unit}]": the header names a unit, and the study file leaves it '
        f'at another; found "{unit}", expected px, which x has where no unit is stated\n'
        "    fix: name a column in px or deg, or export the log again; or, if the header is "
        "wrong, write "
        'x = { column = "gx", unit = "px" } in [logs.columns]\n'
        "1 problem; nothing was written"
    )


def test_every_contradiction_is_told(path: Path) -> None:
    """All columns are looked at."""
    header = HEADER.replace("start", "start [s]").replace("dur", "dur [us]").replace("gy", "gy/deg")
    said = refusal(path, header + ROW, columns(y="gy/deg"))
    assert said.endswith("3 problems; nothing was written")


def test_unit_of_the_columns_of_an_eye(path: Path) -> None:
    """Where a row holds both eyes, each column is looked at, and its table is named."""
    eye = {
        "use": "R",
        "columns": {
            "L": {"x": "lx", "duration": "dur"},
            "R": {"x": "rx", "duration": "rdur"},
        },
    }
    reader = reader_of({"eye": eye}, {"x": None, "duration": None})
    header = "reader\ttrial\tstart\tdur\trdur [s]\tlx\trx\tgy\n"
    said = refusal(path, header + "P01\t1\t1000\t200\t200\t10\t10\t20\n", reader)
    assert 'write duration = { column = "rdur", unit = "s" } in [logs.eye.columns.R]' in said


def test_messages_name_the_header_of_the_log(path: Path) -> None:
    """What is wrong in a cell is told under the name that the log has."""
    said = refusal(path, HEADER.replace("dur", "dur [ms]") + ROW.replace("200", "long"))
    assert said.startswith('P01.tsv:2: column "dur [ms]": this is no number; found "long"')


def test_rows_asked_for_by_a_bare_name(path: Path) -> None:
    """[logs.where] and facts may leave the unit out as well."""
    reader = reader_of({"where": {"delay": ["5"], "start": ["1000"]}}, facts=("delay",))
    header = HEADER.replace("\n", "\tdelay [ms]\n").replace("start", "start [ms]")
    rows = ROW.replace("\n", "\t5\n") + ROW.replace("\n", "\t7\n")
    log, note = read(path, header + rows, reader)
    assert len(log) == 1
    assert log.facts["delay"].text(0) == "5"
    assert note.asked["delay"] == ("5", "7")


def test_two_columns_that_may_be_meant(path: Path) -> None:
    """A bare name that fits two columns is none of the log's names."""
    header = HEADER.replace("dur", "dur [ms]").replace("\n", "\tdur [s]\n")
    said = refusal(path, header + ROW.replace("\n", "\t0.2\n"))
    assert said.startswith('P01.tsv:1: there is no column "dur"')
