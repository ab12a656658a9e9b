"""The output folder: written beside its place, put in place in one step, all or nothing."""

from __future__ import annotations

import contextlib
import errno
import os
import re
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path

from etl.errors import DataError, Findings
from etl.export.claims import claim_of, claimed, refuse_within_claimed
from etl.export.earlier import Keeper, is_ours
from etl.export.swapping import clear, names_to_disk, replace_folder, to_disk
from etl.export.tidying import despite_interruption
from etl.export.unwritable import NAME_ANOTHER, cannot_write

_FRESH, _KEPT, _ASIDE = "new", "kept", "old"
#: How often the folder that is to hold the output is made, where another build that fails may
#: have just removed it.
_TRIES = 3


@dataclass(slots=True)
class Workshop:
    """Where a build works, beside the place where its output will appear.

    Attributes
    ----------
    folder : Path
        What holds the others; gone at the end.
    fresh : Path
        The folder that will be published.
    kept : Path
        A folder for what is put aside meanwhile.
    """

    folder: Path
    fresh: Path = field(init=False)
    kept: Path = field(init=False)
    _settled: bool = field(init=False, default=False)

    def __post_init__(self) -> None:
        self.fresh, self.kept = self.folder / _FRESH, self.folder / _KEPT
        self.fresh.mkdir()
        self.kept.mkdir()

    def settle(self) -> None:
        """Bring all that was written to the disk; nothing may be written after that."""
        if not self._settled:
            to_disk(self.fresh)
            self._settled = True


@contextlib.contextmanager
def published(target: Path, shown: str) -> Iterator[Workshop]:
    """Give folders to work in; when all went well, move the result to its place.

    At every moment the place holds the earlier build or the new one. Where the system cannot let
    two folders change places, there is a moment in which it holds none; the next build mends that.

    Parameters
    ----------
    target : Path
        Where the output is to appear. An earlier build there is replaced as a whole.
    shown : str
        Its name for messages.

    Yields
    ------
    Workshop
        Folders beside the target, gone at the end.

    Raises
    ------
    DataError
        If the target may not be replaced, another build writes into it, or it cannot be written.
    KeyboardInterrupt
        If the build is interrupted; a note says what is in the place then.
    """
    place = _place_of(target, shown)
    work: list[Path] = []
    mark: list[os.stat_result] = []
    try:
        with _held(place, shown):
            keeper = Keeper(shown)
            keeper.check(place)
            work.append(Path(tempfile.mkdtemp(prefix=_prefix(place), dir=place.parent)))
            aside = work[0] / _ASIDE
            try:
                shop = Workshop(work[0])
                mark.append(shop.fresh.stat())
                yield shop
                shop.settle()
                keeper.check(place)
                replace_folder(shop.fresh, place, aside, keeper.check)
                # It is done; whether the system can vouch for it changes nothing.
                with contextlib.suppress(OSError):
                    names_to_disk(place.parent)
            finally:
                # An earlier build that could not be put back is worth more than a tidy folder.
                if place.exists() or not aside.exists():
                    despite_interruption(partial(clear, work[0]))
    except OSError as why:
        raise _told(why, shown, place, work) from why
    except KeyboardInterrupt as stop:
        stop.add_note(_left_by_interruption(place, mark))
        raise


def _place_of(target: Path, shown: str) -> Path:
    """The place itself: a link is followed, so that the tables land where it points."""
    try:
        place = target.resolve()
    except (OSError, RuntimeError) as why:  # a link that leads back to itself
        loop = OSError(errno.ELOOP, os.strerror(errno.ELOOP))
        raise cannot_write(shown, why if isinstance(why, OSError) else loop, target) from why
    if os.path.ismount(place):
        findings = Findings()
        findings.error(
            "the output folder is a disk or share of its own, which no build can replace as a "
            "whole",
            path=shown,
            expected="a folder that can be moved",
            fix="name a folder within it, by [output] folder or --into",
        )
        raise DataError(findings)
    return place


