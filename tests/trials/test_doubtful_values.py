"""Values that occur nowhere, ids that are nearly equal, levels and covariates, order of logs."""

from __future__ import annotations

import os
import unicodedata
from collections.abc import Mapping
from pathlib import Path

import pytest

import etl
from etl.errors import DataError, Findings
from etl.session.log_files import find_logs
from etl.trials import FactTable
from tests.trials.test_facts_of_trials import LOG, REGIONS, STUDY, build, facts_of

ONE = "reader\ttrial\tsentence\tmood\tstart\tdur\tx\ty\n"


def log_of(*readers: str, moods: tuple[str, ...] = ("calm",)) -> str:
    """A log of some readers with a trial for each mood."""
    rows = [
        f"{reader}\t{trial}\tpear\t{mood}\t{trial}000\t200\t50\t25\n"
        for reader in readers
        for trial, mood in enumerate(moods, start=1)
    ]
    return ONE + "".join(rows)


def warnings_of(result: etl.Result) -> list[str]:
    """The warnings of a build; the study file is named as it was opened."""
    return [
        line.replace(str(result.folder.parent) + os.sep, "")
        for line in result.findings.lines(["warning"])
    ]


def test_value_to_skip_by_that_occurs_nowhere_is_warned_of(tmp_path: Path) -> None:
    """A slip in ``skip`` would leave practice trials in the study."""
    result = build(tmp_path, '\n[trials]\nskip = { mood = ["clam", "tense"] }\n')
    assert warnings_of(result) == [
        (
            'warning: study.toml:18: trials.skip.mood: no trial has this value; found "clam", '
            'expected one of calm, tense\n    fix: did you mean "calm"?'
        )
    ]
    assert result.counts["trials skipped"] == 1


def test_value_to_skip_by_of_a_trial_that_was_not_recorded_is_known(tmp_path: Path) -> None:
    """A value that the trial list has is no slip, though no log has the trial."""
    study = '\n[trials]\ntable = "list.csv"\nskip = { part = ["practice"] }\n'
    trials = "participant,trial,part\nP01,1,main\nP01,2,main\nP01,3,practice\n"
    assert warnings_of(build(tmp_path, study, {"list.csv": trials})) == []


def test_skip_compares_composed_and_trimmed(tmp_path: Path) -> None:
    """Blanks, and the way in which letters are composed, make no difference."""
    log = LOG.replace("tense", "\u00fcbung")
    study = (
        f'\n[trials]\nskip = {{ mood = ["{unicodedata.normalize("NFD", "Übung".lower())} "] }}\n'
    )
    result = build(tmp_path, study, {"logs/P01.tsv": log})
    assert (result.counts["trials skipped"], warnings_of(result)) == (1, [])


def test_levels_are_composed(tmp_path: Path) -> None:
    """A level is found whatever form the study file writes."""
    apart = unicodedata.normalize("NFD", "m\u00fcd")
    study = f'\n[trials]\nfactors = ["mood"]\nlevels = {{ mood = ["{apart}", "calm"] }}\n'
    build(tmp_path, study, {"logs/P01.tsv": LOG.replace("tense", "m\u00fcd")})
    assert facts_of(tmp_path, "mood") == {"1": ("calm",), "2": ("m\u00fcd",)}


def test_value_asked_for_that_no_log_has_is_warned_of(tmp_path: Path) -> None:
    """Of several values in ``where``, one that no log has is named with its nearest."""
    where = '[logs.where]\nmood = ["calm", "tens"]\n\n[regions]'
    result = build(tmp_path, "", {"study.toml": STUDY.replace("[regions]", where)})
    assert warnings_of(result) == [
        (
            'warning: study.toml:14: logs.where.mood: no log has this value; found "tens", '
            'expected one of calm, tense\n    fix: did you mean "tense"?'
        )
    ]


def test_value_asked_for_may_be_in_one_log_only(tmp_path: Path) -> None:
    """Readers may differ in what their logs hold."""
    where = '[logs.where]\nmood = ["calm", "tense"]\n\n[regions]'
    files = {
        "study.toml": STUDY.replace("[regions]", where),
        "logs/P01.tsv": log_of("P01"),
        "logs/P02.tsv": log_of("P02", moods=("tense",)),
    }
    assert warnings_of(build(tmp_path, "", files)) == []


