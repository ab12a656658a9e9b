"""Columns, types and row order of the published tables."""

from __future__ import annotations

from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from etl.measures import MEASURES, REASONS, TRIAL_MEASURES, Measure
from etl.tables import CovariateColumn, IdColumn, MeasureColumn, TableDesign, read_schema
from tests.end_to_end.building import TABLES, Sample, build, rows_of
from tests.end_to_end.odd_study import odd_study

FACTORS, COVARIATES = ["cue", "fit", "group"], ["age", "verb_letters"]
IDS = ["participant", "trial", "item"]
REGION_MEASURES = [
    *("first_pass_skip", "fixated", "first_pass_refixation", "first_pass_regression_out"),
    *("regression_out", "regression_in", "reread", "fixation_count"),
    *("first_pass_fixation_count", "visit_count", "regression_out_count", "regression_in_count"),
    *("first_fixation_duration", "single_fixation_duration", "first_pass_time", "go_past_time"),
    *("right_bounded_time", "second_pass_time", "total_time"),
]
WHOLE_TRIAL = [
    *("any_regression", "any_first_pass_regression", "any_skip", "fixation_count"),
    *("outside_fixation_count", "regression_count", "progression_count", "regions_reached"),
    "reading_time",
]
#: Column by column what is promised to whoever reads the tables.
PROMISED = {
    "outcomes": [
        *(IDS + FACTORS + COVARIATES),
        *("region", "region_order", "measure", "kind", "value", "missing"),
    ],
    "outcomes_wide": [*IDS, *FACTORS, *COVARIATES, "region", "region_order", *REGION_MEASURES],
    "trials": [*IDS, *FACTORS, *COVARIATES, *WHOLE_TRIAL, "missing"],
    "regressions": [
        *(IDS + FACTORS),
        *("from_region", "from_order", "to_region", "to_order", "regions_crossed"),
        *("ends_first_pass", "launch_fixation", "landing_fixation", "onset_ms", "amplitude_px"),
    ],
    "fixations": [
        *IDS,
        *("fixation", "onset_ms", "duration_ms", "x_px", "y_px", "line", "region"),
        *("region_order", "visit", "first_pass", "kept", "left_out_by"),
        *("source_file", "source_line"),
    ],
}
LEVELS = pa.dictionary(pa.int32(), pa.string())


