"""When anything was logged for a tag at all: its first and last event, its native step, its gaps."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from auditor.cleaning.view import Events
    from auditor.records.period import Grid
    from auditor.records.ticks import Example

FEW_TICKS = 3
"""A gap is told of when it is longer than this many ticks, and longer than the hold."""


@dataclass(frozen=True)
class Event:
    """The last thing logged for a tag: an accepted sample or a rejected cell."""

    instant_us: int
    value: float
    """SI; NaN for a rejected cell without a number."""
    good: bool
    cell: Example | None
    """Where it stands, when that is before the period and in a file."""


class EventLog:
    """Memory of the events of one tag; local to one call of ``clean``."""

    def __init__(self, grid: Grid, hold_us: int) -> None:
        self.grid = grid
        self.hold_us = hold_us
        self.least_gap_us = max(hold_us, FEW_TICKS * grid.tick_s * MICROSECONDS)
        self.last: Event | None = None
        self.first_us: int | None = None
        self.gaps: list[tuple[int, int]] = []
        """From event to event, or from or to an edge of the period."""
        self._spacing: Counter[int] = Counter()

    def note(self, events: Events) -> None:
        """Note further events; the first one is the last one known, if there was one."""
        if self.first_us is None:
            self.first_us = int(events.instants_us[0])
        for distance, count in zip(*(part.tolist() for part in events.spacing), strict=True):
            self._spacing[distance] += count
        period = self.grid.period
        for index in np.flatnonzero(events.distance_us > self.least_gap_us).tolist():
            start, end = events.instants_us[index : index + 2].tolist()
            if end > period.start_us and start < period.end_us:
                self.gaps.append((start, end))

    @property
    def native_us(self) -> int | None:
        """Median distance between events; None with fewer than two."""
        rest = sum(self._spacing.values()) // 2
        for distance in sorted(self._spacing):
            rest -= self._spacing[distance]
            if rest < 0:
                return distance
        return None

    def close(self) -> None:
        """Note the stretches before the first and after the last event, if they are gaps."""
        period = self.grid.period
        if self.first_us is None or self.last is None:
            self.gaps.append((period.start_us, period.end_us))
            return
        if self.first_us - period.start_us > self.least_gap_us:
            self.gaps.insert(0, (period.start_us, min(self.first_us, period.end_us)))
        last_us = max(self.last.instant_us, period.start_us)
        if period.end_us - last_us > self.least_gap_us:
            self.gaps.append((last_us, period.end_us))

    def never_logged_us(self) -> int:
        """Return the time of the period before the first event, and after the last one beyond its hold."""
        period = self.grid.period
        if self.first_us is None or self.last is None:
            return period.end_us - period.start_us
        head_end = min(max(self.first_us, period.start_us), period.end_us)
        tail_start = min(max(self.last.instant_us + self.hold_us, period.start_us), period.end_us)
        return head_end - period.start_us + max(0, period.end_us - max(tail_start, head_end))
