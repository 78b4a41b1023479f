"""Gas volumes at the meter and at a reference state, and the pressures they need."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_float, as_kelvin, scalar_or_array
from auditor.physics.constants import (
    AIR_GAS_CONSTANT_J_PER_KGK,
    EARTH_RADIUS_M,
    SEA_LEVEL_TEMPERATURE_K,
    STANDARD_ATMOSPHERE_PA,
    STANDARD_GRAVITY_M_PER_S2,
    TROPOSPHERE_LAPSE_K_PER_M,
)

_LOWEST_ALTITUDE_M = -2_000.0
_TROPOPAUSE_M = 11_000.0


def pressure_at_altitude_Pa(altitude_m: ArrayLike) -> FloatArray:
    """Mean air pressure at an altitude, by the standard atmosphere.

    ``p = p_0 (1 + L H / T_0) ** (-g / (R L))`` with the geopotential altitude
    ``H = r z / (r + z)``. It is a long-term mean: the weather moves the true
    pressure by about 1 % (one standard deviation), so a site that needs
    better logs a barometer.

    Parameters
    ----------
    altitude_m : array_like, shape (n,) or scalar [m]
        Geometric altitude above mean sea level.

    Returns
    -------
    ndarray, shape (n,) [Pa]
        NaN where the altitude is NaN or outside -2 000 m to 11 000 m, the
        reach of this layer of the standard.

    Source
    ------
    ISO 2533:1975; U.S. Standard Atmosphere 1976, equations (18) and (33a),
    is the same model in this layer.

    Examples
    --------
    >>> pressure_at_altitude_Pa([0.0, 500.0]).round(0)
    array([101325.,  95461.])
    """
    altitude = as_float(altitude_m)
    within = (altitude >= _LOWEST_ALTITUDE_M) & (altitude <= _TROPOPAUSE_M)
    geometric = np.where(within, altitude, np.nan)
    geopotential = EARTH_RADIUS_M * geometric / (EARTH_RADIUS_M + geometric)
    warmth = 1.0 + TROPOSPHERE_LAPSE_K_PER_M * geopotential / SEA_LEVEL_TEMPERATURE_K
    exponent = -STANDARD_GRAVITY_M_PER_S2 / (AIR_GAS_CONSTANT_J_PER_KGK * TROPOSPHERE_LAPSE_K_PER_M)
    return scalar_or_array(STANDARD_ATMOSPHERE_PA * warmth**exponent)


def absolute_pressure_Pa(gauge_Pa: ArrayLike, atmosphere_Pa: ArrayLike) -> FloatArray:
    """Absolute pressure from a gauge reading and the air pressure at the gauge.

    ``p_abs = p_gauge + p_atm``. The air pressure is that of the site, not
    101 325 Pa: at 500 m the difference is 6 % of a low-pressure gas volume.

    Parameters
    ----------
    gauge_Pa : array_like, shape (n,) or scalar [Pa]
        Pressure above (or below) the surrounding air.
    atmosphere_Pa : array_like, shape (n,) or scalar [Pa]
        Absolute pressure of the surrounding air.

    Returns
    -------
    ndarray, shape (n,) [Pa]
        NaN where either is NaN or the sum is not positive.

    Examples
    --------
    >>> absolute_pressure_Pa(35_000.0, 101_325.0)
    np.float64(136325.0)
    """
    pressure = as_float(gauge_Pa) + as_float(atmosphere_Pa)
    return scalar_or_array(np.where(pressure > 0.0, pressure, np.nan))


def reference_volume_ratio(
    absolute_pressure_Pa: ArrayLike,
    temperature_K: ArrayLike,
    reference_pressure_Pa: ArrayLike,
    reference_temperature_K: ArrayLike,
    compressibility_ratio: ArrayLike = 1.0,
) -> FloatArray:
    """Volume at a reference state over the volume that passed the meter.

    ``V_n / V = (p / p_n) (T_n / T) (Z_n / Z)``. For dry gas at both states;
    a wet gas meter also needs its water vapour taken off.

    Parameters
    ----------
    absolute_pressure_Pa : array_like, shape (n,) or scalar [Pa]
        Absolute pressure at the meter; a gauge reading goes through the
        function `absolute_pressure_Pa` first.
    temperature_K : array_like, shape (n,) or scalar [K]
        Gas temperature at the meter.
    reference_pressure_Pa, reference_temperature_K : array_like or scalar [Pa], [K]
        The reference state; there is no default, because 0 and 15 degC
        differ by 5.5 %.
    compressibility_ratio : array_like or scalar [1]
        Compression factor at the reference state over that at the meter.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where an input is NaN or the absolute pressure is not positive.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Real-gas law; the conversion that EN 12405-1 names PTZ.

    Examples
    --------
    100 m3/h at 0.35 bar gauge and 15 degC at sea level, in m3/h at 0 degC:

    >>> (100 * reference_volume_ratio(136_325.0, 288.15, 101_325.0, 273.15)).round(2)
    np.float64(127.54)
    """
    pressure = as_float(absolute_pressure_Pa)
    temperature = as_kelvin(temperature_K, "reference_volume_ratio")
    reference = as_kelvin(reference_temperature_K, "reference_volume_ratio")
    pressure_ratio = np.where(pressure > 0.0, pressure, np.nan) / as_float(reference_pressure_Pa)
    return scalar_or_array(pressure_ratio * (reference / temperature) * as_float(compressibility_ratio))
