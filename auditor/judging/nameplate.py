"""Power against the nameplate: more than the machine can give, or never enough to count as load."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.familiar import MOST_NAMED, OF_POWER, Familiar, named
from auditor.records.findings import Finding, FindingCode
from auditor.records.kinds import KINDS
from auditor.records.machines import Power, Role, Shaft

if TYPE_CHECKING:
    from collections.abc import Mapping

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine

_OVERLOAD = 1.10
"""Largest power over the rated one: 10 % for an hour in twelve (ISO 8528-1, prime power; from memory)."""
_BUSY = 0.70
"""A machine that suits its site reaches this load at some time of a month. Common practice, no source."""
_USUAL_TOP = 0.95
"""Where the best hours of a month lie. Common practice, no source."""
_LEAST_SHARE = 0.15
"""Without a declared minimum load: a machine does not run a whole month below this."""
_TOP = 0.99
_LEAST_S = 86_400.0
"""A day of running must be known."""


def nameplate_questions(
    machines: Mapping[str, Machine], balances: Mapping[str, MachineBalance]
) -> list[Finding]:
    """Ask about work meters whose best hours lie above the overload of the machine, or hardly show it runs.

    Too little is doubted only where the efficiency does not vouch for it: a machine that truly ran at low
    load has a believable efficiency.
    """
    found = []
    for name, balance in balances.items():
        machine = machines[name]
        tags = _work_tags(machine)
        if machine.rated_power_W is None or not tags:
            continue
        load = _top_load(machine.rated_power_W, balance)
        if load is None:
            continue
        top, U = load
        least = machine.minimum_load if machine.minimum_load is not None else _LEAST_SHARE
        too_little = top + U < least and not _vouched_for(machine, balance)
        hits = _bring_back(top) if too_little or top - U > _OVERLOAD else ()
        if hits:
            found.append(_finding(machine, balance, tags, (top, U), hits))
    return found


def _top_load(rated_W: float, balance: MachineBalance) -> tuple[float, float] | None:
    """Load of the best intervals and its U, in shares of rated power."""
    figures = balance.interval
    work_W = figures.values.get("work_gross_W")
    if work_W is None:
        return None
    runs = np.isfinite(work_W) & (figures.running > 0.99)
    if runs.sum() * balance.interval_s < _LEAST_S:
        return None
    top_W = float(np.quantile(work_W[runs], _TOP))
    near = runs & (np.abs(work_W - top_W) <= 0.05 * abs(top_W))
    U_W = balance.interval_U["work_gross_W"][near]
    if top_W <= 0.0 or not np.isfinite(U_W).any():
        return None
    return top_W / rated_W, float(np.nanmedian(U_W)) / rated_W


def _bring_back(top: float) -> tuple[Familiar, ...]:
    """Familiar ratios by which the best hours come to lie between a busy machine and its overload."""
    loads = {each: top / each.middle if top > 1.0 else top * each.middle for each in OF_POWER}
    hits = [each for each, load in loads.items() if _BUSY <= load <= _OVERLOAD]
    hits.sort(key=lambda each: abs(math.log(loads[each] / _USUAL_TOP)))
    return tuple(hits) if len(hits) <= MOST_NAMED else ()


def _vouched_for(machine: Machine, balance: MachineBalance) -> bool:
    gross, band = balance.period.get("gross"), KINDS[machine.kind].bands.get("gross")
    if gross is None or band is None or not math.isfinite(gross.value):
        return False
    U = gross.expanded_U if math.isfinite(gross.expanded_U) else 0.0
    return gross.value + U >= band.low


def _work_tags(machine: Machine) -> tuple[str, ...]:
    ways = [stream.way for stream in machine.streams_of(Role.WORK_OUT)]
    tags = [way.tag for way in ways if isinstance(way, Power)]
    return tuple(dict.fromkeys(tags + [way.torque for way in ways if isinstance(way, Shaft)]))


def _finding(
    machine: Machine,
    balance: MachineBalance,
    tags: tuple[str, ...],
    load: tuple[float, float],
    hits: tuple[Familiar, ...],
) -> Finding:
    return Finding(
        FindingCode.UNIT_SUSPECTED,
        tag=tags[0],
        machine=machine.name,
        start_us=int(balance.interval.start_us[0]),
        end_us=int(balance.interval.end_us[-1]),
        numbers={"ratio": load[0], "ratio_U": load[1], "familiar": hits[0].middle},
        words={"evidence": "nameplate", "candidates": named(hits)},
        suspects=tags,
    )