@pytest.mark.parametrize(("one", "other"), [("P01", "p01"), ("7", "007"), ("P1", "P01")])
def test_readers_that_are_nearly_equal_are_warned_of(tmp_path: Path, one: str, other: str) -> None:
    """Ids that differ in letter case or leading zeros only are often one reader."""
    files = {"logs/P01.tsv": log_of(one), "logs/P02.tsv": log_of(other)}
    assert warnings_of(build(tmp_path, "", files)) == [
        (
            "warning: logs/P02.tsv:2: two readers' ids differ in letter case or leading zeros "
            f'only; found "{other}", expected "{one}" as in logs/P01.tsv:2, if this is '
            "the same reader"
        )
    ]


@pytest.mark.parametrize(
    ("one", "other"), [("P10", "P1"), ("10", "100"), ("0", "00a"), ("P01", "R01")]
)
def test_readers_that_differ_are_not_warned_of(tmp_path: Path, one: str, other: str) -> None:
    """Zeros at other places are digits like others."""
    files = {"logs/P01.tsv": log_of(one), "logs/P02.tsv": log_of(other)}
    assert warnings_of(build(tmp_path, "", files)) == []


#: Cells of a covariate, its values in the tables, and the cell that a note names.
COVARIATES: Mapping[str, tuple[tuple[str, ...], tuple[object, ...], str | None]] = {
    "numbers": (("21", "1e1", "NA"), (21.0, 10.0, None), None),
    "digits with an underscore": (("1_0", "2", "3"), ("1_0", "2", "3"), "1_0"),
    "a decimal comma": (("2", "3,5", "NA"), ("2", "3,5", None), "3,5"),
    "leading zeros": (("007", "008", "9"), ("007", "008", "9"), None),
    "a zero and less than one": (("0", "0.5", "-0.5"), (0.0, 0.5, -0.5), None),
    "words": (("a", "b", "nan"), ("a", "b", "nan"), None),
}


@pytest.mark.parametrize("case", COVARIATES)
def test_covariate_is_a_number_by_the_grammar_of_numbers(tmp_path: Path, case: str) -> None:
    """A column of numbers is one only where a log's column would be; a mixture is noted."""
    cells, values, noted = COVARIATES[case]
    study = '\n[trials]\ncovariates = ["mood"]\n'
    result = build(tmp_path, study, {"logs/P01.tsv": log_of("P01", moods=cells)})
    assert tuple(value for (value,) in facts_of(tmp_path, "mood").values()) == values
    notes = result.findings.of("note")
    line = None if noted is None else cells.index(noted) + 2
    assert [(note.path, note.line, note.found) for note in notes] == (
        [] if noted is None else [("logs/P01.tsv", line, noted)]
    )


def test_levels_that_are_whole_numbers_are_sorted_as_such(tmp_path: Path) -> None:
    """Without a list in the study file, 2 comes before 10."""
    log = log_of("P01", moods=("10", "1", "2"))
    result = build(tmp_path, '\n[trials]\nfactors = ["mood"]\n', {"logs/P01.tsv": log})
    assert result.trials.mood.cat.categories.tolist() == ["1", "2", "10"]


def test_unlisted_level_is_told_once_for_each_cell(tmp_path: Path) -> None:
    """Every cell is counted, the first few are spelled out; equal lines of two logs are two."""
    study = '\n[trials]\nfactors = ["mood"]\nlevels = { mood = ["calm", "tense"] }\n'
    moods = ("calmer",) * 7
    files = {"logs/P01.tsv": log_of("P01", moods=moods), "logs/P02.tsv": log_of("P02", moods=moods)}
    with pytest.raises(DataError) as caught:
        build(tmp_path, study, files)
    findings = caught.value.findings
    assert findings.count("error") == 14
    assert [(f.path, f.line) for f in findings.of("error")] == [
        (f"logs/P0{reader}.tsv", line) for reader in (1, 2) for line in range(2, 7)
    ]


