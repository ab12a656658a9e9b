"""Which line of a text a fixation belongs to: the published methods, and their consensus.

The methods know positions and the places of lines and words, nothing of files, regions or screens.
"""

from etl.lines.clusters import cluster, exact_clusters
from etl.lines.consensus import REASONS, SURE, LineAssignment, assign_by_consensus
from etl.lines.fits import Regression, Stretching, fit_regression, fit_stretching, regress, stretch
from etl.lines.merging import merge
from etl.lines.methods import METHODS
from etl.lines.nearest import attach, nearest_line
from etl.lines.passage import Lines, Method, Passage, Positions
from etl.lines.runs import chain
from etl.lines.settings import (
    ChainSettings,
    MergeSettings,
    MethodSettings,
    RegressSettings,
    SliceSettings,
    StretchSettings,
)
from etl.lines.slices import slice_runs
from etl.lines.sweeps import segment, split
from etl.lines.warping import warp

__all__ = [
    "METHODS",
    "REASONS",
    "SURE",
    "ChainSettings",
    "LineAssignment",
    "Lines",
    "MergeSettings",
    "Method",
    "MethodSettings",
    "Passage",
    "Positions",
    "RegressSettings",
    "Regression",
    "SliceSettings",
    "StretchSettings",
    "Stretching",
    "assign_by_consensus",
    "attach",
    "chain",
    "cluster",
    "exact_clusters",
    "fit_regression",
    "fit_stretching",
    "merge",
    "nearest_line",
    "regress",
    "segment",
    "slice_runs",
    "split",
    "stretch",
    "warp",
]
