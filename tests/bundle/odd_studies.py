"""Studies in which something is missing, or is called as no program would call it."""

from __future__ import annotations

from typing import Any

#: What :func:`tests.handoff.bundles.small_study` makes each from.
ODD_STUDIES: dict[str, dict[str, Any]] = {
    "no factors": {"factors": {}},
    "no items": {"factors": {"cue": ["early", "late"]}, "items": False},
    "names that need quoting": {
        "factors": {"cue type": ["early", "late"], "if": ["=SUM(A1)", "'=x", "-"]},
        "title": 'A "title" of \\ signs',
    },
    "letters of other languages": {
        "factors": {"Füllung": ["früh", "spät"], "zeros": ["早い", "so, so"]},
        "formats": '["parquet"]',
        "title": "Größe",
    },
    "regions together": {"factors": {"cue": ["early", "late"]}, "regions": 25},
    "stated contrasts": {
        "factors": {"cue": ["early", "mid", "late"], "fit": ["odd", "good"]},
        "output": 'contrasts = { cue = "sum", fit = { half = [-0.5, 0.5] } }',
    },
}
