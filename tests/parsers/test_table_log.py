"""Table logs into canonical fixations: columns, units, identifiers, rows asked for."""

import gzip
import unicodedata
from pathlib import Path

import numpy as np
import pytest

from tests.parsers.reading import HEADER, read, reader_of, refusal, texts

ROWS = "P01\t1\t1000\t200\t10\t20\nP01\t1\t1250\t300\t30\t40\n"


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a log is written."""
    return tmp_path / "P01.tsv"


def test_columns_are_taken_by_name(path: Path) -> None:
    """The order of columns, and columns that nobody asked for, make no difference."""
    content = "spare\tgy\tgx\tdur\tstart\ttrial\treader\nx\t20\t10\t200\t1000\t1\tP01\n"
    log, _ = read(path, content)
    assert (texts(log, "participant"), texts(log, "trial")) == (["P01"], ["1"])
    assert (log.onset_ms[0], log.duration_ms[0], log.x_px[0], log.y_px[0]) == (1000, 200, 10, 20)


@pytest.mark.parametrize(
    ("unit", "cells"),
    [("ms", ("1000.5", "200.25")), ("s", ("1.0005", "0.20025")), ("us", ("1000500", "200250"))],
)
def test_units_of_time(path: Path, unit: str, cells: tuple[str, str]) -> None:
    """Milli-, whole and microseconds give the same times in ms, without rounding noise."""
    reader = reader_of(
        columns={
            "onset": {"column": "start", "unit": unit},
            "duration": {"column": "dur", "unit": unit},
        }
    )
    log, _ = read(path, f"{HEADER}P01\t1\t{cells[0]}\t{cells[1]}\t10\t20\n", reader)
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([1000.5], [200.25])


def test_end_gives_the_duration(path: Path) -> None:
    """Where the log has ends, the duration is end minus onset, each in its own unit."""
    reader = reader_of(
        columns={
            "onset": {"column": "start", "unit": "ms"},
            "duration": None,
            "end": {"column": "dur", "unit": "s"},
        }
    )
    log, _ = read(path, f"{HEADER}P01\t1\t1000\t1.2\t10\t20\n", reader)
    assert log.duration_ms.tolist() == [200.0]


def test_missing_position_is_kept_as_missing(path: Path) -> None:
    """A fixation without a position is a fixation, and is counted."""
    log, note = read(path, f"{HEADER}{ROWS}P01\t1\t1600\t200\t.\tNA\n")
    assert np.isnan(log.x_px).tolist() == [False, False, True]
    assert np.isnan(log.y_px).tolist() == [False, False, True]
    assert note.counts["fixations without a position"] == 1


@pytest.mark.parametrize("mark", ["-", " - ", "-9999"], ids=["sign", "in blanks", "number"])
def test_own_missing_marks(path: Path, mark: str) -> None:
    """A mark of the study file is compared without the blanks around it."""
    reader = reader_of({"missing": [mark]})
    log, _ = read(path, f"{HEADER}P01\t1\t1000\t200\t {mark.strip()}\t20\n", reader)
    assert np.isnan(log.x_px).tolist() == [True]


def test_log_without_onsets(path: Path) -> None:
    """A number of the fixation is enough for the order."""
    log, _ = read(path, HEADER + ROWS, reader_of(columns={"onset": None, "fixation": "start"}))
    assert np.isnan(log.onset_ms).all()
    assert log.number.tolist() == [1000.0, 1250.0]


def test_log_with_labels(path: Path) -> None:
    """A log that says itself which area was fixated needs no coordinates."""
    reader = reader_of(columns={"x": None, "y": None, "label": "gx"})
    log, note = read(
        path, f"{HEADER}P01\t1\t1000\t200\tverb\t0\nP01\t1\t1300\t200\tNA\t0\n", reader
    )
    assert log.label is not None
    assert [log.label.text(row) for row in range(2)] == ["verb", ""]
    assert np.isnan(log.x_px).all()
    assert "fixations without a position" not in note.counts


def test_lines_are_those_of_the_file(path: Path) -> None:
    """Rows keep their line after comments, blank lines and rows not asked for."""
    content = f"# May\n\n{HEADER}{ROWS}# lunch\n\nP02\t1\t1000\t200\t10\t20\n"
    log, note = read(path, content, reader_of({"where": {"reader": ["P02"]}}))
    assert log.source_line.tolist() == [8]
    assert note.counts == {
        "rows": 3,
        "rows not asked for": 2,
        "comment lines below the header": 1,
        "fixations": 1,
        "fixations without a position": 0,
    }


@pytest.mark.parametrize("name", ["trial", "no"], ids=["our name", "the log's header"])
def test_where_takes_either_name(path: Path, name: str) -> None:
    """Rows are asked for by our name of a column or by the log's header."""
    reader = reader_of({"where": {name: ["2", "3"]}}, {"trial": "no"})
    content = HEADER.replace("trial", "no") + "".join(
        f"P01\t {trial}\t{trial}000\t200\t10\t20\n" for trial in range(1, 5)
    )
    log, _ = read(path, content, reader)
    assert texts(log, "trial") == ["2", "3"]


