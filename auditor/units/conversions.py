"""From the units of logs and plant files to SI: a factor and an offset, found once per unit text."""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from auditor.units.spellings import Meaning, UnitError, meanings, nearest, units_of
from auditor.units.table import SI_UNITS

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

_LEVEL = "temperature"
"""The only kind of quantity whose zero lies elsewhere than the SI's."""

_LIBRARY_SI: Final = {
    "K": "kelvin",
    "Pa": "pascal",
    "W": "watt",
    "J": "joule",
    "m3": "meter**3",
    "kg": "kilogram",
    "m3/s": "meter**3/second",
    "kg/s": "kilogram/second",
    "kg/m3": "kilogram/meter**3",
    "J/(kg K)": "joule/kilogram/kelvin",
    "J/m3": "joule/meter**3",
    "J/kg": "joule/kilogram",
    "1": "dimensionless",
    "m3/m3": "dimensionless",
    "1/K": "1/kelvin",
    "N m": "newton*meter",
    "1/s": "1/second",
    "m": "meter",
    "s": "second",
}


@dataclass(frozen=True)
class Conversion:
    """How a raw number becomes SI: ``scale * raw + offset``.

    Examples
    --------
    >>> Conversion(1.0, 273.15, "K", "temperature").to_si([0.0, 100.0])
    array([273.15, 373.15])
    """

    scale: float
    offset: float
    si_unit: str
    quantity: str
    """Kind of quantity, a key of `SI_UNITS`."""

    def to_si(self, raw: ArrayLike) -> NDArray[np.float64]:
        """Convert numbers in the unit's own scale; NaN stays NaN."""
        converted: NDArray[np.float64] = np.asarray(
            np.asarray(raw, dtype=np.float64) * self.scale + self.offset
        )[()]
        return converted

    def difference_to_si(self, raw: ArrayLike) -> NDArray[np.float64]:
        """Convert a difference or a spread, which has no offset: 5 degC of it are 5 K."""
        converted: NDArray[np.float64] = np.asarray(np.asarray(raw, dtype=np.float64) * self.scale)[()]
        return converted


def conversion(unit_text: str, *, quantity: str | None = None) -> Conversion:
    """Find how numbers in a unit become SI.

    Parameters
    ----------
    unit_text : str
        The unit as a person or a logger wrote it.
    quantity : str, optional
        Kind of quantity that is needed, a key of `SI_UNITS`. Without it the
        likeliest meaning is taken (degC: a temperature, not a difference).

    Returns
    -------
    Conversion

    Raises
    ------
    UnitError
        If the text is unknown, ambiguous (with what to write instead), says
        more than a unit (``barg``, ``Nm3``), or measures another quantity.
    ValueError
        If ``quantity`` is no key of `SI_UNITS`: a slip of the caller.

    Examples
    --------
    >>> conversion("kWh")
    Conversion(scale=3600000.0, offset=0.0, si_unit='J', quantity='energy')
    >>> conversion("degC", quantity="temperature difference").offset
    0.0
    """
    if quantity is not None and quantity not in SI_UNITS:
        raise ValueError(f"no such kind of quantity: {quantity!r}")
    found = meanings(unit_text)
    fitting = [m for m in found if quantity in (None, m.quantity)]
    if not fitting:
        reason = f"is a unit of {found[0].quantity}, but one of {quantity} is needed here"
        near = nearest(unit_text, quantity) or units_of(str(quantity))[:3]
        raise UnitError(unit_text, reason, near)
    return _from_library(fitting[0])


@functools.cache
def _from_library(meaning: Meaning) -> Conversion:
    si_unit = SI_UNITS[meaning.quantity]
    registry, target = _registry(), _LIBRARY_SI[si_unit]
    if meaning.quantity != _LEVEL or meaning.expression == "kelvin":
        one = registry.Quantity(meaning.expression).to(target).magnitude
        return Conversion(float(one), 0.0, si_unit, meaning.quantity)
    # Of a temperature scale the step and the zero are two questions: taking the step as the
    # difference of two converted levels would lose three digits.
    step = registry.Quantity(1.0, f"delta_{meaning.expression}").to(target).magnitude
    zero = registry.Quantity(0.0, meaning.expression).to(target).magnitude
    return Conversion(float(step), float(zero), si_unit, meaning.quantity)


@functools.cache
def _registry() -> Any:
    # A third of a second, so only when the first unit is really converted. Our own registry: the
    # library's application-wide one belongs to whoever runs this program.
    import pint

    return pint.UnitRegistry()