@pytest.fixture(scope="module")
def odd(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The built study of awkward ids."""
    root = tmp_path_factory.mktemp("odd")
    return build(odd_study(root)).folder


def declared(sample: Sample) -> TableDesign:
    """The tables of the orchard study as the program declares them, filled in by hand."""

    def columns(measures: dict[str, Measure]) -> tuple[MeasureColumn, ...]:
        return tuple(MeasureColumn(m.name, m.kind, m.unit, m.definition) for m in measures.values())

    trials = sample.truth.trials
    return TableDesign(
        {
            "participant": IdColumn.of(t.plan.participant for t in trials),
            "trial": IdColumn.of(str(t.plan.trial) for t in trials),
            "item": IdColumn.of(t.plan.item for t in trials),
        },
        {
            "cue": ("early", "late"),
            "fit": ("fitting", "odd"),
            "group": ("volunteer", "visitor"),
        },
        {"age": CovariateColumn("number"), "verb_letters": CovariateColumn("number")},
        (),
        columns(MEASURES),
        columns(TRIAL_MEASURES),
        REASONS,
        (),
        (),
    )


@pytest.mark.parametrize("table", TABLES)
def test_parquet_has_the_promised_columns(orchard: Sample, table: str) -> None:
    """Names and order of the columns are exactly those promised."""
    assert pq.read_schema(orchard.result.folder / f"{table}.parquet").names == PROMISED[table]


@pytest.mark.parametrize("table", TABLES)
def test_csv_has_the_promised_columns(orchard: Sample, table: str) -> None:
    """The CSV has the same header."""
    with (orchard.result.folder / f"{table}.csv").open(encoding="utf-8", newline="") as file:
        header = file.readline()
    assert header == ",".join(f'"{name}"' for name in PROMISED[table]) + "\n"


@pytest.mark.parametrize("table", TABLES)
def test_files_are_as_the_program_declares_them(orchard: Sample, table: str) -> None:
    """Names, types and whether cells may be missing are those of the declaration."""
    schema = pq.read_schema(orchard.result.folder / f"{table}.parquet")
    assert schema.remove_metadata() == read_schema(declared(orchard).columns(table))


@pytest.mark.parametrize("table", TABLES)
def test_cells_that_may_not_be_missing_are_there(orchard: Sample, table: str) -> None:
    """A column declared without gaps has none."""
    told = pq.read_table(orchard.result.folder / f"{table}.parquet")
    gaps = [
        name
        for name in told.column_names
        if not told.schema.field(name).nullable and told[name].null_count
    ]
    assert gaps == []


@pytest.mark.parametrize(
    ("table", "column", "type_"),
    [
        ("outcomes", "participant", pa.string()),
        ("outcomes", "trial", pa.int64()),
        ("outcomes", "item", pa.string()),
        ("outcomes", "cue", LEVELS),
        ("outcomes", "age", pa.float64()),
        ("outcomes", "region", LEVELS),
        ("outcomes", "region_order", pa.int64()),
        ("outcomes", "measure", LEVELS),
        ("outcomes", "kind", LEVELS),
        ("outcomes", "value", pa.float64()),
        ("outcomes", "missing", LEVELS),
        ("outcomes_wide", "first_pass_skip", pa.int8()),
        ("outcomes_wide", "visit_count", pa.int64()),
        ("outcomes_wide", "go_past_time", pa.float64()),
        ("trials", "any_skip", pa.int8()),
        ("trials", "regions_reached", pa.int64()),
        ("trials", "reading_time", pa.float64()),
        ("regressions", "ends_first_pass", pa.int8()),
        ("regressions", "launch_fixation", pa.int64()),
        ("regressions", "amplitude_px", pa.float64()),
        ("fixations", "fixation", pa.int64()),
        ("fixations", "x_px", pa.float64()),
        ("fixations", "line", pa.int64()),
        ("fixations", "kept", pa.int8()),
        ("fixations", "left_out_by", LEVELS),
        ("fixations", "source_file", pa.string()),
        ("fixations", "source_line", pa.int64()),
    ],
)
def test_column_has_its_type(orchard: Sample, table: str, column: str, type_: pa.DataType) -> None:
    """Ids are plain, factors are levels, 0/1 is a small integer, counts integers, times floats."""
    schema = pq.read_schema(orchard.result.folder / f"{table}.parquet")
    assert schema.field(column).type == type_


def test_outcomes_are_sorted_by_reader_trial_region_measure(sample: Sample) -> None:
    """Rows of ``outcomes`` stand in the promised order, each once."""
    keys = [
        (r["participant"], r["trial"], r["region_order"], r["measure"])
        for r in sample.tables["outcomes"]
    ]
    assert keys == sorted(set(keys))


@pytest.mark.parametrize(
    ("table", "last"),
    [
        ("outcomes_wide", ["region_order"]),
        ("trials", []),
        ("fixations", ["fixation"]),
        ("regressions", ["launch_fixation"]),
    ],
)
def test_other_tables_are_sorted_alike(sample: Sample, table: str, last: list[str]) -> None:
    """Rows stand by reader, trial, and what comes next, each once."""
    keys = [
        tuple(row[column] for column in ("participant", "trial", *last))
        for row in sample.tables[table]
    ]
    assert keys == sorted(set(keys))


def test_every_region_and_measure_has_its_row(sample: Sample) -> None:
    """Kept trials × regions × measures are all there."""
    trials = [(row["participant"], row["trial"]) for row in sample.tables["trials"]]
    expected = [
        (who, trial, order, measure)
        for who, trial in trials
        for order in range(1, sample.region_count(who, trial) + 1)
        for measure in sorted(REGION_MEASURES)
    ]
    assert expected == [
        (r["participant"], r["trial"], r["region_order"], r["measure"])
        for r in sample.tables["outcomes"]
    ]


def test_session_stands_between_reader_and_trial(odd: Path) -> None:
    """Where readers came more than once, every table says which visit a row is about."""
    for table in TABLES:
        names = pq.read_schema(odd / f"{table}.parquet").names
        assert names[:4] == ["participant", "session", "trial", "item"]


def test_ids_sort_as_numbers_only_where_all_are_numbers(odd: Path) -> None:
    """R10 comes before R9, trial 9 before trial 10; trials of different visits stay apart."""
    told = [(r["participant"], r["session"], r["trial"]) for r in rows_of(odd, "trials")]
    assert told == [
        ("R10", "a", 10),
        ("R9", "a", 9),
        ("R9", "a", 10),
        ("R9", "b", 9),
        ("R9", "b", 10),
    ]


def test_id_with_leading_zeros_stays_as_it_was(odd: Path) -> None:
    """An id such as 007 is a name, and so are texts with quotes, commas and letters with dots."""
    assert {row["item"] for row in rows_of(odd, "trials")} == {
        "007",
        'Ünlü "pear"',
        "o'hara; plum",
    }


def test_fact_that_is_not_there_is_missing_and_a_word_stays_a_word(odd: Path) -> None:
    """An empty cell of a covariate is missing; "NaN" in a column of words is a word."""
    moods = [row["mood"] for row in rows_of(odd, "trials")]
    assert moods == ["so, so", "NaN", "good", None, "so, so"]


def test_second_recording_is_shown_and_left_out(odd: Path) -> None:
    """With ``repeated = "first"`` the fixation of the second recording is there, but not kept."""
    left = [
        (r["participant"], r["session"], r["trial"], r["fixation"], r["left_out_by"])
        for r in rows_of(odd, "fixations")
        if not r["kept"]
    ]
    assert left == [
        ("R10", "a", 9, 1, "skip"),
        ("R10", "a", 9, 2, "skip"),
        ("R9", "a", 8, 1, "skip"),
        ("R9", "b", 10, 5, "repeated"),
        ("R9", "b", 10, 6, "repeated"),
    ]


def test_trial_with_one_fixation_has_no_saccade(odd: Path) -> None:
    """The reasons of a trial's missing outcomes are spelled in its last column."""
    [row] = [r for r in rows_of(odd, "trials") if r["item"] == "o'hara; plum"]
    told = "any_regression: no_saccade; any_first_pass_regression: no_saccade"
    assert (row["any_regression"], row["missing"]) == (None, told)
