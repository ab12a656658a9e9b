"""What the page of a study under other decisions leads with: comparisons named by the user."""

from __future__ import annotations

import difflib
import unicodedata
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from typing import Any, Final

from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted
from etl.study.trial_rules import OUTCOME_GROUPS
from etl.study.variant_told import Told
from etl.study.wording import listed_choices, toml_text

_KEYS: Final = ("outcome", "region", "factor", "level")


@dataclass(frozen=True, slots=True)
class NamedComparison:
    """A comparison that the variants file names.

    Attributes
    ----------
    outcome, region : str
        The outcome, and the region where it is one of regions; empty otherwise.
    factor, level : str
        The level that is compared with the factor's reference level. The level is empty where the
        file leaves it out, and both are in a study without factors.
    line : int or None
        Where it begins in the file, from 1.
    """

    outcome: str
    region: str
    factor: str
    level: str
    line: int | None


@dataclass(frozen=True, slots=True)
class Outcomes:
    """The outcomes that can be compared.

    Attributes
    ----------
    of_regions, of_trials : collection of str
        The names of the 0/1 outcomes that the study computes.
    known : collection of str
        The names of all measures there are, with or without the groups.
    """

    of_regions: Collection[str]
    of_trials: Collection[str]
    known: Collection[str]


def comparisons(
    given: Any, study: StudyFile, outcomes: Outcomes, told: Told
) -> tuple[NamedComparison, ...]:
    """Read the comparisons of a variants file.

    Parameters
    ----------
    given : object
        What the file has under ``comparisons``.
    study : StudyFile
        The study. Names of regions, and levels that it does not state, are not checked.
    outcomes : Outcomes
        What can be compared.
    told : Told
        Where everything that is wrong is recorded.

    Returns
    -------
    tuple of NamedComparison
        In the order of the file, as far as they are sound.
    """
    if not isinstance(given, list) or not all(isinstance(one, Mapping) for one in given):
        told.add(
            ("comparisons",),
            Problem(
                ("comparisons",),
                "these are no comparisons",
                expected="a table for each comparison",
                fix="write [[comparisons]] on a line of its own before each comparison",
            ),
        )
        return ()
    found: dict[tuple[str, ...], NamedComparison] = {}
    for place, table in enumerate(given):
        at: KeyPath = ("comparisons", place)
        one = _Reading(table, at, study, outcomes, told).comparison()
        if one is None:
            continue
        levels = study.trials.levels.get(one.factor, ())
        level = one.level or (levels[1] if levels else "")
        same = found.setdefault((one.outcome, one.region, one.factor, level), one)
        if same is not one:
            told.add(
                at,
                Problem(
                    at,
                    f"this comparison is named in line {same.line} already",
                    fix="keep one of the two",
                ),
            )
    return tuple(found.values())


