"""Pressures of gas meters that were declared gauge but are absolute, or the other way round."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.familiar import Familiar, named
from auditor.judging.series import tag_means
from auditor.records.findings import Finding, FindingCode
from auditor.records.kinds import KINDS
from auditor.records.machines import GasVolume

if TYPE_CHECKING:
    from collections.abc import Mapping

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.plant import AirPressure, GasMeter, Tag
    from auditor.records.ticks import TickTable

_STANDARD_AIR_PA = 101_325.0
"""Standard atmosphere at sea level (ISO 2533)."""
_LEAST_AIR_PA = 70_000.0
"""Air at 3000 m (ISO 2533: 70 108 Pa); no plant is asked about that stands higher."""


def pressure_questions(
    machines: Mapping[str, Machine],
    meters: Mapping[str, GasMeter],
    tags: Mapping[str, Tag],
    air: AirPressure | None,
    ticks: TickTable,
    balances: Mapping[str, MachineBalance],
) -> list[Finding]:
    """Ask about the kind of a gas meter's pressure.

    - Declared absolute, yet below the pressure of the air: a gas pipe under vacuum is none. The fuel then
      counts ``(p + p_air) / p`` times too little.
    - Declared gauge, while the gross efficiency lies below the believable band of its kind by more than U
      and would lie inside it if the pressure were absolute. The fuel counts ``(p + p_air) / p`` times too
      much.
    """
    found = []
    asked: set[str] = set()
    for name, machine in machines.items():
        for stream in machine.streams.values():
            if not isinstance(stream.way, GasVolume):
                continue
            meter = meters[stream.way.meter]
            tag = tags.get(meter.pressure or "")
            if tag is None or meter.reads != "operating volume" or tag.name in asked:
                continue
            found += _asked(tag, machine, _air_Pa(air, ticks), ticks, balances.get(name))
            asked.add(tag.name)
    return found


def _air_Pa(air: AirPressure | None, ticks: TickTable) -> float:
    if air is not None and air.tag is not None:
        read = tag_means(ticks, air.tag)
        if np.isfinite(read).any():
            return float(np.nanmedian(read))
    if air is not None and air.from_altitude is not None:
        return air.from_altitude.value
    return math.nan


def _asked(
    tag: Tag, machine: Machine, air_Pa: float, ticks: TickTable, balance: MachineBalance | None
) -> list[Finding]:
    read = tag_means(ticks, tag.name)
    read = read[np.isfinite(read)]
    usual_Pa = float(np.median(read)) if read.size else math.nan
    if not usual_Pa > 0.0:
        return []
    relative = (
        0.0
        if tag.calibration is None
        else math.hypot(tag.calibration.absolute / usual_Pa, tag.calibration.relative)
    )
    if tag.pressure == "absolute":
        # Without a declared air pressure the thinnest air of any plant is the test, sea level the size.
        below = air_Pa if math.isfinite(air_Pa) else _LEAST_AIR_PA
        if usual_Pa * (1.0 + 2.0 * relative) >= below:
            return []
        air_Pa = air_Pa if math.isfinite(air_Pa) else _STANDARD_AIR_PA
        cause = "gauge pressure read as absolute"
    elif tag.pressure == "gauge" and usual_Pa * (1.0 + 2.0 * relative) >= air_Pa:
        cause = "absolute pressure read as gauge"
        if balance is None or not _explains(machine, balance, (usual_Pa + air_Pa) / usual_Pa):
            return []
    else:
        return []
    ratio = (usual_Pa + air_Pa) / usual_Pa
    hit = Familiar(cause, ratio, ratio)
    return [
        Finding(
            FindingCode.UNIT_SUSPECTED,
            tag=tag.name,
            machine=machine.name,
            start_us=ticks.grid.period.start_us,
            end_us=ticks.grid.period.end_us,
            numbers={
                "ratio": ratio,
                "ratio_U": 2.0 * relative * (ratio - 1.0),
                "familiar": ratio,
                "pressure_Pa": usual_Pa,
                "air_Pa": air_Pa,
            },
            words={"evidence": "pressure kind", "candidates": named((hit,))},
            suspects=(tag.name,),
        )
    ]


def _explains(machine: Machine, balance: MachineBalance, factor: float) -> bool:
    """Whether the efficiency leaves its band below, beyond U, and comes back if fuel is less by a factor."""
    for key, band in KINDS[machine.kind].bands.items():
        figure = balance.period.get(key)
        if figure is None or not math.isfinite(figure.value) or not math.isfinite(figure.expanded_U):
            continue
        if figure.value + figure.expanded_U < band.low and band.low <= figure.value * factor <= band.high:
            return True
    return False
