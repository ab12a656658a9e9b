"""Logs of events into canonical fixations: lines, groups, encodings, eyes, the account."""

import gzip
import pickle
import unicodedata
from pathlib import Path

import numpy as np
import pytest

from tests.parsers.event_reading import (
    CLOSES,
    OPENS,
    PATTERNS,
    TRIAL,
    VISITOR,
    fates,
    read,
    read_and_told,
    reader_of,
    rested,
    text_of,
    texts,
)


def test_groups_become_columns(tmp_path: Path) -> None:
    """A fixation has what its own line says and what the lines of its trial say."""
    log, note = read(tmp_path, TRIAL)
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([1000, 1250], [200, 300])
    assert (log.x_px.tolist(), log.y_px.tolist()) == ([50, 150], [25, 25])
    assert (texts(log, "participant"), texts(log, "trial")) == (["P01"] * 2, ["1"] * 2)
    assert texts(log, "item") == ["pear"] * 2
    assert (log.source_line.tolist(), log.recording.tolist()) == ([3, 4], [0, 0])
    assert (note.encoding, note.decimal, note.delimiter) == ("utf-8", ".", "")


def test_every_line_is_accounted_for(tmp_path: Path) -> None:
    """Each line goes to what it was taken for, with the first line of each kind."""
    lines = [
        "# May",
        VISITOR,
        "",
        "row of pears",
        OPENS,
        "wind 3",
        rested(1000),
        "  # lunch",
        " \t",
    ]
    _, note = read(tmp_path, [*lines, "shut 1210 to 1240", "cue: early", CLOSES, "wind 4"])
    assert note.account.total == 13
    assert {fate: (t.count, t.first_line) for fate, t in note.account.lines.items()} == {
        "fixations": (1, 7),
        "blinks": (1, 10),
        "starts of trials": (1, 5),
        "ends of trials": (1, 12),
        "facts": (2, 2),
        "lasting facts": (1, 4),
        "blank lines": (2, 3),
        "remarks": (2, 1),
        "ignored lines": (2, 6),
    }
    assert note.counts == {
        "trials that do not end": 0,
        "trials": 1,
        "trials without a fixation": 0,
        "rows": 1,
        "rows not asked for": 0,
        "fixations": 1,
        "fixations without a position": 0,
        "blinks": 1,
    }


def test_last_line_may_have_no_end(tmp_path: Path) -> None:
    """A last line without a line end is a line; that it has none is remembered."""
    log, note = read(tmp_path, text_of(TRIAL)[:-1])
    assert (len(log), note.account.total, note.ends_open) == (2, 5, True)
    assert not read(tmp_path, TRIAL)[1].ends_open


@pytest.mark.parametrize(
    "encoding", ["utf-8-sig", "utf-16", "utf-16-le", "cp1252"], ids=lambda name: name
)
@pytest.mark.parametrize("line_end", ["\r\n", "\r"], ids=["CRLF", "CR"])
def test_encodings_and_line_ends(tmp_path: Path, encoding: str, line_end: str) -> None:
    """A log reads the same in every encoding and with every line end."""
    lines = ["visitor Zoë", *TRIAL[1:]]
    content = "".join(f"{line}{line_end}" for line in lines).encode(encoding)
    log, note, _ = read_and_told(tmp_path, content)
    assert texts(log, "participant") == ["Zoë"] * 2
    assert log.source_line.tolist() == [3, 4]
    assert note.account.total == 5


def test_gzipped_log(tmp_path: Path) -> None:
    """A gzipped log is read as it is."""
    log, _ = read(tmp_path, gzip.compress(text_of(TRIAL)))
    assert log.source_line.tolist() == [3, 4]


@pytest.mark.parametrize("form", ["NFC", "NFD"])
def test_letters_with_accents_are_letters(tmp_path: Path, form: str) -> None:
    """A word of the pattern takes letters of any script, composed or not, and is never cut."""
    name = "Zoë_Åström_Ђ"
    log, _ = read(tmp_path, [unicodedata.normalize(form, f"visitor {name}"), *TRIAL[1:]])
    assert texts(log, "participant") == [name] * 2


def test_letters_of_the_pattern_are_composed_too(tmp_path: Path) -> None:
    """How an editor stores an accent in the study file makes no difference."""
    facts = [unicodedata.normalize("NFD", "^gärtner (?P<participant>.+)$")]
    log, _ = read(tmp_path, ["gärtner P01", *TRIAL[1:]], reader_of({"facts": facts}))
    assert texts(log, "participant") == ["P01"] * 2


