"""The file that holds the key to a study's pseudonyms, and whose they are.

It lies beside the study file and never in an output folder. It is written when everything else is
done, and read back at the next build, so that pseudonyms stay what they are.
"""

from __future__ import annotations

import csv
import io
import secrets
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from etl.cells import csv_text, plain
from etl.errors import DataError, Findings
from etl.export.earlier import record_of
from etl.export.run_record import KEY_KNOWN_BY
from etl.pseudonyms import FILE_KINDS, KEY_BYTES, Pseudonyms, is_reader, signs_of
from etl.session.pseudonym_owner import keep_to_owner, write_for_owner

if TYPE_CHECKING:
    from etl.study import Study

COLUMNS = ("kind", "name", "stands_for")
#: What a row of the file is about.
_KEY, _READER, _END = "key", "reader", "end"
_CHECK_SIGNS = 8
#: By 80 bits no two keys are taken for one; they tell nothing of the key, which has 256.
_KNOWN_BY_SIGNS = 16
_WAY_OUT = (
    "put the file back as the program wrote it; to give everybody a new pseudonym, move it away"
)


@dataclass(frozen=True, slots=True)
class KeyFile:
    """A study's pseudonyms, and the file in which they are kept.

    Attributes
    ----------
    path : Path
        The file.
    stored : bytes or None
        What it holds; None where there is none yet.
    pseudonyms : Pseudonyms
        Those it holds, ready to give more.
    """

    path: Path
    stored: bytes | None
    pseudonyms: Pseudonyms


def key_path(study: Study) -> Path:
    """Where the key to a study's pseudonyms is kept.

    Parameters
    ----------
    study : Study
        As loaded.

    Returns
    -------
    Path
        Beside the study file.
    """
    return study.path.with_name(f"{study.path.stem}_pseudonyms.csv")


def is_key_file(study: Study, path: Path) -> bool:
    """Whether a file is the key of a study, and so no log of it.

    Parameters
    ----------
    study : Study
        As loaded.
    path : Path
        A file that lies where logs may lie.

    Returns
    -------
    bool
    """
    own = key_path(study)
    if path.absolute() != own:
        return False
    begins = csv_text([COLUMNS]).encode()
    return study.output.pseudonyms or own.read_bytes()[: len(begins)] == begins


def refuse_key_inside(study: Study, target: Path) -> None:
    """Refuse an output folder that would hold the key to the study's pseudonyms.

    Parameters
    ----------
    study : Study
        As loaded.
    target : Path
        The output folder.

    Raises
    ------
    DataError
        If it would.
    """
    wrong = Findings()
    if study.output.pseudonyms:
        _refuse_inside(key_path(study), target, wrong)
    if wrong.failed:
        raise DataError(wrong)


def open_key(
    study: Study, findings: Findings, *, target: Path | None = None, needed: bool = False
) -> KeyFile | None:
    """The pseudonyms of a study that asks for them.

    Parameters
    ----------
    study : Study
        As loaded.
    findings : Findings
        Where it is recorded that others may read the file.
    target : Path, optional
        The output folder of a build. Only for a build is a new key
        made, and a permission narrowed; without one, pseudonyms that nobody knows yet are such as
        nobody will see.
    needed : bool
        Whether the file must be there.

    Returns
    -------
    KeyFile or None
        None where the study asks for no pseudonyms.

    Raises
    ------
    DataError
        If the file is damaged or cannot be read; or is needed and not there.
    """
    if not study.output.pseudonyms:
        return None
    path, wrong = key_path(study), Findings()
    stored = _stored(path, wrong)
    if stored is None and needed and not wrong.failed:
        wrong.error(
            "there is no key to the pseudonyms of this study yet",
            path=path.name,
            expected="the file that a build writes beside the study file",
            fix="build the study first, or put the file back",
        )
    if wrong.failed:
        raise DataError(wrong)
    if stored is None:
        key = bytes(KEY_BYTES) if target is None else secrets.token_bytes(KEY_BYTES)
        _compare_with_last(path.name, target, key, findings)
        return KeyFile(path, None, Pseudonyms(key, study.folder))
    pseudonyms = _read(stored, path.name, study.folder, wrong)
    if pseudonyms is None:
        raise DataError(wrong)
    _compare_with_last(path.name, target, pseudonyms.key, findings)
    keep_to_owner(path, findings, narrow=target is not None)
    return KeyFile(path, stored, pseudonyms)


def known_by(key: bytes) -> str:
    """By what a key is known again in the record of a build, which may be handed on.

    Parameters
    ----------
    key : bytes
        The secret.

    Returns
    -------
    str
        Signs of a keyed digest of nothing.

    Examples
    --------
    >>> known_by(b"k" * 32)
    '9K906DXPZVGHCFEY'
    """
    return signs_of(key, "record", "", _KNOWN_BY_SIGNS)


def _compare_with_last(shown: str, target: Path | None, key: bytes, findings: Findings) -> None:
    """Warn where the build that is to be replaced had other pseudonyms.

    It is no error: to move the key away is how one gives everybody a new pseudonym.
    """
    record = None if target is None else record_of(target)
    last = None if record is None else record.get(KEY_KNOWN_BY)
    if last is not None and last != known_by(key):
        findings.warning(
            "the last build in the output folder had another key, so every reader and log has "
            "another pseudonym now",
            path=shown,
            expected="the key of the last build",
            fix="if the key was moved, renamed or lost, put it back under this name and build "
            "again before you hand tables on: they do not go with those handed on before",
        )


