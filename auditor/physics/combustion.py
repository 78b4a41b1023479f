"""Flue gas from the fuel and the oxygen that is left in it, in the simple stated form.

Fuel volume, air demand and minimum flue gas all refer to one reference state
(volumes then count like moles). Water vapour of the combustion air is not
counted: at 11 g/kg it would add about 1 % to the flue-gas mass.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_float, as_kelvin, scalar_or_array
from auditor.physics.constants import (
    DRY_AIR_DENSITY_KG_PER_M3,
    OXYGEN_OF_DRY_AIR,
    STANDARD_ATMOSPHERE_PA,
    ZERO_CELSIUS_K,
)

_SIEGERT_LIMIT_K = 200.0 + ZERO_CELSIUS_K


def excess_air_ratio(
    oxygen_dry: ArrayLike, dry_flue_gas_m3_per_m3: ArrayLike, air_demand_m3_per_m3: ArrayLike
) -> FloatArray:
    """Air that was used over the least that would burn the fuel.

    ``lambda = 1 + (v_dry / l_min) O2 / (O2_air - O2)`` for complete
    combustion. The short form ``O2_air / (O2_air - O2)`` leaves out that the
    dry flue gas is less than the air; for methane it reads 7 % high at 13 %.

    Parameters
    ----------
    oxygen_dry : array_like, shape (n,) or scalar [1]
        Oxygen in the **dry** flue gas as a fraction (0.095 for 9.5 %).
    dry_flue_gas_m3_per_m3 : array_like or scalar [m3/m3]
        Dry flue gas of stoichiometric combustion per fuel volume.
    air_demand_m3_per_m3 : array_like or scalar [m3/m3]
        Dry air of stoichiometric combustion per fuel volume.

    Returns
    -------
    ndarray, shape (n,) [1]
        NaN where an input is NaN or the oxygen is not between nothing and
        that of air (20.946 %): the analyser then sees air or is off its zero.

    Source
    ------
    Oxygen balance of the dry flue gas.

    Examples
    --------
    >>> excess_air_ratio(0.03, 8.5484, 9.5484).round(3)
    np.float64(1.15)
    """
    oxygen = as_float(oxygen_dry)
    burning = np.where((oxygen >= 0.0) & (oxygen < OXYGEN_OF_DRY_AIR), oxygen, np.nan)
    dilution = burning / (OXYGEN_OF_DRY_AIR - burning)
    per_air = as_float(dry_flue_gas_m3_per_m3) / as_float(air_demand_m3_per_m3)
    return scalar_or_array(1.0 + per_air * dilution)


def dry_air_density_kg_per_m3(
    temperature_K: ArrayLike = ZERO_CELSIUS_K, pressure_Pa: ArrayLike = STANDARD_ATMOSPHERE_PA
) -> FloatArray:
    """Density of dry air at a gas reference state.

    The density at 0 degC and 101.325 kPa, carried on by the ideal-gas law;
    within 0.1 % of dry air from 0 to 25 degC at about one atmosphere.

    Parameters
    ----------
    temperature_K : array_like or scalar [K]
        Temperature of the reference state; 0 degC without it.
    pressure_Pa : array_like or scalar [Pa]
        Pressure of the reference state; 101.325 kPa without it.

    Returns
    -------
    ndarray [kg/m3]
        NaN where an input is NaN.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    ISO 6976:1995, clause 8, for the density; ideal-gas law.

    Examples
    --------
    >>> dry_air_density_kg_per_m3()
    np.float64(1.2929)
    >>> dry_air_density_kg_per_m3(288.15).round(4)
    np.float64(1.2256)
    """
    temperature = as_kelvin(temperature_K, "dry_air_density_kg_per_m3")
    pressure_ratio = as_float(pressure_Pa) / STANDARD_ATMOSPHERE_PA
    return scalar_or_array(DRY_AIR_DENSITY_KG_PER_M3 * pressure_ratio * ZERO_CELSIUS_K / temperature)


def combustion_air_kg_per_s(
    fuel_flow_m3_per_s: ArrayLike,
    excess_air: ArrayLike,
    air_demand_m3_per_m3: ArrayLike,
    air_density_kg_per_m3: ArrayLike,
) -> FloatArray:
    """Mass flow of the dry air that burns a fuel.

    ``m_air = lambda l_min V_fuel rho_air``.

    Parameters
    ----------
    fuel_flow_m3_per_s : array_like, shape (n,) or scalar [m3/s]
        Fuel at the reference state.
    excess_air : array_like, shape (n,) or scalar [1]
        Excess-air ratio.
    air_demand_m3_per_m3 : array_like or scalar [m3/m3]
        Dry air of stoichiometric combustion per fuel volume.
    air_density_kg_per_m3 : array_like or scalar [kg/m3]
        Density of dry air at the same reference state.

    Returns
    -------
    ndarray, shape (n,) [kg/s]
        NaN where an input is NaN.

    Source
    ------
    Definition of the air demand.

    Examples
    --------
    >>> combustion_air_kg_per_s(0.0786, 1.75, 9.6, 1.2929).round(3)
    np.float64(1.707)
    """
    air_m3_per_s = as_float(fuel_flow_m3_per_s) * as_float(excess_air) * as_float(air_demand_m3_per_m3)
    return scalar_or_array(air_m3_per_s * as_float(air_density_kg_per_m3))


def flue_gas_kg_per_s(
    fuel_flow_m3_per_s: ArrayLike, fuel_density_kg_per_m3: ArrayLike, air_kg_per_s: ArrayLike
) -> FloatArray:
    """Mass flow of the wet flue gas: what went in comes out.

    ``m_flue = m_air + rho_fuel V_fuel``; no condensation, no soot.

    Parameters
    ----------
    fuel_flow_m3_per_s : array_like, shape (n,) or scalar [m3/s]
        Fuel at its reference state.
    fuel_density_kg_per_m3 : array_like or scalar [kg/m3]
        Density of the fuel at the same state.
    air_kg_per_s : array_like, shape (n,) or scalar [kg/s]
        Mass flow of the combustion air.

    Returns
    -------
    ndarray, shape (n,) [kg/s]
        NaN where an input is NaN.

    Source
    ------
    Mass balance.

    Examples
    --------
    >>> flue_gas_kg_per_s(0.0786, 0.78, 1.707).round(3)
    np.float64(1.768)
    """
    fuel = as_float(fuel_flow_m3_per_s) * as_float(fuel_density_kg_per_m3)
    return scalar_or_array(as_float(air_kg_per_s) + fuel)


def siegert_stack_loss(flue_gas_K: ArrayLike, air_K: ArrayLike, oxygen_dry: ArrayLike) -> FloatArray:
    """Stack loss of natural gas by the short formula of small combustion plant: a cross-check.

    ``q = (t_flue - t_air) (0.66 / (21 - O2) + 0.009)`` in percent of the
    lower heating value, O2 in percent. A fit for boilers: within 0.2 points
    of an exact balance up to 200 degC, 1.0 point low at 450 degC, so it
    answers nothing above 200 degC and never stands for an engine's exhaust.

    Parameters
    ----------
    flue_gas_K, air_K : array_like, shape (n,) or scalar [K]
        Flue gas at the end of the boiler and combustion air.
    oxygen_dry : array_like, shape (n,) or scalar [1]
        Oxygen in the dry flue gas as a fraction.

    Returns
    -------
    ndarray, shape (n,) [1]
        Share of the lower heating value; NaN above 200 degC, for oxygen
        outside 0 to 20.946 %, and where an input is NaN.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    German ordinance on small combustion plant (1. BImSchV), annex 2; its form
    is published widely, its two constants for natural gas are from memory and
    agree with an exact balance of methane.

    Examples
    --------
    >>> siegert_stack_loss(473.15, 293.15, 0.03).round(4)
    np.float64(0.0822)
    """
    flue_gas = as_kelvin(flue_gas_K, "siegert_stack_loss")
    air = as_kelvin(air_K, "siegert_stack_loss")
    oxygen = as_float(oxygen_dry)
    valid = (flue_gas <= _SIEGERT_LIMIT_K) & (oxygen >= 0.0) & (oxygen < OXYGEN_OF_DRY_AIR)
    percent = (flue_gas - air) * (0.66 / (21.0 - 100.0 * np.where(valid, oxygen, np.nan)) + 0.009)
    return scalar_or_array(percent / 100.0)
