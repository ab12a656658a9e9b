"""The commands as a user meets them: what is said where, and the exit status."""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path

import pytest

import etl.cli
from etl.export.writers import TableWriters
from etl.measures import MEASURES, TRIAL_MEASURES
from tests.end_to_end.building import BESIDES, PROJECT, TABLES, files_of, write
from tests.end_to_end.odd_study import STUDY, odd_study
from tests.end_to_end.running import ESCAPE, Ran, environment, on_terminal, run

COMMANDS = ("build", "check", "completion", "draft", "measures", "trace", "vary")
ORCHARD = PROJECT / "sample_logs" / "orchard" / "study.toml"
PTY = pytest.mark.skipif(sys.platform == "win32", reason="pseudo-terminals are of POSIX systems")


class Said:
    """Runs the command in this process and gives what it said."""

    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, *arguments: object) -> Ran:
        """Run the command with arguments."""
        with pytest.raises(SystemExit) as ended:
            etl.cli.main(list(map(str, arguments)), prog_name="trialwright")
        out, err = self._capsys.readouterr()
        return Ran(int(ended.value.code or 0), out, err)


@pytest.fixture
def said(capsys: pytest.CaptureFixture[str]) -> Said:
    """The command in this process."""
    return Said(capsys)


@pytest.fixture
def study_file(tmp_path: Path) -> Path:
    """A small study."""
    return odd_study(tmp_path / "study")


def test_version_is_that_of_the_package(said: Said) -> None:
    """--version says name and version on stdout."""
    assert said("--version") == Ran(0, f"trialwright, version {version('trialwright')}\n", "")


@pytest.mark.parametrize("option", ["--help", "-h"])
def test_help_names_every_command(said: Said, option: str) -> None:
    """The help of the program lists its commands, each with a line of explanation."""
    ran = said(option)
    listed = re.findall(r"^  (\w+) {2,}\S", ran.out.partition("Commands:")[2], re.MULTILINE)
    assert (ran.status, tuple(listed), ran.err) == (0, COMMANDS, "")


@pytest.mark.parametrize("command", COMMANDS)
def test_help_of_a_command_explains_it_and_its_options(said: Said, command: str) -> None:
    """Each command says what it does, and each of its options has words beside it."""
    ran = said(command, "--help")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.startswith(f"Usage: trialwright {command} ")
    explained = ran.out.split("\n\n")[1]
    assert len(explained.split()) >= 5
    for option in re.findall(r"^  (?:-\w, )?--.*$(?:\n {10,}.*)*", ran.out, re.MULTILINE):
        assert re.search(r"\s{2,}[A-Z]\w", option), option


def test_nothing_asked_is_answered_with_the_help(said: Said) -> None:
    """Without a command the help is shown and nothing is done: status 2."""
    ran = said()
    assert ran.status == 2
    assert "Commands:" in ran.out + ran.err


def test_misspelt_command_is_refused(said: Said) -> None:
    """An unknown command is status 2, never 0."""
    ran = said("biuld", ORCHARD)
    assert (ran.status, ran.out) == (2, "")
    assert "No such command 'biuld'" in ran.err


def test_build_needs_a_study(said: Said) -> None:
    """A missing argument is status 2."""
    ran = said("build")
    assert (ran.status, ran.out) == (2, "")
    assert "Missing argument 'STUDY'" in ran.err


@pytest.mark.parametrize("command", ["build", "check"])
def test_study_that_is_not_there_is_named(said: Said, command: str) -> None:
    """A study file that does not exist is wrong input: named, with what to do."""
    ran = said(command, "nowhere.toml")
    assert (ran.status, ran.out) == (2, "")
    assert ran.err == (
        "nowhere.toml: there is no such file; expected a study file\n"
        "    fix: correct the name, or change to the folder that holds it\n"
        "1 problem; nothing was written\n"
    )