def _refuse_inside(path: Path, target: Path, findings: Findings) -> None:
    """Record an output folder in which the key would lie: it may be handed on as a whole."""
    if path.resolve().is_relative_to(target.resolve()):
        findings.error(
            "the key to the pseudonyms would lie in the output folder",
            path=str(target),
            expected="an output folder that does not hold the study file",
            fix="name another folder, by [output] folder or --into",
        )


def _stored(path: Path, findings: Findings) -> bytes | None:
    """What the file holds; None where there is none, or it cannot be read."""
    try:
        return path.read_bytes()
    except FileNotFoundError:
        return None
    except OSError as why:
        findings.error(
            f"the key to the pseudonyms cannot be read ({why.strerror or type(why).__name__})",
            path=path.name,
            fix="see that it is a file which you may read",
        )
        return None


def _read(stored: bytes, shown: str, folder: Path, findings: Findings) -> Pseudonyms | None:
    """The pseudonyms in a file; None where anything in it is not as it was written."""
    try:
        text = stored.decode("utf-8-sig")
    except UnicodeDecodeError as why:
        _tell(shown, stored.count(b"\n", 0, why.start) + 1, "this is no text in UTF-8", findings)
        return None
    rows: list[tuple[int, list[str]]] = []
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    line = 1
    try:
        for row in reader:
            rows.append((line, [plain(cell) for cell in row]))
            line = reader.line_num + 1
    except csv.Error:
        _tell(shown, line, "this row is damaged", findings)
        return None
    pseudonyms = _begun(rows, shown, folder, findings)
    if pseudonyms is None:
        return None
    before = findings.count("error")
    for line, row in rows[2:-1]:
        if not _holds(row, pseudonyms):
            _tell(shown, line, "this row is not as it was written", findings)
    line, last = rows[-1]
    if last != [_END, str(len(rows) - 3), ""]:
        _tell(shown, line, "rows were added or are missing, or the last one is", findings)
    return pseudonyms if findings.count("error") == before else None


def _begun(
    rows: Sequence[tuple[int, list[str]]], shown: str, folder: Path, findings: Findings
) -> Pseudonyms | None:
    """What the first rows hold: the header and the key."""
    if not rows or rows[0][1] != list(COLUMNS):
        _tell(shown, 1, "the header is not as it was written", findings)
        return None
    line, row = rows[1] if len(rows) > 2 else (2, [])
    try:
        kind, check, spelled = row
        key = bytes.fromhex(spelled)
    except ValueError:
        kind, check, key = "", "", b""
    if kind != _KEY or len(key) != KEY_BYTES or check != _check(key):
        _tell(shown, line, "the key is not as it was written", findings)
        return None
    return Pseudonyms(key, folder)


def _holds(row: list[str], pseudonyms: Pseudonyms) -> bool:
    """Whether a row gives the name that the key gives; it is learnt then."""
    if len(row) != len(COLUMNS):
        return False
    kind, name, original = row
    if kind == _READER:
        return pseudonyms.of_reader(original) == name
    return any(kind == one and pseudonyms.of_file(original, one) == name for one in FILE_KINDS)


def _check(key: bytes) -> str:
    """By what an edited key is known."""
    return signs_of(key, "key", "", _CHECK_SIGNS)


def _tell(shown: str, line: int, problem: str, findings: Findings) -> None:
    """Record what is wrong with the file. Nothing in it is repeated: it is a secret."""
    findings.error(f"in the key to the pseudonyms, {problem}", path=shown, line=line, fix=_WAY_OUT)


def save_key(held: KeyFile) -> None:
    """Write the key and whose the pseudonyms are; the file is there as a whole or as it was.

    Parameters
    ----------
    held : KeyFile
        From :func:`open_key`, with all that was learnt since.

    Raises
    ------
    DataError
        If the file cannot be written, or somebody else has written it meanwhile.
    """
    text = _spelled(held.pseudonyms).encode("utf-8")
    findings = Findings()
    try:
        now = held.path.read_bytes() if held.path.exists() else None
        if now != held.stored:
            findings.error(
                "another build has written the key to the pseudonyms meanwhile",
                path=held.path.name,
                fix="build again",
            )
        elif now != text:
            write_for_owner(held.path.resolve(), text)
    except PermissionError as why:
        findings.error(
            f"the key to the pseudonyms cannot be written ({why.strerror})",
            path=held.path.name,
            expected="a file of your own, in a folder in which you may write: readers or logs were "
            "added",
            fix="let the owner of the file build the study, or see that you may write in its "
            "folder, and close the key in other programs",
        )
    except OSError as why:
        findings.error(
            f"the key to the pseudonyms cannot be written ({why.strerror or type(why).__name__})",
            path=held.path.name,
            fix="see that you may write in the folder of the study file, and close the key in "
            "other programs",
        )
    if findings.failed:
        raise DataError(findings)


def _spelled(pseudonyms: Pseudonyms) -> str:
    """The file as text: header, key, readers, files, and how many rows these are."""
    rows = [
        *((_READER, name, text) for name, text in pseudonyms.readers().items()),
        *((name.partition("-")[0], name, text) for name, text in pseudonyms.files().items()),
    ]
    # By what they stand for, so that a reader is found quickly; readers come first.
    rows.sort(key=lambda row: (not is_reader(row[1]), row[2], row[1]))
    key = (_KEY, _check(pseudonyms.key), pseudonyms.key.hex())
    return csv_text([COLUMNS, key, *rows, (_END, str(len(rows)), "")])
