"""Text in more than one encoding is refused, never read with wrong letters."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import RawText, read_text

#: Sentences as cp1252 can write them; none holds what only UTF-8 would write so.
SENTENCES = (
    "Die Bäume blühen, fünf zählte er; „Spaß“ – weiß…",
    "« Le pommier est tombé », dit-il à côté du café\xa0».",
    "O pomar é do irmão da mãe; “maçã”, não pêra.",
    "El año pasado llovió; ¿cuántos árboles? ¡Más!",
    "Träd på ön, äpplen och så vidare",
)


def read(
    path: Path, content: bytes, encoding: str | None = None
) -> tuple[RawText | None, Findings]:
    """The text of a file, and what was found."""
    path.write_bytes(content)
    findings = Findings()
    return read_text(path, path.name, findings, encoding=encoding), findings


@pytest.mark.parametrize("sentence", SENTENCES)
def test_windows_1252_is_still_read(tmp_path: Path, sentence: str) -> None:
    """Text in Windows-1252 alone is read, with a warning, as Python's codec reads it."""
    text, findings = read(tmp_path / "log.tsv", f"item\n{sentence}\n".encode("cp1252"))
    assert text is not None, findings.text()
    assert text.data.decode("utf-8") == f"item\n{sentence}\n"
    assert [finding.problem for finding in findings] == [
        "the text is not UTF-8 and was read as Windows-1252"
    ]


@pytest.mark.parametrize("first", ["utf-8", "cp1252"])
@pytest.mark.parametrize("sentence", SENTENCES)
def test_parts_in_two_encodings_are_refused(tmp_path: Path, sentence: str, first: str) -> None:
    """Where there is as much of both, the first line that is no UTF-8 is named."""
    second = "cp1252" if first == "utf-8" else "utf-8"
    part = f"item\n{sentence}\n"
    text, findings = read(tmp_path / "log.tsv", part.encode(first) + part.encode(second))
    assert text is None
    (finding,) = findings
    assert finding.problem == "the text is UTF-8 in part and in another encoding in part"
    assert finding.line == (4 if first == "utf-8" else 2)


def test_message_of_a_mixture(tmp_path: Path) -> None:
    """It says which byte, where, and what to do."""
    content = "item\nBäume\n".encode() + "Bäume\n".encode("cp1252")
    assert read(tmp_path / "log.tsv", content)[1].text() == (
        "log.tsv:3: the text is UTF-8 in part and in another encoding in part; found "
        '"byte 0xe4, which is no UTF-8", expected one encoding in the whole file: line 2 is UTF-8\n'
        "    fix: save every part as UTF-8 before they are put together; or, if it is a log and is "
        "in one encoding after all, state [logs] encoding\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    ("usual", "odd", "found", "kind"),
    [
        ("utf-8", "cp1252", "byte 0xe4, which is no UTF-8", "UTF-8"),
        ("cp1252", "utf-8", "byte 0xc3, which begins a letter of UTF-8", "in another one"),
    ],
    ids=["one of Windows-1252", "one of UTF-8"],
)
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"], ids=["LF", "CRLF", "CR"])
def test_line_in_the_rarer_encoding_is_named(
    tmp_path: Path, usual: str, odd: str, found: str, kind: str, end: str
) -> None:
    """Of many lines in one encoding and one in another, the one is at fault."""
    lines = ["item", *["Bäume"] * 80]
    content = [(line + end).encode(odd if at == 59 else usual) for at, line in enumerate(lines)]
    text, findings = read(tmp_path / "log.tsv", b"".join(content))
    assert text is None
    (finding,) = findings
    assert (finding.line, finding.found) == (60, found)
    assert finding.expected == (
        f"one encoding in the whole file: 79 lines are {kind}, the first of them line 2"
    )


def test_two_encodings_in_one_line(tmp_path: Path) -> None:
    """Where no line is sound UTF-8, there is nothing to compare with."""
    content = b"item\n" + "Bäume".encode() + b" " + "Bäume\n".encode("cp1252")
    _, findings = read(tmp_path / "log.tsv", content)
    (finding,) = findings
    assert (finding.line, finding.found) == (2, "byte 0xe4, which is no UTF-8")
    assert finding.expected == "one encoding in the whole file"


@pytest.mark.parametrize(
    "letters", ["жук", "γάτα", "日本語", "łąka"], ids=["Cyrillic", "Greek", "Japanese", "Polish"]
)
def test_letters_of_other_scripts_are_known_as_well(tmp_path: Path, letters: str) -> None:
    """A text in UTF-8 of another script with one byte of Windows-1252 is a mixture."""
    content = f"item\n{letters} {letters}\n".encode() + b"pear \xe9 fig\n"
    text, findings = read(tmp_path / "log.tsv", content)
    assert text is None
    assert findings.items[0].line == 3


def test_file_cut_within_a_letter(tmp_path: Path) -> None:
    """UTF-8 that ends in half a letter was cut, and is no mixture."""
    text, findings = read(tmp_path / "log.tsv", "item\nBäume\nBä".encode()[:-1])
    assert text is None
    assert findings.text() == (
        'log.tsv:3: the file ends in the middle of a letter; found "byte 0xc3", expected one '
        "encoding in the whole file\n"
        "    fix: copy the file again from where it was recorded\n"
        "1 problem; nothing was written"
    )


def test_stated_encoding_settles_it(tmp_path: Path) -> None:
    """Where the study states the encoding, the file is read so."""
    written = "item\nIRMÃ»\nMÃE é\n"
    content = written.encode("cp1252")
    assert read(tmp_path / "log.tsv", content)[0] is None
    text, findings = read(tmp_path / "log.tsv", content, "cp1252")
    assert text is not None, findings.text()
    assert text.data.decode("utf-8") == written
    assert findings.lines() == []


def test_stated_encoding_of_a_text_that_is_utf8(tmp_path: Path) -> None:
    """UTF-8 that the study has read in another encoding is warned of."""
    text, findings = read(tmp_path / "log.tsv", "item\nBäume\n".encode(), "cp1252")
    assert text is not None
    assert findings.lines() == [
        (
            "warning: log.tsv: the text is valid UTF-8 and was read as cp1252; expected cp1252, as "
            "[logs] encoding says\n"
            "    fix: check the letters with accents; remove [logs] encoding to have it found out "
            "file by file"
        )
    ]


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.sampled_from(SENTENCES), min_size=1), st.integers(0, 300))
def test_foreign_byte_in_utf8_is_always_refused(
    tmp_path: Path, sentences: list[str], place: int
) -> None:
    """Wherever a byte of Windows-1252 comes into UTF-8 with letters, nothing is read."""
    content = "\n".join(sentences).encode()
    place = min(place, len(content) - 1)
    spoiled = content[:place] + b"\xe9 " + content[place:]
    assert read(tmp_path / "log.tsv", spoiled)[0] is None
