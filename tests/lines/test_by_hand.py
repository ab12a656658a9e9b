"""What each method is good for, and where it is known to fail: small cases worked by hand.

Lines are 64 px apart, the first at y = 100, so that the halfway heights are 132, 196, …; words are
at x = 100, 200, 300 and 400. The failures are those that Carr et al. (2022,
doi:10.3758/s13428-021-01554-0) describe and that follow from how the methods work.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from etl.lines import (
    ChainSettings,
    MergeSettings,
    MethodSettings,
    RegressSettings,
    SliceSettings,
    StretchSettings,
)
from tests.lines.building import DEFAULTS, WORDS_X, found, text

Fixations = list[tuple[float, float]]


def row(*heights: float, words_x: tuple[int, ...] = WORDS_X) -> Fixations:
    """Fixations on the words of a line, at heights."""
    return list(zip(words_x, heights, strict=False))


#: Two lines, each read once, all of it too low by 40 px.
SUNK = [*row(138, 141, 140, 142), *row(203, 205, 204, 206)]
EACH_ONCE = [0, 0, 0, 0, 1, 1, 1, 1]

RIGHT: dict[str, tuple[str, int, Fixations, list[int]]] = {
    "attach, noise of less than half a line": (
        "attach",
        2,
        [*row(75, 131, 99, 120), *row(140, 190, 164, 133)],
        EACH_ONCE,
    ),
    "chain, one fixation of a run nearer to the next line": (
        "chain",
        2,
        # Means 118 and 164; the step from 133 to 160 goes 300 px back and so ends the run.
        [*row(110, 125, 133, 104), *row(160, 166, 164, 166)],
        EACH_ONCE,
    ),
    "cluster, all too low": ("cluster", 2, SUNK, EACH_ONCE),
    "cluster, too low, and a line returned to": (
        "cluster",
        2,
        [*SUNK, (200, 139), (300, 207)],
        [*EACH_ONCE, 0, 1],
    ),
    "merge, too low, and a line left and taken up again": (
        "merge",
        2,
        # Sequences 138 … 142, 203 … 205, 140 (a word of the first line), 206 207.
        [*row(138, 141, 140, 142), *row(203, 204, 205), (250, 140), (350, 206), (400, 207)],
        [0, 0, 0, 0, 1, 1, 1, 0, 1, 1],
    ),
    "regress, lines that fall": (
        "regress",
        2,
        # 0.12 px per px without an offset is more than the slope may be; 0.1 leaves 2 to 6 px.
        [*row(100, 112, 124, 136), *row(164, 176, 188, 200)],
        EACH_ONCE,
    ),
    "segment, any height at all": (
        "segment",
        3,
        [*row(100, 190, 20), *row(90, 95, 400), *row(0, 100)],
        [0, 0, 0, 1, 1, 1, 2, 2],
    ),
    "slice, all too low": ("slice", 2, SUNK, EACH_ONCE),
    "slice, a falling line": (
        "slice",
        2,
        # By x, the second line is 62 to 66 px below the first, though it begins 24 below its end.
        [*row(100, 113, 126, 140), *row(164, 176, 190, 206)],
        EACH_ONCE,
    ),
    "slice, a line that was not read": (
        "slice",
        3,
        # From the longest run, 64 px up is the second line presumed, and the first 64 above it.
        [*row(229, 228, 227, 228), *row(99, 101, words_x=(100, 200))],
        [2, 2, 2, 2, 0, 0],
    ),
    "split, steps up and down that would end a run": (
        "split",
        2,
        # Means 110 and 164. Steps across: 100 (six times) and -300 (once).
        [*row(80, 130, 90, 140), *row(140, 190, 150, 176)],
        EACH_ONCE,
    ),
    "split, lines that are read again": (
        "split",
        2,
        [*row(100, 101, 99, 102), *row(164, 160), *row(98, 102), (290, 99)],
        [0, 0, 0, 0, 1, 1, 0, 0, 0],
    ),
    "stretch, lines a tenth too far apart": (
        "stretch",
        7,
        # Times 10/11 these are the lines exactly; the last but one would be taken to the last.
        [(200.0, 100 + 70.4 * line) for line in range(6)],
        [0, 1, 2, 3, 4, 5],
    ),
    "warp, all too low": ("warp", 2, SUNK, EACH_ONCE),
    "warp, words passed over and fixated twice": (
        "warp",
        2,
        [(100, 140), (110, 138), (400, 141), (200, 205), (210, 204), (300, 206)],
        [0, 0, 0, 1, 1, 1],
    ),
}


@pytest.mark.parametrize(("method", "lines", "fixations", "read"), RIGHT.values(), ids=RIGHT.keys())
def test_method_finds_the_lines_read(
    method: str, lines: int, fixations: Fixations, read: list[int]
) -> None:
    """Each method is right about what it was made for."""
    assert found(method, text(lines), fixations) == read


WRONG: dict[str, tuple[str, int, Fixations, list[int]]] = {
    "attach, all too low": ("attach", 3, SUNK, [1] * 4 + [2] * 4),
    "chain, all too low": ("chain", 3, SUNK, [1] * 4 + [2] * 4),
    "split, all too low": ("split", 3, SUNK, [1] * 4 + [2] * 4),
    "cluster, a line that was not read": (
        "cluster",
        3,
        # The third line was not read, but there are three clusters: 160 and 171 are the two parts
        # that cost most together (11² / 2, against 4² / 2 for 98 and 102).
        [(100, 98), (200, 102), (100, 160), (200, 171)],
        [0, 0, 1, 2],
    ),
    "merge, a line read twice in place of the next": (
        "merge",
        2,
        # Two sequences, two lines: nothing is merged.
        [*row(100, 101, 102), *row(103, 104, 103)],
        [0, 0, 0, 1, 1, 1],
    ),
    "segment, a return to the line before": (
        "segment",
        3,
        # Read: 0, 1, 0, 1 and 2. The two longest steps back are the first of -300.
        [(100, 100), (400, 100), (100, 164), (300, 164), (200, 100), (400, 164), (100, 228)],
        [0, 0, 1, 1, 1, 1, 2],
    ),
    "slice, a run 34 px below its line": (
        "slice",
        2,
        # Between within_px and next_px: taken for the next line.
        [*row(100, 100, 100, 100), *row(134, 134)],
        [0, 0, 0, 0, 1, 1],
    ),
    "warp, a return to the line before": (
        "warp",
        3,
        # The first line is gone back to before the third; the order of words knows no way back, and
        # pairs of such fixations with the first words of the third line cost less (128 px) than
        # those with the last word of the second (307 and 210 px).
        [*row(100, 100, 100, 100), *row(164, 164, 164, 164), *row(100, 100), *row(228, 228)],
        [*EACH_ONCE, 2, 2, 2, 2],
    ),
}


@pytest.mark.parametrize(("method", "lines", "fixations", "taken"), WRONG.values(), ids=WRONG)
def test_method_fails_as_it_must(
    method: str, lines: int, fixations: Fixations, taken: list[int]
) -> None:
    """Where a method's presumption does not hold, it gives the lines that follow from it."""
    assert found(method, text(lines), fixations) == taken


