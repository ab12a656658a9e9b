"""Sidecars of the open standard (BIDS): what they inherit, what they must say, what is damaged.

Source: BIDS 1.11, Common principles, "The inheritance principle".
"""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import Findings
from etl.parsers.bids_names import BidsName, Place, folders_above, same_run
from etl.parsers.bids_sidecars import read_sidecar
from tests.parsers.bids_making import RECORDING, RUN, Dataset, told

FILE = f"sub-P01/beh/sub-P01{RUN}_physio.tsv.gz"


def merged(folder: Path, sidecars: dict[str, dict[str, object]]) -> tuple[dict[str, object], str]:
    """What some sidecars say of the recording together, and what is wrong with them."""
    data = Dataset(folder / "data")
    data.remove("physio.json")
    for name, values in sidecars.items():
        data.sidecar(name, values)
    findings = Findings()
    found = read_sidecar(data.folder / FILE, Place(data.folder / FILE, FILE), findings)
    return ({} if found is None else found.values), findings.text()


@pytest.mark.parametrize(
    "name",
    [
        "physio.json",
        "task-read_physio.json",
        "recording-eye1_physio.json",
        "sub-P01/sub-P01_physio.json",
        "sub-P01/beh/sub-P01_task-read_physio.json",
        FILE.replace(".tsv.gz", ".json"),
    ],
)
def test_sidecar_applies_whose_entities_the_file_has(tmp_path: Path, name: str) -> None:
    """A sidecar of this folder or one above applies, if the file has all its entities."""
    assert merged(tmp_path, {name: {"RecordedEye": "left"}}) == ({"RecordedEye": "left"}, "")


@pytest.mark.parametrize(
    "name",
    [
        "task-other_physio.json",
        "recording-eye10_physio.json",
        "acq-fine_physio.json",
        "physioevents.json",
        "events.json",
        "sub-P02/beh/sub-P01_physio.json",
        "sub-P01/beh/deeper/sub-P01_physio.json",
    ],
)
def test_sidecar_of_others_does_not_apply(tmp_path: Path, name: str) -> None:
    """Another label, another entity, another kind of data or another folder is not meant."""
    values, said = merged(tmp_path, {name: {"RecordedEye": "left"}})
    assert values == {}
    assert f"{FILE}: no sidecar describes this file" in said


def test_nearer_sidecar_goes_before_a_farther_one_key_by_key(tmp_path: Path) -> None:
    """What the nearer one does not say is inherited."""
    values, _ = merged(
        tmp_path,
        {
            "physio.json": {"a": 1, "b": 1, "c": 1},
            "sub-P01/sub-P01_physio.json": {"b": 2, "c": 2},
            FILE.replace(".tsv.gz", ".json"): {"c": 3},
        },
    )
    assert values == {"a": 1, "b": 2, "c": 3}


def test_object_of_a_column_is_replaced_as_a_whole(tmp_path: Path) -> None:
    """Keys are those of the sidecar itself, not those within them."""
    values, _ = merged(
        tmp_path,
        {
            "physio.json": {"timestamp": {"Units": "s", "Description": "clock"}},
            "sub-P01/sub-P01_physio.json": {"timestamp": {"Units": "ms"}},
        },
    )
    assert values == {"timestamp": {"Units": "ms"}}


