"""Lines set by hand: what they change, what they cost, and what is wrong with a table of them."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path

import pytest

import etl
from tests.end_to_end.building import rows_of
from tests.lines.passages_study import (
    STUDY,
    Built,
    Fixated,
    Passages,
    read_through,
    region_file,
)

NAMED = '[lines]\ncorrections = "hand.csv"\n'
TRIALS = {("A1", "1"): read_through(1), ("A2", "1"): read_through(2)}
HEAD = "participant,trial,fixation,line\n"


def corrected(rows: str, *, study: str = STUDY + NAMED, head: str = HEAD) -> Passages:
    """The drifted trials with a table of corrections."""
    return Passages(TRIALS, study, more={"hand.csv": head + rows})


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Fixation 5 of reader A1 on line 3, and 8 on none; without them they are on line 1."""
    return corrected("A1,1,5,3\nA1,1,8,0\n").built(tmp_path_factory.mktemp("hand"))


def test_hand_overrides_the_method(built: Built) -> None:
    """The fixation is looked up by its x on the line given; on none it is outside."""
    by_number = {row["fixation"]: row for row in built.fixations if row["participant"] == "A1"}
    assert by_number[5]["line"] == 3
    words_before = sum(f.line < 3 for f in TRIALS["A1", "1"])
    assert by_number[5]["region_order"] > words_before
    assert (by_number[8]["line"], by_number[8]["region"]) == (None, None)
    assert by_number[5]["line_confidence"] == by_number[8]["line_confidence"] == 1.0


def test_only_the_named_fixations_change(built: Built) -> None:
    """All others are where they were."""
    changed = [
        row["fixation"]
        for row in built.fixations
        if row["line"] != TRIALS[row["participant"], "1"][row["fixation"] - 1].line
    ]
    assert changed == [5, 8]


def test_ledger_says_what_was_there_before(built: Built) -> None:
    """A row a correction, with the line before and after, charged to nothing."""
    rows = [(row["fixation"], row["rule"], row["observed"], row["action"]) for row in built.ledger]
    assert rows == [
        ("5", "line_corrections", "line 1", "line set to 3"),
        ("8", "line_corrections", "line 1", "line set to none"),
    ]
    assert built.result.counts["fixations kept"] == len(built.fixations)
    assert built.result.counts["lines set by hand"] == 2


def test_trial_is_sure_by_hand_where_all_of_it_was_set(built: Built, tmp_path: Path) -> None:
    """Two corrections say nothing about the rest of a trial; a table of all its lines does."""
    sure = {r["participant"]: r["line_confidence"] for r in rows_of(built.folder, "trials")}
    assert sure["A1"] < 1.0
    assert sure["A2"] < 1.0
    every = "".join(f"A1,1,{n},{f.line}\n" for n, f in enumerate(TRIALS["A1", "1"], start=1))
    whole = corrected(every).built(tmp_path)
    sure = {r["participant"]: r["line_confidence"] for r in rows_of(whole.folder, "trials")}
    assert sure["A1"] == 1.0
    assert sure["A2"] < 1.0


def test_table_is_among_the_inputs(built: Built, tmp_path: Path) -> None:
    """With its digest, under a role of its own."""
    made = corrected("A1,1,5,3\nA1,1,8,0\n")
    file = made.written(tmp_path).parent / "hand.csv"
    record = json.loads((built.folder / "run.json").read_text(encoding="utf-8"))
    assert {
        "file": "hand.csv",
        "role": "line corrections",
        "sha256": hashlib.sha256(file.read_bytes()).hexdigest(),
    } in record["inputs"]


@pytest.mark.parametrize("method", ["nearest", "slice", "consensus"])
def test_corrections_go_with_any_method(tmp_path: Path, method: str) -> None:
    """The hand has the last word."""
    study = STUDY + NAMED + f'method = "{method}"\n'
    built = corrected("A1,1,2,7\n", study=study).built(tmp_path)
    assert built.fixations[1]["line"] == 7


def test_hand_brings_back_what_belonged_to_no_line(tmp_path: Path) -> None:
    """The ledger tells of the correction, and no longer of a fixation on no line."""
    away = [Fixated(400.0, 850.0, 0, 0), Fixated(420.0, 855.0, 0, 0)]
    made = read_through(3, shift=0.02)
    trials = {("A1", "1"): [*made, *away]}
    without = Passages(trials).built(tmp_path / "without")
    assert [row["rule"] for row in without.ledger] == ["no_line", "no_line"]
    last = len(made) + 2
    hand = HEAD + f"A1,1,{last},7\n"
    built = Passages(trials, STUDY + NAMED, more={"hand.csv": hand}).built(tmp_path / "hand")
    assert [(row["fixation"], row["rule"], row["observed"]) for row in built.ledger][1:] == [
        (str(last), "line_corrections", "no line")
    ]
    assert [row["line"] for row in built.fixations[-2:]] == [None, 7]


