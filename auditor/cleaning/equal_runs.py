"""Runs of exactly equal values across blocks: how long a signal has not moved at all."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from auditor.cleaning.cells import Cells
    from auditor.records.ticks import Example


@dataclass(frozen=True)
class EqualRun:
    """A run of equal values, from its first to its last sample."""

    value: float
    start_us: int
    last_us: int
    first: Example | None
    """The first sample; None when it lies in the period before."""
    last: Example | None


def extend_runs(
    open_run: EqualRun | None,
    cells: Cells,
    good: NDArray[np.intp] | None,
    example: Callable[[Cells, int], Example],
    at_least_us: int | None,
) -> tuple[EqualRun | None, list[EqualRun]]:
    """Continue the open run with further accepted samples.

    Parameters
    ----------
    open_run
        The run that the last sample so far belongs to.
    cells, good
        Further numbers in order of time, and the places of the accepted ones among them (None: all).
    example
        Makes an example of a cell.
    at_least_us
        Finished runs of this length are returned; None: none are asked for, which is cheaper.

    Returns
    -------
    tuple
        The run that the last sample belongs to now, and the finished runs.
    """
    values = cells.values if good is None else cells.values[good]
    if not values.size:
        return open_run, []

    def run(start: int, end: int) -> EqualRun:
        first, last = (start, end) if good is None else (int(good[start]), int(good[end]))
        instants = cells.instants_us
        return EqualRun(
            value=float(values[start]),
            start_us=int(instants[first]),
            last_us=int(instants[last]),
            first=example(cells, first),
            last=example(cells, last),
        )

    starts, ends = _runs(values)
    if at_least_us is None:
        chosen = np.unique([0, starts.size - 1])
    else:
        first, last = (starts, ends) if good is None else (good[starts], good[ends])
        lasting = cells.instants_us[last] - cells.instants_us[first] >= at_least_us
        lasting[0] = lasting[-1] = True
        chosen = np.flatnonzero(lasting)
    runs = [run(int(starts[index]), int(ends[index])) for index in chosen]
    runs[0] = _joined(open_run, runs[0])
    if at_least_us is None:
        return runs[-1], []
    finished = [] if open_run is None or runs[0].start_us == open_run.start_us else [open_run]
    finished += runs[:-1]
    return runs[-1], [run for run in finished if run.last_us - run.start_us >= at_least_us]


def _runs(values: NDArray[np.float64]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return the first and last index of each run of two or more, and of the very first and last run."""
    equal = np.flatnonzero(values[1:] == values[:-1])
    heads = np.flatnonzero(np.diff(equal, prepend=-2) != 1)
    starts = equal[heads]
    ends = equal[np.append(heads[1:], equal.size) - 1] + 1 if equal.size else equal
    if not equal.size or starts[0] != 0:
        starts, ends = np.append(0, starts), np.append(0, ends)
    if ends[-1] != values.size - 1:
        starts, ends = np.append(starts, values.size - 1), np.append(ends, values.size - 1)
    return starts, ends


def _joined(open_run: EqualRun | None, run: EqualRun) -> EqualRun:
    if open_run is None or open_run.value != run.value:
        return run
    return EqualRun(run.value, open_run.start_us, run.last_us, open_run.first, run.last)
