"""Shaft power, and the density of a liquid fuel that is metered by volume."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_float, as_kelvin, scalar_or_array


def shaft_power_W(torque_Nm: ArrayLike, rotational_speed_per_s: ArrayLike) -> FloatArray:
    """Power of a turning shaft, ``P = 2 pi n M``.

    Parameters
    ----------
    torque_Nm : array_like, shape (n,) or scalar [N m]
        Torque; negative where the shaft is driven.
    rotational_speed_per_s : array_like, shape (n,) or scalar [1/s]
        Revolutions per second (not radians per second).

    Returns
    -------
    ndarray, shape (n,) [W]
        NaN where either is NaN. The product of means is the mean of products
        only while torque or speed is steady within the step.

    Source
    ------
    Definitions of rotational frequency (ISO 80000-3:2019) and of torque and
    power (ISO 80000-4:2019).

    Examples
    --------
    >>> shaft_power_W(7639.4, 25.0).round(-2)
    np.float64(1200000.0)
    """
    return scalar_or_array(2.0 * math.pi * as_float(rotational_speed_per_s) * as_float(torque_Nm))


def liquid_density_kg_per_m3(
    temperature_K: ArrayLike,
    reference_density_kg_per_m3: ArrayLike,
    reference_temperature_K: ArrayLike,
    expansion_per_K: ArrayLike,
) -> FloatArray:
    """Density of a liquid away from the temperature of its certificate.

    ``rho = rho_ref / (1 + beta (T - T_ref))``: the volume grows linearly. Good
    to about 0.1 % for liquid fuels within 30 K of the reference; tables for
    custody transfer are not replaced by it.

    Parameters
    ----------
    temperature_K : array_like, shape (n,) or scalar [K]
        Temperature at the meter.
    reference_density_kg_per_m3 : array_like or scalar [kg/m3]
        Density at the reference temperature.
    reference_temperature_K : array_like or scalar [K]
        Usually 288.15 K.
    expansion_per_K : array_like or scalar [1/K]
        Cubic expansion coefficient, about 8e-4 for gas oil.

    Returns
    -------
    ndarray, shape (n,) [kg/m3]
        NaN where an input is NaN or the volume would not be positive.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Definition of the cubic expansion coefficient, ISO 80000-5:2019, item 5-3.2
    (item number from memory).

    Examples
    --------
    >>> liquid_density_kg_per_m3(303.15, 840.0, 288.15, 8.3e-4).round(1)
    np.float64(829.7)
    """
    temperature = as_kelvin(temperature_K, "liquid_density_kg_per_m3")
    reference = as_kelvin(reference_temperature_K, "liquid_density_kg_per_m3")
    growth = 1.0 + as_float(expansion_per_K) * (temperature - reference)
    positive = np.where(growth > 0.0, growth, np.nan)
    return scalar_or_array(as_float(reference_density_kg_per_m3) / positive)
