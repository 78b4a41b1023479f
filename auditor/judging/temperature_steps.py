"""Temperatures inside their believable range whose level changes at once as a change of unit would."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.ratio_steps import level_change
from auditor.judging.series import tag_means
from auditor.judging.steps import largest_steps
from auditor.judging.units import TEMPERATURE_SCALES, is_declared_unit
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import FlowAndTemperatures, FlueGasHeat

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import NDArray

    from auditor.records.machines import Machine
    from auditor.records.plant import Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

_SAME_MOMENT_US = 6 * 3_600_000_000
_FINEST_K = 0.2
"""A level is not taken as known better than this: the last digit of a temperature."""
_KNOWN = 0.25
"""The shift must be known to this share of itself, else nothing is said."""


@dataclass(frozen=True)
class _Shift:
    """A step of one tag, and the unit that would explain it."""

    at_us: int
    before_K: float
    after_K: float
    U_K: float
    unit: str
    """Unit of the odd side of the step; empty if none fits."""
    odd_after: bool
    """Whether the readings after the step are the odd ones, not those before it."""


def temperature_questions(
    machines: Mapping[str, Machine], tags: Mapping[str, Tag], ticks: TickTable, powers: PowerTable
) -> list[Finding]:
    """Ask about temperatures that step as from degrees Celsius to Fahrenheit or kelvin would make them.

    Only while the machine runs; and only where the other temperature of the same exchanger does not step
    at the same moment too, unless by the same change of unit.
    """
    shifts: dict[str, list[_Shift]] = {}
    found: dict[tuple[str, int], Finding] = {}
    for machine in machines.values():
        running = powers.running[machine.name] == 1.0
        for stream in machine.streams.values():
            if not isinstance(stream.way, FlowAndTemperatures | FlueGasHeat):
                continue
            names = [name for name in (stream.way.inlet, stream.way.outlet) if name is not None]
            for name in names:
                if name not in shifts:
                    shifts[name] = _shifts(tags[name], ticks, running)
            for name in names:
                others = [shift for other in names if other != name for shift in shifts[other]]
                for shift in shifts[name]:
                    if shift.unit and not _moved_too(shift, others):
                        other = next((each for each in names if each != name), "")
                        finding = _finding(tags[name], other, machine, shift, ticks)
                        found.setdefault((name, shift.at_us), finding)
    return list(found.values())


def _moved_too(shift: _Shift, others: list[_Shift]) -> bool:
    return any(
        abs(other.at_us - shift.at_us) <= _SAME_MOMENT_US and other.unit != shift.unit for other in others
    )


def _shifts(tag: Tag, ticks: TickTable, running: NDArray[np.bool_]) -> list[_Shift]:
    if tag.quantity != "temperature":
        return []
    grid = ticks.grid
    values = tag_means(ticks, tag.name)
    good = np.isfinite(values) & running
    edges = np.arange(0, grid.ticks, grid.ticks_per_interval)
    count = np.add.reduceat(good.astype(np.float64), edges)
    enough = count >= 0.8 * grid.ticks_per_interval
    means_K = np.add.reduceat(np.where(good, values, 0.0), edges)[enough] / count[enough]
    times_us = grid.start_us[edges][enough]
    found = []
    for step in largest_steps(times_us, means_K):
        before_K, after_K, U_K = level_change(times_us, means_K, step.index)
        if math.isnan(U_K):
            continue
        unit, odd_after = _unit_of(tag, before_K, after_K, max(U_K, _FINEST_K))
        found.append(_Shift(int(times_us[step.index]), before_K, after_K, U_K, unit, odd_after))
    return found


def _unit_of(tag: Tag, before_K: float, after_K: float, U_K: float) -> tuple[str, bool]:
    """Find the unit in which one side of a step would mean the same as the other side as declared."""
    for unit, (scale, offset) in TEMPERATURE_SCALES.items():
        if is_declared_unit(tag, scale, offset):
            continue
        for odd_after, true_K, odd_K in ((True, before_K, after_K), (False, after_K, before_K)):
            # The raw number that the true level has in the other unit, read as declared.
            expected_K = tag.scale * (true_K - offset) / scale + tag.offset
            shift_K = abs(expected_K - true_K)
            # U of the levels grows with the steeper unit.
            allowed_K = U_K * max(tag.scale / scale, 1.0)
            if allowed_K <= _KNOWN * shift_K and abs(odd_K - expected_K) <= allowed_K:
                return unit, odd_after
    return "", True


def _finding(tag: Tag, other: str, machine: Machine, shift: _Shift, ticks: TickTable) -> Finding:
    period = ticks.grid.period
    stretch_us = (shift.at_us, period.end_us) if shift.odd_after else (period.start_us, shift.at_us)
    return Finding(
        FindingCode.UNIT_SUSPECTED,
        tag=tag.name,
        machine=machine.name,
        start_us=stretch_us[0],
        end_us=stretch_us[1],
        numbers={
            "before": shift.before_K,
            "after": shift.after_K,
            "shift_U_K": shift.U_K,
        },
        words={
            "evidence": "temperature step",
            "unit": shift.unit,
            "declared": tag.unit,
            "other": other,
        },
        suspects=(tag.name,),
    )
