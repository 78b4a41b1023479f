"""Heat carried by a liquid or gas: flow times the enthalpy difference of inlet and outlet."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.carriers import carrier_of, density_kg_per_m3
from auditor.metering.metered import Metered
from auditor.records.machines import Role

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import FlowAndTemperatures

_GIVES_HEAT_TO_THE_MACHINE = (Role.HEAT_IN, Role.POWER_IN)


def meter_flow_and_temperatures(way: FlowAndTemperatures, read: Reader) -> Metered:
    """Heat of a carrier, ``Q = m integral(c_p dT)`` with ``m = V rho(T at the meter)`` for a volume.

    A stream that brings heat cools down, one that takes heat away warms up: either is positive.
    Means over one tick are multiplied: flow or temperature difference must be steady within a tick.

    Source
    ------
    EN 1434-1:2015, section 4 and annex A (heat meters: volume at the flow sensor's place, density
    and enthalpy of water); for other liquids the same equation with their own properties.
    """
    carrier = carrier_of(read.settings.fluids[way.fluid], read)
    inlet_K, outlet_K = read.temperature_K(way.inlet), read.temperature_K(way.outlet)
    mass_flow_kg_per_s = read.value(way.flow)
    if way.flow_at is not None:
        at_meter_K = inlet_K if way.flow_at == "inlet" else outlet_K
        mass_flow_kg_per_s = mass_flow_kg_per_s * density_kg_per_m3(carrier, at_meter_K, read)
    if read.stream.role in _GIVES_HEAT_TO_THE_MACHINE:
        heat_J_per_kg = carrier.enthalpy_change_J_per_kg(outlet_K, inlet_K)
    else:
        heat_J_per_kg = carrier.enthalpy_change_J_per_kg(inlet_K, outlet_K)
    return Metered(
        mass_flow_kg_per_s * heat_J_per_kg,
        inlet_K=inlet_K,
        outlet_K=outlet_K,
        entropic_K=read.entropic_K(
            (way.inlet, way.outlet), lambda: carrier.entropic_mean_K(inlet_K, outlet_K)
        ),
    )
