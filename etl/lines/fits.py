"""Lines sloped and moved, or positions stretched and moved, until they fit each other best."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from etl.lines.nearest import nearest_line
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.settings import Bounds, MethodSettings

#: Steps of slope or scale and of offset that are tried at first, ends included. With the published
#: bounds 0.01 (or a few px at the end of a line) and about 4 px, far less than half the distance
#: between lines, within which a misfit has one least value. Odd, so that the middle is among them.
_COARSE: Final = (21, 25)
#: Then steps about the best so far, each time half as long: from 4 px to a hundredth.
_FINER: Final = 10
#: How many thirds of a step to either side are tried then.
_THIRDS: Final = 4
#: From how far above and below the text distances are still distances.
_FAR_PX: Final = 1e6

#: The misfit of each of several pairs of values.
Misfit = Callable[[Positions, Positions], Positions]


@dataclass(frozen=True, slots=True)
class Regression:
    """Lines as fixations lie about them.

    Attributes
    ----------
    slope : float
        In px down per px across.
    offset_px : float
        How far the lines lie below those of the text where lines begin.
    sd_px : float
        Standard deviation of fixations about them.
    """

    slope: float
    offset_px: float
    sd_px: float


@dataclass(frozen=True, slots=True)
class Stretching:
    """What takes fixations to lines.

    Attributes
    ----------
    scale : float
        Factor by which distances from the first line are multiplied.
    offset_px : float
        How far fixations are moved down after that.
    """

    scale: float
    offset_px: float


def fit_regression(
    x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings
) -> Regression:
    """Fit lines of one slope and one offset to fixations.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations, at least one.
    passage : Passage
        The text.
    settings : MethodSettings
        ``regress``: the bounds.

    Returns
    -------
    Regression
        The most likely one, each fixation being normally distributed about the line that is nearest
        to it. Two fixations or fewer show no slope: it has none, and no offset.

    Notes
    -----
    With any standard deviation the likelihood is greatest where the sum of squared distances is
    least. So slope and offset are found first, and the standard deviation follows from them: it is
    the root mean square distance, within its bounds, which thus have no influence on lines.

    Offset and slope start where the lines of the text begin. As we read the paper, x counts from
    the edge of the screen there, so that what the bounds let depends on where the text stands.

    The whole field of slopes and offsets is searched, at first in coarse steps, so that what is
    found does not depend on where a search begins; of equal fits that with the least drift counts.

    Examples
    --------
    Two lines that fall by 1 px in 20:

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([0.0, 0.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> x_px = np.array([0.0, 200.0, 400.0, 0.0, 200.0, 400.0])
    >>> y_px = np.array([100.0, 110.0, 120.0, 160.0, 170.0, 180.0])
    >>> round(fit_regression(x_px, y_px, passage, MethodSettings()).slope, 3)
    0.05
    """
    bounds = settings.regress
    x, y = x_px - passage.begin_x_px, y_px - passage.line_y_px[0]
    distances_px = _distances(passage)

    def misfit(slope: Positions, offset_px: Positions) -> Positions:
        lifted = y - offset_px[:, np.newaxis] - slope[:, np.newaxis] * x
        off_px = distances_px(lifted)
        squares: Positions = np.einsum("gn,gn->g", off_px, off_px)
        return squares

    slope, offset_px = 0.0, 0.0
    if y.size > 2:
        slope, offset_px = _best(misfit, (bounds.slope, bounds.offset_px), (0.0, 0.0))
    squares = misfit(np.array([slope]), np.array([offset_px]))[0]
    sd_px = float(np.clip(np.sqrt(squares / y.size), *bounds.sd_px))
    return Regression(slope, offset_px, sd_px)


def fit_stretching(y_px: Positions, passage: Passage, settings: MethodSettings) -> Stretching:
    """Fit fixations to lines by one scale and one offset.

    Parameters
    ----------
    y_px : (n,) float64 array
        The fixations, at least one.
    passage : Passage
        The text.
    settings : MethodSettings
        ``stretch``: the bounds.

    Returns
    -------
    Stretching
        That with which distances from the nearest lines add up to the least. Two fixations or fewer
        show no stretch: the scale is 1 and the offset 0.

    Notes
    -----
    Heights count from the first line, as we read the paper from the edge of the screen there; the
    search is as in :func:`fit_regression`.

    Examples
    --------
    >>> passage = Passage(np.array([100.0, 200.0, 300.0]), np.array([0.0, 0.0, 0.0]),
    ...                   np.array([0, 1, 2], np.int32), 100.0, 400.0)
    >>> fit = fit_stretching(np.array([90.0, 195.0, 300.0]), passage, MethodSettings())
    >>> round(fit.scale * (300 - 90), 1), round(fit.scale * (90 - 100) + fit.offset_px, 1)
    (200.0, 0.0)
    """
    bounds = settings.stretch
    y = y_px - passage.line_y_px[0]
    distances_px = _distances(passage)

    def misfit(scale: Positions, offset_px: Positions) -> Positions:
        stretched = scale[:, np.newaxis] * y + offset_px[:, np.newaxis]
        added_up: Positions = distances_px(stretched).sum(axis=1)
        return added_up

    if y.size <= 2:
        return Stretching(1.0, 0.0)
    return Stretching(*_best(misfit, (bounds.scale, bounds.offset_px), (1.0, 0.0)))


def _distances(passage: Passage) -> Callable[[Positions], Positions]:
    """What tells how far heights below the first line are from the nearest line."""
    lines = passage.line_y_px - passage.line_y_px[0]
    # Between these the distance from the nearest line is straight.
    halfway = (lines[1:] + lines[:-1]) / 2
    ends = [lines[0] - _FAR_PX, lines[-1] + _FAR_PX]
    knots = np.sort(np.concatenate([lines, halfway, ends]))
    heights = np.abs(knots[:, np.newaxis] - lines).min(axis=1)
    return lambda y: np.interp(y, knots, heights)


def _best(
    misfit: Misfit, bounds: tuple[Bounds, Bounds], neutral: tuple[float, float]
) -> tuple[float, float]:
    """The two values within bounds with the least misfit; of equal ones the nearest to neutral."""
    low, high = np.array(bounds).T
    spans = high - low
    steps = spans / (np.array(_COARSE) - 1)
    grid = np.meshgrid(*(np.linspace(*b, n) for b, n in zip(bounds, _COARSE, strict=True)))
    tried = np.column_stack([values.ravel() for values in grid])
    tried = np.concatenate([[np.clip(neutral, low, high)], tried])
    away = (np.abs(tried - neutral) / np.where(spans > 0, spans, 1.0)).sum(axis=1)
    tried = tried[np.argsort(away, kind="stable")]
    best = tried[misfit(*tried.T).argmin()]
    about = np.arange(-_THIRDS, _THIRDS + 1) / 3
    pattern = np.column_stack([values.ravel() for values in np.meshgrid(about, about)])
    pattern = pattern[np.argsort(np.abs(pattern).sum(axis=1), kind="stable")]
    for _ in range(_FINER):
        tried = np.clip(best + pattern * steps, low, high)
        best = tried[misfit(*tried.T).argmin()]
        steps = steps / 2
    return float(best[0]), float(best[1])


@line_method
def regress(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Take fixations to the nearest of lines that were fitted to them, all with one slope.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    passage : Passage
        The text.
    settings : MethodSettings
        ``regress``: slope within ±0.1, offset within ±50 px, standard deviation within 1 to 20 px.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.

    Notes
    -----
    See :func:`fit_regression`. Fails where drift grows from line to line, which no common slope
    describes, where noise hides the lines, and where the offset is that of a neighbouring line.
    O(n log m) for each pair of values tried.

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``regress``, after Cohen (2013), Behavior
    Research Methods, 45, 679-683, doi:10.3758/s13428-012-0280-3 (cited from memory).

    Examples
    --------
    The fourth fixation is nearer to the second line, but at the end of a falling line.

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([0.0, 0.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> x_px = np.array([0.0, 150.0, 300.0, 450.0, 0.0, 150.0, 300.0, 450.0])
    >>> y_px = np.array([100.0, 112.0, 124.0, 136.0, 160.0, 172.0, 184.0, 196.0])
    >>> regress(x_px, y_px, passage, MethodSettings()).tolist()
    [0, 0, 0, 0, 1, 1, 1, 1]
    """
    fit = fit_regression(x_px, y_px, passage, settings)
    y = y_px - passage.line_y_px[0]
    lifted = y - fit.offset_px - fit.slope * (x_px - passage.begin_x_px)
    return nearest_line(lifted, passage.line_y_px - passage.line_y_px[0])


@line_method
def stretch(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Stretch and move all fixations to fit the lines best, and take each to the nearest line.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order; x is not looked at.
    passage : Passage
        The text.
    settings : MethodSettings
        ``stretch``: scale within 0.9 to 1.1, offset within ±50 px.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.

    Notes
    -----
    See :func:`fit_stretching`. Undoes a drift that grows from line to line; fails where lines
    slope, where noise hides the lines, and where the offset is that of a neighbouring line.
    O(n log m) for each pair of values tried.

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``stretch``, after Lohmeier (2015; from
    memory).

    Examples
    --------
    Lines found 10 % farther apart than they are: the last is halfway to the next.

    >>> passage = Passage(np.arange(100.0, 500.0, 60), np.zeros(7),
    ...                   np.arange(7, dtype=np.int32), 60.0, 400.0)
    >>> y_px = np.array([100.0, 166.0, 232.0, 298.0, 364.0, 431.0])
    >>> stretch(np.zeros(6), y_px, passage, MethodSettings()).tolist()
    [0, 1, 2, 3, 4, 5]
    """
    del x_px  # all methods are called alike
    fit = fit_stretching(y_px, passage, settings)
    top_px = passage.line_y_px[0]
    return nearest_line(fit.scale * (y_px - top_px) + fit.offset_px, passage.line_y_px - top_px)
