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
_IN_A_ROW = 8
"""Windows that share one bound of their scatter."""
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
    limit: NDArray[np.float64] | float = 0.0 if rule.size is None else rule.size
    if rule.times_scatter is not None:
        limit = rule.times_scatter * np.maximum(_least_scatter(values), resolution or 0.0)[AHEAD:-AHEAD]
    # At most one of the four others can lie on the sample's side of a median that is farther away than the
    # limit: so one of the two next to it is as far away too. This screen loses nothing.
    step = np.abs(np.diff(values))
    middle = np.flatnonzero(np.maximum(step[1:-2], step[2:-1]) > limit) + AHEAD
    if not middle.size:
        return result
    near = np.diff(instants_us) <= hold_us
    middle = middle[near[middle - 2] & near[middle - 1] & near[middle] & near[middle + 1]]
    around = values[middle[:, None] + np.arange(-AHEAD, AHEAD + 1)]
    distance = np.abs(values[middle] - _middle(around))
    far = distance > (limit if isinstance(limit, float) else limit[middle - AHEAD])
    middle, distance = middle[far], distance[far]
    if rule.times_scatter is not None:
        true_limit = rule.times_scatter * np.maximum(_scatter(values, middle), resolution or 0.0)
        middle = middle[distance > true_limit]
    result[middle] = True
    return result


def _scatter(values: NDArray[np.float64], middle: NDArray[np.intp]) -> NDArray[np.float64]:
    """Robust standard deviation of the window of each of the samples."""
    result = np.empty(middle.size)
    windows = sliding_window_view(values, SCATTER_WINDOW) if middle.size else values
    for start in range(0, middle.size, _AT_ONCE):
        own = windows[middle[start : start + _AT_ONCE] - BEHIND]
        deviation = np.abs(own - _middle(own)[:, None])
        result[start : start + _AT_ONCE] = _MAD_TO_STANDARD * _middle(deviation)
    return result


def _least_scatter(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return what the scatter of every sample's window cannot be less than; infinite without a window.

    Half of a window, 16 samples, lie within its median absolute deviation of its median. Eight windows in a
    row share 24 samples and differ in seven, so that at least 9 of the shared ones lie so near: the shortest
    stretch that holds 9 of the 24 is no longer than twice any of the eight deviations.
    """
    least = np.full(values.size, np.inf)
    windows = max(0, values.size - SCATTER_WINDOW + 1)
    if not windows:
        return least
    shared = SCATTER_WINDOW - _IN_A_ROW + 1
    whole = windows // _IN_A_ROW
    # Windows that start at w .. w + 7 share the samples from w + 7 on.
    cores = sliding_window_view(values, shared)[_IN_A_ROW - 1 :: _IN_A_ROW][:whole]
    ordered = np.sort(cores, axis=1)
    span = SCATTER_WINDOW // 2 + 1 - _IN_A_ROW
    shortest = (ordered[:, span:] - ordered[:, : shared - span]).min(axis=1, initial=np.inf)
    bound = np.zeros(windows)
    bound[: whole * _IN_A_ROW] = np.repeat(0.5 * shortest, _IN_A_ROW)
    least[BEHIND : BEHIND + windows] = _MAD_TO_STANDARD * bound
    return least


def _middle(rows: NDArray[np.float64]) -> NDArray[np.float64]:
    """Median of each row of an odd number of values."""
    half = rows.shape[1] // 2
    result: NDArray[np.float64] = np.partition(rows, half, axis=1)[:, half]
    return result
