"""Successive readings of a counter: which stand, what they counted, where they fell."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

MARGIN = 1.1
"""A counter may run this much faster than its largest believable rate before it is not believed."""


@dataclass(frozen=True)
class CounterRule:
    """What is believable of a counter, in SI."""

    at_most: float | None
    """Largest believable rate [SI/s]; None: not declared."""
    full_scale: float | None
    """Reading at which it rolls over to zero; None: it is not known to roll over."""
    resolution: float | None
    """Smallest step; None: the smallest rise met so far takes its place."""


@dataclass(frozen=True)
class Readings:
    """Readings in order of time, each with the smallest rise met up to it."""

    instants_us: NDArray[np.int64]
    values: NDArray[np.float64]
    quanta: NDArray[np.float64]
    """Smallest rise from any reading to the very next one so far, those taken out since included:
    infinite before the first rise."""


@dataclass(frozen=True)
class Sifted:
    """What became of the readings. Indices point into the readings that were sifted."""

    kept: NDArray[np.intp]
    """Readings that stand, rising; the first reading always does."""
    amount: NDArray[np.float64]
    """Counted from each kept reading to the next, shape (kept - 1,); NaN where it is not known."""
    spikes: NDArray[np.intp]
    """Single readings that are off while their neighbours agree."""
    settled: int
    """Readings before this index are decided; later ones need the readings that follow them."""


def smallest_rises(before: float, quantum: float, values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Smallest rise met up to each of the readings that follow one of value ``before`` (NaN: none)."""
    rises = np.diff(values, prepend=before)
    smallest: NDArray[np.float64] = np.minimum.accumulate(np.where(rises > 0.0, rises, np.inf))
    return np.minimum(smallest, quantum)


def sift(readings: Readings, rule: CounterRule, *, final: bool) -> Sifted:
    """Decide which readings of a counter stand, and what was counted between them.

    A step from one reading to the next is believed if it rises by no more than ``1.1 * at_most`` times its
    length, plus one smallest step (a reading shows whole steps only); or if it falls and, with a declared
    full scale and largest rate, the roll-over that explains it is no faster than that. A single reading is
    off (a spike) if the steps into or out of it are not believed but the step from the reading before to
    the one after is: then only that reading is dropped, and the sum over the two steps is kept. Any other
    step that is not believed is a reset or an exchange of the meter: what was counted is not known, and the
    new reading is the base of the next step.

    Parameters
    ----------
    readings
        The first one stands already.
    rule
        What is believable.
    final
        False while more readings may follow: then the last two are left open, as the fate of a reading
        depends on two after it. The loop runs over steps that are not believed, not over readings.
    """
    steps = _Steps(readings, rule)
    count = readings.values.size
    settled = count if final else max(1, count - 2)
    found = [spike for spike in _spikes(steps) if spike < settled]
    spikes = np.array(found, dtype=np.intp)
    keep = np.ones(settled, dtype=np.bool_)
    keep[spikes] = False
    kept = np.flatnonzero(keep)
    return Sifted(kept, steps.amounts(kept[:-1], kept[1:]), spikes, settled)


def _spikes(steps: _Steps) -> list[int]:
    """Find the single readings that are off, as far as the readings after them tell.

    Each is judged from the last reading before it that stands, so that it does not matter whether spikes
    before that one have been taken out already.
    """
    doubtful = np.flatnonzero(~steps.believed(1)[:-1]) + 1
    if not doubtful.size:
        return []
    to_second = steps.believed(2).tolist()
    spikes: list[int] = []
    off: set[int] = set()
    for reading in doubtful.tolist():
        before = reading - 1
        if before in off:
            continue
        base = before - 1
        while base in off:
            base -= 1
        if base >= 0 and steps.believes(base, before) and steps.believes(base, reading):
            if not to_second[before]:
                spikes.append(before)
                off.add(before)
                continue
        if to_second[before]:
            spikes.append(reading)
            off.add(reading)
    return spikes


class _Steps:
    """Steps between readings, judged by the rule."""

    def __init__(self, readings: Readings, rule: CounterRule) -> None:
        self.times, self.values, self.quanta = readings.instants_us, readings.values, readings.quanta
        self.rule = rule

    def amounts(self, start: NDArray[np.intp], stop: NDArray[np.intp]) -> NDArray[np.float64]:
        """Return what was counted over each step; NaN where it is not believed."""
        rise = self.values[stop] - self.values[start]
        if self.rule.at_most is None:
            return np.where(rise >= 0.0, rise, np.nan)
        step = self.quanta[stop] if self.rule.resolution is None else self.rule.resolution
        seconds = (self.times[stop] - self.times[start]) / MICROSECONDS
        most = MARGIN * self.rule.at_most * seconds + np.where(np.isfinite(step), step, 0.0)
        if self.rule.full_scale is not None:
            rise = np.where(rise < 0.0, rise + self.rule.full_scale, rise)
        return np.where((rise >= 0.0) & (rise <= most), rise, np.nan)

    def believes(self, start: int, stop: int) -> bool:
        """Tell whether one step is believed."""
        return not bool(np.isnan(self.amounts(np.array([start]), np.array([stop]))[0]))

    def believed(self, stride: int) -> NDArray[np.bool_]:
        """Tell for each reading whether the step to the one ``stride`` later is believed (none: False)."""
        start = np.arange(max(0, self.times.size - stride))
        result = np.zeros(self.times.size, dtype=np.bool_)
        result[: start.size] = ~np.isnan(self.amounts(start, start + stride))
        return result
