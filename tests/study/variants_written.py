"""Variants files on disk, beside a small study."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import StudyError
from etl.study import Study, StudyVariants, load_study, load_variants
from tests.study.written import SOUND

#: A study in which rules are on and factors are named.
STUDY = (
    SOUND
    + """\
[trials]
factors = ["cue", "fit", "group"]
levels = { cue = ["early", "late"], fit = ["fitting", "odd", "neither"] }

[lines]
method = "consensus"

[screening.fixations]
merge = { under_ms = 80, within_px = 14 }
under_ms = 80
over_ms = 800

[screening.trials]
no_first_pass_on = ["verb", "noun"]
"""
)

OF_REGIONS = ("first_pass_regression_out", "skipped", "refixated")
OF_TRIALS = ("any_regression", "refixated")
KNOWN = ("binary", *OF_REGIONS, "any_regression", "first_pass_duration")


def variants_of(written: str | bytes, study: Study) -> StudyVariants:
    """Write a variants file into the present folder and load it as variants.toml."""
    raw = written if isinstance(written, bytes) else written.encode("utf-8")
    Path("variants.toml").write_bytes(raw)
    return load_variants(
        "variants.toml",
        study,
        region_outcomes=OF_REGIONS,
        trial_outcomes=OF_TRIALS,
        known_outcomes=KNOWN,
    )


def said_of(written: str | bytes, study: Study) -> str:
    """The message by which a variants file is refused, without the count that closes it."""
    with pytest.raises(StudyError) as caught:
        variants_of(written, study)
    return str(caught.value).rsplit("\n", 1)[0]


def study_of(text: str = STUDY) -> Study:
    """Write a study file into the present folder and load it."""
    Path("study.toml").write_text(text, encoding="utf-8")
    return load_study("study.toml")
