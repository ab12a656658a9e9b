"""What a build writes besides its tables for whoever fits models to them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from etl.export.earlier import BUNDLE, RECORD
from etl.handoff import BundleFacts, StudyFacts, write_bundle, write_data_package
from etl.readiness.facts import Readiness
from etl.session.codebook_facts import write_described
from etl.session.plan import Plan
from etl.session.readiness import Mapper, map_here, readiness_of, write_readiness
from etl.tables import TableDesign


@dataclass(frozen=True, slots=True)
class Described:
    """What was found out of finished tables.

    Attributes
    ----------
    study : StudyFacts
        What codebook and data packages tell of the study.
    readiness : Readiness
        What is told of the binary outcomes.
    """

    study: StudyFacts
    readiness: Readiness


def describe(folder: Path, plan: Plan, design: TableDesign, mapped: Mapper = map_here) -> Described:
    """Write codebook, table of regions and readiness beside the finished tables.

    Parameters
    ----------
    folder : Path
        Where the tables are.
    plan : Plan
        The study made ready.
    design : TableDesign
        What its tables have in common.
    mapped : callable, optional
        What has row groups counted, here or in other processes.

    Returns
    -------
    Described
        What page and bundle tell, too.
    """
    measures = plan.study.measures
    conventions = (measures.outside, measures.no_opportunity)
    readiness = readiness_of(folder, design, conventions, mapped)
    write_readiness(readiness, folder)
    return Described(write_described(folder, plan, design), readiness)


def hand_over(
    folder: Path,
    plan: Plan,
    design: TableDesign,
    described: Described,
    csv_apart: Mapping[str, Path],
) -> None:
    """Write the bundle and the data packages; only the run record is left to come.

    Parameters
    ----------
    folder : Path
        Where everything else of the build is.
    plan : Plan
        The study made ready.
    design : TableDesign
        What its tables have in common.
    described : Described
        From :func:`describe`.
    csv_apart : mapping of str to Path
        Tables that the study does not want as CSV and the bundle has so, and where they are; they
        are moved into the bundle.
    """

    def csv_copy(table: str, into: Path) -> None:
        csv_apart[table].replace(into)

    formats = tuple(plan.study.output.formats)
    facts = BundleFacts(described.study, design, described.readiness, formats)
    write_bundle(folder, folder / BUNDLE, facts, csv_copy)
    names = [path.name for path in folder.iterdir() if path.is_file()]
    write_data_package(folder, design, described.study, [*names, RECORD])
