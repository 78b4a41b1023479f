"""Sensible heat of flue gas between two temperatures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.metering.combustion_gases import combustion_gases, flue_gas_of, reference_temperature_K
from auditor.metering.metered import Metered
from auditor.physics import entropic_mean_temperature_K

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import FlueGasHeat


def meter_flue_gas_heat(way: FlueGasHeat, read: Reader) -> Metered:
    """Heat that flue gas gives off, ``Q = m c_p (T_in - T_out)``; positive where it cools.

    No condensation. Nothing where the machine is known to stand still: without fire the oxygen is
    that of air and says nothing about a flow.
    """
    gases = combustion_gases(way.of, way.oxygen, read)
    inlet_K = read.temperature_K(way.inlet)
    outlet_K = (
        reference_temperature_K(read, inlet_K) if way.outlet is None else read.temperature_K(way.outlet)
    )
    heat_capacity = read.number(gases.declared.heat_capacity)
    power = flue_gas_of(gases, read) * heat_capacity * (inlet_K - outlet_K)
    return Metered(
        np.where(gases.still, 0.0, power),
        inlet_K=inlet_K,
        outlet_K=outlet_K,
        entropic_K=entropic_mean_temperature_K(inlet_K, outlet_K),
    )
