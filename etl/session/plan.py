"""What is known before any log is read: which logs, which facts, which texts."""

from __future__ import annotations

import glob
import re
import unicodedata
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

from etl.errors import Findings
from etl.export.publish import is_ours
from etl.files import header_of_table, marks_of
from etl.measures import MEASURES, TRIAL_MEASURES
from etl.parsers import EyeChoice, LogReader, counted_file, is_log, reader_for
from etl.regions import RegionLibrary, TrialWords, read_definitions
from etl.screening import Limits
from etl.session.datasets import (
    tell_of_datasets,
    tell_of_lost_recordings,
    tell_of_other_recordings,
)
from etl.session.limits import check_rules, limits_of
from etl.study import Study
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
    """

    study: Study
    logs: tuple[tuple[Path, str], ...]
    reader: LogReader
    facts: FactBook
    library: RegionLibrary
    limits: Limits

    @cached_property
    def supplied(self) -> tuple[str, ...]:
        """The facts that only the region file knows."""
        return tuple(n for n, source in self.facts.sources.items() if source == "regions")


def find_logs(study: Study, findings: Findings) -> tuple[tuple[Path, str], ...]:
    """The logs that the study's patterns name, each once, in the order of their names.

    Digits in names count as numbers: ``P01_2`` comes before ``P01_10``. The order decides how a
    trial goes on from one log to the next, and which of two recordings is the first.
    """
    found: dict[tuple[int, int, str], tuple[str, Path]] = {}
    for number, pattern in enumerate(study.logs.files):
        # The folder's own name may hold a bracket, which only glob.escape tells from a pattern.
        full = str(Path(glob.escape(str(study.folder))) / pattern)
        paths = [Path(path) for path in glob.glob(full, recursive=True)]  # noqa: PTH207
        files = [
            path
            for path in paths
            if is_log(study.logs.kind, path) and not any(is_ours(up) for up in path.parents[:2])
        ]
        _tell_of_what_is_no_file(study, pattern, paths, findings)
        if study.logs.kind == "bids":
            tell_of_lost_recordings(study, pattern, findings)
            others = set(paths) - set(files)
            if tell_of_other_recordings(study, (number, pattern), others, files, findings):
                continue
        if not files:
            findings.error(
                "no log has a name like this",
                path=study.shown,
                line=study.line_of("logs", "files", number),
                where="logs.files",
                found=pattern,
                expected="a pattern relative to the study file that finds the logs",
                fix="correct the pattern; * stands for any part of a name, ** for any folders",
            )
        for path in files:
            called = counted_file(study.logs, path).absolute()
            found.setdefault(_identity(path), (shown_path(study, called), path))
    if study.logs.kind == "bids":
        tell_of_datasets(study, [path for _, path in found.values()], findings)
    in_order = sorted(found.values(), key=lambda log: _in_natural_order(log[0]))
    return tuple((path, shown) for shown, path in in_order)


def _tell_of_what_is_no_file(
    study: Study, pattern: str, paths: list[Path], findings: Findings
) -> None:
    """Tell of folders and broken links that are named like logs."""
    for path in sorted(path for path in paths if not path.is_file()):
        shown = shown_path(study, path.absolute())
        if path.is_dir():
            # A pattern for whatever lies in folders finds the folders too.
            if "." in pattern.rsplit("/", 1)[-1].replace("**", ""):
                findings.warning(
                    "a folder is named like a log, and is no log",
                    path=shown,
                    fix="if logs lie in it, add their names to [logs] files",
                )
        else:
            findings.error(
                "the log is a link that leads to no file",
                path=shown,
                fix="copy the file itself to this place, or remove the link",
            )


def _identity(path: Path) -> tuple[int, int, str]:
    """What makes two paths one log: where disks ignore case, two patterns may spell one name."""
    status = path.stat()
    return status.st_dev, status.st_ino, unicodedata.normalize("NFC", path.name).casefold()


def _in_natural_order(shown: str) -> tuple[list[str | int], str]:
    """A key that sorts names with their digits as numbers."""
    parts = re.split(r"([0-9]+)", shown)
    # Every second part is digits, so that text is never compared with a number.
    return [int(part) if place % 2 else part for place, part in enumerate(parts)], shown


def make_plan(study: Study, findings: Findings) -> tuple[Plan | None, tuple[tuple[Path, str], ...]]:
    """Read everything but the logs.

    Parameters
    ----------
    study : Study
        As loaded.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Plan or None, and the logs
        No plan where tables or region definitions are wrong; the logs can be checked all the same.
    """
    logs = find_logs(study, findings)
    log_header = reader_for(study.logs, study.screen).header(logs[0][0]) if logs else ()
    region_path = study.folder / study.regions.file
    facts = gather_facts(study, log_header, header_of_table(region_path), findings)
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
    eyes = EyeChoice.of(study.logs, facts.eyes)
    reader = reader_for(study.logs, study.screen, facts.from_log, eyes)
    check_rules(study, library.region_names, findings)
    return Plan(study, logs, reader, facts, library, limits_of(study)), logs


def _names_are_free(study: Study, findings: Findings) -> bool:
    """Factors and covariates become columns, so they must not bear the name of another one."""
    taken = {column.name for table in TABLES for column in BARE_DESIGN.columns(table)}
    taken |= {*MEASURES, *TRIAL_MEASURES, *IDS}
    free = True
    for key in ("factors", "covariates"):
        for name in getattr(study.trials, key):
            if name in taken:
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
