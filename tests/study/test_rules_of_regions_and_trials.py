"""Rules about several keys: the message and the line of each."""

from collections.abc import Callable

import pytest

from etl.study import Study
from tests.study.written import changed, changed_at


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {'"boxes"\n': '"words"\n'},
            'study.toml:12: regions: regions.kind = "words" needs to know where the '
            "text stood; expected [regions.layout]\n"
            "    fix: add [regions.layout] with left_px, top_px, character_width_px and "
            "line_height_px",
            id="words without a layout",
        ),
        pytest.param(
            {
                'kind = "boxes"\n': 'kind = "boxes"\n[regions.layout]\nleft_px = 1\n'
                "top_px = 1\ncharacter_width_px = 14\nline_height_px = 60\n"
            },
            "study.toml:15: regions.layout: a layout does nothing with regions.kind ="
            ' "boxes"; expected kind = "marked_text" or kind = "words"\n'
            "    fix: remove [regions.layout], or correct kind",
            id="layout for boxes",
        ),
        pytest.param(
            {
                'y = "gy"': 'y = "gy"\nlabel = "area"',
                'kind = "boxes"\n': 'kind = "labels"\n[lines]\n',
            },
            'study.toml:16: lines: regions.kind = "labels" has no lines; expected '
            "a kind of regions that have positions\n"
            "    fix: remove [lines], or correct kind",
            id="lines of labels",
        ),
        pytest.param(
            {'kind = "boxes"\n': 'kind = "boxes"\nvertical = "any"\n[lines]\n'},
            'study.toml:16: lines: with regions.vertical = "any" no line can be told '
            'from another; expected vertical = "box"\n'
            '    fix: remove [lines] for texts of one line, or write vertical = "box"',
            id="lines at any height",
        ),
        pytest.param(
            {
                'kind = "boxes"\n': 'kind = "boxes"\n[lines]\nmethod = "slice"\n'
                "slice = { next_px = 60 }\nchain = { x_px = 100 }\n"
            },
            'study.toml:18: lines.chain: this means nothing with method = "slice"; expected '
            'method = "chain" or "consensus"\n'
            "    fix: correct the method, or remove the table",
            id="settings of another method",
        ),
        pytest.param(
            {
                'kind = "boxes"\n': 'kind = "words"\n[lines]\nmethod = "none"\n'
                "[regions.layout]\nleft_px = 1\ntop_px = 1\ncharacter_width_px = 14\n"
                "line_height_px = 60\n"
            },
            'study.toml:16: lines.method: regions.kind = "words" is laid out by lines, so each '
            'fixation needs one; found "none", expected another method; "none" is for boxes and '
            "polygons\n"
            '    fix: write method = "consensus", or "nearest"',
            id="text without lines",
        ),
        pytest.param(
            {
                'y = "gy"': 'y = "gy"\nlabel = "area"',
                'kind = "boxes"\n': 'kind = "labels"\ntolerance_px = 0\noverlap = "first"\n',
            },
            "study.toml:16: regions.tolerance_px: this does nothing with regions.kind"
            ' = "labels"; found "0.0", expected a kind of regions that have positions\n'
            "    fix: remove tolerance_px, or correct kind\n"
            "study.toml:17: regions.overlap: this does nothing with regions.kind = "
            '"labels"; found "first", expected a kind of regions that have positions\n'
            "    fix: remove overlap, or correct kind",
            id="geometry of labels",
        ),
    ],
)
def test_tables_fit_the_kind_of_regions(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """Layout, lines and geometry are refused where the kind of regions has no use for them."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {"[regions]": '[trials]\nkeys = ["trial"]\n[regions]'},
            "study.toml:13: trials.keys: there is no trial list to join; found "
            '"trial", expected table beside keys\n'
            '    fix: add table = "…" with the trial list, or remove keys',
            id="keys without a table",
        ),
        pytest.param(
            {"[regions]": '[trials]\nfactors = ["cue"]\nlevels = { cues = ["a", "b"] }\n[regions]'},
            'study.toml:14: trials.levels.cues: this is no factor; found "cues", '
            "expected a name from factors\n"
            '    fix: did you mean "cue"?',
            id="levels near a factor",
        ),
        pytest.param(
            {"[regions]": '[trials]\n[trials.levels]\nage = ["a", "b"]\n[regions]'},
            'study.toml:14: trials.levels.age: this is no factor; found "age", '
            "expected a name from factors\n"
            "    fix: add it to factors, or remove it",
            id="levels of no factor",
        ),
        pytest.param(
            {
                "[regions]": '[trials]\nfactors = ["cue", "age"]\ncovariates = [\n'
                '  "age"\n]\n[regions]'
            },
            "study.toml:15: trials.covariates, entry 1: this is a factor already; "
            'found "age", expected a name that is not in factors\n'
            "    fix: remove it from one of the two lists",
            id="factor and covariate",
        ),
        pytest.param(
            {"[regions]": '[trials]\nfactors = ["region"]\ncovariates = ["value"]\n[regions]'},
            "study.toml:13: trials.factors, entry 1: the tables have a column of this"
            ' name anyway; found "region", expected a name that no column of the '
            "tables has\n"
            "    fix: rename the column in its table, or remove it from the list\n"
            "study.toml:14: trials.covariates, entry 1: the tables have a column of "
            'this name anyway; found "value", expected a name that no column of the '
            "tables has\n"
            "    fix: rename the column in its table, or remove it from the list",
            id="fact called like a column",
        ),
    ],
)
def test_facts_of_trials_fit_together(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """Keys, levels, factors and covariates must not contradict one another."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("outcomes", "expected"),
    [
        pytest.param(
            '["count", "frist_pass_time"]',
            "study.toml:13: measures.outcomes, entry 2: there is no such outcome; found "
            '"frist_pass_time", expected a group (binary, count or duration) or the name of a '
            'measure\n    fix: did you mean "first_pass_time"?',
            id="near a measure",
        ),
        pytest.param(
            '["zzz"]',
            'study.toml:13: measures.outcomes, entry 1: there is no such outcome; found "zzz", '
            "expected a group (binary, count or duration) or the name of a measure\n"
            "    fix: take a name from the list that `trialwright measures` prints",
            id="like none",
        ),
    ],
)
def test_unknown_outcome_is_refused(
    refusal: Callable[..., str], outcomes: str, expected: str
) -> None:
    """An outcome is a group or the name of a measure, where the measures are known."""
    written = changed("[regions]", f"[measures]\noutcomes = {outcomes}\n[regions]")
    assert refusal(written, ["reread", "first_pass_time"]).rsplit("\n", 1)[0] == expected


def test_groups_and_measures_are_outcomes(load: Callable[..., Study]) -> None:
    """Groups and names of measures may be mixed."""
    written = changed("[regions]", '[measures]\noutcomes = ["count", "reread"]\n[regions]')
    assert load(written, ["reread"]).measures.outcomes == ("count", "reread")


def test_fact_called_like_a_measure_is_refused(refusal: Callable[..., str]) -> None:
    """A factor cannot have the name of a measure: the tables give that name to a column."""
    written = changed("[regions]", '[trials]\nfactors = ["reread"]\n[regions]')
    assert refusal(written, ["reread"]).startswith(
        "study.toml:13: trials.factors, entry 1: a measure has this name, and the tables give it a "
        'column; found "reread"'
    )


def test_fact_called_like_a_group_is_accepted(load: Callable[..., Study]) -> None:
    """A group of outcomes gives no column its name, so a factor may have it."""
    written = changed("[regions]", '[trials]\nfactors = ["count"]\n[regions]')
    assert load(written, ["count", "reread"]).trials.factors == ("count",)
