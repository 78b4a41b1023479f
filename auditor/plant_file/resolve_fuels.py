"""Fuels and gas meters, from checked parts to records in SI."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Literal

from auditor.plant_file.clocks import instant_us
from auditor.plant_file.faults import FaultBook, UnusableError
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.quantities import (
    Amount,
    UncertaintyKind,
    amount,
    assumed,
    bare,
    relative_uncertainty,
    unit_conversion,
)
from auditor.plant_file.stated import plain_unit, stated_value
from auditor.plant_file.substance_parts import (
    CorrectedMeter,
    FlueGasPart,
    FuelPart,
    GasFuel,
    HeatingValuePart,
    LiquidFuelPart,
    OperatingMeter,
)
from auditor.plant_file.written import key_text, shown
from auditor.records.plant import FlueGas, Fuel, GasMeter, HeatingValue, VolumeState
from auditor.records.uncertain import Assumed

_SI_VALUE = {"gas": ("heating value by volume", "J/m3"), "liquid": ("heating value by mass", "J/kg")}


def resolve_fuels(
    parts: Mapping[str, GasFuel | LiquidFuelPart], zone: str | None, book: FaultBook
) -> dict[str, Fuel | None]:
    """Make the records of the fuels."""
    return {name: _fuel(name, part, zone, book) for name, part in parts.items()}


def _fuel(name: str, part: GasFuel | LiquidFuelPart, zone: str | None, book: FaultBook) -> Fuel | None:
    path: KeyPath = ("fuels", name)
    phase: Literal["gas", "liquid"] = "gas" if isinstance(part, GasFuel) else "liquid"
    values = _heating_values(part, phase, zone, (path, book))
    factor = _common_factor(part, path, book)
    exergy = stated_value(part.exergy, (*path, "exergy"), book)
    _check_exergy(part, path, book)
    gas = _gas_only(part, path, book) if isinstance(part, GasFuel) else (None, None)
    liquid = _liquid_only(part, path, book) if isinstance(part, LiquidFuelPart) else (None, None, None)
    if not book.clean(path) or values is None or factor is None:
        return None
    return Fuel(
        name=name,
        phase=phase,
        volume_state=gas[0],
        values=values,
        value_standard=factor,
        density=liquid[0],
        density_temperature_K=liquid[1],
        expansion=liquid[2],
        flue_gas=gas[1],
        exergy=exergy,
        exergy_of=None if part.exergy is None else part.exergy.of,
    )


def _gas_only(part: GasFuel, path: KeyPath, book: FaultBook) -> tuple[VolumeState | None, FlueGas | None]:
    state = None
    if part.volume_state is not None:
        state = book.attempt((*path, "volume_state"), _volume_state, part.volume_state)
    return state, _flue_gas(part, path, book)


def _liquid_only(
    part: LiquidFuelPart, path: KeyPath, book: FaultBook
) -> tuple[Assumed | None, float | None, Assumed | None]:
    density, expansion = part.density, part.expansion
    if expansion is not None and density is None and book.clean((*path, "density")):
        book.add(
            (*path, "density"),
            "an expansion coefficient is stated, but no density that it starts from",
            'add density = { value = "840 kg/m3", at = "15 degC", standard = "0.5 %" }, or remove expansion',
        )
    at_K = density.at.value if density is not None and density.at is not None else None
    return (
        stated_value(density, (*path, "density"), book),
        at_K,
        stated_value(expansion, (*path, "expansion"), book),
    )


def _common_factor(part: FuelPart, path: KeyPath, book: FaultBook) -> Assumed | None:
    key: UncertaintyKind = "standard" if part.limit is None else "limit"
    written = part.standard if part.limit is None else part.limit
    if written is None:
        return None
    spread = book.attempt((*path, key), relative_uncertainty, written, key, "the heating value")
    return None if spread is None else assumed(key_text((*path, "value_standard")), bare(1.0), spread, "1")


def _heating_values(
    part: FuelPart, phase: Literal["gas", "liquid"], zone: str | None, noting: tuple[KeyPath, FaultBook]
) -> tuple[HeatingValue, ...] | None:
    path, book = noting
    quantity, si_unit = _SI_VALUE[phase]
    scale = None
    if part.unit is not None:
        own = book.attempt((*path, "unit"), unit_conversion, part.unit, quantity)
        scale = None if own is None else own.scale
    records: list[HeatingValue] = []
    for index, entry in enumerate(part.values or []):
        place: KeyPath = (*path, "values", index)
        _check_pair(entry, place, book)
        if entry.from_ is None or zone is None:
            continue
        from_us = instant_us(entry.from_, zone)
        if records and from_us <= records[-1].from_us:
            book.add(
                (*place, "from"),
                f"{entry.from_.isoformat()} is not after the entry before it",
                "put the entries in order of time, each date once",
            )
        source = entry.source or ""
        lower, higher = (
            None
            if number is None
            else _heating_value((*place, side), number, (part.unit, scale, si_unit), source)
            for side, number in (("lower", entry.lower), ("higher", entry.higher))
        )
        records.append(HeatingValue(from_us, lower, higher, source))
    return tuple(records) if scale is not None else None


def _heating_value(path: KeyPath, number: float, unit: tuple[str, float | None, str], source: str) -> Assumed:
    # Its uncertainty is the factor common to all values of the fuel, so it has none of its own.
    text, scale, si_unit = unit
    return Assumed(key_text(path), number * (scale or 0.0), 0.0, si_unit, f"{number:g} {text}", source)


def _check_pair(entry: HeatingValuePart, place: KeyPath, book: FaultBook) -> None:
    for side in ("lower", "higher"):
        number = getattr(entry, side)
        if number is not None and number <= 0.0:
            book.add((*place, side), f"a heating value of {number:g} is not above zero", "correct it")
    if entry.lower is None and entry.higher is None and book.clean(place):
        book.add(
            (*place, "lower"), "the entry has no heating value", "add lower = 10.10, higher = 11.20, or both"
        )
    if entry.lower is not None and entry.higher is not None and entry.higher < entry.lower:
        book.add(
            (*place, "higher"),
            f"the higher heating value {entry.higher:g} is below the lower one, {entry.lower:g}",
            "exchange the two numbers",
        )


def _check_exergy(part: FuelPart, path: KeyPath, book: FaultBook) -> None:
    if part.exergy is None or part.exergy.of is None:
        return
    side = part.exergy.of
    for index, entry in enumerate(part.values or []):
        if getattr(entry, side) is None and book.clean((*path, "values", index)):
            book.add(
                (*path, "values", index, side),
                f"the exergy is stated for the {side} heating value, which this entry lacks",
                f"add {side} to the entry, or state the exergy for the other heating value",
            )


def _volume_state(text: str) -> VolumeState:
    pieces = [piece.strip() for piece in text.split(",")]
    fix = 'write temperature, pressure, and dry or wet: "0 degC, 101.325 kPa, dry"'
    if len(pieces) != 3 or pieces[2] not in ("dry", "wet"):
        raise UnusableError(f"{shown(text)} is no state of a gas", fix)
    temperature = amount(pieces[0], "temperature", "0 degC")
    pressure = amount(pieces[1], "pressure", "101.325 kPa")
    if temperature.value <= 0.0 or pressure.value <= 0.0:
        raise UnusableError(
            f'"{text}" is no state of a gas: its temperature or pressure is not above zero', fix
        )
    return VolumeState(temperature.value, pressure.value, pieces[2] == "dry", text)


def _flue_gas(part: GasFuel, path: KeyPath, book: FaultBook) -> FlueGas | None:
    air, gas = part.air_demand, part.flue_gas
    for key, one, other in (("air_demand", air, gas), ("flue_gas", gas, air)):
        if one is None and other is not None and book.clean((*path, key)):
            mate = "flue_gas" if key == "air_demand" else "air_demand"
            book.add((*path, key), f'"{mate}" is declared without "{key}"', f"add {key}, or remove {mate}")
    if air is None or gas is None:
        return None
    place: KeyPath = (*path, "flue_gas")
    numbers = [stated_value(air, (*path, "air_demand"), book)]
    for key in ("dry", "density_fuel", "heat_capacity"):
        value = getattr(gas, key)
        numbers.append(None if value is None else _part_of(value, gas, (*place, key), book))
    if any(number is None for number in numbers):
        return None
    demand, dry, density, heat_capacity = (number for number in numbers if number is not None)
    return FlueGas(demand, dry, density, heat_capacity)


def _part_of(value: Amount, gas: FlueGasPart, path: KeyPath, book: FaultBook) -> Assumed | None:
    """One of several numbers of different units that share one percentage."""
    key: UncertaintyKind = "standard" if gas.limit is None else "limit"
    written = gas.standard if gas.limit is None else gas.limit
    if written is None:
        return None
    spread = book.attempt((*path[:-1], key), relative_uncertainty, written, key, "each of these numbers")
    return None if spread is None else assumed(key_text(path), value, spread, plain_unit(value))


def resolve_meters(
    parts: Mapping[str, OperatingMeter | CorrectedMeter], book: FaultBook
) -> dict[str, GasMeter | None]:
    """Make the records of the gas meters; what their tags measure is checked with the other references."""
    meters: dict[str, GasMeter | None] = {}
    for name, part in parts.items():
        path: KeyPath = ("gas_meters", name)
        ratio = part.compressibility_ratio if isinstance(part, OperatingMeter) else None
        number = stated_value(ratio, (*path, "compressibility_ratio"), book)
        pressure, temperature = (
            (part.pressure, part.temperature) if isinstance(part, OperatingMeter) else (None, None)
        )
        record = GasMeter(name, part.reads, pressure, temperature, number)
        meters[name] = record if book.clean(path) else None
    return meters
