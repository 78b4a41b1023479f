"""A counter's readings on their way to the ticks: differences, long gaps, resets, spikes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.cells import Cells
from auditor.cleaning.counters import CounterRule, Readings, sift, smallest_rises
from auditor.cleaning.spans import add_constant, add_covered, cut
from auditor.records.period import MICROSECONDS
from auditor.records.ticks import Bridge

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.sums import Sums


@dataclass(frozen=True)
class Reset:
    """A step of a counter that is not believed: the meter was reset, exchanged, or ran impossibly fast."""

    start_us: int
    end_us: int
    fell: bool
    file: int
    line: int


@dataclass(frozen=True)
class Settled:
    """Readings whose fate is now known."""

    used: Cells
    spikes: Cells


class CounterSums:
    """Readings of one counter that wait for a decision; fills the sums of its tag."""

    def __init__(self, sums: Sums, distrust_us: tuple[tuple[int, int], ...]) -> None:
        tag = sums.tag
        self.sums = sums
        self.rule = CounterRule.of(tag)
        self.distrust_us = distrust_us
        self.waiting: Cells | None = None
        """The last reading that stands, then those not decided yet."""
        self._quanta = np.zeros(0)
        """Smallest rise met up to each waiting reading: found on arrival, so that no cut can change it."""
        self.bridges: list[Bridge] = []
        self.resets: list[Reset] = []
        self.carried: list[Cells] = []
        """Readings outside the period that close its first or last step."""
        self._broken_start_us = np.zeros(0, dtype=np.int64)
        self._broken_end_us = np.zeros(0, dtype=np.int64)

    def reject_if_uncovered(self, start_us: NDArray[np.int64], end_us: NDArray[np.int64]) -> None:
        """Note rejected stretches: they count as such unless a difference across them covers them."""
        starts = np.concatenate((self._broken_start_us, start_us))
        ends = np.concatenate((self._broken_end_us, end_us))
        first = np.ones(starts.size, dtype=np.bool_)
        first[1:] = starts[1:] > ends[:-1]
        heads = np.flatnonzero(first)
        self._broken_start_us = starts[heads]
        self._broken_end_us = np.maximum.reduceat(ends, heads) if heads.size else ends

    def add(self, cells: Cells | None, *, final: bool = False) -> Settled | None:
        """Take further readings, and settle those whose fate is known; None when there are none at all."""
        fresh = self.waiting is None
        if cells is not None and len(cells):
            self._queue(cells)
        if self.waiting is None:
            return None
        waiting = self.waiting
        sifted = sift(Readings(waiting.instants_us, waiting.values, self._quanta), self.rule, final=final)
        kept = waiting.take(sifted.kept)
        self._fill(kept, sifted.amount)
        rest = np.concatenate((sifted.kept[-1:], np.arange(sifted.settled, len(waiting))))
        self.waiting, self._quanta = waiting.take(rest), self._quanta[rest]
        return Settled(kept if fresh else kept.take(slice(1, None)), waiting.take(sifted.spikes))

    def _queue(self, cells: Cells) -> None:
        if self.waiting is None:
            self._quanta = smallest_rises(np.nan, np.inf, cells.values)
            self.waiting = cells
            return
        fresh = smallest_rises(float(self.waiting.values[-1]), float(self._quanta[-1]), cells.values)
        self._quanta = np.concatenate((self._quanta, fresh))
        self.waiting = self.waiting.followed_by(cells)

    def reject_rest(self) -> None:
        """At the end: stretches after the last reading are covered by nothing any more."""
        self.sums.reject(self._broken_start_us, self._broken_end_us)

    def _fill(self, kept: Cells, amount: NDArray[np.float64]) -> None:
        start, end = kept.instants_us[:-1], kept.instants_us[1:]
        length = end - start
        near = length <= self.sums.hold_us
        believed = ~np.isnan(amount)
        trusted = ~self._distrusted(start, end)
        spans = cut(start, end, self.sums.grid)
        bad = np.flatnonzero(~(near & believed & trusted))
        rate = np.where(believed, amount, 0.0) * MICROSECONDS / length
        add_constant(spans, rate, bad, self.sums.integral[0])
        add_covered(spans, bad, self.sums.covered_us)
        self.sums.rejected_us += int(spans.inside_us[near & ~(believed & trusted)].sum())
        self._settle_broken(start, end, near)
        self._note(kept, amount, trusted, spans.inside_us > 0)

    def _note(
        self,
        kept: Cells,
        amount: NDArray[np.float64],
        trusted: NDArray[np.bool_],
        touches: NDArray[np.bool_],
    ) -> None:
        """Note bridges, resets, and readings outside the period that its first or last step needs."""
        period = self.sums.grid.period
        start, end = kept.instants_us[:-1], kept.instants_us[1:]
        near = end - start <= self.sums.hold_us
        known = ~np.isnan(amount) & trusted
        within = (start >= period.start_us) & (end <= period.end_us)
        for step in np.flatnonzero(known & ~near & within).tolist():
            self.bridges.append(
                Bridge(self.sums.tag.name, int(start[step]), int(end[step]), float(amount[step]))
            )
        declared = np.zeros(start.size, dtype=np.bool_)
        for later in self.rule.later:
            declared |= later.exchanged & (start < later.from_us) & (end >= later.from_us)
        for step in np.flatnonzero(np.isnan(amount) & trusted & touches & ~declared).tolist():
            fell = bool(kept.values[step + 1] < kept.values[step])
            new = step + 1
            self.resets.append(
                Reset(int(start[step]), int(end[step]), fell, int(kept.file[new]), int(kept.line[new]))
            )
        used = np.flatnonzero(known & near & touches & ((start < period.start_us) | (end >= period.end_us)))
        for step in used.tolist():
            for reading in (step, step + 1):
                outside = not period.start_us <= kept.instants_us[reading] < period.end_us
                if outside and kept.file[reading] >= 0:
                    self.carried.append(kept.take(slice(reading, reading + 1)))

    def _settle_broken(
        self, start: NDArray[np.int64], end: NDArray[np.int64], near: NDArray[np.bool_]
    ) -> None:
        """Count noted rejected stretches in steps too long to be spread; drop those in other steps."""
        if not (self._broken_start_us.size and end.size):
            return
        settled = self._broken_start_us < end[-1]
        step = np.searchsorted(start, self._broken_start_us, side="right") - 1
        rejected = settled & ((step < 0) | ~near[np.minimum(np.maximum(step, 0), near.size - 1)])
        self.sums.reject(self._broken_start_us[rejected], self._broken_end_us[rejected])
        self._broken_start_us = self._broken_start_us[~settled]
        self._broken_end_us = self._broken_end_us[~settled]

    def _distrusted(self, start: NDArray[np.int64], end: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Find the steps that touch a distrusted stretch: their sum is not to be believed either."""
        touched = np.zeros(start.size, dtype=np.bool_)
        for from_us, until_us in self.distrust_us:
            touched |= (start < until_us) & (end > from_us)
        return touched
