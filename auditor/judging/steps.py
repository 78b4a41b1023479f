"""Steps in a figure: a level that changes at once and stays changed."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.findings import Finding, FindingCode
from auditor.records.verdicts import Verdict

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.result import MachineJudgement

_FIGURES = ("gross", "heat")
_SIDE_US = 48 * 3_600_000_000
"""Length of record compared on each side of a candidate: whole days, so that each side has every hour."""
_NEAR_US = 6 * 3_600_000_000
"""Within this time of the best candidate a step is dated."""
_AT_ONCE_US = 5_400_000_000
"""The hour and a half on either side must show it too: ramps do not."""
_DAY_US = 86_400_000_000
_OTHER_DAYS = (-3, -2, -1, 1, 2, 3)
"""Days on which the same time of the day is looked at, to know what is usual then."""
_LEAST_INTERVALS = 60
"""Fewest intervals on each side."""
_LEAST_RELATIVE = 0.025
"""Smallest step reported, as a share of the level before it."""
_LEAST_SCORE = 6.0
"""Smallest ratio of the step to its own statistical uncertainty."""
_MAD_TO_SIGMA = 1.4826


@dataclass(frozen=True)
class Step:
    """A change of level between two neighbouring points of a series."""

    index: int
    """First point of the new level."""
    before: float
    after: float
    score: float
    """Height of the step over its statistical uncertainty [1]."""


def steps_in_figures(machine: Machine, balance: MachineBalance, judgement: MachineJudgement) -> list[Finding]:
    """Find the steps of the gross and heat efficiency of one machine over credible intervals.

    The finding carries the level before and after; its energy is the change of input at equal output
    from the step to the next one, or to the end of the period.
    """
    figures = balance.interval
    usable = np.isin(judgement.verdict, (Verdict.CREDIBLE, Verdict.NO_CEILING, Verdict.IMPLAUSIBLE))
    found = []
    for key in _FIGURES:
        series = figures.values.get(key)
        if series is None:
            continue
        good = usable & np.isfinite(series)
        times = figures.start_us[good]
        steps = largest_steps(times, series[good])
        ends_us = [*(int(times[step.index]) for step in steps[1:]), int(figures.end_us[-1])]
        for step, end_us in zip(steps, ends_us, strict=False):
            start_us = int(times[step.index])
            found.append(
                Finding(
                    FindingCode.STEP_IN_FIGURE,
                    machine=machine.name,
                    start_us=start_us,
                    end_us=end_us,
                    energy_J=_input_change_J(balance, key, step, (start_us, end_us)),
                    numbers={"before": step.before, "after": step.after, "score": step.score},
                    words={"figure": key},
                )
            )
    return found


def largest_steps(times_us: NDArray[np.int64], values: NDArray[np.float64], at_most: int = 3) -> list[Step]:
    """Pick the clearest steps of a series, none within the compared record of another.

    For each candidate the medians of the two days before and after are compared; their
    difference over the robust scatter of both sides is the score. A step must also be seen between the
    hour and a half on either side of it, beyond what is usual at that time of the day (a ramp or the
    sunrise is none), and must be 2.5 % of the level at least.
    """
    candidates = [
        step for index in _candidates(times_us, values) if (step := _step_at(times_us, values, index))
    ]
    chosen: list[Step] = []
    for step in sorted(candidates, key=lambda candidate: -candidate.score):
        at_us = times_us[step.index]
        if all(abs(at_us - times_us[other.index]) > _SIDE_US for other in chosen):
            chosen.append(_dated(times_us, values, step))
        if len(chosen) == at_most:
            break
    return sorted(chosen, key=lambda step: step.index)


def _candidates(times_us: NDArray[np.int64], values: NDArray[np.float64]) -> list[int]:
    """Points at which means, which are quick, already show half of the smallest step, slowly and at once."""
    sums = np.concatenate(([0.0], np.cumsum(values)))
    place = np.arange(values.size)

    def change(side_us: int) -> NDArray[np.float64]:
        first = np.searchsorted(times_us, times_us - side_us)
        last = np.searchsorted(times_us, times_us + side_us)
        before = (sums[place] - sums[first]) / np.maximum(place - first, 1)
        after = (sums[last] - sums[place]) / np.maximum(last - place, 1)
        size: NDArray[np.float64] = np.abs(after - before)
        return size

    least = 0.5 * _LEAST_RELATIVE * np.abs(values)
    shown = (change(_SIDE_US) > least) & (change(_AT_ONCE_US) > least)
    inside = (place >= _LEAST_INTERVALS) & (place < values.size - _LEAST_INTERVALS)
    return [int(index) for index in np.flatnonzero(shown & inside)]


def _step_at(times_us: NDArray[np.int64], values: NDArray[np.float64], index: int) -> Step | None:
    at_us = times_us[index]
    first = int(np.searchsorted(times_us, at_us - _SIDE_US))
    last = int(np.searchsorted(times_us, at_us + _SIDE_US))
    if index - first < _LEAST_INTERVALS or last - index < _LEAST_INTERVALS:
        return None
    left, right = values[first:index], values[index:last]
    before, after = float(np.median(left)), float(np.median(right))
    height = after - before
    if abs(height) < _LEAST_RELATIVE * abs(before):
        return None
    sigma = _MAD_TO_SIGMA * 0.5 * (np.median(np.abs(left - before)) + np.median(np.abs(right - after)))
    floor = 1e-3 * abs(before)
    score = abs(height) / (max(float(sigma), floor) * np.sqrt(1.0 / left.size + 1.0 / right.size))
    if score < _LEAST_SCORE or not _sudden(times_us, values, index, height):
        return None
    return Step(index, before, after, float(score))


def _dated(times_us: NDArray[np.int64], values: NDArray[np.float64], step: Step) -> Step:
    """Move a step to where the points part best between the two levels (least absolute deviations)."""
    at_us = times_us[step.index]
    first = int(np.searchsorted(times_us, at_us - _NEAR_US))
    last = int(np.searchsorted(times_us, at_us + _NEAR_US))
    near = values[first:last]
    as_before = np.concatenate(([0.0], np.cumsum(np.abs(near - step.before))))
    as_after = np.concatenate(([0.0], np.cumsum(np.abs(near - step.after)[::-1])))[::-1]
    return replace(step, index=first + int(np.argmin(as_before + as_after)))


def _sudden(times_us: NDArray[np.int64], values: NDArray[np.float64], index: int, height: float) -> bool:
    """Whether the change happens at once, and not only as it does at this time of every day."""
    at_us = int(times_us[index])
    here = _at_once(times_us, values, at_us)
    if not np.isfinite(here):
        return False
    other_days = np.array([_at_once(times_us, values, at_us + days * _DAY_US) for days in _OTHER_DAYS])
    known = other_days[np.isfinite(other_days)]
    beyond_usual = here - (float(np.median(known)) if known.size else 0.0)
    return beyond_usual * height > 0.0 and abs(beyond_usual) > 0.6 * abs(height)


def _at_once(times_us: NDArray[np.int64], values: NDArray[np.float64], at_us: int) -> float:
    """Median of the hour and a half from a moment on, less that of the hour and a half before it."""
    first, middle, last = np.searchsorted(times_us, (at_us - _AT_ONCE_US, at_us, at_us + _AT_ONCE_US))
    if middle - first < 4 or last - middle < 4:
        return float("nan")
    return float(np.median(values[middle:last]) - np.median(values[first:middle]))


def _input_change_J(
    balance: MachineBalance, key: str, step: Step, stretch_us: tuple[int, int]
) -> float | None:
    """Input that the same output takes after the step less before it, over a stretch of time."""
    figures = balance.interval
    output = figures.values.get({"gross": "work_gross_W", "heat": "useful_heat_W"}[key])
    if output is None or step.before <= 0.0 or step.after <= 0.0:
        return None
    later = (figures.start_us >= stretch_us[0]) & (figures.start_us < stretch_us[1])
    length_s = (figures.end_us - figures.start_us) / 1e6
    energy_J = float(np.nansum((output * length_s)[later]))
    return abs(energy_J * (1.0 / step.after - 1.0 / step.before))
