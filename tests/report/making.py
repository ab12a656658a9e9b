"""The input of the audit page, made from tables: those of a sample study, or small made-up ones.

Screening is played here by marking trials and fixations in the tables by hand, so that the page
can be checked against tables whatever left things out.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa

import etl
from etl.measures import MEASURES, TRIAL_MEASURES
from etl.measures.reasons import REASON_MEANINGS, REASONS
from etl.report import (
    AccountRow,
    AuditInput,
    GalleryEntry,
    LineGrid,
    NotRecorded,
    Profiles,
    ReaderProfile,
    TrialFates,
    profile_of,
)
from etl.tables import BARE_DESIGN, IdColumn, MeasureColumn, TableDesign, written_schema

#: Rules in order of application, as the accounts have them.
RULES = (
    *("skip", "repeated", "blink", "under_ms", "over_ms", "notes", "fewest_fixations"),
    *("outside_share_over", "no_first_pass_on", "correct_share_under"),
)
FIXATION_RULES = ("blink", "under_ms", "over_ms")
TABLES = ("outcomes", "outcomes_wide", "trials", "fixations")

Frames = dict[str, pd.DataFrame]


def design_of(frames: Frames, factors: Mapping[str, Sequence[str]]) -> TableDesign:
    """The design that tables have."""
    wide, fixations = frames["outcomes_wide"], frames["fixations"]
    ids = {
        name: IdColumn.of(fixations[name].astype(str))
        for name in ("participant", "session", "trial", "item")
        if name in fixations
    }
    measures = {
        name: MeasureColumn(name, m.kind, m.unit, m.definition) for name, m in MEASURES.items()
    }
    of_trials = tuple(
        MeasureColumn(name, m.kind, m.unit, m.definition)
        for name, m in TRIAL_MEASURES.items()
        if name in frames["trials"]
    )
    regions = wide["region"]
    names = list(regions.cat.categories) if hasattr(regions, "cat") else list(regions.unique())
    return TableDesign(
        ids,
        {name: tuple(levels) for name, levels in factors.items()},
        {},
        tuple(names),
        tuple(measure for name, measure in measures.items() if name in wide),
        of_trials,
        REASONS,
        RULES,
        tuple(dict.fromkeys(fixations["source_file"].astype(str))),
    )


def batch_of(frame: pd.DataFrame, table: str, design: TableDesign) -> pa.RecordBatch:
    """Rows in the types in which the work on a reader hands them on."""
    columns = design.columns(table)
    known: dict[str, Sequence[str]] = {c.name: c.levels for c in columns if c.type == "category"}
    known |= {name: column.values for name, column in design.ids.items()}  # noqa: PD011
    known |= {"source_file": design.files, "missing": design.reasons[1:]}
    arrays = []
    for field_, column in zip(written_schema(columns), columns, strict=True):
        values = frame[column.name]
        if not pa.types.is_dictionary(field_.type):
            plain = [None if pd.isna(v) else v for v in values]
            arrays.append(pa.array(plain).cast(field_.type))
            continue
        if column.name not in known or (table == "trials" and column.name == "missing"):
            plain = [None if pd.isna(v) else str(v) for v in values]
            arrays.append(pa.array(plain, pa.string()).dictionary_encode())
            continue
        place = {text: code for code, text in enumerate(known[column.name])}
        codes = [None if pd.isna(v) else place[str(v)] for v in values]
        arrays.append(
            pa.DictionaryArray.from_arrays(
                pa.array(codes, pa.int32()), pa.array(known[column.name], pa.string())
            )
        )
    return pa.RecordBatch.from_arrays(arrays, schema=written_schema(columns))


@dataclass
class Made:
    """Tables, and all that the page needs to know beside them.

    ``recorded`` holds every trial of the study that was read, with factors and the rule that left
    it out, empty where it was kept.
    """

    frames: Frames
    recorded: pd.DataFrame
    factors: Mapping[str, Sequence[str]]
    study: Mapping[str, Any]
    not_recorded: Sequence[NotRecorded] = ()
    warnings: Sequence[str] = ()
    gallery: Sequence[GalleryEntry] = ()
    grid: LineGrid | None = None
    design: TableDesign = BARE_DESIGN

    def __post_init__(self) -> None:
        if self.design is BARE_DESIGN:
            self.design = design_of(self.frames, self.factors)

    @property
    def participants(self) -> list[str]:
        """Readers in the order of the tables."""
        return list(self.design.ids["participant"].values)

    def of(self, table: str, participant: str) -> pd.DataFrame:
        """The rows of one reader."""
        frame = self.frames[table]
        return frame[frame["participant"].astype(str) == participant]

    def profile(self, participant: str, **options: Any) -> ReaderProfile:
        """One reader summed up."""
        own = self.recorded[self.recorded["participant"].astype(str) == participant]
        codes = {
            name: np.array([levels.index(v) for v in own[name].astype(str)], dtype=np.int32)
            for name, levels in self.design.factors.items()
        }
        rules = np.array([RULES.index(r) if r else -1 for r in own["rule"]], dtype=np.int32)
        batches = {
            table: batch_of(self.of(table, participant), table, self.design)
            for table in ("outcomes", "outcomes_wide", "fixations")
        }
        options.setdefault("grid", self.grid)
        return profile_of(participant, batches, TrialFates(codes, rules), self.design, **options)

    def profiles(self) -> Profiles:
        """Every reader summed up, one after the other."""
        out = Profiles()
        for participant in self.participants:
            out.add(self.profile(participant))
        return out

    def accounts(self) -> list[AccountRow]:
        """The accounts, counted anew from ``fixations`` and the trials recorded."""
        fixations = self.frames["fixations"]
        used = set(fixations["left_out_by"].dropna()) | set(self.recorded["rule"])
        rules = [rule for rule in RULES if rule in used]
        out = []
        for participant in self.participants:
            own = self.of("fixations", participant)
            trials = self.recorded[self.recorded["participant"].astype(str) == participant]
            outside = own[own["left_out_by"].isin(["skip"])].drop_duplicates(
                [n for n in ("session", "trial") if n in own]
            )
            lost = {rule: int((trials["rule"] == rule).sum()) for rule in rules}
            if "skip" in rules:
                lost["skip"] = len(outside)
            kept = int((trials["rule"] == "").sum())
            out.append(AccountRow(participant, "trials", len(trials) + len(outside), lost, kept))
            lost = {rule: int((own["left_out_by"] == rule).sum()) for rule in rules}
            out.append(AccountRow(participant, "fixations", len(own), lost, int(own["kept"].sum())))
        return out

    def given(self) -> AuditInput:
        """The input of the page."""
        return AuditInput(
            self.study,
            self.design,
            self.profiles(),
            self.accounts(),
            REASON_MEANINGS,
            self.warnings,
            self.not_recorded,
            self.gallery,
        )


def made_from(result: etl.Result, study: etl.Study) -> Made:
    """A finished build as it is."""
    frames = {table: result.table(table) for table in TABLES}
    frames["fixations"]["left_out_by"] = frames["fixations"]["left_out_by"].astype(object)
    keys = [n for n in ("participant", "session", "trial") if n in frames["trials"]]
    names = study.trials.factors
    recorded = frames["trials"][[*keys, *names]].copy()
    recorded["rule"] = ""
    factors = {name: list(frames["trials"][name].cat.categories) for name in names}
    layout = study.regions.layout
    return Made(
        frames,
        recorded,
        factors,
        study.understood(),
        warnings=result.findings.lines(("warning", "note")),
        grid=None if layout is None else LineGrid(layout.top_px, layout.line_height_px),
    )


def losing(made: Made, lost: Mapping[tuple[Any, Any], str]) -> Made:
    """The same study after a rule left out some trials, named by reader and trial."""
    frames = {name: frame.copy() for name, frame in made.frames.items()}
    gone = pd.MultiIndex.from_tuples(lost) if lost else pd.MultiIndex.from_arrays([[], []])

    def rows_of(frame: pd.DataFrame) -> pd.Series:
        index = pd.MultiIndex.from_frame(frame[["participant", "trial"]])
        return pd.Series(index.isin(gone), index=frame.index)

    for name in ("outcomes", "outcomes_wide", "trials"):
        frames[name] = frames[name][~rows_of(frames[name])]
    fixations = frames["fixations"]
    hit = rows_of(fixations)
    keys = zip(fixations.loc[hit, "participant"], fixations.loc[hit, "trial"], strict=True)
    fixations.loc[hit, "left_out_by"] = [lost[key] for key in keys]
    _blank(fixations, hit)
    recorded = made.recorded.copy()
    keys = zip(recorded["participant"], recorded["trial"], strict=True)
    recorded["rule"] = [
        lost.get(key, rule) for key, rule in zip(keys, recorded["rule"], strict=True)
    ]
    return replace(made, frames=frames, recorded=recorded)


def dropping(made: Made, rows: pd.Series, rule: str) -> Made:
    """The same study after a rule left out some fixations."""
    frames = {name: frame.copy() for name, frame in made.frames.items()}
    fixations = frames["fixations"]
    hit = rows & (fixations["kept"] == 1)
    fixations.loc[hit, "left_out_by"] = rule
    _blank(fixations, hit)
    return replace(made, frames=frames)


def _blank(fixations: pd.DataFrame, hit: pd.Series) -> None:
    """A fixation left out belongs to no visit."""
    fixations.loc[hit, "kept"] = 0
    fixations.loc[hit, ["visit", "first_pass"]] = np.nan


def screened(made: Made) -> Made:
    """The orchard study as screening might leave it: some of everything."""
    fixations = made.frames["fixations"]
    out = dropping(made, fixations["duration_ms"] < 80, "under_ms")
    out = dropping(out, fixations["duration_ms"] > 600, "over_ms")
    trials = out.recorded
    lost: dict[tuple[Any, Any], str] = {}
    for place, row in enumerate(trials.itertuples()):
        key = row.participant, row.trial
        if row.participant == "P20":
            lost[key] = "correct_share_under"
        elif row.participant == "P07" and place % 3 == 0:
            lost[key] = "outside_share_over"
        elif row.fit == "odd" and place % 13 == 0:
            lost[key] = "no_first_pass_on"
        elif place % 41 == 0:
            lost[key] = "notes"
        elif place % 57 == 0:
            lost[key] = "fewest_fixations"
    screening = {
        "fixations": {"under_ms": 80, "over_ms": 600},
        "trials": {
            "notes": "notes.csv",
            "fewest_fixations": 3,
            "outside_share_over": 0.3,
            "no_first_pass_on": ["verb"],
        },
        "participants": {"correct_share_under": 0.75},
    }
    return replace(losing(out, lost), study={**out.study, "screening": screening})


def small(
    trials: Iterable[tuple[str, str, dict[str, str], list[tuple[int, float]]]],
    factors: Mapping[str, Sequence[str]],
    *,
    title: str = "A small study",
    regions: Sequence[str] = ("a", "b"),
) -> Made:
    """Tables of a made-up study, from the region order and duration of each fixation.

    The outcomes hold ``fixated`` and ``first_pass_skip``; region order 0 is outside.
    """
    wide, fixations, kept = [], [], []
    for participant, trial, levels, sequence in trials:
        base = {"participant": participant, "trial": trial, "item": "i1"}
        kept.append({**base, **levels, "missing": None})
        for number, (order, duration) in enumerate(sequence, start=1):
            fixations.append(
                {
                    **base,
                    "fixation": number,
                    "onset_ms": 300.0 * number,
                    "duration_ms": duration,
                    "x_px": 10.0,
                    "y_px": 20.0,
                    "line": 1,
                    "region": regions[order - 1] if order else None,
                    "region_order": order or None,
                    "visit": 1 if order else None,
                    "first_pass": 1 if order else None,
                    "kept": 1,
                    "left_out_by": None,
                    "source_file": f"{participant}.tsv",
                    "source_line": len(fixations) + 2,
                }
            )
        seen = [order for order, _ in sequence]
        for order, region in enumerate(regions, start=1):
            reached = max(seen, default=0) >= order
            wide.append(
                {
                    **base,
                    **levels,
                    "region": region,
                    "region_order": order,
                    "first_pass_skip": float(order not in seen) if reached else np.nan,
                    "fixated": float(order in seen),
                }
            )
    wide_frame = pd.DataFrame(wide)
    names = ("first_pass_skip", "fixated")
    long = wide_frame.melt(
        id_vars=[c for c in wide_frame if c not in names], var_name="measure", value_name="value"
    )
    long["kind"] = "binary"
    long["missing"] = np.where(long["value"].isna(), "not_reached", None)
    frames = {
        "outcomes": long,
        "outcomes_wide": wide_frame,
        "trials": pd.DataFrame(kept),
        "fixations": pd.DataFrame(fixations),
    }
    recorded = frames["trials"][["participant", "trial", *factors]].copy()
    recorded["rule"] = ""
    return Made(frames, recorded, factors, {"title": title, "screening": None})
