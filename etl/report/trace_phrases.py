"""How numbers, fixations and regions are said in explanations."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

from etl.report.trace_input import TracedFixation, TracedTrial

#: The outcomes of regions and trials that are durations.
DURATIONS: Final = frozenset(
    {
        "first_fixation_duration",
        "single_fixation_duration",
        "first_pass_time",
        "go_past_time",
        "right_bounded_time",
        "second_pass_time",
        "total_time",
        "reading_time",
    }
)
#: The outcomes that count.
COUNTS: Final = frozenset(
    {
        "fixation_count",
        "first_pass_fixation_count",
        "visit_count",
        "regression_out_count",
        "regression_in_count",
        "outside_fixation_count",
        "regression_count",
        "progression_count",
        "regions_reached",
    }
)
#: From so many numbers in a row on, "4 to 9" is shorter than the list.
LONG_RUN: Final = 3


@dataclass(frozen=True, slots=True)
class Said:
    """What is said of one outcome: value (None: missing), why missing, the words, fixations."""

    value: float | None
    reason: str
    words: str
    fixations: tuple[TracedFixation, ...] = ()


def ms(duration_ms: float) -> str:
    """A duration with what digits it has, microseconds at most.

    Examples
    --------
    >>> ms(250.0), ms(180.5), ms(0.1 + 0.2)
    ('250', '180.5', '0.3')
    """
    text = f"{duration_ms:.3f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def joined(parts: Sequence[str]) -> str:
    """Parts as a list in words.

    Examples
    --------
    >>> joined(["4"]), joined(["4", "6"]), joined(["4", "6", "9"])
    ('4', '4 and 6', '4, 6 and 9')
    """
    if len(parts) < 2:
        return "".join(parts)
    return f"{', '.join(parts[:-1])} and {parts[-1]}"


def numbers(values: Iterable[int]) -> str:
    """Whole numbers as a list in words, long runs shortened.

    Examples
    --------
    >>> numbers([1, 2, 4, 5, 6, 7, 9])
    '1, 2, 4 to 7 and 9'
    """
    runs: list[list[int]] = []
    for value in values:
        if runs and runs[-1][-1] + 1 == value:
            runs[-1].append(value)
        else:
            runs.append([value])
    parts: list[str] = []
    for run in runs:
        parts += [f"{run[0]} to {run[-1]}"] if len(run) >= LONG_RUN else [str(v) for v in run]
    return joined(parts)


def fixations(chosen: Sequence[TracedFixation]) -> str:
    """Fixations by their numbers: ``fixation 4``, or ``fixations 4 and 6``."""
    listed = numbers(fixation.number for fixation in chosen)
    return f"fixation{'' if len(chosen) == 1 else 's'} {listed}"


def terms(chosen: Sequence[TracedFixation]) -> str:
    """A sum of durations written out: ``250 (fixation 4) + 190 (5)``."""
    return " + ".join(
        f"{ms(fixation.duration_ms)} ({'' if place else 'fixation '}{fixation.number})"
        for place, fixation in enumerate(chosen)
    )


def total_ms(chosen: Iterable[TracedFixation]) -> float:
    """The sum of durations, added up one by one in the order given."""
    total = 0.0
    for fixation in chosen:
        total += fixation.duration_ms
    return total


def quoted(traced: TracedTrial, order: int) -> str:
    """A region's name between grave accents; words for 0."""
    return f"`{traced.region(order)}`" if order else "no region"


def sentence(measure: str, said: Said) -> str:
    """What is said of an outcome as a sentence that begins with its value.

    Examples
    --------
    >>> sentence("go_past_time", Said(440.0, "", "= 250 (fixation 4) + 190 (5)"))
    '440 ms = 250 (fixation 4) + 190 (5)'
    >>> sentence("fixated", Said(None, "why", "words"))
    'missing (why): words'
    """
    if said.value is None:
        return f"missing ({said.reason}): {said.words}"
    value = f"{ms(said.value)} ms" if measure in DURATIONS else str(int(said.value))
    if said.words.startswith(("=", "by ")):
        return f"{value} {said.words}"
    return f"{value}{':' if measure in COUNTS else ','} {said.words}"
