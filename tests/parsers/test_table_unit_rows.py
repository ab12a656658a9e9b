"""A row of units below the header of a log: set aside, and held against the study's units."""

from pathlib import Path
from typing import Any

import pytest

from etl.errors import Findings
from etl.parsers import LogReader
from tests.parsers.reading import HEADER, read, reader_of, refusal

ROWS = "P01\t1\t1000\t200\t10\t20\nP01\t1\t1250\t300\t30\t40\n"
UNITS = "\t\tms\tms\tpx\tpx\n"


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


@pytest.mark.parametrize(
    "units",
    [
        UNITS,
        "\t\t[ms]\t(msec)\tpixel\t\n",
        "text\tno.\tms\tNA\t-\tpx\n",
        '"";"";"ms";"ms";"px";"px"\n'.replace(";", "\t"),
        f"\n# lunch\n{UNITS}",
        UNITS * 2,
    ],
    ids=["plain", "brackets", "words and marks", "quoted", "blank line and remark", "two rows"],
)
def test_row_of_units_is_no_fixation(path: Path, units: str) -> None:
    """Fixations are those of the log without it, and it is counted."""
    log, note = read(path, HEADER + units + ROWS)
    assert log.onset_ms.tolist() == [1000, 1250]
    assert log.x_px.tolist() == [10, 30]
    assert note.account.lines["row of units"].count == (2 if units == UNITS * 2 else 1)
    assert note.account.lines["fixations"].count == note.counts["rows"] == 2
    first = units.splitlines().index(units.splitlines()[-1]) + 2
    assert note.account.lines["row of units"].first_line == first
    assert note.account.lines["fixations"].first_line == log.source_line[0]
    assert note.account.balances()


def test_row_of_units_below_a_repeated_header(path: Path) -> None:
    """Where logs were put together, each may have its own row of units."""
    log, note = read(path, (HEADER + UNITS + ROWS) * 3 + HEADER + HEADER + UNITS)
    assert log.onset_ms.tolist() == [1000, 1250] * 3
    counts = {fate: tally.count for fate, tally in note.account.lines.items()}
    assert counts == {"header": 1, "repeated headers": 4, "row of units": 4, "fixations": 6}
    assert note.account.balances()


def test_row_of_units_below_a_repeated_header_only(path: Path) -> None:
    """The rows above it are not looked at."""
    log, note = read(path, HEADER + ROWS + HEADER + UNITS + ROWS)
    assert len(log) == 4
    assert note.account.lines["row of units"].first_line == 5


def test_row_of_units_elsewhere_is_an_error(path: Path) -> None:
    """In the middle of a log, words among numbers are damage."""
    said = refusal(path, HEADER + ROWS + UNITS)
    assert 'P01.tsv:4: column "dur": this is no number; found "ms"' in said


@pytest.mark.parametrize(
    "row",
    ["P01\t1\tms\tms\tpx\tpx\n", "P01\t\tms\t200\tpx\tpx\n", "\t\tms\tlong\tpx\tpx\n"],
    ids=["a trial's number", "a number", "another word"],
)
def test_row_that_is_not_of_units_alone_is_an_error(path: Path, row: str) -> None:
    """A row with any number, or another word in a column of numbers, is no row of units."""
    said = refusal(path, HEADER + row + ROWS)
    assert said.startswith("P01.tsv:2: ")


def test_log_with_nothing_but_units(path: Path) -> None:
    """A header and its units are no fixation."""
    said = refusal(path, HEADER + UNITS)
    assert said.startswith("P01.tsv:1: the log has a header but no fixation")


def test_unit_that_the_study_leaves_to_the_default(path: Path) -> None:
    """A row of other units than the default stops the build, as a header does."""
    said = refusal(path, HEADER + "\t\tms\ts\tpx\tmm\n" + ROWS)
    assert said == (
        'P01.tsv:2: column "dur": the row of units names a unit, and the study file leaves it at '
        'another; found "s", expected ms, which duration has where no unit is stated\n'
        '    fix: write duration = { column = "dur", unit = "s" } in [logs.columns]; or, if only '
        "this log says so, export it again; or, if the row is wrong, state "
        'unit = "ms"\n'
        'P01.tsv:2: column "gy": the row of units names a unit, and the study file leaves it at '
        'another; found "mm", expected px, which y has where no unit is stated\n'
        "    fix: name a column in px or deg, or export the log again; or, if the row is wrong, "
        'write y = { column = "gy", unit = "px" } in [logs.columns]\n'
        "2 problems; nothing was written"
    )


