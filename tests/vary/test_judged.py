"""What a build would refuse or tell of the study as it stands, and variants that leave nothing."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import pytest
from click.testing import CliRunner

import etl
from etl.cli import main
from etl.errors import DataError, Findings
from etl.tables.variants import rate_columns
from tests.vary.labelled import BY_HAND, STUDY, Trial, labelled_study
from tests.vary.otherwise import Choice, as_toml, changed, few_readers

VARIANTS = "[screening.trials]\nfewest_fixations = [3, 4]\n"


@pytest.fixture
def orchard(tmp_path: Path) -> Path:
    """Three readers of the orchard study, with a variants file beside it."""
    study = few_readers("orchard", tmp_path / "lab", ["logs/P0[1-3]*"])
    study.with_name("variants.toml").write_text(VARIANTS, encoding="utf-8", newline="\n")
    return study


def change(study: Path, choice: Choice) -> None:
    """Set some keys of a study file."""
    data = tomllib.loads(study.read_text(encoding="utf-8"))
    study.write_text(as_toml(changed(data, choice)), encoding="utf-8", newline="\n")


def move(log: Path, by: float) -> None:
    """Add so many pixels to every y of a log."""
    header, *lines = log.read_text(encoding="utf-8").splitlines()
    place = header.split("\t").index("gaze_y")
    moved = [header]
    for line in lines:
        cells = line.split("\t")
        if cells[place].replace(".", "").isdigit():
            cells[place] = f"{float(cells[place]) + by:.1f}"
        moved.append("\t".join(cells))
    log.write_text("\n".join([*moved, ""]), encoding="utf-8", newline="\n")


def refused(study: Path) -> Findings:
    """What is found by ``vary``, which writes nothing."""
    with pytest.raises(DataError) as caught:
        etl.vary(etl.load_study(study), study.with_name("variants.toml"))
    assert not study.with_name("variants").exists()
    return caught.value.findings


@pytest.mark.parametrize(
    ("choice", "problem"),
    [
        (
            {"regions.layout.top_px": 5000, "screening.trials.outside_share_over": False},
            "not one of 1,228 fixations lies in a region",
        ),
        ({"regions.layout.left_px": 5000}, "screening leaves no trial of any reader"),
        (
            {"screening.fixations.under_ms": 5000, "screening.fixations.over_ms": False},
            "screening leaves no trial of any reader",
        ),
        (
            {
                "screening.fixations.under_ms": 5000,
                "screening.fixations.over_ms": False,
                "screening.trials.fewest_fixations": False,
            },
            "screening leaves no fixation of any reader",
        ),
    ],
)
def test_study_that_no_build_would_take_is_refused(
    choice: Choice, problem: str, orchard: Path
) -> None:
    """Regions nowhere near the fixations, or rules that leave nothing: as ``check`` has it."""
    change(orchard, choice)
    found = refused(orchard)
    assert found.text() == etl.check(etl.load_study(orchard)).text()
    (error,) = found.of("error")
    assert error.problem.startswith(problem)
    assert error.path == str(orchard)
    assert error.line is not None


def test_log_beside_the_regions_is_refused(orchard: Path) -> None:
    """One log of three lies 300 px lower than the others."""
    move(orchard.with_name("logs") / "P02.tsv", 300)
    found = refused(orchard)
    assert found.text() == etl.check(etl.load_study(orchard)).text()
    (error,) = found.of("error")
    assert error.path == "logs/P02.tsv"
    assert error.problem.startswith("nearly all fixations lie outside every region")
    assert any("the fixations lie elsewhere" in one.problem for one in found.of("warning"))


@pytest.mark.parametrize(
    ("label", "severity"), [("A", "error"), ("z", "note")], ids=["a slip", "another label"]
)
def test_labels_that_no_row_lists_are_told(label: str, severity: str, tmp_path: Path) -> None:
    """A slip is refused; what may be meant so is told, and the variants are computed."""
    trials: list[Trial] = [
        ("R1", 1, "early", f"a200 {label}210 c190"),
        ("R1", 2, "late", f"a200 b210 c190 {label}200 a90 b100 c90"),
    ]
    study, variants = labelled_study(tmp_path, trials, VARIANTS)
    checked = etl.check(etl.load_study(study))
    if severity == "error":
        found = refused(study)
        assert found.text() == checked.text()
        assert found.of("error")[0].line == 3
        assert found.of("error")[0].found == "A, of 2 fixations"
    else:
        found = etl.vary(etl.load_study(study), variants).findings
        # The last note of a check is what the study is.
        assert checked.items[:-1] == found.items[: len(checked) - 1]
        (note,) = found.of("note")
        assert note.problem == (
            "2 fixations bear labels that regions.csv does not list, outside every region: z"
        )


def test_warnings_of_a_build_are_told(orchard: Path) -> None:
    """A rule of the study that takes much: by the command, and in the record."""
    change(orchard, {"screening.fixations.under_ms": 220})
    study = etl.load_study(orchard)
    checked = etl.check(study)
    varied = etl.vary(study, orchard.with_name("variants.toml"))
    # The last note of a check is what the study is.
    assert varied.findings.lines() == checked.lines()[:-1]
    said = "warning: study.toml:8: screening.fixations.under_ms: the rule under_ms leaves out "
    record = json.loads((varied.folder / "run.json").read_text(encoding="utf-8"))
    assert any(line.startswith(said) for line in record["warnings"])
    # What is not spelled out is counted as a build counts it.
    assert any("more like this in trial_list.csv" in line for line in record["warnings"])


def run(study: Path, variants: Path) -> tuple[int, str]:
    """The command's exit status and all that it said."""
    result = CliRunner().invoke(main, ["vary", str(study), str(variants)], catch_exceptions=False)
    return result.exit_code, result.output


