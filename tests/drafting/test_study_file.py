"""The study file that a draft writes: sound TOML whatever the logs hold, and open questions."""

from __future__ import annotations

import csv
import io
import re
import tomllib
import unicodedata
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import etl
from etl.drafting.toml_text import StudyText, value_text
from tests.drafting.answering import answered
from tests.drafting.small_logs import CELLS, put, reading, write_readers

OPEN = "a question of the draft is still open"
PLAIN = {
    "reader": "participant",
    "trial": "trial",
    "start": "onset",
    "dur": "duration",
    "gx": "x",
    "gy": "y",
}
ROWS = reading(trials=4)
#: Names with every sign that means something in TOML, in CSV or in a remark.
HEADERS = st.text(
    st.one_of(
        st.sampled_from("'\"\\#=[]{}.,;\n\r\t?$ x"),
        st.characters(exclude_categories=("Cs", "Cc")),
        st.sampled_from("\x01\x7f\x85\u2028\u200b"),
    ),
    min_size=1,
    max_size=12,
)
SLOW = settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)


def open_keys(path: Path) -> set[str]:
    """The problems of a study file, each once; it must have some."""
    with pytest.raises(etl.StudyError) as wrong:
        etl.load_study(path)
    return {finding.problem for finding in wrong.value.findings}


@given(
    headers=st.lists(
        HEADERS.filter(lambda name: name.strip()),
        min_size=len(PLAIN),
        max_size=len(PLAIN),
        unique_by=lambda name: unicodedata.normalize("NFC", name.strip()),
    )
)
@SLOW
def test_any_headers_make_a_sound_file(
    headers: list[str], tmp_path_factory: pytest.TempPathFactory
) -> None:
    """Quotes, backslashes, signs of TOML and letters of any script: only questions are open."""
    folder = tmp_path_factory.mktemp("odd")
    written = io.StringIO()
    out = csv.writer(written, quoting=csv.QUOTE_ALL, lineterminator="\n")
    out.writerow(headers)
    out.writerows([CELLS[name](row) for name in PLAIN.values()] for row in ROWS)
    (folder / "P01.csv").write_bytes(written.getvalue().encode("utf-8"))
    try:
        etl.draft([folder / "P01.csv"], into=folder / "study.toml")
    except etl.DataError as wrong:
        assert wrong.findings.failed  # noqa: PT017 - a header that cannot be read is refused
        assert not (folder / "study.toml").exists()
        return
    assert open_keys(folder / "study.toml") == {OPEN}


@given(words=st.lists(HEADERS, min_size=3, max_size=3))
@SLOW
def test_any_lines_make_a_sound_file(
    words: list[str], tmp_path_factory: pytest.TempPathFactory
) -> None:
    """Lines of events with any signs in them: the patterns are sound, only questions are open."""
    folder = tmp_path_factory.mktemp("odd")
    begin, fixation, other = (" ".join(word.split()) or "w" for word in words)
    lines = ["reader: P01"]
    for row in ROWS:
        if row.number == 1:
            lines += [f"trial {row.trial} starts {begin}"]
        numbers = f"{row.onset_ms} {row.duration_ms} {row.x_px} {row.y_px}"
        lines += [f"{fixation} fix {numbers}", f"{other} {row.number} {other}"]
    put(folder / "P01.txt", "\n".join(lines) + "\n")
    try:
        etl.draft([folder / "P01.txt"], into=folder / "study.toml")
    except etl.DataError as wrong:
        assert wrong.findings.failed  # noqa: PT017
        return
    assert open_keys(folder / "study.toml") == {OPEN}


@given(text=st.text(max_size=20), key=st.text(min_size=1, max_size=20))
def test_texts_and_keys_come_back_as_they_were(text: str, key: str) -> None:
    """What is written as TOML is read as the same by the standard library."""
    if any(0xD800 <= ord(sign) < 0xE000 for sign in text + key):
        return
    out = StudyText()
    out.guess(key, [text, {key: text}], text)
    assert tomllib.loads(out.text()) == {key: [text, {key: text}]}


