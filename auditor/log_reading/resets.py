"""Clocks that lost their battery: stamps years away from all others of their export."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

_DAY_US = 86_400_000_000
_FAR_US = 5 * 366 * _DAY_US
"""Stamps of one export with no other within five years are not of one logger's record."""
_FIRST_DAYS = 10
"""A clock without battery starts on 1 January of its first year (GPS: 6 January), in whatever zone."""
_EARLIEST_US = 631_152_000_000_000
"""1990-01-01: no logger's record is older, whatever its clock says."""
ANY_TIME = (-(2**62), 2**62)


@dataclass(frozen=True)
class StampDays:
    """Stamps of a file run by run: rows that follow each other on one day (UTC) are one run."""

    count: NDArray[np.int64]
    first_us: NDArray[np.int64]
    last_us: NDArray[np.int64]


def stamp_days(utc_us: NDArray[np.int64]) -> StampDays:
    """Sum up stamps, in any order, by runs of one day."""
    edges = np.flatnonzero(np.diff(utc_us // _DAY_US, prepend=np.iinfo(np.int64).min // 2))
    return StampDays(
        np.diff(edges, append=utc_us.size),
        np.minimum.reduceat(utc_us, edges),
        np.maximum.reduceat(utc_us, edges),
    )


def believed_range(seen: Sequence[StampDays]) -> tuple[int, int]:
    """Return the stretch in which stamps of an export are believed, from those of all its files.

    Stamps fall into groups wherever five years hold none. The largest group stands; another one is that of
    a clock that was reset when it begins in the first days of a January, as a clock without battery does.
    The stretch reaches five years beyond the groups that stand, but not before 1990.
    """
    if not seen:
        return ANY_TIME
    first_us = np.concatenate([days.first_us for days in seen])
    last_us = np.concatenate([days.last_us for days in seen])
    count = np.concatenate([days.count for days in seen])
    order = np.argsort(first_us, kind="stable")
    first_us, count = first_us[order], count[order]
    reached_us = np.maximum.accumulate(last_us[order])
    starts = np.flatnonzero(np.concatenate([[True], first_us[1:] - reached_us[:-1] > _FAR_US]))
    sizes = np.add.reduceat(count, starts)
    date = first_us[starts].astype("datetime64[us]").astype("datetime64[D]")
    into_year = (date - date.astype("datetime64[Y]")).astype(np.int64)
    stands = into_year >= _FIRST_DAYS
    stands[np.argmax(sizes)] = True
    ends_us = np.append(reached_us[starts[1:] - 1], reached_us[-1])
    return max(int(first_us[starts][stands].min()) - _FAR_US, _EARLIEST_US), int(
        ends_us[stands].max()
    ) + _FAR_US


def range_of(seen: Sequence[StampDays], believed_us: tuple[int, int]) -> tuple[int, int]:
    """Return first and last believed stamp of one file; the first is the later one where there is none."""
    nothing = np.iinfo(np.int64).max, np.iinfo(np.int64).min
    if not seen:
        return nothing
    first_us = np.concatenate([days.first_us for days in seen])
    last_us = np.concatenate([days.last_us for days in seen])
    good = (first_us >= believed_us[0]) & (last_us < believed_us[1])
    return (int(first_us[good].min()), int(last_us[good].max())) if good.any() else nothing
