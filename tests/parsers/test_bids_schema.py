"""What is required of a recording, against the standard's own machine-readable schema.

Source: schema of BIDS 1.11, as the package bidsschematools carries it; the rules are those of
"Modality specific files", "Physiological recordings", for ``PhysioType`` "eyetrack".
"""

from __future__ import annotations

from typing import Any

import pytest
from bidsschematools.schema import load_schema

from etl.parsers.bids_fixations import EVENT_COLUMNS, FIXATION_COLUMNS
from etl.parsers.bids_names import BidsName
from etl.parsers.bids_recording import EYES, ON_SCREEN
from etl.parsers.bids_samples import RECORDING_COLUMNS
from etl.parsers.bids_screen import SCREEN_FIELDS
from etl.parsers.bids_sidecars import (
    ANY_TYPE,
    EVENTS_FIELDS,
    EYE_FIELDS,
    EYE_TRACK,
    RECORDING_FIELDS,
)
from etl.study import bids_rules
from etl.trials.labels import PREFIXES

SCHEMA: Any = load_schema()


def required(fields: Any) -> set[str]:
    """The keys of a rule that are required."""
    return {name for name, level in fields.items() if level == "required"}


def test_schema_is_of_the_version_that_is_read() -> None:
    """The rules below are those of BIDS 1.11."""
    assert SCHEMA.bids_version.startswith("1.11.")


@pytest.mark.parametrize(
    ("rule", "ours"),
    [
        ("Continuous", RECORDING_FIELDS),
        ("EyeTrack", EYE_FIELDS),
        ("PhysioEvents", EVENTS_FIELDS),
    ],
)
def test_required_fields_are_those_of_the_schema(rule: str, ours: tuple[str, ...]) -> None:
    """A sidecar must say what the schema requires, no more and no less."""
    assert set(ours) == required(SCHEMA.rules.sidecars.continuous[rule].fields)


def test_columns_of_recordings_are_those_of_the_schema() -> None:
    """A recording of the eyes has the schema's initial columns, all of them required."""
    rule = SCHEMA.rules.tabular_data.physio.PhysioEyeTracking
    names = [SCHEMA.objects.columns[one].name for one in rule.initial_columns]
    assert list(RECORDING_COLUMNS) == names
    assert set(rule.initial_columns) == required(rule.columns)


def test_columns_of_events_are_those_of_the_schema() -> None:
    """Events need an onset; what fixations need besides is known to the schema."""
    rule = SCHEMA.rules.tabular_data.physio.PhysioEventsColumns
    names = {one: SCHEMA.objects.columns[one].name for one in rule.columns}
    assert set(EVENT_COLUMNS) == {names[one] for one in required(rule.columns)}
    assert set(FIXATION_COLUMNS) <= set(names.values())


def test_eyes_are_those_of_the_schema() -> None:
    """RecordedEye has the schema's values, in the reader and in the study file."""
    assert list(EYES) == list(bids_rules.EYES) == list(SCHEMA.objects.metadata.RecordedEye.enum)


def test_types_of_recordings_are_those_of_the_schema() -> None:
    """PhysioType is one of two, and the absent one is not of the eyes."""
    kind = SCHEMA.objects.metadata.PhysioType
    assert {EYE_TRACK, ANY_TYPE} == set(kind.enum)
    assert f'the default value is `"{ANY_TYPE}"`' in kind.description


def test_coordinate_system_is_one_of_the_schema() -> None:
    """Gaze on the screen is one of the systems of the schema."""
    assert ON_SCREEN in SCHEMA.objects.metadata.SampleCoordinateSystem.enum


def test_screen_is_described_as_the_schema_asks() -> None:
    """The fields of the screen are those that the schema checks for gaze on the screen."""
    checks = SCHEMA.rules.checks.eyetrack.EyetrackingStimulusPresentation.checks
    assert all(any(name in check for check in checks) for name in SCREEN_FIELDS)
    assert len(checks) == len(SCREEN_FIELDS)


def test_times_of_events_are_seconds_by_the_schema() -> None:
    """Events of the task are in seconds, and so is the duration of any event."""
    columns = SCHEMA.objects.columns
    assert (columns.onset.unit, columns.duration.unit) == ("s", "s")
    assert SCHEMA.objects.metadata.StartTime.unit == "s"
    assert "unit" not in columns.onset__physioevents


@pytest.mark.parametrize("name", ["participant", "session"])
def test_prefixes_of_ids_are_those_of_the_schema(name: str) -> None:
    """Ids in the tables of a dataset begin with their entity."""
    assert SCHEMA.objects.columns[f"{name}_id"].pattern.startswith(f"^{PREFIXES[name]}")


@pytest.mark.parametrize("suffix", ["physio", "physioevents"])
def test_names_of_the_schema_can_be_taken_apart(suffix: str) -> None:
    """A name with all entities that the schema allows for behaviour is understood."""
    rule = SCHEMA.rules.files.raw.task.timeseries
    assert suffix in rule.suffixes
    entities = [SCHEMA.objects.entities[one].name for one in rule.entities]
    pairs = {name: f"{place}a" for place, name in enumerate(entities)}
    name = BidsName.of("".join(f"{k}-{v}_" for k, v in pairs.items()) + f"{suffix}.tsv.gz")
    assert name is not None
    assert (name.entities, name.suffix, name.extension) == (pairs, suffix, ".tsv.gz")
    assert ".tsv.gz" in rule.extensions