@pytest.mark.parametrize("blanks", [" ", "\t", "  \t", "\u00a0"], ids=ascii)
def test_blanks_at_the_end_of_a_line_mean_nothing(tmp_path: Path, blanks: str) -> None:
    """A pattern describes a line up to blanks at its end, whether or not it ends in $."""
    patterns = {"facts": [r"^visitor (?P<participant>\w+)", r"^cue: (?P<cue>\w+)$"]}
    log, _ = read(tmp_path, [line + blanks for line in TRIAL], reader_of(patterns))
    assert texts(log, "participant") == ["P01"] * 2
    assert log.y_px.tolist() == [25, 25]


def test_group_that_takes_no_part_is_missing(tmp_path: Path) -> None:
    """An optional part of a line that is not there says nothing."""
    fixation = r"^rested (?P<onset>\d+) to (?P<end>\d+)(?: on (?P<x>\d+)/(?P<y>\d+))?$"
    lines = [VISITOR, OPENS, rested(1000), "rested 1300 to 1500", CLOSES]
    log, note = read(tmp_path, lines, reader_of({"fixation": fixation}))
    assert np.isnan(log.x_px).tolist() == [False, True]
    assert note.counts["fixations without a position"] == 1


def test_several_patterns_of_a_kind(tmp_path: Path) -> None:
    """Lines of one kind may be written in several ways; their order is that of the log."""
    lost = r"^lost (?P<onset>\d+) to (?P<end>\d+)$"
    patterns = {"fixation": [lost, PATTERNS["fixation"]]}
    lines = [VISITOR, OPENS, rested(1000), "lost 1300 to 1500", rested(1600), CLOSES]
    log, _ = read(tmp_path, lines, reader_of(patterns))
    assert log.source_line.tolist() == [3, 4, 5]
    assert log.onset_ms.tolist() == [1000, 1300, 1600]
    assert np.isnan(log.x_px).tolist() == [False, True, False]


def test_line_goes_to_the_first_pattern_that_fits(tmp_path: Path) -> None:
    """A line that two kinds of pattern describe is of the kind that is tried first."""
    patterns = {"ignore": "."}
    _, note = read(tmp_path, [*TRIAL, "anything"], reader_of(patterns))
    assert fates(note) == {
        "fixations": 2,
        "starts of trials": 1,
        "ends of trials": 1,
        "facts": 1,
        "ignored lines": 1,
    }


def test_lines_that_mean_nothing_are_searched(tmp_path: Path) -> None:
    """A pattern of ignore need not describe the whole of a line."""
    _, note = read(tmp_path, [*TRIAL, "10:04 wind 3 m/s"], reader_of({"ignore": r"\bwind\b"}))
    assert fates(note)["ignored lines"] == 1


def test_other_lines_are_counted_where_the_study_says_so(tmp_path: Path) -> None:
    """With other = "ignore" a line that no pattern fits is counted."""
    _, note = read(tmp_path, [*TRIAL, "a bird"], reader_of({"other": "ignore"}))
    assert fates(note)["other lines"] == 1


def test_names_and_units_of_groups(tmp_path: Path) -> None:
    """Groups may have names of their own, and times their unit."""
    patterns = {"fixation": r"^rested (?P<from>[\d.]+) for (?P<time>\d+) on (?P<x>\d+)/(?P<y>\d+)$"}
    columns = {
        "onset": {"column": "from", "unit": "s"},
        "duration": {"column": "time", "unit": "us"},
    }
    lines = [VISITOR, OPENS, "rested 1.25 for 200500 on 50/25", CLOSES]
    log, _ = read(tmp_path, lines, reader_of(patterns, {"columns": columns}))
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([1250], [200.5])


def test_decimal_comma_is_found_out(tmp_path: Path) -> None:
    """The decimal sign of the fixations is found out as in a table."""
    patterns = {"fixation": r"^rested (?P<onset>\S+) to (?P<end>\S+) on (?P<x>\S+)/(?P<y>\S+)$"}
    lines = [VISITOR, OPENS, "rested 1000,5 to 1200,75 on 50,25/25,5", CLOSES]
    log, note = read(tmp_path, lines, reader_of(patterns))
    assert (log.onset_ms.tolist(), log.x_px.tolist()) == ([1000.5], [50.25])
    assert note.decimal == ","


def test_reader_from_the_name_of_the_file(tmp_path: Path) -> None:
    """What no line says can stand in the file's name."""
    reader = reader_of(
        {"facts": [r"^cue: (?P<cue>\w+)$"]},
        {"participant_from_name": r"(?P<participant>P\d+)"},
        ("cue",),
    )
    log, _ = read(tmp_path, ["cue: early", *TRIAL[1:]], reader)
    assert (texts(log, "participant"), texts(log, "cue")) == (["P01"] * 2, ["early"] * 2)


def test_own_marks_of_remarks(tmp_path: Path) -> None:
    """What marks a remark is said by the study; without a mark there are no remarks."""
    lines = [*TRIAL, "// a bird", "%%"]
    _, note = read(tmp_path, lines, reader_of(logs={"comment": ["//", "%"]}))
    assert fates(note)["remarks"] == 2


