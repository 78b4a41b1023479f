"""Heat carriers as the plant file declares them, with their assumed numbers read through the reader."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.physics import (
    ConstantHeatCarrier,
    HeatCarrier,
    TabulatedHeatCarrier,
    WaterHeatCarrier,
    entropic_mean_temperature_K,
    entropic_mean_temperature_of_carrier_K,
    glycol_water,
)
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.plant import Fluid


@dataclass(frozen=True)
class Carrier:
    """A fluid that carries heat."""

    fluid: Fluid
    properties: HeatCarrier
    heat_factor: float
    """By which its enthalpies are multiplied: 1 within the uncertainty of its table."""

    def enthalpy_change_J_per_kg(self, from_K: FloatArray, to_K: FloatArray) -> FloatArray:
        """Integral of c_p dT [J/kg] between temperatures of shape (T,); positive when it warms."""
        return self.heat_factor * self.properties.enthalpy_change_J_per_kg(from_K, to_K)

    def entropic_mean_K(self, inlet_K: FloatArray, outlet_K: FloatArray) -> FloatArray:
        """Entropic mean temperature dh/ds [K], shape (T,); a common factor of c_p cancels."""
        if isinstance(self.properties, ConstantHeatCarrier):
            return entropic_mean_temperature_K(inlet_K, outlet_K)
        return entropic_mean_temperature_of_carrier_K(self.properties, inlet_K, outlet_K)


def carrier_of(fluid: Fluid, read: Reader) -> Carrier:
    """Build a carrier from a declared fluid.

    Raises
    ------
    ValueError
        If a declared fluid has no heat capacity, or a glycol no share by mass.
    """
    if fluid.kind == "water":
        return Carrier(fluid, WaterHeatCarrier(), 1.0)
    if fluid.kind != "declared":
        if fluid.mass_fraction is None:
            raise ValueError(f"fluid {fluid.name}: {fluid.kind} needs a mass fraction")
        return Carrier(fluid, glycol_water(fluid.kind, fluid.mass_fraction), 1.0)
    if fluid.heat_capacity is None:
        raise ValueError(f"fluid {fluid.name}: no heat capacity")
    stated = read.number(fluid.heat_capacity)
    if fluid.heat_capacity_table is None:
        return Carrier(fluid, ConstantHeatCarrier(fluid.name, stated), 1.0)
    temperatures, values = zip(*fluid.heat_capacity_table, strict=True)
    return Carrier(fluid, TabulatedHeatCarrier(fluid.name, temperatures, values), stated)


def density_kg_per_m3(carrier: Carrier, temperature_K: FloatArray, read: Reader) -> FloatArray:
    """Density of a carrier where its volume is metered.

    Apart from the heat capacity because a stream metered by mass is not touched by it.

    Parameters
    ----------
    carrier : Carrier
        The fluid.
    temperature_K : ndarray, shape (T,) [K]
        Temperature at the meter.
    read : Reader
        Of the stream.

    Returns
    -------
    ndarray, shape (T,) [kg/m3]
        NaN outside the range that the fluid is known for.

    Raises
    ------
    ValueError
        If the fluid was declared without a density.
    """
    fluid = carrier.fluid
    if fluid.kind != "declared":
        density = carrier.properties.density_kg_per_m3(temperature_K)
        if density is not None:
            return density
    if fluid.density is None:
        raise ValueError(f"fluid {fluid.name}: its volume is metered but it has no density")
    stated = read.number(fluid.density)
    if fluid.density_table is None:
        return np.where(np.isnan(temperature_K), np.nan, stated)
    temperatures, values = zip(*fluid.density_table, strict=True)
    table: FloatArray = np.interp(temperature_K, temperatures, values, left=np.nan, right=np.nan)
    return stated * table
