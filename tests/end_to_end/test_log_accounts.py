"""Where every line of every log went: log_accounts.csv, the run record, the page, and what is told.

The lines are counted here once more, from the files themselves.
"""

from __future__ import annotations

import csv
import json
from collections import defaultdict
from pathlib import Path

import pytest

import etl
from etl.errors import FaultError
from etl.export.log_accounts import COLUMNS, Counted, LogAccount, log_account_rows
from tests.end_to_end.building import Sample, build
from tests.end_to_end.many_logs import Row, make, name_of, rows_of_log, text_of
from tests.report.reading import read

Account = dict[tuple[str, str], tuple[int, str]]


def accounts_of(folder: Path) -> dict[str, Account]:
    """The accounts of the logs: count and first line by log, unit and what."""
    accounts: dict[str, Account] = defaultdict(dict)
    with (folder / "log_accounts.csv").open(encoding="utf-8", newline="") as file:
        reader = csv.DictReader(file)
        assert reader.fieldnames == list(COLUMNS)
        for row in reader:
            key = row["unit"], row["what"]
            assert key not in accounts[row["source_file"]]
            accounts[row["source_file"]][key] = int(row["count"]), row["first_line"]
    return accounts


def record_of(folder: Path) -> dict[str, object]:
    """The run record."""
    record: dict[str, object] = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    return record


def messy_text(number: int = 3) -> str:
    """A log with remarks, a blank line, and a single quote mark in a cell that is not doubled."""
    lines = text_of(rows_of_log(number)).splitlines()
    lines[4] = lines[4].removesuffix("one") + '"""'
    lines[9] = lines[9].removesuffix("one") + '"""'
    return "\n".join(["# recorded again", "# on Friday", *lines[:30], "", *lines[30:], ""])


@pytest.fixture
def messy(tmp_path: Path) -> etl.Result:
    """A build of twelve logs, the third of which is messy."""
    study_file = make(tmp_path)
    (tmp_path / name_of(3)).write_text(messy_text(), encoding="utf-8", newline="\n")
    return build(study_file)


def test_every_line_is_accounted_for_once(sample: Sample) -> None:
    """For each log of the samples the fates of its lines add up to all lines."""
    accounts = accounts_of(sample.result.folder)
    logs = {str(file) for file in sample.result.fixations["source_file"].unique()}
    assert accounts.keys() == logs
    for account in accounts.values():
        lines = {what: count for (unit, what), (count, _) in account.items() if unit == "lines"}
        assert lines.pop("all lines") == sum(lines.values())


def test_all_lines_are_those_of_the_file(messy: etl.Result) -> None:
    """A log has as many lines as its text, headers, remarks and blank lines included."""
    for name, account in accounts_of(messy.folder).items():
        text = (messy.folder.parent / name).read_text(encoding="utf-8")
        assert account["lines", "all lines"] == (text.count("\n"), "1")


def test_fixations_of_the_accounts_are_those_of_the_table(messy: etl.Result) -> None:
    """A line that holds a fixation is a row of the table of fixations."""
    rows = messy.fixations.groupby("source_file", observed=True)["source_line"]
    for name, account in accounts_of(messy.folder).items():
        lines = rows.get_group(name)
        assert account["lines", "fixations"] == (len(lines), str(lines.min()))


def test_fates_and_repairs_are_told_with_their_first_line(messy: etl.Result) -> None:
    """Remarks, header, blank lines, fixations, and the cells that were mended."""
    assert accounts_of(messy.folder)[name_of(3)] == {
        ("lines", "all lines"): (64, "1"),
        ("lines", "remarks"): (2, "1"),
        ("lines", "header"): (1, "3"),
        ("lines", "blank lines"): (1, "33"),
        ("lines", "fixations"): (60, "4"),
        ("repairs", "quote marks that were not doubled"): (2, "7"),
    }


def test_run_record_has_the_accounts_of_each_log_and_of_all(messy: etl.Result) -> None:
    """What the table has stands in the run record too, with totals among its counts."""
    record = record_of(messy.folder)
    inputs, counts = record["inputs"], record["counts"]
    assert isinstance(inputs, list)
    assert isinstance(counts, dict)
    totals: dict[str, int] = defaultdict(int)
    for name, account in accounts_of(messy.folder).items():
        (own,) = (one for one in inputs if one["file"] == name)
        for unit in ("lines", "repairs"):
            told = {what: n for (u, what), (n, _) in account.items() if u == unit}
            totals["log lines"] += told.pop("all lines", 0)
            assert own[unit] == told
            for what, count in told.items():
                totals[f"log {unit}: {what}"] += count
    assert totals == {n: c for n, c in counts.items() if n.startswith(("log lines", "log repairs"))}
    assert totals["log repairs: quote marks that were not doubled"] == 2


def test_repairs_are_told_with_file_and_line(messy: etl.Result) -> None:
    """A log that was mended is named, with how often and where first."""
    said = [finding.text() for finding in messy.findings]
    assert f"note: {name_of(3)}:7: mended 2 times: quote marks that were not doubled" in said


