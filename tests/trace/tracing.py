"""Traced trials for the checks: made by hand from orders and durations, or from a built study."""

from __future__ import annotations

import csv
import math
import random
import re
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

import etl
from etl.cells import plain
from etl.errors import Findings
from etl.lines.consensus import SURE
from etl.measures import REASONS, Measured, Sequences, compute
from etl.regions.layout import columns, edge_px, line_extent_px
from etl.report.trace_input import (
    Cell,
    Piece,
    Regression,
    Removal,
    TracedFixation,
    TracedLines,
    TracedTrial,
    Word,
)
from etl.session.plan import Plan, make_plan
from etl.tables import LINE_RULES
from tests.end_to_end.building import copied_sample, rows_of

NAN = float("nan")
NAMES = ("when", "topic", "auxiliary", "verb", "object", "spillover", "place")


def cells_of(measured: Measured) -> tuple[Cell, ...]:
    """The cells of a measure as the kernels give them."""
    return tuple(
        Cell(value, REASONS[reason])
        for value, reason in zip(measured.values.tolist(), measured.reasons.tolist(), strict=True)
    )


def measured(traced: TracedTrial) -> TracedTrial:
    """The trial with visits, regressions and all outcomes as the kernels compute them."""
    kept = [place for place, fixation in enumerate(traced.fixations) if fixation.kept]
    chosen = [traced.fixations[place] for place in kept]
    out = compute(
        Sequences(
            np.zeros(len(chosen), np.int64),
            np.array([f.region_order for f in chosen], np.int32),
            np.array([f.duration_ms for f in chosen], np.float64),
            np.array([len(traced.region_names)], np.int32),
        ),
        outside=traced.outside,
        no_opportunity=traced.no_opportunity,
    )
    fixations = list(traced.fixations)
    for place, visit, first in zip(kept, out.visit.tolist(), out.first_pass.tolist(), strict=True):
        fixations[place] = replace(fixations[place], visit=visit, first_pass=first)
    rows = out.regressions
    return replace(
        traced,
        fixations=tuple(fixations),
        outcomes={name: cells_of(m) for name, m in out.regions.items()},
        trial_outcomes={name: cells_of(m)[0] for name, m in out.trials.items()},
        regressions=tuple(
            Regression(chosen[launch].number, chosen[landing].number, bool(ends))
            for launch, landing, ends in zip(
                rows.launch.tolist(),
                rows.landing.tolist(),
                rows.ends_first_pass.tolist(),
                strict=True,
            )
        ),
    )


def by_hand(
    orders: Sequence[int],
    durations_ms: Sequence[float],
    regions: int,
    *,
    left_out: dict[int, Removal] | None = None,
    names: Sequence[str] = (),
    geometry: bool = True,
    **more: Any,
) -> TracedTrial:
    """A trial from region orders and durations; regions of 100 px each side by side on one line.

    ``left_out`` says by number which fixations are left out. Between two fixations pass 30 ms.
    """
    left_out = left_out or {}
    names = tuple(names) or tuple(
        NAMES[k] if regions <= len(NAMES) else f"w{k + 1}" for k in range(regions)
    )
    fixations, onset_ms = [], 1000.0
    for number, (order, duration_ms) in enumerate(zip(orders, durations_ms, strict=True), start=1):
        # A fixation outside hovers above the middle of the text.
        x_px = 100.0 * order + 50 if order else 100.0 + 50 * regions
        fixations.append(
            TracedFixation(
                number,
                onset_ms,
                duration_ms,
                x_px if geometry else NAN,
                (330.0 if order else 200.0) if geometry else NAN,
                1 if order and geometry else 0,
                order,
                0,
                False,
                "logs/P1.tsv",
                number + 1,
                left_out.get(number),
            )
        )
        onset_ms += duration_ms + 30
    words, pieces = (), ()
    if geometry:
        words = tuple(
            Word(1, "x" * 9, 100.0 * k, 300, 100.0 * k + 90, 360) for k in range(1, regions + 1)
        )
        pieces = tuple(
            Piece(k, 1, 100.0 * k, 300, 100.0 * k + 100, 360) for k in range(1, regions + 1)
        )
    traced = TracedTrial(
        **{
            "participant": "P1",
            "session": "",
            "trial": "7",
            "item": "i01",
            "factors": {"cue": "early"},
            "region_names": names,
            "region_texts": ("x" * 9,) * regions,
            "fixations": tuple(fixations),
            "regressions": (),
            "outcomes": {},
            "trial_outcomes": {},
            "words": words,
            "pieces": pieces,
            **more,
        }
    )
    return measured(traced)


def worked_example() -> TracedTrial:
    """The worked example of the definitions."""
    return by_hand(
        [1, 2, 2, 4, 3, 2, 4, 5, 3, 5], [200, 180, 220, 250, 190, 210, 230, 300, 150, 240], 5
    )


