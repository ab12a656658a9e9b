"""What the project says of itself: complete, and nothing of the place where it was written."""

from __future__ import annotations

import re
import subprocess
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner

from etl.cli import main
from etl.measures import GROUPS, MEASURES, REASON_MEANINGS, TRIAL_MEASURES, Measure
from etl.session import told
from etl.study.schema import study_schema
from etl.tables import BARE_DESIGN, TABLES
from tests.documents import README, with_parts

PROJECT = Path(__file__).resolve().parents[1]
EVERY_MEASURE = [
    pytest.param(one, id=f"{one.level}-{one.name}")
    for group in (MEASURES, TRIAL_MEASURES)
    for one in group.values()
]

#: Keys of the study file that others rely on, as the design of the project lists them.
KEYS_OF = {
    "": ("title",),
    "logs": (
        "files",
        "kind",
        "participant_from_name",
        "delimiter",
        "decimal",
        "encoding",
        "missing",
        "where",
    ),
    "logs.columns": (
        "participant",
        "trial",
        "item",
        "session",
        "onset",
        "fixation",
        "duration",
        "end",
        "x",
        "y",
        "label",
        "eye",
        "blink",
    ),
    "participants": ("table",),
    "items": ("table",),
    "trials": (
        "table",
        "keys",
        "factors",
        "covariates",
        "levels",
        "repeated",
        "answer_correct",
        "onset",
        "offset",
        "skip",
    ),
    "screen": ("width_px", "height_px", "width_cm", "distance_cm", "y_axis", "origin"),
    "regions": ("file", "kind", "vertical", "tolerance_px", "overlap"),
    "regions.layout": (
        "left_px",
        "top_px",
        "character_width_px",
        "line_height_px",
        "space",
        "direction",
    ),
    "lines": ("method",),
    "measures": ("outcomes", "outside", "no_opportunity"),
    "screening.fixations": (
        "outside_text_time",
        "off_screen",
        "first",
        "last",
        "blink",
        "undersweep",
        "merge",
        "under_ms",
        "over_ms",
    ),
    "screening.trials": (
        "notes",
        "fewest_fixations",
        "line_confidence_under",
        "outside_share_over",
        "duration_ms",
        "blink_in_first_pass_of",
        "no_first_pass_on",
        "answer_wrong",
    ),
    "screening.participants": (
        "notes",
        "correct_share_under",
        "lost_trials_share_over",
        "fewest_trials_per_cell",
    ),
    "screening.values": ("outlier_sd",),
    "output": ("folder", "formats", "contrasts", "centred", "pseudonyms"),
}
KEYS = [f"{table}.{key}".lstrip(".") for table, keys in KEYS_OF.items() for key in keys]


def project_files() -> list[str]:
    """The files of the project: those that git knows or would take up."""
    asked = ["git", "ls-files", "--cached", "--others", "--exclude-standard", "-z"]
    try:
        listed = subprocess.run(asked, cwd=PROJECT, capture_output=True, check=True)
    except (OSError, subprocess.CalledProcessError):
        return []
    names = listed.stdout.decode("utf-8").split("\0")
    return sorted(name for name in set(names) if name and (PROJECT / name).is_file())


def texts() -> Iterator[tuple[str, str]]:
    """Every text file of the project with its contents; what is no UTF-8 is no text of ours."""
    files = project_files()
    if not files:
        pytest.skip("this is no checkout: git does not know its files")
    for name in files:
        try:
            yield name, (PROJECT / name).read_text(encoding="utf-8")
        except UnicodeDecodeError:
            continue


def places(pattern: re.Pattern[str]) -> list[str]:
    """File, line and words wherever a pattern occurs."""
    return [
        f"{name}:{text.count(chr(10), 0, found.start()) + 1}: {found.group()}"
        for name, text in texts()
        for found in pattern.finditer(text)
    ]


def any_of(words: str) -> str:
    """A pattern for any of some words; written apart so that this file does not hold them."""
    return "|".join(re.escape(word.replace("_", "")) for word in words.split())


