"""The files that a build has read, for its record."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from etl.session.log_tellings import log_inputs
from etl.session.plan import Plan
from etl.session.pseudonym_record import hidden_inputs
from etl.session.work import LogAnswer
from etl.trials.facts import shown_path
from etl.trials.notes import Notes


def inputs_read(
    plan: Plan,
    notes: Sequence[Notes],
    answers: Sequence[LogAnswer],
    more: Sequence[Mapping[str, Any]] = (),
) -> list[dict[str, Any]]:
    """Every file read, with its digest.

    Parameters
    ----------
    plan : Plan
        The study made ready.
    notes : sequence of Notes
        The experimenter's notes that were read.
    answers : sequence of LogAnswer
        What the logs hold.
    more : sequence of mapping
        Other files, in the same way.

    Returns
    -------
    list of dict
        For the run record.
    """
    study = plan.study
    # Digests of what was used, and not of what lies there by now.
    inputs: list[dict[str, Any]] = [
        {"file": study.path.name, "role": "study file", "sha256": study.sha256},
        {
            "file": shown_path(study, study.regions.file),
            "role": "regions",
            "sha256": plan.library.sha256,
        },
    ]
    inputs += [
        {"file": table.shown, "role": "facts", "sha256": table.sha256}
        for table in plan.facts.tables()
    ]
    inputs += [{"file": own.shown, "role": "notes", "sha256": own.sha256} for own in notes]
    if plan.corrections is not None:
        made = plan.corrections
        inputs.append({"file": made.shown, "role": "line corrections", "sha256": made.sha256})
    return hidden_inputs([*inputs, *more, *log_inputs(answers)], plan)
