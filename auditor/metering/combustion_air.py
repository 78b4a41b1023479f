"""Sensible heat of the combustion air against the reference temperature."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from auditor.metering.combustion_gases import combustion_gases, reference_temperature_K
from auditor.metering.metered import Metered
from auditor.physics import entropic_mean_temperature_K

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import CombustionAir

AIR_HEAT_CAPACITY_J_PER_KGK: Final = 1006.0
"""Of dry air from -30 to 60 degC at one atmosphere, within 0.25 %. Value from memory of handbook
tables of dry air; the tests hold it against a property library."""


def meter_combustion_air(way: CombustionAir, read: Reader) -> Metered:
    """Heat that the air brings, ``Q = m_air c_p (T_air - T_ref)``; negative for cold air.

    Dry air; its moisture is not counted. Nothing where the machine is known to stand still.
    """
    gases = combustion_gases(way.of, way.oxygen, read)
    inlet_K = read.temperature_K(way.temperature)
    outlet_K = reference_temperature_K(read, inlet_K)
    power = gases.air_kg_per_s * AIR_HEAT_CAPACITY_J_PER_KGK * (inlet_K - outlet_K)
    return Metered(
        np.where(gases.still, 0.0, power),
        inlet_K=inlet_K,
        outlet_K=outlet_K,
        entropic_K=entropic_mean_temperature_K(inlet_K, outlet_K),
    )
