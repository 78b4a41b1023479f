"""The period of an audit and the grids of ticks and intervals laid over it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

MICROSECONDS = 1_000_000


@dataclass(frozen=True)
class Period:
    """A half-open stretch of time between two local midnights of the site."""

    label: str
    """``2026-07`` for a calendar month, ``2026-07-03_2026-07-09`` (inclusive dates) otherwise."""
    start_us: int
    end_us: int
    zone: str
    """IANA zone of the site."""
    unfinished: bool = False
    """True for a month in progress, cut at the end of its last finished local day."""

    @property
    def seconds(self) -> float:
        """Length of the period [s]."""
        return (self.end_us - self.start_us) / MICROSECONDS


@dataclass(frozen=True)
class Grid:
    """The base grid: equal ticks in UTC from the start of the period to its end."""

    period: Period
    tick_s: int
    interval_s: int
    """Length of an audit interval; a whole number of ticks."""
    start_us: NDArray[np.int64]
    """Start of each tick, shape (T,)."""
    day_start_us: NDArray[np.int64]
    """Local midnights inside the period and its end, shape (days + 1,): days have 23, 24 or 25 hours."""

    @property
    def ticks(self) -> int:
        """Number of ticks, T."""
        return int(self.start_us.shape[0])

    @property
    def ticks_per_interval(self) -> int:
        """Ticks in one audit interval."""
        return self.interval_s // self.tick_s
