"""What each column of a table means, by its name and by its cells."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

import etl
from tests.drafting.small_logs import put, reading, table, write_readers

PLAIN = {
    "reader": "participant",
    "trial": "trial",
    "sentence": "item",
    "start": "onset",
    "dur": "duration",
    "gx": "x",
    "gy": "y",
}
LETTERS = dict(
    zip("ABCDEFG", ("participant", "trial", "fixation", "onset", "duration", "x", "y"), strict=True)
)


def columns_of(drafted: etl.Draft) -> dict[str, Any]:
    """The columns of a draft, those with a unit as (header, unit)."""
    columns = tomllib.loads(drafted.text)["logs"]["columns"]
    return {
        name: (one["column"], one["unit"]) if isinstance(one, dict) else one
        for name, one in columns.items()
    }


def asked(drafted: etl.Draft) -> list[str]:
    """The keys that are open, but for those about regions, which no log can tell."""
    return [q.key for q in drafted.questions if not q.key.startswith("regions.")]


@pytest.mark.parametrize(
    "headers",
    [
        pytest.param(("reader", "trial", "n", "start", "dur", "gx", "gy"), id="English"),
        pytest.param(("VP", "Durchgang", "FixNr", "Beginn", "Dauer", "X", "Y"), id="German"),
        pytest.param(("sujet", "essai", "n°", "début", "durée", "pos_x", "pos_y"), id="French"),
        pytest.param(
            ("participante", "ensayo", "número", "inicio", "duración", "x", "y"), id="Spanish"
        ),
        pytest.param(
            ("participante", "tentativa", "ordinal", "início", "duração", "x", "y"),
            id="Portuguese",
        ),
        pytest.param(("soggetto", "prova", "numero", "inizio", "durata", "x", "y"), id="Italian"),
        pytest.param(
            ("被试", "试次", "注视序号", "开始时间", "注视时长", "横坐标", "纵坐标"), id="Chinese"
        ),
        pytest.param(tuple("ABCDEFG"), id="names that say nothing"),
        pytest.param(
            ("SubjID", "TrialNo", "FixIndex", "FixStart [ms]", "Fix-Dur (ms)", "X(px)", "Y(px)"),
            id="units and signs",
        ),
    ],
)
def test_columns_are_found_under_any_names(headers: tuple[str, ...], tmp_path: Path) -> None:
    """Names in any of these languages, or none at all, lead to the same understanding."""
    write_readers(tmp_path, dict(zip(headers, LETTERS.values(), strict=True)))
    drafted = etl.draft(tmp_path)
    reader, trial, number, onset, duration, x, y = headers
    assert columns_of(drafted) == {
        "participant": reader,
        "trial": trial,
        "fixation": number,
        "onset": (onset, "ms"),
        "duration": (duration, "ms"),
        "x": (x, "px"),
        "y": (y, "px"),
    }


def test_cells_overrule_names_that_are_swapped(tmp_path: Path) -> None:
    """Where a column is called like something that its cells are not, the cells decide."""
    swapped = {"duration": "onset", "onset": "duration", "trial": "fixation", "fix": "trial"}
    write_readers(tmp_path, {"reader": "participant", **swapped, "x": "x", "y": "y"})
    drafted = etl.draft(tmp_path)
    found = columns_of(drafted)
    assert found["onset"] == ("duration", "ms")
    assert found["duration"] == ("onset", "ms")
    assert (found["trial"], found["fixation"]) == ("fix", "trial")
    assert '# Look: column "onset" is called like the onset, but its cells are not' in drafted.text


def test_swapped_coordinates_are_asked_about(tmp_path: Path) -> None:
    """Where y goes over the lines and x stays, nobody but the lab knows which is which."""
    write_readers(tmp_path, {**PLAIN, "gx": "y", "gy": "x"})
    drafted = etl.draft(tmp_path)
    assert asked(drafted) == ["logs.columns.x", "logs.columns.y"]
    assert 'question: is it "gx", as the header says, or "gy"?' in drafted.text


@pytest.mark.parametrize(
    ("cells", "unit"), [("duration", "ms"), ("duration_s", "s"), ("duration_us", "us")]
)
def test_unit_of_durations_is_told_by_their_size(cells: str, unit: str, tmp_path: Path) -> None:
    """A median of 0.2 is in seconds, one of 200 in milliseconds, one of 200,000 in microseconds."""
    write_readers(tmp_path, {**PLAIN, "dur": cells})
    found = columns_of(etl.draft(tmp_path))
    assert (found["duration"], found["onset"]) == (("dur", unit), ("start", "ms"))


def test_unit_that_its_header_contradicts_is_asked_about(tmp_path: Path) -> None:
    """Seconds by the header and milliseconds by the numbers: that is for the lab to say."""
    columns = {("dur [s]" if name == "dur" else name): cell for name, cell in PLAIN.items()}
    write_readers(tmp_path, columns)
    drafted = etl.draft(tmp_path)
    assert asked(drafted) == ["logs.columns.onset.unit", "logs.columns.duration.unit"]
    assert "the header says s, but a median of 2" in drafted.text


def test_degrees_are_told_by_sign_and_size(tmp_path: Path) -> None:
    """Small numbers on both sides of zero are angles, for which the screen must be known."""
    write_readers(tmp_path, {**PLAIN, "gx": "x_deg", "gy": "y_deg"})
    drafted = etl.draft(tmp_path)
    assert columns_of(drafted)["x"] == ("gx", "deg")
    assert asked(drafted) == [
        *("screen.width_px", "screen.height_px", "screen.width_cm", "screen.distance_cm"),
        "screen.y_axis",
    ]


def test_end_is_taken_where_there_is_no_duration(tmp_path: Path) -> None:
    """A column of times that follow the onset in each row says how long a fixation lasted."""
    columns = {name: cell for name, cell in PLAIN.items() if name != "dur"}
    write_readers(tmp_path, {**columns, "stop": "end"})
    assert columns_of(etl.draft(tmp_path))["end"] == ("stop", "ms")


def test_duration_goes_before_an_end_that_agrees(tmp_path: Path) -> None:
    """With both, the duration is taken, and it is said how well the end agrees."""
    write_readers(tmp_path, {**PLAIN, "t_end": "end"})
    drafted = etl.draft(tmp_path)
    assert "end" not in columns_of(drafted)
    said = " ".join(line.lstrip("# ") for line in drafted.text.split("\n"))
    assert 'column "t_end" is the end: onset + duration, to about a millisecond, in 100%' in said


def test_columns_that_nobody_needs_are_left_alone(tmp_path: Path) -> None:
    """Pupils, amplitudes and the like are taken for nothing."""
    write_readers(tmp_path, {**PLAIN, "pupil": "pupil", "amp": "amplitude"})
    assert set(columns_of(etl.draft(tmp_path))) == {
        *("participant", "trial", "item", "onset", "duration", "x", "y")
    }


def test_facts_about_trials_are_listed_as_candidates(tmp_path: Path) -> None:
    """Other columns that are the same in all rows of a trial may be factors."""
    write_readers(tmp_path, {**PLAIN, "block": "block"})
    assert '# factors = ["block"]' in etl.draft(tmp_path).text


def test_duration_that_no_column_holds_is_asked_for(tmp_path: Path) -> None:
    """What is needed and not there is a question."""
    write_readers(tmp_path, {name: cell for name, cell in PLAIN.items() if name != "dur"})
    drafted = etl.draft(tmp_path)
    assert asked(drafted) == ["logs.columns.duration"]
    assert columns_of(drafted)["duration"] == "?"


def test_two_columns_that_may_be_trials_are_a_question(tmp_path: Path) -> None:
    """Where two unnamed columns tell trials apart equally well, both are named in the question."""
    columns = {"a": "trial", "b": "trial", "start": "onset", "dur": "duration", "x": "x", "y": "y"}
    write_readers(tmp_path, columns)
    drafted = etl.draft(tmp_path)
    assert "logs.columns.trial" in asked(drafted)
    assert 'It may be one of "a", "b"' in drafted.text


def test_areas_take_the_place_of_coordinates(tmp_path: Path) -> None:
    """A log that names areas and has no coordinates needs regions by label."""
    columns = {name: cell for name, cell in PLAIN.items() if name not in ("gx", "gy")}
    write_readers(tmp_path, {**columns, "area": "area"})
    drafted = etl.draft(tmp_path)
    data = tomllib.loads(drafted.text)
    assert data["logs"]["columns"]["label"] == "area"
    assert data["regions"] == {"file": "?", "kind": "labels"}


def test_rows_of_other_kinds_are_left_out(tmp_path: Path) -> None:
    """Where a column says that rows are saccades, only those of fixations are asked for."""
    for number in (1, 2, 3):
        lines = table(reading(f"P{number:02}"), PLAIN).split("\n")
        rows = [f"{line}\tfixation\n{line}\tsaccade" for line in lines[1:-1]]
        put(tmp_path / f"P{number:02}.tsv", "\n".join([f"{lines[0]}\twhat", *rows]) + "\n")
    drafted = etl.draft(tmp_path)
    assert tomllib.loads(drafted.text)["logs"]["where"] == {"what": ["fixation"]}
    assert asked(drafted) == []


def test_both_eyes_in_rows_of_their_own_are_asked_about(tmp_path: Path) -> None:
    """Which eye counts is a question that tells how many rows there are of each."""
    for number in (1, 2, 3):
        lines = table(reading(f"P{number:02}"), PLAIN).split("\n")
        rows = [f"{line}\tL\n{line}\tR" for line in lines[1:-1]]
        put(tmp_path / f"P{number:02}.tsv", "\n".join([f"{lines[0]}\teye", *rows]) + "\n")
    drafted = etl.draft(tmp_path)
    assert asked(drafted) == ["logs.eye.use"]
    assert columns_of(drafted)["eye"] == "eye"
    assert 'question: which eye counts, "L" (' in drafted.text


def test_both_eyes_in_one_row_have_tables_of_their_own(tmp_path: Path) -> None:
    """Columns that come in pairs of left and right are those of the eyes."""
    columns = {name: cell for name, cell in PLAIN.items() if name not in ("gx", "gy")}
    pairs = {"x_left": "x", "x_right": "x", "y_left": "y", "y_right": "y"}
    write_readers(tmp_path, {**columns, **pairs})
    drafted = etl.draft(tmp_path)
    eyes = tomllib.loads(drafted.text)["logs"]["eye"]["columns"]
    assert {eye: one["x"]["column"] for eye, one in eyes.items()} == {
        "left": "x_left",
        "right": "x_right",
    }
    assert asked(drafted) == ["logs.eye.use"]


def test_samples_are_told_by_their_pace(tmp_path: Path) -> None:
    """Rows that follow each other every few milliseconds, without durations, are samples."""
    rows = ["reader\ttrial\tt\tx\ty"]
    for fixated in reading():
        for step in range(0, fixated.duration_ms, 4):
            t = fixated.onset_ms + step
            rows.append(f"P01\t{fixated.trial}\t{t}\t{fixated.x_px + step % 3}\t{fixated.y_px}")
    put(tmp_path / "P01.tsv", "\n".join(rows) + "\n")
    drafted = etl.draft(tmp_path)
    data = tomllib.loads(drafted.text)
    assert data["logs"]["samples"] == {"method": "engbert_kliegl"}
    assert "every 4 ms, as samples of gaze do at 250 a second" in drafted.text
    assert "duration" not in data["logs"]["columns"]


def test_marks_for_missing_values_are_listed(tmp_path: Path) -> None:
    """Words in columns of numbers that stand for no value go into the list of marks."""
    text = table(reading(), PLAIN).split("\n")
    rows = [
        line.rsplit("\t", 1)[0] + "\tn/a" if n % 9 == 5 else line for n, line in enumerate(text)
    ]
    put(tmp_path / "P01.tsv", "\n".join(rows))
    assert tomllib.loads(etl.draft(tmp_path).text)["logs"]["missing"] == ["", ".", "NA", "n/a"]


def test_log_with_other_columns_is_named(tmp_path: Path) -> None:
    """A log that lacks a column of the others is warned of with what it lacks."""
    write_readers(tmp_path, PLAIN)
    columns = {("gx_px" if name == "gx" else name): cell for name, cell in PLAIN.items()}
    put(tmp_path / "P04.tsv", table(reading("P04"), columns))
    (warning,) = etl.draft([tmp_path / "*.tsv"]).findings.of("warning")
    assert warning.problem == "the log has other columns than most"
    assert (warning.path, warning.expected) == (
        (tmp_path / "P04.tsv").as_posix(),
        'columns "gx" too',
    )
