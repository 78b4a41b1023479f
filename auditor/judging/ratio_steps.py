"""Steps in the ratio of two signals: when, from what to what, and how well that is known.

Two signals of one machine rise and fall with its load together, and so does their ratio a little. A step is
therefore sized at equal load: only intervals are compared in which one of the two signals was as large
before the step as after it. That one is the signal which did not change its meaning.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.steps import largest_steps

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

SIDE_US = 48 * 3_600_000_000
"""Record compared on each side of a step."""
_BLOCK_US = 6 * 3_600_000_000
"""Readings within a quarter of a day share weather and load: each such block counts as one."""
_DAY_US = 86_400_000_000
_LEAST_QUIET = 6
"""Fewest stretches without a step from which the usual change from day to day is taken."""
_MAD_TO_SIGMA = 1.4826
_LEAST_BLOCKS = 4
"""Fewest blocks on each side."""
_CLASSES = 12
"""Classes of load in which intervals are compared."""
_LEAST_MATCHED = 12
"""Fewest intervals of equal load on each side (three hours of quarter-hours)."""
_T_95 = 2.45
"""Student's t for 95 % and six degrees of freedom, about what twice four blocks leave."""


@dataclass(frozen=True)
class RatioStep:
    """A step in the ratio of two signals."""

    index: int
    """First point of the new level."""
    before: float
    """Median of the ratio before it [1]."""
    after: float
    factor: float
    """By which the ratio changed at equal load [1]."""
    factor_U: float
    """Expanded uncertainty of ``factor`` from scatter and from what differs from day to day [1]."""


def ratio_steps(times_us: NDArray[np.int64], top: Floats, bottom: Floats) -> list[RatioStep]:
    """Find the steps of ``top / bottom``, two positive series of one machine; in order of time.

    Returns
    -------
    list of RatioStep
        Those whose size at equal load is known; a change of both signals together is none.
    """
    found = []
    ratio = top / bottom
    steps = largest_steps(times_us, ratio)
    quiet = _quiet_places(times_us, [step.index for step in steps]) if steps else []
    logarithm, loads = np.log(ratio), (np.log(bottom), np.log(top))
    for step in steps:
        sized = [(_at_equal_load(times_us, logarithm, load, step.index), load) for load in loads]
        known = [(change, load) for change, load in sized if change is not None]
        if known:
            (size, scatter_U, _), load = max(known, key=lambda each: each[0][2])
            U = max(scatter_U, _usual_U(times_us, logarithm, load, quiet, scatter_U))
            factor = math.exp(size)
            found.append(RatioStep(step.index, step.before, step.after, factor, factor * U))
    return found


def _quiet_places(times_us: NDArray[np.int64], steps: list[int]) -> list[int]:
    """One point a day with whole sides, which no step lies in."""
    days_us = np.arange(times_us[0] + SIDE_US, times_us[-1] - SIDE_US, _DAY_US)
    places = [int(index) for index in np.unique(np.searchsorted(times_us, days_us))]
    return [
        index for index in places if all(abs(times_us[index] - times_us[step]) > SIDE_US for step in steps)
    ]


def _usual_U(
    times_us: NDArray[np.int64], ratio: Floats, load: Floats, quiet: list[int], scatter_U: float
) -> float:
    """Twice the usual change at equal load between neighbouring stretches without a step.

    Days differ by more than their quarters do. Where the record is too short to tell by how much, the four
    quarters of a day are taken as one: twice the scatter.
    """
    changes = [_at_equal_load(times_us, ratio, load, index) for index in quiet]
    known = [change[0] for change in changes if change is not None]
    if len(known) < _LEAST_QUIET:
        return 2.0 * scatter_U
    return 2.0 * _MAD_TO_SIGMA * float(np.median(np.abs(known)))


def sides(times_us: NDArray[np.int64], index: int) -> tuple[slice, slice]:
    """Points that are compared before and after a step."""
    first, last = np.searchsorted(times_us, (times_us[index] - SIDE_US, times_us[index] + SIDE_US))
    return slice(int(first), index), slice(index, int(last))


def level_change(times_us: NDArray[np.int64], values: Floats, index: int) -> tuple[float, float, float]:
    """Median before and after a point, and the expanded uncertainty of their difference; NaN if unknown."""
    left, right = sides(times_us, index)
    before, after = float(np.median(values[left])), float(np.median(values[right]))
    return (
        before,
        after,
        _U((times_us[left], values[left] - before), (times_us[right], values[right] - after)),
    )


def _at_equal_load(
    times_us: NDArray[np.int64], ratio: Floats, load: Floats, index: int
) -> tuple[float, float, int] | None:
    """Change of the logarithm of a ratio at equal load, its U, and the number of intervals matched."""
    left, right = sides(times_us, index)
    window = slice(left.start, right.stop)
    times_us, ratio, load = times_us[window], ratio[window], load[window]
    is_after = np.arange(times_us.size) >= index - left.start
    edges = np.unique(np.quantile(load, np.linspace(0.0, 1.0, _CLASSES + 1)))
    classes = np.searchsorted(edges[1:-1], load, side="right")
    changes, weights = np.full(_CLASSES, np.nan), np.zeros(_CLASSES)
    residual = np.full(ratio.shape, np.nan)
    for load_class in range(_CLASSES):
        before, after = (np.flatnonzero((classes == load_class) & side) for side in (~is_after, is_after))
        if not before.size or not after.size:
            continue
        middle = np.median(ratio[before]), np.median(ratio[after])
        residual[before], residual[after] = ratio[before] - middle[0], ratio[after] - middle[1]
        changes[load_class] = middle[1] - middle[0]
        weights[load_class] = min(before.size, after.size)
    matched = int(weights.sum())
    if matched < _LEAST_MATCHED:
        return None
    size = float(np.nansum(changes * weights) / matched)
    matched_sides = [np.isfinite(residual) & side for side in (~is_after, is_after)]
    before_it, after_it = ((times_us[side], residual[side]) for side in matched_sides)
    U = _U(before_it, after_it)
    # What differs from class to class is no scatter of readings: the size is not known better than that.
    spread = float(np.sqrt(np.nansum(weights * (changes - size) ** 2) / matched))
    U = math.hypot(U, 2.0 * spread / math.sqrt(max(1, int(np.count_nonzero(weights)))))
    return (size, U, matched) if math.isfinite(U) else None


def _U(before: tuple[NDArray[np.int64], Floats], after: tuple[NDArray[np.int64], Floats]) -> float:
    """Give the expanded uncertainty of the difference of two levels, from the means of blocks of time.

    Source
    ------
    JCGM 100:2008, 4.2.3 (scatter of means) and G.3 (Student's t), with blocks in place of readings because
    neighbouring readings are not independent.
    """
    variance = 0.0
    for times_us, residual in (before, after):
        blocks = np.unique(times_us // _BLOCK_US, return_inverse=True)[1]
        counts = np.bincount(blocks) if blocks.size else np.zeros(0)
        if counts.size < _LEAST_BLOCKS:
            return math.nan
        means = np.bincount(blocks, weights=residual) / counts
        scatter = float(np.average((means - np.average(means, weights=counts)) ** 2, weights=counts))
        variance += scatter / (counts.size - 1)
    return _T_95 * math.sqrt(variance)
