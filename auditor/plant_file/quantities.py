"""Numbers with units as plant files write them, and declared uncertainties, turned into SI."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, TypeAlias

from auditor.plant_file.faults import UnusableError
from auditor.plant_file.written import shown
from auditor.records.uncertain import Assumed, Uncertainty
from auditor.units import Conversion, UnitError, conversion, parse_quantity, parse_uncertainty

UncertaintyText: TypeAlias = float | str | Sequence[float | str]
"""A bare number in the value's own unit, ``0.5 K``, ``2 %``, ``2 % of 1200 kW``, or a list of these."""

UncertaintyKind: TypeAlias = Literal["limit", "standard"]

RATES = {"energy": "power", "volume": "volume flow", "mass": "mass flow"}
"""What counts up, and the quantity of its rate."""
RATE_UNITS = {"energy": "kW", "volume": "m3/h", "mass": "kg/h"}
"""A usual unit of that rate, for remedies."""


@dataclass(frozen=True)
class Amount:
    """One number with its unit, in SI and in the words of the plant file."""

    value: float
    """In SI."""
    unit: str
    """As written."""
    quantity: str
    declared: str


def unit_conversion(unit: str, quantity: str | None = None) -> Conversion:
    """Conversion of a unit text to SI.

    Raises
    ------
    UnusableError
        If the unit is unknown or measures another quantity.
    """
    try:
        return conversion(unit, quantity=quantity)
    except UnitError as error:
        raise _unusable(error, f"write a unit of {quantity}" if quantity else "write a known unit") from error


def amount(text: object, quantity: str, example: str) -> Amount:
    """Read a number with its unit.

    Parameters
    ----------
    text : object
        Value of the plant file; anything but text is refused.
    quantity : str
        Quantity it must measure, a key of ``auditor.units.SI_UNITS``.
    example : str
        What to write, for the remedy.

    Raises
    ------
    UnusableError
        If it is no text, has no number, no unit, or a unit of another quantity.
    """
    if not isinstance(text, str):
        raise UnusableError(
            f"{shown(text)} stands without a unit", f'write the number with its unit in quotes: "{example}"'
        )
    try:
        read = parse_quantity(text, quantity=quantity)
    except UnitError as error:
        raise _unusable(error, f'write for example "{example}"') from error
    if not math.isfinite(read.value_si):
        raise UnusableError(f"{shown(text)} is not finite", f'write for example "{example}"')
    return Amount(read.value_si, read.unit_text, read.quantity, text.strip())


def difference(quantity: str) -> str:
    """Quantity of a difference of two values: only a temperature has one of its own."""
    return "temperature difference" if quantity == "temperature" else quantity


def _unit_of_difference(unit: str, quantity: str) -> str:
    return "K" if quantity == "temperature" else unit


def in_own_unit(value: float | str, unit: str, quantity: str) -> float:
    """SI size of a bare number in a value's own unit, or of a text that names its unit.

    Of a temperature, a difference. ``quantity`` is that of the value itself.

    Raises
    ------
    UnusableError
        If the text cannot be read, is negative, or has a unit of another quantity.
    """
    wanted = difference(quantity)
    size = (
        amount(value, wanted, f"1 {_unit_of_difference(unit, quantity)}").value
        if isinstance(value, str)
        else float(unit_conversion(unit, wanted).difference_to_si(value))
    )
    if size < 0.0:
        raise UnusableError(f"{shown(value)} is negative", "write it without a sign")
    return size


def uncertainty(text: UncertaintyText, kind: UncertaintyKind, unit: str, quantity: str) -> Uncertainty:
    """One standard uncertainty out of a declared limit or standard uncertainty.

    Raises
    ------
    UnusableError
        If it cannot be read, is negative, or is a percentage of a temperature reading.
    """
    try:
        return parse_uncertainty(text, kind=kind, unit_text=unit, quantity=quantity)
    except UnitError as error:
        share = "" if quantity == "temperature" else f'{kind} = "2 %" or '
        example = f'{share}{kind} = "0.5 {_unit_of_difference(unit, quantity)}"'
        raise _unusable(error, f"write for example {example}") from error


def relative_uncertainty(text: UncertaintyText, kind: UncertaintyKind, of: str) -> Uncertainty:
    """Uncertainty that only a percentage can state, because it is common to several numbers.

    Raises
    ------
    UnusableError
        If it has an absolute part or cannot be read.
    """
    parts = [text] if isinstance(text, float | int | str) else list(text)
    if any(not isinstance(part, str) or not part.rstrip().endswith("%") for part in parts):
        raise UnusableError(
            f"the uncertainty {shown(text)} is no percentage", f'write it in percent of {of}: {kind} = "1 %"'
        )
    return uncertainty(text, kind, "1", "dimensionless")


def assumed(key: str, value: Amount, spread: Uncertainty, si_unit: str, source: str = "") -> Assumed:
    """Make an assumed number out of its value and its declared uncertainty."""
    standard = math.hypot(spread.absolute, spread.relative * value.value)
    return Assumed(key, value.value, standard, si_unit, f"{value.declared}, {spread.declared}", source)


def bare(value: float) -> Amount:
    """Take a number that has no unit."""
    return Amount(value, "1", "dimensionless", f"{value:g}")


def _unusable(error: UnitError, otherwise: str) -> UnusableError:
    fix = " or ".join(f'"{word}"' for word in error.suggestions)
    return UnusableError(f"{shown(error.text)} {error.reason}", f"write {fix}" if fix else otherwise)
