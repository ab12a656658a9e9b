"""The starter scripts of the bundle, in R and in Python, and the page that says how to begin."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any, Final

from jinja2 import Environment, PackageLoader, StrictUndefined

from etl.cells import MARKED
from etl.handoff.codebook_study import StudyFacts
from etl.readiness.facts import (
    ALL_REGIONS,
    ROWS_REMARK,
    VERDICT_RULES,
    VERDICTS,
    OutcomeReadiness,
    Readiness,
    Verdict,
)
from etl.tables import TableDesign

#: The tables that the scripts read.
READ_TABLES: Final = ("outcomes_wide", "trials")
#: Questions that studies of reading ask most often; other outcomes are at hand for checks.
_USUAL: Final = (
    "first_pass_regression_out",
    "regression_out",
    "regression_in",
    "reread",
    "first_pass_skip",
)
_RULE: Final = (
    "These were chosen to begin with something: out of the outcomes about regressions, rereading "
    "and skipping in a region (out of all, where none of these is there) those with the best "
    "verdict in readiness.csv, and out of these the one with the most of its rarer value. That is "
    "no reason to report it."
)
#: What no program can decide for a statistician.
CHOICES: Final = tuple(
    """
which outcome in which region answers your question: decide before you look at effects;
contrasts: what each coefficient compares with what, and what the intercept is the mean of;
random effects: which slopes the design allows and the data support, and which step you report;
several outcomes or regions: they share trials and fixations, so correct for how many you test;
covariates: which, centred or not, and whether they interact with the conditions;
missing values: whether a region was skipped, or never reached, for reasons of the condition;
what was left out (exclusions.csv), and whether the result hangs on it;
estimation: Laplace or quadrature, tests, bootstrap, priors; penalties where cells are one-sided.
""".strip().split("\n")
)
#: What can be done with an outcome of each verdict. The ways out of separation: Firth (1993), Bias
#: reduction of maximum likelihood estimates, Biometrika, 80, 27-38, doi:10.1093/biomet/80.1.27,
#: taken up for separation by Heinze & Schemper (2002), A solution to the problem of separation in
#: logistic regression, Statistics in Medicine, 21, 2409-2419, doi:10.1002/sim.1047; and Gelman,
#: Jakulin, Pittau & Su (2008), A weakly informative default prior distribution for logistic and
#: other regression models, Annals of Applied Statistics, 2, 1360-1383, doi:10.1214/08-AOAS191.
VERDICT_ADVICE: Final[dict[Verdict, str]] = {
    "no values": "nothing can be fitted; the column missing of outcomes says why each is missing",
    "constant": "there is nothing to model: report the count, with the interval in readiness.csv",
    "separated": (
        "some estimates run off to infinity, often with huge standard errors and no warning, and "
        "simpler random effects do not mend that: put levels or regions together where that makes "
        "sense, leave out the effect that does it and report its counts, or fit with a penalty "
        "(Firth 1993, Heinze & Schemper 2002) or weakly informative priors (Gelman et al. 2008)"
    ),
    "sparse": (
        "the expectations in formulas.csv say what speaks against each step: ask less of the data "
        "(fewer effects, levels or regions), collect more, or report the model as unsure, with "
        "intervals"
    ),
    "ready": "begin with the step that is marked as the start, and check the fit as any other",
}
#: By what the ladder leaves slopes out, and by what it cannot.
LADDER_REMARK: Final = (
    "Slopes go in the order of how many of the rarer value stand behind them, fewest first: how "
    "little a slope varies is known only after a fit, and may call for another order."
)
#: Standard deviations of normal priors in the Python model, on the log-odds scale: those that
#: statsmodels takes by itself.
_PRIOR_FIXED: Final = 2
_PRIOR_SCALE: Final = 1
#: On the log-odds scale: an interval of 95 % would go over odds of some 10 to the power of 17. What
#: limit one takes hardly matters, as separation makes far larger ones (common practice, no source).
_ABSURD_ERROR: Final = 10
_KINDS: Final = {
    "text": "text",
    "category": "factor",
    "integer": "whole",
    "number": "number",
    "flag": "flag",
}
_WIDTH: Final = 100


@dataclass(frozen=True, slots=True)
class BundleFacts:
    """What the bundle tells of a study.

    Attributes
    ----------
    study : StudyFacts
        Its title and decisions.
    design : TableDesign
        What its tables have in common.
    readiness : Readiness
        What is told of its binary outcomes.
    formats : tuple of str
        The formats in which the study wants its tables: ``parquet``, ``csv``.
    """

    study: StudyFacts
    design: TableDesign
    readiness: Readiness
    formats: tuple[str, ...]


def first_choice(readiness: Readiness) -> OutcomeReadiness | None:
    """The outcome and region with which the scripts begin.

    Parameters
    ----------
    readiness : Readiness
        All binary outcomes of a study.

    Returns
    -------
    OutcomeReadiness or None
        Of the outcomes that are asked about most often (of all, where the study has none of
        these) the one with the best verdict, and of these with the most of its rarer value; the
        first of equals. None where the study has no binary outcome.
    """
    usual = [one for one in readiness.outcomes if one.outcome in _USUAL]
    return max(
        usual or readiness.outcomes,
        key=lambda one: (VERDICTS.index(one.verdict), min(one.total.zeros, one.total.ones)),
        default=None,
    )


def starter_texts(facts: BundleFacts) -> dict[str, str]:
    """The scripts and the page, by the names of their files.

    Parameters
    ----------
    facts : BundleFacts
        What they tell of the study. The same facts give the same texts.

    Returns
    -------
    dict of str to str
        ``start.R``, ``start.py`` and ``README.md``.
    """
    study, design, readiness = facts.study, facts.design, facts.readiness
    chosen = first_choice(readiness)
    told = {
        "title": study.title or "A study of reading",
        "outcome": chosen.outcome if chosen else "",
        "region": chosen.region if chosen else "",
        "rule": _wrapped(_RULE),
        "factors": [_factor(design, name) for name in design.factors],
        "tables": [_table(design, name) for name in READ_TABLES],
        "contrast_columns": [end for own in design.codings.values() for end in own.columns],
        "regions": design.regions,
        "all_regions": ALL_REGIONS,
        "marked": MARKED,
        "choices": CHOICES,
        "prior_fixed": _PRIOR_FIXED,
        "prior_scale": _PRIOR_SCALE,
        "chosen": chosen,
        "study": study,
        "reasons": {name: study.reasons[name] for name in design.reasons if name in study.reasons},
        "formats": facts.formats,
        "sharing": _sharing(readiness),
        "rows_remark": ROWS_REMARK,
        "verdicts": [(own, VERDICT_RULES[own], VERDICT_ADVICE[own]) for own in VERDICTS],
        "ladder_remark": LADDER_REMARK,
        "absurd_error": _ABSURD_ERROR,
    }
    return {
        name: _environment().get_template(f"{name}.jinja").render(told)
        for name in ("start.R", "start.py", "README.md")
    }


def _sharing(readiness: Readiness) -> dict[str, list[str]]:
    """For each binary outcome those that are not independent of it."""
    sharing: dict[str, list[str]] = {one.outcome: [] for one in readiness.outcomes}
    for pair in readiness.dependences:
        for one, other in ((pair.first, pair.second), (pair.second, pair.first)):
            if one in sharing and other != one and other not in sharing[one]:
                sharing[one].append(other)
    return {name: others for name, others in sharing.items() if others}


def _factor(design: TableDesign, name: str) -> dict[str, Any]:
    """A factor with its levels and numbers."""
    coding = design.coding(name)
    return {
        "name": name,
        "levels": coding.levels,
        "coding": coding.name,
        "columns": coding.columns,
        "rows": [
            {"level": level, "numbers": [_number(number) for number in numbers]}
            for level, numbers in zip(coding.levels, coding.matrix, strict=True)
        ],
    }


def _table(design: TableDesign, name: str) -> dict[str, Any]:
    """A table's columns by what they hold."""
    kinds: dict[str, list[str]] = {}
    for column in design.columns(name):
        kinds.setdefault(_KINDS[column.type], []).append(column.name)
    return {"name": name, "kinds": [{"name": k, "columns": own} for k, own in kinds.items()]}


