"""Which eye counts, where both were recorded: in rows of their own, or in one row."""

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from etl.parsers import CanonicalLog, EyeChoice, LogReader
from etl.parsers.canonical import LogNote
from etl.parsers.readers import reader_for
from etl.study import Study
from tests.parsers.reading import COLUMNS, read, refusal

ONE_EYE = "reader\ttrial\tstart\tdur\tgx\tgy\teye\n"
BOTH = "reader\ttrial\tlt\tld\tlx\trt\trd\trx\n"
BY_EYE = {
    "L": {"onset": "lt", "duration": "ld", "x": "lx"},
    "R": {"onset": "rt", "duration": "rd", "x": "rx"},
}


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a log is written."""
    return tmp_path / "P01.tsv"


def reader_of(
    eye: Mapping[str, Any],
    columns: Mapping[str, Any],
    table: Mapping[str, str] | None = None,
    **logs: Any,
) -> LogReader:
    """A reader of logs of two eyes."""
    named = {key: value for key, value in columns.items() if value is not None}
    study = Study.model_validate(
        {
            "logs": {"files": ["*.tsv"], "columns": named, "eye": eye, **logs},
            "regions": {"file": "regions.csv", "kind": "boxes"},
        }
    )
    return reader_for(study.logs, study.screen, eyes=EyeChoice.of(study.logs, table))


def of_rows(
    eye: Mapping[str, Any], table: Mapping[str, str] | None = None, **logs: Any
) -> LogReader:
    """A reader of logs with one row an eye."""
    return reader_of(eye, {**COLUMNS, "eye": "eye"}, table, **logs)


def of_columns(
    eye: Mapping[str, Any], by_eye: Mapping[str, Any] | None = None, **columns: Any
) -> LogReader:
    """A reader of logs with both eyes in a row."""
    own = {"participant": "reader", "trial": "trial", **columns}
    return reader_of({**eye, "columns": by_eye or BY_EYE}, own)


def rows(*each: str) -> str:
    """Fixations of one row an eye: reader, onset, x, eye."""
    out = []
    for row in each:
        reader, onset, x, eye = row.split()
        out.append(f"{reader}\t1\t{onset}\t200\t{x}\t20\t{'' if eye == '-' else eye}\n")
    return ONE_EYE + "".join(out)


def both(*each: str) -> str:
    """Fixations of both eyes in a row: reader, then onset, duration and x of left and right."""
    out = []
    for row in each:
        reader, *cells = row.split()
        out.append("\t".join([reader, "1", *cells]) + "\n")
    return BOTH + "".join(out)


def set_aside(note: LogNote) -> int:
    """How many lines are of the other eye."""
    assert note.account.balances()
    tally = note.account.lines.get("rows of the other eye")
    return 0 if tally is None else tally.count


def seen(log: CanonicalLog) -> list[tuple[float, float]]:
    """Onset and position of every fixation."""
    return list(zip(log.onset_ms.tolist(), log.x_px.tolist(), strict=True))


# One row an eye.


@pytest.mark.parametrize(("eye", "x"), [("L", [10.0, 30.0]), ("R", [11.0, 31.0])])
def test_rows_of_the_eye_that_counts(path: Path, eye: str, x: list[float]) -> None:
    """Rows of the other eye are set aside and counted."""
    content = rows("P01 1000 10 L", "P01 1000 11 R", "P01 1300 30 L", "P01 1300 31 R")
    log, note = read(path, content, of_rows({"use": eye}))
    assert log.x_px.tolist() == x
    assert set_aside(note) == 2
    assert note.counts["rows of the other eye"] == 2


def test_log_of_one_eye(path: Path) -> None:
    """Where only the eye that counts was recorded, nothing is set aside."""
    log, note = read(path, rows("P01 1000 10 R", "P01 1300 30 R"), of_rows({"use": "R"}))
    assert (len(log), set_aside(note)) == (2, 0)


MIXED = rows("P01 1000 10 L", "P01 1000 11 R", "P02 1000 20 L", "P02 1000 21 R")


@pytest.mark.parametrize(
    ("eye", "table", "x"),
    [
        ({"use": "R"}, {}, [11.0, 21.0]),
        ({"use": "R", "readers": {"P02": "L"}}, {}, [11.0, 20.0]),
        ({"readers": {"P01": "L", "P02": "R"}}, {}, [10.0, 21.0]),
        ({"use": "R"}, {"P02": "L"}, [11.0, 20.0]),
        ({"use": "R"}, {"P02": ""}, [11.0, 21.0]),
        ({"use": "R", "readers": {"P02": "L"}}, {"P01": "L", "P02": "R"}, [10.0, 20.0]),
    ],
    ids=[
        "use",
        "a reader beside use",
        "readers alone",
        "the table",
        "the table is silent",
        "a reader goes before the table",
    ],
)
def test_eye_of_each_reader(
    path: Path, eye: Mapping[str, Any], table: Mapping[str, str], x: list[float]
) -> None:
    """A reader's own eye goes before the table's, and that before the eye of all."""
    log, note = read(path, MIXED, of_rows(eye, table))
    assert log.x_px.tolist() == x
    assert set_aside(note) == 2


def test_reader_without_an_eye_is_an_error(path: Path) -> None:
    """Where nothing says which eye counts for a reader, the reader is named."""
    assert refusal(path, MIXED, of_rows({"readers": {"P01": "L"}})) == (
        'P01.tsv:4: logs.eye: nothing says which eye of this reader counts; found "P02", expected '
        "an eye\n"
        '    fix: add the reader to [logs.eye] readers, or add use = "…"\n'
        "1 problem; nothing was written"
    )


def test_row_that_does_not_name_its_eye_is_an_error(path: Path) -> None:
    """It could be a fixation of either eye; every such row is named."""
    content = rows("P01 1000 10 R", "P01 1300 20 -", "P01 1600 30 NA", "P01 1900 30 L")
    fix = "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]\n"
    assert refusal(path, content, of_rows({"use": "R"})) == (
        'P01.tsv:3: column "eye": the row does not say which eye it is of; found "", expected an '
        f"eye\n{fix}"
        'P01.tsv:4: column "eye": the row does not say which eye it is of; found "NA", expected an '
        f"eye\n{fix}"
        "2 problems; nothing was written"
    )


def test_log_without_the_eye_that_counts_is_an_error(path: Path) -> None:
    """A reader of whom only the other eye was recorded is named, others are not."""
    content = rows("P01 1000 10 L", "P02 1000 10 R", "P02 1000 10 L")
    assert refusal(path, content, of_rows({"use": "R"})) == (
        "P01.tsv:2: logs.eye: the log has nothing of the eye that counts for this reader; found "
        '"P01", expected fixations of the eye R\n'
        "    fix: name the other eye for this reader in [logs.eye] readers, or correct the name of "
        "the eye\n"
        "1 problem; nothing was written"
    )


def test_third_eye_is_an_error(path: Path) -> None:
    """A reader has two eyes: of three names, the rarest that nothing names is a slip."""
    right = [f"P01 {1000 + 300 * n} 10 R" for n in range(4)]
    content = rows(*right, "P01 9000 10 r", "P01 1000 10 L", "P01 1300 10 L")
    said = refusal(path, content, of_rows({"use": "R"}))
    assert said.startswith(
        'P01.tsv:6: column "eye": few rows of this reader are of an eye that nothing names; found '
        '"r", expected R, or the other eye in about as many rows\n'
    )
    assert said.endswith("1 problem; nothing was written")


def test_few_rows_of_an_eye_that_nothing_names_are_an_error(path: Path) -> None:
    """A slip in the column of the eye must not take a fixation away."""
    content = rows(*(f"P01 {1000 + 300 * n} 10 R" for n in range(12)), "P01 9000 10 X")
    said = refusal(path, content, of_rows({"use": "R"}))
    assert said.startswith('P01.tsv:14: column "eye": few rows')


def test_few_rows_of_an_eye_that_the_study_names(path: Path) -> None:
    """Where [logs.where] lists both eyes, one of them may be rare."""
    content = rows(*(f"P01 {1000 + 300 * n} 10 R" for n in range(12)), "P01 9000 10 L")
    log, note = read(path, content, of_rows({"use": "R"}, where={"eye": ["L", "R"]}))
    assert (len(log), set_aside(note)) == (12, 1)


def test_rows_of_the_other_eye_are_not_read(path: Path) -> None:
    """What stands in a row that does not count can be anything."""
    content = rows("P01 1000 10 R", "P01 ? ? L")
    log, _ = read(path, content, of_rows({"use": "R"}))
    assert len(log) == 1


# Both eyes in a row.


@pytest.mark.parametrize(
    ("eye", "expected"),
    [("L", [(1000.0, 10.0), (1300.0, 20.0)]), ("R", [(1010.0, 12.0), (1310.0, 22.0)])],
)
def test_columns_of_the_eye_that_counts(
    path: Path, eye: str, expected: list[tuple[float, float]]
) -> None:
    """Onset, duration and position are those of the chosen eye."""
    content = both("P01 1000 200 10 1010 190 12", "P01 1300 200 20 1310 190 22")
    log, note = read(path, content, of_columns({"use": eye}))
    assert seen(log) == expected
    assert log.duration_ms.tolist() == [200.0 if eye == "L" else 190.0] * 2
    assert set_aside(note) == 0


def test_rows_in_which_only_the_other_eye_has_a_fixation(path: Path) -> None:
    """They are rows of the other eye; a row with a part of a fixation is not."""
    content = both(
        "P01 1000 200 10 NA NA NA", "P01 NA NA NA 1310 190 22", "P01 1600 200 NA 1610 190 30"
    )
    log, note = read(path, content, of_columns({"use": "L"}))
    assert log.onset_ms.tolist() == [1000.0, 1600.0]
    assert np.isnan(log.x_px).tolist() == [False, True]
    assert log.source_line.tolist() == [2, 4]
    assert set_aside(note) == 1


def test_row_of_neither_eye_is_no_row_of_the_other(path: Path) -> None:
    """A row without any fixation is as wrong as in a log of one eye."""
    content = both("P01 1000 200 10 1010 190 12", "P01 NA NA NA NA NA NA")
    said = refusal(path, content, of_columns({"use": "R"}))
    assert said.startswith('P01.tsv:3: column "rt": the fixation has no onset; found "NA"')
    assert 'P01.tsv:3: column "rd": the fixation has no duration; found "NA"' in said


def test_part_of_a_fixation_is_an_error(path: Path) -> None:
    """A fixation of the chosen eye without a duration is told, although the other eye has one."""
    content = both("P01 1000 NA 10 1010 190 12")
    said = refusal(path, content, of_columns({"use": "L"}))
    assert said.startswith('P01.tsv:2: column "ld": the fixation has no duration')


def test_times_that_both_eyes_share(path: Path) -> None:
    """Where a row says once when it was, it is a fixation of both eyes, also without a position."""
    by_eye = {"L": {"x": "lx"}, "R": {"x": "rx"}}
    reader = of_columns({"use": "L"}, by_eye, onset="t", duration="d")
    content = "reader\ttrial\tt\td\tlx\trx\nP01\t1\t1000\t200\t10\t12\nP01\t1\t1300\t200\tNA\t22\n"
    log, note = read(path, content, reader)
    assert log.onset_ms.tolist() == [1000.0, 1300.0]
    assert np.isnan(log.x_px).tolist() == [False, True]
    assert set_aside(note) == 0


TWO_READERS = both(
    "P01 1000 200 10 1010 190 12",
    "P02 1000 200 20 1010 190 22",
    "P01 1300 200 30 NA NA NA",
    "P02 1300 200 40 NA NA NA",
)


def test_readers_of_different_eyes_in_one_log(path: Path) -> None:
    """Each row is read by its reader's eye."""
    log, note = read(path, TWO_READERS, of_columns({"use": "R", "readers": {"P01": "L"}}))
    assert seen(log) == [(1000.0, 10.0), (1010.0, 22.0), (1300.0, 30.0)]
    assert set_aside(note) == 1