def test_line_is_set_where_the_position_is_not_known(tmp_path: Path) -> None:
    """Such a fixation is on the line given, in no region."""
    made = corrected("A1,1,4,2\n")
    study = made.written(tmp_path)
    log = study.parent / "logs" / "A1.tsv"
    rows = log.read_text(encoding="utf-8").splitlines()
    cells = rows[4].split("\t")
    rows[4] = "\t".join([*cells[:5], "", ""])
    log.write_text("\n".join(rows) + "\n", encoding="utf-8", newline="\n")
    etl.build(etl.load_study(study), into=tmp_path / "out")
    own = rows_of(tmp_path / "out", "fixations")[3]
    assert (own["line"], own["region"], own["line_confidence"]) == (2, None, 1.0)


def test_headers_of_the_logs_serve_too(tmp_path: Path) -> None:
    """The reader's column may be called as in the logs."""
    head = "reader,trial,fixation,line\n"
    assert corrected("A1,1,5,3\n", head=head).built(tmp_path).fixations[4]["line"] == 3


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        pytest.param(
            "A1,1,99999,2\n",
            'hand.csv:2: the trial has no fixation of this number; found "reader A1, fixation '
            f'99999", expected a number from 1 to {len(TRIALS["A1", "1"])}, as in the table '
            "fixations\n    fix: correct the row, or remove it",
            id="no such fixation",
        ),
        pytest.param(
            "A1,1,5,8\n",
            'hand.csv:2: the text has no line of this number; found "8", expected a line from 1 '
            "to 7, or 0 for no line; the text is defined in regions.tsv:2\n"
            "    fix: correct the row, or remove it",
            id="no such line",
        ),
        pytest.param(
            "A1,1,5,3\nA2,1,5,3\nA1,1,5,2\n",
            'hand.csv:4: the line of a fixation is set twice; found "participant A1, trial 1, '
            'fixation 5", expected one row for each; line 2 holds the other\n'
            "    fix: remove one of the two rows",
            id="set twice",
        ),
        pytest.param(
            "A9,1,5,3\n",
            'hand.csv:2: the correction is on a reader that no log has; found "participant A9, '
            'trial 1, fixation 5", expected a reader of the logs\n'
            "    fix: correct the row, or remove it",
            id="no such reader",
        ),
        pytest.param(
            "A1,7,5,3\n",
            'hand.csv:2: the correction is on a trial that no log has; found "participant A1, '
            'trial 7, fixation 5", expected a trial of the logs\n'
            "    fix: correct the row, or remove it",
            id="no such trial",
        ),
        pytest.param(
            "A1,1,0,3\n",
            'hand.csv:2: column "fixation": this is no number of a fixation; found "0", expected '
            "a whole number from 1\n    fix: correct the cell, or remove the row",
            id="fixation 0",
        ),
        pytest.param(
            "A1,1,5,1.5\n",
            'hand.csv:2: column "line": this is no number of a line; found "1.5", expected a '
            "whole number from 0; 0 is no line\n    fix: correct the cell, or remove the row",
            id="half a line",
        ),
        pytest.param(
            "A1,,5,1\n",
            'hand.csv:2: column "trial": the cell is empty; found "", expected the trial of the '
            "fixation\n    fix: correct the cell, or remove the row",
            id="no trial given",
        ),
    ],
)
def test_wrong_row_is_refused_with_its_line(tmp_path: Path, rows: str, expected: str) -> None:
    """What fits nothing is an error, never left aside."""
    assert corrected(rows).refused(tmp_path) == [expected]


def test_missing_column_is_named(tmp_path: Path) -> None:
    """Each column that is needed and not there is told."""
    problems = corrected("A1,1,5\n", head="participant,trial,fixation\n").refused(tmp_path)
    assert len(problems) == 1
    assert problems[0].startswith('hand.csv:1: there is no column "line"')


def test_text_of_one_line_has_nothing_to_correct(tmp_path: Path) -> None:
    """A table of lines where no text has several is a slip."""
    one = read_through(3, lines=["The old ladder"])
    made = Passages(
        {("A1", "1"): one},
        STUDY + NAMED,
        region_file(["The old ladder"]),
        {"hand.csv": HEAD + "A1,1,1,1\n"},
    )
    (problem,) = made.refused(tmp_path)
    assert "lines.corrections: lines are set by hand, but no text has several" in problem


def test_skipped_trial_is_told_and_nothing_changes(tmp_path: Path) -> None:
    """A correction of a trial that is no part of the study is a note."""
    study = STUDY + NAMED + '[trials]\nskip = { participant = ["A2"] }\n'
    built = corrected("A2,1,5,3\n", study=study).built(tmp_path)
    notes = [one.problem for one in built.result.findings if one.path == "hand.csv"]
    assert notes == ["lines are set in a trial that is no part of the study, which changes nothing"]
    assert [row["rule"] for row in built.ledger] == ["skip"]
