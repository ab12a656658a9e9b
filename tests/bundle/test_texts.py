"""What the starter scripts and the page say, and with which outcome they begin."""

from __future__ import annotations

import ast
import re
from collections.abc import Callable
from pathlib import Path

import pytest

from etl.handoff.scripts import CHOICES, VERDICT_ADVICE, _number, first_choice
from etl.readiness.facts import VERDICT_RULES, CellCount, OutcomeReadiness, Readiness, Verdict
from tests.bundle.odd_studies import ODD_STUDIES
from tests.handoff.bundles import bundle_of, rows_of, small_study


def told_of(outcome: str, region: str, verdict: Verdict, zeros: int, ones: int) -> OutcomeReadiness:
    """An outcome of which only the verdict and the counts matter."""
    total = CellCount((), zeros, ones, 0, 0.0, 1.0)
    return OutcomeReadiness(outcome, region, total, (), (), (), (), (), 0, verdict, ())


def chosen_of(*outcomes: OutcomeReadiness) -> tuple[str, str] | None:
    """The names of the outcome and the region that are chosen."""
    chosen = first_choice(Readiness((), outcomes, (), False))
    return None if chosen is None else (chosen.outcome, chosen.region)


def test_best_verdict_comes_before_more_values() -> None:
    """A ready outcome is chosen before a sparse one with more of its rarer value."""
    chosen = chosen_of(
        told_of("reread", "a", "sparse", 500, 400), told_of("reread", "b", "ready", 300, 60)
    )
    assert chosen == ("reread", "b")


def test_rarer_value_counts_whichever_it_is() -> None:
    """Of two ready ones that with the most of its rarer value, zeros or ones."""
    chosen = chosen_of(
        told_of("reread", "a", "ready", 900, 50), told_of("first_pass_skip", "b", "ready", 60, 900)
    )
    assert chosen == ("first_pass_skip", "b")


def test_usual_outcomes_come_before_others() -> None:
    """An outcome that few ask about is chosen only where there is no other."""
    fixated = told_of("fixated", "a", "ready", 400, 400)
    assert chosen_of(fixated, told_of("reread", "a", "constant", 90, 0)) == ("reread", "a")
    assert chosen_of(fixated) == ("fixated", "a")


def test_first_of_equals_is_chosen() -> None:
    """The order of the table decides between outcomes that have as much."""
    a, b = (told_of("reread", region, "ready", 70, 30) for region in "ab")
    assert chosen_of(a, b) == ("reread", "a")


def test_study_without_binary_outcomes_has_no_choice() -> None:
    """Where there is nothing of 0 and 1 nothing is chosen."""
    assert chosen_of() is None


def test_script_in_r_begins_with_the_choice(orchard_bundle: Path) -> None:
    """The choice stands at the top of the script, where it is easy to change."""
    rows = rows_of(orchard_bundle / "readiness.csv")
    usual = ("regression_in", "regression_out", "first_pass_regression_out", "reread")
    ready = [
        row
        for row in rows
        if row["verdict"] == "ready" and row["outcome"] in (*usual, "first_pass_skip")
    ]
    best = max(ready, key=lambda row: min(int(row["zeros"]), int(row["ones"])))
    top = (orchard_bundle / "start.R").read_text(encoding="utf-8").splitlines()[:32]
    assert f'outcome <- "{best["outcome"]}"' in top
    assert f'region <- "{best["region"]}"' in top


@pytest.mark.parametrize("name", ODD_STUDIES)
def test_script_in_r_is_plain_letters_but_for_remarks(
    odd_bundle: Callable[[str], Path], name: str
) -> None:
    """R reads other letters as the computer is set, so none stand in what is run."""
    text = (odd_bundle(name) / "start.R").read_text(encoding="utf-8")
    odd = [line for line in text.splitlines() if not line.partition("#")[0].isascii()]
    assert odd == []


@pytest.mark.parametrize("name", ODD_STUDIES)
def test_script_in_python_states_the_levels(odd_bundle: Callable[[str], Path], name: str) -> None:
    """Whatever signs levels have, the script gives Python the very same texts."""
    text = (odd_bundle(name) / "start.py").read_text(encoding="utf-8")
    stated = {
        node.targets[0].id: node.value
        for node in ast.parse(text).body
        if isinstance(node, ast.Assign) and isinstance(node.targets[0], ast.Name)
    }
    factors = ast.literal_eval(stated["FACTORS"])
    assert {own: facts["levels"] for own, facts in factors.items()} == ODD_STUDIES[name]["factors"]


