"""How far one standard uncertainty moves the tick means of a tag."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.records.plant import Tag
    from auditor.records.ticks import TickTable

_ALMOST_ONE = 1.0 - 1e-9


def calibration_shift(mean: FloatArray, tag: Tag) -> FloatArray:
    """Return how far the tick means are off when the instrument is off by one standard uncertainty.

    ``sqrt(a**2 + (b r)**2)`` with the absolute part ``a``, the relative part ``b`` and the reading
    ``r``, the same error at every tick: it does not shrink with the number of samples.

    A purely relative error is one of gain and keeps the sign of the reading, so that flow and
    backflow through one meter still cancel. The reading is what the tag shows, so that a share of
    a temperature in degC is not taken of its kelvins.

    Parameters
    ----------
    mean : ndarray, shape (T,) [SI of the tag]
        Tick means.
    tag : Tag
        With the declared calibration uncertainty; None means none.

    Returns
    -------
    ndarray, shape (T,) [SI of the tag]
        Zero without a declared uncertainty; NaN where the mean is.

    Source
    ------
    JCGM 100:2008, 5.1.2 (independent parts in quadrature) and 5.2.4 (readings of one instrument
    are correlated by its calibration).
    """
    declared = tag.calibration
    if declared is None:
        return np.zeros_like(mean)
    relative = declared.relative * (mean - tag.offset)
    if declared.absolute == 0.0:
        return relative
    shift: FloatArray = np.hypot(declared.absolute, relative)
    return shift


def random_shift(ticks: TickTable, column: str) -> FloatArray:
    """Give every tick the standard uncertainty of its interval's mean from the random part.

    ``u = sqrt(sum(u_tick**2) f) / n`` over the ``n`` covered ticks of an interval. ``f`` allows for
    the correlation ``r`` of neighbouring ticks: for positive ``r`` the first-order process
    ``(1 + r) / (1 - r)``, never more than ``n`` (all ticks share one error); for negative ``r`` the
    moving average ``1 + 2 r (1 - 1/n)``. At ``r = -0.5`` that is ``1/n``: the steps of a counter
    cancel within the interval and only its first and last reading are left.

    Parameters
    ----------
    ticks : TickTable
        With ``noise``, ``noise_lag1`` and the length of the intervals.
    column : str
        Name of the column.

    Returns
    -------
    ndarray, shape (T,) [SI of the column]
        One value per interval, repeated over its ticks; zero where nothing is covered.

    Source
    ------
    JCGM 100:2008, 4.2.3 (standard uncertainty of a mean); Bayley and Hammersley, Supplement to the
    Journal of the Royal Statistical Society 8 (1946) 184, for correlated samples.
    """
    index = ticks.column(column)
    noise = ticks.noise[:, index]
    covered = (ticks.covered_s[:, index] > 0.0) & np.isfinite(noise)
    length = ticks.grid.ticks_per_interval
    starts = np.arange(0, ticks.grid.ticks, length)
    count = np.add.reduceat(covered.astype(np.float64), starts)
    squares = np.add.reduceat(np.square(np.where(covered, noise, 0.0)), starts)
    at_least_one = np.maximum(count, 1.0)
    lag1 = float(ticks.noise_lag1[index])
    correlated = _variance_factor(at_least_one, lag1 if np.isfinite(lag1) else 0.0)
    of_mean = np.sqrt(squares * correlated) / at_least_one
    return np.repeat(of_mean, length)[: ticks.grid.ticks]


def _variance_factor(count: FloatArray, lag1: float) -> FloatArray:
    if lag1 < 0.0:
        return 1.0 + 2.0 * max(lag1, -0.5) * (1.0 - 1.0 / count)
    bounded = min(lag1, _ALMOST_ONE)
    return np.minimum((1.0 + bounded) / (1.0 - bounded), count)
