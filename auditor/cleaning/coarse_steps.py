"""Counters whose smallest step is large against what they count in one interval."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.frozen import running_ticks

if TYPE_CHECKING:
    from auditor.cleaning.settings import CleaningSettings
    from auditor.cleaning.tally import Tally

COARSE = 0.05
"""Share of an interval's amount that one step of its counter may be. Common practice, no source."""


@dataclass(frozen=True)
class CoarseSteps:
    """A counter that an interval of the audit is too short for."""

    tag: str
    step: float
    """SI."""
    usual_rate: float
    """Mean while a machine that uses it runs [SI/s]."""
    interval_s: float
    share: float
    """One step over what is counted in an interval [1]: what the difference of two readings may be off by."""
    smallest_interval_s: float
    """Interval in which one step is :data:`COARSE` of what is counted."""


def coarse_steps(tallies: Mapping[str, Tally], settings: CleaningSettings) -> list[CoarseSteps]:
    """Find the counters of declared resolution that are too coarse for the interval of the audit.

    The difference of two readings is off by less than one step q either way, a rate over the time t by less
    than ``q / t``: of 1 kWh read every minute 60 kW.
    """
    found = []
    runs = {name: running_ticks(rule, tallies[rule.tag]) for name, rule in settings.running.items()}
    for name, tally in tallies.items():
        tag, users = tally.tag, settings.users.get(name, ())
        if tag.between != "counter" or tag.resolution is None or not users:
            continue
        running = np.logical_or.reduce([runs[machine] for machine in users])
        covered_us = int(tally.sums.covered_us[running].sum())
        rate = float(tally.sums.integral[0][running].sum()) / covered_us if covered_us else 0.0
        if rate <= 0.0:
            continue
        interval_s = float(tally.grid.interval_s)
        share = tag.resolution / (rate * interval_s)
        if share > COARSE:
            found.append(
                CoarseSteps(name, tag.resolution, rate, interval_s, share, tag.resolution / (rate * COARSE))
            )
    return found
