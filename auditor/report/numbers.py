"""Numbers as they stand on paper: display units, and never more digits than the uncertainty carries."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Decimal

from auditor.records.nomenclature import TERMS
from auditor.units import DISPLAY, DisplayUnit

THIN = "\u202f"
"""Narrow no-break space: between groups of three digits."""
NBSP = "\u00a0"
MINUS = "\u2212"
UNKNOWN = "not known"


@dataclass(frozen=True)
class Shown:
    """One figure in its display unit: value and expanded uncertainty as text."""

    value: str
    U: str
    """Empty when the uncertainty is not known."""
    unit: str
    U_unit: str = ""
    """Unit of the uncertainty where it is another one: kelvin beside degrees Celsius."""

    @property
    def text(self) -> str:
        """``42.3 ± 0.5 %``; without an uncertainty, that is said."""
        if self.value == UNKNOWN:
            return UNKNOWN
        if not self.U:
            return f"{self.value}{NBSP}{self.unit}"
        if self.U_unit:
            return f"{self.value}{NBSP}{self.unit} ±{NBSP}{self.U}{NBSP}{self.U_unit}"
        return f"{self.value}{NBSP}±{NBSP}{self.U}{NBSP}{self.unit}"


def grouped(number: Decimal) -> str:
    """Write a decimal with its own places, thousands apart by a thin space and a true minus sign."""
    text = f"{number:,f}".replace(",", THIN).replace("-", MINUS)
    return text.removeprefix(MINUS) if not number else text


def places_of(expanded_U: float) -> int:
    """Decimal places that an uncertainty justifies.

    By its first three digits: from 100 to 354 two digits are kept, from 355 to 949 one, and from 950 on
    it is rounded up to 1000 and two are kept. The rounding rule of the Particle Data Group (Review of
    Particle Physics, introduction, section on rounding), quoted from memory.

    Examples
    --------
    >>> places_of(0.53), places_of(0.0249), places_of(340.0), places_of(0.97)
    (1, 3, -1, 1)
    """
    exponent = math.floor(math.log10(expanded_U))
    digits = round(expanded_U / 10.0**exponent * 100.0)
    return 1 - exponent if digits < 355 else -exponent


def to_places(value: float, places: int) -> str:
    """Round half to even at a number of places (negative: tens, hundreds) and group the digits."""
    quantum = Decimal(1).scaleb(-places)
    rounded = Decimal(repr(float(value))).quantize(quantum, ROUND_HALF_EVEN)
    return grouped(rounded if places >= 0 else rounded.quantize(Decimal(1)))


def significant(value: float, digits: int = 3) -> str:
    """Round to significant digits, for numbers without an uncertainty of their own.

    Examples
    --------
    >>> significant(0.012345), significant(-41.26), significant(float("nan"))
    ('0.0123', '−41.3', 'not known')
    """
    if not math.isfinite(value):
        return UNKNOWN
    if value == 0.0:
        return "0"
    exponent = math.floor(math.log10(abs(value)))
    return to_places(value, digits - 1 - exponent)


def exact(value: float, digits: int = 6) -> str:
    """Write a declared number as it was meant: up to some digits, without zeros that nobody wrote.

    Examples
    --------
    >>> exact(2.35), exact(0.3125), exact(60.0)
    ('2.35', '0.3125', '60')
    """
    text = significant(value, digits)
    return text.rstrip("0").rstrip(".") if "." in text else text


def whole(number: int) -> str:
    """Write a whole number with its digits in groups of three."""
    return grouped(Decimal(int(number)))


def count(value: float, one: str, many: str | None = None) -> str:
    """Write a number of things: ``1 interval``, ``2 976 intervals``, ``no intervals``."""
    plural = many if many is not None else f"{one}s"
    number = round(value)
    if number == 0:
        return f"no {plural}"
    return f"{grouped(Decimal(number))}{NBSP}{one if number == 1 else plural}"


def shown(value: float, expanded_U: float, unit: DisplayUnit) -> Shown:
    """Bring an SI figure into a display unit, rounded as its uncertainty justifies.

    Parameters
    ----------
    value, expanded_U : float
        SI; NaN where not known.
    unit : DisplayUnit
        What the reader sees.
    """
    if not math.isfinite(value):
        return Shown(UNKNOWN, "", unit.label)
    number = float(unit.from_si(value))
    if not math.isfinite(expanded_U) or expanded_U <= 0.0:
        return Shown(significant(number), "", unit.label)
    spread = expanded_U / unit.size_si
    places = places_of(spread)
    U_unit = "K" if unit.zero_si else ""
    return Shown(to_places(number, places), to_places(spread, places), unit.label, U_unit)


def figure(key: str, value: float, expanded_U: float) -> Shown:
    """Show a figure of the nomenclature; a margin is a difference of percentages: points."""
    unit = DISPLAY[TERMS[key].quantity]
    if key == "margin":
        unit = DisplayUnit("points", unit.size_si)
    return shown(value, expanded_U, unit)


def percent(share: float, places: int = 1) -> str:
    """Write a bare share as percent."""
    if not math.isfinite(share):
        return UNKNOWN
    return f"{to_places(share * 100.0, places)}{NBSP}%"


def energy(joules: float) -> str:
    """Size of something in kilowatt-hours, megawatt-hours above 10 000 kWh; three digits."""
    if not math.isfinite(joules):
        return UNKNOWN
    unit = DISPLAY["small energy"]
    if abs(joules) >= 10_000.0 * unit.size_si:
        unit = DISPLAY["energy"]
    return f"{significant(joules / unit.size_si)}{NBSP}{unit.label}"


def power(watts: float) -> str:
    """Write a power in kilowatts, three digits."""
    if not math.isfinite(watts):
        return UNKNOWN
    unit = DISPLAY["power"]
    return f"{significant(watts / unit.size_si)}{NBSP}{unit.label}"


def file_size(size: int) -> str:
    """Bytes for small files, kB and MB (powers of ten) above."""
    if size < 10_000:
        return f"{grouped(Decimal(size))}{NBSP}bytes"
    if size < 10_000_000:
        return f"{significant(size / 1e3)}{NBSP}kB"
    return f"{significant(size / 1e6)}{NBSP}MB"


def duration(seconds: float) -> str:
    """Write a length of time as one would say it.

    Examples
    --------
    >>> [duration(s).replace(NBSP, " ") for s in (45, 2400, 18000, 111600, 60*60*24*6)]
    ['45 s', '40 min', '5 h', '31 h', '6 days']
    """
    if not math.isfinite(seconds):
        return UNKNOWN
    if seconds < 90:
        return f"{exact(seconds, 3)}{NBSP}s"
    minutes = round(seconds / 60)
    if minutes < 120:
        return f"{minutes}{NBSP}min"
    hours, rest = divmod(minutes, 60)
    if hours < 72:
        return f"{hours}{NBSP}h" + (f"{NBSP}{rest}{NBSP}min" if rest else "")
    days = exact(seconds / 86400, 2)
    return f"{days}{NBSP}days"
