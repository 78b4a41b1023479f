"""The units that people read: from SI to the scale of a report, by plain factors."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray


@dataclass(frozen=True)
class DisplayUnit:
    """One scale of the report: ``shown = (value_si - zero_si) / size_si``.

    Examples
    --------
    >>> DISPLAY["temperature"].from_si(373.15)
    np.float64(100.0)
    """

    label: str
    size_si: float
    """One of this unit in SI."""
    zero_si: float = 0.0
    """Where its scale begins, in SI."""

    def from_si(self, value_si: ArrayLike) -> NDArray[np.float64]:
        """Return SI values in this unit; NaN stays NaN."""
        shown: NDArray[np.float64] = np.asarray(
            (np.asarray(value_si, dtype=np.float64) - self.zero_si) / self.size_si
        )[()]
        return shown


DISPLAY: Final[Mapping[str, DisplayUnit]] = MappingProxyType(
    {
        "temperature": DisplayUnit("°C", 1.0, 273.15),
        "temperature difference": DisplayUnit("K", 1.0),
        "pressure": DisplayUnit("bar", 1e5),
        "power": DisplayUnit("kW", 1e3),
        "energy": DisplayUnit("MWh", 3.6e9),
        "small energy": DisplayUnit("kWh", 3.6e6),
        "volume": DisplayUnit("m³", 1.0),
        "mass": DisplayUnit("t", 1e3),
        "volume flow": DisplayUnit("m³/h", 1.0 / 3600.0),
        "mass flow": DisplayUnit("kg/s", 1.0),
        "density": DisplayUnit("kg/m³", 1.0),
        "heat capacity": DisplayUnit("kJ/(kg K)", 1e3),
        "heating value by volume": DisplayUnit("kWh/m³", 3.6e6),
        "heating value by mass": DisplayUnit("kWh/kg", 3.6e6),
        "entropy rate": DisplayUnit("kW/K", 1e3),
        "fraction": DisplayUnit("%", 0.01),
        "dimensionless": DisplayUnit("1", 1.0),
        "volume ratio": DisplayUnit("m³/m³", 1.0),
        "volume expansion": DisplayUnit("1/K", 1.0),
        "torque": DisplayUnit("N m", 1.0),
        "rotational speed": DisplayUnit("1/min", 1.0 / 60.0),
        "length": DisplayUnit("m", 1.0),
        "time": DisplayUnit("h", 3600.0),
    }
)
"""The unit of each kind of quantity in the report; every key of ``SI_UNITS`` is here."""


def to_display(value_si: ArrayLike, quantity: str) -> NDArray[np.float64]:
    """Return SI values in the report's unit for their kind of quantity.

    Examples
    --------
    >>> to_display(3.6e9, "energy"), DISPLAY["energy"].label
    (np.float64(1.0), 'MWh')
    """
    return DISPLAY[quantity].from_si(value_si)
