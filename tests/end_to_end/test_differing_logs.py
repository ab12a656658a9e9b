"""Every log that differs from the rest is named, and how; what cannot be right is refused."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import pytest

import etl
from tests.end_to_end.building import build
from tests.end_to_end.many_logs import (
    HEADER,
    REGIONS,
    Change,
    Row,
    check,
    each,
    first_trials,
    make,
    name_of,
    renamed,
    rows_of_log,
    scaled,
    swapped,
    text_of,
)

ODD = 3
NAME = name_of(ODD)
SAME = {column: column for column in HEADER}
NUMBERS = ("start_ms", "dur_ms", "x", "y")


def all_of(*changes: Change) -> Change:
    """Several changes, one after the other."""

    def changed(rows: list[Row]) -> None:
        for change in changes:
            change(rows)

    return changed


def every_third(rows: list[Row]) -> None:
    """Leave every third row only."""
    rows[:] = rows[::3]


def twice_the_trials(rows: list[Row]) -> None:
    """Go on for as many trials again and more."""
    rows[:] = rows_of_log(ODD, trials=25)


def with_a_remark(rows: list[Row]) -> None:
    """Give every row one column more."""
    for row in rows:
        row["remark"] = "fine"


def said_about(findings: etl.Findings, name: str = NAME) -> list[str]:
    """The first line of everything that is said about a log."""
    return [f.text().partition("\n")[0] for f in findings if f.path == name]


#: What is changed in one of twelve logs, and what is said of it without an error.
TOLD = {
    "decimal sign": (
        all_of(*(each(column, lambda cell: cell.replace(".", ",")) for column in NUMBERS)),
        [f'note: {NAME}: the decimal sign is ",", and "." in 11 of 12 logs'],
    ),
    "column left out": (
        renamed({column: column for column in HEADER if column != "device"}),
        [f'note: {NAME}: the columns are not those of the rest, 11 of 12 logs: without "device"'],
    ),
    "column besides": (
        with_a_remark,
        [
            (
                f"note: {NAME}: the columns are not those of the rest, 11 of 12 logs: "
                'with "remark" besides'
            )
        ],
    ),
    "column in another letter case": (
        renamed({**SAME, "device": "Device"}),
        [
            (
                f"note: {NAME}: the columns are not those of the rest, 11 of 12 logs: "
                '"Device" for "device"'
            )
        ],
    ),
    "columns in another order": (
        renamed(dict(reversed(SAME.items()))),
        [f"note: {NAME}: the columns are not those of the rest, 11 of 12 logs: in another order"],
    ),
    "few trials": (
        first_trials(3),
        [
            (
                f"warning: {NAME}: the log holds far fewer trials a reader than the rest, whose "
                "median is 10: 3"
            )
        ],
    ),
    "many trials": (
        twice_the_trials,
        [
            (
                f"warning: {NAME}: the log holds far more trials a reader than the rest, whose "
                "median is 10: 25"
            )
        ],
    ),
    "few fixations": (
        every_third,
        [
            (
                f"warning: {NAME}: the log holds far fewer fixations a reader than the rest, whose "
                "median is 60: 20"
            )
        ],
    ),
    "long durations": (
        all_of(scaled("dur_ms", 4), scaled("start_ms", 4)),
        [
            (
                f"warning: {NAME}: the median duration is more than 3 times off that of the rest, "
                "220.5 ms: 882 ms"
            )
        ],
    ),
    "steps from onset to onset": (
        scaled("start_ms", 20),
        [
            (
                f"warning: {NAME}: the time from onset to onset is more than 10 times off that of "
                "the rest, 1.136 durations: 22.72 durations"
            )
        ],
    ),
    "another height": (
        each("y", lambda cell: f"{float(cell) + 300:.1f}"),
        [
            (
                f"warning: {NAME}: the fixations lie elsewhere from top to bottom than in the "
                "rest, nine in ten of theirs between 523 and 540 px: 826 to 836 px"
            )
        ],
    ),
    "a narrower range": (
        each("x", lambda cell: f"{450 + float(cell) / 10:.2f}"),
        [
            (
                f"warning: {NAME}: the fixations lie elsewhere from left to right than in the "
                "rest, nine in ten of theirs between 262 and 764 px: 476 to 526 px"
            )
        ],
    ),
    "no positions": (
        all_of(each("x", lambda _: ""), each("y", lambda _: "")),
        [f"warning: {NAME}: 100% of the fixations have no position; in the rest it is 0% of them"],
    ),
}


@pytest.mark.parametrize("what", TOLD)
def test_difference_of_one_log_is_told(tmp_path: Path, what: str) -> None:
    """Of twelve logs one is changed: it is named with what it has and what the rest has."""
    change, expected = TOLD[what]
    # Only x decides about regions, so that a log at another height is still a sound one.
    findings = check(make(tmp_path, changes={ODD: change}, vertical="any"))
    assert said_about(findings) == expected
    assert not findings.failed
    assert not [f for f in findings if f.path.startswith("logs/") and f.path != NAME]


def as_utf_16(text: str) -> bytes:
    """In another encoding."""
    return text.encode("utf-16")


#: What is done to the text of one of twelve logs, and what is said of it.
WRITTEN = {
    "encoding": (as_utf_16, f"note: {NAME}: the encoding is utf-16, and utf-8 in 11 of 12 logs"),
    "separator": (
        lambda text: text.replace("\t", ";").encode(),
        f"note: {NAME}: the separator of fields is semicolons, and tabs in 11 of 12 logs",
    ),
    "remarks": (
        lambda text: b"# recorded again\n# on Friday\n" + text.encode(),
        f"note: {NAME}:1: the log holds 2 lines of a kind that 11 of 12 logs do not: remarks",
    ),
}


@pytest.mark.parametrize("what", WRITTEN)
def test_other_way_of_writing_is_told(tmp_path: Path, what: str) -> None:
    """Another encoding or separator, and lines that the others have not, are told as notes."""
    written, expected = WRITTEN[what]
    study_file = make(tmp_path)
    (tmp_path / NAME).write_bytes(written(text_of(rows_of_log(ODD))))
    assert said_about(check(study_file)) == [expected]


#: What is changed in one of twelve logs, and the problem that stops the build.
REFUSED = {
    "durations in microseconds": (
        scaled("dur_ms", 1000),
        (
            "the middle (median) duration of the fixations is far off that of the other logs: this "
            'log has another unit; found "220500 ms", expected about 220.5 ms'
        ),
    ),
    "durations in seconds": (
        scaled("dur_ms", 0.001),
        (
            "the middle (median) duration of the fixations is far off that of the other logs: this "
            'log has another unit; found "0.2205 ms", expected about 220.5 ms'
        ),
    ),
    "onsets in microseconds": (
        scaled("start_ms", 1000),
        (
            "the time from one onset to the next is far off that of the other logs: this log has "
            'another unit; found "1136.05 durations", expected about 1.13605 durations'
        ),
    ),
    "onsets in seconds": (
        scaled("start_ms", 0.001),
        (
            "the time from one onset to the next is far off that of the other logs: this log has "
            'another unit; found "0.00113605 durations", expected about 1.13605 durations'
        ),
    ),
    "x and y swapped": (
        swapped("x", "y"),
        (
            "nearly all fixations lie outside every region, unlike those of the other logs; found "
            '"54 of 60", expected about 0% of them, as in the other logs'
        ),
    ),
    "origin at the centre": (
        all_of(
            each("x", lambda cell: f"{float(cell) - 960:.1f}"),
            each("y", lambda cell: f"{float(cell) - 540:.1f}"),
        ),
        (
            "nearly all fixations lie outside every region, unlike those of the other logs; found "
            '"60 of 60", expected about 0% of them, as in the other logs'
        ),
    ),
}


@pytest.mark.parametrize("what", REFUSED)
def test_log_that_cannot_be_right_is_refused(tmp_path: Path, what: str) -> None:
    """Another unit, swapped axes, another origin: an error that names the log; nothing is built."""
    change, problem = REFUSED[what]
    study_file = make(tmp_path, changes={ODD: change})
    findings = check(study_file)
    assert f"{NAME}: {problem}" in [f.text().partition("\n")[0] for f in findings.of("error")]
    assert {f.path for f in findings.of("error")} == {NAME}
    with pytest.raises(etl.DataError, match=r"another unit|outside every region"):
        build(study_file)
    assert not (tmp_path / "out").exists()


def test_of_two_logs_the_one_in_another_unit_is_refused(tmp_path: Path) -> None:
    """With two logs it is the one whose durations are not those of reading."""
    findings = check(make(tmp_path, 2, {2: scaled("dur_ms", 0.001)}))
    assert {f.path for f in findings.of("error")} == {name_of(2)}


def test_reader_whom_a_note_leaves_out_may_lie_anywhere(tmp_path: Path) -> None:
    """A log that misses the regions is no error where a note leaves its reader out."""
    study_file = make(tmp_path, changes={ODD: swapped("x", "y")})
    notes = '[screening.participants]\nnotes = "notes.csv"\n'
    study_file.write_text(study_file.read_text(encoding="utf-8") + notes, encoding="utf-8")
    (tmp_path / "notes.csv").write_text(
        "participant,trial,reason\nP003,,lost the eye\n", encoding="utf-8"
    )
    assert not check(study_file).failed


def test_texts_with_few_regions_leave_most_fixations_outside(tmp_path: Path) -> None:
    """Where all logs have most fixations outside, none is wrong for that."""
    study_file = make(tmp_path)
    (tmp_path / "regions.csv").write_text(
        "".join(REGIONS.splitlines(keepends=True)[:2]), encoding="utf-8"
    )
    findings = check(study_file)
    assert not findings.failed
    assert [f.problem for f in findings.of("warning")] == [
        "83% of the fixations lie outside every region"
    ]


def test_study_without_a_fixation_in_a_region_is_refused(tmp_path: Path) -> None:
    """Where not one fixation lies in a region, in no log, there is nothing to measure."""
    study_file = make(tmp_path)
    text = re.sub(r",500,(\d+),560", r",2500,\1,2560", REGIONS)
    (tmp_path / "regions.csv").write_text(text, encoding="utf-8")
    assert [f.problem for f in check(study_file).of("error")] == [
        "not one of 720 fixations lies in a region"
    ]


def without_end(path: Path) -> None:
    """Take the last line end away, and a digit of the last cell with it."""
    path.write_bytes(path.read_bytes()[:-2])


def cut_logs(folder: Path, logs: int, cut: int) -> Path:
    """A study of which the first logs are cut short."""
    study_file = make(folder, logs)
    for number in range(1, cut + 1):
        without_end(folder / name_of(number))
    return study_file


@pytest.mark.parametrize(("logs", "cut"), [(3, 1), (12, 5)])
def test_log_that_ends_within_its_last_line_is_refused(tmp_path: Path, logs: int, cut: int) -> None:
    """A last line without an end, where most logs have one, is a file cut short, at that line."""
    errors = check(cut_logs(tmp_path, logs, cut)).of("error")
    assert [(f.path, f.line) for f in errors] == [(name_of(n), 61) for n in range(1, cut + 1)]
    assert errors[0].text() == (
        f"{name_of(1)}:61: the last line has no line end, but {logs - cut} of {logs} logs have "
        "one: the file seems to be cut short; expected a line end after the last row\n"
        "    fix: copy the file again; if it is whole, add a line end at its end"
    )


@pytest.mark.parametrize(
    ("logs", "cut", "told"),
    [
        (1, 1, []),
        (3, 3, []),
        (2, 1, [f"{name_of(2)}: the last line is with a line end, and without one in 1 of 2 logs"]),
        (3, 2, [f"{name_of(3)}: the last line is with a line end, and without one in 2 of 3 logs"]),
    ],
    ids=["alone", "all", "one of two", "most"],
)
def test_logs_that_mostly_end_without_a_line_end_are_whole(
    tmp_path: Path, logs: int, cut: int, told: list[str]
) -> None:
    """Some programs end files so: then a log that does not is told, and none is refused."""
    findings = check(cut_logs(tmp_path, logs, cut))
    assert not findings.failed
    notes = [f for f in findings if "last line" in f.problem]
    assert [f"{f.path}: {f.problem}" for f in notes] == told


def commas(rows: list[Row]) -> None:
    """Write decimal commas."""
    all_of(*(each(column, lambda cell: cell.replace(".", ",")) for column in NUMBERS))(rows)


def test_two_hundred_differing_logs_are_all_named(tmp_path: Path) -> None:
    """Of 401 logs 200 differ: each is named, in one note, with no name broken."""
    odd = range(1, 401, 2)
    findings = check(make(tmp_path, 401, dict.fromkeys(odd, commas), trials=2))
    (note,) = (f for f in findings if "decimal sign" in f.problem)
    assert note.problem == 'in 200 of 401 logs the decimal sign is ",", and "." in 201'
    assert note.files == tuple(name_of(number) for number in odd)
    lines = note.text().splitlines()
    assert lines[0] == f"note: {note.problem}"
    assert ", ".join(note.files) == " ".join(line.removeprefix("    ") for line in lines[1:])
    assert max(map(len, lines)) <= 100


@pytest.mark.parametrize(
    ("change", "remark"),
    [
        (lambda n: first_trials(3 + n % 3), lambda n: f"{3 + n % 3}"),
        (lambda n: renamed({**SAME, "device": f"d{n}"}), lambda n: f'with "d{n}" besides'),
    ],
    ids=["numbers", "columns"],
)
def test_logs_that_differ_each_in_its_own_way_have_remarks(
    tmp_path: Path, change: Callable[[int], Change], remark: Callable[[int], str]
) -> None:
    """Where each has a value of its own, one finding names all logs, with what each has."""
    odd = range(1, 9)
    findings = check(make(tmp_path, 20, {number: change(number) for number in odd}))
    (told,) = (f for f in findings if f.files)
    assert len(told.files) == len(odd)
    for number, named in zip(odd, told.files, strict=True):
        assert named.startswith(f"{name_of(number)} (")
        assert remark(number) in named


def test_files_with_one_problem_are_all_named(tmp_path: Path) -> None:
    """Of thirty logs without a needed column ten are spelled out and twenty named."""
    bare = renamed({column: column for column in HEADER if column != "dur_ms"})
    findings = check(make(tmp_path, 30, dict.fromkeys(range(1, 31), bare), trials=1))
    assert findings.count("error") == 30
    said = findings.text()
    assert "… and 20 more in 20 more files: " in said
    assert all(name_of(number) in said for number in range(1, 31))


@pytest.mark.parametrize("logs", [1, 2, 3, 12])
def test_nothing_is_told_of_logs_that_are_alike(tmp_path: Path, logs: int) -> None:
    """Logs of other readers, with other fixations, that are written alike give no finding."""
    findings = check(make(tmp_path, logs))
    assert [f.severity for f in findings] == ["note"]
    assert findings.items[0].problem.endswith("0 of them outside every region")


def test_order_of_the_logs_does_not_matter(tmp_path: Path) -> None:
    """What is told of a log is the same whether it is the first or the last."""
    for number in (1, 12):
        findings = check(make(tmp_path / str(number), changes={number: first_trials(3)}))
        said = said_about(findings, name_of(number))
        assert [line.split(": ", 2)[2] for line in said] == [
            "the log holds far fewer trials a reader than the rest, whose median is 10: 3"
        ]


def test_workers_change_nothing_that_is_told(tmp_path: Path) -> None:
    """Two processes find what one finds, in the same order."""
    study = etl.load_study(make(tmp_path, changes={2: commas, 5: first_trials(3)}))
    assert etl.check(study, workers=2).lines() == etl.check(study, workers=1).lines()


@pytest.mark.parametrize("odd", [1, 3, 12])
def test_guessed_encoding_is_told_once(tmp_path: Path, odd: int) -> None:
    """However many logs are no UTF-8, one warning says so; all of them need no list."""
    study_file = make(tmp_path, 12)
    for number in range(1, odd + 1):
        path = tmp_path / name_of(number)
        path.write_bytes(b"# recorded by M\xfcller\n" + path.read_bytes())
    told = [f for f in build(study_file).findings if "Windows-1252" in f.problem]
    assert [f.problem for f in told] == [
        f"{odd} of 12 logs are not UTF-8 and were read as Windows-1252"
    ]
    assert len(told[0].files) == (3 if odd == 3 else 0)
    assert ("in [logs]" in told[0].fix) == (odd == 12)
