"""What metering notices by itself: new heating values, power at standstill, numbers that physics refuses."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from auditor.metering.heating_values import valid_entry
from auditor.metering.inputs import counted
from auditor.metering.swapped import swapped_pairs
from auditor.metering.ways import made_of
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import GasVolume, LiquidFuel, Role
from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from auditor.metering.metered import Metered
    from auditor.metering.settings import MeteringSettings
    from auditor.records.machines import Stream
    from auditor.records.plant import Fuel, HeatingValue
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

CREEP_SHARE: Final = 5e-4
"""Smaller power at standstill, as a share of the mean while running, is the last digit of a meter
rather than creep. Common practice, no source."""

_TRUE_AT_STANDSTILL = (Role.OWN_USE, Role.POWER_IN)
"""Auxiliaries go on while the machine stands: that is not creep."""


def findings_of(
    table: PowerTable,
    metered: Mapping[str, Metered],
    ticks: TickTable,
    settings: MeteringSettings,
) -> tuple[Finding, ...]:
    """Everything noticed, by stream in the order of the plant file, then by fuel."""
    findings: list[Finding] = []
    for stream in settings.streams().values():
        findings.extend(_refused(stream, table, metered, ticks, settings))
        findings.extend(swapped_pairs(stream, table))
        if made_of(stream) is None and stream.role not in _TRUE_AT_STANDSTILL:
            findings.extend(_creep(stream, table, ticks))
    for name, fuel in settings.fuels.items():
        burning = [stream for stream in settings.streams().values() if _burns(stream, name)]
        if burning:
            findings.extend(_new_heating_values(fuel, burning, table))
    return tuple(findings)


def _refused(
    stream: Stream,
    table: PowerTable,
    metered: Mapping[str, Metered],
    ticks: TickTable,
    settings: MeteringSettings,
) -> Iterator[Finding]:
    # Every input counts and yet there is no number: a property table was left, oxygen was that of
    # air, or the fuel has no heating value yet.
    refused = np.isnan(metered[stream.key].power_W)
    for column in metered[stream.key].inputs:
        refused &= counted(ticks, column, settings.rules.tick_coverage)
    earlier = made_of(stream)
    if earlier is not None:
        refused &= np.isfinite(metered[earlier].power_W)
    fuel = _fuel_of(stream, settings)
    if fuel is not None:
        without_value = refused & (valid_entry(fuel.values, ticks.grid.start_us) < 0)
        yield from _out_of_range(stream, without_value, "before the first heating value", table)
        refused &= ~without_value
    yield from _out_of_range(stream, refused, "outside the range of the physics", table)


def _out_of_range(
    stream: Stream, where: NDArray[np.bool_], reason: str, table: PowerTable
) -> Iterator[Finding]:
    places = np.flatnonzero(where)
    if len(places) == 0:
        return
    tick_s, start_us = table.grid.tick_s, table.grid.start_us
    affected_s, usual_W = float(len(places) * tick_s), _usual_W(stream, table)
    yield Finding(
        FindingCode.OUT_OF_RANGE,
        machine=stream.machine,
        stream=stream.name,
        start_us=int(start_us[places[0]]),
        end_us=int(start_us[places[-1]]) + tick_s * MICROSECONDS,
        energy_J=usual_W * affected_s if usual_W > 0.0 else None,
        numbers={"count": float(len(places)), "affected_s": affected_s},
        words={"reason": reason},
    )


def _creep(stream: Stream, table: PowerTable, ticks: TickTable) -> Iterator[Finding]:
    index = table.streams.index(stream.key)
    still = table.known[:, index] & (table.running[stream.machine] == 0.0)
    mean_W, usual_W = table.standstill_W[stream.key], _usual_W(stream, table)
    if not abs(mean_W) > CREEP_SHARE * usual_W:
        return
    standstill_s = float(np.count_nonzero(still) * table.grid.tick_s)
    numbers = {"power_W": mean_W, "standstill_s": standstill_s, "running_power_W": usual_W}
    if isinstance(stream.way, GasVolume):
        flow_m3_per_s = ticks.mean[still, ticks.column(stream.way.volume)]
        numbers["metered_m3"] = float(np.mean(flow_m3_per_s)) * standstill_s
    yield Finding(
        FindingCode.CREEP_AT_STANDSTILL,
        machine=stream.machine,
        stream=stream.name,
        start_us=table.grid.period.start_us,
        end_us=table.grid.period.end_us,
        energy_J=abs(mean_W) * standstill_s,
        numbers=numbers,
    )


def _usual_W(stream: Stream, table: PowerTable) -> float:
    # Mean magnitude while the machine runs; 0 when it never does.
    index = table.streams.index(stream.key)
    runs = table.known[:, index] & (table.running[stream.machine] == 1.0)
    return float(np.mean(np.abs(table.power_W[runs, index]))) if runs.any() else 0.0


def _new_heating_values(fuel: Fuel, burning: list[Stream], table: PowerTable) -> Iterator[Finding]:
    period = table.grid.period
    for before, after in zip(fuel.values[:-1], fuel.values[1:], strict=True):
        if not period.start_us < after.from_us < period.end_us:
            continue
        pair = _stated_twice(before, after)
        if pair is None or pair[1] == pair[2]:
            continue
        basis, old, new = pair
        from_then = table.grid.start_us >= after.from_us
        burnt_J = sum(_energy_J(stream.key, from_then, table) for stream in burning)
        only = burning[0] if len(burning) == 1 else None
        yield Finding(
            FindingCode.HEATING_VALUE_CHANGED,
            machine=None if only is None else only.machine,
            stream=None if only is None else only.name,
            start_us=after.from_us,
            end_us=period.end_us,
            energy_J=abs(old / new - 1.0) * burnt_J,
            numbers={"before": old, "after": new, "factor": new / old},
            words={"fuel": fuel.name, "basis": basis, "source": after.source},
        )


def _stated_twice(before: HeatingValue, after: HeatingValue) -> tuple[str, float, float] | None:
    # Basis, old and new value [J/m3] or [J/kg]; the lower one where both entries state it.
    pairs = (("lower", before.lower, after.lower), ("higher", before.higher, after.higher))
    for basis, old, new in pairs:
        if old is not None and new is not None:
            return basis, old.value, new.value
    return None


def _energy_J(key: str, where: NDArray[np.bool_], table: PowerTable) -> float:
    power_W = table.power_W[where, table.streams.index(key)]
    return float(np.nansum(power_W)) * table.grid.tick_s


def _fuel_of(stream: Stream, settings: MeteringSettings) -> Fuel | None:
    way = stream.way
    return settings.fuels[way.fuel] if isinstance(way, GasVolume | LiquidFuel) else None


def _burns(stream: Stream, fuel: str) -> bool:
    return isinstance(stream.way, GasVolume | LiquidFuel) and stream.way.fuel == fuel
