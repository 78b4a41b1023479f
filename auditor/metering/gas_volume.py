"""Fuel power from a gas meter: operating volume to the fuel's state, times the heating value."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.metering.heating_values import fuel_power
from auditor.metering.metered import Metered
from auditor.physics import absolute_pressure_Pa, reference_volume_ratio
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import GasVolume
    from auditor.records.plant import GasMeter, VolumeState


def meter_gas_volume(way: GasVolume, read: Reader) -> Metered:
    """Fuel power of a gas stream, ``P = V (p/p_n)(T_n/T)(Z_n/Z) H``.

    A meter that reads at the fuel's state already gives ``P = V H``. The gas is taken as dry; the
    means over one tick of flow, pressure and temperature are multiplied.
    """
    fuel = read.settings.fuels[way.fuel]
    if fuel.volume_state is None:
        raise ValueError(f"{read.stream.key}: {fuel.name} is metered by volume but has no volume state")
    meter = read.settings.gas_meters[way.meter]
    volume_m3_per_s = read.value(way.volume)
    if meter.reads == "operating volume":
        volume_m3_per_s = volume_m3_per_s * _ratio_to_state(meter, fuel.volume_state, read)
    power = fuel_power(read, fuel, volume_m3_per_s)
    return replace(power, fuel=way.fuel, fuel_m3_per_s=volume_m3_per_s)


def _ratio_to_state(meter: GasMeter, state: VolumeState, read: Reader) -> FloatArray:
    if meter.pressure is None or meter.temperature is None:
        raise ValueError(f"gas meter {meter.name}: an operating volume needs pressure and temperature")
    ratio = meter.compressibility_ratio
    return reference_volume_ratio(
        _absolute_pressure_Pa(meter.pressure, read),
        read.temperature_K(meter.temperature),
        state.pressure_Pa,
        state.temperature_K,
        1.0 if ratio is None else read.number(ratio),
    )


def _absolute_pressure_Pa(tag: str, read: Reader) -> FloatArray:
    pressure_Pa = read.value(tag)
    stretches = read.settings.tags[tag].stretches
    absolute_Pa = np.where(pressure_Pa > 0.0, pressure_Pa, np.nan)
    if all(then.pressure != "gauge" for _, _, then in stretches):
        return absolute_Pa
    against_air_Pa = absolute_pressure_Pa(pressure_Pa, _air_pressure_Pa(read))
    for start_us, end_us, then in stretches:
        if then.pressure != "gauge":
            ticks = (read.start_us >= start_us) & (read.start_us < end_us)
            against_air_Pa = np.where(ticks, absolute_Pa, against_air_Pa)
    return against_air_Pa


def _air_pressure_Pa(read: Reader) -> FloatArray | float:
    declared = read.settings.site.air_pressure
    if declared is not None and declared.tag is not None:
        return read.value(declared.tag)
    if declared is not None and declared.from_altitude is not None:
        return read.number(declared.from_altitude)
    raise ValueError(f"{read.stream.key}: a gauge pressure needs the site's air pressure")
