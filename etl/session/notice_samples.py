"""How fixations were found in gaze samples: what the run record and the audit page say of it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable

from etl.errors import Findings
from etl.parsers.canonical import LogNote
from etl.session.told import counted
from etl.study import Study
from etl.study.models import Samples

#: Where each method is from.
SOURCES = {
    "engbert_kliegl": "the velocity-based method of Engbert & Kliegl (2003, "
    "doi:10.1016/S0042-6989(03)00084-1)",
    "dispersion": "the dispersion-based method (I-DT) of Salvucci & Goldberg (2000, "
    "doi:10.1145/355017.355028)",
}
#: The keys that each method reads, besides those that both read.
_OWN_KEYS = {
    "engbert_kliegl": ("threshold_factor", "shortest_saccade_ms"),
    "dispersion": ("dispersion_px", "dispersion_deg"),
}


def method_in_words(samples: Samples) -> str:
    """The method of detection with its source and its parameters.

    Parameters
    ----------
    samples : Samples
        The study's ``[logs.samples]``.

    Returns
    -------
    str

    Examples
    --------
    >>> print(method_in_words(Samples(method="dispersion", dispersion_px=40)))
    the dispersion-based method (I-DT) of Salvucci & Goldberg (2000, doi:10.1145/355017.355028), \
dispersion_px = 40, shortest_fixation_ms = 50, longest_gap_ms = 0
    """
    keys = (*_OWN_KEYS[samples.method], "shortest_fixation_ms", "longest_gap_ms")
    values = {key: getattr(samples, key) for key in keys}
    told = [f"{key} = {value:g}" for key, value in values.items() if value is not None]
    return ", ".join([SOURCES[samples.method], *told])


def notice_samples(study: Study, notes: Iterable[LogNote], findings: Findings) -> None:
    """Note by which method fixations were found, in samples of which rate.

    Parameters
    ----------
    study : Study
        As loaded.
    notes : iterable of LogNote
        What is told about each log that was read.
    findings : Findings
        Where the note is recorded; nothing is where the logs hold fixations.
    """
    if study.logs.samples is None:
        return
    rates = Counter(round(1000 / note.interval_ms, 3) for note in notes if note.interval_ms > 0)
    if not rates:
        return
    told = [f"{rate:g} a second ({counted(logs, 'log')})" for rate, logs in sorted(rates.items())]
    findings.note(
        f"fixations were found in gaze samples, {' and '.join(told)}, by "
        f"{method_in_words(study.logs.samples)}",
        path=study.shown,
        line=study.line_of("logs", "samples"),
    )
