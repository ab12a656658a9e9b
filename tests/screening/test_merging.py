"""Merging on trials that are worked out on paper: which pair, which way, in which order.

All under ``merge = { under_ms = 80, within_px = 14 }`` where nothing else is said. Fates are the
duration of a fixation that is kept, or the number of the one into which it was merged.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.screening.building import Built, Trial, build, study

RULES = "[screening.fixations]\nmerge = { under_ms = 80, within_px = 14 }\n"


def built(folder: Path, looks: str, rules: str = RULES) -> Built:
    """A study of one trial, and another one that is always kept."""
    return build(study(folder, [Trial("R1", 1, looks), Trial("R2", 1, "50:200")], rules))


def merges(done: Built) -> list[str]:
    """For each fixation its duration, or where it went and how long it was then."""
    went = {
        int(n): f"{action.removeprefix('merged into ')} with {observed}"
        for n, action, observed in done.told("fixation", "fixation", "action", "observed")
    }
    return [
        went.get(row["fixation"], f"{row['duration_ms']:g}")
        for row in done.fixations
        if row["participant"] == "R1"
    ]


PAPER = {
    # 30 is shortest and has 2 beside it: 2 = 70. Then 50, with 70 and 200 both 5 px away: into the
    # longer: 4 = 250. Then 70, whose next neighbour is 4 now, 10 px away: 4 = 320.
    "chain": ("100:30 105:40 110:50 115:200", ["2 with 30", "4 with 70", "4 with 50", "320"]),
    # 50 and 50: the earliest goes first and has only 2 near; equal, so the later into the earlier.
    # Fixation 3 has 1 before it then, 24 px away. Had 2 gone first it would have had the choice.
    "shortest twice": ("100:50 110:50 124:79", ["100", "1 with 50", "79"]),
    # The nearer neighbour, 3 px, not the longer one, 12 px: 100 + 50.
    "nearer": ("100:300 112:50 115:100", ["300", "3 with 50", "150"]),
    # As near as each other: the longer.
    "longer": ("100:200 110:50 120:201", ["200", "3 with 50", "251"]),
    # As near and as long: the earlier.
    "earlier": ("100:200 110:50 120:200", ["250", "1 with 50", "200"]),
    # Exactly 14 px is within 14 px; more is not.
    "limit of distance": ("100:200 114:50 128.1:200", ["250", "1 with 50", "200"]),
    "beyond": ("100:200 114.1:50 128.2:200", ["200", "50", "200"]),
    # 79.9 is short, 80 is not.
    "limit of duration": ("100:79.9 110:300 120:80", ["2 with 79.9", "379.9", "80"]),
    # 10 px right and 9 down are 13.45 px away, 10 and 10 are 14.14.
    "slanting": ("100/25:200 110/34:50 120/44:200", ["250", "1 with 50", "200"]),
    "slanting and far": ("100/25:200 110/35:50", ["200", "50"]),
    # (5, 5) and (7, 1) are both the square root of 50 away: a tie, so the longer.
    "as far by another way": ("100/20:200 105/25:50 112/26:201", ["200", "3 with 50", "251"]),
    # Two short ones become one of 110, which is short no more, and 80 never was.
    "short no more": ("100:50 105:60 110:80", ["2 with 50", "110", "80"]),
    # 3 (30) goes first, into 2: 80. Then 1 (50) into 2: 130.
    "all short": ("100:50 107:50 114:30", ["2 with 50", "130", "2 with 30"]),
    # No neighbour near: nothing.
    "alone": ("100:50", ["50"]),
}


@pytest.mark.parametrize("name", PAPER)
def test_merging_worked_by_hand(tmp_path: Path, name: str) -> None:
    """Durations add, the longer one stays, the order in which they go is the documented one."""
    looks, expected = PAPER[name]
    assert merges(built(tmp_path, looks)) == expected


def test_equal_distances_are_equal_whatever_their_directions(tmp_path: Path) -> None:
    """52, 17 and 47, 28 are both the root of 2993 px away: the longer one takes the short one.

    Rounded hypotenuses of the two differ in the last digit on some systems.
    """
    rules = "[screening.fixations]\nmerge = { under_ms = 80, within_px = 60 }\n"
    done = built(tmp_path, "48/33:201 100/50:50 147/78:200", rules)
    assert merges(done) == ["251", "1 with 50", "200"]


def test_ledger_of_a_chain_names_every_step(tmp_path: Path) -> None:
    """Of a chain 1 > 2 > 4 both rows stand, each with its duration at its time."""
    done = built(tmp_path, PAPER["chain"][0])
    assert done.told("fixation", "fixation", "rule", "observed", "action") == [
        ("1", "merge", "30", "merged into 2"),
        ("2", "merge", "70", "merged into 4"),
        ("3", "merge", "50", "merged into 4"),
    ]
    assert done.account("fixations", "R1") == {"read": 4, "merge": 3, "kept": 1}


def test_chain_begins_where_its_first_link_began(tmp_path: Path) -> None:
    """What is left of the chain has the onset of its first part and the place of its longest."""
    done = built(tmp_path, PAPER["chain"][0])
    last = done.fixations[3]
    assert (last["onset_ms"], last["duration_ms"], last["x_px"]) == (1000, 320, 115)


def test_neighbours_are_those_still_in(tmp_path: Path) -> None:
    """Between the short one and its near neighbour stands a blink, which is gone."""
    rules = '[screening.fixations]\nblink = "drop"\n' + RULES.partition("\n")[2]
    assert built(tmp_path, "100:60 180:300b 108:200", rules).fates() == ["merge", "blink", "260"]


def test_trials_are_merged_apart(tmp_path: Path) -> None:
    """The last fixation of a trial has no neighbour in the next trial."""
    trials = [Trial("R1", 1, "100:200 250:50"), Trial("R1", 2, "250:300 100:50")]
    done = build(study(tmp_path, trials, RULES))
    assert done.account("fixations") == {"read": 4, "kept": 4}


@pytest.mark.parametrize(
    ("first", "second", "kept_fates"),
    [("50:60", "57:60", ["120", "merge"]), ("50:39", "57:40", ["merge", "under_ms"])],
    ids=["long enough together", "too short together"],
)
def test_lower_limit_is_judged_after_merging(
    tmp_path: Path, first: str, second: str, kept_fates: list[str]
) -> None:
    """Two of 60 ms make one of 120, which is kept under ``under_ms = 80``; 39 and 40 do not."""
    rules = RULES + "under_ms = 80\n"
    assert built(tmp_path, f"{first} {second}", rules).fates() == kept_fates


def test_upper_limit_is_judged_after_merging(tmp_path: Path) -> None:
    """780 and 60 make 840, above 800; the two are charged to different rules."""
    done = built(tmp_path, "50:780 57:60", RULES + "over_ms = 800\n")
    assert done.fates() == ["over_ms", "merge"]
    assert done.told("fixation", "observed") == [("840",), ("60",)]


@pytest.mark.parametrize(("merge", "lost"), [(RULES, True), ("", False)], ids=["merged", "not"])
def test_blink_is_inherited(tmp_path: Path, merge: str, lost: bool) -> None:
    """A short fixation on ``who`` with a blink becomes a part of one on the verb, blink and all."""
    rules = merge + '[screening.trials]\nblink_in_first_pass_of = ["verb"]\n'
    done = built(tmp_path, "50:200 95:60b 105:200 250:200", rules)
    assert done.lost_trials() == ({("R1", 1): "blink_in_first_pass_of"} if lost else {})


def test_blink_of_the_longer_one_stays(tmp_path: Path) -> None:
    """A blink of the fixation that takes another one in is not lost either."""
    rules = RULES + '[screening.trials]\nblink_in_first_pass_of = ["verb"]\n'
    done = built(tmp_path, "50:200 105:200b 95:60 250:200", rules)
    assert done.lost_trials() == {("R1", 1): "blink_in_first_pass_of"}


@pytest.mark.parametrize(
    ("distance", "near", "far"),
    [
        # 40 cm are 400 px: 10 px a cm. At 60 cm, tan(1 deg) * 60 cm = 1.0473 cm = 10.473 px.
        ("within_deg = 1", "110.47", "110.48"),
        ("within_px = 10.5", "110.5", "110.51"),
    ],
)
def test_distance_in_its_unit(tmp_path: Path, distance: str, near: str, far: str) -> None:
    """A degree is as many pixels as the screen's size and distance make it."""
    rules = f"[screening.fixations]\nmerge = {{ under_ms = 80, {distance} }}\n"
    assert built(tmp_path / "near", f"100:200 {near}:50", rules).fates() == ["250", "merge"]
    assert built(tmp_path / "far", f"100:200 {far}:50", rules).fates() == ["200", "50"]


