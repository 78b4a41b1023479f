"""Streams of fuel and of heat carried by liquids and gases: what each points at, checked."""

from __future__ import annotations

from auditor.plant_file.faults import choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.machine_parts import (
    CombustionAirStream,
    FlowStream,
    FlueGasStream,
    GasVolumeStream,
    LiquidFuelStream,
)
from auditor.plant_file.references import find, find_tag
from auditor.plant_file.resolve_tags import REFERENCE
from auditor.plant_file.stream_place import TEMPERATURE, Place
from auditor.records.machines import CombustionAir, FlowAndTemperatures, FlueGasHeat, GasVolume, LiquidFuel
from auditor.records.plant import GasMeter


def gas_volume(part: GasVolumeStream, place: Place) -> GasVolume:
    """Check and make a fuel stream by gas volume."""
    place.tag("volume", part.volume, "volume flow")
    fuel = find("fuel", part.fuel, place.declared.fuels, (*place.path, "fuel"), place.book)
    if fuel is not None and fuel.phase != "gas":
        place.book.add(
            (*place.path, "fuel"),
            f'fuel "{part.fuel}" is a liquid: its heating values are by mass',
            'write by = "liquid fuel", or name a gas',
        )
    meter = find("gas meter", part.meter, place.declared.gas_meters, (*place.path, "meter"), place.book)
    if meter is not None:
        _check_meter(meter, place)
    return GasVolume(part.fuel, part.volume, part.meter)


def _check_meter(meter: GasMeter, place: Place) -> None:
    """Check a meter where it is used, so that a gauge pressure nobody uses asks for nothing."""
    path: KeyPath = ("gas_meters", meter.name)
    if meter.reads != "operating volume":
        return
    pressure = find_tag(meter.pressure, ("pressure",), place.declared, (*path, "pressure"), place.book)
    find_tag(meter.temperature, TEMPERATURE, place.declared, (*path, "temperature"), place.book)
    site = place.declared.site
    if (
        pressure is not None
        and any(then.pressure == "gauge" for _, _, then in pressure.stretches)
        and site is not None
        and site.air_pressure is None
    ):
        place.book.add(
            ("site", "air_pressure"),
            f'the key "air_pressure" is missing, but "{pressure.name}" is a pressure against the air',
            'add air_pressure = { from = "altitude", standard = "0.9 kPa" }, or { tag = "barometer" }',
        )


def liquid_fuel(part: LiquidFuelStream, place: Place) -> LiquidFuel:
    """Check and make a fuel stream of a liquid."""
    place.tag("mass", part.mass, "mass flow")
    place.tag("volume", part.volume, "volume flow")
    place.tag("temperature", part.temperature, *TEMPERATURE)
    fuel = find("fuel", part.fuel, place.declared.fuels, (*place.path, "fuel"), place.book)
    if fuel is not None and fuel.phase != "liquid":
        place.book.add(
            (*place.path, "fuel"),
            f'fuel "{part.fuel}" is a gas: its heating values are by volume',
            'write by = "gas volume", or name a liquid',
        )
    elif fuel is not None and part.volume is not None and fuel.density is None:
        place.book.add(
            ("fuels", fuel.name, "density"),
            f'the key "density" is missing, but the stream "{place.name}" meters this fuel by volume',
            'add density = { value = "840 kg/m3", at = "15 degC", standard = "0.5 %" }',
        )
    expands = part.volume is not None and fuel is not None and fuel.expansion is not None
    if expands and part.temperature is None:
        place.book.add(
            (*place.path, "temperature"),
            f'fuel "{part.fuel}" has an expansion coefficient, but no temperature at the meter is named',
            'add temperature = "TAG", or remove expansion from the fuel',
        )
    if part.temperature is not None and fuel is not None and not expands:
        place.book.add(
            (*place.path, "temperature"),
            "the temperature would not be used: the fuel is metered by mass or has no expansion coefficient",
            "remove the key, or declare expansion with the fuel",
        )
    return LiquidFuel(part.fuel, part.mass, part.volume, part.temperature)


