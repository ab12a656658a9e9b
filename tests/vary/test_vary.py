"""The command as a whole: nothing parsed twice, the same bytes, all or nothing, no id."""

from __future__ import annotations

import csv
import json
import math
import tomllib
from pathlib import Path

import pandas as pd
import pyarrow.parquet as pq
import pytest
from click.testing import CliRunner

import etl
from etl.cli import main
from etl.parsers.table_log import TableReader
from etl.session import variant_run
from tests.end_to_end.building import files_of, tables_of
from tests.pseudonyms.named_study import DISTINCTIVE, write_study
from tests.pseudonyms.searching import found_in
from tests.simulator import write_bulk_study
from tests.vary.labelled import BY_HAND, STUDY, labelled_study
from tests.vary.otherwise import as_toml, few_readers

SEVERAL = """\
[screening.fixations]
under_ms = [80, 100, false]
over_ms = [false, 400]
[screening.trials]
fewest_fixations = [false, 6]
[regions]
tolerance_px = [0, 30]
[measures]
outside = ["ignore", "interrupt"]
"""


@pytest.fixture
def bulk(tmp_path: Path) -> tuple[Path, Path]:
    """A study of nine readers, and a variants file beside it."""
    made = write_bulk_study(tmp_path / "lab", readers=9, trials=6, fixations=12, regions=4)
    data = tomllib.loads(made.study_file.read_text(encoding="utf-8"))
    data.setdefault("screening", {}).setdefault("fixations", {})["under_ms"] = 80
    made.study_file.write_text(as_toml(data), encoding="utf-8", newline="\n")
    variants = made.study_file.with_name("variants.toml")
    variants.write_text(SEVERAL, encoding="utf-8", newline="\n")
    return made.study_file, variants


