"""Factors as numbers and centred covariates: what the study file may say of them."""

from __future__ import annotations

import tomllib
from collections.abc import Callable

import jsonschema
import pytest

from etl.measures import SELECTABLE
from etl.study import Study
from etl.study.schema import study_schema
from tests.study.written import SOUND

DESIGN = """
[trials]
factors = ["cue", "fit"]
covariates = ["age"]
levels = { cue = ["early", "middle", "late"], fit = ["good", "bad"] }
[output]
"""
#: The line on which what a test adds to DESIGN stands.
LINE = SOUND.count("\n") + DESIGN.count("\n") + 1


def text(message: str) -> str:
    """The message without the count of problems."""
    return message.rsplit("\n", 1)[0]


@pytest.mark.parametrize(
    ("written", "understood"),
    [
        pytest.param('{ cue = "sum" }', {"cue": "sum"}, id="by name"),
        pytest.param(
            "{ fit = [0.5, -0.5] }", {"fit": {"contrast": (0.5, -0.5)}}, id="one list of numbers"
        ),
        pytest.param(
            "{ cue = { trend = [-1, 0, 1], bend = [1, -2, 1] } }",
            {"cue": {"trend": (-1.0, 0.0, 1.0), "bend": (1.0, -2.0, 1.0)}},
            id="columns by name",
        ),
        pytest.param("{ fit = [-0.0, 1] }", {"fit": {"contrast": (0.0, 1.0)}}, id="negative zero"),
    ],
)
def test_contrasts_are_understood(
    load: Callable[..., Study], written: str, understood: dict[str, object]
) -> None:
    """Names stay names; numbers become columns by name, one of them called contrast."""
    study = load(SOUND + DESIGN + f"contrasts = {written}\n", SELECTABLE)
    assert study.output.contrasts == understood
    assert "-0.0" not in repr(study.output.contrasts)


@pytest.mark.parametrize(
    ("written", "sound"),
    [
        ('{ cue = "sum" }', True),
        ("{ cue = [1, 2] }", True),
        ("{ cue = { a = [1, 2] } }", True),
        ('{ cue = "simple" }', False),
        ('{ cue = ["1"] }', False),
        ("{ cue = [] }", False),
        ('{ cue = { "a b" = [1, 2] } }', False),
        ("{ cue = 1 }", False),
    ],
)
def test_schema_and_models_agree(refusal: Callable[..., str], written: str, sound: bool) -> None:
    """What an editor takes by the schema is what the program takes, key by key."""
    study_file = SOUND + f"[output]\ncontrasts = {written}\n"
    errors = list(
        jsonschema.Draft202012Validator(study_schema()).iter_errors(tomllib.loads(study_file))
    )
    assert (not errors) is sound
    # Without [trials] each is refused by a rule; only what a key is in itself is compared.
    message = refusal(study_file)
    told_of_key = any(
        words in message
        for words in ("no such contrast", "no finite number", "is empty", "quotes", "no contrast")
    )
    assert told_of_key is not sound