def test_numbers_of_rows_not_asked_for_are_not_read(path: Path) -> None:
    """A row that is left out by [logs.where] may hold anything."""
    log, _ = read(
        path, f"{HEADER}{ROWS}P09\t\tnone\t-1\t,\t.\n", reader_of({"where": {"reader": ["P01"]}})
    )
    assert len(log) == 2


def test_reader_from_the_name(path: Path) -> None:
    """The file's name says whose log it is, and in which session and trial."""
    name = r"(?P<participant>P\d+)_s(?P<session>\d)_t(?P<trial>\d+)"
    reader = reader_of({"participant_from_name": name}, {"participant": None, "trial": None})
    log, _ = read(path.with_name("P07_s2_t11.tsv"), HEADER + ROWS, reader)
    assert texts(log, "participant") == ["P07", "P07"]
    assert texts(log, "session") == ["2", "2"]
    assert texts(log, "trial") == ["11", "11"]


def test_session_that_some_names_lack(path: Path) -> None:
    """Logs whose names say no session can stand beside logs whose names do."""
    reader = reader_of(
        {"participant_from_name": r"(?P<participant>P\d+)(?:_s(?P<session>\d))?"},
        {"participant": None},
    )
    log, _ = read(path, HEADER + ROWS, reader)
    assert texts(log, "session") == ["", ""]


def test_reader_from_a_decomposed_name(path: Path) -> None:
    """A name with accents is the same reader whichever way the disk keeps its letters."""
    composed = "José"
    reader = reader_of({"participant_from_name": r"^(?P<participant>\w+)\."}, {"participant": None})
    name = unicodedata.normalize("NFD", composed) + ".tsv"
    log, _ = read(path.with_name(name), HEADER + ROWS, reader)
    assert texts(log, "participant") == [composed, composed]


def test_identifiers_are_trimmed_and_composed(path: Path) -> None:
    """Blanks around an identifier, and the way its letters are stored, do not make another one."""
    decomposed = unicodedata.normalize("NFD", "José")
    content = f"{HEADER} José\t1\t1000\t200\t10\t20\n{decomposed} \t1\t1250\t200\t10\t20\n"
    log, _ = read(path, content)
    assert log.ids["participant"].values == ("José",)


def test_many_readers_in_one_log(path: Path) -> None:
    """A log may hold any number of readers, in any order of rows."""
    content = HEADER + "".join(f"P{n % 3}\t1\t{n}000\t200\t10\t20\n" for n in range(6))
    log, _ = read(path, content)
    assert texts(log, "participant") == ["P0", "P1", "P2", "P0", "P1", "P2"]


