"""Long exports: one line per stamp and tag, put side by side as one row per stamp."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray


def pivot(
    values: NDArray[np.float64],
    tag: NDArray[np.int64],
    instants_us: NDArray[np.int64],
    line: NDArray[np.int64],
    tags: int,
) -> tuple[NDArray[np.float64], NDArray[np.int64], NDArray[np.int64]]:
    """Put neighbouring lines of one stamp side by side.

    Only lines that follow each other without another stamp between them share a row, so that a
    sample is found in its file by looking from the row's line onwards. A tag that comes twice at
    one stamp opens a second row.

    Parameters
    ----------
    values, tag, instants_us, line : ndarray
        Per line of the file, shape (n,); rows of unknown tags (-1) are left out. A rejected cell (NaN)
        keeps its row: something was logged there.
    tags : int
        Number of tags, k.

    Returns
    -------
    values, instants_us, line
        Shapes (k, m), (m,), (m,); the line is the first of its row.
    """
    kept = np.flatnonzero(tag >= 0)
    values, tag, instants_us, line = values[kept], tag[kept], instants_us[kept], line[kept]
    if kept.size == 0:
        return np.zeros((tags, 0)), instants_us, line
    is_new = np.concatenate([[True], np.diff(instants_us) != 0])
    run = np.cumsum(is_new) - 1
    if not _comes_again(run * tags + tag):
        first = np.flatnonzero(is_new)
        out = np.full((tags, first.size), np.nan)
        out[tag, run] = values
        return out, instants_us[first], line[first]
    order = np.lexsort((np.arange(run.size), tag, run))
    is_first = np.concatenate([[True], (np.diff(run[order]) != 0) | (np.diff(tag[order]) != 0)])
    starts = np.flatnonzero(is_first)
    turn = np.empty(run.size, np.int64)
    turn[order] = np.arange(run.size) - np.repeat(starts, np.diff(np.append(starts, run.size)))
    key = run * (int(turn.max()) + 1) + turn
    _, first, row = np.unique(key, return_index=True, return_inverse=True)
    out = np.full((tags, first.size), np.nan)
    out[tag, row] = values
    return out, instants_us[first], line[first]


def _comes_again(key: NDArray[np.int64]) -> bool:
    """Whether any number stands there twice."""
    if (key[1:] > key[:-1]).all():
        return False
    ranked = np.sort(key)
    return bool((ranked[1:] == ranked[:-1]).any())


def rows_by_tag(tag_of_row: NDArray[np.int64], tags: int) -> list[NDArray[np.int64]]:
    """Rows of each tag, rising; those of unknown tags (-1) are left out."""
    # Numbers of two bytes are sorted in one pass.
    order = np.argsort(tag_of_row.astype(np.int16), kind="stable")
    counts = np.bincount(tag_of_row + 1, minlength=tags + 1)
    return np.split(order, np.cumsum(counts)[:-1])[1:]