def test_unit_that_the_study_states_otherwise(path: Path) -> None:
    """The study is believed, with a warning."""
    reader = reader_of(columns={"duration": {"column": "dur", "unit": "ms"}})
    assert warnings_of(path, HEADER + UNITS.replace("ms\tms", "ms\ts") + ROWS, reader) == [
        (
            'warning: P01.tsv:2: column "dur": the row of units names another unit than the study '
            'file; found "s", expected ms, as [logs.columns] says\n'
            "    fix: correct the unit in [logs.columns], unless the row is wrong; or, if only "
            "this log says so, export it again"
        )
    ]


def test_units_that_agree_are_not_spoken_of(path: Path) -> None:
    """Where the study states what the row says, nothing is told."""
    reader = reader_of(columns={"duration": {"column": "dur", "unit": "s"}})
    content = HEADER + UNITS.replace("ms\tms", "ms\tsec") + ROWS.replace("00\t", "\t")
    assert warnings_of(path, content, reader) == []


def test_every_row_of_units_is_held_against_the_study(path: Path) -> None:
    """A part in other units is not read under those of the first part."""
    other = UNITS.replace("ms\tms", "s\ts")
    said = refusal(path, HEADER + UNITS + ROWS + HEADER + other + ROWS)
    assert said.startswith('P01.tsv:6: column "start": the row of units names a unit')
    assert said.endswith("2 problems; nothing was written")


def eyes(**columns: dict[str, Any]) -> LogReader:
    """A reader of logs with both eyes in a row; the right one counts."""
    eye = {"use": "R", "columns": columns}
    return reader_of({"eye": eye}, {"x": None, "duration": None})


def test_units_of_the_columns_of_both_eyes(path: Path) -> None:
    """The columns of an eye that does not count are columns of numbers as well."""
    reader = eyes(L={"x": "lx", "duration": "dur"}, R={"x": "rx", "duration": "rdur"})
    header = "reader\ttrial\tstart\tdur\trdur\tlx\trx\tgy\n"
    row = "P01\t1\t1000\t200\t210\t10\t11\t20\n"
    log, _ = read(path, f"{header}\t\tms\tms\tms\tpx\tpx\tpx\n{row}", reader)
    assert log.duration_ms.tolist() == [210]
    said = refusal(path, f"{header}\t\tms\tms\ts\tpx\tpx\tpx\n{row}", reader)
    assert 'write duration = { column = "rdur", unit = "s" } in [logs.eye.columns.R]' in said
    said = refusal(path, f"{header}\t\tms\tms\tms\tleft\tpx\tpx\n{row}", reader)
    assert said.startswith("P01.tsv:2: ")


def test_row_of_units_of_gaze_samples(path: Path) -> None:
    """Logs of samples have such rows too."""
    samples = {"method": "dispersion", "dispersion_px": 30}
    reader = reader_of({"samples": samples}, {"duration": None})
    header = "reader\ttrial\tstart\tgx\tgy\n"
    rows = "".join(f"P01\t1\t{1000 + 2 * n}\t100\t200\n" for n in range(100))
    log, note = read(path, f"{header}\t\tms\tpx\tpx\n{rows}", reader)
    assert len(log) == 1
    assert note.account.lines["row of units"].count == 1
    assert note.account.balances()


def test_name_with_its_unit_above_a_row_of_units(path: Path) -> None:
    """The bare name of the study finds the column, and the row is held against the study."""
    header = HEADER.replace("dur", "dur [ms]")
    said = refusal(path, header + UNITS.replace("ms\tms", "ms\ts") + ROWS)
    assert said.startswith('P01.tsv:2: column "dur [ms]": the row of units names a unit')


def test_rows_asked_for_are_looked_for_below_the_units(path: Path) -> None:
    """The row of units is none of the rows that [logs.where] leaves out."""
    _, note = read(path, HEADER + UNITS + ROWS, reader_of({"where": {"reader": ["P01"]}}))
    assert note.counts["rows"] == 2
    assert note.asked["reader"] == ("P01",)


def test_guessed_encoding_of_a_log_is_noted_and_not_warned_of(path: Path) -> None:
    """What is true of hundreds of logs is told once, from their notes."""
    content = HEADER.replace("\n", "\tword\n") + ROWS.replace("0\n", "0\tpêche\n")
    path.write_bytes(content.encode("cp1252"))
    findings = Findings()
    found = reader_of().read(path, path.name, findings)
    assert found is not None
    assert (found[1].encoding, findings.items) == ("cp1252", [])