def test_distance_in_characters(tmp_path: Path) -> None:
    """Two characters of 14 px each are 28 px."""
    layout = """
[regions.layout]
left_px = 0
top_px = 0
character_width_px = 14
line_height_px = 100
"""
    rules = "[screening.fixations]\nmerge = { under_ms = 80, within_characters = 2 }\n"
    texts = "item,text\npear,{who: The gardener} {verb: watered} {fruit: the pears}\n"
    file = study(
        tmp_path,
        [Trial("R1", 1, "50:200 78:50 150:200 121.9:50")],
        layout + rules,
        also={"regions.csv": texts},
    )
    text = file.read_text(encoding="utf-8").replace('kind = "boxes"', 'kind = "marked_text"')
    file.write_text(text, encoding="utf-8", newline="\n")
    assert build(file).fates() == ["250", "merge", "200", "50"]


def test_log_without_y_is_merged_by_x(tmp_path: Path) -> None:
    """Where the log has no y at all (texts of one line), x alone decides."""
    file = study(tmp_path, [Trial("R1", 1, "100/10:200 110/90:50")], RULES)
    text = file.read_text(encoding="utf-8")
    text = text.replace('y = "y"\n', "").replace(
        'kind = "boxes"', 'kind = "boxes"\nvertical = "any"'
    )
    file.write_text(text, encoding="utf-8", newline="\n")
    assert build(file).fates() == ["250", "merge"]
