"""The table of ways of metering: which function meters which record."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from auditor.metering.combustion_air import meter_combustion_air
from auditor.metering.constant import meter_constant
from auditor.metering.flow_and_temperatures import meter_flow_and_temperatures
from auditor.metering.flue_gas_heat import meter_flue_gas_heat
from auditor.metering.gas_volume import meter_gas_volume
from auditor.metering.inputs import Reader
from auditor.metering.liquid_fuel import meter_liquid_fuel
from auditor.metering.metered import Metered
from auditor.metering.power import meter_power
from auditor.metering.same_as import meter_same_as
from auditor.metering.shaft import meter_shaft
from auditor.metering.share_of import meter_share_of
from auditor.records.machines import (
    CombustionAir,
    Constant,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    LiquidFuel,
    Power,
    SameAs,
    Shaft,
    ShareOf,
    Stream,
)

WAYS: Mapping[type, Callable[[Any, Reader], Metered]] = {
    GasVolume: meter_gas_volume,
    LiquidFuel: meter_liquid_fuel,
    Power: meter_power,
    Shaft: meter_shaft,
    FlowAndTemperatures: meter_flow_and_temperatures,
    FlueGasHeat: meter_flue_gas_heat,
    CombustionAir: meter_combustion_air,
    ShareOf: meter_share_of,
    Constant: meter_constant,
    SameAs: meter_same_as,
}
"""A new way of metering is a record, a module with one such function, and a line here."""


def made_of(stream: Stream) -> str | None:
    """Key of the stream that a stream is computed from; None when it has its own meters."""
    way = stream.way
    if isinstance(way, SameAs):
        return f"{way.machine}.{way.stream}"
    if isinstance(way, ShareOf | FlueGasHeat | CombustionAir):
        return f"{stream.machine}.{way.of}"
    return None
