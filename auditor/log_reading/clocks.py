"""The clock of an export: readings of the clock on the wall to UTC, and the hour that autumn repeats."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from functools import lru_cache
from zoneinfo import ZoneInfo

import numpy as np
from numpy.typing import NDArray

HOUR_US = 3_600_000_000
_FIRST_YEAR, _LAST_YEAR = 1989, 2101
_CLEAR_FALL_US = 600_000_000
"""A fall of the wall clock that is a second pass of an hour, not a late record [10 min]."""


@dataclass(frozen=True)
class Clock:
    """Changes of the offset from UTC: ``low``...``high`` is the stretch that a change skips or repeats."""

    low_us: NDArray[np.int64]
    """Start of each skipped or repeated stretch on the wall, shape (c,)."""
    high_us: NDArray[np.int64]
    offset_us: NDArray[np.int64]
    """Offset before the first change and after each, shape (c + 1,)."""

    def to_utc(
        self, local_us: NDArray[np.int64]
    ) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]]:
        """Turn wall readings into UTC.

        Returns
        -------
        utc_us : ndarray
            In a repeated hour: as of its first pass.
        second_us : ndarray
            What the second pass adds; 0 outside a repeated hour.
        skipped : ndarray
            True where spring skips the reading: no such time exists.
        """
        if self.low_us.size == 0:
            nothing = np.zeros(local_us.shape, np.int64)
            return local_us - self.offset_us[0], nothing, nothing.astype(np.bool_)
        passed = np.searchsorted(self.high_us, local_us, side="right")
        utc_us = local_us - self.offset_us[passed]
        following = np.minimum(passed, self.low_us.size - 1)
        inside = (passed < self.low_us.size) & (local_us >= self.low_us[following])
        change = self.offset_us[following] - self.offset_us[following + 1]
        second_us = np.where(inside & (change > 0), change, 0)
        return utc_us, second_us, inside & (change < 0)


@lru_cache(maxsize=32)
def clock_of(name: str) -> Clock:
    """Return the clock for ``UTC``, a fixed offset such as ``+01:00``, or an IANA zone."""
    none = np.zeros(0, np.int64)
    fixed = re.fullmatch(r"([+-])(\d\d):?(\d\d)", name)
    if name == "UTC":
        return Clock(none, none, np.zeros(1, np.int64))
    if fixed is not None:
        minutes = (int(fixed[2]) * 60 + int(fixed[3])) * (-1 if fixed[1] == "-" else 1)
        return Clock(none, none, np.array([minutes * 60_000_000], np.int64))
    zone = ZoneInfo(name)
    moment = datetime(_FIRST_YEAR, 1, 1, tzinfo=UTC)
    end = datetime(_LAST_YEAR, 1, 1, tzinfo=UTC)
    offsets = [_offset_us(zone, moment)]
    changes: list[int] = []
    while moment < end:
        following = moment + timedelta(days=8)
        # Two changes within eight days do not occur in the years of loggers.
        if _offset_us(zone, following) != offsets[-1]:
            changes.append(_bisect(zone, moment, following))
            offsets.append(_offset_us(zone, following))
        moment = following
    at = np.array(changes, np.int64)
    offset = np.array(offsets, np.int64)
    before, after = at + offset[:-1], at + offset[1:]
    return Clock(np.minimum(before, after), np.maximum(before, after), offset)


def second_passes(
    local_us: NDArray[np.int64], group: NDArray[np.int64], descending: bool
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Tell the two passes of one repeated hour apart by the order of the lines.

    Parameters
    ----------
    local_us : ndarray
        Readings inside the repeated hour in the order of the file, shape (n,).
    group : ndarray
        Readings of different groups (tags of a long export) are told apart each for itself.
    descending : bool
        The file runs from new to old.

    Returns
    -------
    second, known : ndarray
        Which readings belong to the second pass, and for which the order tells it: the clock must
        fall clearly (10 min), or an hourly reading repeat, exactly once.
    """
    second = np.zeros(local_us.shape, np.bool_)
    known = np.zeros(local_us.shape, np.bool_)
    for name in np.unique(group):
        rows = np.flatnonzero(group == name)
        rows = rows[::-1] if descending else rows
        steps = np.diff(local_us[rows])
        falls = np.flatnonzero(steps < -_CLEAR_FALL_US)
        if falls.size == 0 and rows.size == 2 and steps[0] == 0:
            falls = np.array([0])
        if falls.size == 1:
            second[rows[falls[0] + 1 :]] = True
            known[rows] = True
    return second, known


def _offset_us(zone: ZoneInfo, moment: datetime) -> int:
    offset = moment.astimezone(zone).utcoffset()
    return 0 if offset is None else round(offset.total_seconds()) * 1_000_000


def _bisect(zone: ZoneInfo, start: datetime, end: datetime) -> int:
    """Instant of the change of offset between two moments, to the second [us]."""
    before = _offset_us(zone, start)
    low, high = int(start.timestamp()), int(end.timestamp())
    while high - low > 1:
        middle = (low + high) // 2
        if _offset_us(zone, datetime.fromtimestamp(middle, UTC)) == before:
            low = middle
        else:
            high = middle
    return high * 1_000_000
