"""From the studies of all variants to what the work on readers needs of each."""

from __future__ import annotations

import itertools
import json
from collections.abc import Iterator
from dataclasses import dataclass, replace

from etl.errors import DataError, Finding, Findings
from etl.regions.assign import Manner
from etl.regions.definition_files import manner_of
from etl.session.decisions import facts_needed, options_of
from etl.session.examining import LogsRead
from etl.session.gather import Gathered
from etl.session.limits import check_rules, limits_of
from etl.session.lines import NO_READING
from etl.session.plan import Plan
from etl.session.pseudonym_record import hidden_limits
from etl.session.reader import Options
from etl.study import Study, StudyVariants


@dataclass(frozen=True, slots=True)
class VariantOptions:
    """The decisions of one variant.

    Attributes
    ----------
    options : Options
        For the work on readers.
    manner : Manner or None
        How points are taken to regions.
    facts : int
        Which of the gatherings has the facts that its rules look at.
    place : int
        The same number for variants in which every fixation is in the same place.
    """

    options: Options
    manner: Manner | None
    facts: int
    place: int


@dataclass(frozen=True, slots=True, eq=False)
class VariantPlans:
    """All variants of a study made ready.

    Attributes
    ----------
    plans : tuple of Plan
        One a variant.
    options : tuple of VariantOptions
        One a variant.
    gathered : tuple of Gathered
        Facts and texts joined to trials, once for all variants whose rules look at the same facts.
        The readers, and their trials, are the same in all.
    """

    plans: tuple[Plan, ...]
    options: tuple[VariantOptions, ...]
    gathered: tuple[Gathered, ...]


def plan_variants(read: LogsRead, chosen: StudyVariants, findings: Findings) -> VariantPlans:
    """Make all variants of a study ready for the work on readers.

    Parameters
    ----------
    read : LogsRead
        The study as it stands, with its logs.
    chosen : StudyVariants
        The variants.
    findings : Findings
        Where problems are recorded; what one variant has said already is not said again.

    Returns
    -------
    VariantPlans

    Raises
    ------
    DataError
        If no reader is left to work on, or anything is wrong.
    """
    asked = frozenset(itertools.chain.from_iterable(map(_notes, chosen.studies)))
    plans = [_plan(read.plan, study, asked) for study in chosen.studies]
    needs = [facts_needed(plan) for plan in plans]
    gathered: dict[tuple[object, ...], Gathered] = {}
    told = set(findings)
    for variant, (plan, need) in enumerate(zip(plans, needs, strict=True)):
        new = Findings(names=findings.names)
        check_rules(plan.study, plan.library.region_names, new)
        if need not in gathered:
            own = replace(read, plan=plan, answers=[replace(one) for one in read.answers])
            found = own.gathered(new)
            if found is not None:
                gathered[need] = found
        _add_new(findings, new, chosen, variant, told)
        if need not in gathered:
            raise DataError(findings)
    if findings.failed:
        raise DataError(findings)
    read.plan.facts.release()
    numbers = {need: number for number, need in enumerate(gathered)}
    places: dict[str, int] = {}
    options = []
    for plan, need in zip(plans, needs, strict=True):
        manner = plan.library.manner
        reading = [rule for rule in NO_READING if plan.lines is not None and plan.limits.on(rule)]
        key = repr((numbers[need] if reading else 0, manner, plan.lines, reading))
        options.append(
            VariantOptions(
                options_of(plan), manner, numbers[need], places.setdefault(key, len(places))
            )
        )
    return VariantPlans(tuple(plans), tuple(options), tuple(gathered.values()))


def _notes(study: Study) -> Iterator[tuple[str, str]]:
    """The files of notes that a variant asks for, by level."""
    screening = study.screening
    if screening is None:
        return
    for level, rules in (("trials", screening.trials), ("participants", screening.participants)):
        if rules is not None and rules.notes is not None:
            yield level, rules.notes


def _plan(plan: Plan, study: Study, asked: frozenset[tuple[str, str]]) -> Plan:
    """The plan of a variant: what the study file says anew, and the rest as it is."""
    library = replace(plan.library, manner=manner_of(study.regions, study.lines))
    limits = hidden_limits(limits_of(study), study, plan.pseudonyms)
    return replace(plan, study=study, library=library, limits=limits, notes_elsewhere=asked)


def _add_new(
    findings: Findings, new: Findings, chosen: StudyVariants, variant: int, told: set[Finding]
) -> None:
    """Add what has not been told before: variants have most in common."""
    placed = Findings(names=new.names)
    kinds = {}
    for finding in new:
        own = _placed(finding, chosen, variant)
        kinds[finding.kind] = own.kind
        if own not in told:
            told.add(own)
            placed.add(own)
    for kind, own_kind in kinds.items():
        # What was not spelled out is counted once: by the first variant that has any of its kind.
        if own_kind not in findings.more:
            placed.more[own_kind] += new.more[kind] - sum(one.kind == kind for one in new)
    findings.extend(placed)


def _placed(finding: Finding, chosen: StudyVariants, variant: int) -> Finding:
    """What is said of the study file, said of the variants file where the variant has it there."""
    crossing = chosen.crossing
    own = {
        setting.key: setting.alternatives[choice]
        for setting, choice in zip(
            crossing.settings, crossing.choices[variant].tolist(), strict=True
        )
        if choice != setting.base
    }
    key = finding.where if finding.path == chosen.studies[0].shown else ""
    if key in own:
        return replace(finding, path=chosen.shown, line=_line(chosen, variant, key))
    files = {json.loads(value): key for key, value in own.items() if key.endswith(".notes")}
    if finding.path not in files or finding.line is not None:
        return finding
    key = files[finding.path]
    return replace(
        finding,
        path=chosen.shown,
        line=_line(chosen, variant, key),
        where=key,
        found=finding.path,
        fix=finding.fix.replace("study file", "variants file"),
    )


def _line(chosen: StudyVariants, variant: int, key: str) -> int | None:
    """Where a variant has the value of a key from."""
    named = any(chosen.crossing.names)
    above: tuple[str | int, ...] = ("variants", variant - 1) if named else ()
    return chosen.line_of(*above, *key.split("."))
