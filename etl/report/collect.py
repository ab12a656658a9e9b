"""The facts of the audit page: what it shows, ready for its templates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup, escape

from etl.report.comparing import FENCE, FEWEST_TO_COMPARE
from etl.report.inputs import AuditInput, GalleryEntry
from etl.report.line_part import LinesPart, collect_lines, lines_headline
from etl.report.logs import LogsPart, collect_logs, doubtful
from etl.report.losses import Losses, collect_losses, differing
from etl.report.rates import Rates, collect_rates
from etl.report.readers import Comparison, collect_readers
from etl.report.readiness_part import ReadinessPart, collect_readiness, readiness_headline
from etl.report.study_view import Section, sections
from etl.report.wording import NOTHING, count, counted, listed, name

#: What a study without a title is called.
UNTITLED = "A study without a title"
#: This many readers who stand out are named at the top; the rest are counted there.
MOST_NAMED = 6
#: This many warnings, and notes, are on the page.
MOST_FINDINGS = 1000
#: This many trials that were not recorded are named.
MOST_ABSENT = 12


@dataclass(frozen=True, slots=True)
class Headline:
    """One of the things to look at first.

    Attributes
    ----------
    kind : {"loss", "lines", "readiness", "reader", "log", "absent", "fine"}
        Decides its sign.
    label : str
        What kind of thing it is, in a word or two.
    text : Markup
        The thing.
    href : str
        Where there is more about it.
    """

    kind: str
    label: str
    text: Markup
    href: str


@dataclass(frozen=True, slots=True)
class AccountTable:
    """The accounts of one unit.

    Attributes
    ----------
    unit : str
        ``trials`` or ``fixations``.
    rules : tuple of str
        Columns between read and kept.
    rows : tuple of (str, tuple of str)
        A reader each, with read, the rules, kept; of very many, those in the table of readers.
    total : tuple of str
        The same over all readers.
    """

    unit: str
    rules: tuple[str, ...]
    rows: tuple[tuple[str, tuple[str, ...]], ...]
    total: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class AuditFacts:
    """Everything on the page.

    Attributes
    ----------
    title : str
        Of the study.
    lead : str
        What was built.
    headlines : tuple of Headline
        What to look at first.
    losses : Losses
        Where trials and fixations went.
    readers : Comparison
        The readers beside one another, and what they are compared by.
    fence : str
        How many deviations off a reader stands out.
    fewest : int
        With fewer readers nobody is judged.
    rates : Rates
        Outcomes.
    accounts : tuple of AccountTable
        Trials and fixations.
    warnings, notes : tuple of str
        What the build noticed.
    gallery : tuple of GalleryEntry
        Trials worth looking at.
    logs : LogsPart or None
        The logs; None where nothing is known of them.
    lines : LinesPart or None
        The lines of texts; None where nothing is known of them.
    readiness : ReadinessPart or None
        How ready the binary outcomes are for a model; None where nothing is told of them.
    study : tuple of Section
        As understood.
    says : dict of str to str
        What each part of the page finds, in a sentence.
    """

    title: str
    lead: str
    headlines: tuple[Headline, ...]
    losses: Losses
    readers: Comparison
    fence: str
    fewest: int
    rates: Rates
    accounts: tuple[AccountTable, ...]
    warnings: tuple[str, ...]
    notes: tuple[str, ...]
    gallery: tuple[GalleryEntry, ...]
    logs: LogsPart | None
    lines: LinesPart | None
    readiness: ReadinessPart | None
    study: tuple[Section, ...]
    says: dict[str, str]


def collect(given: AuditInput) -> AuditFacts:
    """Gather what the page shows.

    Parameters
    ----------
    given : AuditInput
        What it is made from.

    Returns
    -------
    AuditFacts
        Numbers in words, drawings and tables.
    """
    losses = collect_losses(given)
    readers = collect_readers(given, {rule.name: rule.level for rule in losses.rules})
    told = [(text.startswith("warning:"), text) for text in _joined(given.warnings)]
    told = [*_first(told, grave=True), *_first(told, grave=False)]
    return AuditFacts(
        str(given.study.get("title") or UNTITLED),
        _lead(given, losses),
        tuple(_headlines(given, losses, readers)),
        losses,
        readers,
        f"{FENCE:g}",
        FEWEST_TO_COMPARE,
        collect_rates(given),
        tuple(_accounts(given, unit, readers) for unit in ("trials", "fixations")),
        tuple(text.removeprefix("warning: ") for grave, text in told if grave),
        tuple(text.removeprefix("note: ") for grave, text in told if not grave),
        tuple(given.gallery),
        collect_logs(given.logs) if given.logs.logs else None,
        collect_lines(given),
        collect_readiness(given.readiness),
        sections(given.study),
        _says(losses, readers, len(given.profiles.readers)),
    )


def _joined(lines: Sequence[str]) -> list[str]:
    """Findings, each with the lines that go on about it."""
    out: list[str] = []
    for line in lines:
        if line.startswith(" ") and out:
            out[-1] += "\n" + line.strip()
        else:
            out.append(line.replace("\n    ", "\n"))
    return out


def _first(told: Sequence[tuple[bool, str]], *, grave: bool) -> list[tuple[bool, str]]:
    """The first warnings, or notes; of very many the rest is counted."""
    own = [one for one in told if one[0] == grave]
    more = len(own) - MOST_FINDINGS
    if more > 0:
        text = f"and {count(more)} more, which run.json lists"
        return [*own[:MOST_FINDINGS], (grave, text)]
    return own


def _lead(given: AuditInput, losses: Losses) -> str:
    """What was built, in a sentence or two."""
    trials, fixations = losses.trials, losses.fixations
    text = (
        f"{counted(len(given.profiles.readers), 'reader')} read {counted(trials.read, 'trial')} "
        f"with {counted(fixations.read, 'fixation')}. The tables rest on "
        f"{counted(trials.kept, 'trial')} and {counted(fixations.kept, 'fixation')}."
    )
    if trials.outside:
        are = "trial is" if trials.outside == 1 else "trials are"
        text += f" {count(trials.outside)} {are} no part of the study."
    return text


def _headlines(given: AuditInput, losses: Losses, readers: Comparison) -> list[Headline]:
    """What to look at first, the gravest first."""
    out = [
        Headline(
            "loss",
            "Loss differs",
            Markup(
                "{} This can bias the result: the trials kept no longer stand for all that were "
                "read."
            ).format(differing(loss)),
            "#losses",
        )
        for loss in losses.factors
        if loss.differs
    ]
    lines = lines_headline(given)
    if lines is not None and lines[0] != "fine":
        out.append(Headline(lines[0], "Lines not sure", lines[1], "#lines"))
    unready = readiness_headline(given.readiness)
    if unready is not None:
        out.append(Headline("readiness", "Hard to model", unready, "#readiness"))
    if readers.left_out:
        out.append(Headline("reader", "Left out", listed(readers.left_out, 12) + ".", "#readers"))
    out += [
        Headline("reader", "Stands out", text + ".", "#readers")
        for text in readers.standing_out[:MOST_NAMED]
    ]
    more = len(readers.standing_out) - MOST_NAMED
    if more > 0:
        text = f"{counted(more, 'more reader')}: choose “who stand out” in the table of readers."
        out.append(Headline("reader", "Stand out", escape(text), "#every-reader"))
    out += [Headline("log", "Logs differ", text, "#logs") for text in doubtful(given.logs)]
    if given.not_recorded:
        out.append(_not_recorded(given))
    if not out:
        text = "No reader stands out, and no loss of trials differs between conditions."
        out.append(Headline("fine", "Nothing", escape(text), "#losses"))
    if lines is not None and lines[0] == "fine":
        out.append(Headline(lines[0], "Lines", lines[1], "#lines"))
    return out


def _not_recorded(given: AuditInput) -> Headline:
    """The trials that no log has."""
    missing: list[str | Markup] = [
        Markup("{} trial {}{}").format(
            name(one.participant),
            name(one.trial),
            Markup(" of session {}").format(name(one.session)) if one.session else "",
        )
        for one in given.not_recorded[:MOST_ABSENT]
    ]
    missing += [""] * (len(given.not_recorded) - len(missing))  # counted, not named
    many = len(missing) != 1
    text = Markup("{} of the trial list {} in no log: {}.").format(
        counted(len(missing), "trial"), "are" if many else "is", listed(missing, MOST_ABSENT)
    )
    return Headline("absent", "Not recorded", text, "#losses")


def _accounts(given: AuditInput, unit: str, readers: Comparison) -> AccountTable:
    """The accounts of one unit; a rule that leaves out nothing of the unit keeps its column."""
    own = [row for row in given.accounts if row.unit == unit]
    rules = tuple(dict.fromkeys(rule for row in own for rule in row.left_out))
    figures = [(r.read, *(r.left_out.get(n, 0) for n in rules), r.kept) for r in own]
    total = tuple(map(sum, zip(*figures, strict=True))) or (0,) * (len(rules) + 2)
    named = {row.name for row in readers.rows} if readers.unlisted else None
    return AccountTable(
        unit,
        rules,
        tuple(
            (row.participant, _shown(line))
            for row, line in zip(own, figures, strict=True)
            if named is None or row.participant in named
        ),
        _shown(total),
    )


def _shown(figures: Sequence[int]) -> tuple[str, ...]:
    """Figures, with a dash where a rule left out nothing; read and kept are always figures."""
    last = len(figures) - 1
    return tuple(
        count(figure) if figure or place in (0, last) else NOTHING
        for place, figure in enumerate(figures)
    )


def _says(losses: Losses, readers: Comparison, n: int) -> dict[str, str]:
    """What each part of the page finds."""
    trials = losses.trials
    study = trials.kept + trials.lost
    lost = "No trial was lost to a rule"
    if trials.lost:
        lost = f"{count(trials.lost)} of {counted(study, 'trial')} lost, {trials.share}"
    many = len(readers.standing_out)
    stands = f"{many:,} of {counted(n, 'reader')} stand{'s' if many == 1 else ''} out"
    if not readers.judged:
        stands = f"{counted(n, 'reader')}: too few to say who stands out"
    elif not many:
        stands = f"None of {counted(n, 'reader')} stands out"
    return {"losses": lost, "readers": stands}