def test_two_sidecars_of_one_folder_are_refused(tmp_path: Path) -> None:
    """At most one sidecar of a folder may apply."""
    _, said = merged(tmp_path, {"physio.json": {}, "task-read_physio.json": {}})
    assert said == (
        f"task-read_physio.json: two sidecars of one folder describe {FILE}; "
        "expected one of each folder for a file; physio.json applies too\n"
        "    fix: put what both say into one, or move the more general one a folder up\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('{"RecordedEye": "left",\n}', "physio.json:2: this is no JSON: "),
        ('{"a": 1, "a": 2}', 'physio.json: the key "a" stands there twice'),
        ('{"a": NaN}', "physio.json: this is no JSON: NaN is no number"),
        ("[1]", "physio.json: this is no JSON object"),
        ("", "physio.json:1: this is no JSON: "),
        ('{"a": ' + "[" * 20_000, "physio.json: "),
    ],
    ids=["comma", "twice", "NaN", "list", "empty", "deep"],
)
def test_damaged_sidecar_is_refused(tmp_path: Path, text: str, said: str) -> None:
    """What is no JSON object stops the build, and the sidecar is named."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", text)
    assert data.refusal().startswith(said)


def test_sidecar_in_another_encoding_is_refused(tmp_path: Path) -> None:
    """Sidecars are UTF-8."""
    data = Dataset(tmp_path)
    (tmp_path / "physio.json").write_bytes(b'{"note": "caf\xe9"}')
    assert data.refusal().startswith("physio.json: the text is not valid UTF-8")


@pytest.mark.parametrize(
    "key", ["SamplingFrequency", "StartTime", "Columns", "RecordedEye", "SampleCoordinateSystem"]
)
def test_required_field_of_a_recording_is_asked_for(tmp_path: Path, key: str) -> None:
    """A sidecar that lacks what the standard requires is refused, and the key named."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, **{key: None}))
    assert data.refusal() == (
        f"physio.json: {key}: the sidecar does not say {key}, which the standard requires; "
        f"expected {key} for {FILE}\n"
        f"    fix: add {key} to this file, or to one in a folder above\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("key", ["Columns", "OnsetSource"])
def test_required_field_of_events_is_asked_for(tmp_path: Path, key: str) -> None:
    """The events beside a recording need their columns and the source of their onsets."""
    data = Dataset(tmp_path)
    both = {"Columns": ["onset", "duration", "trial_type"], "OnsetSource": "timestamp"}
    data.sidecar("physioevents.json", told(both, **{key: None}))
    assert f"physioevents.json: {key}: the sidecar does not say {key}" in data.refusal()


@pytest.mark.parametrize(
    ("key", "value", "said"),
    [
        ("SamplingFrequency", 0, "expected a number above 0"),
        ("SamplingFrequency", "fast", "expected a number above 0"),
        ("SamplingFrequency", True, "expected a number above 0"),
        ("StartTime", "n/a", "expected a number"),
        ("Columns", "timestamp", "this is no list of names"),
        ("Columns", [], "this is no list of names"),
        ("Columns", ["timestamp", "x_coordinate"], 'there is no column "y_coordinate"'),
        ("Columns", ["timestamp", *["x_coordinate"] * 2, "y_coordinate"], "same name"),
        ("RecordedEye", "both", 'expected "left" or "right" or "cyclopean"'),
        ("SampleCoordinateSystem", "eye-in-head", 'expected "gaze-on-screen"'),
        ("SampleCoordinateSystem", "custom", "only gaze on the screen can be in them"),
        ("PhysioType", "generic", 'expected "eyetrack"'),
    ],
)
def test_field_that_cannot_be_used_is_refused(
    tmp_path: Path, key: str, value: object, said: str
) -> None:
    """A wrong value stops the build, with the key, its line and what belongs there."""
    data = Dataset(tmp_path)
    data.sidecar("physio.json", told(RECORDING, **{key: value}))
    text = data.refusal()
    line = list(RECORDING).index(key) + 2
    assert text.startswith(f"physio.json:{line}: {key}: ")
    assert said in text


def test_onset_source_must_be_a_column_of_the_recording(tmp_path: Path) -> None:
    """The standard's check MISSING_ONSET_COLUMN, and rows of the recording besides."""
    data = Dataset(tmp_path)
    data.sidecar(
        "physioevents.json",
        {"Columns": ["onset", "duration", "trial_type"], "OnsetSource": "clock"},
    )
    assert (
        'physioevents.json:7: OnsetSource: this cannot be used; found ""clock""' in data.refusal()
    )


@pytest.mark.parametrize(
    "name",
    ["sub_physio.tsv.gz", "sub-P01_sub-P02_physio.tsv.gz", "sub-P 1_physio.tsv.gz", "physio"],
)
def test_name_that_is_none_of_the_standard_is_not_taken_apart(name: str) -> None:
    """Entities are pairs of letters and digits, each once."""
    parsed = BidsName.of(name)
    assert parsed is None or "sub" not in parsed.entities


def test_folders_go_from_the_dataset_to_the_file() -> None:
    """Sidecars are looked for in the dataset's folder and in each below, down to the file's."""
    path = Path("data/sub-1/ses-2/beh/sub-1_ses-2_physio.tsv.gz")
    assert [folder.as_posix() for folder in folders_above(path)] == [
        "data",
        "data/sub-1",
        "data/sub-1/ses-2",
        "data/sub-1/ses-2/beh",
    ]


def test_recordings_of_a_run_differ_in_their_label_only(tmp_path: Path) -> None:
    """Another run or task is another recording, not the other eye."""
    data = Dataset(tmp_path)
    other = data.samples([], entities="_task-read_recording-eye2")
    data.samples([], entities="_task-read_run-2_recording-eye1")
    assert same_run(other) == [tmp_path / FILE, other]
