"""Logs that cannot be read as files or as text."""

import gzip
from pathlib import Path
from typing import Any

import pytest

from tests.bad_input.small_study import HEADER, SmallStudy, log

P01 = "logs/P01.tsv"
PICTURES = {
    "PNG": b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR",
    "JPEG": b"\xff\xd8\xff\xe0\x00\x10JFIF",
    "GIF": b"GIF89a\x01\x00\x01\x00",
    "BMP": b"BM\x46\x00\x00\x00\x00\x00\x00\x00\x36\x00",
    "TIFF": b"II*\x00\x08\x00\x00\x00",
}


def one_problem(*lines: str) -> str:
    """The whole message about a single problem."""
    return "\n".join([*lines, "1 problem; nothing was written", ""])


def test_pattern_that_finds_no_log(study: SmallStudy) -> None:
    """A pattern without a log names its line in the study file."""
    study.change("study.toml", "logs/*.tsv", "log/*.tsv")
    assert study.refusal() == one_problem(
        'study.toml:2: logs.files: no log has a name like this; found "log/*.tsv", '
        "expected a pattern relative to the study file that finds the logs",
        "    fix: correct the pattern; * stands for any part of a name, ** for any folders",
    )


def test_folders_are_no_logs(study: SmallStudy) -> None:
    """A folder whose name fits the pattern does not count as a log."""
    for name in ("P01", "P02"):
        Path(f"logs/{name}.tsv").unlink()
    Path(P01).mkdir()
    assert study.refusal() == one_problem(
        "warning: logs/P01.tsv: a folder is named like a log, and is no log",
        "    fix: if logs lie in it, add their names to [logs] files",
        'study.toml:2: logs.files: no log has a name like this; found "logs/*.tsv", '
        "expected a pattern relative to the study file that finds the logs",
        "    fix: correct the pattern; * stands for any part of a name, ** for any folders",
    )


def test_unreadable_log(study: SmallStudy, monkeypatch: pytest.MonkeyPatch) -> None:
    """A log that the user may not read is named with the reason."""
    opened = Path.open

    def refuse(path: Path, *how: Any, **options: Any) -> Any:
        if path.name == "P01.tsv":
            raise PermissionError(13, "Permission denied", str(path))
        return opened(path, *how, **options)

    before = study.content()
    monkeypatch.setattr(Path, "open", refuse)
    result = study.run("build", "study.toml")
    monkeypatch.undo()
    assert (result.exit_code, result.stdout) == (2, "")
    assert study.content() == before
    assert result.stderr == one_problem(
        "logs/P01.tsv: the file cannot be read (Permission denied)",
        "    fix: check that you may read the file and that no other program holds it",
    )


@pytest.mark.parametrize(
    "content",
    [b"", b"\n\n", b"\xef\xbb\xbf", b"\xff\xfe"],
    ids=["no byte", "blank lines", "UTF-8 mark only", "UTF-16 mark only"],
)
def test_empty_log(study: SmallStudy, content: bytes) -> None:
    """A file without a visible character is empty."""
    study.write(P01, content)
    assert study.refusal() == one_problem(
        "logs/P01.tsv: the file is empty",
        "    fix: remove it from the folder, or copy it again",
    )


def test_log_of_zero_bytes(study: SmallStudy) -> None:
    """A file that a crash left full of zeros is lost, not empty."""
    study.write(P01, bytes(500))
    assert study.refusal() == one_problem(
        "logs/P01.tsv: the file holds nothing but zero bytes",
        "    fix: copy it again from where it was recorded",
    )


def test_log_with_a_header_only(study: SmallStudy) -> None:
    """A log without a fixation is not passed over."""
    study.write(P01, HEADER + "\n")
    assert study.refusal() == one_problem(
        "logs/P01.tsv:1: the log has a header but no fixation",
        "    fix: remove the file from the folder, or copy it again",
    )


def test_log_in_one_line(study: SmallStudy) -> None:
    """A file that has lost its line ends is recognised, not listed name by name."""
    study.write(P01, log("P01").replace("\n", "\t"))
    assert study.refusal() == one_problem(
        'logs/P01.tsv:1: the whole file is one line; found "50 fields", '
        "expected a header, and below it a line for each row",
        "    fix: export the file again, or copy it again without a change of line ends",
    )


