"""Means over intervals of two signals where both are known: what comparisons of meters stand on."""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.period import Grid
    from auditor.records.ticks import TickTable

    Floats = NDArray[np.float64]
    Flags = NDArray[np.bool_]

_TICK_COVERED = 0.5
"""Share of a tick that must be covered."""
_OF_USUAL = 0.05
"""Where both signals lie below this share of their upper level, they are too small for a ratio."""


class Pair(NamedTuple):
    """Two positive series at the same instants."""

    times_us: NDArray[np.int64]
    """Start of each interval, shape (n,)."""
    first: Floats
    second: Floats


def tag_means(ticks: TickTable, tag: str) -> Floats:
    """Means of a tag by tick, NaN where less than half of the tick is covered; shape (T,)."""
    column = ticks.column(tag)
    covered = ticks.covered_s[:, column] >= _TICK_COVERED * ticks.grid.tick_s
    return np.where(covered, ticks.mean[:, column], np.nan)


def interval_pair(grid: Grid, first: Floats, second: Floats, use: Flags, coverage: float) -> Pair:
    """Mean two signals over intervals in which both are known, used, and large enough for a ratio.

    Parameters
    ----------
    grid : Grid
    first, second : ndarray, shape (T,)
        By tick, NaN where not known.
    use : ndarray of bool, shape (T,)
        Ticks that may be compared.
    coverage : float [1]
        Share of an interval's ticks that must be left.
    """
    good = use & np.isfinite(first) & np.isfinite(second)
    edges = np.arange(0, grid.ticks, grid.ticks_per_interval)
    count = np.add.reduceat(good.astype(np.float64), edges)
    sums = [np.add.reduceat(np.where(good, values, 0.0), edges) for values in (first, second)]
    enough = count >= coverage * grid.ticks_per_interval
    means = [of[enough] / count[enough] for of in sums]
    if not means[0].size:
        return Pair(grid.start_us[edges][enough], means[0], means[1])
    # One large signal is enough: the other may be small because its unit changed.
    large = np.logical_or.reduce([of > _OF_USUAL * np.quantile(of, 0.95) for of in means])
    large &= (means[0] > 0.0) & (means[1] > 0.0)
    return Pair(grid.start_us[edges][enough][large], means[0][large], means[1][large])
