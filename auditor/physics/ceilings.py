"""Ceilings of the second law: what no engine, heat pump or fuel can exceed.

All of them are consequences of one inequality, "the entropy that leaves is at
least the entropy that enters", for a boundary that stores nothing. A ceiling
therefore holds only where all heat that enters and all heat that leaves is
counted at its own temperature; every function says what it takes for granted.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from auditor.physics.arrays import BoolArray, FloatArray, as_kelvin, scalar_or_array
from auditor.physics.liquids import HeatCarrier

_SAME_TEMPERATURE_K = 1e-3
"""Below this glide dh/ds is 0/0 in float64; the logarithmic mean then agrees to 1e-9 K."""


def carnot_ceiling(hot_K: ArrayLike, cold_K: ArrayLike) -> FloatArray:
    """Largest efficiency any engine can have between two temperatures.

    ``eta = 1 - T_cold / T_hot``.

    Holds when all heat enters at or below ``hot_K``, all heat leaves at or
    above ``cold_K``, nothing is stored and the work is net of the pump work
    put into the fluid. It says nothing about internal combustion.

    Parameters
    ----------
    hot_K : array_like, shape (n,) or scalar [K]
        Absolute temperature at which heat enters the engine.
    cold_K : array_like, shape (n,) or scalar [K]
        Absolute temperature at which heat leaves it. Broadcast against ``hot_K``.

    Returns
    -------
    ndarray, shape (n,) [1]
        Scalar for scalars; NaN where either is NaN. Zero or negative where
        the "cold" side is not colder: there is no ceiling to speak of there,
        see `ceiling_exists`; it is shown to the judge and not clipped.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Carnot, Reflexions sur la puissance motrice du feu (1824); as a formula in
    kelvin: Thomson and Clausius (1850s).

    Examples
    --------
    >>> carnot_ceiling(573.15, 298.15).round(4)
    np.float64(0.4798)
    """
    hot = as_kelvin(hot_K, "carnot_ceiling")
    cold = as_kelvin(cold_K, "carnot_ceiling")
    return scalar_or_array(1.0 - cold / hot)


def ceiling_exists(hot_K: ArrayLike, cold_K: ArrayLike) -> BoolArray:
    """Where a ceiling can be stated at all: the hot side is hotter than the cold one.

    Parameters
    ----------
    hot_K, cold_K : array_like, shape (n,) or scalar [K]
        Absolute (mean) temperatures of the two sides.

    Returns
    -------
    ndarray of bool, shape (n,)
        False for equal or crossed temperatures and for NaN.

    Examples
    --------
    >>> ceiling_exists([573.15, 298.15], 298.15)
    array([ True, False])
    """
    hot = as_kelvin(hot_K, "ceiling_exists")
    cold = as_kelvin(cold_K, "ceiling_exists")
    exists: BoolArray = np.asarray(hot > cold)[()]
    return exists


def entropic_mean_temperature_K(inlet_K: ArrayLike, outlet_K: ArrayLike) -> FloatArray:
    """Mean temperature at which a stream of constant heat capacity gives or takes heat.

    ``T_m = (T_in - T_out) / ln(T_in / T_out)``, the logarithmic mean: the one
    temperature at which the same heat would carry the same entropy. Written
    as ``T_a x / artanh(x)`` with ``T_a`` the arithmetic mean and
    ``x = (T_in - T_out) / (T_in + T_out)``, which loses no digits however
    near the two are.

    With a heat capacity that rises with temperature the true mean of a source
    is a little higher (and a ceiling from this one a little too low): use
    `entropic_mean_temperature_of_carrier_K`.

    Parameters
    ----------
    inlet_K, outlet_K : array_like, shape (n,) or scalar [K]
        Absolute temperatures of the stream before and after; order does not matter.

    Returns
    -------
    ndarray, shape (n,) [K]
        NaN where either is NaN; the common value where both are equal.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Lorenz, Zeitschrift des Vereines Deutscher Ingenieure 38 (1894).

    Examples
    --------
    >>> entropic_mean_temperature_K(573.15, 393.15).round(1)
    np.float64(477.5)
    """
    inlet = as_kelvin(inlet_K, "entropic_mean_temperature_K")
    outlet = as_kelvin(outlet_K, "entropic_mean_temperature_K")
    total = inlet + outlet
    half_glide = np.asarray((inlet - outlet) / total)
    ratio = np.ones_like(half_glide)
    np.divide(half_glide, np.arctanh(half_glide), out=ratio, where=half_glide != 0.0)
    return scalar_or_array(0.5 * total * ratio)


def entropic_mean_temperature_of_carrier_K(
    carrier: HeatCarrier, inlet_K: ArrayLike, outlet_K: ArrayLike
) -> FloatArray:
    """Mean temperature at which a fluid of any heat capacity gives or takes heat.

    ``T_m = (h_in - h_out) / (s_in - s_out)`` at constant pressure.

    Parameters
    ----------
    carrier : HeatCarrier
        The fluid; it answers for enthalpy and entropy between two temperatures.
    inlet_K, outlet_K : array_like, shape (n,) or scalar [K]
        Absolute temperatures of the stream before and after; order does not matter.

    Returns
    -------
    ndarray, shape (n,) [K]
        NaN where a temperature is NaN or outside what the fluid is known for.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Lorenz (1894), in the form ``dh/ds`` for a variable heat capacity.

    Examples
    --------
    >>> from auditor.physics.liquids import TabulatedHeatCarrier
    >>> oil = TabulatedHeatCarrier("oil", (458.15, 548.15), (2140.0, 2470.0))
    >>> entropic_mean_temperature_of_carrier_K(oil, 548.15, 458.15).round(1)
    np.float64(502.9)
    """
    inlet = as_kelvin(inlet_K, "entropic_mean_temperature_of_carrier_K")
    outlet = as_kelvin(outlet_K, "entropic_mean_temperature_of_carrier_K")
    enthalpy = carrier.enthalpy_change_J_per_kg(outlet, inlet)
    entropy = carrier.entropy_change_J_per_kgK(outlet, inlet)
    known = np.isfinite(enthalpy) & np.isfinite(entropy)
    near = np.abs(inlet - outlet) < _SAME_TEMPERATURE_K
    mean = np.where(known & near, entropic_mean_temperature_K(inlet, outlet), np.nan)
    np.divide(enthalpy, entropy, out=mean, where=known & ~near)
    return scalar_or_array(mean)


def finite_source_and_sink_ceiling(
    source_inlet_K: ArrayLike,
    source_outlet_K: ArrayLike,
    sink_inlet_K: ArrayLike,
    sink_outlet_K: ArrayLike,
    source_carrier: HeatCarrier | None = None,
    sink_carrier: HeatCarrier | None = None,
) -> FloatArray:
    """Largest efficiency between one stream that cools down and one that warms up.

    ``eta = 1 - T_sink,m / T_source,m`` with the entropic mean temperatures.

    Holds when the source stream delivers **all** the heat, the sink stream
    takes all that is rejected, nothing is stored, and the work is net of the
    pump work put into the fluid. With several streams on a side put their
    `mean_temperature_of_heats_K` (module ``second_law``) into `carnot_ceiling` instead.

    Parameters
    ----------
    source_inlet_K, source_outlet_K : array_like, shape (n,) or scalar [K]
        Absolute temperatures of the stream that gives heat.
    sink_inlet_K, sink_outlet_K : array_like, shape (n,) or scalar [K]
        Absolute temperatures of the stream that takes heat.
    source_carrier, sink_carrier : HeatCarrier, optional
        The fluids; without one its heat capacity is taken as constant.

    Returns
    -------
    ndarray, shape (n,) [1]
        As `carnot_ceiling`, of which it is the finite-stream form.

    Raises
    ------
    ValueError
        If a temperature is zero or below.

    Source
    ------
    Lorenz (1894); the entropy balance of the machine and both streams.

    Examples
    --------
    >>> finite_source_and_sink_ceiling(573.15, 393.15, 298.15, 298.15).round(4)
    np.float64(0.3756)
    """
    source = _mean(source_carrier, source_inlet_K, source_outlet_K)
    sink = _mean(sink_carrier, sink_inlet_K, sink_outlet_K)
    return carnot_ceiling(source, sink)


def _mean(carrier: HeatCarrier | None, inlet_K: ArrayLike, outlet_K: ArrayLike) -> FloatArray:
    if carrier is None:
        return entropic_mean_temperature_K(inlet_K, outlet_K)
    return entropic_mean_temperature_of_carrier_K(carrier, inlet_K, outlet_K)
