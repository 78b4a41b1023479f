"""Which ticks samples of one kind reach: exact zeros, or readings at the end of an instrument's range."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.dated import stamp_shift_us
from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from auditor.cleaning.cells import CellBook, Cells
    from auditor.cleaning.chain import Chain
    from auditor.records.period import Grid
    from auditor.records.plant import Tag
    from auditor.records.ticks import Example

_NEVER = 2**62


class Marks:
    """Per tick: its marked samples, and how far their stretches reach; local to one call of ``clean``."""

    def __init__(
        self, tag: Tag, grid: Grid, chooses: Callable[[NDArray[np.float64]], NDArray[np.bool_]]
    ) -> None:
        self.tag = tag
        self.grid = grid
        self.chooses = chooses
        self.hold_us = round(tag.hold_s * MICROSECONDS)
        self.samples = np.zeros(grid.ticks, dtype=np.int64)
        self._from_us = np.full(grid.ticks, _NEVER, dtype=np.int64)
        self._to_us = np.full(grid.ticks, -_NEVER, dtype=np.int64)
        self._first: dict[int, Example] = {}

    def note(self, chain: Chain, cells: Cells, lead: int, book: CellBook) -> None:
        """Note the marked samples of a chain.

        ``cells`` are those of its events, without the ``lead`` events that came with an earlier piece: these
        are noted again only for the stretch that follows them.
        """
        chosen = self.chooses(chain.values)
        if chain.good is not None:
            chosen &= chain.good
        at = np.flatnonzero(chosen)
        if not at.size:
            return
        instants = chain.instants_us
        before = instants[np.maximum(at - 1, 0)]
        after = instants[np.minimum(at + 1, instants.size - 1)]
        self._reach(instants[at], before, after)
        period = self.grid.period
        shifted = instants - stamp_shift_us(self.tag)
        own = at[(at >= lead) & (shifted[at] >= period.start_us) & (shifted[at] < period.end_us)]
        tick = (shifted[own] - period.start_us) // (self.grid.tick_s * MICROSECONDS)
        np.add.at(self.samples, tick, 1)
        first = np.flatnonzero(np.diff(tick, prepend=-1))
        for place, number in zip(own[first].tolist(), tick[first].tolist(), strict=True):
            if number not in self._first:
                self._first[number] = book.example(cells, place - lead)

    def close(self, instant_us: int, value: float) -> None:
        """Let the last event of all hold on, where values hold like steps."""
        if self.tag.between == "step" and bool(self.chooses(np.array([value]))[0]):
            last = np.array([instant_us], dtype=np.int64)
            self._reach(last, last, last + self.hold_us)

    def ticks(self, where: NDArray[np.bool_] | None = None) -> NDArray[np.bool_]:
        """Return the ticks reached by the marked samples (of the ticks in ``where``)."""
        marked = self._to_us > -_NEVER
        chosen = np.flatnonzero(marked if where is None else marked & where)
        origin, tick_us = self.grid.period.start_us, self.grid.tick_s * MICROSECONDS
        first = (self._from_us[chosen] - origin) // tick_us
        last = (self._to_us[chosen] - 1 - origin) // tick_us
        edges = np.zeros(self.grid.ticks + 1, dtype=np.int64)
        np.add.at(edges, np.clip(np.minimum(first, chosen), 0, self.grid.ticks), 1)
        np.add.at(edges, np.clip(np.maximum(last, chosen) + 1, 0, self.grid.ticks), -1)
        reached: NDArray[np.bool_] = np.cumsum(edges[:-1]) > 0
        return reached

    def examples(self, where: NDArray[np.bool_]) -> tuple[Example, ...]:
        """Return the first marked sample of the first and of the last of these ticks that have any."""
        ticks = [tick for tick in self._first if where[tick]]
        return (self._first[min(ticks)], self._first[max(ticks)]) if ticks else ()

    def _reach(
        self, instants: NDArray[np.int64], before: NDArray[np.int64], after: NDArray[np.int64]
    ) -> None:
        rule, ends = self.tag.between, self.tag.stamp_marks == "end"
        back = rule == "line" or (rule in ("mean", "amount") and ends)
        forward = rule in ("line", "step") or (rule in ("mean", "amount") and not ends)
        start = np.where(instants - before <= self.hold_us, before, instants) if back else instants
        stop = instants
        if forward and rule == "step":
            stop = np.minimum(after, instants + self.hold_us)
        elif forward:
            stop = np.where(after - instants <= self.hold_us, after, instants)
        period = self.grid.period
        inside = (start < period.end_us) & (np.maximum(stop, instants) >= period.start_us)
        tick = (instants - stamp_shift_us(self.tag) - period.start_us) // (self.grid.tick_s * MICROSECONDS)
        tick = np.clip(tick, 0, self.grid.ticks - 1)[inside]
        np.minimum.at(self._from_us, tick, start[inside])
        np.maximum.at(self._to_us, tick, np.maximum(stop, start)[inside])
