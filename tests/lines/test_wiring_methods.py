"""Passages that drift, built as a study: which method finds the words that were read."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.lines import METHODS
from tests.end_to_end.building import rows_of, tables_of
from tests.lines.passages_study import (
    HEIGHT,
    LAYOUT,
    STUDY,
    TEXT,
    TOP,
    Built,
    Fixated,
    Passages,
    boxes_file,
    read_through,
    region_file,
)

DRIFTED = Passages({("A1", "1"): read_through(1), ("A1", "2"): read_through(2)})
#: A text of one line, and a reader of it.
ONE_LINE = TEXT[:1]


@pytest.fixture(scope="module")
def drifted(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Two drifted trials, built without a word about lines."""
    return DRIFTED.built(tmp_path_factory.mktemp("drifted"))


def test_consensus_finds_every_word_of_drifted_trials(drifted: Built) -> None:
    """Where the study file says nothing of lines, they are told by consensus."""
    assert drifted.right() == 1.0


def test_nearest_lines_are_wrong_in_drifted_trials(tmp_path: Path) -> None:
    """The drift reaches beyond half the distance between lines, so that the nearest is another."""
    assert (DRIFTED + '[lines]\nmethod = "nearest"\n').built(tmp_path).right() < 0.8


def test_saying_nothing_is_saying_consensus(tmp_path: Path, drifted: Built) -> None:
    """The stated default gives the same tables as its absence."""
    stated = (DRIFTED + '[lines]\nmethod = "consensus"\n').built(tmp_path)
    own, other = tables_of(drifted.folder), tables_of(stated.folder)
    assert {name for name in own if own[name] != other[name]} <= {"audit.html"}


@pytest.mark.parametrize("method", METHODS)
def test_every_published_method_is_built_as_it_is(tmp_path: Path, method: str) -> None:
    """Fixations close to their lines: the tables hold the lines of the method asked for."""
    near = Passages({("A1", "1"): read_through(3, shift=0.0, noise_px=2.0)})
    built = (near + f'[lines]\nmethod = "{method}"\n').built(tmp_path)
    assert built.right(lines=True) == 1.0
    assert {row["line_confidence"] for row in built.fixations} == {None}


def test_settings_reach_their_method(tmp_path: Path) -> None:
    """Lines stretched by a half are found within bounds that allow it, not within the published."""
    shifted = Passages({("A1", "1"): read_through(4, shift=0.5, noise_px=2.0)})
    wide = '[lines]\nmethod = "stretch"\nstretch = { scale = [0.5, 1.1] }\n'
    narrow = '[lines]\nmethod = "stretch"\n'
    assert (shifted + wide).built(tmp_path / "wide").right(lines=True) == 1.0
    assert (shifted + narrow).built(tmp_path / "narrow").right(lines=True) < 1.0


def test_right_to_left_text_is_read_in_a_mirror(tmp_path: Path) -> None:
    """The same drift, the other way round."""
    made = Passages(
        {("A1", "1"): read_through(5, right_to_left=True)},
        STUDY + 'direction = "rtl"\n',
    )
    built = made.built(tmp_path)
    assert built.right() == 1.0
    assert sum(row["return_sweep"] for row in built.fixations) == len(TEXT) - 1


@pytest.mark.parametrize("right_to_left", [False, True], ids=["to the right", "to the left"])
def test_boxes_of_several_lines_are_read_by_lines(tmp_path: Path, right_to_left: bool) -> None:
    """The direction follows from the order of the boxes; on its line only x decides."""
    made = Passages(
        {("A1", "1"): read_through(6, right_to_left=right_to_left)},
        STUDY.replace(LAYOUT, "").replace('"words"', '"boxes"'),
        boxes_file(right_to_left=right_to_left),
    )
    built = made.built(tmp_path)
    assert built.right() == 1.0
    assert sum(row["return_sweep"] for row in built.fixations) == len(TEXT) - 1


def test_boxes_may_be_taken_by_themselves(tmp_path: Path) -> None:
    """Without a method a fixation belongs to the box in which it lies, if to any."""
    made = Passages(
        {("A1", "1"): read_through(6)},
        STUDY.replace(LAYOUT, '[lines]\nmethod = "none"\n')
        .replace('"words"', '"boxes"')
        .replace("tolerance_px = 20\n", ""),
        boxes_file(),
    )
    built = made.built(tmp_path)
    assert built.right() < 0.8
    rows = built.fixations
    assert {row["line_confidence"] for row in rows} == {None}
    for row, truth in zip(rows, made.trials["A1", "1"], strict=True):
        within_px = (truth.y_px - TOP) % HEIGHT
        assert row["region"] is None or 12 <= within_px < HEIGHT - 12
        of_box = 1 + (truth.y_px - TOP) // HEIGHT
        assert row["line"] == (None if row["region"] is None else of_box)