def test_build_says_what_it_did(said: Said, study_file: Path) -> None:
    """The summary on stdout: what was read, what was left out, each table with its rows."""
    ran = said("build", study_file, "--workers", "1")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out == (
        "note: 1 fixation bears a label that regions.csv does not list, outside every region: ?\n"
        "2 readers, 5 trials, 14 fixations, 1 of them outside every region; "
        "2 more trials skipped; 2 fixations of trials recorded twice left out\n"
        f"Written to {study_file.parent / 'out'}:\n"
        "  outcomes               285 rows\n"
        "  outcomes_wide           15 rows\n"
        "  trials                   5 rows\n"
        "  regressions              3 rows\n"
        "  fixations               19 rows\n"
        "  exclusions               4 rows\n"
        "  accounts.csv, log_accounts.csv, regions.csv, codebook.csv, codebook.md, "
        "datapackage.json,\n"
        "  readiness.csv, readiness.json, formulas.csv, run.json, and audit.html to look at\n"
        "Of 24 binary outcomes by region or of whole trials, 4 are sparse, 11 are separated by the "
        "factors and 9 cannot be fitted (6 constant, 3 without values).\n"
        "  first_pass_skip, Ende (constant): all 3 values are 0\n"
        "  first_pass_refixation, start, or so (constant): all 3 values are 0\n"
        "  first_pass_refixation, middle (constant): all 3 values are 0\n"
        "  first_pass_refixation, Ende (constant): all 3 values are 0\n"
        "  first_pass_regression_out, middle (constant): all 3 values are 0\n"
        "  and 16 more: audit.html shows all under Readiness\n"
        "handoff/ is what the statistician gets; start there with: Rscript start.R\n"
    )


def test_quiet_build_says_nothing(said: Said, study_file: Path) -> None:
    """--quiet: the tables are there, and nothing is said."""
    assert said("build", study_file, "--quiet") == Ran(0, "", "")
    assert (study_file.parent / "out" / "run.json").is_file()


def test_into_names_the_folder(said: Said, study_file: Path, tmp_path: Path) -> None:
    """--into takes the place of the study's own folder."""
    said("build", study_file, "--into", tmp_path / "elsewhere")
    assert (tmp_path / "elsewhere" / "outcomes.parquet").is_file()
    assert not (study_file.parent / "out").exists()


@pytest.mark.parametrize("workers", ["0", "-1", "many"])
def test_number_of_workers_is_a_positive_number(said: Said, study_file: Path, workers: str) -> None:
    """Anything else is a wrong command line."""
    ran = said("build", study_file, "--workers", workers)
    assert (ran.status, ran.out) == (2, "")
    assert "Invalid value for '--workers'" in ran.err


def test_check_of_a_sound_study_says_so(said: Said, study_file: Path) -> None:
    """What was read and that all is well, on stdout, with status 0; nothing is written."""
    before = files_of(study_file.parent)
    assert said("check", study_file) == Ran(
        0,
        "note: 1 fixation bears a label that regions.csv does not list, outside every region: ?\n"
        "note: 2 readers, 5 trials, 14 fixations, 1 of them outside every region; "
        "2 more trials skipped; 2 fixations of trials recorded twice left out\n"
        "All is well. Nothing was written.\n",
        "",
    )
    assert files_of(study_file.parent) == before


def test_check_of_the_sample_lists_its_oddities(said: Said) -> None:
    """Notes and warnings on stdout; they are no errors, so the status is 0."""
    ran = said("check", ORCHARD)
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.endswith(
        "warning: trial_list.csv:464: the trial is in the list but in no log; "
        'found "participant P11, trial 23"\n'
        "note: notes.csv:4: the note is on a trial that was not recorded; found "
        '"participant P11, trial 23"\n'
        "note: 24 readers, 758 trials, 10,277 fixations, 342 of them outside every region; "
        "288 more trials skipped; screening left out 9 trials and 467 fixations in all\n"
        "No errors; 1 warning. Nothing was written.\n"
    )


@pytest.mark.parametrize("command", ["build", "check"])
def test_all_problems_are_listed_at_once(said: Said, study_file: Path, command: str) -> None:
    """Two mistakes in two files: both are named with file and line, on stderr, status 2."""
    for name, old, new in (
        ("log.csv", '"1","160.125"', '"1","long"'),
        ("regions.csv", "c,Ende,3", "c,Ende,4"),
    ):
        path = study_file.parent / name
        text = path.read_text(encoding="utf-8")
        write(study_file.parent, {name: text.replace(old, new, 1)})
    before = files_of(study_file.parent)
    ran = said(command, study_file)
    assert (ran.status, ran.out) == (2, "")
    assert 'log.csv:2: column "dur": this is no number; found "long"' in ran.err
    assert "regions.csv:4: " in ran.err
    assert ran.err.endswith("\n2 problems; nothing was written\n")
    assert files_of(study_file.parent) == before


