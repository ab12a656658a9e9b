"""Fixations that belong to no line: outside, in the ledger, and kept."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.lines.passages_study import STUDY, Built, Fixated, Passages, read_through

#: Three looks far below the text, from 1 in the middle of the trial and at its end.
AWAY = [Fixated(400.0 + 9 * n, 845.0 + 3 * n, 0, 0) for n in range(3)]


def with_looks_away(seed: int) -> list[Fixated]:
    """A trial with a look off the text after the third line."""
    made = read_through(seed, shift=0.02)
    at = sum(f.line <= 3 for f in made)
    return [*made[:at], *AWAY, *made[at:]]


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Two trials with looks off the text."""
    trials = {("A1", "1"): with_looks_away(1), ("A1", "2"): with_looks_away(2)}
    return Passages(trials).built(tmp_path_factory.mktemp("away"))


def on_none(built: Built) -> list[tuple[str, str]]:
    """Trial and fixation of the rows that have no line."""
    rows = [row for row in built.fixations if row["line"] is None]
    return [(str(row["trial"]), str(row["fixation"])) for row in rows]


def test_looks_off_the_text_are_outside(built: Built) -> None:
    """They have no line and no region, although the last line is not far in y alone."""
    assert built.right() == built.right(lines=True) == 1.0
    assert len(on_none(built)) == 2 * len(AWAY)


def test_ledger_names_each_fixation_on_no_line(built: Built) -> None:
    """One row each, with the rule, why, and how sure that is."""
    rows = [row for row in built.ledger if row["rule"] == "no_line"]
    assert [(row["trial"], row["fixation"]) for row in rows] == on_none(built)
    assert {row["action"] for row in rows} == {"counted as outside"}
    assert {row["level"] for row in rows} == {"fixation"}
    assert all("confidence 0." in row["observed"] or "1.000" in row["observed"] for row in rows)


def test_fixations_on_no_line_are_kept(built: Built) -> None:
    """The accounts are charged with nothing; the run record counts them."""
    counts = built.result.counts
    assert counts["fixations kept"] == counts["fixations read"] == len(built.fixations)
    assert counts["fixations kept outside every region"] == 2 * len(AWAY)
    record = json.loads((built.folder / "run.json").read_text(encoding="utf-8"))
    assert record["counts"]["fixations on no line"] == 2 * len(AWAY)


def test_one_note_tells_of_them(built: Built) -> None:
    """One note for the study, not one a fixation."""
    (note,) = [one for one in built.result.findings if "belong to no line" in one.problem]
    assert note.severity == "note"
    assert note.problem.startswith("6 fixations belong to no line and count as outside")


def test_single_methods_put_every_fixation_on_a_line(tmp_path: Path) -> None:
    """Only the consensus knows of fixations on no line."""
    made = Passages({("A1", "1"): with_looks_away(1)}, STUDY + '[lines]\nmethod = "split"\n')
    built = made.built(tmp_path)
    assert on_none(built) == []
    assert [row for row in built.ledger if row["rule"] == "no_line"] == []


def test_what_a_rule_leaves_out_leads_no_method(tmp_path: Path) -> None:
    """Fixations off the screen go to the rule, on the line nearest, and not to the consensus."""
    far = [Fixated(200.0, 5000.0, 7, 0)]
    trials = {("A1", "1"): [*far, *read_through(3)]}
    built = Passages(trials, STUDY + "[screening.fixations]\noff_screen = true\n").built(tmp_path)
    first, *others = built.fixations
    assert (first["left_out_by"], first["line"], first["line_confidence"]) == (
        "off_screen",
        7,
        None,
    )
    assert all(row["line_confidence"] is not None for row in others)
    assert [row["rule"] for row in built.ledger] == ["off_screen"]


def test_ledger_says_nothing_of_lines_of_what_is_left_out(tmp_path: Path) -> None:
    """A look off the text that another rule leaves out is not counted as outside."""
    short = [Fixated(f.x_px, f.y_px, 0, 0, 40) for f in AWAY]
    made = read_through(4, shift=0.02)
    rules = "[screening.fixations]\nunder_ms = 60\n"
    built = Passages({("A1", "1"): [*made, *short]}, STUDY + rules).built(tmp_path)
    assert [row["rule"] for row in built.ledger] == ["under_ms"] * len(AWAY)
