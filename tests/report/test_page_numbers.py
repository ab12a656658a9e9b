"""Every number on the page against the tables, counted anew by pandas."""

from __future__ import annotations

import pandas as pd
import pytest
from scipy import stats

from etl.readiness.intervals import wilson_interval
from tests.report.making import Made
from tests.report.reading import Node, figure

LINE_MIDDLE_PX = 530  # The orchard's only line: top 500 px, 60 px high.


def share(part: float, whole: float) -> str:
    """A share as the page writes it."""
    return f"{100 * part / whole:.1f}%"


def shown(value: float, unit: str, *, signed: bool = False) -> str:
    """A number with a place after the point and its unit, as the page writes it."""
    text = f"{round(value, 1) + 0.0:{'+' if signed else ''},.1f} {unit}"
    return text.replace("-", "−")


def head_of(table: Node) -> list[str]:
    """The words of a table's last row of heads."""
    return list(table.one("thead").all("tr"))[-1].cells()


def test_balances_are_those_of_the_tables(page: Node, made: Made) -> None:
    """The four big figures count kept and lost trials and fixations of the study."""
    fixations = made.frames["fixations"]
    lost = fixations["left_out_by"].notna() & (fixations["left_out_by"] != "skip")
    expected = {
        "trials-kept": len(made.frames["trials"]),
        "trials-lost": int((made.recorded["rule"] != "").sum()),
        "fixations-kept": int(fixations["kept"].sum()),
        "fixations-lost": int(lost.sum()),
    }
    found = {key: figure(page.one("strong", data_fact=key).text) for key in expected}
    assert found == expected


def test_lead_counts_what_was_read(page: Node, made: Made) -> None:
    """The first sentences count readers, trials and fixations read and kept."""
    fixations = made.frames["fixations"]
    trials = fixations.groupby(["participant", "trial"], observed=True).ngroups
    skipped = trials - len(made.recorded)
    assert page.one("p", class_="lead").text == (
        f"{fixations['participant'].nunique()} readers read {trials:,} trials with "
        f"{len(fixations):,} fixations. The tables rest on {len(made.frames['trials']):,} trials "
        f"and {fixations['kept'].sum():,} fixations. {skipped:,} trials are no part of the study."
    )


def test_rules_are_charged_as_in_the_tables(page: Node, made: Made) -> None:
    """What each rule left out is what left_out_by says."""
    fixations = made.frames["fixations"]
    skipped = fixations.query("left_out_by == 'skip'").groupby(["participant", "trial"])
    trials = made.recorded["rule"].value_counts().to_dict() | {"skip": skipped.ngroups}
    of_fixations = fixations["left_out_by"].value_counts()
    rows = {row.attributes["data-rule"]: row.cells()[-2:] for row in page.all("tr", data_rule=None)}
    assert rows.keys() == set(of_fixations.index)
    for rule, (one, other) in rows.items():
        assert (figure(one), figure(other)) == (trials.get(rule, 0), of_fixations[rule]), rule


def test_loss_of_each_reader_is_that_of_the_tables(page: Node, made: Made) -> None:
    """Behind each bar stand kept and read trials, and how many each rule took."""
    for row in page.one("ul", class_="reader-bars").all("li"):
        own = made.recorded.query("participant == @row.attributes['data-reader']")
        lost = own.query("rule != ''")["rule"].value_counts()
        words = row.one("span", class_="what").text
        assert words.startswith(f"{len(own) - lost.sum()} of {len(own)}")
        assert all(f"{count} {rule}" in words for rule, count in lost.items())
        assert ("1 not recorded" in words) == (row.attributes["data-reader"] == "P11")


def test_squares_of_each_reader_are_trials(page: Node, made: Made) -> None:
    """A bar is as many squares of 9 px long as the reader has trials, kept and lost apart."""
    for row in page.one("ul", class_="reader-bars").all("li"):
        own = made.recorded.query("participant == @row.attributes['data-reader']")
        widths = {r.attributes["class"]: r.attributes["width"] for r in row.all("rect")}
        absent = widths.pop("unit-absent", "0")
        assert int(widths.pop("unit-kept", 0)) == 9 * (own["rule"] == "").sum()
        assert sum(map(int, widths.values())) == 9 * (own["rule"] != "").sum()
        assert int(absent) == (9 if row.attributes["data-reader"] == "P11" else 0)


def test_loss_by_condition_is_that_of_the_tables(page: Node, made: Made) -> None:
    """Share, lost and read of each level, and Fisher's p by scipy."""
    for factor in made.factors:
        figure_ = page.one("figure", data_factor=factor)
        table = pd.crosstab(made.recorded[factor], made.recorded["rule"] != "")
        for row in figure_.all("li", data_level=None):
            kept, lost = table.loc[row.attributes["data-level"]]
            words = row.one("span", class_="what").text
            assert words.startswith(share(lost, kept + lost))
            assert f"{lost} of {kept + lost} lost" in words
        p = stats.fisher_exact(table.to_numpy()).pvalue
        told = f"p = {p:.3f}".replace("0.", ".", 1).replace("1.000", "1") if p >= 0.001 else "p < "
        assert told in figure_.one("figcaption").text
        assert ("This can bias the result" in figure_.text) == (p < 0.05)


