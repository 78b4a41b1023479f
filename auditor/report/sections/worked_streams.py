"""Powers of single streams at one tick, each as an equation with its numbers."""

# ruff: noqa: RUF001 - text for paper uses the trade's own signs

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from auditor.records.machines import (
    CombustionAir,
    Constant,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    LiquidFuel,
    Power,
    SameAs,
    Shaft,
    ShareOf,
    Stream,
)
from auditor.report import numbers
from auditor.report.sections.worked_figures import Line
from auditor.report.wording import names
from auditor.units import DISPLAY

if TYPE_CHECKING:
    from auditor.records.plant import FlueGas
    from auditor.records.result import AuditResult

_OXYGEN_OF_AIR = 20.946
"""Oxygen in dry air [%], as metering takes it."""
_AIR_J_PER_KGK = 1006.0
"""Heat capacity of dry air [J/(kg K)], as metering takes it."""


def stream_line(stream: Stream, tick: int, result: AuditResult) -> Line:
    """One stream at one tick: its equation with the readings of that tick, and the power that resulted."""
    watts = float(result.powers.power_W[tick, result.powers.streams.index(stream.key)])
    writer = _WRITERS[type(stream.way)]
    return Line(
        names.sentence(f"{names.plain(stream.name)} ({names.ROLES[stream.role][0]})"),
        f"{writer(stream, tick, result)} = {_kW(watts)}",
    )


def _kW(watts: float) -> str:
    unit = DISPLAY["power"]
    return f"{numbers.significant(watts / unit.size_si, 6)}{numbers.NBSP}{unit.label}"


def _reading(column: str, tick: int, result: AuditResult) -> float:
    return float(result.ticks.mean[tick, result.ticks.column(column)])


def _in(quantity: str, value: float, digits: int = 6) -> str:
    unit = DISPLAY[quantity]
    return f"{numbers.significant(float(unit.from_si(value)), digits)}{numbers.NBSP}{unit.label}"


def _stated(quantity: str, value: float) -> str:
    """Write a number that somebody declared, without zeros that nobody wrote."""
    unit = DISPLAY[quantity]
    return f"{numbers.exact(float(unit.from_si(value)))}{numbers.NBSP}{unit.label}"


def _power(stream: Stream, tick: int, result: AuditResult) -> str:
    way: Power = stream.way  # type: ignore[assignment]
    tag = result.plant.tags[way.tag]
    return (
        f"rate of the counter {way.tag}" if tag.between in ("counter", "amount") else f"reading of {way.tag}"
    )


def _gas(stream: Stream, tick: int, result: AuditResult) -> str:
    way: GasVolume = stream.way  # type: ignore[assignment]
    plant = result.plant
    meter, fuel = plant.gas_meters[way.meter], plant.fuels[way.fuel]
    volume = _reading(way.volume, tick, result)
    heat = _heating_value(stream, tick, result)
    if meter.reads != "operating volume" or meter.pressure is None or meter.temperature is None:
        return f"{_in('volume flow', volume)} · {heat}"
    state = fuel.volume_state
    assert state is not None
    pressure = _reading(meter.pressure, tick, result)
    kelvin = _reading(meter.temperature, tick, result)
    gauge = plant.tags[meter.pressure].pressure == "gauge"
    absolute = (
        f"({_in('pressure', pressure)} + {_barometer(tick, result)})" if gauge else _in("pressure", pressure)
    )
    ratio = meter.compressibility_ratio
    factor = f" · {numbers.exact(ratio.value)}" if ratio is not None else ""
    return (
        f"{_in('volume flow', volume)} · {absolute} / {_stated('pressure', state.pressure_Pa)} · "
        f"{numbers.exact(state.temperature_K)} K / {numbers.significant(kelvin, 6)} K{factor} · {heat}"
    )


def _barometer(tick: int, result: AuditResult) -> str:
    declared = result.plant.site.air_pressure
    if declared is not None and declared.tag is not None:
        return _in("pressure", _reading(declared.tag, tick, result))
    if declared is not None and declared.from_altitude is not None:
        return _in("pressure", declared.from_altitude.value)
    return "air pressure"


