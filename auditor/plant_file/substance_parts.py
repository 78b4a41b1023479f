"""Parts of the plant file about substances: fluids that carry heat, fuels, and the meters of gas."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Annotated, Any, ClassVar, Literal

from auditor.plant_file.faults import UnusableError
from auditor.plant_file.leaves import (
    Density,
    HeatCapacity,
    Moment,
    OneLine,
    Ratio,
    Spread,
    Temperature,
    UnitText,
    VolumeExpansion,
    VolumeRatio,
    Words,
)
from auditor.plant_file.parts import Choice, Part, keys_of, optional, required
from auditor.plant_file.quantities import unit_conversion


class Stated(Part):
    """A number that nobody logs, with its uncertainty."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("standard", "limit"),)

    standard: Spread | None = optional('one standard uncertainty; "1 %" is of the value', "1 %")
    limit: Spread | None = optional('half-width of a rectangular distribution; "1 %" is of the value', "2 %")


class ConstantHeatCapacity(Stated):
    """One heat capacity for all temperatures."""

    constant: HeatCapacity = required("heat capacity", "2.35 kJ/(kg K)")


class ConstantDensity(Stated):
    """One density for all temperatures."""

    constant: Density = required("density", "870 kg/m3")


class PropertyTable(Stated):
    """A property by temperature; the uncertainty is one common factor."""

    temperatures: list[float] = required("temperatures, rising", [20, 150, 300])
    temperature_unit: UnitText = required("unit of the temperatures", "degC")
    values: list[float] = required("one value for each temperature", [1.9, 2.3, 2.8])
    unit: UnitText = required("unit of the values", "kJ/(kg K)")


def heat_capacity_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a heat capacity: a table as soon as it has values."""
    return PropertyTable if {"values", "temperatures"} & raw.keys() else ConstantHeatCapacity


def density_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a density: a table as soon as it has values."""
    return PropertyTable if {"values", "temperatures"} & raw.keys() else ConstantDensity


_TABLE_EXAMPLE = {"constant": "2.35 kJ/(kg K)", "standard": "0.5 %"}


class DeclaredFluid(Part):
    """A liquid or gas whose properties are stated here."""

    heat_capacity: Annotated[ConstantHeatCapacity | PropertyTable, Choice(heat_capacity_form)] = required(
        "heat capacity, constant or by temperature", _TABLE_EXAMPLE
    )
    density: Annotated[ConstantDensity | PropertyTable, Choice(density_form)] | None = optional(
        "density, constant or by temperature; needed where a volume flow of it is metered",
        {"constant": "870 kg/m3", "standard": "0.5 %"},
    )


class GlycolFluid(Part):
    """A mixture of a glycol and water, whose properties are built in."""

    kind: Literal["ethylene glycol", "propylene glycol"] = required("which glycol", "propylene glycol")
    mass_fraction: Ratio = required("share of the glycol by mass", 0.35)


