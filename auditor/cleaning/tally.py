"""One tag on its way from rows to ticks: what it remembers from one piece of its export to the next."""

from __future__ import annotations

from typing import TYPE_CHECKING, Literal

import numpy as np

from auditor.cleaning.cells import Cells
from auditor.cleaning.chain import Chain, broken_chain
from auditor.cleaning.conflicts import Conflicts, conflicts_of
from auditor.cleaning.counter_sums import CounterSums
from auditor.cleaning.dated import stamp_shift_us
from auditor.cleaning.equal_runs import EqualRun, extend_runs
from auditor.cleaning.events import Event, EventLog
from auditor.cleaning.impossible_zeros import zero_marks
from auditor.cleaning.judge import Judged, ends_of, judge
from auditor.cleaning.range_ends import range_end_marks
from auditor.cleaning.spans import cut
from auditor.cleaning.sums import Isolated, Sums
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition
from auditor.records.ticks import CarryOver, SecondKind

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from auditor.cleaning.cells import CellBook
    from auditor.cleaning.counter_sums import Reset
    from auditor.cleaning.spans import Spans
    from auditor.cleaning.view import Events, View
    from auditor.records.period import Grid
    from auditor.records.plant import Distrust, Tag
    from auditor.records.ticks import Bridge


class Tally:
    """Sums, ledgers and memory of one tag; local to one call of ``clean``."""

    def __init__(self, tag: Tag, row_of: int, grid: Grid, distrust: Sequence[Distrust]) -> None:
        self.tag = tag
        self.row_of = row_of
        self.grid = grid
        self.distrust_us = tuple(sorted((entry.start_us, entry.end_us) for entry in distrust))
        self.sums = Sums(tag, grid)
        self.counter = CounterSums(self.sums, self.distrust_us) if tag.between == "counter" else None
        self.log = EventLog(grid, self.sums.hold_us)
        self.zeros = zero_marks(tag, grid)
        self.range_ends = range_end_marks(tag, grid)
        self.conflicts: list[Conflicts] = []
        self.runs: list[EqualRun] = []
        """Runs of equal values long enough to be suspicious."""
        self._run: EqualRun | None = None
        self._isolated: list[Isolated] = []
        self._end_us = grid.period.end_us + stamp_shift_us(tag)
        self._carried_us: int | None = None
        self._last_reading: tuple[int, float] | None = None

    def start_from(self, carry: CarryOver) -> None:
        """Begin with what the period before handed over; rows before it are not looked at again."""
        self._carried_us = carry.instant_us
        self.log.last = Event(carry.instant_us, carry.value, good=True, cell=None)
        self.log.first_us = carry.instant_us
        self._run = EqualRun(carry.value, carry.equal_since_us, carry.instant_us, None, None)
        if self.counter is not None:
            number = np.array([carry.value])
            instant = np.array([carry.instant_us], dtype=np.int64)
            place = np.array([-1], dtype=np.int32)
            self._last_reading = (carry.instant_us, carry.value)
            self.counter.add(Cells(instant, number, number, place, np.zeros(1, dtype=np.int64)))

    def absorb(self, view: View, book: CellBook, doubts: NDArray[np.int8] | None = None) -> None:
        """Take a piece of the export; ``doubts`` are the samples that their neighbours speak against."""
        judged = judge(view, self.row_of, self.tag, self.distrust_us, self._carried_us, doubts)
        cells = self._cells(view)
        self._enter(view, judged, cells, book)
        if judged.resolved is not None:
            self.conflicts += conflicts_of(view, judged.resolved, cells, self.sums.hold_us, self.tag)
        ends = ends_of(judged.event, len(cells))
        if ends is None:
            return
        self._forget_carry_read_again(int(view.rows.instants_us[ends[0]]), judged, ends[0])
        events = view.events(judged.event, None if self.log.last is None else self.log.last.instant_us)
        self.log.note(events)
        good = None if judged.good is None else np.flatnonzero(judged.good)
        self._note_runs(cells, good, book)
        if self.counter is None:
            self._spread(view, judged, events, book)
        else:
            self._reject_between(self.counter, events, self._goodness(judged, len(cells)))
            self._settle(self.counter, cells if good is None else cells.take(good), book, final=False)
        self.log.last = self._last_event(cells, judged, ends[1], book)

    def finish(self, book: CellBook) -> None:
        """Close the last stretch, and settle what waited for later samples or the native step."""
        if self.log.last is not None:
            self._close(self.log.last, book)
        if self.counter is not None:
            self._settle(self.counter, None, book, final=True)
            self.counter.reject_rest()
        native_us = self.log.native_us
        if native_us is not None and self._isolated:
            first_us = self.sums.add_isolated(self._isolated, min(native_us, self.sums.hold_us))
            if self.log.first_us is not None and first_us is not None:
                self.log.first_us = min(self.log.first_us, first_us)
        if self._run is not None and self._frozen_us is not None:
            self.runs += [self._run] if self._run.last_us - self._run.start_us >= self._frozen_us else []
        self.log.close()

    @property
    def carry(self) -> CarryOver | None:
        """What the next period must know; None when nothing was ever accepted."""
        if self._run is None:
            return None
        if self.counter is None or self._last_reading is None:
            return CarryOver(self._run.last_us, self._run.value, self._run.start_us)
        instant_us, value = self._last_reading
        since_us = self._run.start_us if self._run.value == value else instant_us
        return CarryOver(instant_us, value, min(since_us, instant_us))

    def seconds(self) -> list[int]:
        """Return the microseconds of the period by :class:`SecondKind`; their sum is its length.

        Raises
        ------
        RuntimeError
            If more time was given away than there is: a fault of the program.
        """
        covered = int(self.sums.covered_us.sum())
        rejected = self.sums.rejected_us
        never = self.log.never_logged_us()
        stale = self.grid.period.end_us - self.grid.period.start_us - covered - rejected - never
        if min(stale, rejected, never) < 0:
            raise RuntimeError(f"the ledger of seconds of {self.tag.name} does not add up")
        kinds = {
            SecondKind.COVERED: covered,
            SecondKind.STALE: stale,
            SecondKind.REJECTED: rejected,
            SecondKind.NEVER_LOGGED: never,
        }
        return [kinds[kind] for kind in SecondKind]

    @property
    def native_step_s(self) -> float:
        """Median time between what was logged [s]; NaN with fewer than two events."""
        native_us = self.log.native_us
        return np.nan if native_us is None else native_us / MICROSECONDS

    @property
    def bridges(self) -> list[Bridge]:
        """Counter differences over gaps too long to be spread."""
        return [] if self.counter is None else self.counter.bridges

    @property
    def resets(self) -> list[Reset]:
        """Steps of a counter that were not believed."""
        return [] if self.counter is None else self.counter.resets

    @property
    def _frozen_us(self) -> int | None:
        """How long a value may stay exactly equal; None where that is not suspicious.

        States and values stored only when they change are equal for good reason.
        """
        if self.tag.frozen_after_s is None or self.tag.stands_by_design:
            return None
        return round(self.tag.frozen_after_s * MICROSECONDS)

    def _cells(self, view: View) -> Cells:
        rows = view.rows
        values = view.numbers[self.row_of, 1:]
        return Cells(rows.instants_us, values, rows.raw[self.row_of], rows.file, rows.line)

    def _enter(self, view: View, judged: Judged, cells: Cells, book: CellBook) -> None:
        """Enter the numbers of a piece in the ledger of cells; a counter's used ones wait to be settled."""
        used = None if judged.codes is None else judged.codes == Disposition.USED
        if self.counter is None:
            ends = ends_of(used, len(cells))
            if ends is not None:
                count = len(cells) if used is None else int(np.count_nonzero(used))
                book.enter_stretch(self.tag.name, Disposition.USED, cells, count, ends)
                self._count_samples(view, used)
        if judged.codes is None or used is None:
            return
        others = judged.codes[~used]
        others = others[others >= 0]
        for kind in np.unique(others).tolist() if others.size else ():
            at = np.flatnonzero(judged.codes == kind)
            book.enter(self.tag.name, Disposition(kind), cells, at)

    def _count_samples(self, view: View, used: NDArray[np.bool_] | None) -> None:
        counts = view.tick_counts(stamp_shift_us(self.tag))
        if not counts.ticks.size:
            return
        if used is None:
            used = np.ones(view.rows.instants_us.size, dtype=np.bool_)
        inside = used if counts.inside is None else used[counts.inside]
        self.sums.samples[counts.ticks] += np.add.reduceat(inside, counts.first_row, dtype=np.int32)

    def _forget_carry_read_again(self, first_us: int, judged: Judged, row: int) -> None:
        """Drop what was handed over when the same sample is read again."""
        if self._carried_us is None or first_us != self._carried_us or self.log.last is None:
            return
        if self.log.last.instant_us == first_us and self.log.last.cell is None:
            self.log.last = None
            if self.counter is not None and (judged.good is None or judged.good[row]):
                self.counter.waiting = None

    def _note_runs(self, cells: Cells, good: NDArray[np.intp] | None, book: CellBook) -> None:
        end = int(np.searchsorted(cells.instants_us, self._end_us, side="left"))
        if end < len(cells):
            good = np.arange(end) if good is None else good[good < end]
        self._run, finished = extend_runs(self._run, cells, good, book.example, self._frozen_us)
        self.runs += finished

    def _goodness(self, judged: Judged, count: int) -> NDArray[np.bool_] | None:
        """Tell which of a piece's events are accepted, the event before them included; None: all."""
        before = self.log.last
        if judged.good is None and (before is None or before.good):
            return None
        if judged.good is None:
            good = np.ones(count, dtype=np.bool_)
        else:
            good = judged.good if judged.event is None else judged.good[judged.event]
        return good if before is None else np.concatenate(([before.good], good))

    def _spread(self, view: View, judged: Judged, events: Events, book: CellBook) -> None:
        """Spread the values of a piece over the ticks."""
        before = self.log.last
        count = view.rows.instants_us.size
        numbers = view.numbers[self.row_of]
        if judged.event is not None:
            head = [] if before is None else [before.value]
            values = np.concatenate((head, numbers[1:][judged.event]))
        elif before is None:
            values = numbers[1:]
        else:
            numbers[0] = before.value
            values = numbers
        chain = Chain(events.instants_us, values, self._goodness(judged, count))
        for marks in (self.zeros, self.range_ends):
            if marks is not None:
                cells = self._cells(view)
                own = cells if judged.event is None else cells.take(judged.event)
                marks.note(chain, own, 0 if before is None else 1, book)
        self._isolated += self.sums.isolated(chain, leads=before is None)
        chain, spans = self._distrusted(chain, view.spans(events, self.sums.hold_us))
        covered = self.sums.add_chain(chain, spans)
        for instant_us in self.sums.from_outside(chain, spans, covered):
            self._carry_in(view, judged, instant_us, book)

    def _distrusted(self, chain: Chain, spans: Spans) -> tuple[Chain, Spans]:
        """Reject what a distrusted time leaves of a stretch it begins in; a mean goes by its stamp alone."""
        if not self.distrust_us or not self.sums.instantaneous:
            return chain, spans
        starts = [start for start, _ in self.distrust_us]
        rule: Literal["step", "line"] = "line" if self.tag.between == "line" else "step"
        broken = broken_chain(chain, starts, self.sums.hold_us, rule)
        if broken is None:
            return chain, spans
        return broken[0], cut(broken[0].instants_us[:-1], broken[1], self.grid)

    def _carry_in(self, view: View, judged: Judged, instant_us: int, book: CellBook) -> None:
        """Move a sample outside the period, which covers a part of it, to those carried in."""
        before = self.log.last
        if before is not None and instant_us == before.instant_us:
            example = before.cell
        else:
            rows = np.flatnonzero(view.rows.instants_us == instant_us)
            row = int(rows[0] if judged.good is None else rows[judged.good[rows]][0])
            example = book.example(self._cells(view), row)
        if example is not None:
            book.move(self.tag.name, Disposition.OUTSIDE_PERIOD, Disposition.CARRIED_IN, 1, (example,))

    def _reject_between(self, counter: CounterSums, events: Events, good: NDArray[np.bool_] | None) -> None:
        if good is None:
            return
        broken = np.flatnonzero(~good[:-1])
        start = events.instants_us[broken]
        counter.reject_if_uncovered(start, start + np.minimum(events.distance_us[broken], self.sums.hold_us))

    def _settle(self, counter: CounterSums, good: Cells | None, book: CellBook, *, final: bool) -> None:
        """Hand readings to the counter, and enter those whose fate is known."""
        settled = counter.add(good, final=final)
        if settled is None:
            return
        period = self.grid.period
        for kind, cells in ((Disposition.USED, settled.used), (Disposition.SPIKE, settled.spikes)):
            inside = (cells.instants_us >= period.start_us) & (cells.instants_us < period.end_us)
            own = cells.take(inside & (cells.file >= 0))
            book.enter(self.tag.name, kind, own)
            if kind == Disposition.USED and len(own):
                tick = (own.instants_us - period.start_us) // (self.grid.tick_s * MICROSECONDS)
                first = np.flatnonzero(np.diff(tick, prepend=-1))
                self.sums.samples[tick[first]] += np.diff(first, append=tick.size)
        early = np.flatnonzero(settled.used.instants_us < period.end_us)
        if early.size:
            self._last_reading = (
                int(settled.used.instants_us[early[-1]]),
                float(settled.used.values[early[-1]]),
            )
        for cells in counter.carried:
            example = book.example(cells, 0)
            book.move(self.tag.name, Disposition.OUTSIDE_PERIOD, Disposition.CARRIED_IN, 1, (example,))
        counter.carried.clear()

    def _last_event(self, cells: Cells, judged: Judged, row: int, book: CellBook) -> Event:
        good = judged.good is None or bool(judged.good[row])
        instant_us = int(cells.instants_us[row])
        early = good and instant_us < self.grid.period.start_us
        return Event(instant_us, float(cells.values[row]), good, book.example(cells, row) if early else None)

    def _close(self, last: Event, book: CellBook) -> None:
        """Fill the stretch after the last event, as far as its hold reaches."""
        for marks in (self.zeros, self.range_ends):
            if marks is not None and last.good:
                marks.close(last.instant_us, last.value)
        instants = np.array([last.instant_us], dtype=np.int64)
        hold_end = instants + self.sums.hold_us
        if self.counter is not None:
            if not last.good:
                self.counter.reject_if_uncovered(instants, hold_end)
            return
        if not self.sums.instantaneous:
            good = np.array([last.good])
            self._isolated += self.sums.isolated_last(Chain(instants, np.array([last.value]), good))
            return
        if self.tag.between == "line":
            if not last.good:
                self.sums.reject(instants, hold_end)
            return
        chain = Chain(
            np.append(instants, hold_end), np.array([last.value, np.nan]), np.array([last.good, False])
        )
        chain, spans = self._distrusted(chain, cut(instants, hold_end, self.grid))
        covered = self.sums.add_chain(chain, spans)
        if last.cell is not None and self.sums.from_outside(chain, spans, covered):
            book.move(self.tag.name, Disposition.OUTSIDE_PERIOD, Disposition.CARRIED_IN, 1, (last.cell,))