def flow_and_temperatures(part: FlowStream, place: Place) -> FlowAndTemperatures:
    """Check and make a heat stream by flow and temperatures."""
    flow = find_tag(
        part.flow, ("mass flow", "volume flow"), place.declared, (*place.path, "flow"), place.book
    )
    place.tag("inlet", part.inlet, *TEMPERATURE)
    place.tag("outlet", part.outlet, *TEMPERATURE)
    fluid = find("fluid", part.fluid, place.declared.fluids, (*place.path, "fluid"), place.book)
    by_volume = flow is not None and flow.quantity in ("volume flow", "volume")
    if by_volume and part.flow_at is None and place.book.clean((*place.path, "flow_at")):
        place.book.add(
            (*place.path, "flow_at"),
            f'the key "flow_at" is missing, but "{part.flow}" measures a volume',
            'add flow_at = "inlet" or flow_at = "outlet": the density is that of the meter\'s place',
        )
    if flow is not None and not by_volume and part.flow_at is not None:
        place.book.add(
            (*place.path, "flow_at"),
            f'"{part.flow}" measures a mass, so the place of its meter does not matter',
            "remove the key, or correct the tag's unit",
        )
    if by_volume and fluid is not None and fluid.kind == "declared" and fluid.density is None:
        place.book.add(
            ("fluids", fluid.name, "density"),
            f'the key "density" is missing, but the stream "{place.name}" meters this fluid by volume',
            'add density = { constant = "870 kg/m3", standard = "0.5 %" }',
        )
    return FlowAndTemperatures(part.flow, part.flow_at, part.inlet, part.outlet, part.fluid)


def flue_gas(part: FlueGasStream, place: Place) -> FlueGasHeat:
    """Check and make a heat stream of flue gas."""
    _check_combustion(part.of, part.oxygen, place)
    place.tag("inlet", part.inlet, *TEMPERATURE)
    to_reference = part.outlet == REFERENCE
    if to_reference:
        _need_reference(place)
    else:
        place.tag("outlet", part.outlet, *TEMPERATURE)
    return FlueGasHeat(part.of, part.oxygen, part.inlet, None if to_reference else part.outlet)


def combustion_air(part: CombustionAirStream, place: Place) -> CombustionAir:
    """Check and make the sensible heat of combustion air."""
    _check_combustion(part.of, part.oxygen, place)
    place.tag("temperature", part.temperature, *TEMPERATURE)
    _need_reference(place)
    return CombustionAir(part.of, part.oxygen, part.temperature)


def _need_reference(place: Place) -> None:
    site = place.declared.site
    if site is not None and site.reference_temperature_K is None:
        place.book.add(
            ("site", "reference_temperature"),
            'the key "reference_temperature" is missing, but '
            f'the stream "{place.machine}.{place.name}" is reckoned against it',
            'add reference_temperature = "25 degC", the one that the heating values are stated for',
        )


def _check_combustion(of: str | None, oxygen: str | None, place: Place) -> None:
    """Check what a flow of flue gas or air is reckoned from: a metered gas, its data, and dry oxygen."""
    path = place.path
    tag = find_tag(oxygen, ("fraction",), place.declared, (*path, "oxygen"), place.book)
    if tag is not None and tag.basis != "dry":
        place.book.add(
            ("exports", tag.export, "tags", tag.name, "basis"),
            'the key "basis" is missing'
            if tag.basis is None
            else "oxygen in wet flue gas gives no flow here",
            'add basis = "dry" if the analyser dries its gas; '
            "a wet reading must be converted to dry before it is logged",
        )
    if of is None:
        return
    stream = place.siblings.get(of)
    if not isinstance(stream, GasVolumeStream):
        fuels = [name for name, sibling in place.siblings.items() if isinstance(sibling, GasVolumeStream)]
        what = "there is no stream" if of not in place.siblings else "no gas volume is metered by the stream"
        place.book.add(
            (*path, "of"), f'{what} "{of}"', f"name a fuel stream of this machine; {choices(of, fuels)}"
        )
        return
    fuel = place.declared.fuels.get(stream.fuel) if stream.fuel is not None else None
    if fuel is not None and fuel.flue_gas is None:
        place.book.add(
            ("fuels", fuel.name, "flue_gas"),
            f'the keys "air_demand" and "flue_gas" are missing, but the stream "{place.name}" needs them',
            'add air_demand = { value = "9.6 m3/m3", ... } and flue_gas = { dry = "8.6 m3/m3", ... }',
        )
