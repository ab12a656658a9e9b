"""What the tables are made of: columns, and what is known of ids, covariates and measures."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

ColumnType = Literal["text", "category", "flag", "integer", "number"]


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
        As it stands in the file.
    type : {"text", "category", "flag", "integer", "number"}
        A flag is 0 or 1; a category has a fixed order of levels.
    meaning : str
        In a sentence.
    unit : str
        Empty where there is none.
    nullable : bool
        Whether cells may be missing.
    levels : tuple of str
        Levels of a category, the reference level first.
    source : str
        Where the outcome that it holds is defined; empty for what is no outcome.
    reasons : tuple of str
        Why an outcome can be missing under the options of the study.
    """

    name: str
    type: ColumnType
    meaning: str
    unit: str = ""
    nullable: bool = False
    levels: tuple[str, ...] = ()
    source: str = ""
    reasons: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class MeasureColumn:
    """What the tables need to know of a measure.

    Attributes
    ----------
    name : str
        Its name.
    kind : str
        ``binary``, ``count`` or ``duration``.
    unit : str
        Of its values.
    definition : str
        What is computed, under the options of the study.
    source : str
        Where it is defined.
    reasons : tuple of str
        Why it can be missing under the options of the study, in order of precedence.
    """

    name: str
    kind: str
    unit: str
    definition: str
    source: str = ""
    reasons: tuple[str, ...] = ()


@dataclass(frozen=True)
class IdColumn:
    """An identifier: all values that the study has, in the order in which rows are sorted."""

    values: tuple[str, ...]
    type: Literal["text", "integer"]

    @classmethod
    def of(cls, texts: Iterable[str]) -> IdColumn:
        """Order the values of an id: as numbers where all are whole numbers, else as text.

        Examples
        --------
        >>> IdColumn.of(["10", "9"]).values, IdColumn.of(["10", "P9"]).values
        (('9', '10'), ('10', 'P9'))
        """
        distinct = set(texts)
        # "007" is a name, not the number 7: it must come back as it was.
        if distinct and all(
            text.isascii() and text.isdigit() and str(int(text)) == text and len(text) < 19
            for text in distinct
        ):
            return cls(tuple(sorted(distinct, key=int)), "integer")
        return cls(tuple(sorted(distinct)), "text")

    @cached_property
    def ranks(self) -> dict[str, int]:
        """The place of each value."""
        return {text: rank for rank, text in enumerate(self.values)}


@dataclass(frozen=True, slots=True)
class CovariateColumn:
    """A fact that is carried along: a number, or one of some texts."""

    type: Literal["text", "number"]
    values: tuple[str, ...] = ()