@pytest.mark.parametrize(
    ("value", "written"),
    [
        (True, "true"),
        (14.5, "14.5"),
        (r"^\d+$", r"'^\d+$'"),
        ("it's", '"it\'s"'),
        (r"it's \d", r'"it' + "'" + r's \\d"'),
        ("a\u2028b\x7f", r'"a\u2028b\u007F"'),
        ({"a b": ["x"]}, '{ "a b" = ["x"] }'),
    ],
)
def test_values_are_written_as_a_person_would(value: object, written: str) -> None:
    """Patterns stand in single quotes, where a backslash is only itself."""
    assert value_text(value) == written  # type: ignore[arg-type]


@pytest.mark.parametrize(
    "name", ['it\'s "1" [x] #2', "Überläufer läßt", "P 1", "a=b", "100%", "{x}"]
)
def test_any_name_of_a_log_is_found_again(name: str, tmp_path: Path) -> None:
    """Spaces, quotes, brackets and letters with accents in names of logs and folders."""
    write_readers(tmp_path / name, PLAIN)
    etl.draft([tmp_path / name], into=tmp_path / "study.toml")
    assert open_keys(tmp_path / "study.toml") == {OPEN}
    logs = tomllib.loads((tmp_path / "study.toml").read_text(encoding="utf-8"))["logs"]
    assert len(list(tmp_path.glob(logs["files"][0]))) == 3


def test_every_question_names_its_line(tmp_path: Path) -> None:
    """The line that is told for a question is that of its key, with the question above it."""
    columns = {name: cell for name, cell in PLAIN.items() if name not in ("reader", "dur")}
    write_readers(tmp_path, columns, readers=1)
    drafted = etl.draft(tmp_path)
    lines = drafted.text.split("\n")
    assert [question.key for question in drafted.questions] == [
        *("logs.columns.participant", "logs.columns.duration", "regions.file", "regions.kind")
    ]
    for question in drafted.questions:
        assert lines[question.line - 1] == f'{question.key.rpartition(".")[2]} = "?"'
        above = lines[question.line - 2]
        assert above.startswith(("# question: ", "#   "))


def test_every_guess_has_its_evidence_above_it(tmp_path: Path) -> None:
    """No key of [logs] stands without a remark that says why it was written so."""
    drafted = etl.draft(write_readers(tmp_path, PLAIN))
    logs = drafted.text[drafted.text.index("[logs]") : drafted.text.index("# ---- Facts")]
    lines = logs.split("\n")
    keys = [place for place, line in enumerate(lines) if " = " in line and line[0] != "#"]
    assert len(keys) == drafted.guesses >= 10
    assert all(lines[place - 1].startswith(("# guess: ", "#   ")) for place in keys)


def test_all_examples_together_are_sound_keys(tmp_path: Path) -> None:
    """Whoever removes every # in front of an example has keys that a study file knows."""
    drafted = etl.draft(write_readers(tmp_path, PLAIN))
    every, examples = re.subn(r"^# (\[|\w+ = )", r"\1", drafted.text, flags=re.MULTILINE)
    assert examples > 20
    answers = {"regions.file": '"regions.csv"', "regions.kind": '"marked_text"'}
    # Of these two each is for another kind of text.
    study = put(tmp_path / "study.toml", answered(every, {**answers, "regions.vertical": None}))
    assert etl.load_study(study).screening is not None


def test_nothing_is_written_over(tmp_path: Path) -> None:
    """A study file that is there stays as it is, and the message says so."""
    write_readers(tmp_path, PLAIN)
    kept = put(tmp_path / "study.toml", "title = 'mine'\n")
    with pytest.raises(etl.DataError, match="a draft never replaces one"):
        etl.draft(tmp_path, into=kept)
    assert kept.read_text(encoding="utf-8") == "title = 'mine'\n"


def test_draft_in_memory_writes_nothing(tmp_path: Path) -> None:
    """Without a place to go the text is handed over, and that is all."""
    write_readers(tmp_path, PLAIN)
    before = sorted(tmp_path.iterdir())
    assert etl.draft(tmp_path).path is None
    assert sorted(tmp_path.iterdir()) == before
