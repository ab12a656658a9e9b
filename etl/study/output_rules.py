"""Rules about ``[output]``: factors as numbers, and centred covariates."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Iterator, Mapping, Sequence

from etl.coding import Coding, coding_of, tells_levels_apart
from etl.study.contrasts import UNNAMED
from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, Rule, quoted, rule
from etl.study.trial_rules import OUTCOME_GROUPS
from etl.tables import BARE_DESIGN, TABLES, centred_name

_CONTRASTS = ("output", "contrasts")


@rule("output.contrasts", "trials.factors")
def contrasts_belong_to_factors(study: StudyFile) -> Iterator[Problem]:
    """Only a factor has contrasts."""
    for name in study.output.contrasts:
        if name not in study.trials.factors:
            yield Problem(
                (*_CONTRASTS, name),
                "this is no factor",
                found=name,
                expected="a name from [trials] factors",
                fix=_nearest(name, study.trials.factors, "add it to [trials] factors"),
            )


@rule("output.contrasts", "trials.factors", "trials.levels")
def contrasts_have_levels_in_order(study: StudyFile) -> Iterator[Problem]:
    """Every contrast but treatment goes by the order of the levels, which must be stated for that.

    Sorted as texts, low, medium and high would make a linear trend of high, low, medium.
    """
    for name, wanted in study.output.contrasts.items():
        named = isinstance(wanted, str)
        if name not in study.trials.factors or name in study.trials.levels or wanted == "treatment":
            continue
        yield Problem(
            (*_CONTRASTS, name),
            "this contrast goes by the order of the levels, and no order is stated"
            if named
            else "numbers belong to levels in order, and no order is stated",
            found=wanted if isinstance(wanted, str) else _spelled(wanted),
            expected=f"the levels of {name} in [trials] levels",
            fix=f"add [trials] levels = {{ {name} = […] }}, in the order "
            + ("that is meant" if named else "of the numbers"),
        )


@rule("output.contrasts", "trials.factors", "trials.levels")
def given_numbers_fit_their_levels(study: StudyFile) -> Iterator[Problem]:
    """A number for each level, and columns that tell all levels apart."""
    for name, columns in _given(study):
        levels = study.trials.levels.get(name)
        if levels is None:
            continue
        wrong = {end: numbers for end, numbers in columns.items() if len(numbers) != len(levels)}
        for end, numbers in wrong.items():
            yield Problem(
                _place(name, end),
                f"{_counted(len(numbers), 'number')} for {_counted(len(levels), 'level')}",
                found=", ".join(f"{number:g}" for number in numbers),
                expected=f"a number for each of {', '.join(levels)}",
                fix="give as many numbers as there are levels, in their order",
            )
        if wrong or tells_levels_apart(list(columns.values()), len(levels)):
            continue
        needed = len(levels) - 1
        if len(columns) != needed:
            yield Problem(
                (*_CONTRASTS, name),
                f"{_counted(len(columns), 'column')} of numbers for "
                f"{_counted(len(levels), 'level')}",
                found=_spelled(columns),
                expected=f"{_counted(needed, 'column')}, one less than there are levels",
                fix="give each column a name: "
                f"{name} = {{ one = […], two = […] }}, or name a contrast"
                if needed > 1
                else "give one list of two numbers, or name a contrast"
                if needed
                else "remove it: a factor with one level has no contrast",
            )
        else:
            yield Problem(
                (*_CONTRASTS, name),
                "these columns do not tell the levels apart: one of them is constant, or follows "
                "from the others",
                found=_spelled(columns),
                expected="columns of which none can be computed from the others and a constant",
                fix="correct the numbers, or name a contrast",
            )


@rule("output.centred", "trials.covariates", "trials.factors")
def centred_facts_are_covariates(study: StudyFile) -> Iterator[Problem]:
    """Only a covariate is centred."""
    for place, name in enumerate(study.output.centred):
        if name in study.trials.covariates:
            continue
        factor = name in study.trials.factors
        yield Problem(
            ("output", "centred", place),
            "this is a factor; only covariates are centred" if factor else "this is no covariate",
            found=name,
            expected="a name from [trials] covariates",
            fix="name its contrast in [output] contrasts instead"
            if factor
            else _nearest(name, study.trials.covariates, "add it to [trials] covariates"),
        )


def new_columns_called_like_others(known: Collection[str]) -> Rule:
    """Make the rule that no new column has the name of another.

    Parameters
    ----------
    known : collection of str
        The names of all measures; the tables have a column for each. Groups may be among them.

    Returns
    -------
    Rule
        It reports each new column of which the study file alone tells that its name is taken;
        levels that are not stated are known only when the logs are read.
    """
    taken = {column.name for table in TABLES for column in BARE_DESIGN.columns(table)}
    taken |= {"participant", "session", "trial", "item", *known} - set(OUTCOME_GROUPS)

    @rule("output.contrasts", "output.centred", *("trials." + key for key in _NAMING))
    def new_columns_have_names_of_their_own(study: StudyFile) -> Iterator[Problem]:
        there = taken | {*study.trials.factors, *study.trials.covariates}
        for place, column in _new_columns(study):
            if column in there:
                yield clash(place, column)
            there.add(column)

    return new_columns_have_names_of_their_own


_NAMING = ("factors", "covariates", "levels")


def clash(place: KeyPath, column: str) -> Problem:
    """What is said of a new column whose name is taken.

    Parameters
    ----------
    place : tuple of str and int
        The key that asks for it.
    column : str
        Its name.

    Returns
    -------
    Problem
    """
    centred = place[:2] == ("output", "centred")
    return Problem(
        place,
        f"the new column would be called {column}, and a column of the tables has that name",
        found=column,
        expected="a name that no column of the tables has",
        fix="rename the covariate in its table, or remove it from the list"
        if centred
        else "rename the factor or the level, or give the numbers with names for their columns",
    )


def wanted_coding(study: StudyFile, factor: str, levels: Sequence[str]) -> Coding:
    """The numbers that the study file wants for a factor.

    Parameters
    ----------
    study : StudyFile
        As loaded.
    factor : str
        One of those that it names in ``[output] contrasts``.
    levels : sequence of str
        In order.

    Returns
    -------
    Coding
    """
    return coding_of(factor, levels, study.output.contrasts[factor])


def _new_columns(study: StudyFile) -> Iterator[tuple[KeyPath, str]]:
    """The new columns of which the names are known, with the keys that ask for them."""
    for name, wanted in study.output.contrasts.items():
        levels = study.trials.levels.get(name)
        if levels is None or name not in study.trials.factors:
            continue
        if isinstance(wanted, str) or all(len(own) == len(levels) for own in wanted.values()):
            for column in wanted_coding(study, name, levels).columns:
                yield (*_CONTRASTS, name), column
    for place, name in enumerate(study.output.centred):
        yield ("output", "centred", place), centred_name(name)


def _given(study: StudyFile) -> Iterator[tuple[str, Mapping[str, Sequence[float]]]]:
    """The factors for which numbers are given."""
    for name, wanted in study.output.contrasts.items():
        if not isinstance(wanted, str) and name in study.trials.factors:
            yield name, wanted


def _place(factor: str, column: str) -> KeyPath:
    """Where the numbers of a column stand."""
    return (*_CONTRASTS, factor) if column == UNNAMED else (*_CONTRASTS, factor, column)


def _nearest(name: str, names: Sequence[str], otherwise: str) -> str:
    """What to do about an unknown name."""
    near = difflib.get_close_matches(name, names, n=1)
    return f"did you mean {quoted(near[0])}?" if near else f"{otherwise}, or remove it"


def _spelled(columns: Mapping[str, Sequence[float]]) -> str:
    """Columns as the study file may write them."""
    lists = {end: ", ".join(f"{number:g}" for number in own) for end, own in columns.items()}
    if list(lists) == [UNNAMED]:
        return f"[{lists[UNNAMED]}]"
    return ", ".join(f"{end} = [{own}]" for end, own in lists.items())


def _counted(count: int, what: str) -> str:
    """A number of things."""
    return f"{count} {what}" + ("" if count == 1 else "s")
