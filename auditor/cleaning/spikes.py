"""Single or double samples far from their neighbours, by true medians."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.plant import SpikeRule

AHEAD = 2
"""Neighbours needed on either side: the median of five withstands two that are off, and no step or ramp
moves it away from its own sample."""
SCATTER_WINDOW = 31
"""Samples whose scatter is taken, the last of them the second one after the sample judged."""
BEHIND = SCATTER_WINDOW - 1 - AHEAD
_MAD_TO_STANDARD = 1.4826
"""Standard deviation of a normal distribution over its median absolute deviation: 1 / 0.67449."""
_AT_ONCE = 1 << 14
"""Scatter windows held in memory at once."""


def far_from_neighbours(
    values: NDArray[np.float64],
    instants_us: NDArray[np.int64],
    rule: SpikeRule,
    hold_us: int,
    resolution: float | None,
) -> NDArray[np.bool_]:
    """Tell which samples are spikes.

    A sample is compared with the median of itself and the two samples on either side, none of them farther
    than a hold from the next. One or two samples that are off cannot move that median; a step of the
    process, a ramp, or three samples that agree are never taken for a spike. What is farther from it than
    the declared size, or than so many times the scatter, is a spike. The scatter is 1.4826 times the median
    absolute deviation of 31 samples, the last of them the second one after the sample judged, and never
    less than the declared resolution. A sample without its four neighbours (by scatter: without the 28
    samples before it) is not tested.

    Parameters
    ----------
    values, instants_us : ndarray, shape (n,)
        Believed samples in order of time, one per stamp.
    rule
        The declared limit, SI.
    hold_us
        Longest distance of neighbours.
    resolution
        Smallest step of the value, SI.

    Returns
    -------
    ndarray of bool, shape (n,)

    Source
    ------
    F. R. Hampel, The influence curve and its role in robust estimation, J. Am. Stat. Assoc. 69 (1974),
    383-393: median and median absolute deviation (from memory).
    """
    result = np.zeros(values.size, dtype=np.bool_)
    if values.size < 2 * AHEAD + 1:
        return result
    floor = rule.size if rule.size is not None else (rule.times_scatter or 0.0) * (resolution or 0.0)
    step = np.abs(np.diff(values))
    # At most one of the four others can lie on the sample's side of a median that is farther away than the
    # limit: so one of the two next to it is as far away too. This screen loses nothing.
    middle = np.flatnonzero(np.maximum(step[1:-2], step[2:-1]) > floor) + AHEAD
    if not middle.size:
        return result
    near = np.diff(instants_us) <= hold_us
    middle = middle[near[middle - 2] & near[middle - 1] & near[middle] & near[middle + 1]]
    around = values[middle[:, None] + np.arange(-AHEAD, AHEAD + 1)]
    distance = np.abs(values[middle] - np.median(around, axis=1))
    far = distance > floor
    middle, distance = middle[far], distance[far]
    if rule.times_scatter is not None:
        enough = middle >= BEHIND
        middle, distance = middle[enough], distance[enough]
        limit = rule.times_scatter * np.maximum(_scatter(values, middle), resolution or 0.0)
        middle = middle[distance > limit]
    result[middle] = True
    return result


def _scatter(values: NDArray[np.float64], middle: NDArray[np.intp]) -> NDArray[np.float64]:
    """Robust standard deviation of the window of each of the samples."""
    if values.size < SCATTER_WINDOW:
        return np.zeros(0)
    windows = sliding_window_view(values, SCATTER_WINDOW)
    result = np.empty(middle.size)
    for start in range(0, middle.size, _AT_ONCE):
        own = windows[middle[start : start + _AT_ONCE] - BEHIND]
        level = np.median(own, axis=1, keepdims=True)
        result[start : start + _AT_ONCE] = _MAD_TO_STANDARD * np.median(np.abs(own - level), axis=1)
    return result
