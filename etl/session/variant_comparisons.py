"""The comparisons that the page about variants begins with."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from difflib import get_close_matches
from typing import Final

from etl.errors import DataError, Findings
from etl.session.readiness import MOST_REGIONS
from etl.study import StudyVariants
from etl.tables import TableDesign
from etl.variants.facts import Summary
from etl.variants.summaries import leading

#: So many begin the page where nobody has named any.
_MOST_LEADING: Final = 4
#: So many names are listed where one is not known.
_MOST_LISTED: Final = 12


def named_comparisons(
    chosen: StudyVariants, design: TableDesign, read: Collection[str]
) -> list[tuple[str, str, str, str]]:
    """The comparisons that the variants file names, whose names must be those of the study.

    Parameters
    ----------
    chosen : StudyVariants
        The variants file.
    design : TableDesign
        The tables of the study.
    read : collection of str
        The regions that any trial has: some texts may have been read by nobody.

    Returns
    -------
    list of (str, str, str, str)
        Outcome, region, factor, level.

    Raises
    ------
    DataError
        If there is no region or level of a name, no trial has the region, or it is not said which
        level is meant.
    """
    wanted = []
    wrong = Findings()

    def tell(line: int | None, key: str, problem: str, found: str, there: Sequence[str]) -> None:
        near = get_close_matches(found, there, n=1) if found else []
        listed = ", ".join(there[:_MOST_LISTED]) + (" …" if len(there) > _MOST_LISTED else "")
        wrong.error(
            problem,
            path=chosen.shown,
            line=line,
            where=f"comparisons.{key}",
            found=found or None,
            expected=f"one of {listed}",
            fix=f'did you mean "{near[0]}"?' if near else f"correct {key}",
        )

    for number, own in enumerate(chosen.comparisons):

        def line(key: str, number: int = number) -> int | None:
            return chosen.line_of("comparisons", number, key)

        levels = design.factors.get(own.factor, ())
        level = own.level or (levels[1] if len(levels) == 2 else "")
        if own.region and len(design.regions) > MOST_REGIONS:
            wrong.error(
                f"with more than {MOST_REGIONS} regions all are counted together",
                path=chosen.shown,
                line=line("region"),
                where="comparisons.region",
                found=own.region,
                fix="leave out the comparison",
            )
        elif own.region and own.region not in design.regions:
            problem = "no text has a region of this name"
            tell(line("region"), "region", problem, own.region, design.regions)
        elif own.region and own.region not in read:
            wrong.error(
                "no trial has read a text with this region",
                path=chosen.shown,
                line=line("region"),
                where="comparisons.region",
                found=own.region,
                fix="leave out the comparison, or name another region",
            )
        if own.factor and len(levels) < 2:
            wrong.error(
                f"{own.factor} has one level only, so there is nothing to compare",
                path=chosen.shown,
                line=line("factor"),
                where="comparisons.factor",
                found=own.factor,
                fix="leave out the comparison, or name another factor",
            )
        elif own.factor and level not in levels[1:]:
            problem = f"{own.factor} has no level of this name that could be compared"
            if not level:
                problem = f"{own.factor} has {len(levels)} levels: say which one is compared"
            tell(line("level"), "level", problem, level, levels[1:])
        wanted.append((own.outcome, own.region, own.factor, level))
    if wrong.failed:
        raise DataError(wrong)
    return wanted


def leading_ones(
    wanted: Sequence[tuple[str, str, str, str]], summaries: Sequence[Summary], base: int
) -> tuple[int, ...]:
    """Which comparisons the page begins with.

    Parameters
    ----------
    wanted : sequence of (str, str, str, str)
        Those that are named; without any they are chosen.
    summaries : sequence of Summary
        All comparisons.
    base : int
        The variant that is the study as it stands.

    Returns
    -------
    tuple of int
        Their places.
    """
    if not wanted:
        return leading(summaries, _MOST_LEADING, base)
    place = {}
    for number, summary in enumerate(summaries):
        own = summary.compared.comparison
        place[own.outcome, own.region, own.factor, own.level] = number
    return tuple(place[own] for own in wanted)
