"""What a sound study file becomes."""

import json
import multiprocessing
import pickle
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import pydantic
import pytest

from etl.study import Study, load_study
from tests.study.written import EXAMPLE, SOUND, changed

DEFAULTS = {
    "title": "",
    "logs": {
        "files": ["logs/*.tsv"],
        "kind": "table",
        "participant_from_name": None,
        "delimiter": None,
        "decimal": None,
        "encoding": None,
        "missing": ["", ".", "NA"],
        "comment": ["#"],
        "columns": {
            "participant": {"column": "reader", "unit": None},
            "trial": {"column": "trial_no", "unit": None},
            "item": None,
            "session": None,
            "onset": {"column": "t_start", "unit": "ms"},
            "fixation": None,
            "duration": {"column": "dur", "unit": "ms"},
            "end": None,
            "x": {"column": "gx", "unit": "px"},
            "y": {"column": "gy", "unit": "px"},
            "label": None,
            "eye": None,
            "blink": None,
        },
        "where": {},
        "patterns": None,
        "eye": None,
        "samples": None,
        "bids": None,
    },
    "participants": None,
    "items": None,
    "trials": {
        "table": None,
        "keys": ["participant", "trial"],
        "factors": [],
        "covariates": [],
        "levels": {},
        "repeated": "error",
        "answer_correct": None,
        "onset": None,
        "offset": None,
        "skip": {},
    },
    "screen": None,
    "regions": {
        "file": "boxes.csv",
        "kind": "boxes",
        "vertical": "box",
        "tolerance_px": 0.0,
        "overlap": "error",
        "layout": None,
    },
    "lines": None,
    "screening": None,
    "measures": {
        "outcomes": ["binary", "count", "duration"],
        "outside": "ignore",
        "no_opportunity": "missing",
    },
    "output": {
        "folder": "out",
        "formats": ["parquet"],
        "contrasts": {},
        "centred": [],
        "pseudonyms": False,
    },
}


def facts_of(study: Study) -> tuple[object, ...]:
    """What a worker must find in the study it is given."""
    return study.understood(), study.path, study.folder, study.shown, study.line_of("regions")


def test_absent_keys_have_their_defaults(load: Callable[..., Study]) -> None:
    """The study as understood has every key, in the order of the file, defaults filled in."""
    understood = load(SOUND).understood()
    assert json.dumps(understood) == json.dumps(DEFAULTS)


def test_example_reads_like_the_file(load: Callable[..., Study]) -> None:
    """The keys of the design's example are attributes of the same names."""
    study = load(EXAMPLE)
    assert study.title == "Orchard study"
    assert study.logs.participant_from_name == r"(?P<participant>P\d+)"
    assert study.logs.where == {"eye": ("R",)}
    assert study.trials.levels == {"cue": ("early", "late")}
    assert study.screen is not None
    assert (study.screen.width_px, study.screen.distance_cm) == (1920, 65.0)
    assert study.regions.layout is not None
    assert (study.regions.layout.left_px, study.regions.layout.space) == (200.0, "following")
    assert study.output.formats == ("parquet", "csv")


@pytest.mark.parametrize(
    ("written", "column", "unit"),
    [
        pytest.param('"t0"', "t0", "ms", id="header alone"),
        pytest.param('{ column = "t0" }', "t0", "ms", id="table without a unit"),
        pytest.param('{ column = "t0", unit = "us" }', "t0", "us", id="table with a unit"),
    ],
)
def test_column_is_a_header_or_a_table(
    load: Callable[..., Study], written: str, column: str, unit: str
) -> None:
    """A column has a header and a unit, however it was written."""
    onset = load(changed('"t_start"', written)).logs.columns.onset
    assert onset is not None
    assert (onset.column, onset.unit) == (column, unit)


def test_present_columns_are_in_the_order_of_the_table(load: Callable[..., Study]) -> None:
    """Only the columns that the study names are present."""
    present = load(SOUND).logs.columns.present()
    assert list(present) == ["participant", "trial", "onset", "duration", "x", "y"]


def test_numbers_stand_for_their_text(load: Callable[..., Study]) -> None:
    """A number among values of cells is taken as it is written, with its digits."""
    study = load(changed("[regions]", '[trials]\nskip = { block = [0, 1.50, "x"] }\n[regions]'))
    assert study.trials.skip == {"block": ("0", "1.50", "x")}