@contextlib.contextmanager
def _held(place: Path, shown: str) -> Iterator[None]:
    """Hold the place for this build alone, mend and tidy up what killed builds left of it."""
    refuse_within_claimed(place, shown)
    _refuse_within_build(place, shown)
    made: list[Path] = []
    with contextlib.ExitStack() as stack:
        for last in range(1, _TRIES + 1):
            try:
                made += _make_folders(place.parent)
                stack.callback(_remove_empty, made)
                stack.enter_context(claimed(place, shown))
                break
            except FileNotFoundError:
                if last == _TRIES:
                    raise
        _mend(place)
        if place.is_dir() and not os.access(place, os.R_OK | os.W_OK | os.X_OK):
            raise PermissionError(errno.EACCES, os.strerror(errno.EACCES), str(place))
        yield


def _refuse_within_build(place: Path, shown: str) -> None:
    """Refuse a folder within an earlier build, which the next build there would stop at."""
    for folder in place.parents:
        if is_ours(folder):
            findings = Findings()
            findings.error(
                f'the output folder lies within an earlier build, "{folder.name}"',
                path=shown,
                expected="a folder beside it: a build replaces its folder as a whole, and no build "
                "wrote this one",
                fix=NAME_ANOTHER,
            )
            raise DataError(findings)


def _make_folders(folder: Path) -> list[Path]:
    """Make a folder and those above that are missing; gives those made, outermost first."""
    missing = [one for one in (folder, *folder.parents) if not one.is_dir()]
    for one in reversed(missing):
        one.mkdir(exist_ok=True)
    return missing[::-1]


def _remove_empty(folders: list[Path]) -> None:
    """Remove folders made for a build that wrote nothing into them."""
    for folder in reversed(folders):
        with contextlib.suppress(OSError):
            folder.rmdir()


def _prefix(place: Path) -> str:
    """How the names of the folders begin in which builds into a place work."""
    return f".{place.name}.trialwright-"


def _mend(place: Path) -> None:
    """Put an earlier build back that a killed run had just moved aside; remove what it left.

    Whoever has the claim is alone: every other folder of work beside the place is of a dead build.
    """
    pattern = re.compile(re.escape(_prefix(place)) + r"[a-z0-9_]{8}")
    for left in sorted(place.parent.iterdir()):
        if left == claim_of(place) or not pattern.fullmatch(left.name):
            continue
        if left.is_symlink() or not left.is_dir():
            continue
        aside = left / _ASIDE
        if not place.exists() and is_ours(aside):
            aside.replace(place)
        if not aside.exists() or place.exists():
            clear(left)


def _told(why: OSError, shown: str, place: Path, work: list[Path]) -> DataError:
    """An error of the system as a message: about the output, or about the file that it names."""
    named = Path(os.fsdecode(why.filename)) if isinstance(why.filename, str | bytes) else None
    ours = [place, claim_of(place), place.parent, *place.parent.parents]
    if named is None or named in ours or any(named.is_relative_to(one) for one in (place, *work)):
        return cannot_write(shown, why, place)
    if named.parent == place.parent and named.name.startswith(_prefix(place)):
        return cannot_write(shown, why, place)
    findings = Findings()
    findings.error(
        f"this file cannot be read or written ({why.strerror or type(why).__name__})",
        path=str(named),
        fix="see that it is there and that you may read it, and build again",
    )
    return DataError(findings)


def _left_by_interruption(place: Path, mark: list[os.stat_result]) -> str:
    """What is in the place after an interruption, in words."""
    try:
        now = place.stat()
    except OSError:
        return "nothing was written"
    if mark and os.path.samestat(now, mark[0]):
        return "the new build was in its place already, and is whole"
    if not is_ours(place):
        return "nothing was written"
    return "nothing was written, the earlier build is as it was"
