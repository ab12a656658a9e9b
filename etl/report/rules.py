"""What the rules of screening mean, in words, with the limits of the study at hand."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

#: What each rule leaves out, in words; ``{}`` is the limit of the study file.
_FIXATIONS = {
    "outside_text_time": "began before the text came up or after it went away",
    "off_screen": "off the screen",
    "first": "among the first {} of a trial",
    "last": "among the last {} of a trial",
    "blink": "touched by a blink",
    "undersweep": "where the eyes came down short of the beginning of a line and went on to it",
    "merge": "joined to a neighbour: {}",
    "under_ms": "shorter than {} ms",
    "over_ms": "longer than {} ms",
}
_TRIALS = {
    "notes": "named in the experimenter’s notes",
    "fewest_fixations": "fewer than {} fixations left",
    "line_confidence_under": "less than {} sure which lines were read",
    "outside_share_over": "more than {} of the fixations outside every region",
    "duration_ms": "not within {} ms from the first fixation to the last",
    "blink_in_first_pass_of": "a blink in the first pass on {}",
    "no_first_pass_on": "no first pass on {}",
    "answer_wrong": "the question was answered wrongly",
}
_PARTICIPANTS = {
    "participant_notes": "the reader is named in the experimenter’s notes",
    "correct_share_under": "the reader answered less than {} of the questions rightly",
    "lost_trials_share_over": "the reader lost more than {} of the trials",
    "fewest_trials_per_cell": "the reader has a condition with fewer than {} trials left",
}
_BEFORE = {
    "skip": "no part of the study, as [trials] skip says",
    "repeated": "a recording of a trial that was recorded more than once, and not the one used",
}
_LEVELS = (
    ("fixations", "fixation", _FIXATIONS),
    ("trials", "trial", _TRIALS),
    ("participants", "reader", _PARTICIPANTS),
)
_DISTANCES = {"within_px": "px", "within_deg": "degrees", "within_characters": "characters"}


def rule_meaning(rule: str, study: Mapping[str, Any]) -> str:
    """What a rule leaves out, with its limit.

    Parameters
    ----------
    rule : str
        Its name in ``left_out_by`` and in the accounts.
    study : mapping
        The study as understood.

    Returns
    -------
    str
        Without a full stop; empty for a rule that is not known here.

    Examples
    --------
    >>> rule_meaning("under_ms", {"screening": {"fixations": {"under_ms": 80}}})
    'shorter than 80 ms'
    """
    for table, _, meanings in _LEVELS:
        if rule in meanings:
            own = (study.get("screening") or {}).get(table) or {}
            return meanings[rule].format(_limit(rule, own.get(rule)))
    return _BEFORE.get(rule, "")


def rule_level(rule: str) -> str:
    """What a rule judges: ``fixation``, ``trial``, ``reader``, or a ``recording`` of a trial.

    Examples
    --------
    >>> rule_level("under_ms"), rule_level("skip")
    ('fixation', 'trial')
    """
    known = next((level for _, level, own in _LEVELS if rule in own), "trial")
    return "recording" if rule == "repeated" else known


def _limit(rule: str, limit: Any) -> str:
    """A limit in words."""
    if isinstance(limit, Mapping):
        near = [f"within {limit[k]:g} {unit}" for k, unit in _DISTANCES.items() if limit.get(k)]
        return " and ".join([f"shorter than {limit.get('under_ms', 0):g} ms", *near])
    if isinstance(limit, list | tuple):
        numbers = all(isinstance(one, int | float) for one in limit)
        return " to ".join(f"{v:,g}" for v in limit) if numbers else ", ".join(map(str, limit))
    if isinstance(limit, bool | str) or limit is None:
        return ""
    in_percent = "share" in rule or "confidence" in rule
    return f"{100 * limit:g}%" if in_percent else f"{limit:g}"
