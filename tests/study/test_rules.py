"""Rules about several keys: the message and the line of each, and what they let pass."""

from collections.abc import Callable

import pytest

from etl.study import Study
from tests.study.written import SOUND, changed

SCREEN = "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
DEGREES = {
    '"gx"': '{ column = "gx", unit = "deg" }',
    '"gy"': '{ column = "gy", unit = "deg" }',
}
LAYOUT = "[regions.layout]\nleft_px = 1\ntop_px = 1\ncharacter_width_px = 14\nline_height_px = 60\n"


def changed_at(changes: dict[str, str]) -> str:
    """The sound study with several places changed."""
    text = SOUND
    for old, new in changes.items():
        text = changed(old, new, text)
    return text


@pytest.mark.parametrize(
    "changes",
    [
        pytest.param({}, id="nothing but what is needed"),
        pytest.param(
            {
                'participant = "reader"\n': "",
                'trial = "trial_no"\n': "",
                '["logs/*.tsv"]': '["logs/*.tsv"]\n'
                "participant_from_name = '(?P<participant>P[0-9]+)_(?P<trial>[0-9]+)'",
            },
            id="reader and trial from the name",
        ),
        pytest.param({'onset = "t_start"': 'fixation = "n"'}, id="order by number"),
        pytest.param({'duration = "dur"': 'end = "t_end"'}, id="end in place of duration"),
        pytest.param(
            {'y = "gy"\n': "", '"boxes"\n': '"boxes"\nvertical = "any"\n'}, id="x alone decides"
        ),
        pytest.param(
            {'x = "gx"\ny = "gy"': 'label = "area"', '"boxes"\n': '"labels"\n'}, id="labels alone"
        ),
        pytest.param(
            {'y = "gy"': 'y = "gy"\nlabel = "area"', '"boxes"\n': '"labels"\n'},
            id="labels and positions",
        ),
        pytest.param(
            {**DEGREES, "[regions]": f"{SCREEN}width_cm = 53\ndistance_cm = 65\n[regions]"},
            id="degrees",
        ),
        pytest.param(
            {"[regions]": f'{SCREEN}origin = "bottom-left"\ny_axis = "up"\n[regions]'},
            id="up from the bottom",
        ),
        pytest.param(
            {"[regions]": f'{SCREEN}origin = "centre"\ny_axis = "up"\n[regions]'},
            id="up from the centre",
        ),
        pytest.param({'"boxes"\n': '"words"\n' + LAYOUT}, id="words with a layout"),
        pytest.param({'kind = "boxes"\n': 'kind = "boxes"\n[lines]\n'}, id="lines of boxes"),
    ],
)
def test_sound_combination_is_accepted(load: Callable[..., Study], changes: dict[str, str]) -> None:
    """What does not contradict itself passes."""
    assert load(changed_at(changes)).regions.file == "boxes.csv"


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {'participant = "reader"\n': ""},
            (
                "study.toml:4: logs.columns: nothing says who read; expected participant\n"
                '    fix: add participant = "…" with the header of the column, or participant_from_name to [logs] where the file\'s name says it'
            ),
            id="no reader",
        ),
        pytest.param(
            {'trial = "trial_no"\n': ""},
            (
                "study.toml:4: logs.columns: nothing says which trial a fixation belongs to; expected trial\n"
                '    fix: add trial = "…" with the header of the column'
            ),
            id="no trial",
        ),
        pytest.param(
            {'onset = "t_start"\n': ""},
            (
                "study.toml:4: logs.columns: nothing says in which order the fixations were made; expected onset or fixation\n"
                '    fix: add onset = "…" (a time) or fixation = "…" (a number in the trial) with the header of the column'
            ),
            id="no order",
        ),
        pytest.param(
            {'duration = "dur"\n': ""},
            (
                "study.toml:4: logs.columns: nothing says how long a fixation lasted; expected duration or end\n"
                '    fix: add duration = "…" or end = "…" with the header of the column'
            ),
            id="no duration",
        ),
        pytest.param(
            {'duration = "dur"\n': 'duration = "dur"\nend = "t_end"\n'},
            (
                'study.toml:9: logs.columns.end: duration and end both say how long a fixation lasted; found "t_end", expected one of the two\n'
                "    fix: remove the one that is less exact in your logs"
            ),
            id="duration and end",
        ),
        pytest.param(
            {'duration = "dur"\n': 'end = "t_end"\n', 'onset = "t_start"': 'fixation = "n"'},
            (
                'study.toml:8: logs.columns.end: an end alone gives no duration; found "t_end", expected onset beside it\n'
                '    fix: add onset = "…" with the header of the column, or give duration in place of end'
            ),
            id="end without onset",
        ),
        pytest.param(
            {'"gy"': '"gx"'},
            (
                'study.toml:10: logs.columns.y: the column already stands for x; found "gx", expected another column\n'
                "    fix: correct one of the two headers"
            ),
            id="one column for two numbers",
        ),
        pytest.param(
            {'["logs/*.tsv"]': '["logs/*.tsv"]\ndelimiter = ","\ndecimal = ","'},
            (
                'study.toml:4: logs.decimal: the decimal sign is also the delimiter; found ",", expected two different characters\n'
                "    fix: correct one of the two, or remove both to have them found out"
            ),
            id="delimiter is the decimal sign",
        ),
    ],
)
def test_logs_say_who_read_what_and_when(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """The log must say reader, trial, order and duration, each once."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {'"boxes"\n': '"labels"\n'},
            (
                'study.toml:4: logs.columns: regions.kind = "labels" needs the label that the log gives each fixation; expected label\n'
                '    fix: add label = "…" with the header of the column, or define regions by coordinates'
            ),
            id="labels without a label",
        ),
        pytest.param(
            {'"boxes"\n': '"labels"\n', 'y = "gy"': 'label = "area"'},
            (
                "study.toml:4: logs.columns: x and y are given together or not at all; expected y\n"
                '    fix: add y = "…" with the header of the column'
            ),
            id="labels with half a position",
        ),
        pytest.param(
            {'x = "gx"\ny = "gy"\n': ""},
            (
                'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of each fixation; expected x and y\n'
                '    fix: add x = "…" and y = "…" with the header of the column'
            ),
            id="boxes without positions",
        ),
        pytest.param(
            {'x = "gx"\ny = "gy"\n': 'label = "area"\n'},
            (
                'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of each fixation; expected x and y\n'
                '    fix: add x = "…" and y = "…" with the header of the column, or write kind = "labels" in [regions] if regions are to come from the label'
            ),
            id="boxes with labels only",
        ),
        pytest.param(
            {'y = "gy"\n': ""},
            (
                'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of each fixation; expected y\n'
                '    fix: add y = "…" with the header of the column'
            ),
            id="boxes without y",
        ),
        pytest.param(
            {'x = "gx"\n': "", '"boxes"\n': '"boxes"\nvertical = "any"\n'},
            (
                'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of each fixation; expected x\n'
                '    fix: add x = "…" with the header of the column'
            ),
            id="any height without x",
        ),
    ],
)
def test_each_fixation_has_a_place(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """The kind of regions decides whether a fixation needs a label or a position."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {
                '"gx"': '{ column = "gx", unit = "deg" }',
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\nwidth_cm = 53\ndistance_cm = 65\n[regions]",
            },
            (
                'study.toml:10: logs.columns.y.unit: x is in "deg" and y is not; found "px", expected "deg"\n'
                "    fix: give both the same unit"
            ),
            id="two units",
        ),
        pytest.param(
            {'"gx"': '{ column = "gx", unit = "deg" }', '"gy"': '{ column = "gy", unit = "deg" }'},
            (
                'study.toml:9: logs.columns.x: positions in degrees need the size and the distance of the screen; found "deg", expected [screen]\n'
                "    fix: add [screen] with width_px, height_px, width_cm and distance_cm"
            ),
            id="degrees without a screen",
        ),
        pytest.param(
            {
                '"gx"': '{ column = "gx", unit = "deg" }',
                '"gy"': '{ column = "gy", unit = "deg" }',
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\n[regions]",
            },
            (
                "study.toml:12: screen.width_cm: this key is missing, and positions in degrees need it; expected a number of centimetres\n"
                "    fix: add width_cm = … to [screen]\n"
                "study.toml:12: screen.distance_cm: this key is missing, and positions in degrees need it; expected a number of centimetres\n"
                "    fix: add distance_cm = … to [screen]"
            ),
            id="degrees without sizes",
        ),
        pytest.param(
            {
                '"gx"': '{ column = "gx", unit = "deg" }',
                '"gy"': '{ column = "gy", unit = "deg" }',
                "[regions]": '[screen]\nwidth_px = 1920\nheight_px = 1080\nwidth_cm = 53\ndistance_cm = 65\norigin = "top-left"\n[regions]',
            },
            (
                'study.toml:17: screen.origin: positions in degrees are counted from the middle of the screen; found "top-left", expected "centre"\n'
                '    fix: write origin = "centre", or remove the key'
            ),
            id="degrees from a corner",
        ),
    ],
)
def test_degrees_need_a_screen(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """Positions in degrees need one unit, a screen with its sizes, and its middle as origin."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {"[regions]": '[screen]\nwidth_px = 1920\nheight_px = 1080\ny_axis = "up"\n[regions]'},
            (
                'study.toml:15: screen.y_axis: with origin = "top-left" and y_axis = "up" no point of the screen has a y above 0; found "up", expected y_axis = "down" with this origin\n'
                '    fix: write y_axis = "down", or origin = "bottom-left"'
            ),
            id="up from the top",
        ),
        pytest.param(
            {
                "[regions]": '[screen]\nwidth_px = 1920\nheight_px = 1080\norigin = "bottom-left"\n[regions]'
            },
            (
                'study.toml:15: screen.origin: with origin = "bottom-left" and y_axis = "down" no point of the screen has a y above 0; found "bottom-left", expected y_axis = "up" with this origin\n'
                '    fix: write y_axis = "up", or origin = "top-left"'
            ),
            id="down from the bottom",
        ),
        pytest.param(
            {
                "[regions]": '[screen]\nwidth_px = 1920\nheight_px = 1080\ny_axis = "down"\norigin = "bottom-left"\n[regions]'
            },
            (
                'study.toml:15: screen.y_axis: with origin = "bottom-left" and y_axis = "down" no point of the screen has a y above 0; found "down", expected y_axis = "up" with this origin\n'
                '    fix: write y_axis = "up", or origin = "top-left"'
            ),
            id="down from the bottom by name",
        ),
    ],
)
def test_y_axis_fits_the_origin(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """An axis by which the whole screen has no y above 0 is refused."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {'"boxes"\n': '"words"\n'},
            (
                'study.toml:12: regions: regions.kind = "words" needs to know where the text stood; expected [regions.layout]\n'
                "    fix: add [regions.layout] with left_px, top_px, character_width_px and line_height_px"
            ),
            id="words without a layout",
        ),
        pytest.param(
            {
                'kind = "boxes"\n': 'kind = "boxes"\n[regions.layout]\nleft_px = 1\ntop_px = 1\ncharacter_width_px = 14\nline_height_px = 60\n'
            },
            (
                'study.toml:15: regions.layout: a layout does nothing with regions.kind = "boxes"; expected kind = "marked_text" or kind = "words"\n'
                "    fix: remove [regions.layout], or correct kind"
            ),
            id="layout for boxes",
        ),
        pytest.param(
            {'kind = "boxes"\n': 'kind = "wkt"\n[lines]\n'},
            (
                'study.toml:15: lines: regions.kind = "wkt" has no lines; expected kind = "marked_text", "words" or "boxes"\n'
                "    fix: remove [lines], or correct kind"
            ),
            id="lines of polygons",
        ),
        pytest.param(
            {
                'y = "gy"': 'y = "gy"\nlabel = "area"',
                'kind = "boxes"\n': 'kind = "labels"\n[lines]\n',
            },
            (
                'study.toml:16: lines: regions.kind = "labels" has no lines; expected kind = "marked_text", "words" or "boxes"\n'
                "    fix: remove [lines], or correct kind"
            ),
            id="lines of labels",
        ),
        pytest.param(
            {'kind = "boxes"\n': 'kind = "boxes"\nvertical = "any"\n[lines]\n'},
            (
                'study.toml:16: lines: with regions.vertical = "any" no line can be told from another; expected vertical = "box"\n'
                '    fix: remove [lines] for texts of one line, or write vertical = "box"'
            ),
            id="lines at any height",
        ),
        pytest.param(
            {
                'y = "gy"': 'y = "gy"\nlabel = "area"',
                'kind = "boxes"\n': 'kind = "labels"\ntolerance_px = 0\noverlap = "first"\n',
            },
            (
                'study.toml:16: regions.tolerance_px: this does nothing with regions.kind = "labels"; found "0.0", expected a kind of regions that have positions\n'
                "    fix: remove tolerance_px, or correct kind\n"
                'study.toml:17: regions.overlap: this does nothing with regions.kind = "labels"; found "first", expected a kind of regions that have positions\n'
                "    fix: remove overlap, or correct kind"
            ),
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
            (
                'study.toml:13: trials.keys: there is no trial list to join; found "trial", expected table beside keys\n'
                '    fix: add table = "…" with the trial list, or remove keys'
            ),
            id="keys without a table",
        ),
        pytest.param(
            {"[regions]": '[trials]\nfactors = ["cue"]\nlevels = { cues = ["a", "b"] }\n[regions]'},
            (
                'study.toml:14: trials.levels.cues: this is no factor; found "cues", expected a name from factors\n'
                '    fix: did you mean "cue"?'
            ),
            id="levels near a factor",
        ),
        pytest.param(
            {"[regions]": '[trials]\n[trials.levels]\nage = ["a", "b"]\n[regions]'},
            (
                'study.toml:14: trials.levels.age: this is no factor; found "age", expected a name from factors\n'
                "    fix: add it to factors, or remove it"
            ),
            id="levels of no factor",
        ),
        pytest.param(
            {
                "[regions]": '[trials]\nfactors = ["cue", "age"]\ncovariates = [\n  "age"\n]\n[regions]'
            },
            (
                'study.toml:15: trials.covariates, entry 1: this is a factor already; found "age", expected a name that is not in factors\n'
                "    fix: remove it from one of the two lists"
            ),
            id="factor and covariate",
        ),
        pytest.param(
            {"[regions]": '[trials]\nfactors = ["region"]\ncovariates = ["value"]\n[regions]'},
            (
                'study.toml:13: trials.factors, entry 1: the tables have a column of this name anyway; found "region", expected a name that no column of the tables has\n'
                "    fix: rename the column in its table, or remove it from the list\n"
                'study.toml:14: trials.covariates, entry 1: the tables have a column of this name anyway; found "value", expected a name that no column of the tables has\n'
                "    fix: rename the column in its table, or remove it from the list"
            ),
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


def test_rule_is_silent_where_its_key_is_wrong_in_itself(refusal: Callable[..., str]) -> None:
    """A key whose own mistake is reported is not also reported as absent."""
    assert refusal(changed('participant = "reader"', "participant = 7")).count("\n") == 2


def test_rule_is_silent_where_a_key_has_a_slip_in_its_name(refusal: Callable[..., str]) -> None:
    """A key that is there under a slightly wrong name is not also reported as absent."""
    assert refusal(changed("duration =", "duratoin =")) == (
        'study.toml:8: logs.columns.duratoin: unknown key\n    fix: did you mean "duration"?\n'
        "1 problem; nothing was written"
    )


def test_rule_about_one_unit_is_silent_where_it_is_unknown(refusal: Callable[..., str]) -> None:
    """With the unit of x unknown nothing is said of degrees, and all else is still checked."""
    message = refusal(
        changed_at({'"gx"': '{ column = "gx", unit = "mm" }', 'duration = "dur"\n': ""})
    )
    assert [line.split(": ")[1] for line in message.splitlines()[:-1:2]] == [
        "logs.columns",
        "logs.columns.x.unit",
    ]