#: Places and lines of a trial on three lines 60 px apart, whose middles are at 130, 190 and 250:
#: x, y, line, confidence, and what else is known.
DRIFTING = (
    (150.0, 128.0, 1, 0.99, {}),
    (250.0, 131.0, 1, 0.99, {}),
    (350.0, 150.0, 1, 0.99, {}),
    (250.0, 165.0, 2, 0.99, {"return_sweep": True, "undersweep": True}),
    (120.0, 185.0, 2, 0.9, {}),
    (250.0, 225.0, 2, 0.6249, {}),
    (350.0, 400.0, 0, 0.95, {"on_none": "off_text"}),
    (130.0, 248.0, 3, 1.0, {"return_sweep": True, "line_told": 2}),
    (150.0, 252.0, 3, 1.0, {"line_told": 3}),
    (250.0, 262.0, 3, 0.97, {"removal": Removal("under_ms", "80", "40")}),
)


def drifting(**more: Any) -> TracedTrial:
    """A trial on three lines with all that can be said of lines."""
    pieces = tuple(
        Piece(3 * line + k + 1, line + 1, 100.0 * k + 100, 60.0 * line + 100, 100.0 * k + 200,
              60.0 * line + 160)
        for line in range(3)
        for k in range(3)
    )  # fmt: skip
    words = tuple(
        Word(p.line, "plum", p.left_px, p.top_px, p.right_px - 20, p.bottom_px) for p in pieces
    )
    orders = [3 * (line - 1) + int(x_px // 100) if line else 0 for x_px, _, line, _, _ in DRIFTING]
    traced = by_hand(orders, [200.0] * 9 + [40.0], 9, pieces=pieces, words=words)
    fixations = tuple(
        replace(f, x_px=x_px, y_px=y_px, line=line, line_confidence=sure, **known)
        for f, (x_px, y_px, line, sure, known) in zip(traced.fixations, DRIFTING, strict=True)
    )
    lines = TracedLines("consensus", {1: 130.0, 2: 190.0, 3: 250.0}, 1.0, True, "by_hand.csv")
    return measured(replace(traced, fixations=fixations, **{"lines": lines, **more}))


def unsure_sample(root: Path) -> Path:
    """The passages sample, two of its readers as a bad recording has them; its study file."""
    study_file = copied_sample("passages", root)
    chance = random.Random(5)
    for log in sorted((study_file.parent / "logs").glob("P3[34]_*")):
        with log.open(encoding="utf-8", newline="") as file:
            header, *rows = csv.reader(file)
        y_px, lower = header.index("gaze_y"), 44.0 if log.name.startswith("P33") else 0.0
        for row in rows:
            row[y_px] = f"{float(row[y_px]) + lower + chance.gauss(0, 24):.1f}"
        with log.open("w", encoding="utf-8", newline="") as file:
            csv.writer(file, lineterminator="\n").writerows([header, *rows])
    return study_file


def geometry_of(plan: Plan, text: int) -> dict[str, Any]:
    """Lines, pieces and direction of a text of the library."""
    library = plan.library
    shown = library.texts[text]
    found: dict[str, Any] = {
        "region_names": shown.regions,
        "region_texts": shown.region_texts,
    }
    geometry = library.geometry
    if geometry is None:
        return found
    where = slice(*geometry.text_offsets[text : text + 2].tolist())
    found["pieces"] = tuple(
        Piece(order, line, *extent)
        for order, line, extent in zip(
            geometry.orders[where].tolist(),
            geometry.piece_lines[where].tolist(),
            geometry.extents_px[:, where].T.tolist(),
            strict=True,
        )
    )
    layout = plan.study.regions.layout
    if layout is not None:
        found["right_to_left"] = layout.direction == "rtl"
        words = []
        for number, line in enumerate(shown.whole.split("\n"), start=1):
            at = columns(line)
            top, bottom = line_extent_px(layout, number)
            for match in re.finditer(r"\S+", line):
                ends = [edge_px(layout, at[place]) for place in match.span()]
                words.append(Word(number, match.group(), min(ends), top, max(ends), bottom))
        found["words"] = tuple(words)
    return found


class BuiltStudy:
    """A study and its tables, from which any trial can be traced."""

    def __init__(self, study_file: Path, folder: Path) -> None:
        study = etl.load_study(study_file)
        self.plan = make_plan(study, Findings())[0]
        assert self.plan is not None
        self.study = study
        etl.build(study, into=folder, workers=1)
        self._by_trial: dict[str, dict[tuple[str, str], list[dict[str, Any]]]] = {}
        for table in ("outcomes", "trials", "regressions", "fixations"):
            rows = self._by_trial.setdefault(table, {})
            for row in rows_of(folder, table):
                rows.setdefault((str(row["participant"]), str(row["trial"])), []).append(row)
        self._ledger = ledger_of(folder / "exclusions.csv")
        self._of_lines = lines_in_ledger(folder / "exclusions.csv")

    @property
    def trials(self) -> list[tuple[str, str]]:
        """Participant and trial of all kept trials."""
        return list(self._by_trial["trials"])

    def trace(self, participant: str, trial: str) -> TracedTrial:
        """One trial of the tables."""
        key = participant, trial
        (facts,) = self._by_trial["trials"][key]
        own = {name: str(value) for name, value in facts.items()}
        library = self.plan.library
        text = library.find(tuple(own[name] for name in library.keys))
        geometry = geometry_of(self.plan, text)
        outcomes: dict[str, list[Cell]] = {}
        for row in self._by_trial["outcomes"][key]:
            value = NAN if row["value"] is None else row["value"]
            outcomes.setdefault(row["measure"], []).append(Cell(value, row["missing"] or ""))
        why = dict(part.split(": ") for part in (facts["missing"] or "").split("; ") if part)
        names = list(facts)[list(facts).index("any_regression") : -1]
        names = [name for name in names if name != "line_confidence"]
        return TracedTrial(
            participant,
            own.get("session", ""),
            trial,
            own["item"],
            {name: own[name] for name in self.study.trials.factors},
            fixations=tuple(
                traced_fixation(
                    row,
                    self._ledger.get((*key, str(row["fixation"]), "")),
                    self._of_lines.get((*key, str(row["fixation"])), ("", "")),
                )
                for row in self._by_trial["fixations"][key]
            ),
            regressions=tuple(
                Regression(
                    row["launch_fixation"], row["landing_fixation"], bool(row["ends_first_pass"])
                )
                for row in self._by_trial["regressions"].get(key, [])
            ),
            outcomes={name: tuple(cells) for name, cells in outcomes.items()},
            trial_outcomes={
                name: Cell(NAN if facts[name] is None else float(facts[name]), why.get(name, ""))
                for name in names
            },
            outside=self.study.measures.outside,
            no_opportunity=self.study.measures.no_opportunity,
            values_set_missing={
                (name, order): removal_of(row)
                for order, region in enumerate(geometry["region_names"], start=1)
                for name in outcomes
                if (row := self._ledger.get((*key, region, name)))
            },
            lines=self._lines(facts, geometry),
            **geometry,
        )

    def _lines(self, facts: dict[str, Any], geometry: dict[str, Any]) -> TracedLines | None:
        """How the lines of a trial of several were told, by the tables and the layout alone."""
        numbers = sorted({piece.line for piece in geometry.get("pieces", ())})
        if "line_confidence" not in facts or len(numbers) < 2:
            return None
        layout, told = self.study.regions.layout, self.study.lines
        middles = {n: layout.top_px + layout.line_height_px * (n - 0.5) for n in numbers}
        sure = facts["line_confidence"]
        return TracedLines(
            told.method if told else "consensus",
            middles,
            NAN if sure is None else sure,
            sure is not None and sure >= SURE,
            (told.corrections if told else None) or "",
        )


def ledger_of(path: Path) -> dict[tuple[str, str, str, str], dict[str, str]]:
    """The ledger's rows by participant, trial, and fixation, or region and measure."""
    with path.open(encoding="utf-8", newline="") as file:
        # A position left of the screen begins with a minus sign, and is marked as text.
        rows = [{k: plain(v) for k, v in row.items()} for row in csv.DictReader(file)]
    # Of a value, what was found is its measure and the value: "total_time 2310".
    return {
        (
            row["participant"],
            row["trial"],
            row["fixation"] or row["region"],
            row["observed"].split()[0] if row["level"] == "value" else "",
        ): row
        for row in rows
        if row["level"] in {"fixation", "value"} and row["rule"] not in LINE_RULES
    }


def lines_in_ledger(path: Path) -> dict[tuple[str, str, str], tuple[str, str]]:
    """What the ledger says of lines: rule and finding by participant, trial and fixation."""
    with path.open(encoding="utf-8", newline="") as file:
        return {
            (row["participant"], row["trial"], row["fixation"]): (row["rule"], row["observed"])
            for row in csv.DictReader(file)
            if row["rule"] in LINE_RULES
        }


def removal_of(row: dict[str, str]) -> Removal:
    """Why something was left out, from a row of the ledger."""
    observed = "" if row["level"] == "value" else row["observed"]
    return Removal(row["rule"], row["limit"], observed, row["also"])


def traced_fixation(
    row: dict[str, Any], entry: dict[str, str] | None, of_line: tuple[str, str]
) -> TracedFixation:
    """A row of the table of fixations, with its rows of the ledger where it has some."""
    merged = re.fullmatch(r"merged into (\d+)", entry["action"]) if entry else None

    def number(name: str) -> float:
        return math.nan if row.get(name) is None else float(row[name])

    rule, observed = of_line
    found = re.fullmatch(r"line (\d+)", observed)
    by_hand = (int(found[1]) if found else 0) if rule == "line_corrections" else None
    return TracedFixation(
        row["fixation"],
        number("onset_ms"),
        row["duration_ms"],
        number("x_px"),
        number("y_px"),
        row["line"] or 0,
        row["region_order"] or 0,
        row["visit"] or 0,
        bool(row["first_pass"]),
        row["source_file"],
        row["source_line"],
        None if row["kept"] else (removal_of(entry) if entry else Removal(row["left_out_by"])),
        int(merged[1]) if merged else 0,
        line_confidence=number("line_confidence"),
        return_sweep=row.get("return_sweep") == 1,
        undersweep=row.get("undersweep") == 1,
        on_none=observed.split(",")[0] if rule == "no_line" else "",
        line_told=by_hand,
    )