@pytest.mark.parametrize(
    ("added", "expected"),
    [
        pytest.param(
            'contrasts = { cue = "Sum" }',
            ': output.contrasts.cue: there is no such contrast; found "Sum", expected '
            '"treatment", "sum", "helmert", "polynomial", a number for each level, or columns by '
            "name, each with a number for each level\n"
            '    fix: did you mean "sum"?',
            id="name near one",
        ),
        pytest.param(
            "contrasts = { fit = [1e308, 0] }",
            ": output.contrasts.fit: entry 1 of the list is 1e+308; expected 0, or a number "
            "between a millionth and a million, or minus that\n"
            "    fix: write numbers such as -0.5, 1 or 2",
            id="number beyond reason",
        ),
        pytest.param(
            'contrasts = { fit = { "" = [0, 1] } }',
            ': output.contrasts.fit: a formula would need quotes around ""; found '
            '"{ "" = [0, 1] }", expected unaccented letters and digits, with single underscores '
            "between\n"
            "    fix: give it another name",
            id="name that is empty",
        ),
        pytest.param(
            "contrasts = { fit = [0.5, inf] }",
            ": output.contrasts.fit: entry 2 of the list is no finite number; expected a number "
            "for each level\n"
            "    fix: write numbers without quotes, such as -0.5",
            id="no finite number",
        ),
        pytest.param(
            "contrasts = { fit = [true, false] }",
            ": output.contrasts.fit: entry 1 of the list is no finite number; expected a number "
            "for each level\n"
            "    fix: write numbers without quotes, such as -0.5",
            id="true is no number",
        ),
        pytest.param(
            'contrasts = { fit = { "so bad" = [0.5, -0.5] } }',
            ': output.contrasts.fit: a formula would need quotes around "so bad"; found "{ "so '
            'bad" = [0.5, -0.5] }", expected unaccented letters and digits, with single '
            "underscores between\n"
            "    fix: write so_bad",
            id="name of a column in need of quotes",
        ),
        pytest.param(
            "contrasts = { fit = {} }",
            ': output.contrasts.fit: this is empty; found "{}", expected "treatment", "sum", '
            '"helmert", "polynomial", a number for each level, or columns by name, each with a '
            "number for each level\n"
            '    fix: write for example { cue = "sum" }, { cue = [-0.5, 0.5] } or '
            "{ cue = { late = [-0.5, 0.5] } }",
            id="no columns",
        ),
        pytest.param(
            'contrasts = { cuo = "sum" }',
            ': output.contrasts.cuo: this is no factor; found "cuo", expected a name from [trials] '
            "factors\n"
            '    fix: did you mean "cue"?',
            id="unknown factor near one",
        ),
        pytest.param(
            'contrasts = { weather = "sum" }',
            ': output.contrasts.weather: this is no factor; found "weather", expected a name from '
            "[trials] factors\n"
            "    fix: add it to [trials] factors, or remove it",
            id="unknown factor",
        ),
        pytest.param(
            "contrasts = { fit = [1, 0, -1] }",
            ': output.contrasts.fit: 3 numbers for 2 levels; found "1, 0, -1", expected a number '
            "for each of good, bad\n"
            "    fix: give as many numbers as there are levels, in their order",
            id="too many numbers",
        ),
        pytest.param(
            "contrasts = { cue = [1, 0, -1] }",
            ': output.contrasts.cue: 1 column of numbers for 3 levels; found "[1, 0, -1]", '
            "expected 2 columns, one less than there are levels\n"
            "    fix: give each column a name: cue = { one = […], two = […] }, or name a contrast",
            id="too few columns",
        ),
        pytest.param(
            "contrasts = { fit = { a = [0, 1], b = [1, 0] } }",
            ': output.contrasts.fit: 2 columns of numbers for 2 levels; found "a = [0, 1], '
            'b = [1, 0]", expected 1 column, one less than there are levels\n'
            "    fix: give one list of two numbers, or name a contrast",
            id="too many columns",
        ),
        pytest.param(
            "contrasts = { fit = [1, 1] }",
            ": output.contrasts.fit: these columns do not tell the levels apart: one of them is "
            'constant, or follows from the others; found "[1, 1]", expected columns of which none '
            "can be computed from the others and a constant\n"
            "    fix: correct the numbers, or name a contrast",
            id="constant column",
        ),
        pytest.param(
            "contrasts = { cue = { a = [-1, 0, 1], b = [2, 3, 4] } }",
            ": output.contrasts.cue: these columns do not tell the levels apart: one of them is "
            'constant, or follows from the others; found "a = [-1, 0, 1], b = [2, 3, 4]", expected '
            "columns of which none can be computed from the others and a constant\n"
            "    fix: correct the numbers, or name a contrast",
            id="dependent columns",
        ),
        pytest.param(
            'centred = ["agee"]',
            ': output.centred, entry 1: this is no covariate; found "agee", expected a name from '
            "[trials] covariates\n"
            '    fix: did you mean "age"?',
            id="unknown covariate",
        ),
        pytest.param(
            'centred = ["cue"]',
            ": output.centred, entry 1: this is a factor; only covariates are centred; found "
            '"cue", expected a name from [trials] covariates\n'
            "    fix: name its contrast in [output] contrasts instead",
            id="factor to be centred",
        ),
        pytest.param(
            'centred = ["age", "age"]',
            ': output.centred: named twice in this list: "age"\n    fix: keep one of each',
            id="centred twice",
        ),
    ],
)
def test_what_contradicts_is_refused(
    refusal: Callable[..., str], added: str, expected: str
) -> None:
    """Each mistake is told at its line, with what belongs there and what to do."""
    assert (
        text(refusal(SOUND + DESIGN + added + "\n", SELECTABLE)) == f"study.toml:{LINE}{expected}"
    )


