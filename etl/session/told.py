"""What the commands print about a check, a build or a measure."""

from __future__ import annotations

from collections.abc import Mapping
from difflib import get_close_matches
from pathlib import Path

from etl.errors import Findings
from etl.measures import MEASURES, REASON_MEANINGS, TRIAL_MEASURES, Measure
from etl.session.result import Result


def checked(findings: Findings) -> str:
    """The closing line of a check without errors."""
    warnings = findings.count("warning")
    if warnings:
        return f"No errors; {counted(warnings, 'warning')}. Nothing was written."
    return "All is well. Nothing was written."


def counted(count: int, thing: str) -> str:
    """A number of things, in the right number."""
    return f"{count:,} {thing}{'' if count == 1 else 's'}"


def summary(counts: Mapping[str, int]) -> str:
    """What was read and what of it is no part of the outcomes, in one line."""
    kept, outside = counts["fixations kept"], counts["fixations kept outside every region"]
    line = (
        f"{counted(counts['readers'], 'reader')}, {counted(counts['trials kept'], 'trial')}, "
        f"{counted(kept, 'fixation')}, {outside:,} of them outside every region"
    )
    if counts["trials skipped"]:
        line += f"; {counted(counts['trials skipped'], 'more trial')} skipped"
    if counts["fixations of repeated trials"]:
        repeated = counted(counts["fixations of repeated trials"], "fixation")
        line += f"; {repeated} of trials recorded twice left out"
    screened = counts["trials read"] - counts["trials skipped"] - counts["trials kept"]
    dropped = (
        counts["fixations read"]
        - counts["fixations of skipped trials"]
        - counts["fixations of repeated trials"]
        - kept
    )
    if screened or dropped:
        line += (
            f"; screening left out {counted(screened, 'trial')} and "
            f"{counted(dropped, 'fixation')} in all"
        )
    return line


def built(result: Result) -> str:
    """The summary of a build: what was read, what was left out, what was written."""
    lines = [summary(result.counts), f"Written to {_near(result.folder)}:"]
    width = max(len(name) for name in result.rows)
    lines += [f"  {name:<{width}}  {rows:>11,} rows" for name, rows in result.rows.items()]
    besides = "  accounts.csv, log_accounts.csv, run.json, and audit.html to look at"
    return "\n".join([*lines, besides])


def _near(folder: Path) -> Path:
    """A folder as seen from where the command was called, if it lies below."""
    try:
        return folder.absolute().relative_to(Path.cwd())
    except ValueError:
        return folder


def measure_names() -> list[str]:
    """The names of all outcomes."""
    return list(dict.fromkeys([*MEASURES, *TRIAL_MEASURES]))


def catalogue() -> str:
    """All outcomes, a line each, in their groups."""
    lines: list[str] = []
    for title, measures in (
        ("Outcomes of a region in a trial", MEASURES),
        ("Outcomes of a trial", TRIAL_MEASURES),
    ):
        width = max(len(name) for name in measures)
        lines += ["", title, ""] if lines else [title, ""]
        lines += [
            f"  {name:<{width}}  {one.kind:<8}  {one.definition}" for name, one in measures.items()
        ]
    return "\n".join([*lines, "", "trialwright measures NAME tells all about one of them."])


def measure(name: str) -> str | None:
    """All about one outcome; None where there is none of that name."""
    found = [m[name] for m in (MEASURES, TRIAL_MEASURES) if name in m]
    return "\n\n".join(_one(m) for m in found) or None


def _one(measure: Measure) -> str:
    """All about one outcome."""
    kind = measure.kind if measure.unit == measure.kind else f"{measure.kind}, {measure.unit}"
    lines = [
        f"{measure.name} ({kind}; one value a "
        + ("region of a trial)" if measure.level == "region" else "trial)"),
        "",
        f"  {measure.definition}",
    ]
    if measure.interrupted:
        lines.append(f'  With outside = "interrupt": {measure.interrupted}')
    if measure.zeroed:
        lines.append(f'  With no_opportunity = "zero": {measure.zeroed}')
    if measure.reasons:
        lines += ["", "  Missing:"]
        width = max(len(reason) for reason in measure.reasons)
        lines += [f"    {r:<{width}}  {REASON_MEANINGS[r]}" for r in measure.reasons]
    else:
        lines += ["", "  Never missing."]
    return "\n".join([*lines, "", f"  Source: {measure.source}"])


def unknown_measure(name: str) -> str:
    """What is said to a name that no outcome has."""
    near = get_close_matches(name, measure_names(), n=1)
    hint = f' Did you mean "{near[0]}"?' if near else ""
    return f'there is no outcome "{name}".{hint} trialwright measures lists them all.'
