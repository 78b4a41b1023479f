"""The random part of a tick mean's uncertainty: what averaging makes smaller, unlike calibration."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.period import Grid
    from auditor.records.plant import Tag

MAD_TO_STANDARD = 1.4826022185056018
"""Standard deviation over median absolute deviation of a normal distribution, ``1 / Phi^-1(3/4)``."""
_SECOND_DIFFERENCE = 6.0
"""Variance of ``x1 - 2 x2 + x3`` over that of x, for independent x: 1 + 4 + 1."""
_SECOND_DIFFERENCE_OF_COUNTER = 10.0
"""The same where each x is itself the difference of two independent readings: (1 + 9 + 9 + 1) / 2."""
_FEWEST = 30
"""Differences that a local day needs for an estimate of its own."""


@dataclass(frozen=True)
class TickSeries:
    """One column of ticks."""

    mean: NDArray[np.float64]
    """SI, NaN where nothing is covered, shape (T,)."""
    share: NDArray[np.float64]
    """Covered share of each tick [1]."""
    samples: NDArray[np.int32]
    native_s: float
    """Typical time between samples; NaN when unknown."""


def tick_noise(tag: Tag, series: TickSeries, grid: Grid) -> tuple[NDArray[np.float64], float]:
    """Return the standard uncertainty of each tick mean from its random part, and its correlation.

    Added in quadrature:

    - *scatter of samples*: the declared ``random`` part of one sample over the root of the samples in the
      tick; if none is declared, ``1.4826 median(|x1 - 2 x2 + x3|) / sqrt(6)`` of the tick means of each
      local day, zeros left out. Second differences are blind to steady movement: a ramp of the process is
      no noise. Taken over tick means they also hold whatever correlation there is between the samples of a
      tick. Values stored only when they change, and counters of known resolution, are not estimated.
    - *dead-band*: the limit, either way, of a rectangular distribution, ``d / sqrt(3)``, also for values
      that are stored only when they change.
    - *resolution* q: ``q / sqrt(12)``, not made smaller by averaging, as the errors of neighbours are alike.
      The difference of two readings of a counter has ``q / sqrt(6)``, over the time between them.
    - *gaps*: the uncovered share of the tick times the usual change from one tick to the next
      (``1.4826 median(|x2 - x1|)`` of the local day).

    A state has none.

    The second result is the lag-1 autocorrelation r of these errors from tick to tick: a mean over n ticks
    has ``u / sqrt(n) * sqrt((1 + r) / (1 - r))`` for many ticks. With m ticks to a sample it is
    ``(m - 1) / (m + 1)``, which makes m ticks count as one. A counter read in every tick has -1/2: what one
    tick gets too much the next one gets too little, so the errors of a sum stay those of its two ends.
    """
    nan = np.where(np.isfinite(series.mean), 0.0, np.nan)
    if tag.between == "state":
        return nan, 0.0
    stride = 1 if np.isnan(series.native_s) else max(1, round(series.native_s / grid.tick_s))
    length_s = max(grid.tick_s, 0.0 if np.isnan(series.native_s) else series.native_s)
    counter = tag.between == "counter"
    variance = nan.copy()
    variance += _sampling(tag, series, length_s, stride, grid) ** 2
    if tag.deadband is not None:
        # The value in force may have moved by up to the dead band either way: a limit, rectangular.
        variance += tag.deadband**2 / 3.0
    if tag.resolution is not None:
        variance += _resolution(tag, tag.resolution, length_s) ** 2
    if (series.share < 1.0).any():
        change = _daily(np.diff(_strided(series.mean, stride, 2), axis=0)[0], grid)
        variance += ((1.0 - series.share) * change) ** 2
    lag1 = (stride - 1.0) / (stride + 1.0)
    return np.sqrt(variance), -0.5 if counter and stride == 1 else lag1


def _resolution(tag: Tag, resolution: float, length_s: float) -> float:
    if tag.between == "counter":
        return float(resolution / np.sqrt(6.0) / length_s)
    if tag.between == "amount":
        return float(resolution / np.sqrt(12.0) / length_s)
    return float(resolution / np.sqrt(12.0))


def _sampling(
    tag: Tag, series: TickSeries, length_s: float, stride: int, grid: Grid
) -> NDArray[np.float64] | float:
    """Return the part that comes from the scatter of single samples."""
    counter = tag.between == "counter"
    if tag.random is not None:
        absolute = tag.random.absolute
        if tag.between in ("counter", "amount"):
            absolute /= length_s
        relative = tag.random.relative * np.where(np.isfinite(series.mean), series.mean, 0.0)
        if counter:
            absolute *= math.sqrt(2.0)
        count = 1 if counter else np.maximum(series.samples, 1)
        scatter: NDArray[np.float64] = np.hypot(absolute, relative) / np.sqrt(count)
        return scatter
    if (tag.between == "step" and tag.deadband is not None) or (counter and tag.resolution is not None):
        return 0.0
    first, second, third = _strided(series.mean, stride, 3)
    ratio = _SECOND_DIFFERENCE_OF_COUNTER if counter else _SECOND_DIFFERENCE
    return _daily(first - 2.0 * second + third, grid) / math.sqrt(ratio)


def _strided(values: NDArray[np.float64], stride: int, count: int) -> NDArray[np.float64]:
    """Return the values ``count`` times over, each time ``stride`` ticks later, shape (count, n)."""
    length = max(0, values.size - (count - 1) * stride)
    return np.stack([values[shift * stride : shift * stride + length] for shift in range(count)])


def _daily(differences: NDArray[np.float64], grid: Grid) -> NDArray[np.float64]:
    """Return for each tick the robust standard deviation of the differences that begin in its local day.

    A difference of exactly zero says that nothing was read anew (a stopped machine, one sample over many
    ticks), and does not count. A day with too few takes the estimate of the whole period; without any it
    is zero.
    """
    sizes = np.abs(differences)
    sizes[~(sizes > 0.0)] = np.nan
    known = np.isfinite(sizes)
    whole = MAD_TO_STANDARD * float(np.median(sizes[known])) if known.any() else 0.0
    result = np.full(grid.ticks, whole)
    tick_us = grid.tick_s * MICROSECONDS
    edges = -(-(grid.day_start_us - grid.period.start_us) // tick_us)
    for start, stop in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        day = sizes[start:stop][known[start:stop]]
        if day.size >= _FEWEST:
            result[start:stop] = MAD_TO_STANDARD * float(np.median(day))
    return result