@pytest.mark.parametrize(
    ("text", "warnings"),
    [
        (
            "[screening.trials]\nfewest_fixations = [false, 20]\n",
            [
                (
                    "1 variant of 2 leaves no trial of any reader; found "
                    '"variant 2: fewest_fixations = 20"'
                )
            ],
        ),
        (
            (
                "[screening.fixations]\nunder_ms = [80, 5000]\n"
                "[screening.trials]\nfewest_fixations = [2, 20]\n"
            ),
            [
                (
                    "3 variants of 6 leave no trial of any reader; found "
                    '"variant 3: fewest_fixations = 20"'
                ),
                (
                    "1 variant of 6 leaves no fixation of any reader; found "
                    '"variant 4: under_ms = 5000"'
                ),
            ],
        ),
        (
            "[screening.fixations]\nunder_ms = [false, 80, 5000, 6000]\n",
            ['2 variants of 4 leave no fixation of any reader; found "variant 3: under_ms = 5000"'],
        ),
        (
            (
                '[[variants]]\nname = "nothing"\nscreening.fixations.under_ms = 5000\n'
                '[[variants]]\nname = "all"\nscreening.fixations.under_ms = false\n'
            ),
            [
                (
                    "1 variant of 3 leaves no fixation of any reader; found "
                    '"variant 2: nothing (under_ms = 5000)"'
                )
            ],
        ),
    ],
)
def test_variants_that_leave_nothing_are_told(
    text: str, warnings: list[str], tmp_path: Path
) -> None:
    """How many and the first of them; the others are computed, so that the command is content."""
    study, variants = labelled_study(tmp_path, BY_HAND, text)
    status, said = run(study, variants)
    assert status == 0
    fix = "leave out the alternative that takes everything"
    for warning in warnings:
        assert f"warning: {variants}: {warning}\n    fix: {fix}" in said
    assert said.count("of any reader") == len(warnings)
    assert (study.with_name("variants") / "variants.html").is_file()


def test_setting_that_changes_nothing_is_told(tmp_path: Path) -> None:
    """Each at its line; not those that change a cell, be it of a duration only."""
    text = (
        "[screening.fixations]\nunder_ms = [80, false]\nover_ms = [false, 1000]\n"
        "[screening.trials]\nfewest_fixations = [false, 1]\n"
    )
    study, variants = labelled_study(tmp_path, BY_HAND, text)
    status, said = run(study, variants)
    assert status == 0
    problem = "this changes nothing: every cell is the same with each alternative"
    assert said.count(problem) == 2
    assert f"warning: {variants}:3: screening.fixations.over_ms: {problem}" in said
    assert f"warning: {variants}:5: screening.trials.fewest_fixations: {problem}" in said


def test_named_variants_tell_of_no_setting_that_changes_nothing(tmp_path: Path) -> None:
    """Without all combinations it is not known on which setting a cell hangs."""
    text = (
        '[[variants]]\nname = "loose"\nscreening.fixations.under_ms = false\n'
        "screening.fixations.over_ms = 1000\n"
    )
    study, variants = labelled_study(tmp_path, BY_HAND, text)
    status, said = run(study, variants)
    assert status == 0
    assert "warning" not in said


#: Columns of rates; those that a build has in its tables too are refused in its words.
OF_VARIANTS = ["variant", "rows", "rows_lost", "n", "against", "corrected"]
OF_VARIANTS += ["difference", "difference_low", "difference_high"]
OF_BUILDS = ["ones", "rate", "rate_low", "rate_high"]


