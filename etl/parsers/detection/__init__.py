"""Fixations found in gaze samples, by published methods."""

from etl.parsers.detection.dispersion import fixation_windows
from etl.parsers.detection.sampled import SampleRows, log_of_samples
from etl.parsers.detection.track import Spans, Track
from etl.parsers.detection.velocity import saccade_samples

__all__ = [
    "SampleRows",
    "Spans",
    "Track",
    "fixation_windows",
    "log_of_samples",
    "saccade_samples",
]
