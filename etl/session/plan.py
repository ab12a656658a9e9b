"""What is known before any log is read: which logs, which facts, which texts."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.files import header_of_table, marks_of
from etl.handoff import names_in_use
from etl.lines import (
    ChainSettings,
    MergeSettings,
    MethodSettings,
    RegressSettings,
    SliceSettings,
    StretchSettings,
)
from etl.measures import MEASURES, TRIAL_MEASURES
from etl.parsers import EyeChoice, LogReader, reader_for
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary, TrialWords, read_definitions
from etl.screening import Limits
from etl.session.limits import check_rules, limits_of
from etl.session.line_corrections import LineCorrections, read_corrections
from etl.session.lines import LineChoice
from etl.session.log_files import find_logs
from etl.session.pseudonym_study import hidden_study
from etl.study import Study
from etl.study.models import Lines
from etl.tables import BARE_DESIGN, TABLES
from etl.trials import IDS, FactBook, gather_facts
from etl.trials.facts import shown_path


@dataclass(frozen=True)
class Plan:
    """A study made ready for its logs.

    Attributes
    ----------
    study : Study
        As loaded.
    logs : tuple of (Path, str)
        The logs and their names for messages, in the order in which they are read.
    reader : LogReader
        How they are read.
    facts : FactBook
        Where the facts about trials come from.
    library : RegionLibrary
        The texts and their regions.
    limits : Limits
        The rules of screening.
    corrections : LineCorrections or None
        Lines that were set by hand.
    pseudonyms : Pseudonyms or None
        By which readers and logs go, where the study asks for them.
    notes_elsewhere : frozenset of (str, str)
        Level (``trials``, ``participants``) and file of notes for which other variants of the study
        ask: of these rows nobody need be told that the study does not.
    """

    study: Study
    logs: tuple[tuple[Path, str], ...]
    reader: LogReader
    facts: FactBook
    library: RegionLibrary
    limits: Limits
    corrections: LineCorrections | None = None
    pseudonyms: Pseudonyms | None = None
    notes_elsewhere: frozenset[tuple[str, str]] = frozenset()

    @cached_property
    def lines(self) -> LineChoice | None:
        """How lines are told; None where no text has several."""
        told = self.study.lines or Lines()
        if not self.library.has_lines:
            return None
        return LineChoice(told.method, settings_of(told), self.study.regions.layout)

    def understood(self) -> dict[str, Any]:
        """The study as understood, with how its lines are told where it does not say so."""
        whole = self.study.understood()
        if self.lines is not None and self.study.lines is None:
            whole["lines"] = Lines().model_dump(mode="json")
        return whole if self.pseudonyms is None else hidden_study(whole, self.pseudonyms)

    @cached_property
    def log_names(self) -> tuple[str, ...]:
        """The logs in the order in which tables and records name them.

        It is that in which they are read, but for other names than their own, which are sorted: or
        their order would tell which is whose.
        """
        names = [name for _, name in self.logs]
        return tuple(names if self.pseudonyms is None else sorted(names))

    @cached_property
    def places(self) -> tuple[int, ...]:
        """For each log, in the order in which they are read, its place among ``log_names``."""
        place = {name: at for at, name in enumerate(self.log_names)}
        return tuple(place[name] for _, name in self.logs)

    @cached_property
    def supplied(self) -> tuple[str, ...]:
        """The facts that only the region file knows."""
        return tuple(n for n, source in self.facts.sources.items() if source == "regions")


def make_plan(
    study: Study, findings: Findings, pseudonyms: Pseudonyms | None = None
) -> tuple[Plan | None, tuple[tuple[Path, str], ...]]:
    """Read everything but the logs.

    Parameters
    ----------
    study : Study
        As loaded.
    findings : Findings
        Where problems are recorded.
    pseudonyms : Pseudonyms, optional
        What gives readers and logs other names, where the study asks for it.

    Returns
    -------
    Plan or None, and the logs
        No plan where tables or region definitions are wrong; the logs can be checked all the same.
    """
    logs = find_logs(study, findings, pseudonyms)
    log_header = reader_for(study.logs, study.screen).header(logs[0][0]) if logs else ()
    region_path = study.folder / study.regions.file
    region_header = header_of_table(region_path)
    facts = gather_facts(study, log_header, region_header, findings, pseudonyms)
    # Where the tables are wrong, the regions are read all the same, for what is wrong with them:
    # every fact that the study names is then taken for a key.
    named = {*study.trials.factors, *study.trials.covariates, *IDS}
    known = facts.known_facts() if facts is not None else frozenset(named)
    library = read_definitions(
        study.regions,
        study.lines,
        path=region_path,
        shown=shown_path(study, study.regions.file),
        words=TrialWords(
            known,
            known if facts is None else known | set(facts.sources),
            marks_of(study.logs.missing),
        ),
        findings=findings,
    )
    if facts is None or library is None or not _names_are_free(study, findings):
        return None, logs
    eyes = EyeChoice.of(study.logs, facts.eyes, pseudonyms)
    reader = reader_for(study.logs, study.screen, facts.from_log, eyes, pseudonyms)
    check_rules(study, library.region_names, findings)
    corrections = read_corrections(study, findings)
    if corrections is not None and not library.has_lines:
        findings.error(
            "lines are set by hand, but no text has several",
            path=study.shown,
            line=study.line_of("lines", "corrections"),
            where="lines.corrections",
            found=corrections.shown,
            fix=f"remove the key, or correct the lines of the texts in {study.regions.file}",
        )
    limits = limits_of(study)
    return Plan(study, logs, reader, facts, library, limits, corrections, pseudonyms), logs


def _names_are_free(study: Study, findings: Findings) -> bool:
    """Factors and covariates become columns, so they must not bear the name of another one."""
    taken = {column.name for table in TABLES for column in BARE_DESIGN.columns(table)}
    taken |= {*MEASURES, *TRIAL_MEASURES, *IDS}
    free = True
    for key in ("factors", "covariates"):
        # The files that count by condition have a column for each factor, too.
        used = taken | names_in_use() if key == "factors" else taken
        for name in getattr(study.trials, key):
            if name in used:
                free = False
                findings.error(
                    "the tables have a column of this name already",
                    path=study.shown,
                    line=study.line_of("trials", key),
                    where=f"trials.{key}",
                    found=name,
                    expected="a name of its own for every factor and covariate",
                    fix="rename the column in its table, and here",
                )
    return free


def settings_of(lines: Lines) -> MethodSettings:
    """What the study file sets of the methods of line assignment.

    Parameters
    ----------
    lines : Lines
        ``[lines]`` of the study file.

    Returns
    -------
    MethodSettings
    """
    return MethodSettings(
        ChainSettings(**lines.chain.model_dump()),
        MergeSettings(**lines.merge.model_dump()),
        RegressSettings(**lines.regress.model_dump()),
        SliceSettings(**lines.slice.model_dump()),
        StretchSettings(**lines.stretch.model_dump()),
    )
