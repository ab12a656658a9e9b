"""Values of the right kind that cannot work."""

from collections.abc import Callable

import pytest

from tests.study.written import changed


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        pytest.param(
            "[regions]",
            '[trials]\nfactors = ["cue", "fit", "cue"]\n[regions]',
            'study.toml:13: trials.factors: named twice in this list: "cue"\n'
            "    fix: keep one of each",
            id="repeat in a list",
        ),
        pytest.param(
            "[regions]",
            '[trials.skip]\nblock = [1, "1"]\n[regions]',
            'study.toml:13: trials.skip.block: named twice in this list: "1"\n'
            "    fix: keep one of each",
            id="repeat of a number and its text",
        ),
        pytest.param(
            "[regions]",
            '[output]\nformats = ["csv", "csv"]\n[regions]',
            'study.toml:13: output.formats: named twice in this list: "csv"\n'
            "    fix: keep one of each",
            id="repeated format",
        ),
        pytest.param(
            'file = "boxes.csv"',
            "file = 'texts\\boxes.csv'",
            "study.toml:13: regions.file: folders are separated by a backslash, which"
            ' only one operating system understands; found "texts\\boxes.csv", '
            "expected a forward slash between folders\n"
            '    fix: write "texts/boxes.csv"',
            id="backslash between folders",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\ndelimiter = "tab"',
            "study.toml:3: logs.delimiter: this cannot separate the fields of a row; "
            'found "tab", expected one character\n'
            '    fix: write for example delimiter = "\\t" for a tab, or ";"',
            id="long delimiter",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\ndelimiter = \'"\'',
            "study.toml:3: logs.delimiter: this cannot separate the fields of a row; "
            'found """, expected one character\n'
            '    fix: write for example delimiter = "\\t" for a tab, or ";"',
            id="quote as delimiter",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nencoding = "utf-9"',
            "study.toml:3: logs.encoding: this text encoding is not known; found "
            '"utf-9", expected a name such as "utf-8", "utf-16" or "windows-1252"\n'
            "    fix: correct the name, or remove the key to have the encoding found out",
            id="unknown encoding",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nencoding = "hex"',
            "study.toml:3: logs.encoding: this text encoding is not known; found "
            '"hex", expected a name such as "utf-8", "utf-16" or "windows-1252"\n'
            "    fix: correct the name, or remove the key to have the encoding found out",
            id="encoding of no text",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nparticipant_from_name = "(P"',
            "study.toml:3: logs.participant_from_name: this is no regular expression:"
            ' missing ), unterminated subpattern at position 0; found "(P", expected '
            "a regular expression\n"
            "    fix: write for example participant_from_name = '(?P<participant>P\\d+)'",
            id="broken pattern",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nparticipant_from_name = "P[0-9]+"',
            "study.toml:3: logs.participant_from_name: the pattern does not say which"
            ' part is the participant; found "P[0-9]+", expected a group named '
            "participant\n"
            "    fix: put (?P<participant>…) around the part that names the reader",
            id="pattern without a reader",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nparticipant_from_name = "(?P<reader>P[0-9]+)"',
            "study.toml:3: logs.participant_from_name: the pattern does not say which"
            ' part is the participant; found "(?P<reader>P[0-9]+)", expected a group '
            "named participant\n"
            "    fix: rename its group reader to participant",
            id="pattern with a misnamed reader",
        ),
        pytest.param(
            '["logs/*.tsv"]',
            '["logs/*.tsv"]\nparticipant_from_name = "(?P<participant>P[0-9]+)(?P<day>.)"',
            "study.toml:3: logs.participant_from_name: the pattern has a group that "
            'means nothing here: day; found "(?P<participant>P[0-9]+)(?P<day>.)", '
            "expected groups named participant, session, trial or item\n"
            "    fix: rename the group, or write (?:…) where it only groups",
            id="pattern with a strange group",
        ),
    ],
)
def test_value_that_cannot_work_is_refused(
    refusal: Callable[..., str], old: str, new: str, expected: str
) -> None:
    """A value of the right kind that cannot work is refused with a way out."""
    assert refusal(changed(old, new)).rsplit("\n", 1)[0] == expected
