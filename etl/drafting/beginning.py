"""How every draft begins: what its remarks mean, and which logs there are."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from etl.drafting.found_logs import patterns_for
from etl.drafting.meanings import counted
from etl.drafting.readers import NamePattern
from etl.drafting.toml_text import StudyText


def begun(logs: Sequence[Path], target: Path | None) -> StudyText:
    """The study file up to the names of its logs.

    Parameters
    ----------
    logs : sequence of Path
        The logs.
    target : Path or None
        Where the study file goes; None for the current folder.

    Returns
    -------
    StudyText
        In the table ``[logs]``.
    """
    out = StudyText()
    name = "study.toml" if target is None else target.name
    out.remark(
        f"A draft of a study file, made by looking at the beginning of {counted(len(logs), 'log')}."
        " It is yours to correct:"
    )
    out.lines += [
        '#   "guess:"     is why the line below it was written so. Look at each of them.',
        '#   "question:"  is what only you can know: put the answer in place of the "?" below it.',
        "#   Other lines that begin with # explain, or are examples: to use one, remove its #.",
    ]
    out.remark(f"`trialwright check {name}` lists the questions that are still open.")
    out.example("title", "My study")
    out.section("The logs")
    out.begin("logs")
    folder = Path() if target is None else target.parent
    patterns, by_pattern = patterns_for(logs, folder)
    finds = "these find" if len(patterns) > 1 else "this finds"
    told = f"{finds} the {counted(len(logs), 'log')} and no other file"
    out.guess("files", patterns, told if by_pattern else "the logs by name")
    return out


def write_names(out: StudyText, names: NamePattern | None, log: str) -> None:
    """Who read, where only the names of the logs say it.

    Parameters
    ----------
    out : StudyText
        The study file, in its table ``[logs]``.
    names : NamePattern or None
        What the names say; None where a column says it.
    log : str
        The name of the first log.
    """
    if names is None:
        return
    told = ", ".join(f'{name} "{values[0]}"' for name, values in names.said.items())
    out.guess(
        "participant_from_name",
        names.pattern,
        f"nothing in the logs says who read, and their names differ here: {told} in {log}",
    )
