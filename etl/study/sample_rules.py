"""Rules about ``[logs.samples]``: what is needed to find fixations in gaze samples."""

from __future__ import annotations

from collections.abc import Iterator

from etl.study.models import StudyFile
from etl.study.rule import Problem, rule

#: The keys that one method alone reads.
_KEYS_OF = {
    "engbert_kliegl": ("threshold_factor", "shortest_saccade_ms"),
    "dispersion": ("dispersion_px", "dispersion_deg"),
}


@rule("logs.samples", "logs.columns.onset", "logs.columns.x", "logs.columns.y")
def samples_have_time_and_place(study: StudyFile) -> Iterator[Problem]:
    """Fixations are found in samples that have a time and a position."""
    if study.logs.samples is None:
        return
    for key in ("onset", "x", "y"):
        if getattr(study.logs.columns, key) is None:
            yield Problem(
                ("logs", "columns"),
                "fixations are found in samples that have a time and a position",
                expected=key,
                fix=f'add {key} = "…" with the header of the column',
            )


@rule("logs.samples", *(f"logs.columns.{n}" for n in ("duration", "end", "fixation", "label")))
def samples_are_no_fixations(study: StudyFile) -> Iterator[Problem]:
    """What only a fixation has is not named for samples; the open standard's columns are known."""
    logs = study.logs
    if logs.samples is None or logs.kind == "bids":
        return
    for key in ("duration", "end", "fixation", "label"):
        column = getattr(logs.columns, key)
        if column is not None:
            yield Problem(
                ("logs", "columns", key),
                "a sample has none: fixations are found in the samples",
                found=column.column,
                fix="remove the key, or remove [logs.samples] if the rows are fixations",
            )


@rule("logs.kind", "logs.samples")
def events_have_no_samples(study: StudyFile) -> Iterator[Problem]:
    """A log of events tells of fixations that were found already."""
    if study.logs.samples is not None and study.logs.kind == "events":
        yield Problem(
            ("logs", "samples"),
            'a log of kind = "events" tells of fixations, not of samples',
            expected='kind = "table" or "bids"',
            fix="remove [logs.samples], or correct the kind",
        )


@rule("logs.samples")
def method_reads_its_own_keys(study: StudyFile) -> Iterator[Problem]:
    """No key is given that the method does not read."""
    samples = study.logs.samples
    if samples is None:
        return
    for method, keys in _KEYS_OF.items():
        for key in keys:
            if method != samples.method and key in samples.model_fields_set:
                yield Problem(
                    ("logs", "samples", key),
                    f'this means nothing with method = "{samples.method}"',
                    expected=f'method = "{method}"',
                    fix="correct the method, or remove the key",
                )


@rule("logs.samples", "screen")
def dispersion_has_its_limits(study: StudyFile) -> Iterator[Problem]:
    """The method of dispersion has an extent and a duration, and what an extent needs."""
    samples, screen = study.logs.samples, study.screen
    if samples is None or samples.method != "dispersion":
        return
    if (samples.dispersion_px is None) == (samples.dispersion_deg is None):
        yield Problem(
            ("logs", "samples"),
            "one extent is needed of what still is a fixation",
            expected="dispersion_px or dispersion_deg",
            fix="give one of the two",
        )
    if samples.shortest_fixation_ms == 0:
        yield Problem(
            ("logs", "samples", "shortest_fixation_ms"),
            "without a shortest duration every single sample is a fixation",
            found="0",
            expected="a duration above 0",
            fix="give for example shortest_fixation_ms = 100, the paper's own",
        )
    if samples.dispersion_deg is not None and (
        screen is None or screen.width_cm is None or screen.distance_cm is None
    ):
        yield Problem(
            ("logs", "samples", "dispersion_deg"),
            "degrees need the size and the distance of the screen",
            expected="width_cm and distance_cm in [screen]",
            fix="add them, or give dispersion_px",
        )
