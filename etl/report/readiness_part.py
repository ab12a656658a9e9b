"""What the audit page says of readiness: an overview of all binary outcomes, then one by one."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import groupby

from markupsafe import Markup, escape

from etl.readiness.facts import ROWS_REMARK, Dependence, OutcomeReadiness, Readiness, Verdict
from etl.report.charts import counts_bar
from etl.report.readiness_one import One, collect_one, tally
from etl.report.readiness_words import gravest, region_of, summed_up
from etl.report.wording import count, counted, listed, name

#: This many of the gravest things are named; the overview shows the rest.
MOST_GRAVE = 6
#: What each verdict means, from best to worst, as the overview lists them.
MEANINGS: dict[Verdict, str] = {
    "ready": "a formula of the ladder has nothing against it",
    "sparse": "something speaks against every formula, most often too few ones or zeros",
    "separated": "the factors foretell it without error somewhere: estimates run off to infinity",
    "constant": "only zeros or only ones: nothing to model",
    "no values": "missing everywhere, which can be so by definition",
}


@dataclass(frozen=True, slots=True)
class Kind:
    """A verdict in the legend.

    Attributes
    ----------
    verdict : str
        The word.
    sign : str
        Name of its sign.
    number : str
        How many outcomes have it.
    meaning : str
        What it means.
    """

    verdict: str
    sign: str
    number: str
    meaning: str


@dataclass(frozen=True, slots=True)
class Tile:
    """One outcome in the overview.

    Attributes
    ----------
    place : int
        Number of its fold-out.
    label : Markup
        The region, or the outcome where the group is of several.
    spoken : str
        Outcome and region, for programs that read aloud.
    sign : str
        Name of the sign of its verdict.
    verdict : str
        In a word.
    bar : Markup
        Ones and zeros, drawn.
    numbers : str
        Ones and zeros in words.
    one : One
        All about it.
    """

    place: int
    label: Markup
    spoken: str
    sign: str
    verdict: str
    bar: Markup
    numbers: str
    one: One


@dataclass(frozen=True, slots=True)
class Group:
    """Outcomes that stand together: one over its regions, or several.

    Attributes
    ----------
    heading : Markup
        Of the group.
    spoken : str
        The same, for programs that read aloud.
    tiles : tuple of Tile
        In the order of the facts.
    by_region : bool
        Whether it is one outcome over its regions.
    """

    heading: Markup
    spoken: str
    tiles: tuple[Tile, ...]
    by_region: bool


@dataclass(frozen=True, slots=True)
class GraveLine:
    """One of the gravest things.

    Attributes
    ----------
    place : int
        Number of the fold-out.
    sign : str
        Name of the sign of the verdict.
    verdict : str
        In a word.
    where : Markup
        Outcome and region.
    says : str
        What is the matter.
    """

    place: int
    sign: str
    verdict: str
    where: Markup
    says: str


@dataclass(frozen=True, slots=True)
class Shared:
    """Pairs of outcomes that share something.

    Attributes
    ----------
    why : str
        What they share.
    pairs : Markup
        Each outcome with those it is not independent of; empty where the reason names both.
    """

    why: str
    pairs: Markup


@dataclass(frozen=True, slots=True)
class ReadinessPart:
    """All that the page says of readiness.

    Attributes
    ----------
    says : str
        In a sentence.
    kinds : tuple of Kind
        The verdicts that occur.
    grave : tuple of GraveLine
        The gravest things.
    more_grave : str
        How many more there are; empty where all are named.
    groups : tuple of Group
        All outcomes.
    factors : tuple of str
        The factors that make the conditions.
    shared, shared_others : tuple of Shared
        Outcomes that are not independent by design: the binary ones, and pairs with others.
    pairs, other_pairs : str
        How many pairs of them there are, and how many of them are with others.
    remark : str
        What holds of the rows of every outcome.
    """

    says: str
    kinds: tuple[Kind, ...]
    grave: tuple[GraveLine, ...]
    more_grave: str
    groups: tuple[Group, ...]
    factors: tuple[str, ...]
    shared: tuple[Shared, ...]
    shared_others: tuple[Shared, ...]
    pairs: str
    other_pairs: str
    remark: str


def collect_readiness(readiness: Readiness | None) -> ReadinessPart | None:
    """Gather what the page says of readiness.

    Parameters
    ----------
    readiness : Readiness or None
        What is told of the outcomes; None where nothing was judged.

    Returns
    -------
    ReadinessPart or None
        None where there is neither a binary outcome nor a pair of outcomes to speak of.
    """
    if readiness is None or not (readiness.outcomes or readiness.dependences):
        return None
    kinds = Counter(one.verdict for one in readiness.outcomes)
    judged = {one.outcome for one in readiness.outcomes}
    binary = [one for one in readiness.dependences if {one.first, one.second} <= judged]
    others = [one for one in readiness.dependences if not {one.first, one.second} <= judged]
    found = gravest(readiness)
    more = len(found) - MOST_GRAVE
    return ReadinessPart(
        summed_up(readiness),
        tuple(
            Kind(verdict, sign_of(verdict), count(kinds[verdict]), meaning)
            for verdict, meaning in MEANINGS.items()
            if kinds[verdict]
        ),
        tuple(
            GraveLine(
                grave.place + 1,
                sign_of(grave.judged.verdict),
                grave.judged.verdict,
                where(grave.judged),
                grave.says,
            )
            for grave in found[:MOST_GRAVE]
        ),
        f"{count(more)} more: see the overview" if more > 0 else "",
        _groups(readiness),
        readiness.factors,
        _shared(binary),
        _shared(others),
        counted(len(readiness.dependences), "pair"),
        counted(len(others), "pair" if not binary else "other pair"),
        ROWS_REMARK,
    )


def readiness_headline(readiness: Readiness | None) -> Markup | None:
    """What is said of readiness at the top of the page; None where nothing is grave.

    Parameters
    ----------
    readiness : Readiness or None
        What is told of the outcomes.
    """
    found = gravest(readiness) if readiness is not None else ()
    if readiness is None or not found:
        return None
    worst = found[0]
    return Markup("{} The worst is {}: {}.").format(
        summed_up(readiness), where(worst.judged), worst.says
    )


def sign_of(verdict: Verdict) -> str:
    """The name of a verdict's sign, which is part of an id."""
    return verdict.replace(" ", "-")


