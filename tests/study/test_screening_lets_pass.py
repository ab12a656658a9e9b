"""What the rules about screening let pass, and where they are silent."""

from collections.abc import Callable

import pytest

from etl.study import Study
from tests.study.written import changed_at

SCREEN = "[screen]\nwidth_px = 1920\nheight_px = 1080\n"
SIZES = "width_cm = 53\ndistance_cm = 65\n"
LAYOUT = "[regions.layout]\nleft_px = 1\ntop_px = 1\ncharacter_width_px = 14\nline_height_px = 60\n"
DEGREES = {
    '"gx"': '{ column = "gx", unit = "deg" }',
    '"gy"': '{ column = "gy", unit = "deg" }',
}
FIXATIONS = "[screening.fixations]\n"
BY_ANGLE = FIXATIONS + "merge = { under_ms = 80, within_deg = 0.5 }\n"
BY_CHARACTER = FIXATIONS + "merge = { under_ms = 80, within_characters = 1.5 }\n"
BY_PIXEL = FIXATIONS + "merge = { under_ms = 80, within_px = 14 }\n"
TEXT_TIME = FIXATIONS + "outside_text_time = true\n"
OFF_SCREEN = "off_screen = true\n"


@pytest.mark.parametrize(
    ("changes", "tables", "rule"),
    [
        pytest.param({}, f'[trials]\nonset = "on"\n{TEXT_TIME}', "outside_text_time", id="onset"),
        pytest.param(
            {}, f'[trials]\noffset = "off"\n{TEXT_TIME}', "outside_text_time", id="offset"
        ),
        pytest.param({}, SCREEN + FIXATIONS + OFF_SCREEN, "off_screen", id="screen in px alone"),
        pytest.param(
            {'y = "gy"': 'y = "gy"\nblink = "b"'}, f'{FIXATIONS}blink = "drop"\n', "blink"
        ),
        pytest.param(
            {'y = "gy"\n': "", 'kind = "boxes"': 'kind = "boxes"\nvertical = "any"'},
            BY_PIXEL,
            "merge",
            id="merge by x alone",
        ),
        pytest.param(
            {'y = "gy"': 'y = "gy"\nlabel = "area"', 'kind = "boxes"': 'kind = "labels"'},
            BY_PIXEL,
            "merge",
            id="merge with labels and positions",
        ),
        pytest.param({}, SCREEN + SIZES + BY_ANGLE, "merge", id="merge by angle"),
        pytest.param(DEGREES, SCREEN + SIZES + BY_ANGLE, "merge", id="merge by angle of degrees"),
        pytest.param(
            {'kind = "boxes"\n': f'kind = "words"\n{LAYOUT}'},
            BY_CHARACTER,
            "merge",
            id="merge by characters",
        ),
        pytest.param({}, f"{FIXATIONS}over_ms = 80\n", "over_ms", id="one limit alone"),
        pytest.param({}, f'{FIXATIONS}undersweep = "drop"\n', "undersweep", id="boxes in lines"),
        pytest.param(
            {'kind = "boxes"': 'kind = "wkt"'},
            f'{FIXATIONS}undersweep = "drop"\n',
            "undersweep",
            id="polygons in lines",
        ),
        pytest.param(
            {'kind = "boxes"\n': f'kind = "marked_text"\n{LAYOUT}'},
            "[screening.trials]\nline_confidence_under = 0\n",
            "line_confidence_under",
            id="text in lines",
        ),
        pytest.param(
            {},
            '[lines]\nmethod = "consensus"\n[screening.trials]\nline_confidence_under = 0.9\n',
            "line_confidence_under",
            id="consensus by name",
        ),
    ],
)
def test_rule_with_what_it_needs_is_accepted(
    load: Callable[..., Study], changes: dict[str, str], tables: str, rule: str
) -> None:
    """A rule passes once the study has what it judges by, and no more is asked for."""
    screening = load(changed_at(changes) + tables).screening
    assert screening is not None
    assert screening.rules() == (rule,)


@pytest.mark.parametrize(
    ("changes", "tables", "said"),
    [
        pytest.param(
            {'x = "gx"\ny = "gy"\n': ""},
            SCREEN + BY_PIXEL + OFF_SCREEN,
            ["logs.columns"],
            id="positions that the regions need too",
        ),
        pytest.param(
            DEGREES,
            BY_ANGLE + OFF_SCREEN,
            ["logs.columns.x"],
            id="screen that positions in degrees need too",
        ),
        pytest.param(
            DEGREES,
            SCREEN + BY_ANGLE,
            ["screen.width_cm", "screen.distance_cm"],
            id="sizes that positions in degrees need too",
        ),
        pytest.param(
            {'kind = "boxes"': 'kind = "words"'},
            BY_CHARACTER,
            ["regions"],
            id="layout that the kind of regions needs too",
        ),
        pytest.param(
            {},
            f'[trials]\nonset = 7\nanswer_correct = 7\nfactors = "cue"\n{TEXT_TIME}'
            "[screening.trials]\nanswer_wrong = true\n"
            "[screening.participants]\ncorrect_share_under = 0.5\nfewest_trials_per_cell = 2\n",
            ["trials.onset", "trials.answer_correct", "trials.factors"],
            id="facts that are wrong in themselves",
        ),
        pytest.param(
            {'onset = "t_start"': 'fixation = "n"\nonset = 7', 'y = "gy"': 'y = "gy"\nblink = 7'},
            f'{FIXATIONS}blink = "drop"\n[screening.trials]\nduration_ms = [1, 2]\n'
            'blink_in_first_pass_of = ["verb"]\n',
            ["logs.columns.onset", "logs.columns.blink"],
            id="columns that are wrong in themselves",
        ),
        pytest.param(
            {},
            f"{FIXATIONS}merge = {{ under_ms = 80, within_px = 0 }}\n",
            ["screening.fixations.merge.within_px"],
            id="distance that is wrong in itself",
        ),
        pytest.param(
            {},
            f"{FIXATIONS}merge = {{ under_ms = 80, with_px = 14 }}\n",
            ["screening.fixations.merge.with_px"],
            id="distance with a slip in its name",
        ),
        pytest.param(
            {},
            SCREEN.replace("[screen]", "[sceen]") + BY_ANGLE + OFF_SCREEN,
            ["sceen"],
            id="screen with a slip in its name",
        ),
        pytest.param(
            {},
            f"{FIXATIONS}under_ms = 800\nover_ms = 0\n[screening.trials]\nduration_ms = [9, -1]\n",
            ["screening.fixations.over_ms", "screening.trials.duration_ms, entry 2"],
            id="limits that are wrong in themselves",
        ),
    ],
)
def test_nothing_is_said_twice(
    refusal: Callable[..., str], changes: dict[str, str], tables: str, said: list[str]
) -> None:
    """What is reported already, of the key itself or by another rule, is not asked for again."""
    message = refusal(changed_at(changes) + tables)
    assert [line.split(": ")[1] for line in message.splitlines()[:-1:2]] == said