def _heating_value(stream: Stream, tick: int, result: AuditResult) -> str:
    way: Any = stream.way
    fuel = result.plant.fuels[way.fuel]
    at_us = int(result.ticks.grid.start_us[tick])
    valid = [entry for entry in fuel.values if entry.from_us <= at_us]
    basis = result.plant.machines[stream.machine].basis
    if not valid or basis is None:
        return "heating value"
    value = valid[-1].lower if basis == "lower" else valid[-1].higher
    if value is None:
        return f"{basis} heating value"
    quantity = "heating value by volume" if fuel.phase == "gas" else "heating value by mass"
    return f"{_stated(quantity, value.value)} ({basis})"


def _liquid(stream: Stream, tick: int, result: AuditResult) -> str:
    way: LiquidFuel = stream.way  # type: ignore[assignment]
    heat = _heating_value(stream, tick, result)
    if way.mass is not None:
        hourly = numbers.significant(_reading(way.mass, tick, result) * 3600.0, 6)
        return f"{hourly}{numbers.NBSP}kg/h · {heat}"
    volume = _in("volume flow", _reading(way.volume or "", tick, result))
    fuel = result.plant.fuels[way.fuel]
    density = _in("density", fuel.density.value) if fuel.density is not None else "density"
    if way.temperature is None or fuel.expansion is None or fuel.density_temperature_K is None:
        return f"{volume} · {density} · {heat}"
    kelvin = _reading(way.temperature, tick, result)
    return (
        f"{volume} · {density} / (1 + {numbers.significant(fuel.expansion.value, 4)} · "
        f"({numbers.significant(kelvin, 6)} − {numbers.significant(fuel.density_temperature_K, 6)})) · {heat}"
    )


def _shaft(stream: Stream, tick: int, result: AuditResult) -> str:
    way: Shaft = stream.way  # type: ignore[assignment]
    torque, speed = (_reading(name, tick, result) for name in (way.torque, way.speed))
    return f"2π / 60 · {_in('torque', torque)} · {_in('rotational speed', speed)}"


def _flow(stream: Stream, tick: int, result: AuditResult) -> str:
    way: FlowAndTemperatures = stream.way  # type: ignore[assignment]
    flow, inlet, outlet = (_reading(name, tick, result) for name in (way.flow, way.inlet, way.outlet))
    quantity = "mass flow" if way.flow_at is None else "volume flow"
    fluid = result.plant.fluids[way.fluid]
    warm, cold = (inlet, outlet) if inlet >= outlet else (outlet, inlet)
    fall = f"({numbers.significant(warm - 273.15, 6)} − {numbers.significant(cold - 273.15, 6)}) K"
    constant = fluid.heat_capacity is not None and fluid.heat_capacity_table is None
    if constant and way.flow_at is None and fluid.heat_capacity is not None:
        return f"{_in(quantity, flow)} · {_stated('heat capacity', fluid.heat_capacity.value)} · {fall}"
    watts = float(result.powers.power_W[tick, result.powers.streams.index(stream.key)])
    with np.errstate(divide="ignore", invalid="ignore"):
        carried = float(np.float64(watts) / (np.float64(flow) * (warm - cold)))
    kind = "c" if way.flow_at is None else "ρ · c"
    unit = "kJ/(kg K)" if way.flow_at is None else "kJ/(m³ K)"
    return (
        f"{_in(quantity, flow)} · {numbers.significant(carried / 1e3, 5)}{numbers.NBSP}{unit} · {fall}, "
        f"{kind} of {names.plain(fluid.name)} between these temperatures,"
    )