def test_same_bytes_with_any_number_of_workers(
    bulk: tuple[Path, Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One process, or three, or none but this: every file but the record is the same."""
    monkeypatch.setattr(variant_run, "STATES_AT_ONCE", 12_000)
    study, variants = bulk
    folders = []
    for workers in (1, 3):
        folders.append(tmp_path / f"workers {workers}")
        etl.vary(etl.load_study(study), variants, into=folders[-1], workers=workers)
    one, three = (tables_of(folder) for folder in folders)
    assert {"rates.parquet", "changed_cells.parquet", "variants.html"} <= set(one)
    assert one == three


def test_groups_of_readers_add_up(
    bulk: tuple[Path, Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whether readers are worked on one by one or all at once, every row is the same."""
    study, variants = bulk
    every = etl.vary(etl.load_study(study), variants, into=tmp_path / "all")
    monkeypatch.setattr(variant_run, "STATES_AT_ONCE", 1)
    single = etl.vary(etl.load_study(study), variants, into=tmp_path / "single")
    for name in every.rows:
        pd.testing.assert_frame_equal(every.table(name), single.table(name))
    names = ("variants.html", "for_paper.txt", "codebook.csv")
    assert all(
        (every.folder / name).read_bytes() == (single.folder / name).read_bytes() for name in names
    )


def test_logs_that_a_build_has_kept_are_not_parsed_again(
    bulk: tuple[Path, Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """After a build no log is parsed; what it kept stays where it was; the output is the same."""
    study, variants = bulk
    before = etl.vary(etl.load_study(study), variants, into=tmp_path / "before")
    etl.build(etl.load_study(study))
    kept = files_of(study.with_name("out.kept"))

    def no_parsing(*_: object) -> None:
        raise AssertionError("a log is parsed again")

    monkeypatch.setattr(TableReader, "read", no_parsing)
    after = etl.vary(etl.load_study(study), variants, into=tmp_path / "after")
    assert tables_of(before.folder) == tables_of(after.folder)
    assert files_of(study.with_name("out.kept")) == kept


def test_each_log_is_parsed_once_for_all_variants(
    bulk: tuple[Path, Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Without a build before, too."""
    parsed: list[str] = []
    real = TableReader.read

    def read(self: TableReader, path: Path, *rest: object) -> object:
        parsed.append(path.name)
        return real(self, path, *rest)  # type: ignore[arg-type]

    monkeypatch.setattr(TableReader, "read", read)
    study, variants = bulk
    varied = etl.vary(etl.load_study(study), variants)
    assert len(varied.crossing) == 48
    assert len(parsed) == len(set(parsed)) == 9


@pytest.mark.parametrize("stage", ["reading logs", "working on variants", "publishing"])
def test_interrupted_run_leaves_what_was_there(
    stage: str, bulk: tuple[Path, Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whenever it is cancelled, an earlier run stays byte for byte, and nothing lies beside it."""
    monkeypatch.setattr(variant_run, "STATES_AT_ONCE", 12_000)
    study, variants = bulk
    etl.vary(etl.load_study(study), variants)
    beside = {path.name for path in study.parent.iterdir()}
    before = files_of(study.with_name("variants"))
    variants.write_text(SEVERAL.replace("400", "500"), encoding="utf-8", newline="\n")
    told: list[str] = []

    def interrupted(name: str, *_: int) -> None:
        told.append(name)
        if name == stage:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        etl.vary(etl.load_study(study), variants, progress=interrupted)
    assert told[-1] == stage
    assert files_of(study.with_name("variants")) == before
    assert {path.name for path in study.parent.iterdir()} == beside


def test_progress_counts_readers_in_all_variants(bulk: tuple[Path, Path]) -> None:
    """What is told on the way ends at nine readers times 48 variants."""
    study, variants = bulk
    told: list[tuple[str, int, int]] = []
    etl.vary(etl.load_study(study), variants, progress=lambda *stage: told.append(stage))
    own = [stage for stage in told if stage[0] == "working on variants"]
    assert own[-1] == ("working on variants", 9 * 48, 9 * 48)


def test_codebook_has_every_column(bulk: tuple[Path, Path], tmp_path: Path) -> None:
    """Of every table, in order, and none that is not there; the record names every file."""
    study, variants = bulk
    varied = etl.vary(etl.load_study(study), variants, into=tmp_path / "varied")
    with (varied.folder / "codebook.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    told: dict[str, list[str]] = {}
    for row in rows:
        assert row["meaning"]
        told.setdefault(row["table"], []).append(row["column"])
    found = {}
    for path in varied.folder.iterdir():
        if path.suffix == ".parquet":
            found[path.stem] = pq.read_schema(path).names
        elif path.suffix == ".csv":
            with path.open(encoding="utf-8", newline="") as file:
                found.setdefault(path.stem, next(csv.reader(file)))
    assert told == found
    record = json.loads((varied.folder / "run.json").read_text(encoding="utf-8"))
    written = set(files_of(varied.folder)) - {"run.json"}
    assert set(record["files"]) == written
    assert record["counts"]["variants"] == 48
    roles = {one["role"]: one["file"] for one in record["inputs"]}
    assert roles["variants file"] == "variants.toml"


def test_no_id_is_in_any_file(tmp_path: Path) -> None:
    """Readers go by pseudonyms in tables, page, traces and names; notes have other names too."""
    study_file = write_study(tmp_path)
    variants = study_file.with_name("Quillfeather07.toml")
    variants.write_text(
        'title = "As Óskar Lindqvist would have it"\n'
        "[screening.fixations]\nunder_ms = [80, false]\n"
        '[screening.trials]\nnotes = ["notes_Brambleton-12.csv", false]\n',
        encoding="utf-8",
        newline="\n",
    )
    varied = etl.vary(etl.load_study(study_file), variants, into=tmp_path / "varied")
    assert (varied.folder / "traces").is_dir()
    assert found_in(varied.folder, DISTINCTIVE) == {}
    named = study_file.with_name("named.toml")
    named.write_text(
        '[[variants]]\nname = "as Brambleton-12 asked"\n'
        "[variants.screening.fixations]\nunder_ms = false\n",
        encoding="utf-8",
        newline="\n",
    )
    varied = etl.vary(etl.load_study(study_file), named, into=tmp_path / "named")
    assert found_in(varied.folder, DISTINCTIVE) == {}
    key = study_file.with_name("study.pseudonyms.csv")
    assert any(path.suffix == ".csv" and "pseudonym" in path.name for path in tmp_path.iterdir()), (
        key
    )


def test_study_without_factors_has_rates(tmp_path: Path) -> None:
    """Nothing is compared; the page and the passage are of the rate itself."""
    study = STUDY.replace('factors = ["cue"]\nlevels = { cue = ["early", "late"] }\n', "")
    variants = (
        "[screening.fixations]\nunder_ms = [80, false]\n"
        '[[comparisons]]\noutcome = "first_pass_regression_out"\nregion = "middle"\n'
    )
    study_file, path = labelled_study(tmp_path, BY_HAND, variants, study)
    varied = etl.vary(etl.load_study(study_file), path)
    (place,) = varied.leading
    # 3 of 7 without the short glances, 5 of 8 with them.
    assert varied.summaries[place].compared.difference.tolist() == pytest.approx([3 / 7, 5 / 8])
    rates = varied.table("rates")
    assert "cue" not in rates
    assert rates.difference.isna().all()
    (passage,) = varied.passages
    assert "rate" in passage
    assert "above 0" not in varied.told()


def test_notes_can_be_varied(tmp_path: Path) -> None:
    """Trials that the experimenter's notes leave out come back without the rule."""
    study_file = few_readers("orchard", tmp_path / "lab", ["logs/P0[1-5]*"])
    path = study_file.with_name("variants.toml")
    path.write_text(
        '[screening.trials]\nnotes = ["notes.csv", false]\n'
        "[screening.fixations]\noutside_text_time = [true, false]\n",
        encoding="utf-8",
        newline="\n",
    )
    varied = etl.vary(etl.load_study(study_file), path)
    accounts = varied.table("variant_accounts")
    trials = accounts[accounts.unit == "trials"]
    without = varied.table("variants").notes == "false"
    assert (trials.notes.to_numpy()[without] == 0).all()
    assert (trials.notes.to_numpy()[~without] > 0).all()
    assert math.isfinite(trials.kept.mean())


def run(*arguments: object) -> tuple[int, str]:
    """The command's exit status and all that it said."""
    result = CliRunner().invoke(main, [str(one) for one in arguments], catch_exceptions=False)
    return result.exit_code, result.output


def test_build_is_not_replaced_by_variants(bulk: tuple[Path, Path]) -> None:
    """A folder with the tables of the study is not taken for one with variants."""
    study, variants = bulk
    etl.build(etl.load_study(study))
    before = files_of(study.with_name("out"))
    status, told = run("vary", study, variants, "--into", study.with_name("out"))
    assert status == 2
    assert "the output folder holds a build of a study" in told
    assert files_of(study.with_name("out")) == before


def test_folder_that_cannot_be_taken_is_told_by_the_option_only(
    bulk: tuple[Path, Path], tmp_path: Path
) -> None:
    """A variants file names no output folder, so that nobody is sent to the study file for it."""
    study, variants = bulk
    taken = tmp_path / "taken"
    taken.write_text("mine", encoding="utf-8")
    full = tmp_path / "full"
    full.mkdir()
    (full / "mine.txt").write_text("mine", encoding="utf-8")
    for folder, problem, fix in (
        (taken, "the output folder is a file", "name a folder, by --into"),
        (
            full,
            "the output folder holds something else than an earlier build",
            "name another folder, by --into, or empty this one yourself",
        ),
    ):
        status, told = run("vary", study, variants, "--into", folder)
        assert status == 2
        assert f"{folder}: {problem}" in told
        assert f"fix: {fix}\n" in told
        assert "[output]" not in told
    assert taken.read_text(encoding="utf-8") == "mine"
    assert [path.name for path in full.iterdir()] == ["mine.txt"]


def test_key_to_pseudonyms_is_kept_out_of_the_output_folder(tmp_path: Path) -> None:
    """As a build does it, with advice on the option only."""
    study = write_study(tmp_path)
    variants = study.with_name("variants.toml")
    variants.write_text("[screening.fixations]\nunder_ms = [80, false]\n", encoding="utf-8")
    before = files_of(study.parent)
    status, told = run("vary", study, variants, "--into", study.parent)
    assert status == 2
    assert "the key to the pseudonyms would lie in the output folder" in told
    assert "fix: name another folder, by --into\n" in told
    assert files_of(study.parent) == before


def test_files_in_the_wrong_order_are_told_in_one_finding(bulk: tuple[Path, Path]) -> None:
    """The variants file in place of the study file, and the study file in place of the other."""
    study, variants = bulk
    for first, second, problem in (
        (variants, variants, "this is a variants file"),
        (variants, study, "this is a variants file"),
        (study, study, "this is a study file"),
    ):
        status, told = run("vary", first, second)
        assert status == 2
        assert problem in told
        assert "name the study file first, then the variants file" in told
        assert "1 problem; nothing was written" in told


def test_variants_are_replaced_by_variants(bulk: tuple[Path, Path]) -> None:
    """A second run takes the place of the first, unless somebody has changed it."""
    study, variants = bulk
    assert run("vary", study, variants, "--quiet") == (0, "")
    variants.write_text("[measures]\noutside = ['ignore', 'interrupt']\n", encoding="utf-8")
    assert run("vary", study, variants, "--quiet") == (0, "")
    assert len(pd.read_csv(study.with_name("variants") / "variants.csv")) == 2
    (study.with_name("variants") / "variants.csv").write_text("mine", encoding="utf-8")
    status, told = run("vary", study, variants)
    assert status == 2
    assert "changed since" in told


@pytest.mark.parametrize(
    ("variants", "expected"),
    [
        (
            '[screening.trials]\nnotes = [false, "nowhere.csv"]\n',
            [
                "variants.toml:2: screening.trials.notes: there is no such file",
                'found "nowhere.csv"',
                "correct the name in the variants file, or put the file there",
            ],
        ),
        (
            '[screening.trials]\nno_first_pass_on = [false, ["midle"]]\n',
            [
                "variants.toml:2: screening.trials.no_first_pass_on",
                "no text has a region of this name",
                'found "midle"',
                'did you mean "middle"?',
            ],
        ),
        (
            (
                "[screening.fixations]\nunder_ms = [80, 90]\n[[comparisons]]\n"
                'outcome = "reread"\nregion = "midle"\nfactor = "cue"\n'
            ),
            ["variants.toml:5: comparisons.region: no text has a region of this name"],
        ),
        (
            "[screening.fixations]\nunder_ms = [80, 90]\nunder_mss = [80, 90]\n",
            ["variants.toml:3", "under_mss", "did you mean"],
        ),
        ("[screening.fixations]\nunder_ms = 90\n", ["variants.toml:2", "under_ms = [80, 90]"]),
        ("[screening.fixations]\nunder_ms = [80, off]\n", ["write false where a rule is off"]),
    ],
)
def test_what_is_wrong_is_told_and_nothing_written(
    variants: str, expected: list[str], tmp_path: Path
) -> None:
    """Status 2, file and line, the value found, what to do; no traceback, no folder."""
    study, path = labelled_study(tmp_path, BY_HAND, variants)
    status, told = run("vary", study, path)
    assert status == 2
    for text in expected:
        assert text in told
    assert "nothing was written" in told
    assert not study.with_name("variants").exists()


def test_wrong_log_stops_variants(bulk: tuple[Path, Path]) -> None:
    """As it stops a build."""
    study, variants = bulk
    log = min(study.with_name("logs").iterdir())
    log.write_text(log.read_text(encoding="utf-8").replace("\n", "\nx\t", 2), encoding="utf-8")
    status, told = run("vary", study, variants)
    assert status == 2
    assert log.name in told
    assert not study.with_name("variants").exists()