def test_sample_has_loss_that_differs_and_loss_that_does_not(page: Node) -> None:
    """So that the check above has seen both."""
    assert 0 < len(list(page.all("p", class_="differs-note"))) < 3


def expected_readers(made: Made) -> pd.DataFrame:
    """What the table of readers says of each, by pandas alone."""
    fixations = made.frames["fixations"].query("kept == 1")
    by = fixations.groupby("participant", observed=True)
    outcomes = made.frames["outcomes"].query("measure == 'first_pass_skip'")
    inside = fixations.dropna(subset=["region_order"])
    same = inside["trial"].eq(inside["trial"].shift()) & inside["participant"].eq(
        inside["participant"].shift()
    )
    step = inside["region_order"].diff().where(same)
    moved = inside.assign(back=step < 0, moved=step.fillna(0) != 0)
    moves = moved.groupby("participant", observed=True)[["back", "moved"]].sum()
    height = fixations.assign(below=fixations["y_px"] - LINE_MIDDLE_PX)
    out = pd.DataFrame(
        {
            "duration": by["duration_ms"].mean(),
            "spread": by["duration_ms"].std(),
            "regressions": 100 * moves["back"] / moves["moved"],
            "skips": 100 * outcomes.groupby("participant", observed=True)["value"].mean(),
            "outside": 100 * by["region_order"].apply(lambda own: own.isna().mean()),
            "height": height.groupby("participant", observed=True)["below"].median(),
        }
    )
    lost = made.recorded.assign(lost=made.recorded["rule"] != "")
    out["lost"] = 100 * lost.groupby("participant", observed=True)["lost"].mean()
    drift = {}
    for who, own in height.groupby("participant", observed=True):
        trials = own.groupby("trial", observed=True)["source_line"].min().sort_values().index
        third = len(trials) // 3
        first, last = trials[:third], trials[-third:]
        below = own.set_index("trial")["below"]
        drift[who] = below.loc[last].median() - below.loc[first].median()
    out["drift"] = pd.Series(drift)
    return out


def test_table_of_readers_is_that_of_the_tables(page: Node, made: Made) -> None:
    """Every value of every reader, as words and as what the column is sorted by."""
    expected = expected_readers(made)
    table = page.one("table", id="reader-table")
    keys = [th.attributes["data-measure"] for th in table.all("th", data_measure=None)]
    assert sorted(keys) == sorted(expected.columns)
    units = {"duration": "ms", "spread": "ms", "height": "px", "drift": "px"}
    rows = list(table.all("tr", data_reader=None))
    assert len(rows) == len(made.participants)
    for row in rows:
        who = row.attributes["data-reader"]
        cells = list(row.all("td", data_value=None))[1:]
        for key, cell in zip(keys, cells, strict=True):
            if who not in expected.index:
                assert (cell.text, cell.attributes["data-value"]) == ("–", "")
                continue
            value = expected.loc[who, key]
            unit = units.get(key, "")
            signed = unit == "px"
            words = shown(value, unit, signed=signed) if unit else f"{value:.1f}%"
            assert cell.text.removeprefix("◆ ") == words, (who, key)
            assert float(cell.attributes["data-value"]) == pytest.approx(value, rel=1e-5, abs=1e-9)


def test_marked_readers_are_those_far_from_the_median(page: Node, made: Made) -> None:
    """◆ stands where a value is farther than 3 scaled deviations from the median, nowhere else."""
    expected = expected_readers(made)
    table = page.one("table", id="reader-table")
    keys = [th.attributes["data-measure"] for th in table.all("th", data_measure=None)]
    far = (expected - expected.median()).abs() > 3 * 1.4826 * (
        (expected - expected.median()).abs().median()
    )
    marked = {
        (row.attributes["data-reader"], key)
        for row in table.all("tr", data_reader=None)
        for key, cell in zip(keys, list(row.all("td", data_value=None))[1:], strict=True)
        if cell.text.startswith("◆")
    }
    assert marked == {(who, key) for key in keys for who in expected.index[far[key]]}
    assert marked
    for who in {who for who, _ in marked}:
        assert f"{who}: " in page.one("ul", class_="headlines").text


def test_strips_show_the_median_and_all_readers(page: Node, made: Made) -> None:
    """A dot a reader, and the median in words."""
    expected = expected_readers(made)
    for strip in page.all("figure", data_measure=None):
        values = expected[strip.attributes["data-measure"]]
        dots = list(strip.all("circle", class_="reader")) + list(
            strip.all("use", class_="stands-out")
        )
        assert len(dots) == len(values)
        told = strip.one("strong", data_fact="median").text
        number = float(told.split()[0].rstrip("%").replace("−", "-"))
        assert number == pytest.approx(values.median(), abs=0.0501)


