"""What holds for any study under any rules, through the whole build."""

from __future__ import annotations

import random
from collections import Counter, defaultdict
from collections.abc import Sequence
from pathlib import Path

import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from tests.end_to_end.building import rows_of
from tests.screening.building import Built, Trial, build, recorded_ms, rows_to_log, study, table
from tests.screening.random_builds import built_study
from tests.screening.strategies import TABLES, Lab, Rules, everything, labs, rules

EXAMPLES = settings(max_examples=40, deadline=None, suppress_health_check=list(HealthCheck))
#: The name that a rule has in ledger and accounts, by table and key.
NAMES = {
    place: "participant_notes" if place == ("participants", "notes") else place[1]
    for place in everything()
}


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A place to build in, over and over."""
    return tmp_path_factory.mktemp("properties") / "study"


@EXAMPLES
@given(labs(), rules())
def test_balance_holds(folder: Path, lab: Lab, given_rules: Rules) -> None:
    """Read = kept + the sum over rules, for trials and fixations, each reader and all.

    Counted from the written files alone: what is read from ``fixations``, what is kept from
    ``trials`` and ``fixations``, what each rule took from the accounts.
    """
    done = built_study(folder, lab, given_rules)
    assume(done is not None)
    read, kept = Counter(), Counter()
    for row in done.fixations:
        for who in (row["participant"], "(all)"):
            read[who, "fixations"] += 1
            kept[who, "fixations"] += row["kept"]
    trials = {(row["participant"], row.get("session"), row["trial"]) for row in done.fixations}
    for who, *_ in trials:
        read.update([(who, "trials"), ("(all)", "trials")])
    for who, _ in done.trials():
        kept.update([(who, "trials"), ("(all)", "trials")])
    for row in done.accounts:
        who, unit = row.pop("participant"), row.pop("unit")
        assert int(row.pop("read")) == read[who, unit]
        assert int(row.pop("kept")) == kept[who, unit]
        assert read[who, unit] == kept[who, unit] + sum(map(int, row.values()))


@EXAMPLES
@given(labs(), rules())
def test_every_fixation_is_there_once(folder: Path, lab: Lab, given_rules: Rules) -> None:
    """Each line of each log is one row of ``fixations``, kept or not."""
    done = built_study(folder, lab, given_rules)
    assume(done is not None)
    lines = [(row["source_file"], row["source_line"]) for row in done.fixations]
    assert sorted(lines) == sorted(recorded_ms(lab.trials))


@EXAMPLES
@given(labs(), rules(), st.sampled_from(everything()[:-1]), st.data())
def test_rule_changes_nothing_that_an_earlier_one_is_charged_for(
    folder: Path,
    lab: Lab,
    given_rules: Rules,
    added: tuple[str, str],
    data: st.DataObject,
) -> None:
    """With one rule more, the columns of the accounts before it stay as they were."""
    # A note that no rule asks for is an error, so the two rules about notes come together.
    notes = [("trials", "notes"), ("participants", "notes")]
    new = notes if added in notes else [added]
    without = given_rules.without(*new)
    limits = {place: data.draw(TABLES[place[0]][place[1]]) for place in new}
    with_it = Rules({**without.limits, **limits})
    one = built_study(folder / "without", lab, without)
    other = built_study(folder / "with", lab, with_it)
    assume(one is not None and other is not None)
    before = [
        name
        for place, name in NAMES.items()
        if everything().index(place) < everything().index(new[0])
    ]
    columns = [name for name in ("read", "skip", "repeated", *before) if name in one.accounts[0]]
    assert columns == [name for name in other.accounts[0] if name in columns]
    for mine, theirs in zip(one.accounts, other.accounts, strict=True):
        assert [mine[c] for c in columns] == [theirs[c] for c in columns]


@EXAMPLES
@given(labs(), rules(), st.randoms(use_true_random=False))
def test_row_order_of_a_numbered_log_does_not_matter(
    folder: Path, lab: Lab, given_rules: Rules, rng: random.Random
) -> None:
    """Rows shuffled: the same tables, ledger and accounts but for the lines that they name.

    Trials recorded twice are told apart by the order of their rows, so there are none here.
    """
    once = [
        Trial(**{**vars(t), "looks": t.looks if isinstance(t.looks, str) else t.looks[0]})
        for t in lab.trials
    ]
    one = built_study(folder, lab, given_rules, trials=once)
    assume(one is not None)
    plain = contents(one)
    for log in (folder / "logs").iterdir():
        header, *rows = log.read_text(encoding="utf-8").splitlines()
        rng.shuffle(rows)
        log.write_text("\n".join([header, *rows, ""]), encoding="utf-8", newline="\n")
    assert contents(build(folder / "study.toml")) == plain


def contents(done: Built) -> dict[str, list[dict[str, object]]]:
    """Everything published but for lines of logs."""
    found = {
        name: rows_of(done.folder, name)
        for name in ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")
    }
    found |= {"exclusions": done.ledger, "accounts": done.accounts}
    return {
        name: [{k: v for k, v in row.items() if k != "source_line"} for row in rows]
        for name, rows in found.items()
    }


def that_can_be_repeated(given_rules: Rules) -> Rules:
    """The rules under which what was kept must be kept again.

    Not among them, for they look at what the kept fixations no longer show: ``first`` and ``last``
    (places in the recording), the notes (a note on what is gone matches nothing),
    ``correct_share_under`` (answers of trials that are gone); ``merge``, where a rule after it may
    leave out what stood between two neighbours, unless what is left is too long to be merged;
    ``fewest_trials_per_cell``, where trials without any fixation are kept, which no log can show.
    """
    place = ("fixations", "merge")
    again = given_rules.without(
        ("fixations", "first"),
        ("fixations", "last"),
        ("trials", "notes"),
        ("participants", "notes"),
        ("participants", "correct_share_under"),
    )
    if place in again.limits:
        under = again.limits[place].split()[3].strip(",")
        lower = float(again.limit("fixations", "under_ms") or 0)
        if lower < float(under) and (lower or again.limit("fixations", "over_ms")):
            again = again.without(place)
    if not again.limit("trials", "fewest_fixations"):
        again = again.without(("participants", "fewest_trials_per_cell"))
    return again


def blinks_as_used(done: Built, lab: Lab) -> dict[tuple[str, int], bool]:
    """Whether a blink touches each line's fixation or one that it took in."""
    found = {}
    for who in {t.who for t in lab.trials}:
        rows = rows_to_log([t for t in lab.trials if t.who == who])
        found |= {
            (f"logs/{who}.csv", line): bool(row[-1]) for line, row in enumerate(rows, start=2)
        }
    lines = {}
    for row in done.fixations:
        trial = row["participant"], row.get("session"), row["trial"]
        lines[(*trial, row["fixation"])] = row["source_file"], row["source_line"]
    merged = [row for row in done.ledger if row["rule"] == "merge"]
    # The shortest goes first, so a step's own parts came in before it in this order.
    for row in sorted(merged, key=lambda row: float(row["observed"])):
        trial = row["participant"], row.get("session"), int(row["trial"])
        target = lines[(*trial, int(row["action"].removeprefix("merged into ")))]
        found[target] |= found[lines[(*trial, int(row["fixation"]))]]
    return found


