"""Logs read in blocks and held whole, and what is compared of them."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest

import etl
from etl.errors import Findings
from etl.files import Coded
from etl.parsers import readers
from etl.session.kept_logs import Aside, Shelf, kept_log
from etl.session.kept_store import KeptStore
from etl.session.plan import make_plan
from etl.session.work import LogAnswer, LogTask, LogWork

#: In which size of block a log is never read in blocks.
WHOLE = 0


def told(study: Path, length: int, monkeypatch: pytest.MonkeyPatch) -> tuple[list[Any], int]:
    """All that reading the logs of a study gives, and how many logs were read in blocks.

    Parameters
    ----------
    study : Path
        The study file.
    length : int
        How long blocks are; ``WHOLE`` to read every log as a whole.
    monkeypatch : pytest.MonkeyPatch
        Sets the length.

    Returns
    -------
    list and int
        For each log plain values, in which everything counts: words, orders, numbers to the bit.
    """
    with monkeypatch.context() as patched:
        if length != WHOLE:
            patched.setattr(readers, "SIZES", (1, length))
        plan, logs = make_plan(etl.load_study(study), Findings(), None)
        if plan is None:
            return [], 0
        aside = Aside(KeptStore(study.parent / "earlier", study.parent), False, Shelf(2**30))
        reading = LogWork(plan.reader, aside, None)
        answers = []
        for number, (path, shown) in enumerate(logs):
            answers += reading([LogTask(path, shown, number)])
    in_blocks = sum(len(answer.blocks) > 0 for answer in answers)
    return [plain(answer, aside) for answer in answers], in_blocks


def plain(answer: LogAnswer, aside: Aside) -> dict[str, Any]:
    """An answer in plain values."""
    note = answer.note
    trials = answer.trials
    parts: dict[str, list[tuple[str, int]]] = {}
    for entry, batches in answer.entries():
        for reader, batch in batches.items():
            parts.setdefault(reader, []).append((entry, batch))
    return {
        "findings": (answer.findings.text(), sorted(answer.findings.more.items())),
        "note": repr(note),
        "orders": [list(note.counts), list(note.account.lines), list(note.account.repairs)],
        "balances": note.account.balances(),
        "trials": None
        if trials is None
        else (texts(trials.ids), texts(trials.facts), trials.line.tolist(), trials.file.tolist()),
        "figures": repr(answer.figures),
        "fixations": answer.fixations,
        "readers": {reader: fixations(own, aside) for reader, own in parts.items()},
    }


def texts(columns: Mapping[str, Coded]) -> dict[str, list[str]]:
    """Coded columns as texts."""
    return {name: [own.text(row) for row in range(len(own))] for name, own in columns.items()}


def fixations(parts: list[tuple[str, int]], aside: Aside) -> dict[str, Any]:
    """One reader's fixations."""
    log, _ = kept_log(parts, aside)
    return {
        "ids": texts(log.ids),
        "label": None if log.label is None else texts({"": log.label}),
        **{
            name: getattr(log, name).tobytes()
            for name in ("onset_ms", "number", "duration_ms", "x_px", "y_px")
        },
        **{name: getattr(log, name).tolist() for name in ("source_line", "blink", "recording")},
    }
