"""Ceilings of heat pumps and chillers: reversed cycles between two mean temperatures.

For streams that glide, the temperatures to put in are the entropic means of
the **external** streams, never refrigerant temperatures: a bound from outlet
temperatures is not a bound. They hold only if all heat enters through the
cold stream and leaves through the hot one; room air at the machine, solar
gain, a desuperheater that is not counted, defrosting and storage break them,
and absorption machines obey another balance.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_kelvin, scalar_or_array
from auditor.physics.ceilings import entropic_mean_temperature_K


def carnot_heating_cop(hot_K: ArrayLike, cold_K: ArrayLike) -> FloatArray:
    """Largest ratio of heat delivered to work between two temperatures.

    ``COP = T_hot / (T_hot - T_cold)``.

    Parameters
    ----------
    hot_K, cold_K : array_like, shape (n,) or scalar [K]
        Absolute (mean) temperatures of the heat delivered and the heat taken up.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where either is NaN, and where the hot side is not hotter: heat
        then flows by itself and no ceiling exists.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Thomson (1852); the reversed Carnot cycle.

    Examples
    --------
    >>> carnot_heating_cop(353.15, 283.15).round(3)
    np.float64(5.045)
    """
    hot = as_kelvin(hot_K, "carnot_heating_cop")
    return _over_lift(hot, hot, as_kelvin(cold_K, "carnot_heating_cop"))


def carnot_cooling_eer(hot_K: ArrayLike, cold_K: ArrayLike) -> FloatArray:
    """Largest ratio of heat taken up to work between two temperatures.

    ``EER = T_cold / (T_hot - T_cold)``, the heating ratio less one.

    Parameters
    ----------
    hot_K, cold_K : array_like, shape (n,) or scalar [K]
        Absolute (mean) temperatures of the heat rejected and the heat taken up.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where either is NaN and where the hot side is not hotter (free cooling).

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Thomson (1852); the reversed Carnot cycle.

    Examples
    --------
    >>> carnot_cooling_eer(308.15, 280.15).round(2)
    np.float64(10.01)
    """
    cold = as_kelvin(cold_K, "carnot_cooling_eer")
    return _over_lift(cold, as_kelvin(hot_K, "carnot_cooling_eer"), cold)


def lorenz_heating_cop(
    hot_inlet_K: ArrayLike,
    hot_outlet_K: ArrayLike,
    cold_inlet_K: ArrayLike,
    cold_outlet_K: ArrayLike,
) -> FloatArray:
    """Largest ratio of heat delivered to work between two streams that glide.

    ``COP = T_hm / (T_hm - T_cm)`` with the entropic means for constant heat
    capacities; for moist air or a variable heat capacity put the means of
    ``dh/ds`` into `carnot_heating_cop`.

    Parameters
    ----------
    hot_inlet_K, hot_outlet_K : array_like, shape (n,) or scalar [K]
        External stream that is heated.
    cold_inlet_K, cold_outlet_K : array_like, shape (n,) or scalar [K]
        External stream that gives its heat.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where an input is NaN and where the mean temperatures show no lift.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Lorenz, Zeitschrift des Vereines Deutscher Ingenieure 38 (1894).

    Examples
    --------
    Water from 40 to 80 degC by a brine that cools from 20 to 10 degC (the
    outlet temperatures alone would say 5.05, which is no bound):

    >>> lorenz_heating_cop(313.15, 353.15, 293.15, 283.15).round(2)
    np.float64(7.46)
    """
    return carnot_heating_cop(
        entropic_mean_temperature_K(hot_inlet_K, hot_outlet_K),
        entropic_mean_temperature_K(cold_inlet_K, cold_outlet_K),
    )


def lorenz_cooling_eer(
    hot_inlet_K: ArrayLike,
    hot_outlet_K: ArrayLike,
    cold_inlet_K: ArrayLike,
    cold_outlet_K: ArrayLike,
) -> FloatArray:
    """Largest ratio of heat taken up to work between two streams that glide.

    ``EER = T_cm / (T_hm - T_cm)``; everything else as `lorenz_heating_cop`.

    Parameters
    ----------
    hot_inlet_K, hot_outlet_K : array_like, shape (n,) or scalar [K]
        External stream that takes the rejected heat.
    cold_inlet_K, cold_outlet_K : array_like, shape (n,) or scalar [K]
        External stream that is cooled.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where an input is NaN and where the mean temperatures show no lift.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Lorenz (1894).

    Examples
    --------
    >>> lorenz_cooling_eer(313.15, 353.15, 293.15, 283.15).round(2)
    np.float64(6.46)
    """
    return carnot_cooling_eer(
        entropic_mean_temperature_K(hot_inlet_K, hot_outlet_K),
        entropic_mean_temperature_K(cold_inlet_K, cold_outlet_K),
    )


def _over_lift(numerator: FloatArray, hot: FloatArray, cold: FloatArray) -> FloatArray:
    lift = np.asarray(hot - cold)
    ratio = np.full_like(lift, np.nan)
    np.divide(numerator, lift, out=ratio, where=lift > 0.0)
    return scalar_or_array(ratio)
