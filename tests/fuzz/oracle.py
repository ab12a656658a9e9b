"""What a damaged study comes to, and whether that is right."""

from __future__ import annotations

import os
import re
import shutil
import signal
import tempfile
import time
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from random import Random
from typing import Literal

import etl
from tests.fuzz.damage import DAMAGES, Damage
from tests.fuzz.kinds import KINDS
from tests.fuzz.logs import Files, Link
from tests.simulator.dialects.recorded import RecordedStudy, recorded_study

Verdict = Literal["refused", "mended", "harmless", "told", "does not apply", "fault"]
#: No damaged file of this size may keep a build busy for longer: it takes some 30 ms undamaged,
#: and the longest file of the corpus (10 MB) well under a second.
LONGEST_S = 20.0
#: The account of what became of the lines of every log.
ACCOUNT = "log_accounts.csv"


@dataclass(frozen=True, slots=True)
class Sound:
    """A study before the damage: its files, and what its build gives and notices."""

    files: Files
    outcomes: bytes
    account: bytes
    noticed: frozenset[str]


@dataclass(frozen=True, slots=True)
class Outcome:
    """What became of a damaged study, and why."""

    verdict: Verdict
    why: str = ""


@dataclass(frozen=True, slots=True)
class Judgement:
    """What became of a damaged study; ``why`` says what is wrong, or how it was refused."""

    kind: str
    damage: str
    seed: int
    verdict: Verdict
    why: str = ""
    seconds: float = 0.0

    def __str__(self) -> str:
        return f"{self.kind} / {self.damage} / seed {self.seed}: {self.verdict}: {self.why}"


class SlowError(Exception):
    """A build took longer than any may."""


@cache
def small_study() -> RecordedStudy:
    """The study that is written in every kind of log."""
    return recorded_study(3, 3, seed=7)


@cache
def sound_study(kind: str) -> Sound:
    """The undamaged study in one kind of log."""
    with tempfile.TemporaryDirectory(prefix="fuzz-") as place:
        folder = Path(place)
        study = KINDS[kind].write(small_study(), folder)
        files = content(folder)
        result = etl.build(etl.load_study(study))
        return Sound(
            files,
            (folder / "out" / "outcomes.parquet").read_bytes(),
            (folder / "out" / ACCOUNT).read_bytes(),
            noticed_by(result, folder),
        )


def noticed_by(result: etl.Result, folder: Path) -> frozenset[str]:
    """What a build warns of and notes, wherever it lay."""
    return frozenset(
        finding.text().replace(f"{folder.as_posix()}/", "") for finding in result.findings
    )


def content(folder: Path) -> Files:
    """Every file below a folder, and every folder without files."""
    found: Files = {}
    for path in sorted(folder.rglob("*")):
        name = path.relative_to(folder).as_posix()
        if path.is_dir():
            if not any(path.iterdir()):
                found[name] = None
        elif path.is_file() and os.access(path, os.R_OK):
            found[name] = path.read_bytes()
    return found


def put(folder: Path, files: Files) -> None:
    """Write files into a folder."""
    for name, own in files.items():
        path = folder / name
        if own is None:
            path.mkdir(parents=True)
            continue
        path.parent.mkdir(parents=True, exist_ok=True)
        if isinstance(own, Link):
            path.symlink_to(own.target)
        else:
            path.write_bytes(own)


def judge(kind: str, damage: str, seed: int) -> Judgement:
    """Damage a study, build it, and say whether what came of it is right.

    Parameters
    ----------
    kind : str
        A name in ``KINDS``.
    damage : str
        A name in ``DAMAGES``.
    seed : int
        Of the generator that chooses the place of the damage.

    Returns
    -------
    Judgement
    """
    own = DAMAGES[damage]
    sound = sound_study(kind)
    rng = Random(f"{kind}/{damage}/{seed}")
    files = own.spoil(KINDS[kind], dict(sound.files), rng)
    if files is None or files == sound.files:
        return Judgement(kind, damage, seed, "does not apply")
    started = time.perf_counter()
    built = build_damaged(files, own, sound)
    seconds = time.perf_counter() - started
    return Judgement(kind, damage, seed, built.verdict, built.why, seconds)


def build_damaged(files: Files, damage: Damage, sound: Sound) -> Outcome:
    """Build a damaged study, and say whether what came of it is right.

    Parameters
    ----------
    files : dict
        The damaged study.
    damage : Damage
        What was done to it.
    sound : Sound
        The study before.

    Returns
    -------
    Outcome
    """
    folder = Path(tempfile.mkdtemp(prefix="fuzz-"))
    try:
        try:
            put(folder, files)
        except OSError as why:
            # Not every system lets everybody make links, or has such names.
            return Outcome("does not apply", str(why))
        return Outcome(*_judged(folder, damage, sound))
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _judged(folder: Path, damage: Damage, sound: Sound) -> tuple[Verdict, str]:
    """Build a damaged study and judge what came of it."""
    before = content(folder)
    try:
        with warnings.catch_warnings(), _no_longer_than(LONGEST_S):
            warnings.simplefilter("error")
            result = etl.build(etl.load_study(folder / "study.toml"))
    except etl.InputError as refusal:
        if content(folder) != before:
            return "fault", "a refused build has written something"
        return _refused(refusal, damage)
    except Exception as fault:
        return "fault", f"{type(fault).__name__}: {fault}"
    out = folder / "out"
    new = sorted(noticed_by(result, folder) - sound.noticed)
    if damage.told_by and any(re.search(damage.told_by, one) for one in new):
        return "told", damage.told_by
    if (out / "outcomes.parquet").read_bytes() != sound.outcomes:
        return "fault", f"the outcomes differ; noticed: {'; '.join(new)[:300] or 'nothing'}"
    if damage.owes == "nothing":
        return "harmless", ""
    if (out / ACCOUNT).read_bytes() == sound.account:
        return "fault", "the outcomes are right, but the account of logs says nothing"
    return "mended", ""


def _refused(refusal: etl.InputError, damage: Damage) -> tuple[Verdict, str]:
    """Whether a refusal says where."""
    errors = refusal.findings.of("error")
    if not errors:
        return "fault", "refused without a finding"
    for finding in errors:
        if not finding.path:
            return "fault", f"refused without naming a file: {finding.text()}"
    if damage.at_line and not any(finding.line for finding in errors):
        return "fault", f"refused without naming a line: {errors[0].text()}"
    return "refused", errors[0].text()


@contextmanager
def _no_longer_than(seconds: float) -> Iterator[None]:
    """Break off what takes longer, where the system can; elsewhere say so when it is over."""
    if not hasattr(signal, "setitimer"):
        started = time.perf_counter()
        yield
        if time.perf_counter() - started > seconds:
            raise SlowError(f"took longer than {seconds:g} s")
        return

    def ring(_number: int, _frame: object) -> None:
        raise SlowError(f"took longer than {seconds:g} s")

    before = signal.signal(signal.SIGALRM, ring)
    signal.setitimer(signal.ITIMER_REAL, seconds)
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, before)
