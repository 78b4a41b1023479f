"""Entropy and exergy that streams carry: what must be rejected, what was generated, what work is worth.

The entropy balance of a steady boundary, written for heat flows: the ground on
which every ceiling stands. Nothing here holds while a machine stores heat.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import FloatArray, as_float, as_kelvin, scalar_or_array
from auditor.physics.ceilings import carnot_ceiling


def entropy_flow_W_per_K(heat_W: ArrayLike, temperature_K: ArrayLike) -> FloatArray:
    """Entropy that a heat flow carries at its (entropic mean) temperature, ``Q / T``.

    Parameters
    ----------
    heat_W : array_like, shape (n,) or scalar [W]
        Heat flow.
    temperature_K : array_like, shape (n,) or scalar [K]
        Absolute temperature at the boundary.

    Returns
    -------
    ndarray, shape (n,) [W/K]
        NaN where either is NaN.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Examples
    --------
    >>> entropy_flow_W_per_K(1000.0, 500.0)
    np.float64(2.0)
    """
    temperature = as_kelvin(temperature_K, "entropy_flow_W_per_K")
    return scalar_or_array(as_float(heat_W) / temperature)


def mean_temperature_of_heats_K(heats_W: ArrayLike, temperatures_K: ArrayLike) -> FloatArray:
    """One temperature that stands for several heat flows together.

    ``T_m = sum(Q) / sum(Q / T)``, so that total heat and total entropy stay
    what they are. A heat that is not counted here makes a ceiling wrong: a
    share that leaves to something colder lowers the true mean.

    Parameters
    ----------
    heats_W : array_like, shape (k, n) or (k,) [W]
        Heat flows of the k streams, all counted in the same direction.
    temperatures_K : array_like, shape (k, n) or (k,) [K]
        Entropic mean temperature of each stream.

    Returns
    -------
    ndarray, shape (n,) or scalar [K]
        NaN where one is NaN or the heats do not sum to something positive.
        A stream without heat does not count, but must have a temperature.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Entropy balance; the harmonic mean weighted by heat.

    Examples
    --------
    >>> mean_temperature_of_heats_K([0.95, 0.05], [343.15, 298.15]).round(1)
    np.float64(340.6)
    """
    heats = as_float(heats_W)
    entropies = entropy_flow_W_per_K(heats, temperatures_K)
    heat = np.asarray(np.sum(heats, axis=0))
    entropy = np.asarray(np.sum(entropies, axis=0))
    mean = np.full_like(entropy, np.nan)
    np.divide(heat, entropy, out=mean, where=(heat > 0.0) & (entropy > 0.0))
    return scalar_or_array(mean)


def entropy_generation_W_per_K(
    heat_in_W: ArrayLike, source_K: ArrayLike, heat_out_W: ArrayLike, sink_K: ArrayLike
) -> FloatArray:
    """Entropy that a steady machine makes; below zero it would be impossible.

    ``S_gen = Q_out / T_sink - Q_in / T_source`` (Clausius). Several streams on
    a side enter through their sum and `mean_temperature_of_heats_K`, which is
    exact. The work it costs is ``T_sink * S_gen`` (Gouy and Stodola).

    Parameters
    ----------
    heat_in_W, heat_out_W : array_like, shape (n,) or scalar [W]
        Heat flows over the boundary, both positive; ``heat_out_W`` measured,
        not found by difference, or the test is no test.
    source_K, sink_K : array_like, shape (n,) or scalar [K]
        Entropic mean temperatures.

    Returns
    -------
    ndarray, shape (n,) [W/K]
        NaN where an input is NaN. Holds for a machine that stores nothing.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Clausius (1865); Gouy (1889) and Stodola (1905) for the lost work.

    Examples
    --------
    1000 kW taken from a source at 450 degC and delivered at 90 degC:

    >>> entropy_generation_W_per_K(1e6, 723.15, 1e6, 363.15).round(3)
    np.float64(1370.844)
    """
    leaving = entropy_flow_W_per_K(heat_out_W, sink_K)
    entering = entropy_flow_W_per_K(heat_in_W, source_K)
    return scalar_or_array(leaving - entering)


def smallest_rejection_W(
    heat_in_W: ArrayLike,
    source_K: ArrayLike,
    sink_K: ArrayLike,
    useful_entropy_W_per_K: ArrayLike = 0.0,
) -> FloatArray:
    """Heat that the second law obliges a steady heat engine to reject.

    ``Q_min = max(0, T_sink (Q_in / T_source - sum(Q_useful / T_useful)))``:
    the entropy that came in with the heat and did not leave with useful heat
    must leave to the sink. Meaningless for combustion engines, boilers, heat
    pumps and exchangers, where heat is not what drives the machine.

    Parameters
    ----------
    heat_in_W : array_like, shape (n,) or scalar [W]
        Heat that drives the engine.
    source_K, sink_K : array_like, shape (n,) or scalar [K]
        Entropic mean temperatures of the driving heat and of the rejected heat.
    useful_entropy_W_per_K : array_like, shape (n,) or scalar [W/K]
        Entropy that leaves with useful heat, summed over its streams
        (`entropy_flow_W_per_K`).

    Returns
    -------
    ndarray, shape (n,) [W]
        Never negative; NaN where an input is NaN.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Clausius (1865): the entropy balance with nothing generated.

    Examples
    --------
    >>> smallest_rejection_W(4865.0, 501.8, 296.57).round(0)
    np.float64(2875.0)
    """
    entering = entropy_flow_W_per_K(heat_in_W, source_K)
    sink = as_kelvin(sink_K, "smallest_rejection_W")
    demanded = sink * (entering - as_float(useful_entropy_W_per_K))
    return scalar_or_array(np.maximum(0.0, demanded))


def exergy_of_heat_W(heat_W: ArrayLike, temperature_K: ArrayLike, surroundings_K: ArrayLike) -> FloatArray:
    """Work that a heat flow is worth at most, ``Q (1 - T_0 / T)``.

    A combustion engine with useful heat obeys
    ``work + sum(Q_u (1 - T_0 / T_u)) <= fuel exergy``.

    Parameters
    ----------
    heat_W : array_like, shape (n,) or scalar [W]
        Heat flow.
    temperature_K, surroundings_K : array_like, shape (n,) or scalar [K]
        Its entropic mean temperature and that of the surroundings.

    Returns
    -------
    ndarray, shape (n,) [W]
        Negative below the temperature of the surroundings; NaN where an input is NaN.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Gouy (1889); Rant, Forschung im Ingenieurwesen 22 (1956), for the name.

    Examples
    --------
    >>> exergy_of_heat_W(1e6, 363.15, 298.15).round(0)
    np.float64(178989.0)
    """
    return scalar_or_array(as_float(heat_W) * carnot_ceiling(temperature_K, surroundings_K))


def fuel_exergy_W(fuel_power_W: ArrayLike, exergy_ratio: ArrayLike) -> FloatArray:
    """Work that a fuel is worth at most: the strict limit of internal combustion.

    ``E = beta P_fuel``. Nearly the first law again: about 1.04 of the lower
    heating value for natural gas, 0.976 for hydrogen, so no jacket or exhaust
    temperature may stand in for it.

    Parameters
    ----------
    fuel_power_W : array_like, shape (n,) or scalar [W]
        Fuel power on one heating-value basis.
    exergy_ratio : array_like, shape (n,) or scalar [1]
        Chemical exergy over the heating value of the **same** basis.

    Returns
    -------
    ndarray, shape (n,) [W]
        NaN where an input is NaN.

    Source
    ------
    Szargut, Morris and Steward, Exergy Analysis of Thermal, Chemical, and
    Metallurgical Processes (1988).

    Examples
    --------
    >>> fuel_exergy_W(1000.0, 1.04)
    np.float64(1040.0)
    """
    return scalar_or_array(as_float(fuel_power_W) * as_float(exergy_ratio))
