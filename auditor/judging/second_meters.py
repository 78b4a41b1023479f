"""Two meters of the same thing, declared as such: whether they agree, and since when they do not."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.familiar import OF_FLOW, OF_POWER, Familiar, candidates, named
from auditor.judging.ratio_steps import RatioStep, level_change
from auditor.judging.series import Pair, interval_pair, tag_means
from auditor.judging.steps import largest_steps
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import Power, Role

if TYPE_CHECKING:
    from collections.abc import Mapping

    from auditor.records.machines import Machine
    from auditor.records.plant import Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

_LEAST_INTERVALS = 96
"""Fewest intervals compared: a day of quarter-hours."""
_FINEST = 1e-3
"""A ratio of two logged numbers is not taken as known better than this: their last digits."""


def second_meter_questions(
    tags: Mapping[str, Tag],
    machines: Mapping[str, Machine],
    ticks: TickTable,
    powers: PowerTable,
    coverage: float,
) -> list[Finding]:
    """Compare every tag with the one that it is declared to be a second meter of.

    Any step of their ratio is told, familiar or not; a steady ratio only where it differs from one by
    more than both calibrations allow and is a familiar one.
    """
    found: list[Finding] = []
    everywhere = np.ones(ticks.grid.ticks, dtype=bool)
    for tag in tags.values():
        other = tags.get(tag.same_quantity_as or "")
        if other is None:
            continue
        pair = interval_pair(
            ticks.grid, tag_means(ticks, tag.name), tag_means(ticks, other.name), everywhere, coverage
        )
        if pair.times_us.size < _LEAST_INTERVALS:
            continue
        net = _net_share(other, machines, powers, pair)
        found += _of_pair(tag, other, pair, net, ticks.grid.period.end_us)
    return found


def _of_pair(tag: Tag, other: Tag, pair: Pair, net: float, period_end_us: int) -> list[Finding]:
    ratio = pair.first / pair.second
    relative_U = 2.0 * math.hypot(_calibration(tag, pair.first), _calibration(other, pair.second))
    familiar = OF_POWER if other.si_unit in ("W", "J") else OF_FLOW
    steps = [_sized(pair, step.index) for step in largest_steps(pair.times_us, ratio)]
    if not steps:
        level = float(np.median(ratio))
        hits = candidates(level, level * max(relative_U, _FINEST), familiar)
        if _is_net(level, net, relative_U):
            hits = (Familiar("net or gross", 1.0 / net, 1.0 / net), *hits)
        if not hits:
            return []
        numbers = {"ratio": level, "ratio_U": level * relative_U, "familiar": hits[0].middle}
        return [_finding(tag, other, (int(pair.times_us[0]), period_end_us), numbers, hits)]
    ends_us = [*(int(pair.times_us[step.index]) for step in steps[1:]), period_end_us]
    found = []
    for step, end_us in zip(steps, ends_us, strict=True):
        hits = candidates(step.factor, step.factor_U, familiar)
        one_is_net = any(
            _is_net(level, net, relative_U) and abs(math.log(rest)) <= relative_U
            for level, rest in ((step.before, step.after), (step.after, step.before))
        )
        if one_is_net:
            hits = (Familiar("net or gross", 1.0 / net, 1.0 / net), *hits)
        numbers = {
            "ratio": step.factor,
            "ratio_U": step.factor_U,
            "before": step.before,
            "after": step.after,
        } | ({"familiar": hits[0].middle} if hits else {})
        found.append(_finding(tag, other, (int(pair.times_us[step.index]), end_us), numbers, hits))
    return found


def _sized(pair: Pair, index: int) -> RatioStep:
    """Size a step of two meters of one thing: at any load their ratio should be the same."""
    before, after, U = level_change(pair.times_us, np.log(pair.first / pair.second), index)
    factor = math.exp(after - before)
    U = _FINEST if math.isnan(U) else math.hypot(U, _FINEST)
    return RatioStep(index, math.exp(before), math.exp(after), factor, factor * U)


def _calibration(tag: Tag, values: np.ndarray) -> float:
    """Relative standard uncertainty of a tag's calibration at its usual value [1]."""
    usual = float(np.median(values))
    if tag.calibration is None or usual <= 0.0:
        return 0.0
    return math.hypot(tag.calibration.absolute / usual, tag.calibration.relative)


def _is_net(level: float, net: float, relative_U: float) -> bool:
    """Whether a ratio is that of net to gross power within U, and one is not."""
    return math.isfinite(net) and abs(math.log(level / net)) <= relative_U < abs(math.log(net))


def _net_share(gross: Tag, machines: Mapping[str, Machine], powers: PowerTable, pair: Pair) -> float:
    """Net over gross power of the machine whose gross power a tag measures, over the pair's intervals."""
    for machine in machines.values():
        work = [
            stream
            for stream in machine.streams_of(Role.WORK_OUT)
            if isinstance(stream.way, Power) and stream.way.tag == gross.name
        ]
        own = machine.streams_of(Role.OWN_USE)
        if len(work) != 1 or not own:
            continue
        indices = [powers.streams.index(stream.key) for stream in (*work, *own)]
        power_W = powers.power_W[:, indices]
        grid = powers.grid
        compared = np.isin(
            np.repeat(grid.start_us[:: grid.ticks_per_interval], grid.ticks_per_interval)[: grid.ticks],
            pair.times_us,
        )
        good = compared & np.isfinite(power_W).all(axis=1)
        gross_W = float(power_W[good, 0].sum())
        return 1.0 - float(power_W[good, 1:].sum()) / gross_W if gross_W > 0.0 else math.nan
    return math.nan


def _finding(
    tag: Tag,
    other: Tag,
    stretch_us: tuple[int, int],
    numbers: Mapping[str, float],
    hits: tuple[Familiar, ...],
) -> Finding:
    return Finding(
        FindingCode.UNIT_SUSPECTED,
        tag=tag.name,
        start_us=stretch_us[0],
        end_us=stretch_us[1],
        numbers=numbers,
        words={"evidence": "second meter", "other": other.name, "candidates": named(hits)},
        suspects=(tag.name, other.name),
    )
