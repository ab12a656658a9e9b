"""Rules about ``[trials]`` and ``[measures]``: the design, and what is computed."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Iterator

from etl.study.models import StudyFile
from etl.study.rule import Problem, Rule, quoted, rule

#: Groups of outcomes that [measures] may name beside single ones.
OUTCOME_GROUPS = ("binary", "count", "duration")

#: Columns of the outcome tables that no factor or covariate may take.
OWN_COLUMNS = (
    "participant",
    "session",
    "trial",
    "item",
    "region",
    "region_order",
    "measure",
    "kind",
    "value",
    "missing",
)


@rule("trials.keys", "trials.table")
def keys_have_a_table(study: StudyFile) -> Iterator[Problem]:
    """Keys join a trial list; without one they do nothing."""
    if "keys" in study.trials.model_fields_set and study.trials.table is None:
        yield Problem(
            ("trials", "keys"),
            "there is no trial list to join",
            found=", ".join(study.trials.keys),
            expected="table beside keys",
            fix='add table = "…" with the trial list, or remove keys',
        )


@rule("trials.levels", "trials.factors")
def levels_belong_to_factors(study: StudyFile) -> Iterator[Problem]:
    """Only a factor has levels."""
    for name in study.trials.levels:
        if name in study.trials.factors:
            continue
        near = difflib.get_close_matches(name, study.trials.factors, n=1)
        yield Problem(
            ("trials", "levels", name),
            "this is no factor",
            found=name,
            expected="a name from factors",
            fix=f"did you mean {quoted(near[0])}?" if near else "add it to factors, or remove it",
        )


@rule("trials.factors", "trials.covariates")
def factors_are_no_covariates(study: StudyFile) -> Iterator[Problem]:
    """A fact is part of the design, or it is not."""
    for place, name in enumerate(study.trials.covariates):
        if name in study.trials.factors:
            yield Problem(
                ("trials", "covariates", place),
                "this is a factor already",
                found=name,
                expected="a name that is not in factors",
                fix="remove it from one of the two lists",
            )


@rule("trials.factors", "trials.covariates")
def facts_keep_their_own_names(study: StudyFile) -> Iterator[Problem]:
    """A fact cannot take the place of a column that the tables have anyway."""
    yield from _taken(study, OWN_COLUMNS, "the tables have a column of this name anyway")


def unknown_outcomes(known: Collection[str]) -> Rule:
    """Make the rule that an outcome is a group or the name of a measure.

    Parameters
    ----------
    known : collection of str
        The names of all measures.

    Returns
    -------
    Rule
        It reports each unknown name, with the nearest known one.
    """
    names = [*OUTCOME_GROUPS, *known]

    @rule("measures.outcomes")
    def outcomes_are_known(study: StudyFile) -> Iterator[Problem]:
        for place, name in enumerate(study.measures.outcomes):
            if name in names:
                continue
            near = difflib.get_close_matches(name.lower(), names, n=1)
            yield Problem(
                ("measures", "outcomes", place),
                "there is no such outcome",
                found=name,
                expected="a group (binary, count or duration) or the name of a measure",
                fix=f"did you mean {quoted(near[0])}?"
                if near
                else "take a name from the list that `trialwright measures` prints",
            )

    return outcomes_are_known


def facts_called_like_measures(known: Collection[str]) -> Rule:
    """Make the rule that no factor or covariate has the name of a measure.

    Parameters
    ----------
    known : collection of str
        The names of all measures; the tables have a column for each. Groups may be among them.

    Returns
    -------
    Rule
        It reports each factor or covariate with such a name.
    """
    names = set(known) - set(OUTCOME_GROUPS)

    @rule("trials.factors", "trials.covariates")
    def facts_are_no_measures(study: StudyFile) -> Iterator[Problem]:
        yield from _taken(study, names, "a measure has this name, and the tables give it a column")

    return facts_are_no_measures


def _taken(study: StudyFile, names: Collection[str], problem: str) -> Iterator[Problem]:
    """Factors and covariates whose names are taken."""
    for key, facts in (("factors", study.trials.factors), ("covariates", study.trials.covariates)):
        for place, name in enumerate(facts):
            if name in names:
                yield Problem(
                    ("trials", key, place),
                    problem,
                    found=name,
                    expected="a name that no column of the tables has",
                    fix="rename the column in its table, or remove it from the list",
                )