class _Reading:
    """One comparison, key by key."""

    def __init__(
        self,
        table: Mapping[str, Any],
        at: KeyPath,
        study: StudyFile,
        outcomes: Outcomes,
        told: Told,
    ) -> None:
        self.table = table
        self.at = at
        self.trials = study.trials
        self.outcomes = outcomes
        self.told = told

    def comparison(self) -> NamedComparison | None:
        """What the table names; None where something about it was recorded."""
        before = len(self.told)
        for key in self.table:
            if key not in _KEYS:
                self._unknown_key(key)
        texts = {key: self._text(key) for key in _KEYS}
        self._check_outcome(texts["outcome"])
        self._check_region(texts["outcome"], texts["region"])
        self._check_factor(texts["factor"])
        self._check_level(texts["factor"], texts["level"])
        if len(self.told) > before:
            return None
        return NamedComparison(
            texts["outcome"],
            texts["region"],
            texts["factor"],
            texts["level"],
            self.told.line_of(self.at),
        )

    def _record(
        self, key: str, problem: str, found: str | None = None, expected: str = "", fix: str = ""
    ) -> None:
        """Record what is wrong at a key."""
        path = (*self.at, key)
        self.told.add(path, Problem(path, problem, found, expected, fix))

    def _unknown_key(self, key: str) -> None:
        """Record a key that means nothing here."""
        near = difflib.get_close_matches(
            key.lower(), [own for own in _KEYS if own not in self.table], n=1
        )
        if near:
            self._record(key, "unknown key", fix=f"did you mean {quoted(near[0])}?")
        else:
            self._record(
                key, "unknown key", expected="outcome, region, factor or level", fix="remove it"
            )

    def _text(self, key: str) -> str:
        """The text of a key; empty where there is none, or one of another kind was recorded."""
        given = self.table.get(key, "")
        number = isinstance(given, (int, float)) and not isinstance(given, bool)
        if key == "level" and number:  # as the study file takes the value of a cell
            given = toml_text(given)
        if not isinstance(given, str):
            said = toml_text(given)
            single = not isinstance(given, (list, Mapping))
            fix = f"write {key} = {quoted(said)}" if single else f'write {key} = "…"'
            self._record(key, "this is no text", said, "text in quotes", fix)
            return ""
        text = unicodedata.normalize("NFC", given).strip()
        if key in self.table and not text:
            self._record(key, "this is empty", None, "some text", "write a name, or remove the key")
        return text

    def _check_outcome(self, name: str) -> None:
        """An outcome is one of zeros and ones that the study computes."""
        computed = sorted({*self.outcomes.of_regions, *self.outcomes.of_trials})
        if "outcome" not in self.table:
            self._record(
                "outcome",
                "this key is missing",
                expected="the 0/1 outcome that is compared",
                fix=f"add for example outcome = {quoted(computed[0])}"
                if computed
                else "add a 0/1 outcome to measures.outcomes of the study, and name it here",
            )
        if not name or name in computed:
            return
        if name in self.outcomes.known and name not in OUTCOME_GROUPS:
            self._record(
                "outcome",
                "the study computes no 0/1 outcome of this name",
                name,
                "a 0/1 outcome among the measures.outcomes of the study",
                "name another, or add it to measures.outcomes if it is one of zeros and ones",
            )
            return
        near = difflib.get_close_matches(name.lower(), computed, n=1)
        self._record(
            "outcome",
            "there is no such outcome",
            name,
            "the name of a 0/1 outcome",
            f"did you mean {quoted(near[0])}?"
            if near
            else "take a name from the list that `trialwright measures` prints",
        )

    def _check_region(self, outcome: str, region: str) -> None:
        """A region goes with an outcome of regions, and with no other."""
        of_regions = outcome in self.outcomes.of_regions
        of_trials = outcome in self.outcomes.of_trials
        if of_regions and not of_trials and "region" not in self.table:
            self._record(
                "region",
                "this key is missing",
                expected=f"the region in which {outcome} is compared",
                fix='add region = "…" with the name of a region',
            )
        if of_trials and not of_regions and "region" in self.table:
            self._record(
                "region",
                f"{outcome} is an outcome of whole trials",
                region or None,
                "no region",
                "remove region",
            )

    def _check_factor(self, name: str) -> None:
        """A factor is one of the study's."""
        factors = self.trials.factors
        if not factors:
            for key in ("factor", "level"):
                if key in self.table:
                    self._record(
                        key,
                        "the study has no factors; the rate itself is looked at",
                        expected="no factor and no level",
                        fix=f"remove {key}, or name the factors in [trials] of the study",
                    )
        elif "factor" not in self.table:
            self._record(
                "factor",
                "this key is missing",
                expected=listed_choices(factors),
                fix=f"add for example factor = {quoted(factors[0])}",
            )
        elif name and name not in factors:
            near = difflib.get_close_matches(name, factors, n=1)
            self._record(
                "factor",
                "this is no factor of the study",
                name,
                listed_choices(factors),
                f"did you mean {quoted(near[0])}?" if near else "take one of these",
            )

    def _check_level(self, factor: str, name: str) -> None:
        """A level is one of the factor's, and not the one it is compared with."""
        levels = self.trials.levels.get(factor, ())
        if factor not in self.trials.factors or not levels:
            return
        others = levels[1:]
        expected = listed_choices(others) if others else "a factor of two levels or more"
        if not others:
            self._record(
                "factor",
                "the study states one level of this factor, so nothing can be compared",
                factor,
                expected,
                "name another factor",
            )
        elif "level" not in self.table and len(others) > 1:
            self._record(
                "level",
                "this key is missing, and the factor has more than two levels",
                expected=expected,
                fix=f"add for example level = {quoted(others[0])}",
            )
        elif name == levels[0]:
            self._record(
                "level",
                "this is the reference level, with which the others are compared",
                name,
                expected,
                f"write level = {quoted(others[0])}"
                if len(others) == 1
                else "take one of the others",
            )
        elif name and name not in others:
            near = difflib.get_close_matches(name, others, n=1)
            self._record(
                "level",
                "this is no level of the factor",
                name,
                expected,
                f"did you mean {quoted(near[0])}?" if near else "take one of these",
            )
