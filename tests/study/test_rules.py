"""Rules about several keys: the message and the line of each."""

from collections.abc import Callable

import pytest

from tests.study.written import changed_at


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        pytest.param(
            {'participant = "reader"\n': ""},
            "study.toml:4: logs.columns: nothing says who read; expected participant\n"
            '    fix: add participant = "…" with the header of the column, or '
            "participant_from_name to [logs] where the file's name says it",
            id="no reader",
        ),
        pytest.param(
            {'trial = "trial_no"\n': ""},
            "study.toml:4: logs.columns: nothing says which trial a fixation belongs "
            "to; expected trial\n"
            '    fix: add trial = "…" with the header of the column',
            id="no trial",
        ),
        pytest.param(
            {'onset = "t_start"\n': ""},
            "study.toml:4: logs.columns: nothing says in which order the fixations "
            "were made; expected onset or fixation\n"
            '    fix: add onset = "…" (a time) or fixation = "…" (a number in the trial) '
            "with the header of the column",
            id="no order",
        ),
        pytest.param(
            {'duration = "dur"\n': ""},
            "study.toml:4: logs.columns: nothing says how long a fixation lasted; "
            "expected duration or end\n"
            '    fix: add duration = "…" or end = "…" with the header of the column',
            id="no duration",
        ),
        pytest.param(
            {'duration = "dur"\n': 'duration = "dur"\nend = "t_end"\n'},
            "study.toml:9: logs.columns.end: duration and end both say how long a "
            'fixation lasted; found "t_end", expected two of onset, duration and end\n'
            "    fix: remove the one that is less exact in your logs",
            id="duration and end",
        ),
        pytest.param(
            {'duration = "dur"\n': 'end = "t_end"\n', 'onset = "t_start"': 'fixation = "n"'},
            "study.toml:8: logs.columns.end: an end alone gives no duration; found "
            '"t_end", expected onset or duration beside it\n'
            '    fix: add onset = "…" with the header of the column, or duration = "…"',
            id="end without onset",
        ),
        pytest.param(
            {'"gy"': '"gx"'},
            "study.toml:10: logs.columns.y: the column already stands for x; found "
            '"gx", expected another column\n'
            "    fix: correct one of the two headers",
            id="one column for two numbers",
        ),
        pytest.param(
            {'["logs/*.tsv"]': '["logs/*.tsv"]\ndelimiter = ","\ndecimal = ","'},
            "study.toml:4: logs.decimal: the decimal sign is also the delimiter; "
            'found ",", expected two different characters\n'
            "    fix: correct one of the two, or remove both to have them found out",
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
            'study.toml:4: logs.columns: regions.kind = "labels" needs the label that'
            " the log gives each fixation; expected label\n"
            '    fix: add label = "…" with the header of the column, or define regions by'
            " coordinates",
            id="labels without a label",
        ),
        pytest.param(
            {'"boxes"\n': '"labels"\n', 'y = "gy"': 'label = "area"'},
            "study.toml:4: logs.columns: x and y are given together or not at all; "
            "expected y\n"
            '    fix: add y = "…" with the header of the column',
            id="labels with half a position",
        ),
        pytest.param(
            {'x = "gx"\ny = "gy"\n': ""},
            'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of'
            " each fixation; expected x and y\n"
            '    fix: add x = "…" and y = "…" with the header of the column',
            id="boxes without positions",
        ),
        pytest.param(
            {'x = "gx"\ny = "gy"\n': 'label = "area"\n'},
            'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of'
            " each fixation; expected x and y\n"
            '    fix: add x = "…" and y = "…" with the header of the column, or write '
            'kind = "labels" in [regions] if regions are to come from the label',
            id="boxes with labels only",
        ),
        pytest.param(
            {'y = "gy"\n': ""},
            'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of'
            " each fixation; expected y\n"
            '    fix: add y = "…" with the header of the column',
            id="boxes without y",
        ),
        pytest.param(
            {'x = "gx"\n': "", '"boxes"\n': '"boxes"\nvertical = "any"\n'},
            'study.toml:4: logs.columns: regions.kind = "boxes" needs the position of'
            " each fixation; expected x\n"
            '    fix: add x = "…" with the header of the column',
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
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
                "width_cm = 53\ndistance_cm = 65\n[regions]",
            },
            'study.toml:10: logs.columns.y.unit: x is in "deg" and y is not; found '
            '"px", expected "deg"\n'
            "    fix: give both the same unit",
            id="two units",
        ),
        pytest.param(
            {'"gx"': '{ column = "gx", unit = "deg" }', '"gy"': '{ column = "gy", unit = "deg" }'},
            "study.toml:9: logs.columns.x: positions in degrees need the size and the"
            ' distance of the screen; found "deg", expected [screen]\n'
            "    fix: add [screen] with width_px, height_px, width_cm and distance_cm",
            id="degrees without a screen",
        ),
        pytest.param(
            {
                '"gx"': '{ column = "gx", unit = "deg" }',
                '"gy"': '{ column = "gy", unit = "deg" }',
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\n[regions]",
            },
            "study.toml:12: screen.width_cm: this key is missing, and positions in "
            "degrees need it; expected a number of centimetres\n"
            "    fix: add width_cm = … to [screen]\n"
            "study.toml:12: screen.distance_cm: this key is missing, and positions in"
            " degrees need it; expected a number of centimetres\n"
            "    fix: add distance_cm = … to [screen]",
            id="degrees without sizes",
        ),
        pytest.param(
            {
                '"gx"': '{ column = "gx", unit = "deg" }',
                '"gy"': '{ column = "gy", unit = "deg" }',
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
                'width_cm = 53\ndistance_cm = 65\norigin = "top-left"\n[regions]',
            },
            "study.toml:17: screen.origin: positions in degrees are counted from the "
            'middle of the screen; found "top-left", expected "centre"\n'
            '    fix: write origin = "centre", or remove the key',
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
            'study.toml:15: screen.y_axis: with origin = "top-left" and y_axis = "up"'
            ' no point of the screen has a y above 0; found "up", expected y_axis = '
            '"down" with this origin\n'
            '    fix: write y_axis = "down", or origin = "bottom-left"',
            id="up from the top",
        ),
        pytest.param(
            {
                "[regions]": "[screen]\nwidth_px = 1920\n"
                'height_px = 1080\norigin = "bottom-left"\n[regions]'
            },
            'study.toml:15: screen.origin: with origin = "bottom-left" and y_axis = '
            '"down" no point of the screen has a y above 0; found "bottom-left", '
            'expected y_axis = "up" with this origin\n'
            '    fix: write y_axis = "up", or origin = "top-left"',
            id="down from the bottom",
        ),
        pytest.param(
            {
                "[regions]": "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
                'y_axis = "down"\norigin = "bottom-left"\n[regions]'
            },
            'study.toml:15: screen.y_axis: with origin = "bottom-left" and y_axis = '
            '"down" no point of the screen has a y above 0; found "down", expected '
            'y_axis = "up" with this origin\n'
            '    fix: write y_axis = "up", or origin = "top-left"',
            id="down from the bottom by name",
        ),
    ],
)
def test_y_axis_fits_the_origin(
    refusal: Callable[..., str], changes: dict[str, str], expected: str
) -> None:
    """An axis by which the whole screen has no y above 0 is refused."""
    assert refusal(changed_at(changes)).rsplit("\n", 1)[0] == expected
