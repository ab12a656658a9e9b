"""Reading a region definition file in one line."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from etl.errors import Findings
from etl.regions import RegionLibrary, TrialWords, read_definitions
from etl.study.models import Lines, Regions

#: First character at x = 200, 10 px a character; first line from y = 500, 40 px a line.
LAYOUT = {"left_px": 200, "top_px": 500, "character_width_px": 10, "line_height_px": 40}


@dataclass
class Read:
    """What came of reading a definition file."""

    library: RegionLibrary | None
    findings: Findings

    @property
    def text(self) -> str:
        """All that was found, as the user sees it."""
        return self.findings.text()

    def orders(self, points: list[tuple[float, float]], text: int = 0) -> list[int]:
        """The order of each point's region, 0 outside."""
        return self.assigned(points, text).order.tolist()

    def line_numbers(self, points: list[tuple[float, float]], text: int = 0) -> list[int]:
        """The number of each point's line, 0 on none."""
        return self.assigned(points, text).line.tolist()

    def assigned(self, points: list[tuple[float, float]], text: int = 0) -> Any:
        """What the library says about points on one of its texts."""
        assert self.library is not None, self.findings.text()
        x, y = np.array(points, dtype=np.float64).reshape(-1, 2).T
        return self.library.assign_points(np.full(len(x), text, dtype=np.int32), x, y)


def read_file(path: Path, kind: str, **options: Any) -> Read:
    """Read a definition file under the options of a study file."""
    findings = Findings()
    lines = Lines(method="nearest") if options.pop("lines", False) else None
    known = options.pop("known", ("item",))
    wanted = options.pop("wanted", ())
    if kind in {"marked_text", "words"}:
        options["layout"] = {**LAYOUT, **options.get("layout", {})}
    regions = Regions(file=path.name, kind=kind, **options)
    library = read_definitions(
        regions,
        lines,
        path=path,
        shown=path.name,
        words=TrialWords(known, wanted, frozenset({"", "NA"})),
        findings=findings,
    )
    return Read(library, findings)