def where(judged: OutcomeReadiness) -> Markup:
    """An outcome and its region."""
    outcome, region = _code(judged.outcome), region_of(judged)
    return Markup("{} in {}").format(outcome, name(region)) if region else outcome


def _code(outcome: str) -> Markup:
    """The name of an outcome, which may break after an underscore."""
    parts = [escape(part) for part in outcome.split("_")]
    return Markup("<code>{}</code>").format(Markup("_<wbr>").join(parts))


def _groups(readiness: Readiness) -> tuple[Group, ...]:
    """The outcomes of regions by name, or all in one group where each has one region; trials."""
    numbered = list(enumerate(readiness.outcomes, start=1))
    of_regions = [pair for pair in numbered if pair[1].region]
    of_trials = [pair for pair in numbered if not pair[1].region]
    most = max((one.total.values for one in readiness.outcomes), default=0)
    regions = {one.region for _, one in of_regions}
    groups = []
    if len(regions) == 1:
        (region,) = regions
        heading = Markup("All regions together") if readiness.together else name(region)
        spoken = "All regions together" if readiness.together else region
        groups.append(_group(heading, spoken, of_regions, most, by_region=False))
    else:
        for outcome, own in groupby(of_regions, key=lambda pair: pair[1].outcome):
            groups.append(_group(_code(outcome), outcome, list(own), most, by_region=True))
    if of_trials:
        groups.append(
            _group(Markup("Whole trials"), "Whole trials", of_trials, most, by_region=False)
        )
    return tuple(groups)


def _group(
    heading: Markup,
    spoken: str,
    numbered: Sequence[tuple[int, OutcomeReadiness]],
    most: int,
    *,
    by_region: bool,
) -> Group:
    """Some outcomes that stand together."""
    tiles = []
    for place, one in numbered:
        label = name(one.region) if by_region else _code(one.outcome)
        spelled = ", ".join(filter(None, (one.outcome, region_of(one))))
        tiles.append(
            Tile(
                place,
                label,
                spelled,
                sign_of(one.verdict),
                one.verdict,
                counts_bar(one.total.ones, one.total.zeros, most),
                tally(one.total),
                collect_one(one),
            )
        )
    return Group(heading, spoken, tuple(tiles), by_region)


def _shared(dependences: Sequence[Dependence]) -> tuple[Shared, ...]:
    """Pairs by what they share, and within that by their first outcome."""
    reasons: dict[str, dict[str, list[str]]] = {}
    for one in dependences:
        firsts = reasons.setdefault(one.why, {})
        if not (one.first in one.why and one.second in one.why):
            firsts.setdefault(one.first, []).append(one.second)
    return tuple(
        Shared(
            f"{why[:1].upper()}{why[1:]}" if firsts else why,
            Markup("; ").join(
                Markup("{} with {}").format(
                    _code(first), listed([_code(second) for second in seconds], len(seconds))
                )
                for first, seconds in firsts.items()
            ),
        )
        for why, firsts in sorted(reasons.items(), key=lambda pair: bool(pair[1]))
    )
