"""Fluids that carry heat: one small interface, so that metering and ceilings treat any of them alike.

Enthalpy and entropy differences are taken at constant pressure, which is what
a heat meter and an entropic mean temperature need. Nothing is extrapolated:
outside the range a fluid is known for, the answer is NaN.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass, field
from typing import Final, Literal, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from auditor.physics import water
from auditor.physics.arrays import FloatArray, as_float, as_kelvin, scalar_or_array
from auditor.physics.constants import STANDARD_ATMOSPHERE_PA

HEAT_METER_PRESSURE_PA: Final = 1.6e6
"""Pressure at which liquid water is evaluated when nothing else is known.

EN 1434-1:2015, annex A, takes 16 bar for heat meters. Against 3 bar it moves
the heat of a 90/70 degC circuit by 0.07 % and the density by 0.06 %.
"""

GLYCOL_LARGEST_MASS_FRACTION: Final = 0.6
"""Reach of the published glycol correlations."""

_GLYCOL_POINTS: Final = 128


class HeatCarrier(Protocol):
    """What a fluid answers; temperatures [K] of shape (n,) or scalar, NaN where it does not know."""

    @property
    def name(self) -> str:
        """What the fluid is called in messages."""
        ...

    def heat_capacity_J_per_kgK(self, temperature_K: ArrayLike) -> FloatArray:
        """Isobaric heat capacity [J/(kg K)] at a temperature [K]."""
        ...

    def enthalpy_change_J_per_kg(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Integral of c_p dT [J/kg]; positive when it gets warmer."""
        ...

    def entropy_change_J_per_kgK(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Integral of c_p dT / T [J/(kg K)]; positive when it gets warmer."""
        ...

    def density_kg_per_m3(self, temperature_K: ArrayLike) -> FloatArray | None:
        """Density [kg/m3]; None when the fluid was declared without one."""
        ...


@dataclass(frozen=True)
class ConstantHeatCarrier:
    """A liquid or gas with one stated heat capacity, at any temperature.

    Examples
    --------
    >>> air = ConstantHeatCarrier("cooling air", 1006.0)
    >>> air.enthalpy_change_J_per_kg(288.15, 305.15)
    np.float64(17102.0)
    """

    name: str
    heat_capacity: float
    """[J/(kg K)]."""
    density: float | None = None
    """[kg/m3]."""

    def __post_init__(self) -> None:
        if not self.heat_capacity > 0.0 or (self.density is not None and not self.density > 0.0):
            raise ValueError(f"{self.name}: heat capacity and density must be positive")

    def heat_capacity_J_per_kgK(self, temperature_K: ArrayLike) -> FloatArray:
        """Return the stated heat capacity [J/(kg K)]; NaN for NaN [K]."""
        return scalar_or_array(_constant(self.heat_capacity, temperature_K))

    def enthalpy_change_J_per_kg(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """``c_p (T_to - T_from)`` [J/kg]."""
        start, end = as_kelvin(from_K, self.name), as_kelvin(to_K, self.name)
        return scalar_or_array(self.heat_capacity * (end - start))

    def entropy_change_J_per_kgK(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """``c_p ln(T_to / T_from)`` [J/(kg K)]."""
        start, end = as_kelvin(from_K, self.name), as_kelvin(to_K, self.name)
        return scalar_or_array(self.heat_capacity * np.log1p((end - start) / start))

    def density_kg_per_m3(self, temperature_K: ArrayLike) -> FloatArray | None:
        """Return the stated density [kg/m3]; None without one."""
        if self.density is None:
            return None
        return scalar_or_array(_constant(self.density, temperature_K))


@dataclass(frozen=True)
class TabulatedHeatCarrier:
    """A fluid with tables of heat capacity and density, linear between their points.

    The integrals of ``c_p dT`` and ``c_p dT / T`` are exact for that piecewise
    line, not a sum over steps. Outside the table everything is NaN.

    Examples
    --------
    >>> oil = TabulatedHeatCarrier("thermal oil", (458.15, 548.15), (2140.0, 2470.0))
    >>> oil.enthalpy_change_J_per_kg([458.15, 300.0], 548.15)
    array([207450.,     nan])
    """

    name: str
    temperatures_K: tuple[float, ...]
    """Strictly rising, at least two."""
    heat_capacities: tuple[float, ...]
    """[J/(kg K)] at ``temperatures_K``."""
    density_temperatures_K: tuple[float, ...] = ()
    """Strictly rising; empty when no density is known."""
    densities: tuple[float, ...] = ()
    """[kg/m3] at ``density_temperatures_K``."""
    _enthalpies: FloatArray = field(init=False, repr=False, compare=False)
    _entropies: FloatArray = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        _check_table(f"{self.name}, heat capacity", self.temperatures_K, self.heat_capacities)
        if self.density_temperatures_K or self.densities:
            _check_table(f"{self.name}, density", self.density_temperatures_K, self.densities)
        nodes, values = np.array(self.temperatures_K), np.array(self.heat_capacities)
        step, rise = np.diff(nodes), np.diff(values)
        slope = rise / step
        heat = (values[:-1] + rise / 2.0) * step
        order = (values[:-1] - slope * nodes[:-1]) * np.log1p(step / nodes[:-1]) + rise
        object.__setattr__(self, "_enthalpies", np.concatenate([[0.0], np.cumsum(heat)]))
        object.__setattr__(self, "_entropies", np.concatenate([[0.0], np.cumsum(order)]))

    def heat_capacity_J_per_kgK(self, temperature_K: ArrayLike) -> FloatArray:
        """Heat capacity [J/(kg K)], linear between the points of the table [K]."""
        kelvin = as_kelvin(temperature_K, self.name)
        return scalar_or_array(_interpolated(kelvin, self.temperatures_K, self.heat_capacities))

    def enthalpy_change_J_per_kg(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Exact integral of c_p dT [J/kg]."""
        return scalar_or_array(self._enthalpy(to_K) - self._enthalpy(from_K))

    def entropy_change_J_per_kgK(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Exact integral of c_p dT / T [J/(kg K)]."""
        return scalar_or_array(self._entropy(to_K) - self._entropy(from_K))

    def density_kg_per_m3(self, temperature_K: ArrayLike) -> FloatArray | None:
        """Density [kg/m3], linear between the points of its table; None without one."""
        if not self.densities:
            return None
        kelvin = as_kelvin(temperature_K, self.name)
        return scalar_or_array(_interpolated(kelvin, self.density_temperatures_K, self.densities))

    def _segment(self, kelvin: FloatArray) -> tuple[NDArray[np.intp], FloatArray, FloatArray, FloatArray]:
        # Index of the segment below each temperature, distance into it, c_p at its start, slope.
        nodes, values = np.array(self.temperatures_K), np.array(self.heat_capacities)
        index = np.clip(np.searchsorted(nodes, kelvin, side="right") - 1, 0, len(nodes) - 2)
        slopes = np.diff(values) / np.diff(nodes)
        within = (kelvin >= nodes[0]) & (kelvin <= nodes[-1])
        distance = np.where(within, kelvin - nodes[index], np.nan)
        return index, distance, values[index], slopes[index]

    def _enthalpy(self, temperature_K: ArrayLike) -> FloatArray:
        index, distance, start, slope = self._segment(as_kelvin(temperature_K, self.name))
        enthalpy: FloatArray = self._enthalpies[index] + (start + slope * distance / 2.0) * distance
        return enthalpy

    def _entropy(self, temperature_K: ArrayLike) -> FloatArray:
        index, distance, start, slope = self._segment(as_kelvin(temperature_K, self.name))
        foot = np.array(self.temperatures_K)[index]
        logarithmic = (start - slope * foot) * np.log1p(distance / foot)
        entropy: FloatArray = self._entropies[index] + logarithmic + slope * distance
        return entropy


@dataclass(frozen=True)
class WaterHeatCarrier:
    """Liquid water at one pressure, by IAPWS-IF97; NaN below 0 degC and where it would boil.

    Examples
    --------
    >>> WaterHeatCarrier(pressure_Pa=3e5).enthalpy_change_J_per_kg(343.15, 363.15).round(1)
    np.float64(83908.5)
    """

    pressure_Pa: float = HEAT_METER_PRESSURE_PA
    """Absolute."""
    name: str = "water"

    def heat_capacity_J_per_kgK(self, temperature_K: ArrayLike) -> FloatArray:
        """Isobaric heat capacity [J/(kg K)] at a temperature [K]."""
        return water.water_heat_capacity_J_per_kgK(temperature_K, self.pressure_Pa)

    def enthalpy_change_J_per_kg(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Difference of the specific enthalpies [J/kg]."""
        start = water.water_enthalpy_J_per_kg(from_K, self.pressure_Pa)
        return scalar_or_array(water.water_enthalpy_J_per_kg(to_K, self.pressure_Pa) - start)

    def entropy_change_J_per_kgK(self, from_K: ArrayLike, to_K: ArrayLike) -> FloatArray:
        """Difference of the specific entropies [J/(kg K)]."""
        start = water.water_entropy_J_per_kgK(from_K, self.pressure_Pa)
        return scalar_or_array(water.water_entropy_J_per_kgK(to_K, self.pressure_Pa) - start)

    def density_kg_per_m3(self, temperature_K: ArrayLike) -> FloatArray:
        """Density [kg/m3] at a temperature [K]."""
        return water.water_density_kg_per_m3(temperature_K, self.pressure_Pa)


@functools.lru_cache(maxsize=32)
def glycol_water(
    glycol: Literal["ethylene glycol", "propylene glycol"], mass_fraction: float
) -> TabulatedHeatCarrier:
    """Mixture of a glycol with water, from freezing to 100 degC.

    The published polynomials are tabulated once per concentration, at steps
    of less than 1.4 K, and read linearly (2e-5 from the polynomials). They
    describe the pure mixture; corrosion inhibitors of ready-made fluids move
    heat capacity and density by up to about 1 %.

    Parameters
    ----------
    glycol : "ethylene glycol" or "propylene glycol"
        Which glycol.
    mass_fraction : float [1]
        Glycol by mass, above 0 and up to 0.6.

    Returns
    -------
    TabulatedHeatCarrier
        Heat capacity and density between freezing point and 373.15 K.

    Raises
    ------
    ValueError
        If the mass fraction is outside the range of the correlation.

    Source
    ------
    Melinder, Properties of Secondary Working Fluids for Indirect Systems,
    International Institute of Refrigeration (2010), as carried by CoolProp's
    incompressible fluids MEG and MPG.

    Examples
    --------
    >>> brine = glycol_water("propylene glycol", 0.35)
    >>> brine.name
    '35 % propylene glycol in water'
    >>> brine.heat_capacity_J_per_kgK(293.15).round(-2)
    np.float64(3800.0)
    """
    if not 0.0 < mass_fraction <= GLYCOL_LARGEST_MASS_FRACTION:
        raise ValueError(
            f"{glycol}: mass fraction {mass_fraction:g} is outside 0 to "
            f"{GLYCOL_LARGEST_MASS_FRACTION:g}, the reach of the correlation"
        )
    from CoolProp.CoolProp import PropsSI  # two seconds to import, so only for sites with glycol

    code = {"ethylene glycol": "MEG", "propylene glycol": "MPG"}[glycol]
    fluid = f"INCOMP::{code}[{mass_fraction:.6f}]"
    freezing_K = PropsSI("T_freeze", "T", 300.0, "P", STANDARD_ATMOSPHERE_PA, fluid)
    hottest_K = PropsSI("Tmax", "T", 300.0, "P", STANDARD_ATMOSPHERE_PA, fluid)
    grid = np.linspace(freezing_K, hottest_K, _GLYCOL_POINTS)
    # The correlations are for incompressible liquids, so any pressure that keeps them liquid serves.
    heat_capacity = PropsSI("C", "T", grid, "P", HEAT_METER_PRESSURE_PA, fluid)
    density = PropsSI("D", "T", grid, "P", HEAT_METER_PRESSURE_PA, fluid)
    temperatures = tuple(grid.tolist())
    return TabulatedHeatCarrier(
        name=f"{100.0 * mass_fraction:g} % {glycol} in water",
        temperatures_K=temperatures,
        heat_capacities=tuple(heat_capacity.tolist()),
        density_temperatures_K=temperatures,
        densities=tuple(density.tolist()),
    )


def _constant(value: float, temperature_K: ArrayLike) -> FloatArray:
    temperature = as_float(temperature_K)
    return np.where(np.isnan(temperature), np.nan, value)


def _interpolated(kelvin: FloatArray, nodes: tuple[float, ...], values: tuple[float, ...]) -> FloatArray:
    read: FloatArray = np.asarray(np.interp(kelvin, nodes, values, left=np.nan, right=np.nan))
    return read


def _check_table(what: str, temperatures: tuple[float, ...], values: tuple[float, ...]) -> None:
    if len(temperatures) != len(values) or len(values) < 2:
        raise ValueError(f"{what}: needs two or more temperatures and as many values")
    if not (np.all(np.diff(temperatures) > 0.0) and temperatures[0] > 0.0):
        raise ValueError(f"{what}: temperatures must be in kelvin and rise strictly")
    if not min(values) > 0.0:
        raise ValueError(f"{what}: every value must be positive")