def test_no_file_names_a_folder_of_one_machine() -> None:
    """Absolute paths of somebody's machine are of no use to anybody else."""
    folders = any_of("h_ome ro_ot wo_rk tm_p Us_ers fa_rm m_nt o_pt/build work_space")
    posix = rf"(?<![\w.<\]*/]){re.escape('/')}(?:{folders})/\w+"
    windows = r"\b[A-Za-z]:\\{1,2}" + f"(?:{any_of('Us_ers wo_rk')})" + r"\\{1,2}\w"
    assert places(re.compile(f"{posix}|{windows}")) == []


def test_no_file_names_the_host_of_a_package_index() -> None:
    """Where packages are fetched from is the reader's own affair."""
    hosts = any_of("py_pi.org python_hosted.org np_mjs.org golan_g.org ana_conda.org cr_an.r-")
    proxies = r"\b(?:index|proxy|mirror|registry|artifactory|nexus)[\w.-]*\.[a-z]{2,}/"
    assert places(re.compile(f"{hosts}|https?://{proxies}")) == []


def test_no_file_speaks_of_how_it_was_written() -> None:
    """The project speaks of its job, not of who or what wrote it."""
    words = any_of("a_gent a_gents chat_bot language_model ll_m a_i-generated co-authored_-by")
    assert places(re.compile(rf"\b(?:{words})\b", re.IGNORECASE)) == []


def test_text_files_have_plain_line_ends() -> None:
    """Line ends are plain and the last line is whole; logs keep those of their recorder."""
    odd = [
        name
        for name in project_files()
        if Path(name).suffix in {".py", ".toml", ".md", ".json", ".csv"}
        and (b"\r" in (content := (PROJECT / name).read_bytes()) or content[-1:] != b"\n")
    ]
    assert odd == []


@pytest.mark.parametrize("measure", EVERY_MEASURE)
def test_measure_is_documented_in_full(measure: Measure) -> None:
    """Definition, unit, kind, the meaning of every reason, and a source or the word of none."""
    text = told.measure(measure.name)
    assert text is not None
    assert measure.definition.endswith(".")
    unit = "" if measure.unit == measure.kind else f", {measure.unit}"
    assert f"{measure.name} ({measure.kind}{unit};" in text
    assert measure.definition in text
    for reason in measure.reasons:
        assert reason in text
        assert REASON_MEANINGS[reason] in text
    assert re.search(r"\b(?:19|20)\d\d\b|^common practice, no source$", measure.source)
    assert measure.source in text


@pytest.mark.parametrize("measure", EVERY_MEASURE)
def test_measure_is_listed_in_the_catalogue(measure: Measure) -> None:
    """The list of all outcomes has a line for each, with its definition."""
    lines = [line.split() for line in told.catalogue().splitlines()]
    assert [measure.name, measure.kind, *measure.definition.split()] in lines


def test_every_reason_has_a_meaning_and_occurs() -> None:
    """Reasons for missing values are explained, and none is explained that never occurs."""
    used = {r for group in (MEASURES, TRIAL_MEASURES) for m in group.values() for r in m.reasons}
    assert used == {reason for reason in REASON_MEANINGS if reason}


def test_groups_hold_every_outcome_once() -> None:
    """The groups that a study can ask for are the kinds, and share out all outcomes."""
    assert set(GROUPS) == {m.kind for m in MEASURES.values()} == {"binary", "count", "duration"}


@pytest.mark.parametrize("table", TABLES)
def test_column_is_documented(table: str) -> None:
    """Each column of each table says in a sentence what it is."""
    for column in BARE_DESIGN.columns(table):
        assert len(column.meaning) > 5, column.name


def resolved(schema: dict[str, Any], part: dict[str, Any]) -> dict[str, Any]:
    """A part of the schema, with the definition it refers to put in its place."""
    alternatives = [part, *part.get("anyOf", ()), *part.get("allOf", ()), *part.get("oneOf", ())]
    for one in alternatives:
        if "$ref" in one:
            return schema["$defs"][one["$ref"].rpartition("/")[2]]
    return part


