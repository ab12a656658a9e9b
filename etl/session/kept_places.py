"""Where builds keep what the next one can use."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from etl.session.kept_store import KeptStore, forget
from etl.session.pseudonym_key import KeyFile


def kept_folder(target: Path, held: KeyFile | None) -> Path:
    """Where a build keeps parsed logs for the next one.

    Parameters
    ----------
    target : Path
        The output folder.
    held : KeyFile or None
        The pseudonyms of the study. What is kept names readers by id; so it lies with these.

    Returns
    -------
    Path
    """
    target = target.resolve()
    beside = target if held is None else held.path.resolve().with_name(target.name)
    return beside.with_name(f"{beside.name}.kept")


def settle_kept(
    store: KeptStore, target: Path, held: KeyFile | None, *, used: Sequence[str]
) -> None:
    """Keep what a build has used for the next one.

    Parameters
    ----------
    store : KeptStore
        The entries.
    target : Path
        The output folder.
    held : KeyFile or None
        The pseudonyms of the study. With them, what a build without has kept beside the output is
        removed: it names readers by id.
    used : sequence of str
        The entries; without any, nothing is kept or removed.
    """
    if used:
        store.settle(used)
    beside = kept_folder(target, None)
    if beside != kept_folder(target, held):
        forget(beside)
