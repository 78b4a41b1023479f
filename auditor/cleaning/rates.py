"""Values that changed faster than they can."""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.plant import ChangeRule

_FIRST_LOOK = 64


def slow_enough(
    values: NDArray[np.float64], instants_us: NDArray[np.int64], rule: ChangeRule, hold_us: int
) -> NDArray[np.bool_]:
    """Tell which samples lie within reach of the last believed sample before them.

    Within the time that the limit names (a minute of ``5 K/min``) the value may change by the whole size,
    over a longer time in proportion: so that scatter and the steps of the last digit are no fast change.
    The first sample is believed, and so is the first one more than a hold after the last believed one: a
    real step is believed again as soon as there was time for it, after a hold at the latest.

    Parameters
    ----------
    values, instants_us : ndarray, shape (n,)
        Samples in order of time, one per stamp; SI.
    rule
        The declared limit.
    hold_us
        Longest time for which a sample is compared.

    Returns
    -------
    ndarray of bool, shape (n,)
        The loop runs over stretches that are not believed, not over samples.
    """
    believed = np.ones(values.size, dtype=np.bool_)
    if values.size < 2:  # nothing to compare
        return believed
    earlier = _Samples(values[:-1], instants_us[:-1])
    suspects = np.flatnonzero(~_reached(earlier, _Samples(values[1:], instants_us[1:]), rule, hold_us)) + 1
    samples = _Samples(values, instants_us)
    # Mostly a single sample is off and the one after it is within reach again: told for all at once.
    single = np.zeros(values.size, dtype=np.bool_)
    single[1:-1] = _reached(samples.part(0, -2), samples.part(2, values.size), rule, hold_us)
    resumed = 0
    for place, only_one in zip(suspects.tolist(), single[suspects].tolist(), strict=True):
        # A step inside a stretch that is not believed says nothing: it is not from the last believed one.
        if place <= resumed:
            continue
        resumed = place + 1 if only_one else _next_believed(samples, place - 1, rule, hold_us)
        believed[place:resumed] = False
    return believed


class _Samples(NamedTuple):
    values: NDArray[np.float64]
    instants_us: NDArray[np.int64]

    def part(self, start: int, stop: int) -> _Samples:
        return _Samples(self.values[start:stop], self.instants_us[start:stop])


def _next_believed(samples: _Samples, base: int, rule: ChangeRule, hold_us: int) -> int:
    """Return the first sample after ``base`` that it reaches; the number of samples where there is none."""
    start, length = base + 1, _FIRST_LOOK
    own = samples.part(base, base + 1)
    while start < samples.values.size:
        hit = np.flatnonzero(_reached(own, samples.part(start, start + length), rule, hold_us))
        if hit.size:
            return start + int(hit[0])
        start, length = start + length, 2 * length
    return int(samples.values.size)


def _reached(before: _Samples, after: _Samples, rule: ChangeRule, hold_us: int) -> NDArray[np.bool_]:
    elapsed_us = after.instants_us - before.instants_us
    share = np.maximum(elapsed_us / (rule.within_s * MICROSECONDS), 1.0)
    reached: NDArray[np.bool_] = np.abs(after.values - before.values) <= rule.size * share
    return reached | (elapsed_us > hold_us)