def test_numbers_need_stated_levels(refusal: Callable[..., str]) -> None:
    """Numbers stand in the order of the levels, which is known only where it is stated."""
    study = SOUND + '[trials]\nfactors = ["cue"]\n[output]\ncontrasts.cue = [0.5, -0.5]\n'
    assert text(refusal(study)) == (
        "study.toml:18: output.contrasts.cue: numbers belong to levels in order, and no order is "
        'stated; found "[0.5, -0.5]", expected the levels of cue in [trials] levels\n'
        "    fix: add [trials] levels = { cue = […] }, in the order of the numbers"
    )


def test_named_contrast_needs_stated_levels(refusal: Callable[..., str]) -> None:
    """All but treatment go by the order of the levels: sorted as texts, a trend means nothing."""
    study = SOUND + '[trials]\nfactors = ["cue"]\n[output]\ncontrasts.cue = "polynomial"\n'
    assert text(refusal(study)) == (
        "study.toml:18: output.contrasts.cue: this contrast goes by the order of the levels, and "
        'no order is stated; found "polynomial", expected the levels of cue in [trials] levels\n'
        "    fix: add [trials] levels = { cue = […] }, in the order that is meant"
    )


def test_wrong_column_is_told_at_its_own_line(refusal: Callable[..., str]) -> None:
    """Of columns in a table of their own, the line is that of the column."""
    added = "[output.contrasts.cue]\ntrend = [-1, 0, 1]\nbend = [1, -2]\n"
    message = text(refusal(SOUND + DESIGN + added))
    assert message.startswith(
        f"study.toml:{LINE + 2}: output.contrasts.cue.bend: 2 numbers for 3 levels"
    )


@pytest.mark.parametrize(
    ("trials", "output", "line", "column"),
    [
        pytest.param(
            'factors = ["cue", "cue_late"]\nlevels = { cue = ["early", "late"] }',
            'contrasts = { cue = "treatment" }',
            20,
            "cue_late",
            id="another factor",
        ),
        pytest.param(
            'factors = ["cue"]\ncovariates = ["cue_linear"]\nlevels = { cue = ["early", "late"] }',
            'contrasts = { cue = "polynomial" }',
            21,
            "cue_linear",
            id="a covariate",
        ),
        pytest.param(
            'factors = ["any"]\nlevels = { any = ["no", "skip"] }',
            'contrasts = { any = "treatment" }',
            20,
            "any_skip",
            id="a measure",
        ),
        pytest.param(
            'factors = ["from"]\nlevels = { from = ["region", "order"] }',
            'contrasts = { from = "treatment" }',
            20,
            "from_order",
            id="a column of regressions",
        ),
        pytest.param(
            'covariates = ["age", "age_centred"]', 'centred = ["age"]', 19, "age_centred", id="fact"
        ),
    ],
)
def test_new_column_whose_name_is_taken(
    refusal: Callable[..., str], trials: str, output: str, line: int, column: str
) -> None:
    """No table may have two columns of one name."""
    message = text(refusal(f"{SOUND}\n[trials]\n{trials}\n[output]\n{output}\n", SELECTABLE))
    assert message.startswith(f"study.toml:{line}: output.")
    assert (
        f"the new column would be called {column}, and a column of the tables has that name; found "
        f'"{column}", expected a name that no column of the tables has\n    fix: rename the '
    ) in message


def test_two_new_columns_of_one_name(refusal: Callable[..., str]) -> None:
    """Factors whose names and levels run together give one name twice."""
    study = (
        SOUND
        + '[trials]\nfactors = ["a", "a_b"]\nlevels = { a = ["x", "b_c"], a_b = ["x", "c"] }\n'
        '[output]\ncontrasts = { a = "treatment", a_b = "treatment" }\n'
    )
    assert text(refusal(study, SELECTABLE)).startswith(
        "study.toml:19: output.contrasts.a_b: the new column would be called a_b_c"
    )


def test_all_mistakes_are_told_at_once(refusal: Callable[..., str]) -> None:
    """A wrong contrast hides neither another one nor a wrong covariate."""
    message = refusal(
        SOUND + DESIGN + 'contrasts = { cue = "simple", fit = [1, 1], sky = "sum" }\n'
        'centred = ["height"]\n'
    )
    for words in ("no such contrast", "do not tell the levels apart", "no factor", "no covariate"):
        assert words in message
    assert message.endswith("4 problems; nothing was written")
