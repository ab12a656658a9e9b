"""Studies in which something is missing, or is called as no program would call it."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from tests.end_to_end.building import write
from tests.handoff.bundles import STUDY

#: What :func:`tests.handoff.bundles.small_study` makes each from.
ODD_STUDIES: dict[str, dict[str, Any]] = {
    "no factors": {"factors": {}},
    "no items": {"factors": {"cue": ["early", "late"]}, "items": False},
    "names that need quoting": {
        "factors": {"cue type": ["early", "late"], "if": ["=SUM(A1)", "'=x", "-"]},
        "title": 'A "title" of \\ signs',
    },
    "letters of other languages": {
        "factors": {"Füllung": ["früh", "spät"], "Ort": ["早い", "so, so"]},
        "formats": '["parquet"]',
        "title": "Größe",
    },
    "regions that a spreadsheet would run": {
        "factors": {"cue": ["early", "late"]},
        "region_names": ["=SUM(A1)", "-b", "@c"],
    },
    "regions together": {"factors": {"cue": ["early", "late"]}, "regions": 25},
    "stated contrasts": {
        "factors": {"cue": ["early", "mid", "late"], "fit": ["odd", "good"]},
        "output": 'contrasts = { cue = "sum", fit = { half = [-0.5, 0.5] } }',
    },
}


def even_study(folder: Path) -> Path:
    """Write a study in which readers do not differ at all; gives its study file.

    Ten readers, twelve texts, the cue early and late by turns of two texts. Everybody skips region
    b in every other text, region c never where the cue is early and in every other text where it
    is late, region d in as many texts as everybody else, of which some are skipped by most and
    some by few.
    """
    lines = ["who,n,text,cue,fix,dur,area"]
    for r in range(10):
        for i in range(12):
            late, turn = i // 2 % 2, (r + i) % 2
            often = (r + i // 2) % 10 < (1, 8, 2, 9, 1, 8)[i // 2]
            skipped = {"b": turn, "c": late and turn, "d": often != i % 2}
            areas = [area for area in "abcde" if not skipped.get(area)]
            fact = f"r{r},{i + 1},i{i},{('early', 'late')[late]}"
            lines += [f"{fact},{n},200,{area}" for n, area in enumerate(areas, start=1)]
    study = STUDY.format(
        title='"An even study"',
        item='item = "text"',
        factors='["cue"]',
        levels='cue = ["early", "late"]',
        formats='["parquet"]',
        output="",
    )
    labels = "".join(f"{area},{area},{place}\n" for place, area in enumerate("abcde", start=1))
    return write(
        folder,
        {
            "study.toml": study,
            "log.csv": "\n".join(lines) + "\n",
            "regions.csv": f"label,region,order\n{labels}",
        },
    )