def test_readers_within_published_ranges_are_counted(page: Node, made: Made) -> None:
    """Of mean durations and regressions, those within 200 to 250 ms and 10 to 15 %."""
    expected = expected_readers(made)
    for key, low, high in (("duration", 200, 250), ("regressions", 10, 15)):
        within = expected[key].between(low, high).sum()
        words = page.one("figure", data_measure=key).one("p", class_="strip-words").text
        assert f"{within} of {len(expected)} readers within" in words
        assert "doi:10.1037/0033-2909.124.3.372" in words


@pytest.mark.parametrize("combined", [False, True], ids=["by level", "by combination"])
def test_rates_are_those_of_the_tables(page: Node, made: Made, *, combined: bool) -> None:
    """Share, number of values and interval of every outcome, region and condition."""
    binary = made.frames["outcomes"].query("kind == 'binary'").dropna(subset=["value"])
    checked = 0
    for section in page.all("section", data_outcome=None):
        own = binary[binary["measure"] == section.attributes["data-outcome"]]
        kind = "rates combined" if combined else "rates"
        for row in section.one("table", class_=kind).all("tr", data_region=None):
            here = own[own["region"] == row.attributes["data-region"]]
            if combined:
                names = here[list(made.factors)].astype(str).agg(" · ".join, axis=1)
                levels = head_of(section.one("table", class_=kind))[1:]
                groups = [here[names == level] for level in levels]
            else:
                groups = [here[here[f] == v] for f, levels in made.factors.items() for v in levels]
            for cell, group in zip(row.all("td"), groups, strict=True):
                if group.empty:
                    assert cell.text == "–"
                    continue
                ones, n = int(group["value"].sum()), len(group)
                low, high = wilson_interval(ones, n)
                assert cell.text == f"{share(ones, n)} of {n}{100 * low:.1f}–{100 * high:.1f}"
                checked += 1
    assert checked > 200


def test_drawn_rates_stand_where_the_numbers_say(page: Node) -> None:
    """Markers of one outcome lie on one line with their rates: the same scale for all."""
    section = page.one("section", data_outcome="first_pass_regression_out")
    rates = [
        int(c.attributes["data-ones"]) / int(c.attributes["data-n"])
        for row in section.one("table", class_="rates").all("tr", data_region=None)
        for c in row.all("td")
        if c.attributes["data-n"] != "0"
    ]
    places = [
        float(use.attributes["x"].rstrip("%"))
        for drawing in section.all("svg", class_="estimates")
        for use in drawing.all("use")
    ]
    assert len(places) == len(rates)
    assert stats.linregress(rates, places).rvalue == pytest.approx(1, abs=1e-6)


def test_missing_values_are_those_of_the_tables(page: Node, made: Made) -> None:
    """Values and reasons of every outcome."""
    outcomes = made.frames["outcomes"]
    table = page.one("table", class_="missing")
    reasons = ["", *head_of(table)[2:]]
    theirs = pd.crosstab(
        outcomes["measure"].astype(str), outcomes["missing"].astype(object).fillna("")
    )
    assert set(theirs.columns) == set(reasons)
    rows = {r.attributes["data-outcome"]: r.cells()[1:] for r in table.all("tr", data_outcome=None)}
    assert {name: [figure(c) for c in cells] for name, cells in rows.items()} == {
        name: theirs.loc[name, reasons].tolist() for name in theirs.index
    }


@pytest.mark.parametrize("unit", ["trials", "fixations"])
def test_accounts_are_those_of_the_tables(page: Node, made: Made, unit: str) -> None:
    """Each row holds what left_out_by says, and balances; so does the sum."""
    table = page.one("table", data_unit=unit)
    rules = head_of(table)[2:-1]
    for row in table.all("tr", data_reader=None):
        who = row.attributes["data-reader"]
        fixations = made.of("fixations", who)
        if unit == "trials":
            left = made.recorded.query("participant == @who")["rule"].value_counts().to_dict()
            left["skip"] = fixations.query("left_out_by == 'skip'")["trial"].nunique()
            read = fixations["trial"].nunique()
        else:
            left, read = fixations["left_out_by"].value_counts().to_dict(), len(fixations)
        figures = [figure(text) for text in row.cells()[1:]]
        assert figures[0] == read
        assert figures[1:-1] == [left.get(rule, 0) for rule in rules]
        assert figures[0] == sum(figures[1:])
    rows = [[figure(t) for t in r.cells()[1:]] for r in table.all("tr", data_reader=None)]
    total = [figure(text) for text in table.one("tfoot").one("tr").cells()[1:]]
    assert total == [sum(column) for column in zip(*rows, strict=True)]