def test_page_names_outcomes_that_share_fixations(orchard_bundle: Path) -> None:
    """The page lists with a skip, among others, the first-pass time that it leaves missing."""
    page = (orchard_bundle / "README.md").read_text(encoding="utf-8")
    assert re.search(r"^- `first_pass_skip`: .*`first_pass_time`", page, re.MULTILINE)
    assert not re.search(r"^- `(\w+)`: .*`\1`", page, re.MULTILINE)


def test_page_says_what_remains_to_be_decided(orchard_bundle: Path) -> None:
    """What no program decides stands on the page and at the end of both scripts."""
    for name in ("README.md", "start.R", "start.py"):
        text = (orchard_bundle / name).read_text(encoding="utf-8")
        assert [choice for choice in CHOICES if f"- {choice}" not in text] == []


def test_page_explains_every_verdict(orchard_bundle: Path) -> None:
    """For each verdict a row with its meaning and with what to do."""
    page = (orchard_bundle / "README.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| (.+?) \| (.+?) \| (.+?) \|$", page, re.MULTILINE)
    told = {verdict: (meaning, advice) for verdict, meaning, advice in rows}
    for verdict, meaning in VERDICT_RULES.items():
        assert told[verdict] == (meaning, VERDICT_ADVICE[verdict])


def test_texts_say_by_what_slopes_are_left_out(orchard_bundle: Path) -> None:
    """The order of the ladder is one of counts, and a fit may call for another."""
    for name in ("README.md", "start.R", "start.py"):
        text = (orchard_bundle / name).read_text(encoding="utf-8")
        assert "is known only after a fit, and may call for another order" in text


def test_page_says_what_the_next_build_does(orchard_bundle: Path) -> None:
    """Who works in the folder learns which files stop a build, and which go."""
    page = " ".join((orchard_bundle / "README.md").read_text(encoding="utf-8").split())
    assert "The next build of the study replaces the folder as a whole" in page
    assert "such as `.RData` or `Rplots.pdf`" in page


@pytest.mark.parametrize("number", [1e308, -1e308, 5e-324, 0.1, 1 / 3, -0.5, 1.0, 0.0, 2.0**60])
def test_number_is_short_and_the_same_when_read(number: float) -> None:
    """However large or small, a number of contrasts stands in few digits and loses none."""
    text = _number(number)
    assert float(text) == number
    assert len(text) <= 24  # a sign, 17 digits, a point, an exponent


def test_page_says_that_no_chance_counts_as_zero_where_it_does(tmp_path: Path) -> None:
    """A study that turns no opportunity into 0 is not described as one that leaves it missing."""
    study_file = small_study(tmp_path, {}, output='[measures]\nno_opportunity = "zero"')
    page = (bundle_of(study_file) / "README.md").read_text(encoding="utf-8")
    assert "which this study counts as 0" in page


def test_page_names_every_file_of_the_bundle(orchard_bundle: Path) -> None:
    """Nothing lies in the bundle of which the page does not speak."""
    page = (orchard_bundle / "README.md").read_text(encoding="utf-8")
    names = {path.name for path in orchard_bundle.iterdir()} - {"README.md"}
    tables = re.compile(r"\.(parquet|csv)$")
    assert [
        name
        for name in sorted(names)
        if f"`{name}`" not in page and tables.sub("", name) not in page
    ] == []


def test_title_stays_within_its_line(tmp_path: Path) -> None:
    """A title with an end of line does not break out of a remark or a heading."""
    study_file = small_study(
        tmp_path, {}, title='one\ntwo """ stop("out")'.replace("\n", "\\u000a")
    )
    text = study_file.read_text(encoding="utf-8").replace("\\\\u000a", "\\n")
    study_file.write_text(text, encoding="utf-8", newline="\n")
    bundle = bundle_of(study_file)
    first = (bundle / "start.R").read_text(encoding="utf-8").splitlines()[0]
    assert first.startswith('# one two """ stop("out"): to start with')
    ast.parse((bundle / "start.py").read_text(encoding="utf-8"))