def test_unlisted_levels_are_looked_up_at_once(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """However many cells are wrong, the table is searched once for all of them."""
    searched: list[int] = []
    plain = FactTable.find

    def counted(self: FactTable, known: Mapping[str, object]) -> object:
        searched.append(1)
        return plain(self, known)  # type: ignore[arg-type]

    monkeypatch.setattr(FactTable, "find", counted)
    trials = "participant,trial,cue\n" + "".join(f"P01,{n},erly\n" for n in range(1, 31))
    study = '\n[trials]\ntable = "list.csv"\nfactors = ["cue"]\nlevels = { cue = ["early"] }\n'
    log = log_of("P01", moods=("calm",) * 30)
    with pytest.raises(DataError, match="has a level that is not listed"):
        build(tmp_path, study, {"list.csv": trials, "logs/P01.tsv": log})
    assert len(searched) == 2


def test_fact_of_the_region_file_is_missed_there(tmp_path: Path) -> None:
    """Where a text's own fact is a missing mark, the region file is named."""
    regions = REGIONS.replace("bottom\n", "bottom,length\n").replace("50\n", "50,NA\n", 1)
    regions = regions.removesuffix("\n") + ",long\n"
    with pytest.raises(DataError) as caught:
        build(tmp_path, '\n[trials]\nfactors = ["length"]\n', {"regions.csv": regions})
    assert [(f.problem, f.path, f.line) for f in caught.value.findings.of("error")] == [
        ("the factor length has no value", "regions.csv", 2),
    ]


def test_keys_of_the_region_file_are_composed(tmp_path: Path) -> None:
    """A text is found whatever form the region file writes."""
    apart = unicodedata.normalize("NFD", "p\u00e4r")
    build(
        tmp_path,
        "",
        {
            "logs/P01.tsv": LOG.replace("pear", "p\u00e4r"),
            "regions.csv": REGIONS.replace("pear", apart),
        },
    )
    assert set(facts_of(tmp_path, "item").values()) == {("p\u00e4r",), ("plum",)}


def logs_found(folder: Path, names: list[str], patterns: list[str]) -> list[str]:
    """The logs that patterns find among some files."""
    for name in names:
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        (folder / name).write_text(LOG, encoding="utf-8")
    text = STUDY.replace('["logs/*.tsv"]', "[" + ", ".join(f'"{p}"' for p in patterns) + "]")
    (folder / "study.toml").write_text(text, encoding="utf-8")
    findings = Findings()
    logs = find_logs(etl.load_study(folder / "study.toml"), findings)
    assert not findings.failed, findings.text()
    return [shown for _, shown in logs]


def test_logs_are_read_in_the_order_of_their_numbers(tmp_path: Path) -> None:
    """The second part of a session comes before the tenth."""
    names = ["logs/P2_1.tsv", "logs/P01_10.tsv", "logs/P01_2.tsv", "logs/P01.tsv", "logs/P1_3.tsv"]
    assert logs_found(tmp_path, names, ["logs/*.tsv"]) == [
        "logs/P01.tsv",
        "logs/P01_2.tsv",
        "logs/P1_3.tsv",
        "logs/P01_10.tsv",
        "logs/P2_1.tsv",
    ]


def test_recordings_follow_the_numbers_of_the_logs(tmp_path: Path) -> None:
    """The first recording is that of part 2, not of part 10."""
    files = {"logs/P01.tsv": None, "logs/P01_10.tsv": LOG, "logs/P01_2.tsv": LOG}
    build(tmp_path, '\n[trials]\nrepeated = "first"\n', files)
    kept = facts_of(tmp_path, "source_file", "kept", table="fixations")
    assert kept["1"] == ("logs/P01_10.tsv", 0)


def test_log_that_two_spellings_name_is_read_once(tmp_path: Path) -> None:
    """Where the disk ignores case, two patterns may give one file under two names."""
    (tmp_path / "logs").mkdir()
    (tmp_path / "logs" / "P01.tsv").write_text(LOG, encoding="utf-8")
    try:
        os.link(tmp_path / "logs" / "P01.tsv", tmp_path / "logs" / "P01.TSV")
    except FileExistsError:
        pass  # the disk ignores case
    except OSError:
        pytest.skip("this disk has no links, which stand for a disk that ignores case")
    assert len(logs_found(tmp_path, [], ["logs/*.tsv", "logs/*.TSV", "logs/P01.TSV"])) == 1