def test_whole_number_serves_as_a_number(load: Callable[..., Study]) -> None:
    """Where decimals are allowed they are not demanded."""
    study = load(changed('"boxes"\n', '"boxes"\ntolerance_px = 20\n'))
    assert study.regions.tolerance_px == 20.0


@pytest.mark.parametrize("axis", ["up", "down"])
def test_degrees_count_from_the_centre_unless_said(load: Callable[..., Study], axis: str) -> None:
    """With positions in degrees an absent origin is the centre, in the record too."""
    degrees = '{ column = "gx", unit = "deg" }\ny = { column = "gy", unit = "deg" }\n[screen]\n'
    sizes = "width_px = 1920\nheight_px = 1080\nwidth_cm = 53\ndistance_cm = 65\n"
    study = load(changed('"gx"\ny = "gy"\n', f'{degrees}{sizes}y_axis = "{axis}"\n'))
    assert study.understood()["screen"]["origin"] == "centre"


def test_study_knows_its_place(load: Callable[..., Study], tmp_path: Path) -> None:
    """A study knows its file, its folder, and the name the user gave."""
    study = load(SOUND)
    assert (study.path, study.folder) == (tmp_path / "study.toml", tmp_path)
    assert study.shown == "study.toml"


@pytest.mark.parametrize(
    ("path", "line"),
    [
        pytest.param(("regions", "kind"), 14, id="key"),
        pytest.param(("logs", "columns"), 4, id="table"),
        pytest.param(("logs", "files", 0), 2, id="entry"),
        pytest.param(("logs", "columns", "onset", "unit"), 7, id="default in a column"),
        pytest.param(("regions", "layout", "left_px"), 12, id="key that is not there"),
        pytest.param(("screen", "width_px"), None, id="table that is not there"),
    ],
)
def test_study_knows_the_lines_of_its_keys(
    load: Callable[..., Study], path: tuple[str | int, ...], line: int | None
) -> None:
    """A finding about a key can name its line later on."""
    assert load(SOUND).line_of(*path) == line


def test_study_can_be_pickled(load: Callable[..., Study]) -> None:
    """Nothing is lost on the way to a worker."""
    study = load(EXAMPLE)
    again = pickle.loads(pickle.dumps(study))  # noqa: S301 - our own bytes
    assert facts_of(again) == facts_of(study)


def test_study_reaches_a_spawned_worker(load: Callable[..., Study]) -> None:
    """A worker that shares no memory with us finds the same study."""
    study = load(EXAMPLE)
    spawn = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(max_workers=1, mp_context=spawn) as pool:
        assert pool.submit(Study.line_of, study, "regions").result() == study.line_of("regions")


def test_study_cannot_be_changed(load: Callable[..., Study]) -> None:
    """A study stays what its file says."""
    study = load(SOUND)
    with pytest.raises(pydantic.ValidationError, match="frozen"):
        study.regions.kind = "words"  # type: ignore[misc]


@pytest.mark.parametrize(
    ("name", "recorded"),
    [
        pytest.param("boxes.csv", "boxes.csv", id="relative"),
        pytest.param("../texts/boxes.csv", "../texts/boxes.csv", id="beside the folder"),
        pytest.param("{folder}/texts/boxes.csv", "texts/boxes.csv", id="below the folder"),
        pytest.param("/somewhere/else/boxes.csv", "…/boxes.csv", id="elsewhere"),
        pytest.param("C:/somewhere/else/boxes.csv", "…/boxes.csv", id="on another drive"),
    ],
)
def test_record_says_nothing_about_the_machine(
    load: Callable[..., Study], tmp_path: Path, name: str, recorded: str
) -> None:
    """The study as understood names no folder of this machine."""
    written = changed("boxes.csv", name.format(folder=tmp_path.as_posix()))
    assert load(written).understood()["regions"]["file"] == recorded


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_sample_study_is_sound(name: str) -> None:
    """The study files that come with the program are accepted."""
    path = Path(__file__).parents[2] / "sample_logs" / name / "study.toml"
    assert load_study(path).title.endswith("about a community orchard")