def _flue_gas(stream: Stream, tick: int, result: AuditResult) -> str:
    way: FlueGasHeat = stream.way  # type: ignore[assignment]
    declared = _flue_gas_of(stream, way.of, result)
    inlet = _reading(way.inlet, tick, result)
    outlet = _reading(way.outlet, tick, result) if way.outlet is not None else _reference_K(result)
    carried = _carried(stream, tick, declared.heat_capacity.value, (inlet, outlet), result)
    return (
        f"{_air_ratio(way.oxygen, declared, tick, result)}; flue gas (fuel and λ times its least air) "
        f"{carried}"
    )


def _air(stream: Stream, tick: int, result: AuditResult) -> str:
    way: CombustionAir = stream.way  # type: ignore[assignment]
    declared = _flue_gas_of(stream, way.of, result)
    ends = (_reading(way.temperature, tick, result), _reference_K(result))
    carried = _carried(stream, tick, _AIR_J_PER_KGK, ends, result)
    return (
        f"{_air_ratio(way.oxygen, declared, tick, result)}; air (λ times the least air of the fuel) {carried}"
    )


def _reference_K(result: AuditResult) -> float:
    reference = result.plant.site.reference_temperature_K
    return reference if reference is not None else float("nan")


def _flue_gas_of(stream: Stream, of: str, result: AuditResult) -> FlueGas:
    """Find the declared flue gas of the fuel that another stream of the same machine burns."""
    way: Any = result.plant.machines[stream.machine].streams[of].way
    declared = result.plant.fuels[way.fuel].flue_gas
    assert declared is not None, f"{stream.key}: the fuel of {of} declares no flue gas"
    return declared


def _air_ratio(oxygen: str, declared: FlueGas, tick: int, result: AuditResult) -> str:
    """Oxygen balance of the dry flue gas, in percent of oxygen."""
    share = _reading(oxygen, tick, result) * 100.0
    dry, least = declared.dry_flue_gas.value, declared.air_demand.value
    ratio = 1.0 + dry / least * share / (_OXYGEN_OF_AIR - share)
    return (
        f"λ = 1 + {numbers.exact(dry)} / {numbers.exact(least)} · {numbers.significant(share, 5)} / "
        f"({numbers.exact(_OXYGEN_OF_AIR)} − {numbers.significant(share, 5)}) = "
        f"{numbers.significant(ratio, 5)}"
    )


def _carried(
    stream: Stream, tick: int, capacity: float, ends_K: tuple[float, float], result: AuditResult
) -> str:
    """Mass flow that gave the power, times heat capacity, times fall in temperature."""
    watts = float(result.powers.power_W[tick, result.powers.streams.index(stream.key)])
    with np.errstate(divide="ignore", invalid="ignore"):
        flow = float(np.float64(watts) / (capacity * (ends_K[0] - ends_K[1])))
    warm, cold = (numbers.significant(end - 273.15, 6) for end in ends_K)
    return f"{_in('mass flow', flow, 5)} · {_stated('heat capacity', capacity)} · ({warm} − {cold}) K"


def _share(stream: Stream, tick: int, result: AuditResult) -> str:
    way: ShareOf = stream.way  # type: ignore[assignment]
    key = f"{stream.machine}.{way.of}"
    watts = float(result.powers.power_W[tick, result.powers.streams.index(key)])
    return f"{numbers.exact(way.share.value)} · {_kW(watts)} of {names.plain(way.of)}"


def _constant(stream: Stream, tick: int, result: AuditResult) -> str:
    return "stated power"


def _same(stream: Stream, tick: int, result: AuditResult) -> str:
    way: SameAs = stream.way  # type: ignore[assignment]
    other = result.plant.machines[way.machine].streams[way.stream]
    line = _WRITERS[type(other.way)](other, tick, result)
    return f"{line}, as {names.plain(way.stream)} of {result.plant.machines[way.machine].title},"


_WRITERS: dict[type, Callable[[Stream, int, AuditResult], str]] = {
    Power: _power,
    GasVolume: _gas,
    LiquidFuel: _liquid,
    Shaft: _shaft,
    FlowAndTemperatures: _flow,
    FlueGasHeat: _flue_gas,
    CombustionAir: _air,
    ShareOf: _share,
    Constant: _constant,
    SameAs: _same,
}