@pytest.mark.parametrize(
    ("line", "cell", "column"), [(0, "200", "ld"), (1, "190", "rd")], ids=["left", "right"]
)
def test_message_names_the_column_of_the_eye(path: Path, line: int, cell: str, column: str) -> None:
    """In a log of readers of different eyes, each cell is told of under its own header."""
    each = TWO_READERS.split("\n")
    each[line + 1] = each[line + 1].replace(cell, "long")
    reader = of_columns({"use": "R", "readers": {"P01": "L"}})
    assert refusal(path, "\n".join(each), reader).startswith(
        f'P01.tsv:{line + 2}: column "{column}": this is no number; found "long"'
    )


def test_messages_of_both_eyes_are_all_counted(path: Path) -> None:
    """Naming the column changes neither how many problems there are nor their order."""
    content = both(*["P01 1000 0 10 1010 0 12", "P02 1000 0 10 1010 0 12"] * 10)
    said = refusal(path, content, of_columns({"use": "R", "readers": {"P01": "L"}}))
    assert said.endswith("20 problems; nothing was written")
    assert said.startswith('P01.tsv:2: column "ld": the duration is not above 0')
    assert 'P01.tsv:3: column "rd": the duration is not above 0' in said
    assert " or " not in said.split("fix:")[0]


