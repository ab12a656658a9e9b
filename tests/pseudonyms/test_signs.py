"""The signs of pseudonyms come from HMAC-SHA256 and tell nothing; ids are found in texts."""

from __future__ import annotations

import hashlib
import pickle
import unicodedata
from pathlib import Path

import numpy as np
import pyarrow as pa
import pytest

from etl import pseudonyms
from etl.files import Coded
from etl.pseudonyms import SIGNS, Pseudonyms, is_distinctive, is_reader, signs_of
from etl.session.work import noted

KEY = bytes(range(32))


def naive_hmac(key: bytes, message: bytes) -> bytes:
    """HMAC-SHA256 as RFC 2104, section 2, writes it: H(K xor opad, H(K xor ipad, text))."""
    if len(key) > 64:
        key = hashlib.sha256(key).digest()
    key = key.ljust(64, b"\0")
    inner = hashlib.sha256(bytes(k ^ 0x36 for k in key) + message).digest()
    return hashlib.sha256(bytes(k ^ 0x5C for k in key) + inner).digest()


@pytest.mark.parametrize(
    ("key", "message", "expected"),
    [
        pytest.param(
            b"\x0b" * 20,
            b"Hi There",
            "b0344c61d8db38535ca8afceaf0bf12b881dc200c9833da726e9376c2e32cff7",
            id="case 1",
        ),
        pytest.param(
            b"Jefe",
            b"what do ya want for nothing?",
            "5bdcc146bf60754e6a042426089575c75a003f089d2739839dec58b964ec3843",
            id="case 2",
        ),
        pytest.param(
            b"\xaa" * 20,
            b"\xdd" * 50,
            "773ea91e36800e46854db8ebd09181a72959098b3ef8c122d9635514ced565fe",
            id="case 3",
        ),
    ],
)
def test_naive_hmac_gives_the_published_digests(key: bytes, message: bytes, expected: str) -> None:
    """Test cases 1 to 3 of RFC 4231 (doi:10.17487/RFC4231), section 4, from memory."""
    assert naive_hmac(key, message).hex() == expected


def test_signs_are_the_first_bits_of_the_digest() -> None:
    """Five bits a sign, from the first bit on; held against HMAC written out."""
    digest = naive_hmac(KEY, "reader\0Óskar".encode())
    bits = "".join(f"{byte:08b}" for byte in digest)
    expected = "".join(SIGNS[int(bits[at : at + 5], 2)] for at in range(0, 35, 5))
    assert signs_of(KEY, "reader", "Óskar", 7) == expected
    assert Pseudonyms(KEY).of_reader("Óskar") == "R" + expected


def test_signs_have_no_look_alikes() -> None:
    """32 digits and capital letters, none of them I, L, O or U, and no two the same."""
    assert len(set(SIGNS)) == 32
    assert set(SIGNS) == set("0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZ") - set("ILOU")


def test_another_key_gives_another_pseudonym() -> None:
    """Nothing can be told without the key; a reader and a file of one name differ."""
    one, other = Pseudonyms(KEY), Pseudonyms(bytes(32))
    assert one.of_reader("P01") != other.of_reader("P01")
    assert one.of_file("P01").removeprefix("log-")[:7] != one.of_reader("P01")[1:]


def test_forms_of_one_letter_give_one_pseudonym() -> None:
    """An accent that is composed or not (Unicode NFC, NFD) makes no other reader."""
    held = Pseudonyms(KEY)
    assert held.of_reader(unicodedata.normalize("NFD", "Óskar")) == held.of_reader("Óskar")


def test_pseudonyms_of_many_readers_are_text_and_differ() -> None:
    """A thousand readers have a thousand pseudonyms, none of which is a number."""
    held = Pseudonyms(KEY)
    given = {held.of_reader(str(number)) for number in range(1000)}
    assert len(given) == 1000
    assert all(is_reader(name) and name[0] == "R" for name in given)
    assert held.clashes == {}


def test_two_readers_of_one_pseudonym_are_found(monkeypatch: pytest.MonkeyPatch) -> None:
    """With pseudonyms of one sign, two of 40 readers must share one."""
    monkeypatch.setattr(pseudonyms, "READER_SIGNS", 1)
    held = Pseudonyms(KEY)
    given = [held.of_reader(str(number)) for number in range(40)]
    assert set(held.clashes) == {name for name in given if given.count(name) > 1}


def test_copy_of_a_worker_tells_what_it_learnt() -> None:
    """What a pickled copy gives, the original takes over."""
    held = Pseudonyms(KEY, Path("study"))
    held.of_reader("P01")
    copy = pickle.loads(pickle.dumps(held))  # noqa: S301  (our own bytes)
    with noted(copy) as given:
        name = copy.of_reader("P02")
        known = copy.of_reader("P01")
    assert given == {name: "P02", known: "P01"}
    held.learn(given)
    assert held.originals == {held.of_reader("P01"): "P01", name: "P02"}


def test_file_has_one_name_however_it_is_spelled(tmp_path: Path) -> None:
    """A file of the study's folder, named from there, by its whole path, or by a detour."""
    held = Pseudonyms(KEY, tmp_path)
    expected = held.of_file("logs/P01.tsv")
    assert held.of_file(tmp_path / "logs" / "P01.tsv") == expected
    assert held.of_file("logs/../logs/P01.tsv") == expected
    assert held.originals[expected] == "logs/P01.tsv"


