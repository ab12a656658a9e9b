"""The methods of line assignment by their published names."""

from __future__ import annotations

from typing import Final

from etl.lines.clusters import cluster
from etl.lines.fits import regress, stretch
from etl.lines.merging import merge
from etl.lines.nearest import attach
from etl.lines.passage import Method
from etl.lines.runs import chain
from etl.lines.slices import slice_runs
from etl.lines.sweeps import segment, split
from etl.lines.warping import warp

#: All methods, each a pure function of fixations in time order, the text and the settings. The
#: papers' ``compare`` is left out: they call it a dead end themselves.
METHODS: Final[dict[str, Method]] = {
    "attach": attach,
    "chain": chain,
    "cluster": cluster,
    "merge": merge,
    "regress": regress,
    "segment": segment,
    "slice": slice_runs,
    "split": split,
    "stretch": stretch,
    "warp": warp,
}
