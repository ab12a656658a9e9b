"""What the commands print about a check, a build or a measure."""

from __future__ import annotations

import os
from collections.abc import Mapping
from difflib import get_close_matches
from pathlib import Path

from etl.errors import Findings
from etl.export.earlier import BUNDLE
from etl.measures import MEASURES, REASON_MEANINGS, TRIAL_MEASURES, Measure
from etl.readiness.facts import Readiness
from etl.report.readiness_words import gravest, region_of, summed_up
from etl.session.pseudonym_owner import is_open
from etl.session.result import Result

#: This many of the worst outcomes are named.
MOST_GRAVE = 5
#: What is written besides the tables.
_BESIDES = (
    "accounts.csv, log_accounts.csv, regions.csv, codebook.csv, codebook.md, datapackage.json,",
    "readiness.csv, readiness.json, formulas.csv, run.json, and audit.html to look at",
)


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
    lines = [summary(result.counts), f"Written to {near(result.folder)}:"]
    width = max(len(name) for name in result.rows)
    lines += [f"  {name:<{width}}  {rows:>11,} rows" for name, rows in result.rows.items()]
    lines += [f"  {line}" for line in _BESIDES]
    lines += readiness_lines(result.readiness)
    lines.append(f"{BUNDLE}/ is what the statistician gets; start there with: Rscript start.R")
    if result.key is not None:
        alone = "its folder says who may read it"
        if os.name == "posix":
            alone = (
                "others may read it, too" if is_open(result.key) else "its owner alone may read it"
            )
        lines.append(f"Whose the pseudonyms are stands in {near(result.key)}; {alone}.")
        lines.append("Keep it apart from the tables.")
    return "\n".join(lines)


def readiness_lines(readiness: Readiness) -> list[str]:
    """How ready the outcomes are for a model, and the worst of what speaks against one.

    Parameters
    ----------
    readiness : Readiness
        What is told of the binary outcomes.

    Returns
    -------
    list of str
        The summing-up, a line for each of the worst, and where the rest is to be found.
    """
    lines, found = [summed_up(readiness)], gravest(readiness)
    for grave in found[:MOST_GRAVE]:
        where = ", ".join(filter(None, (grave.judged.outcome, region_of(grave.judged))))
        # Not every pipe takes the sign of times; a line break in a name must not look like ours.
        says = grave.says.replace(" × ", " and ")
        lines.append("  " + " ".join(f"{where} ({grave.judged.verdict}): {says}".split()))
    more = len(found) - MOST_GRAVE
    if more > 0:
        lines.append(f"  and {more:,} more: audit.html shows all under Readiness")
    return lines


def near(folder: Path) -> Path:
    """A folder as seen from where the command was called, if it lies below.

    Parameters
    ----------
    folder : Path
        Any folder or file.

    Returns
    -------
    Path
    """
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
