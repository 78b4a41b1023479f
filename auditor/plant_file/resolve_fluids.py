"""Fluids that carry heat, from checked parts to records in SI."""

from __future__ import annotations

from collections.abc import Mapping

from auditor.plant_file.faults import FaultBook, UnusableError
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.quantities import bare, unit_conversion
from auditor.plant_file.stated import stated
from auditor.plant_file.substance_parts import (
    ConstantDensity,
    ConstantHeatCapacity,
    DeclaredFluid,
    GlycolFluid,
    PropertyTable,
)
from auditor.records.plant import Fluid
from auditor.records.uncertain import Assumed

WATER = Fluid("water", "water", None, None, None, None, None)
_LARGEST_GLYCOL_FRACTION = 0.6  # reach of the published property correlations


def resolve_fluids(
    parts: Mapping[str, DeclaredFluid | GlycolFluid], book: FaultBook
) -> dict[str, Fluid | None]:
    """Make the records of the declared fluids, with water before them."""
    fluids: dict[str, Fluid | None] = {"water": WATER}
    for name, part in parts.items():
        path = ("fluids", name)
        if name == "water":
            book.add(
                path,
                '"water" is built in and need not be declared',
                "remove the table, or choose another name",
            )
            continue
        record = _glycol(name, part, book) if isinstance(part, GlycolFluid) else _declared(name, part, book)
        fluids[name] = record if book.clean(path) else None
    return fluids


def _glycol(name: str, part: GlycolFluid, book: FaultBook) -> Fluid:
    fraction = part.mass_fraction
    if fraction is not None and not 0.0 < fraction.value <= _LARGEST_GLYCOL_FRACTION:
        book.add(
            ("fluids", name, "mass_fraction"),
            f"{fraction.declared} lies outside 0 to {_LARGEST_GLYCOL_FRACTION:g}, the reach of the data",
            "write the share of the glycol by mass, such as 0.35; "
            "another mixture is declared by heat_capacity and density",
        )
    return Fluid(name, part.kind, None if fraction is None else fraction.value, None, None, None, None)


def _declared(name: str, part: DeclaredFluid, book: FaultBook) -> Fluid:
    heat = _property(part.heat_capacity, "heat capacity", ("fluids", name, "heat_capacity"), book)
    density = _property(part.density, "density", ("fluids", name, "density"), book)
    return Fluid(name, "declared", None, *heat, *density)


_Property = tuple[Assumed | None, tuple[tuple[float, float], ...] | None]


def _property(
    part: ConstantHeatCapacity | ConstantDensity | PropertyTable | None,
    quantity: str,
    path: KeyPath,
    book: FaultBook,
) -> _Property:
    if part is None:
        return None, None
    if isinstance(part, PropertyTable):
        table = book.attempt(path, _table, part, quantity)
        return stated(bare(1.0), part, path, book), table
    return (None if part.constant is None else stated(part.constant, part, path, book)), None


def _table(part: PropertyTable, quantity: str) -> tuple[tuple[float, float], ...] | None:
    if None in (part.temperatures, part.values, part.temperature_unit, part.unit):
        return None
    level = unit_conversion(part.temperature_unit, "temperature")
    value = unit_conversion(part.unit, quantity)
    rising = all(low < high for low, high in zip(part.temperatures, part.temperatures[1:], strict=False))
    if len(part.temperatures) != len(part.values) or len(part.values) < 2 or not rising:
        raise UnusableError(
            f"{len(part.temperatures)} temperatures stand beside {len(part.values)} values, or do not rise",
            "write two or more rising temperatures, and one value for each",
        )
    if min(part.values) <= 0.0:
        raise UnusableError(f"a {quantity} of {min(part.values):g} is not above zero", "correct the values")
    kelvins = (level.scale * temperature + level.offset for temperature in part.temperatures)
    return tuple(zip(kelvins, (value.scale * number for number in part.values), strict=True))