@pytest.mark.parametrize("key", KEYS)
def test_schema_covers_the_key(key: str) -> None:
    """An editor that reads the schema completes and explains every key of the study file."""
    schema = study_schema()
    part = schema
    for name in key.split("."):
        properties = resolved(schema, part).get("properties", {})
        assert name in properties
        part = properties[name]
    assert len(part.get("description", "")) > 5


def documents() -> str:
    """README and the developers' notes together."""
    files = [PROJECT / "README.md", PROJECT / "DEVELOPERS.md"]
    return "\n".join(path.read_text(encoding="utf-8") for path in files if path.is_file())


@pytest.mark.parametrize("name", sorted(main.commands))
def test_command_is_in_the_documents(name: str) -> None:
    """No command goes without a word in README or DEVELOPERS."""
    assert re.search(rf"\btrialwright {name}\b", documents())


@pytest.mark.parametrize("table", TABLES)
def test_table_and_its_columns_are_in_the_documents(table: str) -> None:
    """Every table and each of its own columns is named in README or DEVELOPERS."""
    text = documents()
    names = [table, *(column.name for column in BARE_DESIGN.columns(table))]
    assert [name for name in names if f"`{name}`" not in text] == []


def test_keys_of_the_study_file_are_in_the_documents() -> None:
    """Every key of the study file is named in README or DEVELOPERS."""
    text = documents()
    last = {key.rpartition(".")[2] for key in KEYS}
    assert sorted(name for name in last if not re.search(rf"\b{name}\b", text)) == []


def test_made_parts_of_the_readme_are_current() -> None:
    """The tables of columns and of keys are what the code declares."""
    text = README.read_text(encoding="utf-8")
    assert text == with_parts(text), "run python -m tests.documents"


def printed_after(command: str) -> str:
    """What the README says a command prints."""
    text = README.read_text(encoding="utf-8")
    start = text.index(f"$ {command}\n") + len(command) + 3
    return text[start : text.index("```", start)]


def test_readme_shows_what_check_prints(monkeypatch: pytest.MonkeyPatch) -> None:
    """The walk through the sample study shows what its reader will see."""
    monkeypatch.chdir(PROJECT)
    command = ["check", "sample_logs/orchard/study.toml"]
    done = CliRunner().invoke(main, command)
    assert done.output == printed_after(f"trialwright {' '.join(command)}")


def test_readme_shows_what_build_prints(tmp_path: Path) -> None:
    """The summary of the sample study is the one in the walk."""
    study = PROJECT / "sample_logs" / "orchard" / "study.toml"
    done = CliRunner().invoke(main, ["build", str(study), "--into", str(tmp_path / "out")])
    shown = printed_after("trialwright build sample_logs/orchard/study.toml").splitlines()
    printed = done.output.splitlines()[-len(shown) + 1 :]
    assert [line for line in printed if not line.startswith("Written")] == [
        line for line in shown[1:] if not line.startswith("Written")
    ]


def test_readme_shows_what_vary_prints(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The variants of the sample study say what the README says."""
    monkeypatch.chdir(PROJECT)
    command = "vary sample_logs/orchard/study.toml sample_logs/orchard/variants.toml"
    into = ["--into", str(tmp_path / "variants")]
    done = CliRunner().invoke(main, [*command.split(), *into])
    shown = printed_after(f"trialwright {command}").splitlines()
    printed = done.output.splitlines()
    assert [line for line in printed if not line.startswith("Written")] == [
        line for line in shown if not line.startswith("Written")
    ]


def test_variants_file_of_the_readme_is_sound(tmp_path: Path) -> None:
    """Both examples, tried on the sample study: what is shown can be copied."""
    text = README.read_text(encoding="utf-8")
    part = text[text.index("## How much do your exclusions decide?") :]
    examples = re.findall(r"```toml\n(.*?)```", part, re.DOTALL)[:2]
    assert len(examples) == 2
    study = PROJECT / "sample_logs" / "orchard" / "study.toml"
    for number, example in enumerate(examples):
        path = tmp_path / f"variants {number}.toml"
        path.write_text(example, encoding="utf-8")
        done = CliRunner().invoke(main, ["vary", str(study), str(path), "--quiet"])
        assert (done.exit_code, done.output) == (0, "")