def kept_log(done: Built, lab: Lab, who: str) -> str:
    """The log of what was kept of a reader, durations and onsets as used, numbers as they were."""
    blinks = blinks_as_used(done, lab)
    rows: Sequence[list[object]] = [
        [
            *(r["participant"], r.get("session", ""), r["trial"], r["item"], r["fixation"]),
            *(r["onset_ms"], r["duration_ms"], r["x_px"], r["y_px"]),
            int(blinks[r["source_file"], r["source_line"]]),
        ]
        for r in done.fixations
        if r["kept"] and r["participant"] == who
    ]
    return table("who,came,trial,text,n,start,dur,x,y,blink", rows)


@EXAMPLES
@given(labs(), rules())
def test_screening_its_own_output_leaves_nothing_more_out(
    folder: Path, lab: Lab, given_rules: Rules
) -> None:
    """A log of what was kept, screened again: all is kept, with the same outcomes.

    But for the rules that look at what is no longer there; see :func:`that_can_be_repeated`.
    """
    one = built_study(folder, lab, given_rules)
    assume(one is not None and any(row["kept"] for row in one.fixations))
    plain = outcomes_of(one)
    logs = {
        who: kept_log(one, lab, who)
        for who in sorted({row["participant"] for row in one.fixations if row["kept"]})
    }
    for log in (folder / "logs").iterdir():
        log.unlink()
    study(
        folder,
        lab.trials,
        str(that_can_be_repeated(given_rules)),
        repeated="first",
        also={f"logs/{who}.csv": text for who, text in logs.items()},
    )
    for log in (folder / "logs").iterdir():
        if log.stem not in logs:
            log.unlink()
    other = build(folder / "study.toml")
    assert [row for row in other.ledger if row["level"] != "value"] == []
    assert outcomes_of(other) == plain


def outcomes_of(done: Built) -> dict[str, dict[tuple[object, ...], object]]:
    """Outcomes of trials with a kept fixation; the others have nothing to log."""
    some = defaultdict(int)
    for row in done.fixations:
        some[row["participant"], row.get("session"), row["trial"]] += row["kept"]
    found: dict[str, dict[tuple[object, ...], object]] = {"outcomes": {}, "trials": {}}
    for name, own in found.items():
        for row in rows_of(done.folder, name):
            key = row["participant"], row.get("session"), row["trial"]
            if some[key]:
                rest = tuple(v for k, v in row.items() if k not in ("value", "missing"))
                own[rest] = (row.get("value"), row["missing"])
    return found
