"""Fuel power: gas volumes at their reference state, dated heating values, liquid fuels."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from metering_factory import (
    CELSIUS,
    KWH_PER_M3,
    PER_HOUR,
    START_US,
    TICK_US,
    assumed,
    heating_value,
    make_fuel,
    make_machine,
    make_settings,
    make_tag,
    make_ticks,
    stream_W,
)

from auditor.metering import MeteringSettings, meter
from auditor.records.findings import FindingCode
from auditor.records.machines import GasVolume, LiquidFuel, Role, Running, SameAs
from auditor.records.plant import AirPressure, Fuel, GasMeter, TagChange

RUNNING = Running("volume", 0.0, None)
AT_STATE = GasMeter("meter", "already at the fuel's state", None, None, None)
OPERATING = GasMeter("meter", "operating volume", "pressure", "temperature", assumed("z", 1.0))


def gas_plant(
    fuel: Fuel,
    meter: GasMeter = AT_STATE,
    *,
    basis: str = "lower",
    pressure: str = "gauge",
    air_pressure: AirPressure | None = None,
) -> MeteringSettings:
    """One engine that burns one metered gas."""
    tags = [
        make_tag("volume"),
        make_tag("pressure", pressure=pressure),
        make_tag("temperature"),
        make_tag("barometer", pressure="absolute"),
    ]
    streams = {"gas": (Role.FUEL_IN, GasVolume("fuel", "volume", "meter"))}
    engine = make_machine("engine", streams, running=RUNNING, basis=basis)
    return make_settings(
        tags, engine, fuels={"fuel": fuel}, gas_meters={"meter": meter}, air_pressure=air_pressure
    )


def gas_ticks(volume_m3_per_h: float = 100.0, pressure_Pa: float = 35_000.0, celsius: float = 15.0):
    """One tick of the gas plant."""
    return make_ticks(
        {
            "volume": volume_m3_per_h * PER_HOUR,
            "pressure": pressure_Pa,
            "temperature": celsius + CELSIUS,
            "barometer": 101_325.0,
        }
    )


def test_fuel_power_is_volume_times_heating_value_on_the_declared_basis():
    """250 m3/h of 10.00/11.06 kWh/m3 are 2500 kW on the lower and 2765 kW on the higher value."""
    # By the definition of the heating values; worked by hand.
    fuel = make_fuel(heating_value(10.00 * KWH_PER_M3, 11.06 * KWH_PER_M3))
    ticks = gas_ticks(250.0)
    lower, _ = meter(ticks, gas_plant(fuel))
    higher, _ = meter(ticks, gas_plant(fuel, basis="higher"))
    assert stream_W(lower, "engine.gas") == pytest.approx(2500e3)
    assert stream_W(higher, "engine.gas") == pytest.approx(2765e3)
    for table in (lower, higher):
        assert table.lower_W["engine.gas"] == pytest.approx(2500e3)
        assert table.higher_W["engine.gas"] == pytest.approx(2765e3)


@pytest.mark.parametrize(
    ("pressure", "air_Pa", "printed"),
    [
        ("gauge", 101_325.0, 127.54),
        ("absolute", 101_325.0, 32.74),
        ("gauge", 95_400.0, 122.00),
    ],
)
def test_gas_volume_at_its_reference_state(pressure: str, air_Pa: float, printed: float):
    """100 m3/h at 0.35 bar and 15 degC become what the gas law says, gauge and absolute apart."""
    # Real-gas law as EN 12405-1 uses it, worked by hand:
    # 100 (0.35 + 1.01325)/1.01325 273.15/288.15 = 127.54; read as absolute 32.74; at 500 m
    # (0.954 bar, ISO 2533:1975) 100 (0.35 + 0.954)/1.01325 273.15/288.15 = 122.00.
    fuel = make_fuel(heating_value(KWH_PER_M3))
    air = AirPressure(None, assumed("site.air_pressure", air_Pa))
    settings = gas_plant(fuel, OPERATING, pressure=pressure, air_pressure=air)
    table, _ = meter(gas_ticks(), settings)
    assert stream_W(table, "engine.gas") / 1e3 == pytest.approx(printed, abs=0.006)
    assert "barometer" not in table.inputs["engine.gas"]


def test_a_pressure_that_goes_over_to_absolute():
    """Gauge until a date and absolute from then on: each tick by what holds at its start."""
    settings = gas_plant(
        make_fuel(heating_value(KWH_PER_M3)),
        OPERATING,
        air_pressure=AirPressure(None, assumed("site.air_pressure", 101_325.0)),
    )
    gauge = settings.tags["pressure"]
    then = TagChange(START_US + TICK_US, "then", replace(gauge, pressure="absolute"), False)
    tags = {**settings.tags, "pressure": replace(gauge, changes=(then,))}
    means = {
        "volume": 100.0 * PER_HOUR, "pressure": 35_000.0, "temperature": 288.15, "barometer": 101_325.0,
    }  # fmt: skip
    table, _ = meter(make_ticks(means, ticks=2), replace(settings, tags=tags))
    assert stream_W(table, "engine.gas") / 1e3 == pytest.approx([127.54, 32.74], abs=0.006)


def test_a_barometer_stands_in_for_the_altitude():
    """A logged air pressure gives the same volume as the same pressure declared, and is an input."""
    fuel = make_fuel(heating_value(KWH_PER_M3))
    settings = gas_plant(fuel, OPERATING, air_pressure=AirPressure("barometer", None))
    table, _ = meter(gas_ticks(), settings)
    assert stream_W(table, "engine.gas") / 1e3 == pytest.approx(127.54, abs=0.005)
    assert table.inputs["engine.gas"] == ("volume", "pressure", "barometer", "temperature")


def test_a_reference_state_of_15_degC_reads_more_volume():
    """The same gas counts 5.49 % more at 15 degC than at 0 degC (288.15/273.15)."""
    cold = make_fuel(heating_value(KWH_PER_M3))
    warm = replace(cold, volume_state=replace(cold.volume_state, temperature_K=288.15))
    air = AirPressure("barometer", None)
    at_0, _ = meter(gas_ticks(), gas_plant(cold, OPERATING, air_pressure=air))
    at_15, _ = meter(gas_ticks(), gas_plant(warm, OPERATING, air_pressure=air))
    ratio = stream_W(at_15, "engine.gas") / stream_W(at_0, "engine.gas")
    assert ratio == pytest.approx(1.0549, abs=5e-5)


def test_each_tick_takes_the_heating_value_valid_at_its_start():
    """A new heating value counts from its date on and is told; before the first nothing is known."""
    second, third = START_US + TICK_US, START_US + 2 * TICK_US
    fuel = make_fuel(
        heating_value(10.10 * KWH_PER_M3, 11.20 * KWH_PER_M3, from_us=second),
        heating_value(9.965 * KWH_PER_M3, 11.05 * KWH_PER_M3, from_us=third),
    )
    ticks = make_ticks({"volume": 0.1, "pressure": 0.0, "temperature": 280.0, "barometer": 1e5}, ticks=4)
    table, findings = meter(ticks, gas_plant(fuel))
    expected = 0.1 * KWH_PER_M3 * np.array([np.nan, 10.10, 9.965, 9.965])
    assert stream_W(table, "engine.gas") == pytest.approx(expected, nan_ok=True)
    assert table.known[:, 0].tolist() == [False, True, True, True]
    unknown, changed = findings
    assert unknown.code == FindingCode.OUT_OF_RANGE
    assert unknown.words["reason"] == "before the first heating value"
    assert (unknown.start_us, unknown.end_us) == (START_US, second)
    assert unknown.energy_J == pytest.approx(60.0 * np.nanmean(expected))
    assert changed.code == FindingCode.HEATING_VALUE_CHANGED
    assert changed.start_us == third
    assert changed.words == {"fuel": "fuel", "basis": "lower", "source": "supplier's sheet"}
    assert changed.numbers["factor"] == pytest.approx(9.965 / 10.10)
    burnt_J = 2 * 60.0 * 0.1 * 9.965 * KWH_PER_M3
    assert changed.energy_J == pytest.approx(burnt_J * (10.10 / 9.965 - 1.0))


def test_fuel_exergy_is_the_stated_ratio_of_the_stated_basis():
    """Exergy is 1.04 times the lower heating value, whichever basis the machine is judged on."""
    # Natural gas: about 1.04 of the lower heating value (Szargut, Morris and Steward, 1988).
    fuel = make_fuel(
        heating_value(10.0 * KWH_PER_M3, 11.0 * KWH_PER_M3),
        exergy=assumed("fuels.fuel.exergy", 1.04, 0.01),
        exergy_of="lower",
    )
    table, _ = meter(gas_ticks(100.0), gas_plant(fuel, basis="higher"))
    assert table.exergy_W["engine.gas"] == pytest.approx(1040e3)
    assert "assumed:fuels.fuel.exergy" in table.sources["engine.gas"]


def test_a_pressure_below_nothing_is_unknown_and_told():
    """An absolute pressure that is not positive gives no volume but a finding that names the stream."""
    fuel = make_fuel(heating_value(KWH_PER_M3))
    settings = gas_plant(fuel, OPERATING, pressure="absolute")
    table, findings = meter(gas_ticks(pressure_Pa=-10.0), settings)
    assert not table.known.any()
    assert [(found.code, found.stream) for found in findings] == [(FindingCode.OUT_OF_RANGE, "gas")]


def liquid_plant(way: LiquidFuel) -> MeteringSettings:
    """One engine on gas oil of 42.7 MJ/kg, 840 kg/m3 at 15 degC, 8.3e-4 1/K."""
    fuel = make_fuel(
        heating_value(42.7e6),
        phase="liquid",
        density=assumed("fuels.fuel.density", 840.0, 1.0),
        density_temperature_K=288.15,
        expansion=assumed("fuels.fuel.expansion", 8.3e-4),
    )
    tags = [make_tag("volume"), make_tag("mass"), make_tag("temperature")]
    engine = make_machine("genset", {"oil": (Role.FUEL_IN, way)}, running=RUNNING, basis="lower")
    return make_settings(tags, engine, fuels={"fuel": fuel})


def test_liquid_fuel_by_mass_and_by_volume():
    """205 g/kWh at 42.7 MJ/kg are 41.1 %, and a warm litre holds less fuel than a cold one."""
    # 3600/(0.205 42.7) = 411.3: arithmetic of specific consumption, ISO 3046-1 (42.7 MJ/kg).
    ticks = make_ticks({"volume": 1e-3, "mass": 0.205 * 1000 * PER_HOUR, "temperature": 303.15})
    by_mass, _ = meter(ticks, liquid_plant(LiquidFuel("fuel", "mass", None, None)))
    assert 1000e3 / stream_W(by_mass, "genset.oil") == pytest.approx(0.411, abs=5e-4)
    by_volume, _ = meter(ticks, liquid_plant(LiquidFuel("fuel", None, "volume", "temperature")))
    # 840/(1 + 8.3e-4 15) = 829.67 kg/m3: definition of the cubic expansion coefficient.
    assert stream_W(by_volume, "genset.oil") == pytest.approx(829.67e-3 * 42.7e6, rel=1e-5)
    assert "assumed:fuels.fuel.density" in by_volume.sources["genset.oil"]
    assert "assumed:fuels.fuel.density" not in by_mass.sources["genset.oil"]


def test_the_same_fuel_seen_by_a_machine_on_the_other_basis():
    """A stream that is the same as another machine's fuel is counted on this machine's own basis."""
    fuel = make_fuel(heating_value(10.0 * KWH_PER_M3, 11.0 * KWH_PER_M3))
    first = make_machine(
        "engine",
        {"gas": (Role.FUEL_IN, GasVolume("fuel", "volume", "meter"))},
        running=RUNNING,
        basis="lower",
    )
    twin = make_machine(
        "plant", {"gas": (Role.FUEL_IN, SameAs("engine", "gas"))}, running=RUNNING, basis="higher"
    )
    settings = make_settings(
        [make_tag("volume", relative=0.01)],
        twin,
        first,
        fuels={"fuel": fuel},
        gas_meters={"meter": AT_STATE},
    )
    table, _ = meter(make_ticks({"volume": 100.0 * PER_HOUR}), settings)
    assert stream_W(table, "plant.gas") == pytest.approx(1100e3)
    assert stream_W(table, "engine.gas") == pytest.approx(1000e3)
    assert table.sources["plant.gas"] == table.sources["engine.gas"] == {"calibration:volume"}
