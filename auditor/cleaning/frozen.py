"""Sensors that stand still while their machine runs: whole ticks are taken out of the covered ones."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.dated import stamp_shift_us
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.cells import CellBook
    from auditor.cleaning.equal_runs import EqualRun
    from auditor.cleaning.settings import CleaningSettings
    from auditor.cleaning.tally import Tally
    from auditor.records.machines import Running

_HALF_OF_THE_TICK = 0.5


@dataclass(frozen=True)
class FrozenStretch:
    """A stretch of ticks taken out because the value did not move."""

    tag: str
    start_us: int
    end_us: int
    value: float
    """SI."""
    cells: int
    covered_us: int
    """Time that was covered before."""
    run: EqualRun


def running_ticks(running: Running, tally: Tally) -> NDArray[np.bool_]:
    """Tell for each tick whether a machine runs, by the tag that its running rule names.

    A tick runs if its mean is above the limit, or more than half of its covered time is spent in the
    state. A tick without cover does not count as running.
    """
    covered = tally.sums.covered_us
    column = tally.tag.tick_columns.index(running.tick_column)
    limit = _HALF_OF_THE_TICK if running.above is None else running.above
    result: NDArray[np.bool_] = (covered > 0) & (tally.sums.integral[column] > limit * covered)
    return result


def take_out_frozen(
    tallies: Mapping[str, Tally], settings: CleaningSettings, book: CellBook
) -> list[FrozenStretch]:
    """Reject values that stay exactly equal for too long while a machine that uses them runs.

    The limit is the tag's ``frozen_after``; only covered time counts in which one of its machines runs, so
    that a plant at rest is not tested. Rejected are the ticks from the first running tick of the run of
    equal values to its end: their time moves from covered to rejected, their used cells to frozen. A value
    carried over from the period before has been equal since then; that time counts if the machine runs in
    the first tick of the period.
    """
    runs = {name: running_ticks(rule, tallies[rule.tag]) for name, rule in settings.running.items()}
    found: list[FrozenStretch] = []
    for name, tally in tallies.items():
        users = settings.users.get(name, ())
        if tally.runs and users:
            running = np.logical_or.reduce([runs[machine] for machine in users])
            for run in tally.runs:
                found += _take_out(tally, run, running, book)
    return found


def _take_out(
    tally: Tally, run: EqualRun, running: NDArray[np.bool_], book: CellBook
) -> Sequence[FrozenStretch]:
    grid, sums = tally.grid, tally.sums
    tick_us = grid.tick_s * MICROSECONDS
    origin = grid.period.start_us + stamp_shift_us(tally.tag)
    first, last = (run.start_us - origin) // tick_us, (run.last_us - origin) // tick_us
    ticks = slice(max(first, 0), max(min(last + 1, grid.ticks), 0))
    tested_us = int(sums.covered_us[ticks][running[ticks]].sum())
    if not tested_us:
        return ()
    if first < 0 and running[0]:
        tested_us += origin - run.start_us
    if tested_us < round((tally.tag.frozen_after_s or 0.0) * MICROSECONDS):
        return ()
    if tally.tag.between in ("line", "step"):
        # Until the first live sample its place is held, or led up to, by a frozen one.
        live = np.flatnonzero(sums.samples[ticks.stop :] > 0)
        ticks = slice(ticks.start, ticks.stop + (int(live[0]) if live.size else 0))
    ticks = slice(ticks.start + int(np.argmax(running[ticks])), ticks.stop)
    cells, covered_us = sums.take_out(ticks)
    examples = tuple(example for example in (run.first, run.last) if example is not None)
    book.move(tally.tag.name, Disposition.USED, Disposition.FROZEN, cells, examples)
    start_us = grid.period.start_us + ticks.start * tick_us
    end_us = grid.period.start_us + ticks.stop * tick_us
    return (FrozenStretch(tally.tag.name, start_us, end_us, run.value, cells, covered_us, run),)
