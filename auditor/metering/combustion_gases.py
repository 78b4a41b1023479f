"""Mass flows of combustion air and flue gas of a metered gas, from the oxygen left in the dry flue gas."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from auditor.physics import (
    combustion_air_kg_per_s,
    dry_air_density_kg_per_m3,
    excess_air_ratio,
    flue_gas_kg_per_s,
)
from auditor.physics.arrays import FloatArray
from auditor.records.errors import Fault, PlantFileError

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.plant import FlueGas


@dataclass(frozen=True)
class CombustionGases:
    """What goes into and comes out of a fire, shape (T,)."""

    declared: FlueGas
    fuel_m3_per_s: FloatArray
    air_kg_per_s: FloatArray
    still: NDArray[np.bool_]
    """The machine is known to stand still: the analyser sees air and there is no flue gas."""


def combustion_gases(of: str, oxygen: str, read: Reader) -> CombustionGases:
    """Combustion air of a fuel stream of the same machine.

    Parameters
    ----------
    of : str
        Name of the fuel stream.
    oxygen : str
        Tag of oxygen in the dry flue gas.
    read : Reader
        Of the stream that is metered by it.

    Returns
    -------
    CombustionGases
        Air is NaN where the oxygen is that of air or below zero.

    Raises
    ------
    PlantFileError
        If the oxygen is not stated to be that of dry flue gas: the declared volumes are dry ones.
    ValueError
        If the stream is not a gas with declared flue gas.
    """
    fuel_stream = read.other(f"{read.stream.machine}.{of}")
    volume = fuel_stream.fuel_m3_per_s
    fuel = None if fuel_stream.fuel is None else read.settings.fuels[fuel_stream.fuel]
    if volume is None or fuel is None or fuel.flue_gas is None or fuel.volume_state is None:
        raise ValueError(f"{read.stream.key}: {of} is not a metered gas with declared flue gas")
    _require_dry_oxygen(oxygen, read)
    declared, state = fuel.flue_gas, fuel.volume_state
    air_demand = read.number(declared.air_demand)
    excess = excess_air_ratio(read.value(oxygen), read.number(declared.dry_flue_gas), air_demand)
    density = dry_air_density_kg_per_m3(state.temperature_K, state.pressure_Pa)
    air = combustion_air_kg_per_s(volume, excess, air_demand, density)
    return CombustionGases(declared, volume, air, still=read.still())


def flue_gas_of(gases: CombustionGases, read: Reader) -> FloatArray:
    """Mass flow of the wet flue gas [kg/s], shape (T,): air and fuel."""
    density = read.number(gases.declared.fuel_density)
    return flue_gas_kg_per_s(gases.fuel_m3_per_s, density, gases.air_kg_per_s)


def reference_temperature_K(read: Reader, like: FloatArray) -> FloatArray:
    """Return the site's reference temperature at every tick [K], shaped ``like`` another temperature."""
    reference_K = read.settings.site.reference_temperature_K
    if reference_K is None:
        raise ValueError(f"{read.stream.key}: the site states no reference temperature")
    return np.full_like(like, reference_K)


def _require_dry_oxygen(oxygen: str, read: Reader) -> None:
    tag = read.settings.tags[oxygen]
    if tag.basis != "dry":
        stated = tag.basis or "not stated to be dry"
        raise PlantFileError(
            [
                Fault(
                    f"plant.toml:{tag.line}, exports.{tag.export}.tags.{oxygen}.basis",
                    f"{read.stream.key} needs oxygen in dry flue gas, this tag is {stated}",
                    'state basis = "dry" if the gas is dried before it is measured, else use another tag',
                )
            ]
        )
