"""One trial explained: each outcome, and the fixations that decide it."""

from __future__ import annotations

import math
from collections.abc import Collection
from dataclasses import dataclass, replace

from etl.errors import FaultError
from etl.report.trace_input import Cell, TracedFixation, TracedTrial
from etl.report.trace_lines import tell_lines
from etl.report.trace_phrases import Said, fixations, ms, numbers, quoted, sentence
from etl.report.trace_region_words import tell_region
from etl.report.trace_story import Story
from etl.report.trace_trial_words import tell_trial

#: Sums are added up here and in the kernels in different ways; they may differ by rounding only,
#: which for durations up to days, in doubles, stays far below a thousandth of a millisecond.
_ROUNDING_MS = 1e-3


@dataclass(frozen=True, slots=True)
class Statement:
    """One outcome explained.

    Attributes
    ----------
    measure : str
        Its name.
    value : float
        The value that follows from the fixations; NaN where there is none.
    reason : str
        Why there is none; empty where there is one.
    sentence : str
        The value and the fixations that decide it, in words.
    fixations : tuple of int
        The numbers of those fixations.
    """

    measure: str
    value: float
    reason: str
    sentence: str
    fixations: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class RegionExplained:
    """The outcomes of one region: its order, name and own text, and a statement an outcome."""

    order: int
    name: str
    text: str
    statements: tuple[Statement, ...]


@dataclass(frozen=True, slots=True)
class Explanation:
    """A trial in words.

    Attributes
    ----------
    heading : str
        Which trial.
    summary : str
        What it holds.
    left_out : tuple of str
        A sentence for all that was left out, or stands aside, and why.
    lines : tuple of str
        How the lines of a text of several were told, and how far that can be trusted; the first
        sentence is about the trial as a whole.
    trial : tuple of Statement
        The outcomes of the trial.
    regions : tuple of RegionExplained
        The regions in reading order.
    whole : bool
        Whether it is about all regions and outcomes.
    """

    heading: str
    summary: str
    left_out: tuple[str, ...]
    lines: tuple[str, ...]
    trial: tuple[Statement, ...]
    regions: tuple[RegionExplained, ...]
    whole: bool = True

    def only(self, regions: Collection[str], measures: Collection[str]) -> Explanation:
        """The part of it that is about some regions and outcomes; empty stands for all.

        Parameters
        ----------
        regions, measures : collection of str
            Names. Naming regions leaves out what is said of the trial as a whole.

        Returns
        -------
        Explanation
        """

        def chosen(statements: tuple[Statement, ...]) -> tuple[Statement, ...]:
            return tuple(s for s in statements if not measures or s.measure in measures)

        return replace(
            self,
            lines=self.lines[:1],
            whole=False,
            trial=() if regions else chosen(self.trial),
            regions=tuple(
                replace(region, statements=chosen(region.statements))
                for region in self.regions
                if not regions or region.name in regions
            ),
        )


def explain(traced: TracedTrial) -> Explanation:
    """Explain every outcome of a trial by the fixations that decide it.

    Parameters
    ----------
    traced : TracedTrial
        The trial. What its fixations say of visits and passes is not looked at: visits, passes and
        saccades are found anew.

    Returns
    -------
    Explanation
        A statement for every outcome that the trial has.

    Raises
    ------
    FaultError
        If what follows from the fixations is not what the trial's outcomes say: no words are
        better than words that do not fit the number.

    Examples
    --------
    Region 2 is passed over and then returned to:

    >>> nan = float("nan")
    >>> looks = [(1, 1, 200.0), (2, 3, 250.0), (3, 2, 190.0)]
    >>> traced = TracedTrial(
    ...     "P1", "", "7", "i01", {}, ("who", "verb", "what"), ("", "", ""),
    ...     tuple(TracedFixation(n, nan, d, nan, nan, 0, k, 1, True, "P1.tsv", n + 1)
    ...           for n, k, d in looks),
    ...     (), {"first_pass_skip": (Cell(0), Cell(1), Cell(0))}, {})
    >>> explain(traced).regions[1].statements[0].sentence
    '1, because fixation 2 went beyond `verb`, to `what`, before `verb` was ever fixated; \
fixation 3 came to it only afterwards'
    """
    story = Story(traced)
    problems: list[str] = []
    regions = tuple(
        RegionExplained(
            order,
            name,
            traced.region_texts[order - 1],
            tuple(
                _region_statement(story, measure, order, cells[order - 1], problems)
                for measure, cells in traced.outcomes.items()
            ),
        )
        for order, name in enumerate(traced.region_names, start=1)
    )
    trial = tuple(
        _statement(measure, tell_trial(story, measure), cell, problems)
        for measure, cell in traced.trial_outcomes.items()
    )
    if problems:
        raise FaultError(
            f"{traced.heading}: the explanation and the tables differ: {'; '.join(problems)}"
        )
    return Explanation(
        traced.heading, traced.summary, _left_out(traced), tell_lines(traced), trial, regions
    )