def study_with_factor(name: str, folder: Path) -> Path:
    """A study whose factor has this name."""
    text = STUDY.replace('["cue"]', f'["{name}"]').replace("{ cue =", f"{{ {name} =")
    # The fixations have numbers in a column that is called so.
    text = text.replace('fixation = "n"', 'fixation = "number"')
    study, _ = labelled_study(folder, BY_HAND, VARIANTS, text)
    log = study.with_name("log.csv")
    header = f"reader,trial,text,{name},number,ms,area"
    lines = log.read_text(encoding="utf-8").splitlines()[1:]
    log.write_text("\n".join([header, *lines, ""]), encoding="utf-8", newline="\n")
    return study


@pytest.mark.parametrize("name", OF_VARIANTS)
def test_factor_called_like_a_column_is_refused(name: str, tmp_path: Path) -> None:
    """The table of rates has a column for each factor; a build takes the study as it is."""
    study = study_with_factor(name, tmp_path)
    assert not etl.check(etl.load_study(study)).failed
    assert refused(study).text() == (
        f"{study}:15: trials.factors: the tables about variants have a column of this name already;"
        f' found "{name}"\n'
        "    fix: rename the column in its table, and in the study file\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("name", OF_BUILDS)
def test_factor_that_a_build_refuses_is_refused_so(name: str, tmp_path: Path) -> None:
    """In the words of ``check``."""
    study = study_with_factor(name, tmp_path)
    found = refused(study)
    assert found.text() == etl.check(etl.load_study(study)).text()
    assert [(one.where, one.found) for one in found] == [("trials.factors", name)]


def test_every_column_of_rates_is_taken() -> None:
    """Those above, and what a study has a column of already."""
    taken = {"measure", "region", "missing", *OF_VARIANTS, *OF_BUILDS}
    assert {column.name for column in rate_columns({})} == taken


def test_wrong_alternatives_are_all_told(tmp_path: Path) -> None:
    """Files that are not there, and regions of no such name, each with what was found."""
    text = (
        '[screening.trials]\nnotes = [false, "nowhere.csv", "neither.csv"]\n'
        'no_first_pass_on = [false, ["midle"], ["strat"]]\n'
    )
    study, variants = labelled_study(tmp_path, BY_HAND, text)
    found = refused(study)
    told = [(one.path, one.line, one.where, one.found) for one in found.of("error")]
    notes, region = "screening.trials.notes", "screening.trials.no_first_pass_on"
    assert sorted(told) == [
        *((str(variants), 2, notes, name) for name in ("neither.csv", "nowhere.csv")),
        *((str(variants), 3, region, name) for name in ("midle", "strat")),
    ]
    assert found.count("error") == 4


def test_wrong_file_of_a_named_variant_has_its_own_line(tmp_path: Path) -> None:
    """That of the key in its variant."""
    text = (
        '[[variants]]\nname = "one"\nscreening.fixations.under_ms = false\n'
        '[[variants]]\nname = "other"\nscreening.participants.notes = "nowhere.csv"\n'
    )
    study, variants = labelled_study(tmp_path, BY_HAND, text)
    assert refused(study).text() == (
        f"{variants}:6: screening.participants.notes: there is no such file; found "
        '"nowhere.csv"\n'
        "    fix: correct the name in the variants file, or put the file there\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("absolute", [True, False])
def test_record_and_page_name_the_file_only(
    absolute: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whatever path was typed; the console says it as it was typed."""
    text = "[screening.fixations]\nunder_ms = [80, 5000]\nover_ms = [false, 8000]\n"
    study, variants = labelled_study(tmp_path / "lab", BY_HAND, text)
    monkeypatch.chdir(tmp_path)
    typed = variants if absolute else Path("lab") / "variants.toml"
    varied = etl.vary(etl.load_study(study), typed)
    assert f"warning: {typed}:3: screening.fixations.over_ms: " in varied.findings.text()
    record = json.loads((varied.folder / "run.json").read_text(encoding="utf-8"))
    (file,) = (one["file"] for one in record["inputs"] if one["role"] == "variants file")
    assert file == "variants.toml"
    assert [line.split(": ")[:2] for line in record["warnings"]] == [
        ["warning", "variants.toml"],
        ["warning", "variants.toml:3"],
    ]
    page = (varied.folder / "variants.html").read_text(encoding="utf-8")
    assert "variants.toml:3: screening.fixations.over_ms: this changes nothing" in page
    for path in varied.folder.rglob("*"):
        if path.is_file():
            assert str(tmp_path).encode() not in path.read_bytes()
            assert b"lab/variants.toml" not in path.read_bytes()
