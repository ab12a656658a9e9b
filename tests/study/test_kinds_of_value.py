"""Values of the wrong kind or out of bounds: the message and the line of each."""

from collections.abc import Callable

import pytest

from tests.study.written import changed


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            "[regions]",
            '[regions]\nlayout = "wide"',
            'study.toml:13: regions.layout: this is text; found "wide", expected a '
            "table\n"
            "    fix: write its keys under [regions.layout]",
            id="text for a table",
        ),
        pytest.param(
            "[regions]",
            "[[regions]]",
            'study.toml:12: regions: this is a list; found "[{ file = "boxes.csv", '
            'kind = "boxes" }]", expected a table\n'
            "    fix: write its keys under [regions]",
            id="list of tables for a table",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '"logs/*.tsv"',
            'study.toml:2: logs.files: this is text; found "logs/*.tsv", expected a '
            "list in square brackets\n"
            '    fix: write files = ["logs/*.tsv"]',
            id="text for a list",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            "{ a = 1 }",
            'study.toml:2: logs.files: this is a table; found "{ a = 1 }", expected a'
            " list in square brackets\n"
            '    fix: write for example files = ["logs/*.tsv"]',
            id="table for a list",
        ),
        pytest.param(
            'file = "boxes.csv"',
            "file = 12",
            'study.toml:13: regions.file: this is a whole number; found "12", '
            "expected text in quotes\n"
            '    fix: write file = "12"',
            id="number for a text",
        ),
        pytest.param(
            'file = "boxes.csv"',
            "file = true",
            "study.toml:13: regions.file: this is a true-or-false value; found "
            '"true", expected text in quotes\n'
            '    fix: write file = "true"',
            id="switch for a text",
        ),
        pytest.param(
            'file = "boxes.csv"',
            "file = 2024-05-01",
            "study.toml:13: regions.file: this is a date or a time; found "
            '"2024-05-01", expected text in quotes\n'
            '    fix: write file = "2024-05-01"',
            id="date for a text",
        ),
        pytest.param(
            'file = "boxes.csv"',
            'file = ["boxes.csv"]',
            'study.toml:13: regions.file: this is a list; found "["boxes.csv"]", '
            "expected text in quotes\n"
            '    fix: write for example file = "regions.csv"',
            id="list for a text",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '[\n  "logs/*.tsv",\n  7,\n]',
            'study.toml:4: logs.files, entry 2: this is a whole number; found "7", '
            "expected text in quotes\n"
            '    fix: write "7"',
            id="number in a list of texts",
        ),
        pytest.param(
            '"t_start"',
            "5",
            'study.toml:7: logs.columns.onset: this is a whole number; found "5", '
            "expected the column's header in quotes, or a table with column and unit\n"
            '    fix: write for example onset = { column = "t_start", unit = "ms" }',
            id="number for a column",
        ),
        pytest.param(
            "[regions]",
            '[screen]\nwidth_px = "1920"\nheight_px = 1080\n[regions]',
            'study.toml:13: screen.width_px: this is text; found "1920", expected a '
            "whole number\n"
            "    fix: write width_px = 1920",
            id="text for a whole number",
        ),
        pytest.param(
            "[regions]",
            "[screen]\nwidth_px = 1920.5\nheight_px = 1080\n[regions]",
            "study.toml:13: screen.width_px: this is a number with decimals; found "
            '"1920.5", expected a whole number\n'
            "    fix: write for example width_px = 1920",
            id="decimals for a whole number",
        ),
        pytest.param(
            "[regions]",
            "[screen]\nwidth_px = 1920.0\nheight_px = 1080\n[regions]",
            "study.toml:13: screen.width_px: this is a number with decimals; found "
            '"1920.0", expected a whole number\n'
            "    fix: write width_px = 1920",
            id="decimal point for a whole number",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = "20 px"',
            'study.toml:15: regions.tolerance_px: this is text; found "20 px", '
            "expected a number\n"
            "    fix: write for example tolerance_px = 20",
            id="text with a unit for a number",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = "2.5"',
            'study.toml:15: regions.tolerance_px: this is text; found "2.5", expected'
            " a number\n"
            "    fix: write tolerance_px = 2.5",
            id="text for a number",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = true',
            "study.toml:15: regions.tolerance_px: this is a true-or-false value; "
            'found "true", expected a number\n'
            "    fix: write for example tolerance_px = 20",
            id="switch for a number",
        ),
        pytest.param(
            "[regions]",
            '[output]\npseudonyms = "False"\n[regions]',
            'study.toml:13: output.pseudonyms: this is text; found "False", expected '
            "true or false\n"
            "    fix: write pseudonyms = false",
            id="text for a switch",
        ),
        pytest.param(
            "[regions]",
            "[output]\npseudonyms = 0\n[regions]",
            'study.toml:13: output.pseudonyms: this is a whole number; found "0", '
            "expected true or false\n"
            "    fix: remove the key",
            id="number for a switch",
        ),
        pytest.param(
            'kind = "boxes"',
            "kind = 3",
            'study.toml:14: regions.kind: this is not one of the choices; found "3", '
            'expected "marked_text", "words", "boxes", "wkt" or "labels"\n'
            "    fix: take one of these",
            id="number for a choice",
        ),
        pytest.param(
            "[regions]",
            '[logs.where]\neye = "R"\n[regions]',
            'study.toml:13: logs.where.eye: this is text; found "R", expected a list '
            "in square brackets\n"
            '    fix: write eye = ["R"]',
            id="single value for a list of cells",
        ),
        pytest.param(
            "[regions]",
            "[logs.where]\nblink = [true]\n[regions]",
            "study.toml:13: logs.where.blink, entry 1: this is a true-or-false value;"
            ' found "true", expected text in quotes\n'
            '    fix: write "true"',
            id="switch in a list of cells",
        ),
        pytest.param(
            "[regions]",
            '[trials]\nskip = "practice"\n[regions]',
            'study.toml:13: trials.skip: this is text; found "practice", expected a '
            "table\n"
            '    fix: write for example skip = { block = ["practice"] }',
            id="text for a table of lists",
        ),
    ],
)
def test_wrong_kind_of_value_is_named_in_plain_words(
    refusal: Callable[..., str], old: str, new: str, expected: str
) -> None:
    """A value of the wrong kind is refused with what it is, what is expected, and what to write."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            "[regions]",
            "[screen]\nwidth_px = 0\nheight_px = 1080\n[regions]",
            'study.toml:13: screen.width_px: out of bounds; found "0", expected a '
            "number above 0\n"
            "    fix: write for example width_px = 1920",
            id="below a bound",
        ),
        pytest.param(
            "[regions]",
            "[screen]\nwidth_px = 100001\nheight_px = 1080\n[regions]",
            'study.toml:13: screen.width_px: out of bounds; found "100001", expected '
            "a number of 100000 or less\n"
            "    fix: write for example width_px = 1920",
            id="above a bound",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = -0.5',
            'study.toml:15: regions.tolerance_px: out of bounds; found "-0.5", '
            "expected a number of 0 or more\n"
            "    fix: write for example tolerance_px = 20",
            id="negative tolerance",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = inf',
            'study.toml:15: regions.tolerance_px: out of bounds; found "inf", '
            "expected a finite number\n"
            "    fix: write for example tolerance_px = 20",
            id="infinite number",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntolerance_px = nan',
            'study.toml:15: regions.tolerance_px: out of bounds; found "nan", '
            "expected a finite number\n"
            "    fix: write for example tolerance_px = 20",
            id="no number",
        ),
        pytest.param(
            'file = "boxes.csv"',
            'file = ""',
            "study.toml:13: regions.file: this is empty; expected some text\n"
            '    fix: write for example file = "regions.csv"',
            id="empty text",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            "[]",
            "study.toml:2: logs.files: this is empty; expected at least one entry\n"
            '    fix: write for example files = ["logs/*.tsv"]',
            id="empty list",
        ),
        pytest.param(
            "[regions]",
            "[logs.where]\neye = []\n[regions]",
            "study.toml:13: logs.where.eye: this is empty; expected at least one "
            "entry\n"
            '    fix: write for example where = { eye = ["R"] }',
            id="empty list of cells",
        ),
        pytest.param(
            '"t_start"',
            '""',
            "study.toml:7: logs.columns.onset: this is empty; expected some text\n"
            '    fix: write for example onset = { column = "t_start", unit = "ms" }',
            id="empty header",
        ),
        pytest.param(
            "[regions]",
            '[logs.where]\n"" = ["R"]\n[regions]',
            'study.toml:13: logs.where."": this is empty; expected some text\n'
            '    fix: write for example where = { eye = ["R"] }',
            id="empty key",
        ),
    ],
)
def test_value_out_of_bounds_is_refused(
    refusal: Callable[..., str], old: str, new: str, expected: str
) -> None:
    """A number outside its bounds and an empty value are refused."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected
