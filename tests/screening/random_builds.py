"""Random studies built as a whole."""

from __future__ import annotations

import shutil
from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path
from unittest.mock import patch

import etl
from tests.screening.building import Built, Trial, build, study
from tests.screening.strategies import Lab, Rules, usable


def built_study(
    folder: Path,
    lab: Lab,
    rules: Rules,
    *,
    trials: Sequence[Trial] | None = None,
    page: bool = False,
) -> Built | None:
    """Build a random study; None where nothing is left of it, which is an error of its own.

    The audit page takes most of the time and is left out unless asked for, and the bundle, which
    has it too.
    """
    shutil.rmtree(folder, ignore_errors=True)
    file = study(
        folder,
        trials or lab.trials,
        str(usable(lab, rules)),
        notes=lab.notes,
        repeated="first",
    )
    try:
        with ExitStack() as without:
            for part in () if page else ("write_audit", "hand_over"):
                without.enter_context(patch(f"etl.session.run.{part}"))
            return build(file)
    except etl.DataError as nothing:
        said = str(nothing)
        # By chance a reader's fixations may all lie beside the text, as those of no other do.
        beside = "unlike those of the other logs" in said
        assert beside or "of any reader (trials:" in said or "no trial is left" in said, said
        return None
