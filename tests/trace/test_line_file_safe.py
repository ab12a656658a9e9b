"""Names that a spreadsheet would run as formulas, in the table of lines to be corrected."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import pytest

import etl
from etl.session import write_lines
from tests.end_to_end.building import build, copied_sample, rows_of
from tests.trace.tracing import BuiltStudy, drifting

#: A reader of the sample under each of these names, and how the table has it.
DANGEROUS = {"=P33": "'=P33", "'=P33": "''=P33", "-P 33": "'-P 33", "@33": "'@33"}


def rows_in(path: Path) -> list[dict[str, str]]:
    """The rows of a table, as they stand in it."""
    with path.open(encoding="utf-8-sig", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("name", ["lines.csv", "lines.tsv"])
@pytest.mark.parametrize(("reader", "written"), DANGEROUS.items())
def test_written_twice_is_written_once(
    tmp_path: Path, unsure: BuiltStudy, name: str, reader: str, written: str
) -> None:
    """A reader is marked in the table, and known by the mark when rows are added."""
    path = tmp_path / name
    for _ in range(2):
        write_lines(drifting(participant=reader, trial="+7 b"), path, unsure.study)
    lines = path.read_text(encoding="utf-8").splitlines()
    assert len(lines) == 1 + 10
    sign = "," if name.endswith("csv") else "\t"
    assert {line.split(sign)[0] for line in lines[1:]} == {written}
    assert {line.split(sign)[1] for line in lines[1:]} == {"'+7 b"}


def test_word_on_the_screen_is_marked(tmp_path: Path, unsure: BuiltStudy) -> None:
    """What stands in the text may begin with a sign, too."""
    traced = drifting()
    words = tuple(replace(word, text="=2*3") for word in traced.words)
    write_lines(replace(traced, words=words), tmp_path / "lines.csv", unsure.study)
    assert {row["word"] for row in rows_in(tmp_path / "lines.csv")} == {"'=2*3", ""}


@pytest.mark.parametrize("reader", DANGEROUS)
def test_build_finds_the_reader_by_the_marked_name(tmp_path: Path, reader: str) -> None:
    """A table that was written, edited and named in the study file corrects this reader's lines."""
    pattern = {r"(?P<participant>P\d+)": "^(?P<participant>[^_]+)_"}
    study_file = copied_sample("passages", tmp_path, pattern)
    text = study_file.read_text(encoding="utf-8")
    for log in (study_file.parent / "logs").iterdir():
        if log.name.startswith("P33_"):
            log.rename(log.with_name(log.name.replace("P33", reader)))
        else:
            log.unlink()
    traced = etl.trace(etl.load_study(study_file), reader, "3")
    table = study_file.parent / "by_hand.csv"
    write_lines(traced, table, etl.load_study(study_file))
    edited = rows_in(table)
    assert {row["participant"] for row in edited} == {DANGEROUS[reader]}
    edited[9]["line"] = str(int(edited[9]["line_told"]) + 1)
    with table.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, edited[0])
        writer.writeheader()
        writer.writerows(edited)
    study_file.write_text(
        text + '\n[lines]\ncorrections = "by_hand.csv"\n', encoding="utf-8", newline="\n"
    )
    build(study_file, tmp_path / "out")
    corrected = [
        row["line"]
        for row in rows_of(tmp_path / "out", "fixations")
        if (row["participant"], row["trial"], row["fixation"])
        == (reader, 3, int(edited[9]["fixation"]))
    ]
    assert corrected == [int(edited[9]["line"])]
