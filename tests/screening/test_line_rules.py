"""``undersweep`` and ``line_confidence_under`` on readers that are worked out on paper."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest

from etl.report.rules import rule_level, rule_meaning
from etl.screening import LEFT_OUT_BY
from etl.screening.ledger import Accounts, Screened, columns_of_accounts, entries_of
from etl.screening.rules import key_of
from etl.session.limits import limits_of
from etl.session.screening import screen
from etl.study import Study
from etl.study.models import StudyFile
from tests.screening import naive_screening as naive
from tests.screening.random_readers import LIBRARY, TEXTS, options, unscreened


def look(number: int, duration_ms: float, x_px: float, *, under: bool = False) -> naive.Fixation:
    """A fixation on the first region; the next one begins 20 ms after it at the earliest."""
    return naive.Fixation(number, 1000 * number, duration_ms, x_px, 20, False, 1, undersweep=under)


@dataclass(frozen=True)
class Done:
    """A reader after all rules."""

    told: Screened
    rules: dict[str, object]

    def fates(self) -> list[str]:
        """What left each fixation out, or how long it lasts."""
        codes = self.told.fixation_codes().tolist()
        lasting = self.told.fixations.duration_ms.tolist()
        return [
            f"{ms:g}" if code < 0 else LEFT_OUT_BY[code]
            for code, ms in zip(codes, lasting, strict=True)
        ]

    def ledger(self, notes: tuple[str, ...]) -> list[tuple[object, ...]]:
        """Level, trial, fixation, rule, limit, observed, action and later rules."""
        width = len(self.told.trials.left_out)
        first_row = np.searchsorted(self.told.recorded.trial, np.arange(width))
        limits = limits_of(study(self.rules))
        found = entries_of(self.told, limits, (("",) * width, notes, ("",)), first_row)
        return [
            (
                e.level,
                e.trial + 1,
                max(e.fixation, 0),
                e.rule,
                e.limit,
                e.observed,
                e.action,
                e.also,
            )
            for e in found
        ]


def study(rules: dict[str, object]) -> Study:
    """A study file with some rules of each level."""
    fixations = {name: rules[name] for name in naive.FIXATION_RULES if name in rules}
    trials = {name: rules[name] for name in naive.TRIAL_RULES if name in rules}
    if "merge" in fixations:
        under_ms, within_px = rules["merge"]
        fixations["merge"] = {"under_ms": under_ms, "within_px": within_px}
    if "notes" in trials:
        trials["notes"] = "notes.csv"
    return StudyFile(
        logs={"files": ["a.tsv"], "columns": {"participant": "p", "trial": "t", "duration": "d"}},
        regions={"file": "r.csv", "kind": "boxes"},
        screening={"fixations": fixations, "trials": trials},
    )


def screened(trials: list[naive.Trial], rules: dict[str, object]) -> Done:
    """A reader of the first text under some rules."""
    before = unscreened(naive.Reader(trials), [0] * len(trials))
    return Done(screen(before, LIBRARY, options(rules, "ignore")), rules)


def one(*fixations: naive.Fixation, confidence: float | None = None, note: str = "") -> naive.Trial:
    """A trial of the first text."""
    return naive.Trial(list(fixations), TEXTS[0], note=note, cell=(0, 0), confidence=confidence)


#: The second is an undersweep: short, and 5 px from the first and 4 from the third.
SWEPT = (look(1, 200, 10), look(2, 60, 15, under=True), look(3, 150, 19), look(4, 70, 21))
MERGE = (80, 7.5)


@pytest.mark.parametrize(
    ("rules", "fates"),
    [
        ({"undersweep": "drop"}, ["200", "undersweep", "150", "70"]),
        # Left out before merging, it is joined to nothing, and the one after it is as it was.
        ({"undersweep": "drop", "merge": MERGE}, ["200", "undersweep", "220", "merge"]),
        # The label alone does nothing: without the rule it is merged like any other (60 + 150).
        ({"merge": MERGE}, ["200", "merge", "280", "merge"]),
        # The first rule against it is charged: it would have been too short as well.
        ({"undersweep": "drop", "under_ms": 80}, ["200", "undersweep", "150", "under_ms"]),
        ({"first": 2, "undersweep": "drop"}, ["first", "first", "150", "70"]),
    ],
    ids=["alone", "before merging", "label without the rule", "before under_ms", "after first"],
)
def test_undersweep_on_paper(rules: dict[str, object], fates: list[str]) -> None:
    """The fixation goes, and goes before short ones are merged."""
    assert screened([one(*SWEPT)], rules).fates() == fates


def test_neighbours_of_an_undersweep_become_neighbours() -> None:
    """What stood before and after it may be merged with each other, 4 px apart: 200 + 70."""
    looks = (look(1, 200, 10), look(2, 60, 40, under=True), look(3, 70, 14))
    rules: dict[str, object] = {"merge": MERGE}
    assert screened([one(*looks)], rules).fates() == ["200", "60", "70"]
    rules["undersweep"] = "drop"
    assert screened([one(*looks)], rules).fates() == ["270", "undersweep", "merge"]


def test_unknown_lines_have_no_undersweep() -> None:
    """Where nothing is known of lines the rule is on and leaves nothing out."""
    done = screened([one(look(1, 200, 10), look(2, 60, 15))], {"undersweep": "drop"})
    assert done.fates() == ["200", "60"]
    assert done.told.recorded.undersweep is None
    assert done.told.fixations.holds["undersweep"].tolist() == [False, False]


TRIALS = [
    one(look(1, 200, 10), confidence=0.9),
    one(look(1, 200, 10), confidence=0.8999),
    one(look(1, 200, 10)),
    one(look(1, 200, 10), confidence=0.3, note="sneezed"),
    one(look(1, 200, 10), look(2, 300, 10), confidence=0.25),
    one(confidence=0.1),
]
UNSURE = {"notes": True, "fewest_fixations": 1, "line_confidence_under": 0.9, "over_ms": 250}


def test_trials_that_are_not_sure_go() -> None:
    """At the limit is sure enough; a trial of which nothing is told is not judged."""
    done = screened(TRIALS[:3], {"line_confidence_under": 0.9})
    names = ["" if code < 0 else LEFT_OUT_BY[code] for code in done.told.trial_codes()]
    assert names == ["", "line_confidence_under", ""]


def test_nothing_told_of_any_trial() -> None:
    """The rule is on and leaves nothing out, even where all that is below 1 would go."""
    done = screened([TRIALS[2], TRIALS[2]], {"line_confidence_under": 1})
    assert done.told.trial_codes().tolist() == [-1, -1]


def test_ledger_of_trials_that_are_not_sure() -> None:
    """Limit and observed chance; after the notes and too few fixations, before the others."""
    rules = {**UNSURE, "no_first_pass_on": ["verb"]}
    notes = ("", "", "", "sneezed", "", "")
    later = "line_confidence_under no_first_pass_on"
    assert screened(TRIALS, rules).ledger(notes) == [
        ("trial", 1, 0, "no_first_pass_on", "verb", "1", "left out", ""),
        (
            *("trial", 2, 0, "line_confidence_under", "0.9", "0.8999", "left out"),
            "no_first_pass_on",
        ),
        ("trial", 3, 0, "no_first_pass_on", "verb", "1", "left out", ""),
        ("trial", 4, 0, "notes", "notes.csv", "sneezed", "left out", later),
        ("fixation", 5, 2, "over_ms", "250", "300", "left out", later),
        ("trial", 5, 0, "line_confidence_under", "0.9", "0.25", "left out", "no_first_pass_on"),
        ("trial", 6, 0, "fewest_fixations", "1", "0", "left out", later),
    ]


def test_ledger_of_undersweeps() -> None:
    """Limit, action, and the later rules that hold as well."""
    rules = {"undersweep": "drop", "under_ms": 80, "line_confidence_under": 0.5}
    trial = one(*SWEPT, confidence=0.4)
    assert screened([trial], rules).ledger(("",)) == [
        (
            *("fixation", 1, 2, "undersweep", "drop", "1", "left out"),
            "under_ms line_confidence_under",
        ),
        ("fixation", 1, 4, "under_ms", "80", "70", "left out", "line_confidence_under"),
        ("trial", 1, 0, "line_confidence_under", "0.5", "0.4", "left out", ""),
    ]


def test_accounts_charge_both() -> None:
    """4 + 1 read: one undersweep, the rest of the first trial with it, the second is kept."""
    rules = {"undersweep": "drop", "line_confidence_under": 0.5}
    done = screened([one(*SWEPT, confidence=0.4), TRIALS[0]], rules)
    fixations = Accounts.of(done.told.fixation_codes())
    trials = Accounts.of(done.told.trial_codes())
    assert fixations.balance()
    assert trials.balance()
    assert (fixations.read, dict(fixations.by_rule), fixations.kept) == (
        *(5, {"undersweep": 1, "line_confidence_under": 3}),
        1,
    )
    assert (trials.read, dict(trials.by_rule), trials.kept) == (2, {"line_confidence_under": 1}, 1)
    assert columns_of_accounts(limits_of(study(rules))) == (
        *("undersweep", "line_confidence_under"),
    )


def test_practice_is_not_judged() -> None:
    """Neither rule looks at a trial that is no part of the study."""
    trial = one(*SWEPT, confidence=0.1)
    trial.skipped = True
    done = screened([trial, TRIALS[0]], {"undersweep": "drop", "line_confidence_under": 0.5})
    assert done.fates() == [*(["skip"] * 4), "200"]


@pytest.mark.parametrize(
    ("rule", "key", "level", "meaning"),
    [
        (
            "undersweep",
            ("screening", "fixations", "undersweep"),
            "fixation",
            "where the eyes came down short of the beginning of a line and went on to it",
        ),
        (
            "line_confidence_under",
            ("screening", "trials", "line_confidence_under"),
            "trial",
            "less than 90% sure which lines were read",
        ),
    ],
    ids=["undersweep", "line_confidence_under"],
)
def test_what_the_audit_page_says(
    rule: str, key: tuple[str, ...], level: str, meaning: str
) -> None:
    """Key, level and meaning with the limit."""
    limits = {"fixations": {"undersweep": "drop"}, "trials": {"line_confidence_under": 0.9}}
    assert (key_of(rule), rule_level(rule)) == (key, level)
    assert rule_meaning(rule, {"screening": limits}) == meaning
