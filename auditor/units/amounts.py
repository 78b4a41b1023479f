"""Amounts with their unit in the text, and uncertainties, as a plant file writes them."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Literal, TypeAlias

from auditor.records.uncertain import Uncertainty
from auditor.units.conversions import Conversion, conversion
from auditor.units.spellings import UnitError, units_of

Amount: TypeAlias = float | str | Sequence[float | str]
"""An uncertainty as written: a bare number, a text with a unit, or a list of these."""

_NUMBER: Final = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?"
_NUMBER_AND_UNIT: Final = re.compile(rf"\s*({_NUMBER})\s*(.*?)\s*")
_SHARE: Final = re.compile(rf"\s*({_NUMBER})\s*%\s*of\s+(.+?)\s*")


@dataclass(frozen=True)
class Quantity:
    """An amount in SI, with the unit it was written in."""

    value_si: float
    unit_text: str
    quantity: str
    """Kind of quantity, a key of ``SI_UNITS``."""


def parse_quantity(text: str, *, quantity: str | None = None) -> Quantity:
    """Read an amount that carries its unit: ``"5 K"``, ``"30 min"``, ``"2 % of 1200 kW"``.

    Parameters
    ----------
    text : str
        Number with a decimal point, then the unit; or a share of such an
        amount. A share of a temperature is a share of a difference.
    quantity : str, optional
        Kind of quantity that is needed, a key of ``SI_UNITS``.

    Returns
    -------
    Quantity

    Raises
    ------
    UnitError
        If there is no number, a decimal comma, no unit, or one that is not
        known or measures another quantity.

    Examples
    --------
    >>> parse_quantity("10.10 kWh/m3").value_si
    36360000.0
    >>> parse_quantity("2 % of 1200 kW", quantity="power").value_si
    24000.0
    """
    share = _SHARE.fullmatch(_text(text))
    if share:
        kind = "temperature difference" if quantity == "temperature" else quantity
        whole = parse_quantity(share[2], quantity=kind)
        return Quantity(float(share[1]) / 100.0 * whole.value_si, whole.unit_text, whole.quantity)
    number, unit = _number_and_unit(text)
    if not unit:
        raise UnitError(text, "has no unit", (f"{text.strip()} {_example_unit(quantity)}",))
    factor = conversion(unit, quantity=quantity)
    return Quantity(float(factor.to_si(number)), unit, factor.quantity)


def parse_uncertainty(
    amount: Amount, *, kind: Literal["limit", "standard"], unit_text: str, quantity: str
) -> Uncertainty:
    """Read an uncertainty: ``0.2``, ``"0.5 K"``, ``"2 %"``, ``"2 % of 1200 kW"``, or a list of these.

    A bare number is in the unit of the value itself; ``%`` is of the reading
    unless ``of`` names a span; the parts of a list add in quadrature. The
    uncertainty of a temperature is a difference: 0.5 degC of it are 0.5 K.

    Parameters
    ----------
    amount : float, str or sequence of these
        As written in the plant file.
    kind : "limit" or "standard"
        A limit is the half-width of a rectangular distribution and is divided
        by the square root of three (JCGM 100:2008, section 4.3.7).
    unit_text : str
        Unit of the value, for bare numbers.
    quantity : str
        Kind of quantity of the value, a key of ``SI_UNITS``.

    Returns
    -------
    Uncertainty
        One standard uncertainty: an absolute part in SI, a relative part as a
        fraction of the reading, and the words it came from.

    Raises
    ------
    UnitError
        If an amount is negative, not finite or not understood, a percentage is
        of a temperature reading (Celsius and kelvin would differ) or, without
        ``of reading``, of a value that is itself in percent.

    Examples
    --------
    >>> parse_uncertainty("2 % of 1200 kW", kind="standard", unit_text="kW", quantity="power")
    Uncertainty(absolute=24000.0, relative=0.0, declared='standard 2 % of 1200 kW')
    """
    several = isinstance(amount, Sequence) and not isinstance(amount, str)
    amounts: Sequence[float | str] = amount if several else [amount]  # type: ignore[assignment,list-item]
    if not amounts:
        raise UnitError("[]", "is an empty list of uncertainties")
    spread = "temperature difference" if quantity == "temperature" else quantity
    own = conversion(unit_text, quantity=spread)
    parts = [_absolute_and_relative(part, own, quantity) for part in amounts]
    divisor = math.sqrt(3.0) if kind == "limit" else 1.0
    words = " and ".join(_in_words(part, unit_text) for part in amounts)
    return Uncertainty(
        absolute=math.hypot(*(absolute for absolute, _ in parts)) / divisor,
        relative=math.hypot(*(relative for _, relative in parts)) / divisor,
        declared=f"{kind} {words}",
    )


def _absolute_and_relative(amount: float | str, own: Conversion, quantity: str) -> tuple[float, float]:
    if isinstance(amount, bool) or not isinstance(amount, int | float | str):
        raise UnitError(str(amount), "is neither a number nor a text")
    if not isinstance(amount, str):
        return _not_negative(str(amount), float(own.difference_to_si(amount))), 0.0
    share = _SHARE.fullmatch(amount)
    of_reading = share is not None and share[2] == "reading"
    number, unit = _number_and_unit(amount) if share is None else (float(share[1]), "%")
    if unit == "%" and (share is None or of_reading):
        if quantity == "temperature":
            example = ("0.5 K", "0.3 % of 150 K")
            raise UnitError(amount, "of a temperature reading depends on its scale", example)
        if own.quantity == "fraction" and not of_reading:
            example = (f"{number:g} % of reading", f"{number:g} without quotes for points")
            raise UnitError(amount, "may be points or a share of the reading", example)
        return 0.0, _not_negative(amount, number / 100.0)
    if not unit:
        return _not_negative(amount, float(own.difference_to_si(number))), 0.0
    return _not_negative(amount, parse_quantity(amount, quantity=own.quantity).value_si), 0.0


def _not_negative(text: str, value: float) -> float:
    if not (math.isfinite(value) and value >= 0.0):
        raise UnitError(text, "cannot be an uncertainty: it must be finite and not negative")
    return value


def _number_and_unit(text: str) -> tuple[float, str]:
    match = _NUMBER_AND_UNIT.fullmatch(_text(text))
    if match is None:
        raise UnitError(text, "does not begin with a number", ("12.5 kW",))
    rest = match[2]
    if re.match(r",\d", rest):
        raise UnitError(text, "has a decimal comma; the plant file takes a decimal point")
    if re.match(r"[\d.+-]", rest) and not re.match(r"1/", rest) and rest != "-":
        raise UnitError(text, "has more than one number; write it without blanks or separators")
    number = float(match[1])
    if math.isinf(number):
        raise UnitError(text, "is too large for a number")
    return number, rest


def _text(text: object) -> str:
    if not isinstance(text, str):
        raise UnitError(str(text), "needs a unit and therefore quotes")
    return text


def _in_words(amount: float | str, unit_text: str) -> str:
    return amount.strip() if isinstance(amount, str) else f"{amount:g} {unit_text}"


def _example_unit(quantity: str | None) -> str:
    return units_of(quantity)[0] if quantity else "kW"
