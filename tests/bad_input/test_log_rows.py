"""Logs whose header, rows or cells are wrong."""

from collections.abc import Mapping

import pytest

from tests.bad_input.small_study import SmallStudy, log

P01 = "logs/P01.tsv"
ROW = "P01\t1\tpear\t1000250\t200\t50\t25"  # line 3
NEXT = "P01\t1\tpear\t1000500\t200\t50\t25"  # line 4

CORRECT_ROW = "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]\n"
CORRECT_CELL = (
    "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
)
COMPLETE_ROW = (
    "    fix: complete the row, or remove what is too much; a cell that holds the separator must "
    "stand in quotes\n"
)
ONE = "1 problem; nothing was written\n"
TWO = "2 problems; nothing was written\n"

#: For each case: what is changed in the first log, and the whole message.
CASES: Mapping[str, tuple[dict[str, str], str]] = {
    "missing column": (
        {"dur_ms": "dur"},
        (
            'logs/P01.tsv:1: there is no column "dur_ms"; found "reader, trial, sentence, '
            "start_ms, "
            'dur, x, y", expected a header, separated by tabs, that has "dur_ms"\n'
            '    fix: did you mean "dur"? Write the header\'s own name in the study file, or '
            "correct "
            "the header\n" + ONE
        ),
    ),
    "two equal names": (
        {"x\ty\n": "x\tx\n"},
        (
            'logs/P01.tsv:1: header: two columns have the same name; found "x", expected a name of '
            "its own for each of columns 6 and 7\n"
            "    fix: rename one of them in the file's header\n" + ONE
        ),
    ),
    "too few and too many fields": (
        {ROW: ROW.removesuffix("\t25"), NEXT: NEXT + "\t9"},
        (
            'logs/P01.tsv:3: the row has too few fields; found "6 fields", expected 7 '
            "fields, as in "
            "the header\n"
            + COMPLETE_ROW
            + 'logs/P01.tsv:4: the row has too many fields; found "8 fields", expected 7 '
            "fields, as in "
            "the header\n" + COMPLETE_ROW + TWO
        ),
    ),
    "quote never closed": (
        {ROW: ROW.replace("pear", '"pear')},
        (
            'logs/P01.tsv:3: a quote mark is never closed; expected a quote mark " on both '
            "sides of "
            "a cell, and doubled inside it\n"
            "    fix: close or double the quote mark in this line\n" + ONE
        ),
    ),
    "quote inside a quoted cell": (
        {ROW: ROW.replace("pear", '"pe"ar')},
        (
            'logs/P01.tsv:3: a quoted cell is broken; expected a quote mark " on both sides of a '
            "cell, and doubled inside it\n"
            "    fix: close or double the quote mark in this line\n" + ONE
        ),
    ),
    "durations of zero and below": (
        {ROW: ROW.replace("\t200", "\t-200"), NEXT: NEXT.replace("\t200", "\t0")},
        (
            'logs/P01.tsv:3: column "dur_ms": the duration is not above 0; found "-200", '
            "expected a "
            "duration above 0\n"
            + CORRECT_ROW
            + 'logs/P01.tsv:4: column "dur_ms": the duration is not above 0; found "0", expected a '
            "duration above 0\n" + CORRECT_ROW + TWO
        ),
    ),
    "no duration": (
        {ROW: ROW.replace("\t200", "\tNA")},
        (
            'logs/P01.tsv:3: column "dur_ms": the fixation has no duration; found "NA", expected a '
            "duration above 0\n" + CORRECT_ROW + ONE
        ),
    ),
    "no onset": (
        {ROW: ROW.replace("1000250", "")},
        (
            'logs/P01.tsv:3: column "start_ms": the fixation has no onset; found "", expected a '
            "number\n" + CORRECT_ROW + ONE
        ),
    ),
    "not finite": (
        {ROW: ROW.replace("200", "inf"), NEXT: NEXT.replace("\t50", "\tnan")},
        (
            'logs/P01.tsv:3: column "dur_ms": this is no number; found "inf", expected a number in '
            "ms\n"
            + CORRECT_CELL
            + 'logs/P01.tsv:4: column "x": this is no number; found "nan", expected a number '
            "in px\n" + CORRECT_CELL + TWO
        ),
    ),
    "a time beyond all clocks": (
        {ROW: ROW.replace("1000250", "1e300")},
        (
            'logs/P01.tsv:3: column "start_ms": the time is too large to be told to the '
            "millisecond; "
            'found "1e300", expected a time below 9e+15 ms\n' + CORRECT_ROW + ONE
        ),
    ),
    "decimal commas and points": (
        {ROW: ROW.replace("\t50\t25", "\t50,5\t25.5")},
        (
            'logs/P01.tsv:3: column "x": the numbers have commas and points, so the decimal sign '
            'cannot be told (a point in column "y", line 3); found "50,5", expected one '
            "decimal sign "
            "in the whole file\n"
            '    fix: state decimal = "." or "," in [logs], and write numbers without thousands '
            "signs\n" + ONE
        ),
    ),
    "thousands signs": (
        {"1000000": "1,000,000", "1000250": "1,000,250", "1000500": "1,000,500"},
        (
            'logs/P01.tsv:2: column "start_ms": the comma could be a decimal sign or a thousands '
            'sign; found "1,000,000", expected numbers that can be read in one way only\n'
            '    fix: state decimal = "," in [logs] if it is the decimal sign; otherwise write the '
            "numbers without thousands signs\n" + ONE
        ),
    ),
    "reader missing": (
        {ROW: ROW.removeprefix("P01")},
        (
            'logs/P01.tsv:3: column "reader": the participant is missing; found "", expected the '
            "participant this fixation belongs to\n"
            "    fix: fill in the cell, remove the row, or leave such rows out by [logs.where]\n"
            + ONE
        ),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_message(study: SmallStudy, name: str) -> None:
    """The message names the file, the line, the column, what was found and what to do."""
    changes, expected = CASES[name]
    for old, new in changes.items():
        study.change(P01, old, new)
    assert study.refusal() == expected


def test_text_for_a_number_in_line_5003(study: SmallStudy) -> None:
    """The line is right far down in a log."""
    lines = log("P01", fixations=3000).split("\n")
    lines[5002] = lines[5002].replace("\t200\t", "\ttwo hundred\t")
    study.write(P01, "\n".join(lines))
    assert study.refusal() == (
        'logs/P01.tsv:5003: column "dur_ms": this is no number; found "two hundred", expected a '
        "number in ms\n"
        "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
        "1 problem; nothing was written\n"
    )


def test_item_that_varies_within_a_trial(study: SmallStudy) -> None:
    """A trial shows one item from beginning to end."""
    study.change(P01, NEXT, NEXT.replace("pear", "plum"))
    assert study.refusal() == (
        'logs/P01.tsv:4: logs.columns.item: item varies within a trial; found "plum", expected '
        '"pear" in all rows of trial 1 of reader P01, as in logs/P01.tsv:2\n'
        "    fix: correct the cells; if these are two trials, number them apart or name a session "
        "column\n"
        "1 problem; nothing was written\n"
    )


def test_header_that_lacks_a_name(study: SmallStudy) -> None:
    """Where every row has one field more than the header, the header is at fault."""
    study.write(P01, log("P01").replace("\t25\n", "\t25\t1\n"))
    assert study.refusal() == (
        'logs/P01.tsv:1: the header has another number of fields than every row; found "7 in the '
        'header, 8 in each row", expected as many names, separated by tabs, as fields in a row\n'
        "    fix: complete the header, or remove the name that is too much\n"
        "1 problem; nothing was written\n"
    )


def test_header_behind_a_comment_sign(study: SmallStudy) -> None:
    """A header that a # makes a comment of is named as that."""
    study.write(P01, "#" + log("P01"))
    assert study.refusal() == (
        "logs/P01.tsv:2: the header has none of the columns that the study file names; found "
        '"P01, 1, pear, 1000000, 200, 50, 25", expected a header, separated by tabs, that has '
        '"reader", "trial", "sentence", "start_ms", "dur_ms", "x", "y"\n'
        "    fix: remove the # before the names: it makes a comment of the line\n"
        "1 problem; nothing was written\n"
    )


def test_wrong_delimiter(study: SmallStudy) -> None:
    """Where no name of the header is known, the delimiter is suspected, once."""
    study.change("study.toml", "[logs.columns]", 'delimiter = ";"\n[logs.columns]')
    study.write("logs/P02.tsv", log("P02").replace("\t", ";"))
    assert study.refusal() == (
        "logs/P01.tsv:1: the header has none of the columns that the study file names; found "
        '"reader\\ttrial\\tsentence\\tstart_ms\\tdur_ms\\tx\\ty", expected a header, separated by '
        'semicolons, that has "reader", "trial", "sentence", "start_ms", "dur_ms", "x", "y"\n'
        "    fix: write the header's own names in [logs.columns], or correct the header; if the "
        "fields are separated otherwise, state [logs] delimiter\n"
        "1 problem; nothing was written\n"
    )


def test_comma_where_the_point_is_stated(study: SmallStudy) -> None:
    """A comma is not read as a decimal sign where the study file says that it is none."""
    study.change("study.toml", "[logs.columns]", 'decimal = "."\n[logs.columns]')
    study.change(P01, ROW, ROW.replace("\t50", "\t50,5"))
    assert study.refusal() == (
        'logs/P01.tsv:3: column "x": this is no number; found "50,5", expected a number in px\n'
        '    fix: the log is read with "." as decimal sign and without thousands signs: correct '
        "the cell, or [logs] decimal in the study file\n"
        "1 problem; nothing was written\n"
    )


def test_where_that_no_row_meets(study: SmallStudy) -> None:
    """A log of which nothing is asked for is not passed over."""
    study.add("study.toml", '\n[logs.where]\nsentence = ["pear"]\ntrial = ["2"]\n')
    study.write("logs/P02.tsv", log("P02").replace("plum", "pear"))
    assert study.refusal() == (
        "logs/P01.tsv: no row is left by [logs.where]; expected a row that has sentence pear and "
        "trial 2\n"
        "    fix: correct [logs.where] in the study file, or remove the log\n"
        "1 problem; nothing was written\n"
    )


def test_where_with_a_value_that_no_row_has(study: SmallStudy) -> None:
    """A value that a log never has is named with those that it has."""
    study.add("study.toml", '\n[logs.where]\nreader = ["P01"]\n')
    assert study.refusal() == (
        'logs/P02.tsv: column "reader": no row has the value asked for; found "P02", expected P01\n'
        "    fix: correct [logs.where] in the study file, or remove the log\n"
        "1 problem; nothing was written\n"
    )


def test_file_name_without_a_reader(study: SmallStudy) -> None:
    """A log whose name does not fit the pattern belongs to nobody."""
    study.change(
        "study.toml",
        "[logs.columns]",
        "participant_from_name = '(?P<participant>P01)'\n[logs.columns]",
    )
    assert study.refusal() == (
        "logs/P02.tsv: logs.participant_from_name: the file's name does not say whose log it is; "
        'found "P02.tsv", expected a name in which (?P<participant>P01) is found\n'
        "    fix: rename the file, correct the pattern, or narrow [logs] files\n"
        "1 problem; nothing was written\n"
    )


def test_file_name_of_another_reader(study: SmallStudy) -> None:
    """A log that contradicts its own name is refused."""
    study.change(
        "study.toml",
        "[logs.columns]",
        "participant_from_name = '(?P<participant>P..)'\n[logs.columns]",
    )
    study.write("logs/P02.tsv", log("P03"))
    assert study.refusal() == (
        'logs/P02.tsv:2: column "reader": the participant is not the one in the file\'s name; '
        'found "P03", expected P02\n'
        "    fix: correct the log or its name, or remove logs.participant_from_name\n"
        "1 problem; nothing was written\n"
    )


def test_file_name_with_an_empty_reader(study: SmallStudy) -> None:
    """A pattern whose group finds nothing does not make a reader without a name."""
    study.change("study.toml", 'participant = "reader"\n', "")
    study.change(
        "study.toml",
        "[logs.columns]",
        "participant_from_name = '(?P<participant>Q*)'\n[logs.columns]",
    )
    message = (
        "logs/{0}: logs.participant_from_name: the file's name does not say the participant; "
        'found "{0}", expected a name in which the group participant of (?P<participant>Q*) is '
        "not empty\n"
        "    fix: rename the file, correct the pattern, or narrow [logs] files\n"
    )
    assert study.refusal() == (
        message.format("P01.tsv") + message.format("P02.tsv") + "2 problems; nothing was written\n"
    )
