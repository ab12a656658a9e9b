"""Which column of a table says which text was read, and rows of units below a header."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

import etl
from tests.drafting.small_logs import put, reading

HEADERS = ("reader", "start", "dur", "gx", "gy")
READERS = ("P01", "P02", "P03")


def drafted(tmp_path: Path, **named: Any) -> etl.Draft:
    """A draft of logs with further columns, each a function of reader and trial."""
    for who in READERS:
        lines = ["\t".join((*HEADERS, *named))]
        for f in reading(who):
            cells = (who, f.onset_ms, f.duration_ms, f.x_px, f.y_px)
            more = (cell(READERS.index(who), f.trial) for cell in named.values())
            lines.append("\t".join(map(str, (*cells, *more))))
        put(tmp_path / f"{who}.tsv", "\n".join(lines) + "\n")
    return etl.draft(tmp_path)


def code(reader: int, trial: int) -> str:
    """A text's name: the same texts for all, in an order of each reader's own."""
    return f"pear{(5 * trial + reader) % 13}"


def number(_: int, trial: int) -> int:
    """The place of a trial."""
    return trial


def asked(draft: etl.Draft) -> str:
    """What is asked about the text; empty where nothing is."""
    return next((q.text for q in draft.questions if q.key == "logs.columns.item"), "")


def columns_of(draft: etl.Draft) -> dict[str, Any]:
    """The columns of a draft."""
    return dict(tomllib.loads(draft.text)["logs"]["columns"])


def test_column_that_counts_trials_is_not_the_text_as_well(tmp_path: Path) -> None:
    """A number called sentence that only counts, beside names of texts, is a question."""
    draft = drafted(tmp_path, sentence_no=number, code=code)
    assert (columns_of(draft)["trial"], columns_of(draft)["item"]) == ("sentence_no", "?")
    assert 'It may be "sentence_no" (which tells trials apart) or "code"' in asked(draft)


def test_text_that_only_counts_trials_again_is_asked_about(tmp_path: Path) -> None:
    """A column that equals the trial throughout is no evidence."""
    draft = drafted(tmp_path, trial=number, item=number, code=code)
    assert 'It may be "item" or "code"' in asked(draft)


def test_named_text_is_taken(tmp_path: Path) -> None:
    """A column called text that differs from the trial is the text, whatever else is constant."""
    draft = drafted(tmp_path, trial=number, text=code, block=lambda _, t: f"b{t // 7}")
    assert (columns_of(draft)["item"], asked(draft)) == ("text", "")


def test_two_columns_called_text_are_a_question(tmp_path: Path) -> None:
    """Where two names say text and the cells differ, the lab must choose."""
    draft = drafted(tmp_path, trial=number, text=code, item=lambda r, t: f"i{(t + r) % 5}")
    assert 'It may be "text" or "item"' in asked(draft)


def test_two_names_of_the_same_texts_are_no_question(tmp_path: Path) -> None:
    """Where each value of one goes with one of the other, either will do."""
    draft = drafted(tmp_path, trial=number, text=code, item=lambda r, t: code(r, t).upper())
    assert (columns_of(draft)["item"] in ("text", "item"), asked(draft)) == (True, "")


@pytest.mark.parametrize(
    "cell",
    [
        pytest.param(lambda r, t: 50_000 + 977 * (12 * r + t), id="a time of each trial"),
        pytest.param(lambda _, t: f"block {t // 5}", id="a block"),
        pytest.param(lambda _, t: t + 100, id="a counter"),
    ],
)
def test_what_is_no_text_is_no_candidate(cell: Any, tmp_path: Path) -> None:
    """Texts are read by several readers, each in about one trial of theirs, and do not count."""
    draft = drafted(tmp_path, trial=number, extra=cell)
    assert ("item" in columns_of(draft), asked(draft)) == (False, "")


def test_row_of_units_is_no_row_and_no_mark_for_missing_values(tmp_path: Path) -> None:
    """Units below the header are taken as units, with that as evidence."""
    lines = ["reader\ttrial\tt0\tlasted\tgx\tgy", "\t-\ts\tms\tpx\tpx"]
    lines += [
        f"P01\t{f.trial}\t{f.onset_ms / 1000}\t{f.duration_ms}\t{f.x_px}\t{f.y_px}"
        for f in reading()
    ]
    draft = etl.draft([put(tmp_path / "P01.tsv", "\n".join(lines) + "\n")])
    logs = tomllib.loads(draft.text)["logs"]
    assert "missing" not in logs
    assert logs["columns"]["onset"] == {"column": "t0", "unit": "s"}
    assert logs["columns"]["duration"] == {"column": "lasted", "unit": "ms"}
    said = " ".join(line.lstrip("# ") for line in draft.text.split("\n"))
    assert 'the row below the header says "ms"' in said
    assert f"{len(reading())} rows of 6 columns" in said
    assert draft.findings.lines() == []


def test_unit_below_a_header_that_the_numbers_contradict_is_asked_about(tmp_path: Path) -> None:
    """Seconds by the row of units and milliseconds by the numbers: that is for the lab to say."""
    lines = ["reader\ttrial\tt0\tlasted\tgx\tgy", "\t\ts\ts\tpx\tpx"]
    lines += [
        f"P01\t{f.trial}\t{f.onset_ms}\t{f.duration_ms}\t{f.x_px}\t{f.y_px}" for f in reading()
    ]
    draft = etl.draft([put(tmp_path / "P01.tsv", "\n".join(lines) + "\n")])
    assert "logs.columns.duration.unit" in [question.key for question in draft.questions]
