"""Unknown and missing keys, and choices: the message and the line of each."""

from collections.abc import Callable

import pytest

from tests.study.written import changed


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            "trial = ",
            "trail = ",
            'study.toml:6: logs.columns.trail: unknown key\n    fix: did you mean "trial"?',
            id="unknown key near a known one",
        ),
        pytest.param(
            "[logs]\n",
            'Title = "Orchard"\n[logs]\n',
            'study.toml:1: Title: unknown key\n    fix: did you mean "title"?',
            id="unknown key in capitals",
        ),
        pytest.param(
            "[regions]",
            "[regoins]",
            'study.toml:12: regoins: unknown key\n    fix: did you mean "regions"?',
            id="unknown table near a known one",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\nfactors = ["cue"]',
            "study.toml:15: regions.factors: unknown key; expected file, kind, "
            "vertical, tolerance_px, overlap or layout\n"
            "    fix: it belongs in [trials]",
            id="unknown key of another table",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\ntitle = "Orchard"',
            "study.toml:15: regions.title: unknown key; expected file, kind, "
            "vertical, tolerance_px, overlap or layout\n"
            "    fix: it belongs in the top of the file, before the first [table]",
            id="unknown key of the top",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\nkinds = "words"',
            "study.toml:15: regions.kinds: unknown key; expected file, kind, "
            "vertical, tolerance_px, overlap or layout\n"
            '    fix: remove it; "kind" is there already',
            id="unknown key beside the known one",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "boxes"\n[output]\nzzz = 1',
            "study.toml:16: output.zzz: unknown key; expected folder, formats, contrasts, "
            "centred or pseudonyms\n"
            "    fix: remove it",
            id="unknown key like nothing",
        ),
    ],
)
def test_unknown_key_names_the_nearest(
    refusal: Callable[..., str], old: str, new: str, expected: str
) -> None:
    """An unknown key is refused with the nearest known one, or the table it belongs in."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            'file = "boxes.csv"\n',
            "",
            "study.toml:12: regions.file: this key is missing; expected the region "
            "definitions (CSV, TSV or .xlsx, its sheet after a #), relative to the study file\n"
            '    fix: add for example file = "regions.csv"',
            id="missing key",
        ),
        pytest.param(
            "[regions]",
            "[participants]\n[regions]",
            "study.toml:12: participants.table: this key is missing; expected the "
            "file of facts (CSV, TSV or .xlsx, its sheet after a #), relative to the study file\n"
            '    fix: add for example table = "participants.csv"',
            id="missing key of a table to be",
        ),
        pytest.param(
            '[regions]\nfile = "boxes.csv"\nkind = "boxes"\n',
            "",
            "study.toml: regions: this table is missing; expected [regions]\n"
            "    fix: add [regions] with file and kind",
            id="missing table",
        ),
        pytest.param(
            '"t_start"',
            '{ unit = "s" }',
            "study.toml:7: logs.columns.onset.column: this key is missing; expected "
            "the column's header in the log\n"
            '    fix: add for example column = "trial_no"',
            id="missing column of a table",
        ),
    ],
)
def test_missing_key_is_asked_for(
    refusal: Callable[..., str], old: str, new: str, expected: str
) -> None:
    """A key that must be there is asked for at the table that should hold it."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            'kind = "boxes"',
            'kind = "Box"',
            "study.toml:14: regions.kind: this is not one of the choices; found "
            '"Box", expected "marked_text", "words", "boxes", "wkt" or "labels"\n'
            '    fix: did you mean "boxes"?',
            id="choice near one",
        ),
        pytest.param(
            'kind = "boxes"',
            'kind = "circles"',
            "study.toml:14: regions.kind: this is not one of the choices; found "
            '"circles", expected "marked_text", "words", "boxes", "wkt" or "labels"\n'
            "    fix: take one of these",
            id="choice like none",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nkind = "event"',
            'study.toml:3: logs.kind: this is not one of the choices; found "event",'
            ' expected "table", "events" or "bids"\n'
            '    fix: did you mean "events"?',
            id="kind of log",
        ),
        pytest.param(
            "[regions]",
            '[lines]\nmethod = "attached"\n[regions]',
            "study.toml:13: lines.method: this is not one of the choices; found "
            '"attached", expected "consensus", "attach", "chain", "cluster", "merge", "regress", '
            '"segment", "slice", "split", "stretch", "warp", "nearest" or "none"\n'
            '    fix: did you mean "attach"?',
            id="method of lines",
        ),
        pytest.param(
            "[regions]",
            '[output]\nformats = ["csv", "excel"]\n[regions]',
            "study.toml:13: output.formats, entry 2: this is not one of the choices; "
            'found "excel", expected "parquet" or "csv"\n'
            "    fix: take one of these",
            id="choice in a list",
        ),
        pytest.param(
            '"t_start"',
            '{ column = "t_start", unit = "min" }',
            "study.toml:7: logs.columns.onset.unit: this is not one of the choices; "
            'found "min", expected "ms", "s" or "us"\n'
            "    fix: take one of these",
            id="unknown unit",
        ),
        pytest.param(
            '"trial_no"',
            '{ column = "trial_no", unit = "ms" }',
            "study.toml:6: logs.columns.trial.unit: this column has no unit; found "
            '"ms", expected no unit\n'
            "    fix: remove unit",
            id="unit of a column without",
        ),
    ],
)
def test_choices_are_listed(refusal: Callable[..., str], old: str, new: str, expected: str) -> None:
    """A text that is no choice is refused with all choices and the nearest one."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected
