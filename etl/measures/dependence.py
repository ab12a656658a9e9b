"""Which outcomes rest on the same fixations by design, and what one then says of another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import Final, Literal

from etl.measures.conventions import NoOpportunity, Outside

When = Literal["= 0", "= 1", "> 0", "has a value"]
Then = Literal[
    "= 0",
    "= 1",
    ">= 1",
    ">= 2",
    "> 0",
    "missing",
    "not 0",
    "not 1",
    "not > 0",
    ">= it",
    "= it",
]
Level = Literal["region", "trial", "both"]
#: What a study does with fixations outside every region, and where there was no opportunity.
Conventions = tuple[Outside, NoOpportunity]


@dataclass(frozen=True, slots=True)
class Implication:
    """What one outcome says of another, in every trial that there is.

    Attributes
    ----------
    first : str
        Name of an outcome.
    when : str
        For which of its values.
    second : str
        Name of the other outcome.
    then : str
        What holds of that one; ``it`` is the value of the first.
    level : {"region", "trial", "both"}
        Whether both are outcomes of the same region, both of the same trial, or the first of a
        region and the second of its trial.
    only_under : {"", "ignore", "interrupt", "missing", "zero"}
        The one convention under which it holds; empty where it holds under all.
    because : str
        Why it does, where that is not plain.
    """

    first: str
    when: When
    second: str
    then: Then
    level: Level = "region"
    only_under: Literal["", Outside, NoOpportunity] = ""
    because: str = ""

    def holds(self, conventions: Conventions | None) -> bool:
        """Whether it holds under a study's conventions; under all that there are for None."""
        return not self.only_under or self.only_under in (conventions or ())

    @property
    def words(self) -> str:
        """The implication in words.

        Examples
        --------
        >>> Implication("first_pass_skip", "= 1", "first_pass_time", "missing").words
        'first_pass_skip = 1 means that first_pass_time is missing'
        """
        under = " under the study's options" if self.only_under else ""
        because = f": {self.because}" if self.because else ""
        return f"{self._bare}{under}{because}"

    @property
    def _bare(self) -> str:
        """The implication without the conventions under which it holds."""
        first, second = named(self)
        if self.when == "has a value":
            if self.then == ">= it":
                return f"{second} is never below {first}"
            if self.then == "= it":
                return f"{second} is the same wherever {first} has a value"
        said = {
            "missing": "is missing",
            "not 0": "is not 0",
            "not 1": "is not 1",
            "not > 0": "is not above 0",
            ">= 1": "is at least 1",
            ">= 2": "is at least 2",
            "> 0": "is above 0",
        }.get(self.then, self.then)
        when = "having a value" if self.when == "has a value" else self.when
        return f"{first} {when} means that {second} {said}"


def named(pair: Implication) -> tuple[str, str]:
    """The names of both outcomes, told apart where an outcome of trials has that of a region."""
    first = pair.first if pair.level != "trial" else of_trial(pair.first)
    return first, pair.second if pair.level == "region" else of_trial(pair.second)


def of_trial(name: str) -> str:
    """The name of an outcome of trials, told apart where one of regions is called the same.

    Examples
    --------
    >>> of_trial("any_skip"), of_trial("fixation_count")
    ('any_skip', 'fixation_count of the trial')
    """
    return f"{name} of the trial" if name == "fixation_count" else name


def _all(
    first: str, when: When, seconds: Sequence[str], then: Then, level: Level = "region"
) -> list[Implication]:
    """The same said of several outcomes."""
    return [Implication(first, when, second, then, level) for second in seconds]


def _ignoring(firsts: Sequence[str], second: str, then: Then) -> list[Implication]:
    """The same of outcomes that are 1, where fixations outside every region are ignored."""
    return [Implication(first, "= 1", second, then, "both", "ignore") for first in firsts]


_OF_FIRST_PASS: Final = ("first_pass_refixation", "first_pass_regression_out", "reread")
_FIRST_PASS_TIMES: Final = (
    "first_fixation_duration",
    "single_fixation_duration",
    "first_pass_time",
    "go_past_time",
    "right_bounded_time",
)

#: What outcomes say of one another. Of a pair with several, the first stands in the list of pairs.
IMPLICATIONS: Final[tuple[Implication, ...]] = (
    *_all("first_pass_skip", "= 1", _FIRST_PASS_TIMES, "missing"),
    *_all("first_pass_skip", "= 1", _OF_FIRST_PASS, "not 1"),
    *_all("first_pass_skip", "= 1", ["first_pass_fixation_count"], "not > 0"),
    *_all("first_pass_skip", "= 0", ["fixated"], "= 1"),
    *_all("first_pass_skip", "= 0", ["first_pass_fixation_count", "fixation_count"], ">= 1"),
    *_all("first_pass_skip", "= 0", ["visit_count"], ">= 1"),
    *_all("first_pass_skip", "= 0", ["total_time"], "> 0"),
    *_all("fixated", "= 0", ["fixation_count", "visit_count"], "= 0"),
    *_all("fixated", "= 0", _OF_FIRST_PASS, "not 1"),
    *_all("fixated", "= 0", ["regression_out", "regression_in"], "not 1"),
    *_all("fixated", "= 0", ["regression_out_count", "regression_in_count"], "not > 0"),
    *_all("fixated", "= 0", ["first_pass_fixation_count"], "not > 0"),
    *_all("fixated", "= 0", [*_FIRST_PASS_TIMES, "second_pass_time", "total_time"], "missing"),
    *_all("first_pass_refixation", "= 1", ["first_pass_fixation_count"], ">= 2"),
    *_all("first_pass_refixation", "= 1", ["fixation_count"], ">= 2"),
    *_all("first_pass_refixation", "= 1", ["single_fixation_duration"], "missing"),
    *_all("first_pass_regression_out", "= 1", ["regression_out"], "= 1"),
    *_all("first_pass_regression_out", "= 1", ["regression_out_count"], ">= 1"),
    *_all("regression_out", "= 1", ["regression_out_count"], ">= 1"),
    *_all("regression_out", "= 0", ["regression_out_count"], "= 0"),
    *_all("regression_in", "= 1", ["regression_in_count"], ">= 1"),
    *_all("regression_in", "= 0", ["regression_in_count"], "= 0"),
    *_all("regression_in", "= 1", ["second_pass_time"], "> 0"),
    *_all("regression_in_count", "> 0", ["second_pass_time"], "> 0"),
    *_all("reread", "= 1", ["visit_count", "fixation_count"], ">= 2"),
    *_all("reread", "= 1", ["second_pass_time"], "> 0"),
    # Who comes in from a later region has been there before, or has skipped it: then reread is
    # missing, but 0 where want of opportunity counts as 0.
    Implication("regression_in", "= 1", "reread", "not 0", only_under="missing"),
    *_all("first_pass_fixation_count", "has a value", ["fixation_count"], ">= it"),
    *_all("visit_count", "has a value", ["fixation_count"], ">= it"),
    *_all("single_fixation_duration", "has a value", ["first_fixation_duration"], "= it"),
    *_all("single_fixation_duration", "has a value", ["first_pass_time"], "= it"),
    *_all("first_fixation_duration", "has a value", ["first_pass_time"], ">= it"),
    *_all("first_pass_time", "has a value", ["right_bounded_time", "go_past_time"], ">= it"),
    *_all("first_pass_time", "has a value", ["total_time"], ">= it"),
    *_all("right_bounded_time", "has a value", ["go_past_time", "total_time"], ">= it"),
    *_all("second_pass_time", "has a value", ["total_time"], ">= it"),
    *_all("first_pass_skip", "= 1", ["any_skip"], "= 1", "both"),
    *_all("first_pass_regression_out", "= 1", ["any_first_pass_regression"], "= 1", "both"),
    *_all("first_pass_regression_out", "= 1", ["any_regression"], "= 1", "both"),
    *_all("regression_out", "= 1", ["any_regression"], "= 1", "both"),
    *_all("regression_in", "= 1", ["any_regression"], "= 1", "both"),
    *_all("regression_out", "= 1", ["regression_count"], ">= 1", "both"),
    *_all("regression_in", "= 1", ["regression_count"], ">= 1", "both"),
    *_all("regression_out_count", "has a value", ["regression_count"], ">= it", "both"),
    *_all("regression_in_count", "has a value", ["regression_count"], ">= it", "both"),
    *_all("fixation_count", "has a value", ["fixation_count"], ">= it", "both"),
    *_all("total_time", "has a value", ["reading_time"], ">= it", "both"),
    # Before the first regression every step goes on, so the first one always ends a first pass; a
    # fixation outside can end that pass before, unless such fixations are ignored.
    *_ignoring(("regression_out", "regression_in"), "any_first_pass_regression", "= 1"),
    # A region is left for an earlier one and reached again, or for a later one and come back to.
    *_ignoring(("reread",), "any_first_pass_regression", "= 1"),
    *_ignoring(("reread",), "any_regression", "= 1"),
    *_ignoring(("reread",), "regression_count", ">= 1"),
    Implication("fixated", "= 0", "any_skip", "= 1", "both", "zero"),
    Implication(
        *("any_first_pass_regression", "has a value", "any_regression", "= it", "trial", "ignore"),
        "the first regression of a trial always ends a first pass, so both are the same outcome",
    ),
    *_all("any_regression", "= 1", ["regression_count"], ">= 1", "trial"),
    *_all("any_regression", "= 0", ["any_first_pass_regression"], "not 1", "trial"),
    *_all("any_regression", "= 0", ["regression_count"], "= 0", "trial"),
    *_all("any_first_pass_regression", "= 1", ["regression_count"], ">= 1", "trial"),
    *_all("fixation_count", "> 0", ["reading_time"], "> 0", "trial"),
    *_all("fixation_count", "> 0", ["regions_reached"], ">= 1", "trial"),
)

#: What outcomes of a region rest on, and how it is said of two that share it; the first that they
#: share is said.
_SHARED: Final = {
    "end": "both rest on the saccade that ends the first pass on the region",
    "out": "both rest on the saccades that leave the region for an earlier one",
    "in": "both rest on the saccades that come into the region from a later one",
    "first": "both rest on the fixations of the first pass on the region, or on there being none",
    "later": "both rest on the later visits to the region, or on there being none",
}
_RESTS_ON: Final[dict[str, frozenset[str]]] = {
    name: frozenset(parts.split())
    for name, parts in {
        "first_pass_skip": "first",
        "fixated": "first later",
        "first_pass_refixation": "first",
        "first_pass_regression_out": "first end out",
        "regression_out": "first later out end",
        "regression_in": "later in",
        "reread": "first later",
        "fixation_count": "first later",
        "first_pass_fixation_count": "first",
        "visit_count": "first later",
        "regression_out_count": "first later out end",
        "regression_in_count": "later in",
        "first_fixation_duration": "first",
        "single_fixation_duration": "first",
        "first_pass_time": "first",
        "go_past_time": "first later end",
        "right_bounded_time": "first later",
        "second_pass_time": "later",
        "total_time": "first later",
    }.items()
}
_BOTH_ENDS: Final = (
    "a regression counts at both of its ends: out of the region that it leaves, and into the "
    "earlier region of the same trial on which it lands"
)
_OUT: Final = ("regression_out", "regression_out_count")
_IN: Final = ("regression_in", "regression_in_count")
#: Outcomes of trials that are made from the same fixations as those of a region.
_MADE_FROM: Final = {
    "any_regression": ("first_pass_regression_out", *_OUT, *_IN),
    "any_first_pass_regression": ("first_pass_regression_out", *_OUT, *_IN),
    "any_skip": ("first_pass_skip",),
    "fixation_count": ("fixated", "fixation_count", "visit_count"),
    "regression_count": ("first_pass_regression_out", *_OUT, *_IN),
    "reading_time": ("fixation_count", "total_time"),
    "regions_reached": ("first_pass_skip", "fixated"),
}
_OF_TRIALS: Final = {
    ("any_regression", "any_first_pass_regression"): "",
    ("any_regression", "regression_count"): "",
    ("any_first_pass_regression", "regression_count"): "",
    ("any_skip", "regions_reached"): "both rest on how far the eyes got in the trial",
    ("fixation_count", "regression_count"): "a saccade is counted where two fixations are",
    ("fixation_count", "progression_count"): "a saccade is counted where two fixations are",
    ("fixation_count", "regions_reached"): "",
    ("fixation_count", "reading_time"): "",
    ("regression_count", "progression_count"): "every saccade from one region to another is one "
    "or the other",
    ("progression_count", "regions_reached"): "both rest on the saccades to later regions",
}


def shared_fixations(
    measures: Sequence[str],
    trial_measures: Sequence[str],
    conventions: Conventions | None = None,
) -> tuple[tuple[str, str, str], ...]:
    """Pairs of outcomes that rest on the same fixations by design.

    Parameters
    ----------
    measures, trial_measures : sequence of str
        Names of outcomes of regions, and of trials, in the order of the catalogue.
    conventions : tuple of str or None
        What the study does with fixations outside every region, and where there was no
        opportunity; for None only what holds whatever it does is told.

    Returns
    -------
    tuple of (str, str, str)
        The names of both, and what they share or what one says of the other, in words. Outcomes
        of regions are of the same region, but for a regression, which has two ends.

    Examples
    --------
    >>> for pair in shared_fixations(["first_pass_skip", "first_pass_time"], ["any_skip"]):
    ...     print(*pair, sep="; ")
    first_pass_skip; first_pass_time; first_pass_skip = 1 means that first_pass_time is missing
    first_pass_skip; any_skip; first_pass_skip = 1 means that any_skip = 1
    >>> shared_fixations(["reread"], ["any_regression"])
    ()
    >>> ((_, _, why),) = shared_fixations(["reread"], ["any_regression"], ("ignore", "zero"))
    >>> why
    "reread = 1 means that any_regression = 1 under the study's options"
    """
    said: dict[tuple[str, str, str], str] = {}
    for one in (one for one in IMPLICATIONS if one.holds(conventions)):
        said.setdefault((one.level, one.first, one.second), one.words)
        said.setdefault((one.level, one.second, one.first), one.words)
    pairs = []
    for first, second in combinations(measures, 2):
        ends = {first in _OUT, second in _IN} == {True} or {first in _IN, second in _OUT} == {True}
        shared = [part for part in _SHARED if part in _RESTS_ON[first] & _RESTS_ON[second]]
        why = said.get(("region", first, second)) or (_SHARED[shared[0]] if shared else "")
        why = _BOTH_ENDS if ends else why
        if why:
            pairs.append((first, second, why))
    for name in trial_measures:
        for first in measures:
            why = said.get(("both", first, name), "")
            if not why and first in _MADE_FROM.get(name, ()):
                why = "what happens in the region is part of what the trial counts"
            if why:
                pairs.append((first, of_trial(name), why))
    for first, second in combinations(trial_measures, 2):
        if (first, second) in _OF_TRIALS:
            why = _OF_TRIALS[first, second] or said["trial", first, second]
            pairs.append((of_trial(first), of_trial(second), why))
    return tuple(pairs)
