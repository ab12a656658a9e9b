"""The limits of a study's rules as plain numbers, and what is dangerous about them."""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING

import numpy as np

from etl.errors import Findings
from etl.measures import select
from etl.parsers.coordinates import degrees_to_px
from etl.screening import Limits

if TYPE_CHECKING:
    from etl.study import Study
    from etl.study.screening import Merge


def limits_of(study: Study) -> Limits:
    """Turn a study's ``[screening]`` into limits.

    Parameters
    ----------
    study : Study
        As loaded.

    Returns
    -------
    Limits
        With distances in pixels.
    """
    used = [
        *(["skip"] if study.trials.skip else []),
        *(["repeated"] if study.trials.repeated != "error" else []),
    ]
    screening = study.screening
    shown: dict[str, str] = {"repeated": study.trials.repeated}
    if screening is None:
        return Limits(used=tuple(used), shown=shown)
    rules = screening.rules()
    values: dict[str, object] = {"used": (*used, *rules)}
    fixations, trials = screening.fixations, screening.trials
    participants, apart = screening.participants, screening.values
    for part in (fixations, trials, participants, apart):
        if part is None:
            continue
        for key, value in part:
            name = "participant_notes" if part is participants and key == "notes" else key
            if name not in rules:
                continue
            shown[name] = _shown(value)
            if key in _PLAIN:
                values[key] = value
    if fixations is not None:
        if fixations.merge is not None:
            values["merge_under_ms"] = fixations.merge.under_ms
            values["merge_within_px"] = _distance_px(study, fixations.merge)
        if study.screen is not None:
            values["screen_px"] = (float(study.screen.width_px), float(study.screen.height_px))
            shown["off_screen"] = f"{study.screen.width_px} x {study.screen.height_px}"
    if trials is not None:
        values["blink_regions"] = tuple(trials.blink_in_first_pass_of or ())
        values["first_pass_regions"] = tuple(trials.no_first_pass_on or ())
    return Limits(**values, shown=shown)  # type: ignore[arg-type]


_PLAIN = (
    "first",
    "last",
    "under_ms",
    "over_ms",
    "fewest_fixations",
    "line_confidence_under",
    "outside_share_over",
    "duration_ms",
    "correct_share_under",
    "lost_trials_share_over",
    "fewest_trials_per_cell",
    "outlier_sd",
)


def _shown(value: object) -> str:
    """A limit as the ledger shows it."""
    if value is True:
        return "true"
    if isinstance(value, tuple | list):
        return ", ".join(_shown(one) for one in value)
    if isinstance(value, float):
        return f"{value:.10g}"
    if hasattr(value, "model_dump"):
        given = value.model_dump(exclude_none=True)
        return ", ".join(f"{key} {_shown(one)}" for key, one in given.items())
    return str(value)


def _distance_px(study: Study, merge: Merge) -> float:
    """How near a neighbour must be, in pixels."""
    if merge.within_px is not None:
        return float(merge.within_px)
    if merge.within_characters is not None and study.regions.layout is not None:
        return float(merge.within_characters * study.regions.layout.character_width_px)
    screen = study.screen
    if merge.within_deg is None or screen is None:
        return 0.0
    pixels = degrees_to_px(
        np.array([merge.within_deg]),
        size_px=screen.width_px,
        size_cm=screen.width_cm or 0.0,
        distance_cm=screen.distance_cm or 0.0,
    )
    return float(pixels[0])


def check_rules(study: Study, region_names: tuple[str, ...], findings: Findings) -> None:
    """See that rules name regions that there are, and warn where a choice is dangerous.

    Parameters
    ----------
    study : Study
        As loaded.
    region_names : tuple of str
        All regions of all texts.
    findings : Findings
        Where problems and warnings are recorded.
    """
    if study.screening is None or study.screening.trials is None:
        return
    trials = study.screening.trials
    for key in ("blink_in_first_pass_of", "no_first_pass_on"):
        for name in getattr(trials, key) or ():
            if name in region_names:
                continue
            near = get_close_matches(name, region_names, n=1)
            listed = ", ".join(region_names[:12]) + (" …" if len(region_names) > 12 else "")
            findings.error(
                "no text has a region of this name",
                path=study.shown,
                line=study.line_of("screening", "trials", key),
                where=f"screening.trials.{key}",
                found=name,
                expected=f"one of {listed}",
                fix=f'did you mean "{near[0]}"?' if near else "correct the name",
            )
    skipping = {"first_pass_skip"} & set(select(study.measures.outcomes))
    named = set(trials.no_first_pass_on or ()) & set(region_names)
    if named and skipping:
        findings.warning(
            "this rule leaves out the trials in which the region was skipped, which is what "
            "first_pass_skip measures there",
            path=study.shown,
            line=study.line_of("screening", "trials", "no_first_pass_on"),
            where="screening.trials.no_first_pass_on",
            found=", ".join(sorted(named)),
            fix="take first_pass_skip of these regions from a build without the rule, or leave "
            "it out of [measures] outcomes",
        )