def test_facts_are_taken_by_header(path: Path) -> None:
    """Facts that stand in the log are handed on as text, missing ones as empty."""
    content = HEADER.replace("\n", "\tcue\n") + ROWS.replace("20\n", "20\tearly\n").replace(
        "40\n", "40\tNA\n"
    )
    log, _ = read(path, content, reader_of(facts=("cue",)))
    assert [log.facts["cue"].text(row) for row in range(2)] == ["early", ""]


@pytest.mark.parametrize(
    "content",
    [
        (HEADER + ROWS).encode("utf-8"),
        (HEADER + ROWS).encode("utf-16"),
        (HEADER + ROWS).replace("\n", "\r\n").encode("utf-8-sig"),
        (HEADER + ROWS).replace("\n", "\r").encode("cp1252"),
        (HEADER + ROWS).replace("\t", ";").encode("utf-8"),
        (HEADER + ROWS).replace("\t10\t", '\t"10"\t').encode("utf-8"),
        (HEADER + ROWS).replace("\t10\t", "\t10.0\t").rstrip("\n").encode("utf-8"),
        (HEADER + ROWS).replace("\t10\t", "\t10,0\t").encode("utf-8"),
        gzip.compress((HEADER + ROWS).encode("utf-8")),
    ],
    ids=[
        "plain",
        "UTF-16",
        "CRLF",
        "CR",
        "semicolons",
        "quotes",
        "no last line end",
        "commas",
        "gzip",
    ],
)
def test_every_way_of_writing_gives_the_same(path: Path, content: bytes) -> None:
    """However a log is written, the fixations are the same."""
    log, _ = read(path, content)
    assert log.onset_ms.tolist() == [1000, 1250]
    assert log.duration_ms.tolist() == [200, 300]
    assert log.x_px.tolist() == [10, 30]
    assert log.y_px.tolist() == [20, 40]
    assert log.source_line.tolist() == [2, 3]


def test_how_a_log_was_read_is_noted(path: Path) -> None:
    """The note says what was found out."""
    content = (HEADER + ROWS).replace("\t10\t", "\t10,5\t").replace("\t", ";").encode("utf-16")
    _, note = read(path, content)
    assert (note.shown, note.encoding, note.delimiter, note.decimal) == (
        "P01.tsv",
        "utf-16",
        ";",
        ",",
    )


def test_problems_are_listed_by_line(path: Path) -> None:
    """What is wrong in a log is told from its top to its bottom, whatever was checked first."""
    content = f"{HEADER}P01\t1\t1000\t0\t10\t20\n\t1\t1300\t200\t10\t20\nP01\t1\t\t200\t10\t20\n"
    said = refusal(path, content).splitlines()
    assert [line.split(":")[1] for line in said if line.startswith("P01.tsv:")] == ["2", "3", "4"]


def test_end_and_duration_give_the_onset(tmp_path: Path) -> None:
    """A log that is written as fixations end has no onset: it is the end less the duration."""
    reader = reader_of(columns={"onset": None, "end": {"column": "over", "unit": "s"}})
    log, _ = read(
        tmp_path / "P01.tsv",
        "reader\ttrial\tover\tdur\tgx\tgy\nP01\t1\t0.3\t200\t5\t5\nP01\t1\t0.7\t150.5\t5\t5\n",
        reader,
    )
    assert log.onset_ms.tolist() == [100.0, 549.5]
    assert log.duration_ms.tolist() == [200.0, 150.5]


def test_end_that_is_missing_beside_a_duration_is_told_once(tmp_path: Path) -> None:
    """Without an onset of its own, a fixation needs its end."""
    reader = reader_of(columns={"onset": None, "end": "over"})
    said = refusal(
        tmp_path / "P01.tsv", "reader\ttrial\tover\tdur\tgx\tgy\nP01\t1\tNA\t200\t5\t5\n", reader
    )
    assert said.startswith(
        'P01.tsv:2: column "over": the fixation has no end; found "NA", expected a number\n'
    )
    assert said.endswith("1 problem; nothing was written")
