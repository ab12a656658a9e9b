"""The variants file: the same study under other decisions.

All combinations of alternatives are what is known as a multiverse analysis (Steegen, Tuerlinckx,
Gelman & Vanpaemel 2016, doi:10.1177/1745691616658637).
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from etl.errors import Findings, StudyError
from etl.study.load import Study
from etl.study.positions import KeyPath, nearest_line
from etl.study.rule import Problem, quoted
from etl.study.syntax import decode, parse, read_bytes
from etl.study.variant_alternatives import varied_keys
from etl.study.variant_comparisons import NamedComparison, Outcomes, comparisons
from etl.study.variant_crossing import crossed
from etl.study.variant_keys import BESIDE, WHAT_VARIES, Entry, entries
from etl.study.variant_named import named
from etl.study.variant_told import Told
from etl.study.wording import toml_text
from etl.variants.facts import Crossing

_COLUMN = re.compile(r"column (\d+)")
_OFF = re.compile(r"(off|none|no|null)\b", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class StudyVariants:
    """A variants file that was read and found sound.

    Attributes
    ----------
    shown : str
        The name of the file in messages, as the user gave it.
    path : Path
        The file, absolute.
    sha256 : str
        Digest of the file as it was read, in hex.
    title : str
        What the file is called; empty where it does not say.
    crossing : Crossing
        Which variants there are; variant 0 is the study as it stands.
    studies : tuple of Study
        One for each variant, with the source of the study: lines are those of the study file.
    comparisons : tuple of NamedComparison
        What to lead with; empty where the file names nothing.
    lines : mapping of tuple to int
        The line of each key of the variants file, from 1.
    """

    shown: str
    path: Path
    sha256: str
    title: str
    crossing: Crossing
    studies: tuple[Study, ...]
    comparisons: tuple[NamedComparison, ...]
    lines: Mapping[KeyPath, int] = field(default_factory=dict)

    def line_of(self, *path: str | int) -> int | None:
        """The line of a key in the variants file.

        Parameters
        ----------
        *path : str or int
            Keys from the outermost table inwards, and places in arrays from 0.

        Returns
        -------
        int or None
            From 1. Where the key is not in the file, the line of the nearest table around it;
            None where that is not there either.
        """
        return nearest_line(self.lines, path)


def load_variants(
    path: str | Path,
    study: Study,
    *,
    region_outcomes: Collection[str],
    trial_outcomes: Collection[str],
    known_outcomes: Collection[str],
) -> StudyVariants:
    """Read a variants file: lists of alternatives for keys of the study file, or named variants.

    Parameters
    ----------
    path : str or Path
        The variants file: TOML, UTF-8, with or without a byte-order mark.
    study : Study
        The study whose decisions vary. Its own values are always among the alternatives.
    region_outcomes, trial_outcomes : collection of str
        The names of the 0/1 outcomes that the study computes, of regions and of whole trials. A
        name may be in both.
    known_outcomes : collection of str
        The names of all measures, with or without the groups.

    Returns
    -------
    StudyVariants
        With a sound study for each variant. Whether files that a variant names are there, and
        regions too, is left to those who read them.

    Raises
    ------
    StudyError
        If the file cannot be read, is no TOML, names what may not vary, or has variants that are
        no sound study: all problems at once, each with its line. Combinations are looked at once
        every alternative is sound by itself.

    Examples
    --------
    >>> study = Study.model_validate(
    ...     {
    ...         "logs": {"files": ["*.tsv"], "columns": {"onset": "t_start"}},
    ...         "regions": {"file": "boxes.csv", "kind": "boxes"},
    ...     }
    ... )
    >>> load_variants(
    ...     "none.toml", study, region_outcomes=(), trial_outcomes=(), known_outcomes=()
    ... )
    Traceback (most recent call last):
        ...
    etl.errors.StudyError: none.toml: there is no such file; expected a variants file
        fix: correct the name, or change to the folder that holds it
    1 problem; nothing was written
    """
    shown = str(path)
    findings = Findings()
    raw = read_bytes(Path(path), shown, findings)
    text = None if raw is None else decode(raw, shown, findings)
    parsed = None if text is None else parse(text, shown, findings)
    if raw is None or parsed is None:
        raise StudyError(_of_variants(findings, text or ""))
    data, lines = parsed
    if "logs" in data:
        raise StudyError(_swapped(shown, lines))
    told = Told(shown, lines)
    title = _title(data, told)
    outcomes = Outcomes(region_outcomes, trial_outcomes, known_outcomes)
    leading = comparisons(data.get("comparisons", []), study, outcomes, told)
    made = _variants(data, study, told)
    if made is None or len(told):
        raise StudyError(told.findings())
    crossing, studies = made
    return StudyVariants(
        shown,
        Path(path).absolute(),
        hashlib.sha256(raw).hexdigest(),
        title,
        crossing,
        studies,
        leading,
        lines,
    )


def _swapped(shown: str, lines: Mapping[KeyPath, int]) -> Findings:
    """What is said of a study file in the place of a variants file."""
    findings = Findings()
    findings.error(
        "this is a study file",
        path=shown,
        line=nearest_line(lines, ("logs",)),
        where="logs",
        expected="a variants file, which says nothing of logs",
        fix="name the study file first, then the variants file",
    )
    return findings


def _of_variants(findings: Findings, text: str) -> Findings:
    """What was said of a study file, said of a file of variants."""
    lines = text.split("\n")
    said = Findings()
    for one in findings:
        fix = one.fix
        place = _COLUMN.fullmatch(one.where)
        if place is not None and one.line is not None:
            rest = lines[one.line - 1][int(place[1]) - 1 :]
            off = _OFF.match(rest)
            # Only a value is told so: a key of this name is another mistake.
            if off is not None and one.problem == "this is no value":
                fix = f"{off[0]} is no word of TOML: write false where a rule is off"
        said.add(
            replace(
                one,
                problem=one.problem.replace("study file", "variants file"),
                expected=one.expected.replace("study file", "variants file"),
                fix=fix.replace("study file", "variants file").replace(
                    "study.toml", "variants.toml"
                ),
            )
        )
    return said


def _title(data: Mapping[str, Any], told: Told) -> str:
    """The title; empty where there is none."""
    given = data.get("title", "")
    if isinstance(given, str):
        return given
    said = toml_text(given)
    told.add(
        ("title",),
        Problem(
            ("title",), "this is no text", said, "text in quotes", f"write title = {quoted(said)}"
        ),
    )
    return ""


def _variants(
    data: Mapping[str, Any], study: Study, told: Told
) -> tuple[Crossing, tuple[Study, ...]] | None:
    """The variants that the file gives, in one of the two ways; None where that was refused."""
    before = len(told)
    settings = {key: value for key, value in data.items() if key not in BESIDE}
    listed: list[Entry] = entries(settings, (), told, crossed=True)
    variants = data.get("variants", [])
    if listed and variants:
        told.add(
            ("variants",),
            Problem(
                ("variants",),
                "the file has both lists of alternatives and named variants",
                expected="one of the two",
                fix="keep the lists, or put every value into a variant",
            ),
        )
        return None
    if variants:
        made = named(variants, study, told)
        return None if len(told) > before else made
    varied = varied_keys(listed, study, told)
    if len(told) > before:
        return None
    if not varied:
        told.add(
            (),
            Problem(
                (),
                "the file names nothing that varies",
                expected=WHAT_VARIES,
                fix="write for example under_ms = [60, 80, 100] under [screening.fixations]",
            ),
        )
        return None
    return crossed(varied, study, told)