def test_repairs_of_many_logs_are_told_at_once(tmp_path: Path) -> None:
    """One note for each kind of repair names all logs, each with its count."""
    study_file = make(tmp_path, 20)
    for number in range(1, 16):
        (tmp_path / name_of(number)).write_text(messy_text(number), encoding="utf-8", newline="\n")
    (told,) = (f for f in build(study_file).findings if "mended" in f.problem)
    assert told.problem == ("mended 30 times, in 15 of 20 logs: quote marks that were not doubled")
    assert told.files == tuple(f"{name_of(number)} (2)" for number in range(1, 16))


def test_lines_set_aside_are_told_in_one_note(messy: etl.Result) -> None:
    """Over all logs, how many lines of which kinds hold no fixation."""
    said = [finding.text() for finding in messy.findings]
    assert (
        "note: set aside, of 735 lines in 12 logs: 2 remarks; log_accounts.csv counts them log "
        "by log"
    ) in said


def test_rows_not_asked_for_are_accounted_for(orchard: Sample) -> None:
    """The orchard's P07 was recorded with both eyes; rows of the left one are no fixations."""
    accounts = accounts_of(orchard.result.folder)
    other = {name for name, one in accounts.items() if ("lines", "rows not asked for") in one}
    assert other == {"logs/P07.tsv"}
    text = (orchard.folder / "logs" / "P07.tsv").read_text(encoding="utf-8")
    eye = text.splitlines()[0].split("\t").index("eye")
    left = [n for n, line in enumerate(text.splitlines(), 1) if line.split("\t")[eye] == "L"]
    own = accounts["logs/P07.tsv"]
    assert own["lines", "rows not asked for"] == (len(left), str(left[0]))


def test_workers_change_no_byte_of_the_accounts(tmp_path: Path) -> None:
    """Two processes count what one counts, in the same order."""
    study_file = make(tmp_path)
    (tmp_path / name_of(3)).write_text(messy_text(), encoding="utf-8", newline="\n")
    one = build(study_file, tmp_path / "one")
    two = build(study_file, tmp_path / "two", workers=2)
    for name in ("log_accounts.csv", "audit.html"):
        assert (one.folder / name).read_bytes() == (two.folder / name).read_bytes()


def test_page_tells_of_the_logs(messy: etl.Result) -> None:
    """The page has a row for each fate with its lines and logs, and every difference and repair."""
    page = read((messy.folder / "audit.html").read_text(encoding="utf-8"))
    part = page.one("section", id="logs")
    fates = {
        node.attributes["data-fate"]: [cell.text for cell in node.all("td")]
        for node in part.all("tr", data_fate=None)
    }
    assert fates == {
        "header": ["12", "12"],
        "fixations": ["720", "12"],
        "remarks": ["2", "1"],
        "blank lines": ["1", "1"],
    }
    matters = [" ".join(node.text.split()) for node in part.all("li")]
    assert matters == [
        (
            "Differs the log holds 2 lines of a kind that 11 of 12 logs do not: remarks "
            f"{name_of(3)}"
        ),
        f"Mended 2 times: quote marks that were not doubled {name_of(3)}",
    ]
    assert "1 of 12 logs differs from the rest" in part.one("h2").text


def few_trials(rows: list[Row]) -> None:
    """Leave two trials."""
    rows[:] = [row for row in rows if int(row["trial"]) <= 2]


def test_page_names_all_logs_of_a_long_list(tmp_path: Path) -> None:
    """A long list is folded away but whole; a doubtful difference is among the headlines."""
    odd = range(1, 13)
    folder = build(make(tmp_path, 40, dict.fromkeys(odd, few_trials))).folder
    page = read((folder / "audit.html").read_text(encoding="utf-8"))
    details = page.one("section", id="logs").one("details")
    assert details.one("summary").text == "All 12 logs"
    assert all(f"{name_of(number)} (2)" in details.text for number in odd)
    (headline,) = (n for n in page.all("li") if "Logs differ" in n.text)
    assert "in 12 of 40 logs" not in headline.text
    assert "12 of 40 logs hold far fewer trials a reader than the rest" in headline.text


def test_account_that_does_not_balance_is_a_fault() -> None:
    """Lines that went nowhere are a fault of the program, told with the log's name."""
    lines = (Counted("header", 1, 1), Counted("fixations", 7, 2))
    with pytest.raises(FaultError, match=r"account of a\.tsv does not balance: it has 9 lines, "):
        log_account_rows([LogAccount("a.tsv", 9, lines, ())])


def test_accounts_that_do_not_balance_are_not_published(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A build with such a fault leaves no folder."""
    monkeypatch.setattr("etl.files.tally.FileAccount.move", lambda *_: None)
    monkeypatch.setattr("etl.files.tally.FileAccount.line", lambda *_: None)
    with pytest.raises(FaultError, match="does not balance"):
        build(make(tmp_path))
    assert not (tmp_path / "out").exists()
