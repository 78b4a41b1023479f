"""Fuel power from the mass of a liquid fuel, or from its volume and density."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.heating_values import fuel_power
from auditor.metering.metered import Metered
from auditor.physics import liquid_density_kg_per_m3
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import LiquidFuel
    from auditor.records.plant import Fuel


def meter_liquid_fuel(way: LiquidFuel, read: Reader) -> Metered:
    """Fuel power of a liquid, ``P = m H`` or ``P = V rho(T) H``.

    The fuel's sensible heat (preheating) is not counted.
    """
    fuel = read.settings.fuels[way.fuel]
    if way.mass is not None:
        return fuel_power(read, fuel, read.value(way.mass))
    if way.volume is None:
        raise ValueError(f"{read.stream.key}: a liquid fuel needs a tag of mass or of volume")
    return fuel_power(read, fuel, read.value(way.volume) * _density_kg_per_m3(way, fuel, read))


def _density_kg_per_m3(way: LiquidFuel, fuel: Fuel, read: Reader) -> FloatArray | float:
    if fuel.density is None:
        raise ValueError(f"{read.stream.key}: {fuel.name} is metered by volume but has no density")
    density_kg_per_m3 = read.number(fuel.density)
    if fuel.expansion is None:
        return density_kg_per_m3
    if way.temperature is None or fuel.density_temperature_K is None:
        raise ValueError(f"{read.stream.key}: an expansion coefficient needs a temperature at the meter")
    return liquid_density_kg_per_m3(
        read.temperature_K(way.temperature),
        density_kg_per_m3,
        fuel.density_temperature_K,
        read.number(fuel.expansion),
    )
