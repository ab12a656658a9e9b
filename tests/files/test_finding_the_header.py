"""The header among banner lines: found by the columns that are needed."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of, header_of

NEEDED = ("reader", "trial", "dur")
TABLE = "reader{0}trial{0}dur{0}spare\nP01{0}1{0}200{0}x\nP01{0}2{0}210{0}y\n"


def read(
    content: str, needed: Sequence[str] | None = NEEDED, delimiter: str | None = None
) -> tuple[Cells | None, Findings]:
    """The cells of a log, and all that was found."""
    findings = Findings()
    text = RawText("log.csv", content.encode("utf-8"), "", "utf-8")
    return cells_of(text, findings, needed=needed, delimiter=delimiter, wary=True), findings


@pytest.mark.parametrize("separator", ["\t", ";", ",", "|", " "])
@pytest.mark.parametrize(
    "banner",
    [
        "Orchard study\n",
        "Export: May, June; 12 readers | all\tof them\n",
        'made "by hand\n',
        '"Orchard study"\n"made by hand"\n',
        '"Orchard\n',
        "reader;P01\nscreen;1920;1080\n",
        "settings\nrate,1000\nrate,500\nrate,250\nrate,125\n",
        "one\n\n# two\n\nthree\n",
    ],
    ids=[
        "a title",
        "every separator",
        "a quote mark inside",
        "quotes",
        "a quote that is never closed",
        "a name alone",
        "a table of its own",
        "blank lines and remarks between",
    ],
)
def test_header_below_a_banner(separator: str, banner: str) -> None:
    """No banner hides the header, nor what separates its names."""
    cells, findings = read(banner + TABLE.format(separator))
    assert cells is not None, findings.text()
    assert cells.delimiter == separator
    assert cells.header_line == banner.count("\n") + 1
    assert cells.column("dur").to_pylist() == ["200", "210"]


@given(st.lists(st.text(alphabet='ab;,| \t"1', max_size=20), max_size=8))
def test_any_banner(lines: list[str]) -> None:
    """Whatever stands above the header, the table is the same."""
    content = "".join(f"{line}\n" for line in lines) + TABLE.format(";")
    cells, findings = read(content)
    assert cells is not None, findings.text()
    assert cells.header_line == len(lines) + 1
    assert cells.lines.tolist() == [len(lines) + 2, len(lines) + 3]


def test_stated_separator_is_kept() -> None:
    """A line that has the names under another separator than the stated one is no header."""
    cells, findings = read(TABLE.format(",") + TABLE.format(";"), delimiter=";")
    assert cells is not None, findings.text()
    assert cells.header_line == 4


def test_header_as_it_is_told_before_rows_are_read() -> None:
    """What is asked about a log's columns gets the same answer."""
    text = RawText("log.csv", b"Orchard; study\n" + TABLE.format(",").encode(), "", "utf-8")
    assert header_of(text, needed=NEEDED) == ("reader", "trial", "dur", "spare")


def test_names_around_which_two_separators_stand() -> None:
    """Where two separators give all names, the one that splits the rows evenly is taken."""
    cells, findings = read("reader ; trial ; dur\nP 01 ; 1 ; 200\n")
    assert cells is not None, findings.text()
    assert cells.delimiter == ";"


def test_separator_is_that_of_the_names_not_that_of_the_rows() -> None:
    """Commas in every cell do not hide the semicolons between the names."""
    cells, findings = read("reader;trial;dur\n1,5,2,5;1,1;200,5\n")
    assert cells is not None, findings.text()
    assert cells.delimiter == ";"


def test_missing_column_is_told_of_the_line_most_like_a_header() -> None:
    """A banner does not hide what is wrong with the header."""
    said = read("Orchard study\nreader 1, trial 2\n" + TABLE.format(";").replace("dur", "ms"))
    assert said[1].text() == (
        'log.csv:3: there is no column "dur"; found "reader, trial, ms, spare", expected a header, '
        'separated by semicolons, that has "dur"\n'
        "    fix: write the header's own name in the study file, or correct the header\n"
        "1 problem; nothing was written"
    )