@cache
def _environment() -> Environment:
    """The templates, with what writes texts as R and Python take them."""
    # Scripts and Markdown are no HTML: escaping for it would spoil them.
    environment = Environment(  # noqa: S701
        loader=PackageLoader("etl.handoff"),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.filters |= {
        "comment": _comment,
        "r": _r,
        "r_inner": lambda text: _r(text)[1:-1],
        "r_vector": _r_vector,
        "py": _py,
        "py_inner": lambda text: _py(text)[1:-1],
        "py_list": _py_list,
        "md": _md,
    }
    return environment


def _wrapped(text: str) -> list[str]:
    """A text as lines of a comment."""
    lines = [""]
    for word in text.split():
        if len(lines[-1]) + len(word) > _WIDTH - 4:
            lines.append("")
        lines[-1] += f"{' ' if lines[-1] else ''}{word}"
    return lines


def _comment(text: str) -> str:
    """A text that stays within its line."""
    return "".join(sign if sign.isprintable() else " " for sign in text)


def _r(text: str) -> str:
    r"""A text as R writes it, in plain letters: others would depend on the computer's setting.

    Examples
    --------
    >>> print(_r('früh "\n"'))
    "fr\u00fch \"\n\""
    """
    named = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\t": "\\t", "\r": "\\r"}
    signs = []
    for sign in text:
        code = ord(sign)
        if sign in named:
            signs.append(named[sign])
        elif code < 0x20 or code == 0x7F:
            signs.append(f"\\x{code:02x}")
        elif code < 0x7F:
            signs.append(sign)
        else:
            signs.append(f"\\u{code:04x}" if code < 0x10000 else f"\\U{code:08x}")
    return f'"{"".join(signs)}"'


def _number(number: float) -> str:
    """A number as R and Python both read it, in the shortest form that gives the same number.

    Examples
    --------
    >>> [_number(number) for number in (-1.0, 0.1, 1e308, -2.5e-9)]
    ['-1', '0.1', '1e+308', '-2.5e-09']
    """
    return repr(float(number)).removesuffix(".0")


def _py(text: str) -> str:
    """A text as Python writes it; what JSON writes is the same there."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\x7f")


def _r_vector(texts: Sequence[str], indent: int) -> str:
    """Texts as a vector in R, over several lines where they need it."""
    return _listed([_r(text) for text in texts], ("c(", ")"), indent) if texts else "character()"


def _py_list(texts: Sequence[str], indent: int) -> str:
    """Texts as a list in Python, over several lines where they need it."""
    return _listed([_py(text) for text in texts], ("[", "]"), indent)


def _listed(parts: Sequence[str], brackets: tuple[str, str], indent: int) -> str:
    """Parts between brackets, in lines no longer than need be."""
    before, after = brackets
    whole = ", ".join(parts)
    # Half a line is what a name and its brackets leave free at most.
    if len(whole) <= _WIDTH // 2:
        return before + whole + after
    inner = " " * (indent + 2)
    lines = [inner]
    for place, part in enumerate(parts):
        piece = part + ("," if place < len(parts) - 1 else "")
        if lines[-1].strip() and len(lines[-1]) + len(piece) + 1 > _WIDTH:
            lines.append(inner)
        lines[-1] += f"{' ' if lines[-1].strip() else ''}{piece}"
    return "\n".join([before, *lines, " " * indent + after])


def _md(text: str) -> str:
    """A text as it may stand in a line of Markdown."""
    return "".join(f"\\{sign}" if sign in "\\`*_<>[]|#" else sign for sign in _comment(text))
