"""What the rules about several keys let pass, and where they are silent."""

from collections.abc import Callable

import pytest

from etl.study import Study
from tests.study.written import changed, changed_at

SCREEN = "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
DEGREES = {
    '"gx"': '{ column = "gx", unit = "deg" }',
    '"gy"': '{ column = "gy", unit = "deg" }',
}
LAYOUT = "[regions.layout]\nleft_px = 1\ntop_px = 1\ncharacter_width_px = 14\nline_height_px = 60\n"


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
        pytest.param({'kind = "boxes"\n': 'kind = "wkt"\n[lines]\n'}, id="lines of polygons"),
        pytest.param(
            {
                'kind = "boxes"\n': 'kind = "boxes"\n[lines]\nmethod = "consensus"\n'
                "chain = { x_px = 100 }\nstretch = { scale = [0.8, 1.2] }\n"
            },
            id="consensus with settings of the methods",
        ),
        pytest.param(
            {'kind = "boxes"\n': 'kind = "boxes"\n[lines]\nmethod = "none"\n'},
            id="boxes by themselves",
        ),
    ],
)
def test_sound_combination_is_accepted(load: Callable[..., Study], changes: dict[str, str]) -> None:
    """What does not contradict itself passes."""
    assert load(changed_at(changes)).regions.file == "boxes.csv"


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
