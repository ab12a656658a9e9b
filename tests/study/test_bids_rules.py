"""Rules about kind = "bids": what the standard says itself is not said in the study file."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import StudyError
from etl.study import load_study

BIDS = """\
[logs]
files = ["sub-*/**/*_physio.tsv.gz"]
kind = "bids"

[logs.columns]
trial = "trial"

[regions]
file = "boxes.csv"
kind = "boxes"
"""


def said(folder: Path, text: str) -> str:
    """What is said of a study file in which something is wrong."""
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8", newline="\n")
    with pytest.raises(StudyError) as caught:
        load_study(path)
    return str(caught.value)


def test_columns_of_the_standard_are_known(tmp_path: Path) -> None:
    """A study of the standard names its trials, and that is enough."""
    path = tmp_path / "study.toml"
    path.write_text(BIDS, encoding="utf-8", newline="\n")
    logs = load_study(path).logs
    named = {name: column.column for name, column in logs.columns.present().items()}
    assert named == {
        "participant": "participant_id",
        "trial": "trial",
        "onset": "onset",
        "session": "session_id",
        "duration": "duration",
        "x": "x_coordinate",
        "y": "y_coordinate",
        "blink": "blink",
    }
    assert logs.missing == ("", ".", "NA", "n/a")


def test_mark_of_the_standard_is_added_to_those_stated(tmp_path: Path) -> None:
    """n/a is a missing value in any dataset of the standard."""
    path = tmp_path / "study.toml"
    text = BIDS.replace('kind = "bids"', 'kind = "bids"\nmissing = ["-"]')
    path.write_text(text, encoding="utf-8", newline="\n")
    assert load_study(path).logs.missing == ("-", "n/a")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('trial = "trial"', 'item = "item"', "nothing says which trial a fixation belongs to"),
        (
            'kind = "bids"\n\n[logs.columns]\ntrial = "trial"',
            'kind = "bids"\nparticipant_from_name = "sub-(?P<participant>.+)_(?P<trial>[0-9])"\n',
            "nothing says which trial a row of the events is",
        ),
        (
            'trial = "trial"',
            'trial = "trial"\nx = "gx"',
            'logs.columns.x: the standard has a column of its own for this; found "gx"',
        ),
        (
            'trial = "trial"',
            'trial = "trial"\nonset = { column = "onset", unit = "s" }',
            'the sidecars say this unit; found "s", expected onset_unit in [logs.bids], where',
        ),
        (
            'trial = "trial"',
            'trial = "trial"\nend = "end"',
            "the standard says how long a fixation lasted, not when it ended",
        ),
        (
            'kind = "bids"',
            'kind = "bids"\ndelimiter = ";"',
            (
                'study.toml:4: logs.delimiter: this means nothing with kind = "bids"; found ";", '
                "expected tabs, as in the standard"
            ),
        ),
        (
            "[regions]",
            '[logs.eye]\nuse = "R"\n\n[regions]',
            (
                'logs.eye.use: the standard has no such eye; found "R", expected "left" or '
                '"right" or "cyclopean"'
            ),
        ),
        (
            "[regions]",
            '[logs.eye]\nreaders = { P01 = "both" }\n\n[regions]',
            'logs.eye.readers.P01: the standard has no such eye; found "both"',
        ),
        (
            "[regions]",
            '[logs.eye]\nuse = "left"\ncolumns = { left = { x = "lx" } }\n\n[regions]',
            "each eye has a recording of its own",
        ),
    ],
)
def test_what_the_standard_says_is_refused(
    tmp_path: Path, old: str, new: str, message: str
) -> None:
    """Each key that the standard leaves no room for is refused with its place."""
    assert BIDS.count(old) == 1
    assert message in said(tmp_path, BIDS.replace(old, new))
