"""Variants that are sound: which there are, in which order, and what each study holds."""

from __future__ import annotations

import pickle
import time
import tomllib
from pathlib import Path
from typing import Any

import pytest

from etl.study import Study, load_study
from etl.study.rules import broken_rules
from tests.study.variants_written import STUDY, study_of, variants_of
from tests.study.written import ALL_OFF, SOUND

ORCHARD = Path(__file__).parents[2] / "sample_logs" / "orchard" / "study.toml"

CROSSED = """\
title = "How others would have cleaned it"

[screening.fixations]
under_ms = [60, 80.0, 100]
merge = [false, { within_px = 14.0, under_ms = 80 }]

[measures]
outside = ["interrupt"]

[screening.trials]
duration_ms = [false, [500, 30000]]

[regions]
tolerance_px = [0, 20]
"""


@pytest.fixture(autouse=True)
def _in_a_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Work in an empty folder."""
    monkeypatch.chdir(tmp_path)


def settings(written: str, text: str = STUDY) -> dict[str, tuple[tuple[str, ...], int]]:
    """The alternatives of each setting, and which is the study's own."""
    crossing = variants_of(written, study_of(text)).crossing
    return {one.key: (one.alternatives, one.base) for one in crossing.settings}


def as_if_written(text: str, values: dict[str, Any]) -> Study:
    """The study as it would be read with these keys in its own file."""
    data = tomllib.loads(text)
    for key, value in values.items():
        *tables, name = key.split(".")
        inner = data
        for table in tables:
            inner = inner.setdefault(table, {})
        inner[name] = value
    return Study.model_validate(data)


def test_settings_are_in_the_order_of_the_study_file() -> None:
    """The file's own order does not count; the study's own value is in front where it lacks."""
    assert settings(CROSSED) == {
        "regions.tolerance_px": (("0", "20"), 0),
        "screening.fixations.merge": (("false", "{ under_ms = 80, within_px = 14 }"), 1),
        "screening.fixations.under_ms": (("60", "80", "100"), 1),
        "screening.trials.duration_ms": (("false", "[500, 30000]"), 0),
        "measures.outside": (('"ignore"', '"interrupt"'), 0),
    }


def test_first_setting_changes_slowest_and_own_values_come_first() -> None:
    """Variant 0 is the study; the order is that of an odometer that starts there."""
    study = study_of()
    read = variants_of(
        "[screening.fixations]\nunder_ms = [60, 80, 100]\nover_ms = [700, 800]\n", study
    )
    assert read.crossing.choices.tolist() == [[1, 1], [1, 0], [0, 1], [0, 0], [2, 1], [2, 0]]
    assert read.crossing.base == 0
    assert read.crossing.full
    assert read.crossing.names == ("",) * 6
    assert read.studies[0] is study


def test_every_variant_is_the_study_that_its_values_would_make() -> None:
    """A variant equals the study read from a file with its values, also in which keys it names."""
    study = study_of()
    read = variants_of(CROSSED, study)
    values = {
        "regions.tolerance_px": (0, 20),
        "screening.fixations.merge": (False, {"under_ms": 80, "within_px": 14}),
        "screening.fixations.under_ms": (60, 80, 100),
        "screening.trials.duration_ms": (False, [500, 30000]),
        "measures.outside": ("ignore", "interrupt"),
    }
    assert len(read.studies) == len(read.crossing) == 48
    for made, chosen in zip(read.studies, read.crossing.choices.tolist(), strict=True):
        own = {
            setting.key: values[setting.key][place]
            for setting, place in zip(read.crossing.settings, chosen, strict=True)
            if place != setting.base
        }
        written = as_if_written(STUDY, own)
        assert made.model_dump() == written.model_dump()
        assert made.model_dump(exclude_unset=True) == written.model_dump(exclude_unset=True)
        assert list(broken_rules(made, ())) == []


def test_a_variant_knows_where_the_study_was_read_from() -> None:
    """Lines, folder and digest are those of the study file, in a worker process too."""
    study = study_of()
    made = pickle.loads(pickle.dumps(variants_of(CROSSED, study).studies[-1]))  # noqa: S301
    assert made.line_of("regions", "file") == study.line_of("regions", "file") == 13
    assert (made.folder, made.shown, made.sha256) == (study.folder, "study.toml", study.sha256)
    assert made.regions.tolerance_px == 20
    assert made.screening is not None
    assert made.screening.trials is not None
    assert made.screening.trials.no_first_pass_on == ("verb", "noun")
    assert study.regions.tolerance_px == 0


@pytest.mark.parametrize(
    ("written", "expected", "base"),
    [
        ("[screening.trials]\nfewest_fixations = [3]", ("false", "3"), 0),
        ("[screening.trials]\nanswer_wrong = [true, false]", ("true", "false"), 1),
        ("[measures]\nno_opportunity = ['zero']", ('"missing"', '"zero"'), 0),
        ("[lines]\nmethod = ['warp']", ('"consensus"', '"warp"'), 0),
        ("[lines.chain]\nx_px = [150, 192.0]", ("150", "192"), 1),
        ("[lines.stretch]\nscale = [[0.8, 1.2], [0.90, 1.10]]", ("[0.8, 1.2]", "[0.9, 1.1]"), 1),
        ("[screening.values]\noutlier_sd = [2.5]", ("false", "2.5"), 0),
        ("[screening.trials]\noutside_share_over = [0, false]", ("0", "false"), 1),
        ("[screening.trials]\nnotes = ['more notes.csv']", ("false", '"more notes.csv"'), 0),
    ],
)
@pytest.mark.parametrize("text", [SOUND, ALL_OFF], ids=["absent", "switched off"])
def test_absent_keys_have_their_default(
    text: str, written: str, expected: tuple[str, ...], base: int
) -> None:
    """A rule that is absent or false is false, and a key with a default is its default."""
    text += '[trials]\nanswer_correct = "ok"\n'
    assert list(settings(written, text).values()) == [(expected, base)]


@pytest.mark.parametrize(
    ("written", "base"),
    [
        ("[screening.fixations]\nunder_ms = [60, 80.0]", 1),
        ("[screening.fixations]\nunder_ms = [60, 8e1]", 1),
        ("[screening.fixations]\nmerge = [false, { within_px = 14, under_ms = 80 }]", 1),
        ("[screening.trials]\nno_first_pass_on = [false, ['noun', 'verb']]", 1),
        ("[regions]\ntolerance_px = [20, 0]", 1),
        ("[regions]\ntolerance_px = [20, -0.0]", 1),
    ],
)
def test_own_value_is_known_by_its_meaning(written: str, base: int) -> None:
    """However the study's own value is written, it is not added a second time."""
    ((alternatives, found),) = settings(written).values()
    assert (len(alternatives), found) == (2, base)


def test_keys_of_merge_may_vary_by_themselves() -> None:
    """A table of merge with lists varies its keys, and keeps the others as the study has them."""
    study = study_of()
    read = variants_of("[screening.fixations.merge]\nunder_ms = [60]\nwithin_px = [14, 7]", study)
    assert [(one.key, one.alternatives) for one in read.crossing.settings] == [
        ("screening.fixations.merge.under_ms", ("80", "60")),
        ("screening.fixations.merge.within_px", ("14", "7")),
    ]
    merges = [one.screening.fixations.merge for one in read.studies]  # type: ignore[union-attr]
    assert [(one.under_ms, one.within_px) for one in merges if one is not None] == [
        (80, 14),
        (80, 7),
        (60, 14),
        (60, 7),
    ]


def test_named_variants_follow_the_study() -> None:
    """Variant 0 is the study; the others come as written, with the keys that any of them sets."""
    study = study_of()
    read = variants_of(
        """\
[[variants]]
name = "as the other lab does"
[variants.screening.fixations]
under_ms = 100
merge = false
over_ms = 800
[[variants]]
name = "wide"
regions.tolerance_px = 20
screening.fixations.under_ms = 60
[[variants]]
name = "off"
screening.fixations.under_ms = false
""",
        study,
    )
    crossing = read.crossing
    assert crossing.names == ("the study", "as the other lab does", "wide", "off")
    assert [(one.key, one.alternatives, one.base) for one in crossing.settings] == [
        ("regions.tolerance_px", ("0", "20"), 0),
        ("screening.fixations.merge", ("{ under_ms = 80, within_px = 14 }", "false"), 0),
        ("screening.fixations.under_ms", ("80", "100", "60", "false"), 0),
    ]
    assert crossing.choices.tolist() == [[0, 0, 0], [0, 1, 1], [1, 0, 2], [0, 0, 3]]
    assert read.studies[0] is study
    assert [one.regions.tolerance_px for one in read.studies] == [0, 0, 20, 0]
    assert [one.screening.fixations.under_ms for one in read.studies] == [  # type: ignore[union-attr]
        *(80, 100, 60, None)
    ]
    assert not crossing.full


def test_named_variant_may_hold_what_no_crossing_could() -> None:
    """Values that only go together are sound where one variant has both."""
    study = study_of()
    read = variants_of(
        '[[variants]]\nname = "long ones"\n[variants.screening.fixations]\n'
        "under_ms = 900\nover_ms = 2000\n",
        study,
    )
    assert len(read.studies) == 2


def test_comparisons_are_read() -> None:
    """Names come as written, with the line; a level may be left out where there are two."""
    read = variants_of(
        CROSSED
        + """
[[comparisons]]
outcome = "first_pass_regression_out"
region = "verb"
factor = "cue"

[[comparisons]]
outcome = "any_regression"
factor = "fit"
level = "neither"

[[comparisons]]
outcome = "refixated"
factor = "group"
level = 2

[[comparisons]]
outcome = "refixated"
region = "noun"
factor = "group"
""",
        study_of(),
    )
    assert [
        (one.outcome, one.region, one.factor, one.level, one.line) for one in read.comparisons
    ] == [
        ("first_pass_regression_out", "verb", "cue", "", 16),
        ("any_regression", "", "fit", "neither", 21),
        ("refixated", "", "group", "2", 26),
        ("refixated", "noun", "group", "", 31),
    ]


def test_study_without_factors_is_compared_by_rates() -> None:
    """There, an outcome is enough."""
    read = variants_of(
        CROSSED + '[[comparisons]]\noutcome = "skipped"\nregion = "verb"\n',
        study_of(STUDY[: STUDY.index("[trials]")] + STUDY[STUDY.index("[lines]") :]),
    )
    (one,) = read.comparisons
    assert (one.outcome, one.region, one.factor, one.level) == ("skipped", "verb", "", "")


@pytest.mark.parametrize(
    "raw",
    [
        pytest.param(CROSSED.encode("utf-8"), id="plain"),
        pytest.param(b"\xef\xbb\xbf" + CROSSED.encode("utf-8"), id="byte-order mark"),
        pytest.param(CROSSED.replace("\n", "\r\n").encode("utf-8"), id="line breaks of two"),
    ],
)
def test_file_is_read_however_it_was_saved(raw: bytes) -> None:
    """Marks and line breaks change nothing, neither values nor lines."""
    read = variants_of(raw, study_of())
    assert (len(read.crossing), read.title) == (48, "How others would have cleaned it")
    assert read.line_of("screening", "trials", "duration_ms") == 11
    assert read.line_of("screening", "fixations", "under_ms", 2) == 4
    assert read.line_of("lines", "method") is None
    assert (read.shown, read.path) == ("variants.toml", Path("variants.toml").absolute())
    assert len(read.sha256) == 64


def test_study_made_in_memory_can_vary() -> None:
    """No file is needed, and what rules say against such a study is not said of its variants."""
    study = Study.model_validate(
        {
            "logs": {"files": ["*.tsv"], "columns": {"onset": "t_start"}},
            "regions": {"file": "boxes.csv", "kind": "boxes"},
        }
    )
    assert list(broken_rules(study, ()))
    read = variants_of("[screening.fixations]\nfirst = [1, 2]\nlast = [1]\n", study)
    assert len(read.studies) == 6
    assert read.studies[5].shown == "study.toml"


def test_sample_study_can_vary() -> None:
    """The sample study takes every kind of key, and quickly: a thousand variants in a second."""
    study = load_study(ORCHARD)
    begun = time.perf_counter()
    read = variants_of(
        """\
[screening.fixations]
outside_text_time = [true, false]
under_ms = [false, 50, 60, 80]
merge = [false, { under_ms = 80, within_characters = 1 }]
over_ms = [false, 800, 1000, 1200]
[screening.trials]
outside_share_over = [false, 0.30]
[screening.participants]
correct_share_under = [0.75, 0.8]
[regions]
tolerance_px = [0, 14]
[measures]
outside = ["ignore", "interrupt"]
""",
        study,
    )
    took = time.perf_counter() - begun
    assert len(read.studies) == 1024
    assert took < 5  # a tenth of a second as measured; a busy machine may take longer
    assert read.studies[0].understood() == study.understood()
    assert read.studies[1].understood() != study.understood()
