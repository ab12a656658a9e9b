"""Rules about [logs.samples]: the message and the line of each."""

from collections.abc import Callable

import pytest

from etl.study import Study

#: Line 12 is the table of samples.
SAMPLES = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial_no"
onset = "time"
x = "gx"
y = "gy"


[logs.samples]
method = "engbert_kliegl"

[regions]
file = "boxes.csv"
kind = "boxes"
"""
DISPERSION = SAMPLES.replace('"engbert_kliegl"', '"dispersion"')


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        pytest.param(
            SAMPLES.replace('y = "gy"\n', "") + 'vertical = "any"\n',
            "study.toml:4: logs.columns: fixations are found in samples that have a time and a "
            'position; expected y\n    fix: add y = "…" with the header of the column',
            id="no y",
        ),
        pytest.param(
            SAMPLES.replace('y = "gy"\n', 'y = "gy"\nduration = "dur"'),
            "study.toml:10: logs.columns.duration: a sample has none: fixations are found in the "
            'samples; found "dur"\n'
            "    fix: remove the key, or remove [logs.samples] if the rows are fixations",
            id="a duration",
        ),
        pytest.param(
            DISPERSION,
            "study.toml:12: logs.samples: one extent is needed of what still is a fixation; "
            "expected dispersion_px or dispersion_deg\n    fix: give one of the two",
            id="no extent",
        ),
        pytest.param(
            DISPERSION.replace('sion"', 'sion"\ndispersion_px = 40\nthreshold_factor = 6'),
            "study.toml:15: logs.samples.threshold_factor: this means nothing with method = "
            '"dispersion"; expected method = "engbert_kliegl"\n'
            "    fix: correct the method, or remove the key",
            id="a factor for dispersion",
        ),
        pytest.param(
            SAMPLES.replace('gl"', 'gl"\ndispersion_px = 40'),
            "study.toml:14: logs.samples.dispersion_px: this means nothing with method = "
            '"engbert_kliegl"; expected method = "dispersion"\n'
            "    fix: correct the method, or remove the key",
            id="an extent for velocity",
        ),
        pytest.param(
            DISPERSION.replace('sion"', 'sion"\ndispersion_px = 40\nshortest_fixation_ms = 0'),
            "study.toml:15: logs.samples.shortest_fixation_ms: without a shortest duration every "
            'single sample is a fixation; found "0", expected a duration above 0\n'
            "    fix: give for example shortest_fixation_ms = 100, the paper's own",
            id="no duration for dispersion",
        ),
        pytest.param(
            DISPERSION.replace('sion"', 'sion"\ndispersion_deg = 1'),
            "study.toml:14: logs.samples.dispersion_deg: degrees need the size and the distance of "
            "the screen; expected width_cm and distance_cm in [screen]\n"
            "    fix: add them, or give dispersion_px",
            id="degrees without a screen",
        ),
    ],
)
def test_samples_can_be_searched(refusal: Callable[..., str], text: str, expected: str) -> None:
    """What a method needs must be there, and nothing that it does not read."""
    assert refusal(text).rsplit("\n", 1)[0] == expected


def test_log_of_events_has_no_samples(refusal: Callable[..., str]) -> None:
    """A log of events tells of fixations that were found already."""
    text = SAMPLES.replace("[logs]\n", '[logs]\nkind = "events"\n')
    assert (
        'study.toml:13: logs.samples: a log of kind = "events" tells of fixations, not of samples; '
        'expected kind = "table" or "bids"\n'
        "    fix: remove [logs.samples], or correct the kind"
    ) in refusal(text)


def test_defaults_are_those_of_the_paper(load: Callable[..., Study]) -> None:
    """The factor is 6 and the shortest saccade 12 ms (Engbert & Kliegl 2003), all of it told."""
    assert load(SAMPLES).understood()["logs"]["samples"] == {
        "method": "engbert_kliegl",
        "threshold_factor": 6.0,
        "shortest_saccade_ms": 12.0,
        "dispersion_px": None,
        "dispersion_deg": None,
        "shortest_fixation_ms": 50.0,
        "longest_gap_ms": 0.0,
        "frequency_hz": None,
    }
