"""Fewer points for a line: neighbours are grouped, and of each group the lowest and the highest are kept."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

MOST_POINTS = 2_000


def group_size(points: int, most: int = MOST_POINTS) -> int:
    """Neighbours per group so that two points of each group stay within ``most``; 1: nothing is thinned."""
    return 1 if points <= most else -(-points * 2 // most)


def envelope(values: NDArray[np.float64], most: int = MOST_POINTS) -> NDArray[np.int64]:
    """Choose the points to draw: of each group the lowest and the highest, in order of time.

    A group without any number keeps one of its points, so that a gap stays a gap.

    Parameters
    ----------
    values : ndarray, shape (n,)
    most : int
        Largest number of points.

    Returns
    -------
    ndarray of int, at most ``most`` long
    """
    size = group_size(values.shape[0], most)
    if size == 1:
        return np.arange(values.shape[0], dtype=np.int64)
    groups = -(-values.shape[0] // size)
    padded = np.full(groups * size, np.nan)
    padded[: values.shape[0]] = values
    table = padded.reshape(groups, size)
    start = np.arange(groups, dtype=np.int64) * size
    lowest = start + np.where(np.isnan(table), np.inf, table).argmin(axis=1)
    highest = start + np.where(np.isnan(table), -np.inf, table).argmax(axis=1)
    return np.unique(np.concatenate((lowest, highest)))


def every(points: int, most: int = MOST_POINTS) -> slice:
    """Every k-th point of a cloud, so that at most ``most`` remain."""
    return slice(None, None, max(1, -(-points // most)))


def numbers(values: NDArray[np.float64], digits: int = 5) -> list[float | None]:
    """Numbers for the chart with few significant digits; NaN becomes null: a gap."""
    return [float(f"{value:.{digits}g}") if np.isfinite(value) else None for value in values.tolist()]


def milliseconds(instants_us: NDArray[np.int64], offset_us: int) -> list[int]:
    """Instants as milliseconds of the site's standard time, which the plotting script takes as they are."""
    shifted: list[int] = ((instants_us + offset_us) // 1000).tolist()
    return shifted
