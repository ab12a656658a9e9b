"""Rules for fixations on trials that are worked out on paper, in their order."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.screening.building import Built, Trial, build, study

RULES = """
[screening.fixations]
outside_text_time = true
off_screen = true
first = 1
last = 1
blink = "drop"
merge = { under_ms = 80, within_px = 14 }
under_ms = 80
over_ms = 800
"""
#: The text is there from 1000 to 5000 ms.
LONG = (
    "50@900:180 50@1100:200 60@1320:60 450@1400:70 160@1500:70 162@1600:150b 165@1800:300 "
    "250@2200:70 280@2400:790 285@3200:20 150@3300:900 50@5000:100 50@5200:100"
)
SHORT = "50@101000:250 150@101300:260 150@101600:240 250@101900:300"


@pytest.fixture(scope="module")
def paper(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """The two trials under all rules for fixations."""
    trials = [
        Trial("R1", 1, LONG, on="1000", off="5000"),
        Trial("R1", 2, SHORT, on="100000", off="105000"),
    ]
    return build(study(tmp_path_factory.mktemp("paper"), trials, RULES))


def test_every_rule_in_order_on_a_trial_worked_by_hand(paper: Built) -> None:
    """Each fixation of the first trial goes by the first rule against it.

    ===  =====  ====  ====  ======================================================================
      n  onset  ms    x     on paper
    ===  =====  ====  ====  ======================================================================
      1    900   180    50  begins before the text (1000): ``outside_text_time``, though also first
      2   1100   200    50  kept; takes in 3: 260 ms
      3   1320    60    60  60 < 80 and 10 px from 2: merged into 2
      4   1400    70   450  right of the screen (400): ``off_screen``, though also under 80 ms
      5   1500    70   160  2 is 110 px away; 6 is gone, so 7 is next, 5 px away: merged into 7
      6   1600   150   162  a blink: ``blink``
      7   1800   300   165  kept; takes in 5: 370 ms, onset 1500
      8   2200    70   250  7 is 85 px away, 9 is 30: nothing to merge with; 70 < 80: ``under_ms``
      9   2400   790   280  takes in 10: 810 > 800: ``over_ms``, though 790 alone is not
     10   3200    20   285  5 px from 9: merged into 9
     11   3300   900   150  900 > 800: ``over_ms``
     12   5000   100    50  begins with the end of the text, not after it; is not the last: kept
     13   5200   100    50  begins after the text (5000): ``outside_text_time``, though also last
    ===  =====  ====  ====  ======================================================================
    """
    assert paper.fates() == [
        *("outside_text_time", "260", "merge", "off_screen", "merge", "blink", "370", "under_ms"),
        *("over_ms", "merge", "over_ms", "100", "outside_text_time"),
    ]


def test_first_and_last_of_the_recording_go(paper: Built) -> None:
    """Of four fixations without another fault the first and the last are left out."""
    assert paper.fates(trial=2) == ["first", "260", "240", "last"]


def test_accounts_of_the_two_trials(paper: Built) -> None:
    """13 + 4 read; 2 outside the time, 1 off screen, 1 first, 1 last, 1 blink, 3 merged, 1 under.

    2 over; kept are 2, 7 and 12 of the first trial, and two of the second: 5.
    """
    assert paper.account("fixations") == {
        "read": 17,
        "outside_text_time": 2,
        "off_screen": 1,
        "first": 1,
        "last": 1,
        "blink": 1,
        "merge": 3,
        "under_ms": 1,
        "over_ms": 2,
        "kept": 5,
    }
    assert paper.account("trials") == {"read": 2, "kept": 2}


def test_ledger_names_limit_observed_action_and_later_rules(paper: Built) -> None:
    """The rows of the first trial, word for word."""
    columns = ("fixation", "rule", "limit", "observed", "action", "source_line", "also")
    merge = "under_ms 80, within_px 14"
    assert paper.told("fixation", *columns)[:10] == [
        ("1", "outside_text_time", "true", "900", "left out", "2", "first"),
        ("3", "merge", merge, "60", "merged into 2", "4", "under_ms"),
        ("4", "off_screen", "400 x 100", "450, 25", "left out", "5", "under_ms"),
        ("5", "merge", merge, "70", "merged into 7", "6", "under_ms"),
        ("6", "blink", "drop", "1", "left out", "7", ""),
        ("8", "under_ms", "80", "70", "left out", "9", ""),
        ("9", "over_ms", "800", "810", "left out", "10", ""),
        ("10", "merge", merge, "20", "merged into 9", "11", "under_ms"),
        ("11", "over_ms", "800", "900", "left out", "12", ""),
        ("13", "outside_text_time", "true", "5200", "left out", "14", "last"),
    ]


def test_kept_fixations_show_the_onset_and_duration_used(paper: Built) -> None:
    """Fixation 7 begins with 5, which it took in; 9, which is left out, keeps its own 790 ms."""
    rows = {r["fixation"]: r for r in paper.fixations if r["trial"] == 1}
    assert (rows[7]["onset_ms"], rows[7]["duration_ms"], rows[7]["x_px"]) == (1500, 370, 165)
    assert (rows[2]["onset_ms"], rows[2]["duration_ms"], rows[2]["x_px"]) == (1100, 260, 50)
    assert (rows[9]["onset_ms"], rows[9]["duration_ms"]) == (2400, 790)
    assert (rows[5]["onset_ms"], rows[5]["duration_ms"]) == (1500, 70)


def test_outcomes_are_of_the_durations_used(paper: Built) -> None:
    """260 ms on ``who`` in first pass and 100 later: 360 ms in all; 370 on the verb."""
    assert paper.values("total_time", "who")["R1", 1] == 360
    assert paper.values("first_pass_time", "who")["R1", 1] == 260
    assert paper.values("total_time", "verb")["R1", 1] == 370


@pytest.mark.parametrize(
    ("rule", "looks", "fates"),
    [
        ("under_ms = 80", "50:79.9 50:80 50:81", ["under_ms", "80", "81"]),
        ("over_ms = 800", "50:800 50:800.5", ["800", "over_ms"]),
        ("first = 2", "50:200 50:201 50:202", ["first", "first", "202"]),
        ("last = 2", "50:200 50:201 50:202", ["200", "last", "last"]),
        (
            "first = 2\nlast = 2",
            "50:1 50:2 50:3 50:4 50:5",
            ["first", "first", "3", "last", "last"],
        ),
        ('blink = "drop"', "50:200b 50:201", ["blink", "201"]),
        (
            "off_screen = true",
            "-0.5:100 0:101 399.5:102 400:103 50/-1:104 50/0:105 50/99.5:106 50/100:107",
            ["off_screen", "101", "102", "off_screen", "off_screen", "105", "106", "off_screen"],
        ),
        ("under_ms = false\nover_ms = 300", "50:10 50:301", ["10", "over_ms"]),
    ],
)
def test_rule_alone(tmp_path: Path, rule: str, looks: str, fates: list[str]) -> None:
    """Each rule at its very limit; the edges of the screen as half-open as regions are."""
    trials = [Trial("R1", 1, looks)]
    assert build(study(tmp_path, trials, f"[screening.fixations]\n{rule}\n")).fates() == fates


@pytest.mark.parametrize(
    ("on", "off", "fates"),
    [
        ("1000.5", "2000", ["outside_text_time", "101", "102", "outside_text_time"]),
        ("1000.5", "", ["outside_text_time", "101", "102", "103"]),
        ("", "2000", ["100", "101", "102", "outside_text_time"]),
        ("", "", ["100", "101", "102", "103"]),
        ("899", "1999.9", ["100", "101", "outside_text_time", "outside_text_time"]),
    ],
)
def test_time_of_the_text(tmp_path: Path, on: str, off: str, fates: list[str]) -> None:
    """A fixation that begins with the text or with its end is in; an unknown side is not judged."""
    looks = "50@899:100 50@1000.5:101 50@2000:102 50@2150:103"
    rules = "[screening.fixations]\noutside_text_time = true\n"
    trials = [Trial("R1", 1, looks, on=on, off=off)]
    assert build(study(tmp_path, trials, rules)).fates() == fates


def test_times_in_seconds_are_as_exact_as_the_onsets(tmp_path: Path) -> None:
    """1.001 s times 1000 is 1000.9999999999999; a fixation at 1.001 s is in all the same."""
    trials = [Trial("R1", 1, "50@1.001:200", on="1.001", off="1.001")]
    file = study(tmp_path, trials, "[screening.fixations]\noutside_text_time = true\n")
    text = file.read_text(encoding="utf-8").replace('"start", unit = "ms"', '"start", unit = "s"')
    file.write_text(text, encoding="utf-8", newline="\n")
    assert build(file).fates() == ["200"]


@pytest.mark.parametrize(
    ("on", "off"), [('"1000,5"', '"1999,75"'), ("1000.5", "1999.75"), ("+1000.5", "1.99975e3")]
)
def test_times_of_the_text_may_have_a_decimal_comma(tmp_path: Path, on: str, off: str) -> None:
    """The decimal sign of a column is found out."""
    trials = [Trial("R1", 1, "50@899:100 50@1000.5:101 50@1999.8:102", on=on, off=off)]
    rules = "[screening.fixations]\noutside_text_time = true\n"
    fates = ["outside_text_time", "101", "outside_text_time"]
    assert build(study(tmp_path, trials, rules)).fates() == fates


def test_place_that_is_not_known_is_on_no_side_of_the_screen(tmp_path: Path) -> None:
    """``off_screen`` does not judge a fixation without a position."""
    file = study(
        tmp_path, [Trial("R1", 1, "50:200 50:201")], "[screening.fixations]\noff_screen = true\n"
    )
    log = tmp_path / "logs" / "R1.csv"
    text = log.read_text(encoding="utf-8").replace(",200,50,25,", ",200,NA,NA,")
    log.write_text(text, encoding="utf-8", newline="\n")
    assert build(file).fates() == ["200", "201"]


def test_rule_that_is_off_has_no_column_and_no_row(tmp_path: Path) -> None:
    """Accounts have a column for each rule that is on, in order, and for no other."""
    rules = "[screening.fixations]\nover_ms = 800\nunder_ms = 80\nfirst = false\n"
    built = build(study(tmp_path, [Trial("R1", 1, "50:60 50:201")], rules))
    header = (built.folder / "accounts.csv").read_text(encoding="utf-8").splitlines()[0]
    assert header == "participant,unit,read,under_ms,over_ms,kept"
    assert built.told("fixation", "rule") == [("under_ms",)]


def test_skipped_trials_are_not_screened(tmp_path: Path) -> None:
    """All fixations of a practice trial are charged to ``skip``, whatever they are like."""
    trials = [Trial("R1", 1, "50:60 450:900", block="practice"), Trial("R1", 2, "50:200 50:60")]
    rules = "[screening.fixations]\noff_screen = true\nunder_ms = 80\n"
    built = build(study(tmp_path, trials, rules))
    assert built.fates() == ["skip", "skip"]
    assert built.account("fixations") == {"read": 4, "skip": 2, "under_ms": 1, "kept": 1}
    assert built.account("trials") == {"read": 2, "skip": 1, "kept": 1}
    columns = ("trial", "rule", "limit", "observed", "action", "also")
    assert built.told("trial", *columns) == [("1", "skip", "block = practice", "", "left out", "")]


@pytest.mark.parametrize(("which", "used"), [("first", 0), ("last", 1)])
def test_places_are_counted_in_the_recording_that_is_used(
    tmp_path: Path, which: str, used: int
) -> None:
    """Of a trial recorded twice, ``first`` and ``last`` count in the recording that counts."""
    recordings = ("50:201 150:202 250:203", "50:204 150:205 250:206")
    trials = [Trial("R1", 1, recordings)]
    rules = "[screening.fixations]\nfirst = 1\nlast = 1\n"
    built = build(study(tmp_path, trials, rules, repeated=which))
    one, other = ["first", f"{[202, 205][used]}", "last"], ["repeated"] * 3
    assert built.fates() == (one + other if used == 0 else other + one)
    assert built.account("fixations") == {
        "read": 6,
        "repeated": 3,
        "first": 1,
        "last": 1,
        "kept": 1,
    }
    repeated = built.told("fixation", "rule", "limit", "observed", "action", "also")
    assert repeated.count(("repeated", which, "1", "left out", "")) == 3
