"""Logs of gaze samples: what is read from them, what is counted, and what is refused."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

import pytest

from etl.errors import Findings
from etl.parsers import LogReader
from tests.parsers.reading import read, reader_of, refusal, texts

HEADER = "reader\ttrial\ttime\tgx\tgy\n"
Place = tuple[object, object]


def reader(
    columns: Mapping[str, Any] | None = None,
    screen: Mapping[str, Any] | None = None,
    facts: tuple[str, ...] = (),
    logs: Mapping[str, Any] | None = None,
    **samples: Any,
) -> LogReader:
    """A reader of logs of samples."""
    named = {"onset": "time", "duration": None, **(columns or {})}
    settings = {"method": "engbert_kliegl", **samples}
    return reader_of({"samples": settings, **(logs or {})}, named, screen, facts)


def rows(places: Iterable[Place], trial: object = 1, begin: int = 1000, step: int = 4) -> str:
    """Samples of one trial, every 4 ms."""
    return "".join(
        f"P01\t{trial}\t{begin + step * n}\t{x}\t{y}\n" for n, (x, y) in enumerate(places)
    )


def rest(count: int, x: float = 100, y: float = 50) -> list[Place]:
    """Samples at one place."""
    return [(x, y)] * count


TWO = [*rest(20), *rest(20, 300, 60)]


def test_fixation_has_the_line_of_its_first_sample(tmp_path: Path) -> None:
    """Rows are samples; onset, duration, place and line are those of the fixations in them."""
    log, note = read(tmp_path / "p.tsv", HEADER + rows(TWO), reader())
    assert log.onset_ms.tolist() == [1000.0, 1088.0]
    assert log.duration_ms.tolist() == [72.0, 72.0]
    assert (log.x_px.tolist(), log.y_px.tolist()) == ([100.0, 300.0], [50.0, 60.0])
    assert log.source_line.tolist() == [2, 24]
    assert note.counts["fixations"] == 2
    assert note.interval_ms == 4.0


def test_every_sample_is_accounted_for(tmp_path: Path) -> None:
    """The lines of a log are in fixations, in saccades, too short a fixation or nowhere."""
    places = [*TWO, (".", 50), ("NA", ""), *rest(3, 500, 60)]
    _, note = read(tmp_path / "p.tsv", HEADER + rows(places), reader())
    account = note.account
    assert account.balances()
    told = {fate: (t.count, t.first_line) for fate, t in account.lines.items() if "sample" in fate}
    assert told == {
        "samples in fixations": (36, 2),
        "samples in saccades": (4, 20),
        "samples without a position": (2, 42),
        "samples of too short a fixation": (3, 44),
    }
    assert "fixations" not in account.lines


def test_trials_are_searched_by_themselves(tmp_path: Path) -> None:
    """A fixation does not reach from one trial into the next."""
    text = HEADER + rows(rest(20)) + rows(rest(20), trial=2, begin=1080)
    log, _ = read(tmp_path / "p.tsv", text, reader())
    assert texts(log, "trial") == ["1", "2"]
    assert log.duration_ms.tolist() == [80.0, 80.0]


def test_clock_may_begin_anew_with_each_trial(tmp_path: Path) -> None:
    """Times ascend within a trial; from one to the next they may fall."""
    text = HEADER + rows(rest(20)) + rows(rest(20), trial=2, begin=0)
    log, _ = read(tmp_path / "p.tsv", text, reader())
    assert log.onset_ms.tolist() == [1000.0, 0.0]


def test_rows_left_out_leave_a_hole(tmp_path: Path) -> None:
    """Rows that [logs.where] leaves out are as samples that are not there."""
    phases = ["a"] * 15 + ["b"] * 2 + ["a"] * 15
    text = "reader\ttrial\ttime\tgx\tgy\tphase\n" + "".join(
        f"P01\t1\t{4 * n}\t100\t50\t{phase}\n" for n, phase in enumerate(phases)
    )
    log, note = read(tmp_path / "p.tsv", text, reader(logs={"where": {"phase": ["a"]}}))
    assert log.duration_ms.tolist() == [60.0, 60.0]
    assert note.account.lines["rows not asked for"].count == 2
    assert note.account.balances()


def test_chosen_eye_alone_is_searched(tmp_path: Path) -> None:
    """Where rows of both eyes alternate, the samples of the one that counts are one recording."""
    text = "reader\ttrial\ttime\tgx\tgy\teye\n" + "".join(
        f"P01\t1\t{4 * n}\t{x}\t50\t{eye}\n"
        for n in range(20)
        for eye, x in (("L", 90), ("R", 110))
    )
    one_eye = reader(columns={"eye": "eye"}, logs={"eye": {"use": "R"}})
    log, note = read(tmp_path / "p.tsv", text, one_eye)
    assert (log.x_px.tolist(), log.duration_ms.tolist()) == ([110.0], [80.0])
    assert note.account.lines["rows of the other eye"].count == 20
    assert note.account.balances()


def test_times_in_seconds_are_milliseconds(tmp_path: Path) -> None:
    """Units are those of [logs.columns]."""
    text = HEADER + "".join(f"P01\t1\t{2 + 0.002 * n:.3f}\t100\t50\n" for n in range(50))
    log, _ = read(tmp_path / "p.tsv", text, reader({"onset": {"column": "time", "unit": "s"}}))
    assert (log.onset_ms.tolist(), log.duration_ms.tolist()) == ([2000.0], [100.0])


def test_fixations_are_found_on_the_screen(tmp_path: Path) -> None:
    """Positions are turned into pixels from the top left before fixations are found."""
    screen = {"width_px": 1000, "height_px": 800, "origin": "centre", "y_axis": "up"}
    log, _ = read(tmp_path / "p.tsv", HEADER + rows(rest(20, -100, 50)), reader(screen=screen))
    assert (log.x_px.tolist(), log.y_px.tolist()) == ([400.0], [350.0])


def test_dispersion_in_degrees_is_one_at_the_middle_of_the_screen(tmp_path: Path) -> None:
    """One degree at 57.29 cm is 1 cm, here 20 px: 19 px are within it and 21 px are not."""
    screen = {"width_px": 1000, "height_px": 800, "width_cm": 50.0, "distance_cm": 57.29}
    degrees = reader(screen=screen, method="dispersion", dispersion_deg=1.0)
    log, _ = read(tmp_path / "p.tsv", HEADER + rows([*rest(20), *rest(20, 119)]), degrees)
    assert log.duration_ms.tolist() == [160.0]
    log, _ = read(tmp_path / "p.tsv", HEADER + rows([*rest(20), *rest(20, 121)]), degrees)
    assert log.duration_ms.tolist() == [80.0, 80.0]


@pytest.mark.parametrize(
    ("blinks", "touched"),
    [
        pytest.param(range(5, 8), [True, False], id="in the first fixation"),
        pytest.param(range(18, 22), [True, True], id="between the two"),
        pytest.param([30], [False, True], id="in the second fixation"),
        pytest.param(range(3, 30), [True, True], id="from one into the other"),
        pytest.param([], [False, False], id="nowhere"),
    ],
)
def test_blink_touches_fixations(
    tmp_path: Path, blinks: Iterable[int], touched: list[bool]
) -> None:
    """A blink touches the fixations it has samples in; one between two touches both."""
    flagged = set(blinks)
    text = "reader\ttrial\ttime\tgx\tgy\tblink\n" + "".join(
        f"P01\t1\t{4 * n}\t{x}\t{y}\t{int(n in flagged)}\n" for n, (x, y) in enumerate(TWO)
    )
    log, _ = read(tmp_path / "p.tsv", text, reader({"blink": "blink"}))
    assert log.onset_ms.tolist() == [0.0, 88.0]
    assert log.blink.tolist() == touched


def test_blink_touches_no_fixation_of_another_trial(tmp_path: Path) -> None:
    """A blink at the end of a trial is no matter of the next one."""
    text = "reader\ttrial\ttime\tgx\tgy\tblink\n"
    text += "".join(f"P01\t1\t{4 * n}\t{100 if n < 20 else '.'}\t5\t{n // 20}\n" for n in range(25))
    text += "".join(f"P01\t2\t{100 + 4 * n}\t100\t5\t0\n" for n in range(20))
    log, _ = read(tmp_path / "p.tsv", text, reader({"blink": "blink"}))
    assert log.blink.tolist() == [True, False]


def test_missing_samples_alone_are_no_blink(tmp_path: Path) -> None:
    """Without a column that says so, no fixation counts as touched by a blink."""
    log, _ = read(tmp_path / "p.tsv", HEADER + rows([*rest(20), (".", "."), *rest(20)]), reader())
    assert log.blink.tolist() == [False, False]


def test_trial_without_a_fixation_is_told(tmp_path: Path) -> None:
    """A trial in which nothing is found drops out of the study, and a warning says so."""
    path = tmp_path / "p.tsv"
    path.write_text(HEADER + rows(rest(20)) + rows(rest(5), trial=2, begin=2000), encoding="utf-8")
    findings = Findings()
    found = reader().read(path, "p.tsv", findings)
    assert found is not None
    assert findings.text() == (
        "warning: p.tsv:22: no fixation is found in the samples of a trial, which is therefore no "
        'part of the study; found "trial 2 of reader P01"'
    )
    assert found[1].counts["recordings of trials without a fixation"] == 1


def test_recordings_stay_apart_where_nothing_is_found_between(tmp_path: Path) -> None:
    """A trial that is recorded again after one without a fixation is a second recording."""
    text = HEADER + rows(rest(20)) + rows(rest(3), 2, 2000) + rows(rest(20), 1, 3000)
    log, _ = read(tmp_path / "p.tsv", text, reader())
    assert len(set(log.recording.tolist())) == 2
    one_after_the_other = HEADER + rows(rest(20)) + rows(rest(20), 2, 2000)
    log, _ = read(tmp_path / "p.tsv", one_after_the_other, reader())
    assert log.recording.tolist() == [-1, -1]


def test_fact_of_a_trial_comes_with_its_fixations(tmp_path: Path) -> None:
    """Facts that stand beside the samples are facts of the trial."""
    text = "reader\ttrial\ttime\tgx\tgy\tcue\n" + "".join(
        f"P01\t{trial}\t{4 * n}\t100\t50\t{cue}\n"
        for trial, cue in ((1, "early"), (2, "late"))
        for n in range(20)
    )
    log, _ = read(tmp_path / "p.tsv", text, reader(facts=("cue",)))
    assert [log.facts["cue"].text(row) for row in range(2)] == ["early", "late"]


def test_fact_that_changes_between_two_fixations_is_refused(tmp_path: Path) -> None:
    """A fact must be the same in all samples of a trial, also in those of no fixation."""
    text = "reader\ttrial\ttime\tgx\tgy\tcue\n" + "".join(
        f"P01\t1\t{4 * n}\t{x}\t{y}\t{'late' if n == 19 else 'early'}\n"
        for n, (x, y) in enumerate(TWO)
    )
    said = refusal(tmp_path / "p.tsv", text, reader(facts=("cue",)))
    assert (
        'p.tsv:21: column "cue": cue varies within a trial; found "late", expected "early" in all '
        "rows of trial 1 of reader P01, as in line 2"
    ) in said


@pytest.mark.parametrize(
    ("instead", "said"),
    [
        pytest.param(
            "P01\t1\t1030\t100\t50",
            'p.tsv:12: column "time": the samples of a trial go back in time; found "1030", '
            'expected a time after "1036", which the row before has\n'
            "    fix: put the rows in order; if two trials have one number, number them apart",
            id="times that go back",
        ),
        pytest.param(
            "P01\t1\t1036\t100\t50",
            'p.tsv:12: column "time": two samples of a trial have the same time; found "1036", '
            'expected a time after "1036", which the row before has\n'
            "    fix: remove what is there twice; if the rows are of two eyes, choose one by "
            "[logs.eye]; if times are rounded, have the recorder write them in a smaller unit",
            id="a time that comes twice",
        ),
        pytest.param(
            "P01\t1\t.\t100\t50",
            'p.tsv:12: column "time": the sample has no time; found ".", expected a time\n'
            "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]",
            id="no time",
        ),
        pytest.param(
            "P01\t1\t1e99\t100\t50",
            'p.tsv:12: column "time": the time is too large to be told to the millisecond; found '
            '"1e99", expected a time below 9e+15 ms\n',
            id="an absurd time",
        ),
        pytest.param(
            "P01\t1\t1040\tblink\t50",
            'p.tsv:12: column "gx": this is no number; found "blink", expected a number in px\n',
            id="a word for x",
        ),
        pytest.param(
            "P01\t\t1040\t100\t50",
            'p.tsv:12: column "trial": the trial is missing',
            id="no trial",
        ),
    ],
)
def test_sample_that_cannot_be_used_is_refused(tmp_path: Path, instead: str, said: str) -> None:
    """What is wrong with a sample stops the build, with its line."""
    text, row = HEADER + rows(rest(30)), "P01\t1\t1040\t100\t50"
    assert text.count(row) == 1
    assert said in refusal(tmp_path / "p.tsv", text.replace(row, instead), reader())


def test_column_that_is_not_there_is_refused(tmp_path: Path) -> None:
    """A log without x is refused before anything is looked for."""
    text = HEADER.replace("gx", "pupil") + rows(rest(20))
    assert 'p.tsv:1: there is no column "gx"' in refusal(tmp_path / "p.tsv", text, reader())


def test_columns_of_fixations_are_not_asked_for(tmp_path: Path) -> None:
    """A log of samples needs no duration."""
    assert "dur" not in HEADER
    log, _ = read(tmp_path / "p.tsv", HEADER + rows(rest(20)), reader())
    assert len(log) == 1


def test_rows_that_are_no_samples_are_refused(tmp_path: Path) -> None:
    """A log with one row a trial has no samples."""
    text = HEADER + "".join(rows(rest(1), trial=n) for n in range(9))
    assert ("p.tsv:2: no trial has two samples; expected gaze samples, many a trial") in refusal(
        tmp_path / "p.tsv", text, reader()
    )


def test_log_without_any_fixation_is_refused(tmp_path: Path) -> None:
    """A log in which nothing is found is not understood."""
    text = HEADER + rows([(".", ".")] * 30)
    assert (
        "p.tsv:2: logs.samples: no fixation is found in the samples of the log; expected "
        "fixations of 50 ms or more"
    ) in refusal(tmp_path / "p.tsv", text, reader())


def test_stated_frequency_must_be_that_of_the_times(tmp_path: Path) -> None:
    """A frequency that contradicts the times is a slip in one of the two."""
    said = refusal(tmp_path / "p.tsv", HEADER + rows(rest(30)), reader(frequency_hz=1000))
    assert said == (
        "p.tsv: logs.samples.frequency_hz: the samples do not come at the rate that the study "
        'file says; found "a sample every 4 ms (250 a second)", expected one every 1 ms\n'
        "    fix: correct frequency_hz, or the unit of onset in [logs.columns]\n"
        "1 problem; nothing was written"
    )


def test_trial_at_another_rate_is_refused(tmp_path: Path) -> None:
    """All samples of a log are at one rate; otherwise holes could not be told."""
    text = HEADER + rows(rest(40)) + rows(rest(30), trial=2, begin=5000, step=8)
    said = refusal(tmp_path / "p.tsv", text, reader())
    assert (
        "p.tsv:42: the samples of a trial come at another rate than those of the log; found "
        '"a sample every 8 ms", expected one every 4 ms'
    ) in said


def test_stated_frequency_gives_the_last_sample_its_length(tmp_path: Path) -> None:
    """At 60 Hz and whole milliseconds the interval is 16.667 ms, which the times do not say."""
    text = HEADER + "".join(f"P01\t1\t{round(n * 1000 / 60)}\t100\t50\n" for n in range(61))
    log, _ = read(tmp_path / "p.tsv", text, reader())
    assert log.duration_ms.tolist() == [1017.0]
    log, _ = read(tmp_path / "p.tsv", text, reader(frequency_hz=60))
    assert log.duration_ms.tolist() == [1016.667]