def test_polygons_of_several_lines_are_read_by_lines(tmp_path: Path) -> None:
    """A polygon is looked up on the line that the fixation was found to be on."""
    rows = [row.split("\t") for row in boxes_file().splitlines()[1:]]
    lines = ["item\tregion\torder\twkt"]
    for item, region, order, left, top, right, bottom in rows:
        corners = f"{left} {top}, {right} {top}, {right} {bottom}, {left} {bottom}, {left} {top}"
        lines.append(f"{item}\t{region}\t{order}\tPOLYGON (({corners}))")
    made = Passages(
        {("A1", "1"): read_through(6)},
        STUDY.replace(LAYOUT, "").replace('"words"', '"wkt"'),
        "\n".join(lines) + "\n",
    )
    assert made.built(tmp_path).right() == 1.0


def test_regions_as_wide_as_lines_are_read_by_lines(tmp_path: Path) -> None:
    """A text whose regions are whole lines says no less about where they begin and end."""
    lines = [line.replace(" ", "\u00b7") for line in TEXT]  # no blank in it: one word a line
    truth = [Fixated(f.x_px, f.y_px, f.line, f.line) for f in read_through(7)]
    built = Passages({("A1", "1"): truth}, regions=region_file(lines)).built(tmp_path)
    assert built.right() == 1.0


def test_blank_lines_are_counted(tmp_path: Path) -> None:
    """Lines are numbered as on the screen, blank ones included."""
    lines = [TEXT[0], "", *TEXT[1:]]
    made = read_through(8, lines=[line or "-" for line in lines], shift=0.0)
    truth = [Fixated(f.x_px, f.y_px, f.line, f.order - (f.line > 1)) for f in made if f.line != 2]
    built = Passages({("A1", "1"): truth}, regions=region_file(lines)).built(tmp_path)
    assert built.right(lines=True) == built.right() == 1.0


def test_one_line_texts_keep_their_tables(tmp_path: Path) -> None:
    """Where no text has several lines no column tells of them, and y decides as ever."""
    beside = [Fixated(f.x_px, f.y_px + 60, 0, 0) for f in read_through(9, lines=ONE_LINE)]
    made = Passages(
        {("A1", "1"): read_through(9, lines=ONE_LINE), ("A1", "2"): beside},
        regions=region_file(ONE_LINE),
    )
    built = made.built(tmp_path)
    assert built.right() == 1.0
    for table in ("fixations", "trials"):
        assert "line_confidence" not in rows_of(built.folder, table)[0]
    assert "fixations on no line" not in built.result.counts


def test_trials_say_how_sure_their_lines_are(drifted: Built) -> None:
    """Every kept trial has its confidence, every fixation too."""
    sure = [row["line_confidence"] for row in rows_of(drifted.folder, "trials")]
    assert len(sure) == 2
    assert all(0.9 < value <= 1 for value in sure)
    assert all(0 < row["line_confidence"] <= 1 for row in drifted.fixations)


def test_return_sweeps_are_labelled(drifted: Built) -> None:
    """One sweep onto each line after the first, on its first fixation."""
    rows = drifted.fixations
    swept = [row["fixation"] for row in rows if row["return_sweep"] and row["trial"] == 1]
    begins = [
        number
        for number, (one, before) in enumerate(
            zip(DRIFTED.trials["A1", "1"][1:], DRIFTED.trials["A1", "1"], strict=False), start=2
        )
        if one.line > before.line
    ]
    assert swept == begins


@pytest.mark.slow
def test_same_bytes_with_any_number_of_workers(tmp_path: Path) -> None:
    """Lines are told reader by reader; who does it changes nothing."""
    trials = {(f"A{n}", "1"): read_through(n, noise_px=12.0) for n in range(1, 4)}
    one = Passages(trials).built(tmp_path / "one")
    two = Passages(trials).built(tmp_path / "two", workers=2)
    assert tables_of(one.folder) == tables_of(two.folder)
