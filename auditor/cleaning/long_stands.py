"""Tags that are not tested for standing still, and stood still for much longer than they usually do."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.frozen import running_ticks
from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.settings import CleaningSettings
    from auditor.cleaning.tally import Tally

TIMES_ITS_USUAL = 20
"""A tag that stands so many times longer than its usual longest stand of a day raises a question. Common
practice, no source; it rejects nothing."""
_SHORTEST_S = 3600.0
_FEWEST_DAYS = 3
"""Days on which it ran, before anything can be called usual."""
_SAME = 1e-12
"""Relative difference of tick means of one and the same value: sums of the same number, rounded."""


@dataclass(frozen=True)
class LongStand:
    """The longest stand of a tag while a machine that uses it ran."""

    tag: str
    start_us: int
    end_us: int
    usual_s: float
    """Median over the days of the longest stand of each [s]."""
    value: float
    """SI."""


def long_stands(tallies: Mapping[str, Tally], settings: CleaningSettings) -> list[LongStand]:
    """Find the tags without ``frozen_after`` whose longest stand is far out of their own habit.

    Looked at are the means of ticks in which one of its machines runs. States, counters, amounts and values
    stored only when they change stand still for good reason.
    """
    found = []
    runs = {name: running_ticks(rule, tallies[rule.tag]) for name, rule in settings.running.items()}
    for name, tally in tallies.items():
        tag, users = tally.tag, settings.users.get(name, ())
        if not users or tag.frozen_after_s is not None or tag.stands_by_design:
            continue
        if tag.between in ("line", "step", "mean"):
            found += _long_stand(tally, np.logical_or.reduce([runs[machine] for machine in users]))
    return found


def _long_stand(tally: Tally, running: NDArray[np.bool_]) -> list[LongStand]:
    sums, grid = tally.sums, tally.grid
    live = running & (sums.covered_us > 0)
    mean = np.full(grid.ticks, np.nan)
    np.divide(sums.integral[0], sums.covered_us, out=mean, where=live)
    same = np.abs(np.diff(mean)) <= _SAME * np.abs(mean[1:])
    # Ticks of one stand share a number; a tick that differs from the one before, or is not live, begins anew.
    stand = np.concatenate(([0], np.cumsum(~same)))
    ticks_of = np.bincount(stand, weights=live).astype(np.int64)
    length = ticks_of[stand] * live
    tick_us = grid.tick_s * MICROSECONDS
    edges = -(-(grid.day_start_us - grid.period.start_us) // tick_us)
    days = zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True)
    daily = [int(length[start:stop].max()) for start, stop in days if live[start:stop].any()]
    longest = int(np.argmax(length))
    ticks = int(length[longest])
    if tally.tag.cut_off is not None and mean[longest] == 0.0:
        return []
    usual_s = float(np.median(daily)) * grid.tick_s if len(daily) >= _FEWEST_DAYS else np.inf
    if ticks * grid.tick_s < max(_SHORTEST_S, TIMES_ITS_USUAL * usual_s):
        return []
    start_us = grid.period.start_us + longest * tick_us
    return [LongStand(tally.tag.name, start_us, start_us + ticks * tick_us, usual_s, float(mean[longest]))]
