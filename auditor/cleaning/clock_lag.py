"""The lag between two signals, day by day, from the events that both of them show."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.period import Grid

EVENT_S = 600
"""Half-length of an event: the mean of so long after a moment less that of so long before it."""
LARGEST_LAG_S = 9_000
"""Lags up to 150 min are looked for: the two hours that a wrong time rule can make, and a margin."""
_CLIP = 4.0
"""Events count up to so many times their usual size: one trip does not outvote the day."""
_HALF = 0.5
_NORMAL_95 = 1.959964
"""Quantile of the normal distribution, 95 % between both signs of it."""
_CLEAR_PEAK = 0.2
_CLEAR_RATIO = 1.8
"""A peak is clear when it stands so far above every other lag, and has this correlation at least."""


def daily_spectra(
    mean: NDArray[np.float64], grid: Grid
) -> tuple[NDArray[np.complex128], NDArray[np.float64]]:
    """Turn tick means of one signal into the spectra of its events, one per local day.

    Parameters
    ----------
    mean : ndarray
        Tick means, NaN where nothing is known, shape (T,).
    grid : Grid
        The ticks and the edges of the days.

    Returns
    -------
    spectra : ndarray
        Shape (days, frequencies).
    energy : ndarray
        Sum of squares of each day's events, shape (days,); 0 for a day that shows none, or is known
        for less than half of its time.
    """
    events = _events(mean, max(1, round(EVENT_S / grid.tick_s)))
    day = _days(events, grid)
    known = np.isfinite(day)
    # Rounding of a long sum is no event.
    dust = 1e-9 * float(np.nanmax(np.abs(mean), initial=0.0))
    size = np.where(known & (np.abs(day) > dust), np.abs(day), np.nan)
    steady = np.where(known, np.nan_to_num(size), np.nan)
    usual, smallest = _median(steady), _median(size)
    usual = np.where(usual > 0, usual, smallest)
    good = (known.mean(axis=1) >= _HALF) & (usual > 0)
    scale = np.where(good, usual, 1.0)[:, None]
    clipped = np.where(known & good[:, None], np.clip(np.nan_to_num(day) / scale, -_CLIP, _CLIP), 0.0)
    length = _length(day.shape[1], grid)
    return np.fft.rfft(clipped, length, axis=1), (clipped**2).sum(axis=1)


def daily_lags(
    first: tuple[NDArray[np.complex128], NDArray[np.float64]],
    second: tuple[NDArray[np.complex128], NDArray[np.float64]],
    grid: Grid,
) -> NDArray[np.float64]:
    """Return by how much the second signal shows the same events later, for each day.

    The lag is where the correlation of the events, of either sign, is largest:
    ``sum_t a(t) b(t + lag) / sqrt(sum a^2 sum b^2)``, made finer than a tick by a parabola through the peak.

    Parameters
    ----------
    first, second
        As :func:`daily_spectra` gives them.
    grid : Grid

    Returns
    -------
    ndarray
        Seconds, shape (days,); NaN where no peak stands clear of all others.
    """
    power = first[1] * second[1]
    length = 2 * (first[0].shape[1] - 1)
    reach = LARGEST_LAG_S // grid.tick_s
    whole = np.fft.irfft(np.conj(first[0]) * second[0], length, axis=1)
    size = np.abs(np.concatenate([whole[:, -reach:], whole[:, : reach + 1]], axis=1))
    size /= np.sqrt(np.where(power > 0, power, 1.0))[:, None]
    at = size.argmax(axis=1)
    rows = np.arange(at.size)
    peak = size[rows, at]
    width = 2 * max(1, round(EVENT_S / grid.tick_s)) + max(1, round(EVENT_S / 2 / grid.tick_s))
    apart = np.abs(np.arange(size.shape[1])[None, :] - at[:, None]) > width
    others = np.where(apart, size, 0.0).max(axis=1)
    inner = np.clip(at, 1, size.shape[1] - 2)
    left, middle, right = size[rows, inner - 1], size[rows, inner], size[rows, inner + 1]
    bend = left - 2.0 * middle + right
    finer = np.where(bend < 0, 0.5 * (left - right) / np.where(bend < 0, bend, 1.0), 0.0)
    clear = (power > 0) & (at == inner) & (peak >= _CLEAR_PEAK) & (peak >= _CLEAR_RATIO * others)
    return np.where(clear, (at - reach + finer) * grid.tick_s, np.nan)


def theil_sen(x: NDArray[np.int64], y: NDArray[np.float64]) -> tuple[float, float, float]:
    """Return the slope of a line through points of which some may be wild, and its interval of 95 %.

    The slope is the median of those between all pairs of points; the interval counts the ordered slopes off
    by Kendall's variance, n (n - 1) (2 n + 5) / 18 (P. K. Sen, J. Am. Stat. Assoc. 63 (1968) 1379).

    Parameters
    ----------
    x, y : ndarray
        At least two points, ``x`` without ties.

    Returns
    -------
    tuple of float
        Slope, lower and upper end.
    """
    first, second = np.triu_indices(x.size, 1)
    slopes = np.sort((y[second] - y[first]) / (x[second] - x[first]))
    off = _NORMAL_95 * np.sqrt(x.size * (x.size - 1) * (2 * x.size + 5) / 18.0)
    low = max(int(np.round((slopes.size - off) / 2.0)) - 1, 0)
    high = min(int(np.round((slopes.size + off) / 2.0)), slopes.size - 1)
    return float(np.median(slopes)), float(slopes[low]), float(slopes[high])


def _events(mean: NDArray[np.float64], half: int) -> NDArray[np.float64]:
    """Mean of the ticks after each moment less that of the ticks before it, shape (T,)."""
    known = np.isfinite(mean)
    # Sums run from the middle of the signal, so that they keep their digits.
    middle = float(np.median(mean[known])) if known.any() else 0.0
    total = np.concatenate([[0.0], np.cumsum(np.where(known, mean - middle, 0.0))])
    count = np.concatenate([[0], np.cumsum(known)])
    moment = np.arange(mean.size)
    before, after = np.maximum(moment - half, 0), np.minimum(moment + half, mean.size)
    n_before, n_after = count[moment] - count[before], count[after] - count[moment]
    enough = (n_before > _HALF * half) & (n_after > _HALF * half)
    step = (total[after] - total[moment]) / np.maximum(n_after, 1)
    step -= (total[moment] - total[before]) / np.maximum(n_before, 1)
    return np.where(enough, step, np.nan)


def _days(series: NDArray[np.float64], grid: Grid) -> NDArray[np.float64]:
    """Cut a series at the edges of the days, shape (days, ticks of the longest day); NaN fills short days."""
    edges = (grid.day_start_us - grid.period.start_us) // (grid.tick_s * 1_000_000)
    lengths = np.diff(edges)
    place = np.arange(int(lengths.max()))
    index = np.minimum(edges[:-1, None] + place[None, :], series.size - 1)
    return np.where(place[None, :] < lengths[:, None], series[index], np.nan)


def _median(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Median of each row's numbers; 0 for a row without any."""
    result = np.zeros(values.shape[0])
    rows = np.isfinite(values).any(axis=1)
    result[rows] = np.nanmedian(values[rows], axis=1)
    return result


def _length(ticks: int, grid: Grid) -> int:
    """Length of a transform in which no lag that is looked for wraps round."""
    return 1 << (ticks + LARGEST_LAG_S // grid.tick_s).bit_length()