def test_eye_that_has_no_columns_is_an_error(path: Path) -> None:
    """An eye that the reader table names and the study does not know is told with its reader."""
    reader = reader_of(
        {"use": "L", "columns": BY_EYE},
        {"participant": "reader", "trial": "trial"},
        {"P02": "both"},
    )
    assert refusal(path, TWO_READERS, reader) == (
        "P01.tsv:3: logs.eye: the eye that counts for this reader has no columns; found "
        '"both for P02", expected one of L, R\n'
        "    fix: correct the name of the eye, or add its columns to [logs.eye.columns]\n"
        "1 problem; nothing was written"
    )


def test_nothing_of_the_eye_that_counts_in_any_row(path: Path) -> None:
    """A reader whose eye never has a fixation is an error."""
    content = both("P01 NA NA NA 1010 190 12", "P01 NA NA NA 1310 190 12")
    said = refusal(path, content, of_columns({"use": "L"}))
    assert "the log has nothing of the eye that counts for this reader" in said


def test_blinks_and_labels_of_each_eye(path: Path) -> None:
    """Whatever column an eye has of its own is taken from the chosen eye."""
    by_eye = {
        "L": {"duration": "ld", "label": "la", "blink": "lb"},
        "R": {"duration": "rd", "label": "ra", "blink": "rb"},
    }
    reader = of_columns({"use": "R"}, by_eye, onset="t")
    content = "reader\ttrial\tt\tld\tla\tlb\trd\tra\trb\nP01\t1\t1000\t200\tverb\t1\t190\tnoun\t0\n"
    log, _ = read(path, content, reader)
    assert log.label is not None
    assert (log.label.text(0), log.blink[0]) == ("noun", np.False_)


def test_column_of_one_eye_that_the_log_lacks(path: Path) -> None:
    """Both eyes must have their columns, whichever counts."""
    said = refusal(path, TWO_READERS.replace("rx", "xr"), of_columns({"use": "L"}))
    assert said.startswith('P01.tsv:1: there is no column "rx"')
