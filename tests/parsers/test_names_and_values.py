"""Ids from the names of files, values of ``[logs.where]``, letters with accents, rounding."""

from __future__ import annotations

import unicodedata
from pathlib import Path

import pytest

from tests.parsers.reading import HEADER, read, reader_of, refusal, texts

NAMED = "trial\tstart\tdur\tgx\tgy\n"
ROW = "1\t1000\t200\t10\t20\n"
BY_NAME = {"participant_from_name": "(?P<participant>[^.]+)"}
MILL = "m\u00fchle"
APART = unicodedata.normalize("NFD", MILL)


def test_id_from_the_name_is_trimmed(tmp_path: Path) -> None:
    """Blanks around an id count as little in a name as in a cell."""
    reader = reader_of(BY_NAME, {"participant": None})
    log, _ = read(tmp_path / "P01 .tsv", NAMED + ROW, reader)
    assert texts(log, "participant") == ["P01"]


def test_missing_mark_is_no_id_in_a_name(tmp_path: Path) -> None:
    """A file called NA names nobody."""
    reader = reader_of(BY_NAME, {"participant": None})
    assert refusal(tmp_path / "NA.tsv", NAMED + ROW, reader) == (
        "NA.tsv: logs.participant_from_name: the file's name does not say the participant; found "
        '"NA.tsv", expected a name in which the group participant of (?P<participant>[^.]+) is not '
        'empty, and not "NA", which [logs] missing lists\n'
        "    fix: rename the file, correct the pattern, or narrow [logs] files\n"
        "1 problem; nothing was written"
    )


def test_pattern_for_names_is_composed(tmp_path: Path) -> None:
    """A pattern finds a name whichever way either composes its letters."""
    pattern = {"participant_from_name": f"{APART}_(?P<participant>P..)"}
    log, _ = read(
        tmp_path / f"{MILL}_P01.tsv", NAMED + ROW, reader_of(pattern, {"participant": None})
    )
    assert texts(log, "participant") == ["P01"]


@pytest.mark.parametrize(
    "cell", [MILL, APART, f" {APART} "], ids=["one form", "the other", "blanks"]
)
@pytest.mark.parametrize(
    "value", [MILL, APART, f"{MILL} "], ids=["one form", "the other", "blanks"]
)
def test_where_compares_composed_and_trimmed(tmp_path: Path, cell: str, value: str) -> None:
    """A row is asked for whatever form its cell, or the study file, writes."""
    reader = reader_of({"where": {"item": [value]}}, {"item": "sent"})
    content = HEADER.replace("\n", "\tsent\n") + f"P01\t1\t1000\t200\t10\t20\t{cell}\n"
    log, note = read(tmp_path / "P01.tsv", content, reader)
    assert texts(log, "item") == [MILL]
    assert note.asked == {"item": (MILL,)}


def test_values_of_where_are_remembered(tmp_path: Path) -> None:
    """The values asked for that the log has come first, then others."""
    reader = reader_of({"where": {"trial": ["2", "9", "1"]}})
    rows = "".join(f"P01\t{trial}\t{trial}000\t200\t10\t20\n" for trial in (1, 2, 3))
    _, note = read(tmp_path / "P01.tsv", HEADER + rows, reader)
    assert note.asked == {"trial": ("2", "1", "3")}


def test_missing_marks_are_composed(tmp_path: Path) -> None:
    """A mark with an accent stands for no value in either form, in words and in numbers."""
    reader = reader_of({"missing": [APART]}, facts=("cue",))
    content = HEADER.replace("\n", "\tcue\n") + f"P01\t1\t1000\t200\t{APART}\t20\t{MILL}\n"
    log, note = read(tmp_path / "P01.tsv", content, reader)
    assert log.facts["cue"].text(0) == ""
    assert note.counts["fixations without a position"] == 1


def test_columns_are_composed(tmp_path: Path) -> None:
    """A header is found whatever form the study file writes."""
    reader = reader_of(columns={"item": APART})
    content = HEADER.replace("\n", f"\t{MILL}\n") + "P01\t1\t1000\t200\t10\t20\tpear\n"
    log, _ = read(tmp_path / "P01.tsv", content, reader)
    assert texts(log, "item") == ["pear"]


def test_duration_from_decimal_times_is_free_of_noise(tmp_path: Path) -> None:
    """End minus onset is what the decimals say."""
    reader = reader_of(columns={"duration": None, "end": "dur"})
    log, _ = read(tmp_path / "P01.tsv", HEADER + "P01\t1\t1000.1\t1200.3\t10\t20\n", reader)
    assert log.duration_ms.tolist() == [200.2]


def test_open_quote_in_the_last_column_is_an_error(tmp_path: Path) -> None:
    """A log's word column must not swallow the rows below."""
    words = ("The", '"pear', 'fell"', "down")
    content = HEADER.replace("\n", "\tword\n") + "".join(
        f"P01\t1\t{1000 + 250 * row}\t200\t10\t20\t{word}\n" for row, word in enumerate(words)
    )
    assert refusal(tmp_path / "P01.tsv", content).startswith(
        "P01.tsv:3: a quoted cell holds whole rows"
    )


def test_comments_like_rows_are_counted(tmp_path: Path) -> None:
    """They are counted apart from other remarks."""
    content = HEADER + "P01\t1\t1000\t200\t10\t20\n#P02\t1\t1000\t200\t10\t20\n# noise\n"
    _, note = read(tmp_path / "P01.tsv", content)
    assert note.counts["comment lines below the header"] == 2
    assert note.counts["comment lines like rows"] == 1
