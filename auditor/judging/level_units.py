"""Efficiencies of a whole period that no machine of the kind has, and would be usual by a familiar ratio."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from auditor.judging.familiar import MOST_NAMED, Familiar, named
from auditor.judging.own_past import Meter, meter_of
from auditor.records.findings import Finding, FindingCode
from auditor.records.kinds import KINDS, Band
from auditor.records.machines import Role

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.plant import Fuel

_OUTPUT = {"gross": Role.WORK_OUT, "heat": Role.USEFUL_HEAT}
_INPUTS = (Role.FUEL_IN, Role.HEAT_IN)
_FAR_BELOW = 0.5
"""A poor machine may well lie below the band of its kind; below half of it a meter is the likelier cause."""


def level_questions(
    machines: Mapping[str, Machine],
    fuels: Mapping[str, Fuel],
    balances: Mapping[str, MachineBalance],
    asked: Iterable[Finding],
) -> list[Finding]:
    """Ask about the meters of a machine whose efficiency lies far outside the believable band of its kind.

    Above it by more than U, or below half of it. Input and output may both be at fault: both are named. A
    machine that is asked about already is left out.
    """
    known = {finding.machine for finding in asked}
    found = []
    for name, balance in balances.items():
        machine = machines[name]
        for key, band in KINDS[machine.kind].bands.items():
            figure = balance.period.get(key)
            if name in known or key not in _OUTPUT or figure is None:
                continue
            value, U = figure.value, figure.expanded_U
            if not (value > 0.0 and math.isfinite(U)):
                continue
            if not (value - U > band.high or value + U < _FAR_BELOW * band.low):
                continue
            meters = [
                meter
                for stream in machine.streams_of(*_INPUTS, _OUTPUT[key])
                if (meter := meter_of(stream, machines, fuels))
            ]
            hits = _bring_back(value, band, meters)
            if hits:
                found.append(_finding(key, (value, U), balance, meters, hits))
    return found


def _bring_back(value: float, band: Band, meters: list[Meter]) -> tuple[Familiar, ...]:
    """Ratios that bring a figure into its band, the one that brings it nearest to the middle first."""
    corrected = {
        each: value / each.middle if value > band.high else value * each.middle
        for meter in meters
        for each in meter.familiar
    }
    middle = math.sqrt(band.low * band.high)
    hits = [each for each, figure in corrected.items() if band.low <= figure <= band.high]
    hits.sort(key=lambda each: abs(math.log(corrected[each] / middle)))
    return tuple(hits) if len(hits) <= MOST_NAMED else ()


def _finding(
    key: str,
    figure: tuple[float, float],
    balance: MachineBalance,
    meters: list[Meter],
    hits: tuple[Familiar, ...],
) -> Finding:
    tags = tuple(dict.fromkeys(meter.tag for meter in meters if set(meter.familiar) & set(hits)))
    return Finding(
        FindingCode.UNIT_SUSPECTED,
        tag=tags[0],
        machine=balance.machine,
        start_us=int(balance.interval.start_us[0]),
        end_us=int(balance.interval.end_us[-1]),
        numbers={"ratio": figure[0], "ratio_U": figure[1], "familiar": hits[0].middle},
        words={"evidence": "level", "figure": key, "candidates": named(hits)},
        suspects=tags,
    )
