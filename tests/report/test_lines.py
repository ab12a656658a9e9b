"""What the audit page says of lines, against the tables of a study half of which is unsure."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

import etl
from etl.report.line_trust import CLASSES, LineTrust, tally
from tests.report.reading import Node, read
from tests.trace.tracing import unsure_sample

#: A trial is sure from this confidence on.
SURE = 0.95


class Built:
    """A built study: its trials, and its audit page read back."""

    def __init__(self, study_file: Path, into: Path) -> None:
        self.result = etl.build(etl.load_study(study_file), into=into, workers=1)
        self.trials = self.result.table("trials")
        self.page = read((into / "audit.html").read_text(encoding="utf-8"))

    @property
    def unsure(self) -> pd.DataFrame:
        """The trials that are not sure, the least sure first."""
        own = self.trials[self.trials["line_confidence"] < SURE]
        return own.sort_values("line_confidence", kind="stable")


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Texts of several lines, half of them recorded badly."""
    root = tmp_path_factory.mktemp("unsure")
    return Built(unsure_sample(root), root / "out")


@pytest.fixture(scope="module")
def by_hand(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """The same with all lines of one unsure trial set by hand, and a limit for the rest."""
    root = tmp_path_factory.mktemp("by_hand")
    study_file = unsure_sample(root)
    fixations = Built(study_file, root / "before").result.table("fixations")
    own = fixations[(fixations["participant"].astype(str) == "P33") & (fixations["trial"] == 3)]
    rows = "".join(
        f"P33,3,{number},{line}\n"
        for number, line in zip(own["fixation"], own["line"].fillna(0).astype(int), strict=True)
    )
    (study_file.parent / "lines.csv").write_text(
        "participant,trial,fixation,line\n" + rows, encoding="utf-8", newline="\n"
    )
    text = study_file.read_text(encoding="utf-8")
    more = (
        '\n[lines]\ncorrections = "lines.csv"\n[screening.trials]\nline_confidence_under = 0.935\n'
    )
    study_file.write_text(text + more, encoding="utf-8", newline="\n")
    return Built(study_file, root / "out")


def test_study_has_both_kinds(built: Built) -> None:
    """So that the checks below have seen sure and unsure trials."""
    assert 2 <= len(built.unsure) < len(built.trials)


def test_headline_counts_the_trials(built: Built) -> None:
    """At the top stands how many trials of several lines are sure, and what to do."""
    unsure, every = len(built.unsure), len(built.trials)
    (headline,) = built.page.all("li", class_="headline lines")
    assert (
        f"{every - unsure} of {every} trials of several lines are sure of their lines; {unsure} "
        f"are not ({100 * unsure / every:.1f}%)"
    ) in headline.text
    assert headline.one("a").attributes["href"] == "#lines"


def test_classes_of_confidence_are_those_of_the_table(built: Built) -> None:
    """Each class counts its trials; together they are all."""
    table = built.page.one("table", class_="confidence")
    rows = [row.cells()[:2] for row in table.one("tbody").all("tr")]
    confidence = built.trials["line_confidence"]
    ends = [*CLASSES[1:], np.inf]
    expected = [
        [
            f"{100 * low:.0f} to {100 * min(high, 1):.0f}%",
            str(((confidence >= low) & (confidence < high)).sum()),
        ]
        for low, high in reversed(list(zip(CLASSES, ends, strict=True)))
    ]
    assert rows == expected
    assert sum(int(trials) for _, trials in rows) == len(built.trials)


def test_unsure_trials_are_named_the_least_sure_first(built: Built) -> None:
    """With their confidence, and how to correct one."""
    named = built.page.one("p", data_fact="lines-unsure").text
    expected = [
        f"{row.participant} trial {row.trial} ({100 * row.line_confidence:.1f}%)"
        for row in built.unsure.itertuples()
    ]
    assert re.split(r", | and ", named.rstrip(".")) == expected
    assert "--lines FILE.csv" in built.page.one("section", id="lines").text


def test_gallery_begins_with_the_least_sure(built: Built) -> None:
    """The unsure trials are drawn first, each with its confidence."""
    gallery = built.page.one("ol", class_="gallery-list")
    entries = [item.text for item in gallery.all("li")]
    for entry, row in zip(entries, built.unsure.head(4).itertuples(), strict=False):
        assert entry.startswith(f"participant {row.participant}, trial {row.trial}, ")
        assert f"a confidence of {row.line_confidence:.0%}" in entry
    assert "the least sure of all" in entries[0]
    assert sum("not sure of its lines" in entry for entry in entries) == min(4, len(built.unsure))
    plate = built.page.one("figure", id="trial-1")
    assert "Lines told by consensus, not sure" in plate.text


def test_table_of_readers_has_their_share(built: Built) -> None:
    """Of each reader's trials, the share whose lines are not sure."""
    table = built.page.one("table", id="reader-table")
    keys = [th.attributes["data-measure"] for th in table.all("th", data_measure=None)]
    doubt = built.trials.assign(doubt=built.trials["line_confidence"] < SURE)
    expected = 100 * doubt.groupby("participant", observed=True)["doubt"].mean()
    found = {
        row.attributes["data-reader"]: list(row.all("td", data_value=None))[1:][
            keys.index("lines")
        ].text.removeprefix("◆ ")
        for row in table.all("tr", data_reader=None)
    }
    assert found == {who: f"{share:.1f}%" for who, share in expected.items()}
    assert len(set(found.values())) > 1


def test_trials_set_by_hand_count_as_sure(built: Built, by_hand: Built) -> None:
    """They are told of apart, and are in no class of confidence."""
    section = by_hand.page.one("section", id="lines")
    assert "1 trial has lines that were set by hand and count as sure." in section.text
    assert "told by consensus and by hand" in section.text
    counted = [int(row.cells()[1]) for row in section.one("tbody").all("tr")]
    assert sum(counted) == len(built.trials) - 1
    assert "P33 trial 3" not in section.one("p", data_fact="lines-unsure").text


def test_trials_left_out_for_their_lines_are_named_all_the_same(
    built: Built, by_hand: Built
) -> None:
    """What the rule takes is not in the tables, but on the page: it is what can be corrected."""
    gone = built.unsure[built.unsure["line_confidence"] < 0.935]
    gone = gone[(gone["participant"].astype(str) != "P33") | (gone["trial"] != 3)]
    assert len(gone)
    named = by_hand.page.one("p", data_fact="lines-unsure").text
    for row in gone.itertuples():
        assert f"{row.participant} trial {row.trial} ({100 * row.line_confidence:.1f}%)" in named
    assert len(by_hand.trials) == len(built.trials) - len(gone)


def test_all_sure_is_said_as_good_news(passages_page: Node) -> None:
    """No alarm, no list, no drawing for its sake; the count stands there all the same."""
    headlines = passages_page.one("ul", class_="headlines").text
    assert "All 12 trials of several lines are sure of their lines." in headlines
    assert not list(passages_page.all("p", data_fact="lines-unsure"))
    assert "not sure of its lines" not in passages_page.text


@pytest.fixture(scope="module")
def passages_page(tmp_path_factory: pytest.TempPathFactory) -> Node:
    """The page of the passages sample as committed."""
    sample = Path(__file__).resolve().parents[2] / "sample_logs" / "passages" / "study.toml"
    return Built(sample, tmp_path_factory.mktemp("passages") / "out").page


def test_texts_of_one_line_have_no_such_part(page: Node) -> None:
    """Neither a section nor a headline nor a column that would be empty."""
    assert not list(page.all("section", id="lines"))
    assert not list(page.all("a", href="#lines"))
    assert not list(page.all(data_measure="lines"))


def test_nothing_is_counted_where_no_method_judges() -> None:
    """Trials whose lines a single method told have no confidence and are in no count."""
    flags = np.zeros(3, dtype=bool)
    assert tally(LineTrust(np.full(3, np.nan), flags, flags)).judged == 0
    assert tally(None).judged == 0


@pytest.mark.parametrize("confidence", [*CLASSES, 1.0])
def test_class_begins_at_its_bound(confidence: float) -> None:
    """A bound belongs to the class above; certainty to the last."""
    flags = np.zeros(1, dtype=bool)
    counted = tally(LineTrust(np.array([confidence]), flags, flags)).classes
    assert counted.index(1) == (CLASSES.index(confidence) if confidence < 1 else len(CLASSES) - 1)