def test_column_keeps_what_is_missing() -> None:
    """Every id of a column has its pseudonym; a missing one stays missing."""
    held = Pseudonyms(KEY)
    column = held.readers_of(Coded.of(pa.array(["b", "", "a", "b"]), {""}))
    b, a = held.of_reader("b"), held.of_reader("a")
    assert [column.text(row) for row in range(4)] == [b, "", a, b]


def test_id_and_its_pseudonym_in_one_column_are_one_reader() -> None:
    """A table may name a reader by either."""
    held = Pseudonyms(KEY)
    b = held.of_reader("b")
    column = held.readers_of(Coded.of(pa.array(["b", b, "c"]), {""}), either=True)
    assert column.codes.tolist() == [0, 0, 1]
    assert column.codes.dtype == np.int32


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("Quillfeather07 slept", "{} slept"),
        ("logs_quillfeather07.csv", "logs_{}.csv"),
        ("QUILLFEATHER07", "{}"),
        ("Quillfeather071", None),
        ("xQuillfeather07", "{}"),
        ("likeQUILLFEATHER07x is", "{} is"),
        ("Quillfeather", None),
    ],
)
def test_distinctive_id_is_hidden_as_a_word_of_its_own(text: str, found: str | None) -> None:
    """Letter case and letters around it do not matter; another number is another id."""
    held = Pseudonyms(KEY)
    name = held.of_reader("Quillfeather07")
    assert held.hidden(text) == (text if found is None else found.format(name))


@pytest.mark.parametrize(
    ("reader", "text", "in_values", "in_free_text"),
    [
        pytest.param("Quimby", "QuimbyA", True, True, id="six letters, one behind"),
        pytest.param("Quimby", "likeQUIMBYx", True, True, id="six letters, other case"),
        pytest.param("Quimby", "Quimby2", True, True, id="six letters, a digit behind"),
        pytest.param("Tina", "destination", False, True, id="four letters in a word"),
        pytest.param("S101", "xs101y", True, True, id="four signs with digits"),
        pytest.param("S101", "S1012", False, False, id="another number"),
        pytest.param("P01", "P01a", False, True, id="three signs"),
        pytest.param("P7", "P7a", False, False, id="two signs"),
        pytest.param("48211", "R48211", False, True, id="five digits behind a letter"),
        pytest.param("48211", "148211", False, False, id="part of a number"),
        pytest.param("482", "R482", False, False, id="three digits"),
    ],
)
def test_word_that_holds_an_id_is_replaced_as_a_whole(
    reader: str, text: str, in_values: bool, in_free_text: bool
) -> None:
    """In values by long ids with a letter only, in free text by shorter ones and numbers too."""
    held = Pseudonyms(KEY)
    name = held.of_reader(reader)
    assert held.hidden(f"a {text}.") == f"a {name if in_values else text}."
    assert held.hidden_in_free_text(f"a {text}.") == f"a {name if in_free_text else text}."


@pytest.mark.parametrize(
    ("log", "text"),
    [
        ("logs/QuimbyB.tsv", "see logs/QuimbyB.tsv"),
        ("logs/subj7xyz.tsv", "see SUBJ7xyz.tsv"),
        ("logs/20240501_Zorblax.tsv.gz", "see 20240501_Zorblax"),
        ("7.tsv", "see 7.tsv"),
    ],
)
def test_free_text_loses_names_of_logs(log: str, text: str) -> None:
    """With folder and ending, or without; a number is too common to be one without."""
    held = Pseudonyms(KEY)
    name = held.of_file(log)
    assert held.hidden_in_free_text(text) == f"see {name}"
    assert held.hidden_in_free_text("see 7") == "see 7"


def test_log_that_is_called_like_its_reader_is_told_as_the_reader() -> None:
    """A title that names a reader tells of the reader."""
    held = Pseudonyms(KEY)
    held.of_file("logs/Quimby.tsv")
    name = held.of_reader("Quimby")
    assert held.hidden_in_free_text("How Quimby read") == f"How {name} read"


def test_pseudonym_in_which_an_id_is_by_chance_stays() -> None:
    """The second time a text is looked at nothing of a pseudonym is replaced."""
    held = Pseudonyms(KEY)
    name = held.of_reader("Quimby")
    held.of_reader(name[2:7])
    assert held.hidden_in_free_text(name) == held.hidden(name) == name


def test_short_id_is_hidden_only_as_it_is_written() -> None:
    """Somebody's initials are not every little word."""
    held = Pseudonyms(KEY)
    name = held.of_reader("NO")
    assert held.hidden("NO, no") == f"{name}, no"
    assert held.hidden_in_sentence("NO trial, no log") == "NO trial, no log"


@pytest.mark.parametrize(
    ("text", "expected"),
    [("P1", True), ("7", False), ("P", False), ("123", False), ("1234", True), ("Ó1", True)],
)
def test_ids_that_may_be_anything_are_not_looked_for(text: str, expected: bool) -> None:
    """Distinctive are two characters or more with a letter, and numbers of four digits or more."""
    assert is_distinctive(text) is expected


def test_longer_id_is_found_before_one_that_begins_it() -> None:
    """Anna and Anna-2 are two readers."""
    held = Pseudonyms(KEY)
    short, long = held.of_reader("Anna"), held.of_reader("Anna-2")
    assert held.hidden("Anna-2 and Anna") == f"{long} and {short}"


def test_letter_that_folds_to_two_is_hidden_too() -> None:
    """A dotted capital I is found by an i, though its lower case is of two letters."""
    held = Pseudonyms(KEY)
    name = held.of_reader("ilse1")
    assert held.hidden("by İlse1") == f"by {name}"
