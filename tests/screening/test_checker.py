"""The checker finds nothing wrong with what is built, and everything that is planted."""

from __future__ import annotations

import csv
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import HealthCheck, assume, given, settings

from tests.screening.building import Built, Trial, build, recorded_ms, study
from tests.screening.checker import CHECKS, Published, contradictions
from tests.screening.random_builds import built_study
from tests.screening.strategies import Lab, Rules, labs, rules

RULES = """
[screening.fixations]
first = 1
merge = { under_ms = 80, within_px = 14 }
under_ms = 80
over_ms = 800
[screening.trials]
fewest_fixations = 2
outside_share_over = 0.4
[screening.participants]
correct_share_under = 0.5
[screening.values]
outlier_sd = 1.2
"""
READ = "150:200 50:210 150:60 155:200 250:220 270:70"
TRIALS = (
    Trial("R1", 1, READ),
    Trial("R1", 2, "150:200 50:200 150:220 250:200", block="practice"),
    Trial("R1", 3, "150:200 50:200 150:230 250:900 50:200"),
    Trial("R1", 4, "150:200 50:200"),
    Trial("R1", 5, "150:200 350:200 350:200 50:200"),
    Trial("R1", 6, "150:200 50:200 150:720 250:200"),
    Trial("R1", 7, ("150:200 50:200 150:240 250:200", "150:200 50:205")),
    Trial("R2", 1, READ, ok="0"),
    Trial("R2", 2, "150:200 50:200", ok="0"),
    Trial("R3", 1, "150:200 100:30 105:40 110:50 115:200 250:200"),
)