def test_remark_like_a_line_is_told(tmp_path: Path) -> None:
    """A line that only a mark makes a remark is not read, and the user is told."""
    log, note, said = read_and_told(
        tmp_path, [*TRIAL[:4], f"# {rested(1600)}", "#" + CLOSES, CLOSES]
    )
    assert (len(log), fates(note)["remarks"]) == (2, 2)
    assert said == (
        "warning: P01.log:5: 2 remarks would be lines of the log without the mark of a remark; "
        'found "# rested 1600 to 1800 on 50/25", expected remarks, which are not read\n'
        "    fix: if it is to be read, take the mark away, or out of [logs] comment"
    )


def test_what_logs_can_say(tmp_path: Path) -> None:
    """The header of a log is all the groups of its patterns but those of blinks."""
    reader = reader_of({"blink": r"^shut (?P<eye>\w)$"})
    assert reader.header(tmp_path / "any.log") == (
        *("onset", "end", "x", "y", "trial", "item", "answer", "participant", "cue", "row"),
    )


BOTH_EYES = {"fixation": str(PATTERNS["fixation"]).replace("^rested", "^(?P<eye>[LR]) rested")}


def test_eye_that_counts(tmp_path: Path) -> None:
    """Of two eyes with lines of their own, the one that the study names is read."""
    reader = reader_of(BOTH_EYES, {"eye": {"use": "R", "readers": {"P02": "L"}}})
    own = [OPENS, f"L {rested(1000)}", f"R {rested(1002)}", f"L {rested(1300)}", CLOSES]
    log, note = read(tmp_path, [VISITOR, *own], reader)
    assert log.onset_ms.tolist() == [1002]
    assert fates(note)["rows of the other eye"] == 2
    log, _ = read(tmp_path, ["visitor P02", *own], reader)
    assert log.onset_ms.tolist() == [1000, 1300]


def test_both_eyes_in_one_line(tmp_path: Path) -> None:
    """Where a line tells of both eyes, the groups of the one that counts are read."""
    places = r"(?P<lx>\d+)/(?P<ly>\d+) (?P<rx>\d+)/(?P<ry>\d+)"
    fixation = rf"^rested (?P<onset>\d+) to (?P<end>\d+) on {places}$"
    eye = {
        "use": "R",
        "columns": {"L": {"x": "lx", "y": "ly"}, "R": {"x": "rx", "y": "ry"}},
    }
    lines = [VISITOR, OPENS, "rested 1000 to 1200 on 1/2 3/4", CLOSES]
    log, _ = read(tmp_path, lines, reader_of({"fixation": fixation}, {"eye": eye}))
    assert (log.x_px.tolist(), log.y_px.tolist()) == ([3], [4])


def test_rows_asked_for(tmp_path: Path) -> None:
    """Fixations may be left out by any group, also one of their trial."""
    reader = reader_of(logs={"where": {"cue": ["early"]}})
    lines = [*TRIAL, "cue: early", "gate 2 opens on plum", "cue: late", rested(3000), CLOSES]
    log, note = read(tmp_path, lines, reader)
    assert texts(log, "trial") == ["1", "1"]
    assert (fates(note)["fixations"], fates(note)["rows not asked for"]) == (2, 1)


def test_reader_travels_to_workers(tmp_path: Path) -> None:
    """A reader that was pickled reads as before."""
    reader = pickle.loads(pickle.dumps(reader_of(facts=("cue",))))  # noqa: S301 - our own
    log, _ = read(tmp_path, ["cue: early", *TRIAL], reader)
    assert texts(log, "cue") == ["early"] * 2


def test_lines_of_samples(tmp_path: Path) -> None:
    """With [logs.samples] the lines are gaze samples, and fixations are found in each trial."""
    patterns = {"fixation": r"^at (?P<onset>\d+) (?P<x>\d+)/(?P<y>\d+)$"}
    samples = {"method": "dispersion", "dispersion_px": 10, "shortest_fixation_ms": 50}
    places = [(50, 25)] * 40 + [(150, 25)] * 30
    own = [f"at {1000 + 4 * number} {x}/{y}" for number, (x, y) in enumerate(places)]
    lines = [VISITOR, OPENS, *own[:20], "shut 1076 to 1080", *own[20:], CLOSES]
    lines += ["gate 2 opens on plum", *(f"at {2000 + 4 * n} 50/25" for n in range(25)), CLOSES]
    log, note = read(tmp_path, lines, reader_of(patterns, {"samples": samples}))
    assert texts(log, "trial") == ["1", "1", "2"]
    assert (log.x_px.tolist(), log.onset_ms.tolist()) == ([50, 150, 50], [1000, 1160, 2000])
    assert log.blink.tolist() == [True, False, False]
    assert log.recording.tolist() == [0, 0, 1]
    assert note.account.total == len(lines)