@pytest.mark.parametrize("kind", PICTURES)
def test_picture_among_the_logs(study: SmallStudy, kind: str) -> None:
    """A picture is called one."""
    study.write(P01, PICTURES[kind])
    assert study.refusal() == one_problem(
        f"logs/P01.tsv: this is no text file: it begins like a picture ({kind}); "
        "expected delimited text",
        "    fix: export the table as text; or name another file, or another pattern, in the "
        "study file",
    )


def test_truncated_gzip(study: SmallStudy) -> None:
    """A compressed log that ends too early is not read as far as it goes."""
    study.change("study.toml", "logs/*.tsv", "logs/*.tsv*")
    Path(P01).unlink()
    study.write("logs/P01.tsv.gz", gzip.compress(log("P01").encode("utf-8"))[:-9])
    assert study.refusal() == one_problem(
        "logs/P01.tsv.gz: the gzip file is cut short",
        "    fix: copy the file again from where it was recorded",
    )


def test_damaged_gzip(study: SmallStudy) -> None:
    """A compressed log whose checksum is wrong is damaged."""
    study.change("study.toml", "logs/*.tsv", "logs/*.tsv*")
    Path(P01).unlink()
    packed = bytearray(gzip.compress(log("P01").encode("utf-8")))
    packed[-8] ^= 1
    study.write("logs/P01.tsv.gz", bytes(packed))
    said = study.refusal()
    assert said.startswith("logs/P01.tsv.gz: the gzip file is damaged (CRC check failed")
    assert said.endswith(
        "    fix: copy the file again from where it was recorded\n1 problem; nothing was written\n"
    )


def test_gzip_name_without_gzip(study: SmallStudy) -> None:
    """A plain file under a compressed file's name is doubtful and refused."""
    study.change("study.toml", "logs/*.tsv", "logs/*.tsv*")
    Path(P01).rename("logs/P01.tsv.gz")
    assert study.refusal() == one_problem(
        "logs/P01.tsv.gz: the name ends in .gz but the file is not gzipped",
        "    fix: rename the file, or compress it again",
    )


def test_log_that_is_not_in_the_stated_encoding(study: SmallStudy) -> None:
    """A stated encoding is taken at its word; the line of the first wrong byte is named."""
    study.change("study.toml", "[logs.columns]", 'encoding = "utf-8"\n[logs.columns]')
    study.write(P01, log("P01").replace("plum", "pfläume").encode("cp1252"))
    assert study.refusal() == one_problem(
        'logs/P01.tsv:5: the text is not valid utf-8; found "byte 0xe4"',
        "    fix: state the right encoding in [logs] encoding",
    )


def test_log_in_no_known_encoding(study: SmallStudy) -> None:
    """Bytes that are neither UTF-8 nor Windows-1252 are not guessed at."""
    study.write(P01, log("P01").encode("utf-8").replace(b"plum", b"pl\x81m"))
    assert study.refusal() == one_problem(
        'logs/P01.tsv:5: the text is neither UTF-8 nor Windows-1252; found "byte 0x81"',
        "    fix: save the file as UTF-8, or, if it is a log, state its encoding in "
        "[logs] encoding",
    )


def test_byte_order_mark_against_the_stated_encoding(study: SmallStudy) -> None:
    """A log that says itself how it is encoded is not read otherwise."""
    study.change("study.toml", "[logs.columns]", 'encoding = "cp1252"\n[logs.columns]')
    study.write(P01, log("P01").encode("utf-8-sig"))
    assert study.refusal() == one_problem(
        "logs/P01.tsv:1: the file's byte-order mark contradicts the study file; "
        'found "utf-8", expected cp1252, as [logs] encoding says',
        "    fix: correct [logs] encoding, or remove it: the encoding is then found out file by "
        "file",
    )


def test_zero_byte_in_a_log(study: SmallStudy) -> None:
    """Text holds no zero bytes."""
    study.change(P01, "1000250\t200", "1000250\t2\x0000")
    assert study.refusal() == one_problem(
        "logs/P01.tsv:3: the text holds a zero byte; expected text only",
        "    fix: the file is damaged or is no text: copy or export it again",
    )