def test_regress_cannot_follow_lines_too_far_apart() -> None:
    """One offset for all lines leaves a drift that grows with each line.

    Line i of lines 80 px apart is at 100 + 80 i; below line i of the text the border is at
    132 + 64 i. So the seventh (i = 6) must be lifted by more than 64 px; where lines begin, where a
    slope lifts nothing, the bound is 50 px.
    """
    fixations = [(x, 100 + 80.0 * line) for line in range(8) for x in WORDS_X]
    read = [line for line in range(8) for _ in WORDS_X]
    assert found("regress", text(8), fixations) != read
    assert found("cluster", text(8), fixations) == read


def test_stretch_cannot_follow_lines_that_fall_by_more_than_their_distance() -> None:
    """Heights on the middle line, which falls by 81 px, span 73 px at the least scale: over 64."""
    fixations = [(x, 100 + 64.0 * line + 0.27 * (x - 100)) for line in range(3) for x in WORDS_X]
    read = [line for line in range(3) for _ in WORDS_X]
    assert found("stretch", text(3), fixations) != read
    assert found("segment", text(3), fixations) == read


SET = {
    "chain": (
        replace(DEFAULTS, chain=ChainSettings(y_px=7)),
        [*row(110, 125, 133, 104)],
        [0, 0, 1, 0],
    ),
    "chain, across": (
        replace(DEFAULTS, chain=ChainSettings(x_px=99)),
        [*row(110, 125, 133, 104)],
        [0, 0, 1, 0],
    ),
    "merge": (
        # With steps of 1 px every fixation is a sequence; the limits leave none to the phases but
        # the last, which joins the first two of those that two points lie on exactly.
        replace(DEFAULTS, merge=MergeSettings(y_px=1, slope=0.0)),
        [(100, 100), (200, 110), (300, 130)],
        [0, 0, 1],
    ),
    "regress": (
        replace(DEFAULTS, regress=RegressSettings(slope=(0, 0), offset_px=(0, 0))),
        SUNK,
        [1] * 8,
    ),
    "slice": (
        replace(DEFAULTS, slice=SliceSettings(within_px=35)),
        [*row(100, 100, 100, 100), *row(134, 134)],
        [0, 0, 0, 0, 0, 0],
    ),
    "stretch": (
        replace(DEFAULTS, stretch=StretchSettings(scale=(1, 1), offset_px=(0, 0))),
        SUNK,
        [1] * 8,
    ),
}


@pytest.mark.parametrize(
    ("name", "settings", "fixations", "taken"), [(k, *v) for k, v in SET.items()], ids=SET.keys()
)
def test_settings_are_heeded(
    name: str, settings: MethodSettings, fixations: Fixations, taken: list[int]
) -> None:
    """A setting changes what its method finds; each case gives other lines with the defaults."""
    method = name.split(",", maxsplit=1)[0]
    assert found(method, text(2), fixations, settings) == taken
    assert found(method, text(2), fixations) != taken
