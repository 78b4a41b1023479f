"""Ratios that a wrong unit, reference state or setting leaves behind, each with where it comes from.

A ratio is taken as hit only where the measured one agrees with it within its own uncertainty.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Final, NamedTuple

if TYPE_CHECKING:
    from auditor.records.plant import Fuel

_ICE_POINT_K: Final = 273.15
MOST_NAMED: Final = 3
"""A question that offers more answers than these helps nobody: then nothing is said."""
_KNOWN: Final = 0.25
"""Largest U of a change, as a share of the change: beyond it too many ratios would fit to name any."""


class Familiar(NamedTuple):
    """One ratio that has a name."""

    cause: str
    """Code of the cause; the report puts it into words."""
    low: float
    """Least value of the ratio, above 1 [1]."""
    high: float
    """Largest value; the same as ``low`` where the ratio is exact [1]."""

    @property
    def middle(self) -> float:
        """The ratio itself, the geometric middle of a range [1]."""
        return math.sqrt(self.low * self.high)


def _exact(cause: str, ratio: float) -> Familiar:
    return Familiar(cause, ratio, ratio)


_REFERENCE_STATES = (
    # ISO 13443:1996: standard reference conditions of natural gas are 288.15 K and 101.325 kPa. Normal state
    # of DIN 1343: 273.15 K, 101.325 kPa. Volumes at 293.15 K: common practice, no source.
    _exact("normal or 15 degC", 288.15 / _ICE_POINT_K),
    _exact("normal or 20 degC", 293.15 / _ICE_POINT_K),
)
_GAS_HEATING_VALUE = Familiar("heating value basis", 1.10, 1.112)
"""Higher over lower heating value of natural gas; methane 1.110 (ISO 6976:2016, from memory: 55.57 and
50.03 MJ/kg)."""
_LIQUID_HEATING_VALUE = Familiar("heating value basis", 1.06, 1.07)
"""The same of gas oil and heavy fuel oil; common practice, no source."""
_DECADES = (
    # A pulse's weight, a prefix (kilo, mega), litres for cubic metres: exact by definition.
    _exact("decimal place", 10.0),
    _exact("decimal place", 100.0),
    _exact("decimal place", 1000.0),
)
_ENERGY = (
    # 1 kWh = 3.6 MJ, 1 t/h = 1/3.6 kg/s: exact by definition (SI brochure, table 8).
    _exact("factor 3.6", 3.6),
    # The energy of a quarter of an hour in kWh is a quarter of the mean power in kW.
    _exact("quarter-hour energy", 4.0),
)
_TRANSFORMERS = (
    # Ratios of rated primary currents of IEC 61869-2 (10, 12.5, 15, 20, 25, 30, 40, 50, 60, 75 A and
    # their decimal multiples) that are taken for one another: 600/400, 600/500, 400/200.
    _exact("transformer ratio", 1.5),
    _exact("transformer ratio", 1.2),
    _exact("transformer ratio", 2.0),
    # Line voltage of a three-phase system over its phase voltage.
    _exact("phase or line voltage", math.sqrt(3.0)),
)
_PULSE_WEIGHT = (_exact("pulse weight", 2.0),)

OF_POWER: Final = (*_TRANSFORMERS, *_ENERGY, *_DECADES)
"""Of electrical or shaft power."""
OF_FLOW: Final = (*_PULSE_WEIGHT, *_ENERGY, *_DECADES)
"""Of a flow of a liquid, or of heat that is made of one."""


def of_fuel(fuel: Fuel, by_mass: bool) -> tuple[Familiar, ...]:
    """Familiar ratios of a fuel's meter; the two heating values as declared where both are."""
    both = [
        entry.higher.value / entry.lower.value
        for entry in fuel.values
        if entry.lower is not None and entry.higher is not None
    ]
    usual = _GAS_HEATING_VALUE if fuel.phase == "gas" else _LIQUID_HEATING_VALUE
    basis = Familiar(usual.cause, min(both), max(both)) if both else usual
    states = () if by_mass or fuel.phase != "gas" else _REFERENCE_STATES
    return (*states, basis, *OF_FLOW)


def candidates(ratio: float, U: float, familiar: Iterable[Familiar]) -> tuple[Familiar, ...]:
    """Familiar ratios that agree with a measured one within its uncertainty, the nearest first.

    Parameters
    ----------
    ratio : float [1]
        Above zero; a ratio below 1 is taken as its inverse.
    U : float [1]
        Expanded uncertainty (k = 2) of ``ratio``.
    familiar : iterable of Familiar

    Returns
    -------
    tuple of Familiar
        Empty where none agrees, where the change is not known to a quarter of itself, and where more
        agree than ``MOST_NAMED``: such a ratio is known too badly to say anything.
    """
    if not (ratio > 0.0 and math.isfinite(ratio) and math.isfinite(U)):
        return ()
    size, allowed = abs(math.log(ratio)), U / ratio
    if allowed > _KNOWN * size:
        return ()
    hits = [each for each in dict.fromkeys(familiar) if _distance(size, each) <= allowed]
    hits.sort(key=lambda each: (_distance(size, each), abs(size - math.log(each.middle))))
    return tuple(hits) if len(hits) <= MOST_NAMED else ()


def _distance(size: float, of: Familiar) -> float:
    """How far a logarithm lies outside the range of a familiar ratio; zero inside."""
    return max(math.log(of.low) - size, size - math.log(of.high), 0.0)


def named(found: Sequence[Familiar]) -> str:
    """Codes of the causes, each with its ratio: ``normal or 15 degC=1.0549; ...``."""
    return "; ".join(f"{each.cause}={each.middle:.5g}" for each in found)
