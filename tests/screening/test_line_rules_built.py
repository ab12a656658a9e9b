"""``undersweep`` and ``line_confidence_under`` through whole builds of texts of two lines."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.end_to_end.building import rows_of
from tests.screening.building import Built, Trial, build, recorded_ms, study
from tests.screening.checker import Published, contradictions

#: Two lines of three words each, the first from 0 to 50 px down, the second from there to 100.
REGIONS = "item,region,order,left,top,right,bottom\n" + "".join(
    f"pear,w{3 * line + word + 1},{3 * line + word + 1},"
    f"{100 * word},{50 * line},{100 * word + 100},{50 * line + 50}\n"
    for line in range(2)
    for word in range(3)
)
#: Down to 80 and from there to 40: not so far that it could lie in the middle of the sweep.
SHORT = "50/25:200 150/25:210 250/25:220 80/75:60 40/75:230 150/75:240 250/75:250"
#: The same with a sweep that comes down on the first word at once.
STRAIGHT = "50/25:200 150/25:210 250/25:220 40/75:230 150/75:240 250/75:250"
#: Looks here and there, at the height between the lines.
LOST = "250/49:200 50/52:210 150/48:220 260/51:200 40/49:230 150/53:240 60/50:250 250/52:200"


def built(folder: Path, rules: str, *looks: str, method: str) -> Built:
    """A study of texts of two lines, a trial for each text of looks."""
    trials = [Trial("R1", n, text) for n, text in enumerate(looks, start=1)]
    lines = f'[lines]\nmethod = "{method}"\n'
    done = build(study(folder, trials, lines + rules, also={"regions.csv": REGIONS}))
    assert contradictions(Published(done.folder, recorded_ms(trials))) == []
    return done


MERGE = "merge = { under_ms = 80, within_px = 100 }\n"
DROP = 'undersweep = "drop"\n'


@pytest.mark.parametrize(
    ("rules", "fates"),
    [
        (DROP, ["200", "210", "220", "undersweep", "230", "240", "250"]),
        # Without the rule the fixation of 60 ms is 40 px from the next one: 60 + 230 ms.
        (MERGE, ["200", "210", "220", "merge", "290", "240", "250"]),
        (DROP + MERGE, ["200", "210", "220", "undersweep", "230", "240", "250"]),
    ],
    ids=["alone", "merge without it", "before merge"],
)
@pytest.mark.parametrize("method", ["nearest", "attach", "consensus"])
def test_undersweep_is_left_out(tmp_path: Path, method: str, rules: str, fates: list[str]) -> None:
    """The fixation that fell short goes; one on which a sweep came down well stays."""
    done = built(tmp_path, f"[screening.fixations]\n{rules}", SHORT, STRAIGHT, method=method)
    assert done.fates(trial=1) == fates
    assert done.fates(trial=2) == ["200", "210", "220", "230", "240", "250"]


def test_ledger_and_accounts_of_undersweeps(tmp_path: Path) -> None:
    """One row with limit and line of the log, one column with 1."""
    done = built(tmp_path, f"[screening.fixations]\n{DROP}", SHORT, STRAIGHT, method="nearest")
    columns = ("trial", "fixation", "rule", "limit", "observed", "action", "source_line", "also")
    assert done.told("fixation", *columns) == [
        ("1", "4", "undersweep", "drop", "1", "left out", "5", "")
    ]
    assert done.account("fixations") == {"read": 13, "undersweep": 1, "kept": 12}


def test_fixations_that_the_rule_takes_are_those_labelled(tmp_path: Path) -> None:
    """What ``fixations`` calls an undersweep, and nothing else."""
    done = built(tmp_path, f"[screening.fixations]\n{DROP}", SHORT, STRAIGHT, method="consensus")
    labelled = [bool(row["undersweep"]) for row in done.fixations]
    assert [row["left_out_by"] == "undersweep" for row in done.fixations] == labelled
    assert [row["return_sweep"] for row in done.fixations] == [
        *(0, 0, 0, 1, 0, 0, 0),
        *(0, 0, 0, 1, 0, 0),
    ]


def test_trials_under_the_limit_are_left_out(tmp_path: Path) -> None:
    """Those whose chance in ``trials`` is below it; at the limit is sure enough."""
    plain = built(tmp_path / "plain", "", STRAIGHT, LOST, method="consensus")
    sure = {row["trial"]: row["line_confidence"] for row in rows_of(plain.folder, "trials")}
    assert 0 <= sure[2] < sure[1] <= 1
    rules = f"[screening.trials]\nline_confidence_under = {sure[1]!r}\n"
    done = built(tmp_path / "ruled", rules, STRAIGHT, LOST, method="consensus")
    assert done.trials() == [("R1", 1)]
    assert done.told("trial", "trial", "rule", "observed", "action") == [
        ("2", "line_confidence_under", f"{sure[2]:.10g}", "left out")
    ]
    assert done.account("trials") == {"read": 2, "line_confidence_under": 1, "kept": 1}


def test_texts_of_one_line_are_not_judged(tmp_path: Path) -> None:
    """Both rules may be on and leave nothing out; their columns in the accounts are there."""
    rules = f"[screening.fixations]\n{DROP}[screening.trials]\nline_confidence_under = 1\n"
    trials = [Trial("R1", 1, "250:200 120:60 40:200")]
    done = build(study(tmp_path, trials, rules))
    assert done.fates() == ["200", "60", "200"]
    header = (done.folder / "accounts.csv").read_text(encoding="utf-8").splitlines()[0]
    assert header == "participant,unit,read,undersweep,line_confidence_under,kept"