@pytest.fixture(scope="module")
def sound(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """A study in which something of every level is left out."""
    file = study(tmp_path_factory.mktemp("sound"), TRIALS, RULES, repeated="first")
    return build(file)


def told(folder: Path, *, logs: bool = True) -> list[str]:
    """What the checker finds in a folder, with or without a look at the logs."""
    return contradictions(Published(folder, recorded_ms(TRIALS) if logs else None))


@pytest.mark.parametrize("logs", [True, False])
def test_sound_study_has_no_contradiction(sound: Built, logs: bool) -> None:
    """Nothing is found, and there was something of every kind to look at."""
    assert told(sound.folder, logs=logs) == []
    assert {row["level"] for row in sound.ledger} == {"fixation", "trial", "participant", "value"}
    assert set(sound.account("fixations")) == {
        *("read", "skip", "repeated", "first", "merge", "under_ms", "over_ms"),
        *("fewest_fixations", "outside_share_over", "correct_share_under", "kept"),
    }


@settings(max_examples=40, deadline=None, suppress_health_check=list(HealthCheck))
@given(labs(), rules())
def test_random_study_has_no_contradiction(
    tmp_path_factory: pytest.TempPathFactory, lab: Lab, given_rules: Rules
) -> None:
    """Whatever the study and the rules."""
    done = built_study(tmp_path_factory.mktemp("random"), lab, given_rules, page=True)
    assume(done is not None)
    assert contradictions(Published(done.folder, recorded_ms(lab.trials))) == []


def edit_text(name: str, change: Callable[[list[dict[str, str]]], Any]) -> Callable[[Path], None]:
    """Change the rows of a CSV file."""

    def apply(folder: Path) -> None:
        path = folder / f"{name}.csv"
        with path.open(encoding="utf-8", newline="") as file:
            rows = list(csv.DictReader(file))
        header = list(rows[0])
        change(rows)
        with path.open("w", encoding="utf-8", newline="") as file:
            writer = csv.DictWriter(file, header, lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)

    return apply


def edit_table(name: str, change: Callable[[list[dict[str, Any]]], Any]) -> Callable[[Path], None]:
    """Change the rows of a Parquet file."""

    def apply(folder: Path) -> None:
        path = folder / f"{name}.parquet"
        with pq.ParquetFile(path) as file:
            schema, rows = file.schema_arrow, file.read().to_pylist()
        change(rows)
        plain = pa.schema(
            [
                pa.field(f.name, pa.string() if pa.types.is_dictionary(f.type) else f.type)
                for f in schema
            ]
        )
        pq.write_table(pa.Table.from_pylist(rows, plain), path)

    return apply


def first(rows: list[dict[str, Any]], **wanted: Any) -> dict[str, Any]:
    """The first row that has some values."""
    return next(row for row in rows if all(row[name] == value for name, value in wanted.items()))


def add(row: dict[str, Any], column: str, amount: float) -> None:
    """Change a number, be it text or not."""
    row[column] = (
        type(row[column])(float(row[column]) + amount)
        if not isinstance(row[column], str)
        else str(int(row[column]) + int(amount))
    )


def move(row: dict[str, Any], one: str, other: str) -> None:
    """Take one from a column and give it to another."""
    add(row, one, -1)
    add(row, other, 1)


def in_all(rows: list[dict[str, Any]], one: str, other: str) -> None:
    """Move one in a reader's row and in the last one, so that all still balances."""
    move(first(rows, participant="R1", unit="fixations"), one, other)
    move(first(rows, participant="(all)", unit="fixations"), one, other)


PLANTED: dict[str, tuple[Callable[[Path], None], str]] = {
    "an account that does not balance": (
        edit_text("accounts", lambda rows: add(rows[0], "kept", 1)),
        "the accounts of trials of R1 do not balance",
    ),
    "an account moved to another rule": (
        edit_text("accounts", lambda rows: in_all(rows, "first", "under_ms")),
        "accounts of fixations of R1",
    ),
    "a sum that is none": (
        edit_text("accounts", lambda rows: move(rows[-1], "first", "kept")),
        "the last row of fixations is not the sum",
    ),
    "a reader without an account": (
        edit_text("accounts", lambda rows: rows.pop(2)),
        "do not list each reader",
    ),
    "a ledger row that is missing": (
        edit_text("exclusions", lambda rows: rows.remove(first(rows, rule="under_ms"))),
        "the ledger None",
    ),
    "a ledger row told twice": (
        edit_text("exclusions", lambda rows: rows.insert(0, rows[0])),
        "2 times",
    ),
    "a ledger row with another rule": (
        edit_text("exclusions", lambda rows: first(rows, rule="under_ms").update(rule="last")),
        "fixations say ('under_ms'",
    ),
    "a ledger row with another line": (
        edit_text("exclusions", lambda rows: add(first(rows, rule="first"), "source_line", 1)),
        "fixations say ('first'",
    ),
    "a ledger out of order": (
        edit_text("exclusions", lambda rows: rows.insert(4, rows.pop(0))),
        "out of order",
    ),
    "a lost trial that is not told": (
        edit_text("exclusions", lambda rows: rows.remove(first(rows, rule="fewest_fixations"))),
        "is nowhere",
    ),
    "a lost trial with another rule": (
        edit_text(
            "exclusions", lambda rows: first(rows, rule="fewest_fixations").update(rule="notes")
        ),
        "is charged to notes, its fixations to {'fewest_fixations'}",
    ),
    "a lost reader that is not told": (
        edit_text("exclusions", lambda rows: rows.remove(first(rows, level="participant"))),
        "('R2', '1') went with its reader, who is not in the ledger",
    ),
    "a kept trial that is told": (
        edit_text(
            "exclusions",
            lambda rows: rows.insert(3, {**first(rows, rule="fewest_fixations"), "trial": "1"}),
        ),
        "('R1', '1') is kept and in the ledger",
    ),
    "an observed number within its limit": (
        edit_text("exclusions", lambda rows: first(rows, rule="under_ms").update(observed="80")),
        "80 is not against under_ms 80",
    ),
    "a count that is not that of the table": (
        edit_text(
            "exclusions", lambda rows: first(rows, rule="fewest_fixations").update(observed="0")
        ),
        "0 fixations observed, 1 in the table",
    ),
    "a share that is not that of the table": (
        edit_text(
            "exclusions", lambda rows: first(rows, rule="outside_share_over").update(observed="0.5")
        ),
        "0.5 outside observed",
    ),
    "an earlier rule in also": (
        edit_text("exclusions", lambda rows: first(rows, rule="under_ms").update(also="first")),
        "also first after under_ms",
    ),
    "a rule above that is not in also": (
        edit_text(
            "exclusions",
            lambda rows: first(rows, participant="R2", rule="first").update(also="over_ms"),
        ),
        "correct_share_under above it is not in also",
    ),
    "a merge into another one": (
        edit_text(
            "exclusions",
            lambda rows: first(rows, rule="merge").update(action="merged into 2"),
        ),
        "its parts",
    ),
    "a merge into one that is not there": (
        edit_text(
            "exclusions",
            lambda rows: first(rows, rule="merge").update(action="merged into 99"),
        ),
        "merged into none that is there",
    ),
    "a merge in a circle": (
        edit_text(
            "exclusions",
            lambda rows: first(rows, participant="R3", fixation="3").update(action="merged into 2"),
        ),
        "merged into none that is there",
    ),
    "a merge that lost its partner": (
        edit_text("exclusions", lambda rows: first(rows, rule="merge").update(action="left out")),
        "the action left out is not one of merge",
    ),
    "a chain with another duration": (
        edit_text(
            "exclusions",
            lambda rows: first(rows, participant="R3", fixation="3").update(observed="69"),
        ),
        "was 69.0 when merged",
    ),
    "a value that is not told": (
        edit_text("exclusions", lambda rows: rows.remove(first(rows, level="value"))),
        "is an outlier and not in the ledger",
    ),
    "a value that is told and there": (
        edit_text(
            "exclusions",
            lambda rows: rows.insert(
                rows.index(first(rows, level="value")) + 1,
                {**first(rows, level="value"), "region": "fruit"},
            ),
        ),
        "is in the ledger and not missing",
    ),
    "a fixation kept and left out": (
        edit_table("fixations", lambda rows: first(rows, left_out_by="under_ms").update(kept=1)),
        "is kept and left out, or neither",
    ),
    "a fixation that went missing": (
        edit_table("fixations", lambda rows: rows.remove(first(rows, kept=1))),
        "not numbered from 1",
    ),
    "a fixation that is there twice": (
        edit_table("fixations", lambda rows: rows.insert(1, rows[0])),
        "is told 2 times",
    ),
    "a fixation with another duration": (
        edit_table("fixations", lambda rows: add(first(rows, kept=1), "duration_ms", 1)),
        "its parts",
    ),
    "a fixation left out by another rule": (
        edit_table(
            "fixations",
            lambda rows: first(rows, left_out_by="under_ms").update(left_out_by="over_ms"),
        ),
        "fixations say ('over_ms'",
    ),
    "a left-out fixation with a visit": (
        edit_table("fixations", lambda rows: first(rows, left_out_by="under_ms").update(visit=1)),
        "is left out and has a visit",
    ),
    "an outcome that is another": (
        edit_table(
            "outcomes",
            lambda rows: first(rows, measure="fixation_count", region="who").update(value=7.0),
        ),
        "who fixation_count: 7.0",
    ),
    "a reason that is another": (
        edit_table(
            "outcomes", lambda rows: first(rows, missing="skipped").update(missing="refixated")
        ),
        "refixated, not skipped",
    ),
    "an outlier that is none": (
        edit_table(
            "outcomes",
            lambda rows: first(rows, measure="total_time", region="who").update(
                value=None, missing="outlier"
            ),
        ),
        "is an outlier and not in the ledger",
    ),
    "outcomes of a trial that is lost": (
        edit_table("outcomes", lambda rows: rows.append({**rows[-1], "participant": "R2"})),
        "outcomes and trials have different trials",
    ),
    "a trial that is not kept": (
        edit_table("trials", lambda rows: rows.pop(0)),
        "is nowhere",
    ),
    "a reading time that is another": (
        edit_table("trials", lambda rows: add(rows[0], "reading_time", 1)),
        "reading time is not that of the kept fixations",
    ),
}


@pytest.mark.parametrize("name", PLANTED)
def test_planted_contradiction_is_found(sound: Built, tmp_path: Path, name: str) -> None:
    """The checker names what was changed."""
    change, expected = PLANTED[name]
    folder = shutil.copytree(sound.folder, tmp_path / "out")
    change(folder)
    assert any(expected in found for found in told(folder)), told(folder)


def test_every_check_finds_something_planted(sound: Built, tmp_path: Path) -> None:
    """No check of the checker is idle."""
    idle = {check.__name__ for check in CHECKS}
    for number, (change, _) in enumerate(PLANTED.values()):
        folder = shutil.copytree(sound.folder, tmp_path / str(number))
        change(folder)
        published = Published(folder, recorded_ms(TRIALS))
        idle -= {check.__name__ for check in CHECKS if list(check(published))}
    assert idle == set()
