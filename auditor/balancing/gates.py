"""Gates of an interval: does the machine run, at what load, and steadily; how long its intervals are."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from auditor.balancing.columns import Bools, Floats
    from auditor.balancing.masks import Steps
    from auditor.records.machines import Machine, Steady
    from auditor.records.plant import Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

_JITTER = 0.02
"""A native step this much longer than the interval is the interval with a jitter of stamps."""


def steps_per_interval(
    machine: Machine, powers: PowerTable, ticks: TickTable, tags: Mapping[str, Tag]
) -> tuple[int, str]:
    """Length of a machine's intervals in steps of the site's, and the tag that makes them longer.

    No figure is finer than its slowest input. A tag stored by exception (with a dead band) is known
    between its samples, however far apart they are, and makes nothing slower; nor does a state.

    Returns
    -------
    (steps, tag)
        The tag is empty when it is the site's interval.
    """
    slowest_s, slowest = 0.0, ""
    columns = dict.fromkeys(
        column for stream in machine.streams.values() for column in powers.inputs[stream.key]
    )
    for column in columns:
        place = ticks.column(column)
        tag = tags[ticks.tags[place]]
        if tag.deadband is not None or tag.between == "state":
            continue
        native_s = float(ticks.native_step_s[place])
        if native_s > slowest_s:
            slowest_s, slowest = native_s, tag.name
    steps = max(1, math.ceil(slowest_s / powers.grid.interval_s - _JITTER))
    return steps, slowest if steps > 1 else ""


def running_share(running: Floats, steps: Steps) -> Floats:
    """Share of the ticks of known state that run, by interval; NaN when none is known."""
    known = np.isfinite(running)
    count = steps.by_interval(steps.by_step(known))
    runs = steps.by_interval(steps.by_step(np.where(known, running, 0.0)))
    return _over(runs, count)


def load(machine: Machine, gross_W: Floats | None, intervals: int) -> Floats:
    """Mean gross power of each interval over rated power [1]; NaN without either."""
    if gross_W is None or machine.rated_power_W is None:
        return np.full(intervals, np.nan)
    return gross_W / machine.rated_power_W


def is_steady(steady: Steady | None, ticks: TickTable, steps: Steps, running: Floats) -> Bools:
    """Intervals around which the tag's interval means change by less than the limit.

    Compared are the means of all intervals whose middles lie no more than half of ``within_s`` from the
    interval's own (one neighbour on each side at least): the largest less the smallest must be below the
    limit. Means of intervals are looked at, so that a source that swings faster than an interval, as a
    furnace that reverses its fire does, is no hindrance while the output stays. A neighbour that stands
    still for a part of its time makes the interval unsteady; one that is not known is left out, but one at
    least must be known.

    Parameters
    ----------
    steady : Steady or None
        None: every interval is steady.
    ticks : TickTable
    steps : Steps
        Grouping of ticks into the machine's intervals.
    running : ndarray, shape (I,) [1]
        Running share of each interval.

    Returns
    -------
    ndarray of bool, shape (I,)
    """
    intervals = running.shape[0]
    if steady is None:
        return np.ones(intervals, dtype=bool)
    place = ticks.column(steady.tag)
    mean, weight_s = ticks.mean[:, place], ticks.covered_s[:, place]
    known = np.isfinite(mean) & (weight_s > 0.0)
    sums = steps.by_interval(steps.by_step(np.where(known, mean * weight_s, 0.0)))
    means = _over(sums, steps.by_interval(steps.by_step(np.where(known, weight_s, 0.0))))
    length_s = steps.steps_per_interval * steps.ticks_per_step * steps.tick_s
    reach = max(1, int(steady.within_s / 2.0 // length_s))
    high = _windows(means, reach, -np.inf).max(axis=1)
    low = _windows(means, reach, np.inf).min(axis=1)
    neighbours = _windows(np.isfinite(means).astype(np.float64), reach, 0.0).sum(axis=1) >= 2.0
    stops = (_windows(running, reach, np.inf) < 1.0).any(axis=1)
    steady_now: Bools = np.isfinite(means) & neighbours & (high - low < steady.change_below) & ~stops
    return steady_now


def _windows(values: Floats, reach: int, absent: float) -> Floats:
    """Each interval with its neighbours, shape (I, 2 reach + 1); ``absent`` for NaN and beyond the ends."""
    filled = np.where(np.isfinite(values), values, absent)
    padded = np.pad(filled, reach, constant_values=absent)
    windows: Floats = np.lib.stride_tricks.sliding_window_view(padded, 2 * reach + 1)
    return windows


def _over(top: Floats, bottom: Floats) -> Floats:
    result: Floats = np.full(top.shape, np.nan)
    return np.divide(top, bottom, out=result, where=bottom > 0.0)
