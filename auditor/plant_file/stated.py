"""Numbers that nobody logs: their value and uncertainty, made into records."""

from __future__ import annotations

from auditor.plant_file.faults import FaultBook
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.quantities import Amount, UncertaintyKind, assumed, uncertainty, unit_conversion
from auditor.plant_file.substance_parts import (
    AirDemandPart,
    CompressibilityPart,
    ExergyPart,
    ExpansionPart,
    LiquidDensityPart,
    Stated,
)
from auditor.plant_file.written import key_text
from auditor.records.uncertain import Assumed, Uncertainty


def spread_of(part: Stated, value: Amount, path: KeyPath, book: FaultBook) -> Uncertainty | None:
    """Read the declared uncertainty of a number that nobody logs."""
    key: UncertaintyKind = "standard" if part.limit is None else "limit"
    written = part.standard if part.limit is None else part.limit
    if written is None:
        return None
    return book.attempt((*path, key), uncertainty, written, key, value.unit, value.quantity)


def stated(
    value: Amount, part: Stated, path: KeyPath, book: FaultBook, *, under: str = "", source: str = ""
) -> Assumed | None:
    """Make an assumed number of a value and the uncertainty written beside it.

    Its key is its place in the file: the table, or the key ``under`` it where the table holds other things.
    """
    spread = spread_of(part, value, path, book)
    if spread is None:
        return None
    place = (*path, under) if under else path
    return assumed(key_text(place), value, spread, plain_unit(value), source)


def plain_unit(value: Amount) -> str:
    """SI unit of an assumed number; a ratio of volumes is a bare ratio."""
    si_unit = unit_conversion(value.unit, value.quantity).si_unit
    return "1" if si_unit == "m3/m3" else si_unit


def stated_value(
    part: ExergyPart | AirDemandPart | LiquidDensityPart | ExpansionPart | CompressibilityPart | None,
    path: KeyPath,
    book: FaultBook,
) -> Assumed | None:
    """Make an assumed number of a table that holds a value and its uncertainty; None without one."""
    if part is None or part.value is None:
        return None
    if part.value.value <= 0.0:
        book.add((*path, "value"), f"{part.value.declared} is not above zero", "correct the value")
    return stated(part.value, part, path, book)
