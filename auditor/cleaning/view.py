"""One piece of an export as all its tags see it; what tags have in common is worked out once."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from auditor.cleaning.dated import rows_by_stretch
from auditor.cleaning.repeats import find_repeats
from auditor.cleaning.spans import Spans, cut
from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from auditor.cleaning.rows import Rows
    from auditor.records.period import Grid
    from auditor.records.plant import Export, Tag


_KEPT = 6
"""Sets of events, and of stretches, that are kept for the tags that follow."""


@dataclass(frozen=True)
class Events:
    """Stamps at which something was logged for a tag: an accepted sample or a rejected one."""

    instants_us: NDArray[np.int64]
    """Rising; the first one is the last event of the piece before, where there was one."""
    distance_us: NDArray[np.int64]
    """From each to the next, shape (events - 1,)."""
    spacing: tuple[NDArray[np.int64], NDArray[np.int64]]
    """The distances to four digits, each with its count."""


@dataclass(frozen=True)
class TickCounts:
    """The tick of each row that lies in the period."""

    inside: NDArray[np.bool_] | None
    """Rows in the period; None: all."""
    first_row: NDArray[np.intp]
    """First row (of those inside) of each tick touched."""
    ticks: NDArray[np.intp]


class View:
    """A piece of an export with its numbers in SI and a store of what several tags share."""

    def __init__(self, rows: Rows, export: Export, tags: Sequence[Tag], grid: Grid) -> None:
        self.rows = rows
        self.grid = grid
        self.finite = np.isfinite(rows.raw)
        self.numbers = np.empty((rows.raw.shape[0], rows.raw.shape[1] + 1))
        """In SI, one place before the first row left free for the last event of the piece before."""
        scale = np.array([[tag.scale] for tag in tags])
        offset = np.array([[tag.offset] for tag in tags])
        np.multiply(rows.raw, scale, out=self.numbers[:, 1:])
        if offset.any():
            self.numbers[:, 1:] += offset
        for row, tag in enumerate(tags):
            for stretch, then in rows_by_stretch(tag, rows.instants_us) if tag.changes else ():
                self.numbers[row, 1:][stretch] = then.scale * rows.raw[row, stretch] + then.offset
        self.repeats = find_repeats(rows.instants_us, rows.pattern, export.when_stamps_repeat)
        self._events: dict[tuple[bytes, int | None], Events] = {}
        self._spans: dict[tuple[int, int], tuple[Events, Spans]] = {}
        self._counts: dict[int, TickCounts] = {}

    def events(self, chosen: NDArray[np.bool_] | None, before_us: int | None) -> Events:
        """Return the events in the chosen rows (None: all), after the event ``before_us``."""
        key = (b"" if chosen is None else chosen.tobytes(), before_us)
        if key not in self._events:
            instants = self.rows.instants_us if chosen is None else self.rows.instants_us[chosen]
            if before_us is not None:
                instants = np.concatenate((np.array([before_us], dtype=np.int64), instants))
            distance = np.diff(instants)
            _keep_few(self._events)
            self._events[key] = Events(instants, distance, _spacing(distance))
        return self._events[key]

    def spans(self, events: Events, hold_us: int) -> Spans:
        """Return the stretch from each event to the next, at most a hold long."""
        key = (id(events), hold_us)
        if key not in self._spans:
            start = events.instants_us[:-1]
            _keep_few(self._spans)
            spans = cut(start, start + np.minimum(events.distance_us, hold_us), self.grid)
            # With its events, so that no others can get their identity meanwhile.
            self._spans[key] = (events, spans)
        return self._spans[key][1]

    def tick_counts(self, shift_us: int) -> TickCounts:
        """Return the ticks of all rows, their stamps moved back by ``shift_us``."""
        if shift_us not in self._counts:
            period = self.grid.period
            instants = self.rows.instants_us - shift_us
            inside = (instants >= period.start_us) & (instants < period.end_us)
            tick = (instants[inside] - period.start_us) // (self.grid.tick_s * MICROSECONDS)
            first = np.flatnonzero(np.diff(tick, prepend=-1))
            self._counts[shift_us] = TickCounts(None if inside.all() else inside, first, tick[first])
        return self._counts[shift_us]


def _keep_few(store: dict[Any, Any]) -> None:
    """Make room for one more: tags share what all or neighbouring ones need, the rest is used once."""
    while len(store) >= _KEPT:
        del store[next(iter(store))]


def _spacing(distance_us: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Count the distances, to four digits: so that they stay few however much the stamps jitter."""
    if not distance_us.size:
        return distance_us, distance_us
    usual = distance_us[distance_us.size // 2]
    unusual = distance_us[distance_us != usual]
    values = np.append(unusual, usual)
    counts = np.ones(values.size, dtype=np.int64)
    counts[-1] = distance_us.size - unusual.size
    digit = 10 ** np.maximum(np.floor(np.log10(values)).astype(np.int64) - 3, 0)
    distinct, at = np.unique((values + digit // 2) // digit * digit, return_inverse=True)
    return distinct, np.bincount(at, weights=counts).astype(np.int64)
