"""The fuzz corpus: damaged logs are refused or mended and told, and make no silent difference.

The long run is ``python -m tests.fuzz --cases 5000``.
"""

from __future__ import annotations

from random import Random

import pytest

from tests.fuzz.cases import CORPUS, some_kinds
from tests.fuzz.damage import Damage
from tests.fuzz.kinds import KINDS
from tests.fuzz.not_told import NOT_TOLD
from tests.fuzz.oracle import Outcome, build_damaged, judge, sound_study

#: The fewest kinds of damage, and the fewest damaged studies of this run.
FEWEST_KINDS, FEWEST_CASES = 60, 300


@pytest.mark.parametrize("damage", CORPUS)
def test_damage_is_refused_or_mended(damage: str) -> None:
    """In some kinds of log: a refusal with file and line, or the same outcomes and a word of it."""
    judged = [judge(kind, damage, seed=1) for kind in some_kinds(damage)]
    assert judged
    assert [str(one) for one in judged if one.verdict == "fault"] == []


def test_corpus_is_as_large_as_promised() -> None:
    """There are as many kinds of damage, and of damaged studies in this run, as there must be."""
    assert len(CORPUS) >= FEWEST_KINDS
    assert sum(len(some_kinds(damage)) for damage in CORPUS) >= FEWEST_CASES


@pytest.mark.parametrize("kind", KINDS)
def test_undamaged_study_is_no_fault(kind: str) -> None:
    """What damaged studies are held against is built again, with the same outcomes and account."""
    unharmed = Damage("nothing", lambda _, files, __: files, owes="nothing")
    sound = sound_study(kind)
    built = build_damaged(dict(sound.files), unharmed, sound)
    assert built == Outcome("harmless")


@pytest.mark.parametrize("damage", NOT_TOLD)
def test_what_cannot_be_told_is_read(damage: str) -> None:
    """The table of damage that nothing can tell is true: it is read, and nobody refuses it."""
    own = NOT_TOLD[damage]
    verdicts = []
    for name in ("table", "numbered", "areas"):
        sound = sound_study(name)
        files = own.spoil(KINDS[name], dict(sound.files), Random(f"{name}/{damage}"))
        if files is not None and files != sound.files:
            built = build_damaged(files, own, sound)
            verdicts.append(built.verdict)
            assert built.verdict != "refused", built.why
    assert verdicts


@pytest.mark.parametrize(
    ("spoiled", "verdict"),
    [("P01\tx", "refused"), ("P01\t1", "harmless")],
    ids=["refused", "harmless"],
)
def test_oracle_knows_both_ends(spoiled: str, verdict: str) -> None:
    """The judge of all this tells a refusal from a build."""
    sound = sound_study("table")
    log = sound.files["logs/P01.tsv"]
    assert isinstance(log, bytes)
    files = {**sound.files, "logs/P01.tsv": log.replace(b"P01\t1", spoiled.encode(), 1)}
    damage = Damage("a cell", lambda _, own, __: own, owes="nothing", at_line=True)
    assert build_damaged(files, damage, sound).verdict == verdict


def test_oracle_finds_a_silent_difference() -> None:
    """A study with other outcomes, and nobody who says so, is a fault."""
    sound = sound_study("table")
    log = sound.files["logs/P01.tsv"]
    assert isinstance(log, bytes)
    lines = log.split(b"\n")
    files = {**sound.files, "logs/P01.tsv": b"\n".join([*lines[:4], *lines[9:]])}
    damage = Damage("rows less", lambda _, own, __: own)
    built = build_damaged(files, damage, sound)
    assert (built.verdict, built.why[:19]) == ("fault", "the outcomes differ")
