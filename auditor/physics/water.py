"""Liquid water and its saturation line by IAPWS-IF97, regions 1 and 4.

Source of every equation here: IAPWS R7-97(2012), sections 5.1 (region 1, a
dimensionless Gibbs energy gamma(pi, tau)) and 8 (region 4). Steam, and water
above 350 degC, is refused as NaN rather than extrapolated.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import BoolArray, FloatArray, as_float, as_kelvin, scalar_or_array
from auditor.physics.constants import ZERO_CELSIUS_K
from auditor.physics.water_coefficients import (
    CRITICAL_TEMPERATURE_K,
    GAS_CONSTANT_J_PER_KGK,
    REGION_1,
    REGION_1_PRESSURE_PA,
    REGION_1_TEMPERATURE_K,
    REGION_4,
)

_HOTTEST_LIQUID_K: Final = 623.15
_HIGHEST_PRESSURE_PA: Final = 100e6
_ON_THE_LINE: Final = 1.0 - 1e-9
"""A pressure found from a saturation temperature is that much off the line by rounding."""


def saturation_pressure_Pa(temperature_K: ArrayLike) -> FloatArray:
    """Pressure at which water boils.

    Parameters
    ----------
    temperature_K : array_like, shape (n,) or scalar [K]
        Absolute temperature.

    Returns
    -------
    ndarray, shape (n,) [Pa]
        NaN where the temperature is NaN, below 273.15 K or above 647.096 K.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), section 8.1, equation (30).

    Examples
    --------
    >>> saturation_pressure_Pa([300.0, 500.0]).round(3)
    array([   3536.589, 2638897.756])
    """
    temperature = as_kelvin(temperature_K, "saturation_pressure_Pa")
    within = (temperature >= ZERO_CELSIUS_K) & (temperature <= CRITICAL_TEMPERATURE_K)
    known = np.where(within, temperature, np.nan)
    n1, n2, n3, n4, n5, n6, n7, n8, n9, n10 = REGION_4
    theta = known + n9 / (known - n10)
    a = theta**2 + n1 * theta + n2
    b = n3 * theta**2 + n4 * theta + n5
    c = n6 * theta**2 + n7 * theta + n8
    root = 2.0 * c / (-b + np.sqrt(b**2 - 4.0 * a * c))
    return scalar_or_array(1e6 * root**4)


def saturation_temperature_K(pressure_Pa: ArrayLike) -> FloatArray:
    """Temperature at which water boils.

    Parameters
    ----------
    pressure_Pa : array_like, shape (n,) or scalar [Pa]
        Absolute pressure.

    Returns
    -------
    ndarray, shape (n,) [K]
        NaN where the pressure is NaN, below 611.213 Pa or above 22.064 MPa.

    Source
    ------
    IAPWS R7-97(2012), section 8.2, equation (31).

    Examples
    --------
    >>> saturation_temperature_K(1e6).round(6)
    np.float64(453.035632)
    """
    pressure = as_float(pressure_Pa)
    within = (pressure >= 611.213) & (pressure <= 22.064e6)
    beta = (np.where(within, pressure, np.nan) / 1e6) ** 0.25
    n1, n2, n3, n4, n5, n6, n7, n8, n9, n10 = REGION_4
    e = beta**2 + n3 * beta + n6
    f = n1 * beta**2 + n4 * beta + n7
    g = n2 * beta**2 + n5 * beta + n8
    d = 2.0 * g / (-f - np.sqrt(f**2 - 4.0 * e * g))
    return scalar_or_array((n10 + d - np.sqrt((n10 + d) ** 2 - 4.0 * (n9 + n10 * d))) / 2.0)


def is_liquid_water(temperature_K: ArrayLike, pressure_Pa: ArrayLike) -> BoolArray:
    """Where water is liquid and the formulas below answer.

    Parameters
    ----------
    temperature_K : array_like, shape (n,) or scalar [K]
        Absolute temperature.
    pressure_Pa : array_like, shape (n,) or scalar [Pa]
        Absolute pressure.

    Returns
    -------
    ndarray of bool, shape (n,)
        True from 0 to 350 degC at or above saturation pressure, up to 100 MPa.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), section 5.1, range of validity of region 1.

    Examples
    --------
    >>> is_liquid_water([363.15, 453.15], 3e5)
    array([ True, False])
    """
    temperature = as_kelvin(temperature_K, "is_liquid_water")
    pressure = as_float(pressure_Pa)
    boiling = saturation_pressure_Pa(temperature)
    liquid: BoolArray = np.asarray(
        (temperature <= _HOTTEST_LIQUID_K)
        & (pressure >= boiling * _ON_THE_LINE)
        & (pressure <= _HIGHEST_PRESSURE_PA)
    )[()]
    return liquid


def water_density_kg_per_m3(temperature_K: ArrayLike, pressure_Pa: ArrayLike) -> FloatArray:
    """Density of liquid water, ``rho = p / (R T pi gamma_pi)``.

    Parameters
    ----------
    temperature_K, pressure_Pa : array_like, shape (n,) or scalar [K], [Pa]
        Absolute temperature and pressure.

    Returns
    -------
    ndarray, shape (n,) [kg/m3]
        NaN where the water is not liquid, see `is_liquid_water`.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), table 3.

    Examples
    --------
    >>> water_density_kg_per_m3(343.15, 3e5).round(3)
    np.float64(977.867)
    """
    temperature, pi, tau = _liquid_state(temperature_K, pressure_Pa)
    by_pressure = _gibbs(_over_tau(pi, pressure_derivative=True), tau)
    return scalar_or_array(REGION_1_PRESSURE_PA / (GAS_CONSTANT_J_PER_KGK * temperature * by_pressure))


def water_enthalpy_J_per_kg(temperature_K: ArrayLike, pressure_Pa: ArrayLike) -> FloatArray:
    """Specific enthalpy of liquid water, ``h = R T tau gamma_tau``; zero at the triple point.

    Parameters
    ----------
    temperature_K, pressure_Pa : array_like, shape (n,) or scalar [K], [Pa]
        Absolute temperature and pressure.

    Returns
    -------
    ndarray, shape (n,) [J/kg]
        NaN where the water is not liquid, see `is_liquid_water`.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), table 3.

    Examples
    --------
    >>> water_enthalpy_J_per_kg([363.15, 343.15], 3e5).round(1)
    array([377146.3, 293237.7])
    """
    _, pi, tau = _liquid_state(temperature_K, pressure_Pa)
    slope = _gibbs(_derivative(_over_tau(pi)), tau)
    return scalar_or_array(GAS_CONSTANT_J_PER_KGK * REGION_1_TEMPERATURE_K * slope)


def water_entropy_J_per_kgK(temperature_K: ArrayLike, pressure_Pa: ArrayLike) -> FloatArray:
    """Specific entropy of liquid water, ``s = R (tau gamma_tau - gamma)``.

    Parameters
    ----------
    temperature_K, pressure_Pa : array_like, shape (n,) or scalar [K], [Pa]
        Absolute temperature and pressure.

    Returns
    -------
    ndarray, shape (n,) [J/(kg K)]
        NaN where the water is not liquid, see `is_liquid_water`.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), table 3.

    Examples
    --------
    >>> water_entropy_J_per_kgK(363.15, 3e5).round(3)
    np.float64(1192.491)
    """
    _, pi, tau = _liquid_state(temperature_K, pressure_Pa)
    gamma = _over_tau(pi)
    slope = _gibbs(_derivative(gamma), tau)
    return scalar_or_array(GAS_CONSTANT_J_PER_KGK * (tau * slope - _gibbs(gamma, tau)))


def water_heat_capacity_J_per_kgK(temperature_K: ArrayLike, pressure_Pa: ArrayLike) -> FloatArray:
    """Isobaric heat capacity of liquid water, ``c_p = -R tau**2 gamma_tautau``.

    Parameters
    ----------
    temperature_K, pressure_Pa : array_like, shape (n,) or scalar [K], [Pa]
        Absolute temperature and pressure.

    Returns
    -------
    ndarray, shape (n,) [J/(kg K)]
        NaN where the water is not liquid, see `is_liquid_water`.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    IAPWS R7-97(2012), table 3.

    Examples
    --------
    >>> water_heat_capacity_J_per_kgK(363.15, 3e5).round(2)
    np.float64(4204.58)
    """
    _, pi, tau = _liquid_state(temperature_K, pressure_Pa)
    curvature = _gibbs(_derivative(_derivative(_over_tau(pi))), tau)
    return scalar_or_array(-GAS_CONSTANT_J_PER_KGK * tau**2 * curvature)


def _liquid_state(
    temperature_K: ArrayLike, pressure_Pa: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    liquid = is_liquid_water(temperature_K, pressure_Pa)
    temperature = np.where(liquid, as_float(temperature_K), np.nan)
    pi = as_float(pressure_Pa) / REGION_1_PRESSURE_PA
    return temperature, pi, REGION_1_TEMPERATURE_K / temperature


def _over_tau(pi: FloatArray, *, pressure_derivative: bool = False) -> Mapping[int, FloatArray]:
    # The Gibbs energy at given pressures as a polynomial of tau - 1.222 alone, {exponent:
    # coefficient}. A single pressure makes the coefficients scalars, and a month of
    # temperatures then costs a few passes over the array instead of 34 real powers.
    coefficients: dict[int, FloatArray] = {}
    for i, j, n in REGION_1:
        if pressure_derivative:
            if i == 0:
                continue
            term = -n * i * (7.1 - pi) ** (i - 1)
        else:
            term = n * (7.1 - pi) ** i
        coefficients[j] = coefficients.get(j, as_float(0.0)) + term
    return coefficients


def _derivative(coefficients: Mapping[int, FloatArray]) -> Mapping[int, FloatArray]:
    return {j - 1: j * coefficient for j, coefficient in coefficients.items() if j != 0}


def _gibbs(coefficients: Mapping[int, FloatArray], tau: FloatArray) -> FloatArray:
    # Horner's scheme for the exponents from zero up, and in 1 / x for those below.
    x = np.asarray(tau - 1.222)
    shape = np.broadcast_shapes(x.shape, coefficients[max(coefficients)].shape)
    rising, falling, inverse = np.zeros(shape), np.zeros(shape), 1.0 / x
    for j in range(max(coefficients), -1, -1):
        rising *= x
        if j in coefficients:
            rising += coefficients[j]
    for j in range(min(coefficients), 0):
        if j in coefficients:
            falling += coefficients[j]
        falling *= inverse
    rising += falling
    return rising