def test_missing_columns_are_told_in_one_finding() -> None:
    """What a header lacks is one mistake, with what may be meant for each name."""
    _, findings = read("reader;Trial;durr;spare\nP01;1;200;x\n")
    assert findings.text() == (
        'log.csv:1: there are no columns "trial", "dur"; found "reader, Trial, durr, spare", '
        'expected a header, separated by semicolons, that has "trial", "dur"\n'
        '    fix: did you mean "Trial" for "trial", "durr" for "dur"? Write the header\'s own '
        "names in the study file, or correct the header\n"
        "1 problem; nothing was written"
    )


def test_names_near_to_a_missing_one_are_shown_of_a_wide_header() -> None:
    """A message is cut; what may be meant comes before what else there is."""
    spare = "".join(f";spare{n}" for n in range(60))
    _, findings = read(f"reader{spare};TRAIL;dur [fast];durr [ms]\n")
    (finding,) = findings
    assert '; found "TRAIL, durr [ms], reader, spare0, ' in finding.text()


def test_names_of_a_short_header_are_shown_in_their_order() -> None:
    """Where all names fit, they stand as in the file."""
    _, findings = read("reader;trial;spare;durr\nP01;1;x;200\n")
    assert findings.items[0].found == "reader, trial, spare, durr"


def test_no_needed_column_anywhere_is_told_of_the_first_line() -> None:
    """Where no line is like a header, the first one is named."""
    _, findings = read("who;what;when\nP01;1;200\n")
    (finding,) = findings
    assert finding.problem == "the header has none of the columns that the study file names"
    assert (finding.line, finding.found) == (1, "who, what, when")


def test_header_behind_another_sign_of_a_remark() -> None:
    """The hint names the sign that makes a remark of the header."""
    findings = Findings()
    text = RawText("log.csv", b"% reader;trial;dur\nP01;1;200\n", "", "utf-8")
    assert cells_of(text, findings, needed=NEEDED, wary=True, remarks=["%"]) is None
    assert findings.items[0].fix == (
        "remove the % before the names: it makes a comment of the line"
    )


def test_equal_names_of_columns_that_are_not_needed() -> None:
    """Only what is asked for must have a name of its own."""
    cells, findings = read("spare;reader;trial;dur;spare\nx;P01;1;200;y\n")
    assert cells is not None, findings.text()
    assert cells.column("reader").to_pylist() == ["P01"]


def test_equal_names_of_needed_columns() -> None:
    """A column that is asked for and is there twice is an error."""
    _, findings = read("reader;trial;dur;dur\nP01;1;200;300\n")
    (finding,) = findings
    assert (finding.problem, finding.found) == ("two columns have the same name", "dur")


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_thousands_of_columns(quote: str) -> None:
    """Of a wide table only the columns asked for are kept."""
    names = [f"spare{n}" for n in range(5000)]
    names[7], names[2500], names[4999] = NEEDED
    row = [f"{quote}{n}{quote}" for n in range(5000)]
    cells, findings = read("\t".join(names) + "\n" + ("\t".join(row) + "\n") * 3)
    assert cells is not None, findings.text()
    assert cells.table.column_names == list(NEEDED)
    assert cells.column("trial").to_pylist() == ["2500"] * 3
    assert cells.position("dur") == 5000


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
@pytest.mark.parametrize("first", ["reader;tri#al;dur;spare\n", ""], ids=["damaged", "lost"])
def test_rows_above_the_header_are_an_error(first: str, quote: str) -> None:
    """Where the first of two headers is damaged, its rows are no banner."""
    rows = f"P01;1;{quote}200{quote};x\nP01;2;210;y\n"
    cells, findings = read(first + rows + TABLE.format(";"))
    assert cells is None
    line = first.count("\n") + 1
    assert findings.text() == (
        f"log.csv:{line}: 2 lines above the header are like rows; found "
        f'"P01;1;{quote}200{quote};x", expected rows below line {line + 2} only, which is the '
        "first to name all columns that the study file names\n"
        "    fix: correct the header above these rows, or remove what is no part of the table\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    "line",
    ["Orchard study;;;", "rate;1000;;", "# P01;1;200;x", "a;b;c;d", "P01;1;200"],
    ids=["filled up", "a setting filled up", "a remark", "without a number", "another width"],
)
def test_banner_as_wide_as_the_table(line: str) -> None:
    """Programs fill up lines with separators; such a line is no row."""
    cells, findings = read(f"{line}\n{TABLE.format(';')}")
    assert cells is not None, findings.text()
    assert len(cells) == 2
