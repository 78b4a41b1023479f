"""Several values for one stamp: which is kept, which is a duplicate, which lost."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from typing import Literal

    from numpy.typing import NDArray


@dataclass(frozen=True)
class Repeats:
    """Rows that share their stamp with others."""

    rows: NDArray[np.intp]
    """In order, shape (r,)."""
    group: NDArray[np.intp]
    """Number of the stamp for each of them, rising."""
    pattern: NDArray[np.int16]
    """Index of the file pattern for each of them; the lower one wins."""
    rule: Literal["keep first", "keep later", "reject both"]
    """Which of several differing values of the same pattern is kept."""


@dataclass(frozen=True)
class Resolved:
    """What became of the values of one tag that share a stamp."""

    duplicate: NDArray[np.intp]
    """Rows whose value equals the one kept."""
    lost: NDArray[np.intp]
    """Rows whose value differs from the one kept, or all rows of a stamp where none is kept."""
    winner: NDArray[np.intp]
    """For each lost row the row it lost to (itself where none is kept)."""


def find_repeats(
    instants_us: NDArray[np.int64],
    pattern: NDArray[np.int16],
    rule: Literal["keep first", "keep later", "reject both"],
) -> Repeats | None:
    """Find the rows that share a stamp; None when every stamp is there once."""
    same = instants_us[1:] == instants_us[:-1]
    if not same.any():
        return None
    shared = np.zeros(instants_us.size, dtype=np.bool_)
    shared[1:] = same
    shared[:-1] |= same
    rows = np.flatnonzero(shared)
    stamps = instants_us[rows]
    group = np.cumsum(np.diff(stamps, prepend=stamps[0]) != 0)
    return Repeats(rows, group, pattern[rows], rule)


def resolve(repeats: Repeats, values: NDArray[np.float64], good: NDArray[np.bool_]) -> Resolved:
    """Decide between the good values of each shared stamp.

    The file of the earlier pattern wins. Between values of the same pattern the export's rule decides;
    with ``reject both``, two values that differ leave none. Equal values are duplicates of the one kept.

    ``values`` and ``good`` have one place per row of the block.
    """
    entry = np.flatnonzero(good[repeats.rows])
    rows, group, pattern = repeats.rows[entry], repeats.group[entry], repeats.pattern[entry]
    if not rows.size:
        return Resolved(rows, rows, rows)
    first = np.flatnonzero(np.diff(group, prepend=group[0] - 1))
    size = np.diff(first, append=rows.size)
    leads = pattern == np.repeat(pattern[first], size)
    if repeats.rule == "keep later":
        kept = np.maximum.reduceat(np.where(leads, np.arange(rows.size), -1), first)
    else:
        kept = first
    winner = rows[np.repeat(kept, size)]
    equal = values[rows] == values[winner]
    loses = rows != winner
    if repeats.rule == "reject both":
        torn = np.repeat(np.logical_or.reduceat(leads & ~equal, first), size)
        winner = np.where(torn, rows, winner)
        equal &= ~torn
        loses |= torn
    lost = loses & ~equal
    return Resolved(rows[loses & equal], rows[lost], winner[lost])


def one_event_per_stamp(repeats: Repeats, event: NDArray[np.bool_], good: NDArray[np.bool_]) -> None:
    """Leave one event for each shared stamp, in place: the good value if there is one, else the first."""
    entry = np.flatnonzero(event[repeats.rows])
    rows, group = repeats.rows[entry], repeats.group[entry]
    if not rows.size:
        return
    first = np.flatnonzero(np.diff(group, prepend=group[0] - 1))
    size = np.diff(first, append=rows.size)
    any_good = np.repeat(np.logical_or.reduceat(good[rows], first), size)
    leading = np.zeros(rows.size, dtype=np.bool_)
    leading[first] = True
    event[rows] = np.where(any_good, good[rows], leading)