def fluid_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a fluid: a glycol as soon as it has a kind or a mass fraction."""
    return GlycolFluid if {"kind", "mass_fraction"} & raw.keys() else DeclaredFluid


class HeatingValuePart(Part):
    """Heating values from a date until the next entry."""

    from_: Moment = required("first day that they hold for", "2025-10-01", alias="from")
    lower: float | None = optional("lower heating value, in the fuel's unit", 10.1)
    higher: float | None = optional("higher heating value, in the fuel's unit", 11.2)
    source: Words | None = optional("where the values were taken from", "supplier's sheet")


class AirDemandPart(Stated):
    """Dry air that burns the fuel without excess."""

    value: VolumeRatio = required("dry air per fuel, both at the fuel's volume state", "9.6 m3/m3")


class FlueGasPart(Stated):
    """Flue gas of the fuel without excess air; the uncertainty holds for each of its numbers."""

    dry: VolumeRatio = required("dry flue gas per fuel, both at the fuel's volume state", "8.6 m3/m3")
    density_fuel: Density = required("density of the fuel at its volume state", "0.78 kg/m3")
    heat_capacity: HeatCapacity = required("mean heat capacity of the wet flue gas", "1.10 kJ/(kg K)")


class ExergyPart(Stated):
    """Chemical exergy of the fuel over one of its heating values."""

    value: Ratio = required("chemical exergy over the heating value named by of", 1.04)
    of: Literal["lower", "higher"] = required("the heating value it is stated for", "lower")


class FuelPart(Stated):
    """What every fuel has; the uncertainty is one factor common to all its heating values."""

    unit: UnitText = required("unit of the heating values", "kWh/m3")
    values: list[HeatingValuePart] = required(
        "heating values, each from a date until the next",
        [{"from": "2025-10-01", "lower": 10.1, "higher": 11.2}],
    )
    exergy: ExergyPart | None = optional(
        "ratio of chemical exergy to heating value; needed for the ceiling of a combustion engine",
        {"value": 1.04, "of": "lower", "standard": 0.01},
    )


class GasFuel(FuelPart):
    """A gas: heating values per volume at a stated state."""

    volume_state: OneLine = required(
        "temperature, pressure, and dry or wet, that the heating values are stated for",
        "0 degC, 101.325 kPa, dry",
    )
    air_demand: AirDemandPart | None = optional(
        "needed, with flue_gas, where flue gas is reckoned from oxygen",
        {"value": "9.6 m3/m3", "standard": "1 %"},
    )
    flue_gas: FlueGasPart | None = optional(
        "needed, with air_demand, where flue gas is reckoned from oxygen",
        {
            "dry": "8.6 m3/m3",
            "density_fuel": "0.78 kg/m3",
            "heat_capacity": "1.10 kJ/(kg K)",
            "standard": "1 %",
        },
    )


class LiquidDensityPart(Stated):
    """Density of a liquid fuel at a stated temperature."""

    value: Density = required("density", "840 kg/m3")
    at: Temperature = required("temperature that it is stated for", "15 degC")


class ExpansionPart(Stated):
    """Cubic expansion coefficient of a liquid fuel."""

    value: VolumeExpansion = required("cubic expansion coefficient", "0.00083 1/K")


class LiquidFuelPart(FuelPart):
    """A liquid: heating values per mass."""

    density: LiquidDensityPart | None = optional(
        "needed where it is metered by volume", {"value": "840 kg/m3", "at": "15 degC", "standard": "0.5 %"}
    )
    expansion: ExpansionPart | None = optional(
        "needed where it is metered by volume at another temperature",
        {"value": "0.00083 1/K", "standard": "5 %"},
    )


def fuel_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a fuel: a liquid when its heating values are by mass and it has no gas state."""
    if {"volume_state", "air_demand", "flue_gas"} & raw.keys():
        return GasFuel
    if {"density", "expansion"} & raw.keys():
        return LiquidFuelPart
    try:
        by_mass = unit_conversion(str(raw.get("unit"))).quantity == "heating value by mass"
    except UnusableError:
        return GasFuel
    return LiquidFuelPart if by_mass else GasFuel


class CompressibilityPart(Stated):
    """Compression factor at the fuel's state over that at the meter."""

    value: Ratio = required("compression factor at the reference state over that at the meter", 1.0)


class OperatingMeter(Part):
    """A gas meter that counts the volume as it passes."""

    reads: Literal["operating volume"] = required("what the meter's volume is", "operating volume")
    pressure: OneLine = required("tag of the gas pressure at the meter", "gas_pressure")
    temperature: OneLine = required("tag of the gas temperature at the meter", "gas_temperature")
    compressibility_ratio: CompressibilityPart = required(
        "compression factor at the fuel's state over that at the meter", {"value": 1.0, "standard": 0.001}
    )


_TWICE = (
    'a meter that reads "already at the fuel\'s state" has this correction in it, so it would be made twice: '
    'remove the key, or write reads = "operating volume"'
)


class CorrectedMeter(Part):
    """A gas meter with a corrector: its volume is at the fuel's state already."""

    refused: ClassVar[Mapping[str, str]] = MappingProxyType(
        dict.fromkeys(("pressure", "temperature", "compressibility_ratio"), _TWICE)
    )

    reads: Literal["already at the fuel's state"] = required("what the meter's volume is", "operating volume")


class UndecidedMeter(Part):
    """A gas meter that does not say which volume it reads."""

    also_known: ClassVar[frozenset[str]] = frozenset(keys_of(OperatingMeter))

    reads: Literal["operating volume", "already at the fuel's state"] = required(
        "what the meter's volume is", "operating volume"
    )


def meter_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a gas meter, from the volume it reads."""
    forms: Mapping[str, type[Part]] = {
        "operating volume": OperatingMeter,
        "already at the fuel's state": CorrectedMeter,
    }
    return forms.get(str(raw.get("reads")), UndecidedMeter)