def _region_statement(
    story: Story, measure: str, order: int, cell: Cell, problems: list[str]
) -> Statement:
    """One outcome of a region; what a rule on values set missing is told with what it was."""
    said = tell_region(story, measure, order)
    removal = story.traced.values_set_missing.get((measure, order))
    if removal is not None:
        limit = f" = {removal.limit}" if removal.limit else ""
        was = sentence(measure, said)
        said = Said(
            None, cell.reason, f"set missing by {removal.rule}{limit}; it was {was}",
            said.fixations,
        )  # fmt: skip
    return _statement(measure, said, cell, problems, f" of {quoted(story.traced, order)}")


def _statement(
    measure: str, said: Said, cell: Cell, problems: list[str], whose: str = ""
) -> Statement:
    """What is said, checked against the outcome as it stands in the tables."""
    value = math.nan if said.value is None else float(said.value)
    same = math.isnan(value) and math.isnan(cell.value)
    same = same or math.isclose(value, cell.value, rel_tol=1e-9, abs_tol=_ROUNDING_MS)
    if not same or said.reason != cell.reason:
        problems.append(
            f"{measure}{whose} is {cell.reason or cell.value}, but by the fixations "
            f"{said.reason or value}"
        )
    return Statement(
        measure,
        value,
        said.reason,
        sentence(measure, said),
        tuple(fixation.number for fixation in said.fixations),
    )


def _left_out(traced: TracedTrial) -> tuple[str, ...]:
    """All that was left out and why, and what stands aside."""
    if traced.removal is not None:
        removal = traced.removal
        same = tuple(f for f in traced.fixations if f.left_out_by == removal.rule)
        others = tuple(f for f in traced.fixations if f.left_out_by not in {"", removal.rule})
        told = f"the whole trial: {_why(removal.rule, removal.limit, removal.observed)}"
        head = (f"{told}{_also(removal.also)}; {fixations(same)} with it" if same else told,)
        return (*head, *_sentences(traced, others))
    outside = tuple(f for f in traced.fixations if f.kept and not f.region_order)
    aside: list[str] = []
    if outside:
        one = len(outside) == 1
        what = (
            "passed over when visits and saccades are found"
            if traced.outside == "ignore"
            else f"{'it ends' if one else 'each ends'} the visit in progress"
        )
        aside.append(
            f"{fixations(outside)} {'lies' if one else 'lie'} outside every region: {what} "
            f'(outside = "{traced.outside}")'
        )
    removed = tuple(f for f in traced.fixations if not f.kept)
    return (*_sentences(traced, removed), *aside)


def _why(rule: str, limit: str, observed: str) -> str:
    """A rule with its limit and what was found."""
    text = f"left out by {rule}"
    if limit:
        text += f" = {limit}"
    return f"{text} (found {observed})" if observed else text


def _also(also: str) -> str:
    """Later rules that would have done the same."""
    return f"; also {', '.join(also.split())}" if also else ""


def _sentences(traced: TracedTrial, removed: tuple[TracedFixation, ...]) -> tuple[str, ...]:
    """One sentence a fixation left out, or one for many that have nothing of their own to say."""
    told: list[str] = []
    alike: dict[str, list[int]] = {}
    for fixation in removed:
        removal = fixation.removal
        if removal is None:
            continue
        if fixation.merged_into:
            what = f"merged into fixation {fixation.merged_into} by {removal.rule}"
            what += f" = {removal.limit}" if removal.limit else ""
        else:
            what = _why(removal.rule, removal.limit, removal.observed)
            if not removal.observed:
                alike.setdefault(what + _also(removal.also), []).append(fixation.number)
                continue
        where = quoted(traced, fixation.region_order)
        told.append(
            f"fixation {fixation.number} ({ms(fixation.duration_ms)} ms, on {where}): "
            f"{what}{_also(removal.also)}"
        )
    for what, listed in alike.items():
        told.append(f"fixation{'' if len(listed) == 1 else 's'} {numbers(listed)}: {what}")
    return tuple(told)
