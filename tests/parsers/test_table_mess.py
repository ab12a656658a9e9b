"""Table logs as labs have them: what is repaired or set aside is counted, and nothing differs."""

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from etl.parsers.canonical import LogNote
from tests.parsers.reading import HEADER, read, reader_of, refusal, texts

ROWS = "P01\t1\t1000\t200\t10\t20\nP01\t1\t1250\t300\t30\t40\n"


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a log is written."""
    return tmp_path / "P01.tsv"


def fates(note: LogNote) -> dict[str, int]:
    """How many lines of a log there are of each fate."""
    assert note.account.balances()
    return {fate: tally.count for fate, tally in note.account.lines.items()}


def test_fixations_are_counted_among_the_lines(path: Path) -> None:
    """What the table set aside and what the rows are told of add up to the file."""
    content = f"Orchard, May\n\n{HEADER}{ROWS}# lunch\n{HEADER}P02\t1\t1000\t200\t10\t20\n"
    _, note = read(path, content, reader_of({"where": {"reader": ["P01"]}}))
    assert fates(note) == {
        "banner above the header": 1,
        "blank lines": 1,
        "header": 1,
        "remarks": 1,
        "repeated headers": 1,
        "fixations": 2,
        "rows not asked for": 1,
    }
    assert note.account.total == 8


@pytest.mark.parametrize(
    "content",
    [
        f"Orchard; May\nmade by hand\n{HEADER}{ROWS}",
        HEADER + ROWS.replace("\nP01", f"\n{HEADER}P01"),
        f"\ufeff{HEADER}" + ROWS.replace("\nP01", f"\n\ufeff{HEADER}P01"),
        HEADER.replace("\n", "\tword\n")
        + ROWS.replace("20\n", '20\t"""\n').replace("40\n", "40\tx\n"),
        (HEADER + ROWS).replace("\t", "   "),
        (HEADER + ROWS).replace("start", "start [ms]").replace("gx", "gx (px)"),
        (HEADER + ROWS).replace("\n", "\r\n", 2),
        HEADER.replace("\n", "\tfile\n")
        + ROWS.replace("20\n", "20\tC:\\new\\P01\n").replace("40\n", "40\tD:\\\n"),
    ],
    ids=[
        "banner",
        "header again",
        "marks and header again",
        "mark alone",
        "aligned by blanks",
        "units in names",
        "line ends of two kinds",
        "paths",
    ],
)
def test_every_mess_gives_the_same(path: Path, content: str) -> None:
    """However a table is written, the fixations are the same."""
    log, note = read(path, content)
    assert log.onset_ms.tolist() == [1000, 1250]
    assert log.duration_ms.tolist() == [200, 300]
    assert log.x_px.tolist() == [10, 30]
    assert log.y_px.tolist() == [20, 40]
    assert fates(note)["fixations"] == 2


def test_repairs_are_in_the_account(path: Path) -> None:
    """What was mended is counted with its first line."""
    content = HEADER.replace("\n", "\tword\n") + ROWS.replace("20\n", '20\t"""\n').replace(
        "40\n", "40\tpear\n"
    )
    _, note = read(path, content)
    (repair,) = note.account.repairs.items()
    assert repair[0] == "quote marks that were not doubled"
    assert (repair[1].count, repair[1].first_line) == (1, 2)


@pytest.mark.parametrize("end", ["", "\n", "\r\n"], ids=["none", "LF", "CRLF"])
def test_end_of_the_last_line_is_noted(path: Path, end: str) -> None:
    """Whether the last line has an end is told, so that logs can be compared."""
    _, note = read(path, HEADER + ROWS.removesuffix("\n") + end)
    assert note.ends_open is (end == "")


def test_remarks_by_the_signs_of_the_study(path: Path) -> None:
    """[logs] comment says what a remark begins with, above the header and below it."""
    content = f"% May\n{HEADER}{ROWS}% lunch\n"
    log, note = read(path, content, reader_of({"comment": ["%"]}))
    assert len(log) == 2
    assert fates(note)["remarks"] == 2


def test_no_remarks_where_the_study_has_none(path: Path) -> None:
    """With an empty list a reader may be called what he likes."""
    log, _ = read(path, HEADER + ROWS.replace("P01", "#1"), reader_of({"comment": []}))
    assert texts(log, "participant") == ["#1", "#1"]


def test_header_is_asked_for_as_it_is_read(path: Path) -> None:
    """The columns that a log can supply are those of the header that is found."""
    path.write_text(f"% Orchard\tMay\nby hand\n{HEADER}{ROWS}", encoding="utf-8")
    assert reader_of({"comment": ["%"]}).header(path) == tuple(HEADER.split())


def test_rows_of_a_second_table_are_an_error(path: Path) -> None:
    """A second header in another order is never read under the first one."""
    swapped = HEADER.replace("gx\tgy", "gy\tgx")
    said = refusal(path, HEADER + ROWS + swapped + ROWS)
    assert said.startswith("P01.tsv:4: a second header differs from the first; found ")


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.lists(
        st.sampled_from(
            ["\n", "# x\n", HEADER, "P01\t1\t1000\t200\t10\t20\n", 'P02\t"1"\t900\t200\t10\t20\n']
        ),
        max_size=10,
    )
)
def test_account_of_a_log_always_balances(path: Path, pieces: list[str]) -> None:
    """Whatever [logs.where] leaves out, all lines are counted once."""
    content = "".join(["banner\n", HEADER, *pieces, ROWS])
    log, note = read(path, content, reader_of({"where": {"reader": ["P01"]}}))
    counted = fates(note)
    assert note.account.total == content.count("\n")
    assert counted["fixations"] == len(log)
    assert counted.get("rows not asked for", 0) == sum("P02" in piece for piece in pieces)