def test_quiet_does_not_hide_errors(said: Said, study_file: Path) -> None:
    """--quiet silences the summary, never a problem."""
    write(study_file.parent, {"study.toml": STUDY.replace("duration", "durration")})
    ran = said("build", study_file, "--quiet")
    assert (ran.status, ran.out) == (2, "")
    assert 'did you mean "duration"?' in ran.err


def test_fault_of_the_program_is_told_apart_from_wrong_input(
    said: Said, study_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Status 1, one paragraph without a traceback, nothing written."""
    before = files_of(study_file.parent)

    def broken(*_: object) -> None:
        raise RuntimeError("seven is not eight")

    monkeypatch.setattr(TableWriters, "add", broken)
    ran = said("build", study_file, "--workers", "1")
    assert (ran.status, ran.out) == (1, "")
    assert "a fault of the program, not of your data: RuntimeError: seven is not eight" in ran.err
    assert "Traceback" not in ran.err
    assert files_of(study_file.parent) == before


def test_measures_lists_every_outcome(said: Said) -> None:
    """Without a name: each outcome with its kind and definition, those of trials too."""
    ran = said("measures")
    assert (ran.status, ran.err) == (0, "")
    listed = re.findall(r"^  (\w+) +(binary|count|duration) +\S.*$", ran.out, re.MULTILINE)
    expected = [(m.name, m.kind) for group in (MEASURES, TRIAL_MEASURES) for m in group.values()]
    assert listed == expected


def test_measures_tells_all_about_one(said: Said) -> None:
    """With a name: definition, unit, reasons for missing, source."""
    ran = said("measures", "go_past_time")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.startswith("go_past_time (duration, ms; one value a region of a trial)\n")
    assert MEASURES["go_past_time"].definition in ran.out
    assert set(re.findall(r"^    (\w+) ", ran.out, re.MULTILINE)) == {"skipped", "not_reached"}
    assert re.search(r"^  Source: .*\d{4}", ran.out, re.MULTILINE)


def test_measure_of_two_levels_is_told_for_both(said: Said) -> None:
    """fixation_count is an outcome of a region and one of a trial."""
    ran = said("measures", "fixation_count")
    assert re.findall(r"one value a (region of a trial|trial)\)", ran.out) == [
        "region of a trial",
        "trial",
    ]


def test_misspelt_measure_is_answered_with_the_nearest(said: Said) -> None:
    """Status 2, and the name that was probably meant."""
    ran = said("measures", "first_pas_time")
    assert (ran.status, ran.out) == (2, "")
    assert 'there is no outcome "first_pas_time". Did you mean "first_pass_time"?' in ran.err


def test_name_like_no_measure_gets_no_guess(said: Said) -> None:
    """No guess where nothing is near, but the way to the list."""
    ran = said("measures", "zzz")
    assert (ran.status, ran.out) == (2, "")
    assert "Did you mean" not in ran.err
    assert "trialwright measures lists them all" in ran.err


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_completion_prints_lines_for_the_shell(said: Said, shell: str) -> None:
    """The lines name the command and come alone on stdout."""
    ran = said("completion", shell)
    assert (ran.status, ran.err) == (0, "")
    assert f"_TRIALWRIGHT_COMPLETE={shell}_complete" in ran.out


def test_completion_of_an_unknown_shell_is_refused(said: Said) -> None:
    """Only shells that can be completed."""
    ran = said("completion", "abacus")
    assert (ran.status, ran.out) == (2, "")
    assert "'bash', 'zsh', 'fish'" in ran.err


@pytest.mark.skipif(shutil.which("bash") is None, reason="needs bash")
def test_bash_accepts_the_completion(said: Said) -> None:
    """Bash itself finds no error in the lines."""
    checked = subprocess.run(
        ["bash", "-n"],
        input=said("completion", "bash").out.encode(),
        capture_output=True,
        check=False,
    )
    assert (checked.returncode, checked.stderr) == (0, b"")


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        ("trialwright ", set(COMMANDS)),
        ("trialwright build --wo", {"--workers"}),
        ("trialwright measures go_p", {"go_past_time"}),
    ],
)
def test_completion_completes(words: str, expected: set[str]) -> None:
    """Commands, options and names of outcomes are completed, as bash asks for them."""
    asked = environment(
        _TRIALWRIGHT_COMPLETE="bash_complete",
        COMP_WORDS=words,
        COMP_CWORD=str(len(words.split(" ")) - 1),
    )
    program = "from etl.cli import run; run()"
    done = subprocess.run(
        [sys.executable, "-c", program], env=asked, capture_output=True, check=False, cwd=PROJECT
    )
    offered = {line.partition(",")[2] for line in done.stdout.decode("utf-8").splitlines()}
    assert offered == expected


def test_program_as_a_process_keeps_results_and_the_rest_apart(
    study_file: Path, tmp_path: Path
) -> None:
    """In a pipe: the summary on stdout, nothing on stderr, no codes for colours."""
    ran = run("build", study_file, "--into", tmp_path / "out")
    assert (ran.status, ran.err) == (0, "")
    lines = ran.out.splitlines()
    begin = next(n for n, line in enumerate(lines, start=1) if line.startswith("Written to"))
    end = next(n for n, line in enumerate(lines) if "to look at" in line) + 1
    named = [line.split()[0] for line in lines[begin : end - 2]]
    assert named == [*TABLES, "exclusions"]
    others = re.findall(r"\w+\.\w+", " ".join(lines[end - 2 : end]))
    assert {*others, "exclusions.csv"} == set(BESIDES)
    assert ESCAPE not in ran.out


def test_exit_status_of_the_process_is_2_for_wrong_input(tmp_path: Path) -> None:
    """The shell sees it too."""
    ran = run("build", tmp_path / "nowhere.toml")
    assert (ran.status, ran.out) == (2, "")
    assert "Traceback" not in ran.err


def test_reader_that_closes_the_pipe_is_no_fault() -> None:
    """``trialwright measures | head -1`` ends without a word about a broken pipe."""
    process = subprocess.Popen(
        [sys.executable, "-m", "etl.cli", "measures"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env=environment(),
        cwd=PROJECT,
    )
    assert process.stdout is not None
    process.stdout.close()
    assert process.stderr is not None
    with process.stderr:
        err = process.stderr.read()
    process.wait(timeout=60)
    assert err == b""


@PTY
def test_progress_is_shown_on_a_terminal_and_only_there(tmp_path: Path) -> None:
    """Stages on the terminal, the summary alone in the pipe."""
    ran = on_terminal("build", ORCHARD, "--into", tmp_path / "out", "--workers", "1")
    assert ran.status == 0
    assert "reading logs" in ran.err
    assert "working on readers" in ran.err
    assert "24/24" in ran.err
    assert "reading logs" not in ran.out
    assert ESCAPE not in ran.out
    assert ran.out.splitlines()[-1].startswith("handoff/ is what the statistician gets")


@PTY
def test_quiet_shows_no_progress_on_a_terminal(tmp_path: Path) -> None:
    """--quiet leaves the terminal empty."""
    arguments = "build", ORCHARD, "--into", tmp_path / "out", "--workers", "1", "--quiet"
    assert on_terminal(*arguments) == Ran(0, "", "")


@PTY
def test_no_color_is_respected(tmp_path: Path) -> None:
    """With NO_COLOR there is progress on the terminal, but no code that sets a colour."""
    arguments = "build", ORCHARD, "--into", tmp_path / "out", "--workers", "1"
    colour = re.compile(r"\x1b\[(?:\d+;)*(?:3[0-7]|38;[\d;]+|9[0-7])m")
    assert colour.search(on_terminal(*arguments).err)
    without = on_terminal(*arguments, NO_COLOR="1")
    assert "working on readers" in without.err
    assert not colour.search(without.err)
