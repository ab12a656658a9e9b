"""One outcome as the catalogue describes it, under the options of a study."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

from etl.measures.conventions import NoOpportunity, Outside
from etl.measures.reasons import NO_OPPORTUNITY

_UNITS: Final = {"binary": "0 or 1", "count": "count", "duration": "ms"}


@dataclass(frozen=True, slots=True)
class Measure:
    """One outcome: what it is called, what it counts, and when it is missing.

    Attributes
    ----------
    name : str
        Its name in the tables.
    level : {"region", "trial"}
        Whether there is one value a region of a trial, or one a trial.
    kind : {"binary", "count", "duration"}
        What kind of number it is; the groups by which a study asks for outcomes.
    definition : str
        What is computed, under the options a study has when it names none.
    source : str
        Where the outcome is defined.
    reasons : tuple of str
        The reasons for which it can be missing, in order of precedence.
    interrupted : str
        What ``outside = "interrupt"`` changes in the definition; empty where nothing.
    zeroed : str
        What ``no_opportunity = "zero"`` changes, where that is not the 0 it stands for.
    """

    name: str
    level: Literal["region", "trial"]
    kind: Literal["binary", "count", "duration"]
    definition: str
    source: str
    reasons: tuple[str, ...] = ()
    interrupted: str = ""
    zeroed: str = ""

    @property
    def unit(self) -> str:
        """The unit of its values: ``0 or 1``, ``count`` or ``ms``."""
        return _UNITS[self.kind]

    def reasons_under(self, no_opportunity: NoOpportunity) -> tuple[str, ...]:
        """The reasons for which it can be missing under a convention.

        Parameters
        ----------
        no_opportunity : {"missing", "zero"}
            What a study does where the reader had no chance.

        Returns
        -------
        tuple of str
            In order of precedence.

        Examples
        --------
        >>> Measure("regression_out", "region", "binary", "1 if …", "…",
        ...         ("no_earlier_region", "never_fixated")).reasons_under("zero")
        ('no_earlier_region',)
        """
        if no_opportunity == "missing" or self.kind == "duration":
            return self.reasons
        return tuple(reason for reason in self.reasons if reason not in NO_OPPORTUNITY)

    def definition_under(self, outside: Outside, no_opportunity: NoOpportunity) -> str:
        """The definition under the options of a study.

        Parameters
        ----------
        outside : {"ignore", "interrupt"}
            What a fixation outside every region does.
        no_opportunity : {"missing", "zero"}
            What a study does where the reader had no chance.

        Returns
        -------
        str
            One or more sentences.

        Examples
        --------
        >>> reread = Measure("reread", "region", "binary", "1 if visited again.", "…",
        ...                  ("skipped",), interrupted="A fixation outside ends a visit.")
        >>> reread.definition_under("interrupt", "missing")
        '1 if visited again. A fixation outside ends a visit.'
        >>> reread.definition_under("ignore", "zero")
        '1 if visited again. Also 0 where there was no opportunity (skipped).'
        """
        sentences = [self.definition]
        if outside == "interrupt" and self.interrupted:
            sentences.append(self.interrupted)
        if no_opportunity == "zero":
            dropped = [
                reason for reason in self.reasons if reason not in self.reasons_under("zero")
            ]
            if self.zeroed:
                sentences.append(self.zeroed)
            elif dropped:
                sentences.append(f"Also 0 where there was no opportunity ({', '.join(dropped)}).")
        return " ".join(sentences)
