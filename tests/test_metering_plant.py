"""Whole plants: nominal balances, what is known, what runs, creep, and streams made of each other."""

from __future__ import annotations

import math
from typing import get_args

import numpy as np
import pytest
from metering_factory import (
    CELSIUS,
    KWH_PER_M3,
    PER_HOUR,
    assumed,
    declared_fluid,
    heating_value,
    make_fuel,
    make_machine,
    make_settings,
    make_tag,
    make_ticks,
    stream_W,
)

from auditor.metering import WAYS, MeteringSettings, meter
from auditor.records.findings import FindingCode
from auditor.records.machines import (
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    Power,
    Role,
    Running,
    SameAs,
    Shaft,
    ShareOf,
    Way,
)
from auditor.records.plant import AirPressure, FlueGas, Fluid, GasMeter
from auditor.records.ticks import TickTable


def kW(table, key: str) -> float:
    """First tick of a stream."""
    return float(stream_W(table, key)[0]) / 1e3


def waste_heat_site() -> tuple[TickTable, MeteringSettings]:
    """An exhaust coil and the organic Rankine engine that its oil drives, at nominal load."""
    means = {
        "exhaust_in": 450.0 + CELSIUS,
        "exhaust_out": 205.0 + CELSIUS,
        "exhaust_flow": 18.0,
        "oil_flow": 23.0,
        "oil_hot": 275.0 + CELSIUS,
        "oil_cold": 185.0 + CELSIUS,
        "air_in": 15.0 + CELSIUS,
        "air_out": 32.0 + CELSIUS,
        "air_flow": 226.0,
        "gross_power": 1000e3,
        "own_power": 160e3,
    }
    coil = make_machine(
        "coil",
        {
            "exhaust": (
                Role.HEAT_IN,
                FlowAndTemperatures("exhaust_flow", None, "exhaust_in", "exhaust_out", "exhaust"),
            ),
            "oil": (Role.USEFUL_HEAT, SameAs("orc", "oil")),
            "casing": (Role.LOSS, ShareOf("exhaust", assumed("casing", 0.015, 0.005))),
        },
        running=Running("exhaust_flow", 2.0, None),
    )
    orc = make_machine(
        "orc",
        {
            "feed": (Role.POWER_IN, ShareOf("own_use", assumed("feed", 0.3125, 0.03))),
            "oil": (Role.HEAT_IN, FlowAndTemperatures("oil_flow", None, "oil_hot", "oil_cold", "oil")),
            "power": (Role.WORK_OUT, Power("gross_power", "terminals")),
            "own_use": (Role.OWN_USE, Power("own_power", "")),
            "drive": (Role.LOSS, ShareOf("power", assumed("drive", 0.05, 0.01))),
            "air": (Role.REJECTED_HEAT, FlowAndTemperatures("air_flow", None, "air_in", "air_out", "air")),
        },
        running=Running("gross_power", 20e3, None),
    )
    fluids = {
        "exhaust": declared_fluid(1120.0),
        "oil": declared_fluid(2350.0),
        "air": declared_fluid(1006.0),
    }
    tags = [make_tag(name, relative=0.01) for name in means]
    return make_ticks(means), make_settings(tags, coil, orc, fluids=fluids)


def test_nominal_balance_of_a_waste_heat_engine():
    """Exhaust 4939, coil loss 74, oil 4865, air 3865, feed and drive 50 kW: the balance closes."""
    # By hand: 18 x 1.12 x 245; 1.5 % of it; 23 x 2.35 x 90; 226 x 1.006 x 17; 0.3125 x 160; 5 % of 1000.
    ticks, settings = waste_heat_site()
    table, findings = meter(ticks, settings)
    nominal = {
        "coil.exhaust": 4939.0,
        "coil.casing": 74.1,
        "coil.oil": 4865.0,
        "orc.oil": 4865.0,
        "orc.power": 1000.0,
        "orc.own_use": 160.0,
        "orc.feed": 50.0,
        "orc.drive": 50.0,
        "orc.air": 3865.0,
    }
    for key, expected_kW in nominal.items():
        assert kW(table, key) == pytest.approx(expected_kW, rel=1e-3), key
    rest = kW(table, "orc.oil") + 50.0 - 1000.0 - 50.0 - kW(table, "orc.air")
    assert abs(rest) < 0.001 * kW(table, "orc.oil")
    ceiling = 1.0 - table.entropic_K["orc.air"][0] / table.entropic_K["orc.oil"][0]
    assert ceiling == pytest.approx(0.409, abs=5e-4)
    assert findings == () and table.known.all()


def test_streams_are_listed_as_declared_whatever_they_are_made_of():
    """A stream may stand before the one it is made of, and brings that one's inputs and sources."""
    ticks, settings = waste_heat_site()
    table, _ = meter(ticks, settings)
    assert table.streams[:4] == ("coil.exhaust", "coil.oil", "coil.casing", "orc.feed")
    assert table.inputs["coil.oil"] == ("oil_hot", "oil_cold", "oil_flow")
    assert table.inputs["orc.feed"] == ("own_power",)
    assert table.sources["orc.feed"] == {"calibration:own_power", "assumed:feed"}
    assert table.sources["coil.oil"] == table.sources["orc.oil"]
    assert np.array_equal(table.entropic_K["coil.oil"], table.entropic_K["orc.oil"])


def test_streams_made_of_each_other_are_refused():
    """Two streams that point at each other are named instead of looping for ever."""
    streams = {
        "one": (Role.LOSS, ShareOf("two", assumed("one", 0.5))),
        "two": (Role.LOSS, ShareOf("one", assumed("two", 0.5))),
    }
    machine = make_machine("unit", streams, running=Running("tag", 0.0, None))
    with pytest.raises(ValueError, match=r"unit\.one -> unit\.two -> unit\.one"):
        meter(make_ticks({"tag": 1.0}), make_settings([make_tag("tag")], machine))


def gas_engine(flow_at: str = "inlet") -> MeteringSettings:
    """A gas engine with two water circuits, exhaust heat exchanger and stack."""
    flue_gas = FlueGas(
        assumed("fuels.fuel.air_demand", 9.6, 0.096),
        assumed("fuels.fuel.flue_gas.dry", 8.6, 0.086),
        assumed("fuels.fuel.flue_gas.density_fuel", 0.78, 0.0078),
        assumed("fuels.fuel.flue_gas.heat_capacity", 1100.0, 11.0),
    )
    fuel = make_fuel(heating_value(10.10 * KWH_PER_M3, 11.20 * KWH_PER_M3), standard=0.004, flue_gas=flue_gas)
    water = ("hot_flow", flow_at, "hot_return", "hot_supply", "water")
    streams: dict[str, tuple[Role, Way]] = {
        "gas": (Role.FUEL_IN, GasVolume("fuel", "gas_index", "meter")),
        "power": (Role.WORK_OUT, Power("generated", "generator terminals")),
        "own_use": (Role.OWN_USE, Power("auxiliaries", "")),
        "hot_water": (Role.USEFUL_HEAT, FlowAndTemperatures(*water)),  # type: ignore[arg-type]
        "exhaust": (Role.USEFUL_HEAT, FlueGasHeat("gas", "oxygen", "exhaust_hot", "exhaust_cool")),
        "stack": (Role.REJECTED_HEAT, FlueGasHeat("gas", "oxygen", "exhaust_cool", None)),
        "casing": (Role.LOSS, ShareOf("gas", assumed("casing", 0.026, 0.005))),
        "generator": (Role.LOSS, ShareOf("power", assumed("generator", 0.031, 0.005))),
    }
    names = "gas_index gas_temperature generated auxiliaries hot_flow hot_supply hot_return".split()
    tags = [make_tag(name, relative=0.01) for name in (*names, "exhaust_hot", "exhaust_cool")]
    tags += [make_tag("gas_pressure", pressure="gauge"), make_tag("oxygen", basis="dry", absolute=0.002)]
    tags += [make_tag("breaker", calibration=None, between="state", states={"0": "open", "1": "closed"})]
    return make_settings(
        tags,
        make_machine("engine", streams, running=Running("breaker", None, "closed"), basis="lower"),
        fluids={"water": Fluid("water", "water", None, None, None, None, None)},
        fuels={"fuel": fuel},
        gas_meters={
            "meter": GasMeter(
                "meter", "operating volume", "gas_pressure", "gas_temperature", assumed("z", 1.0, 0.001)
            )
        },
        air_pressure=AirPressure(None, assumed("site.air_pressure", 101_325.0, 900.0)),
    )


FULL_LOAD = {
    "gas_index": 268.8 * PER_HOUR,
    "gas_pressure": 10e3,
    "gas_temperature": 12.0 + CELSIUS,
    "generated": 1200e3,
    "auxiliaries": 36e3,
    "hot_flow": 32.0 * PER_HOUR,
    "hot_supply": 90.1 + CELSIUS,
    "hot_return": 72.0 + CELSIUS,
    "exhaust_hot": 420.0 + CELSIUS,
    "exhaust_cool": 120.0 + CELSIUS,
    "oxygen": 0.095,
    "breaker=open": 0.0,
    "breaker=closed": 1.0,
}


def test_nominal_balance_of_a_gas_engine():
    """268.8 m3/h operating are 2857 kW; 42.0 % power, 660 kW of water, casing 74 kW, generator 37 kW."""
    # Gas law by hand: 268.8 (1.11325/1.01325)(273.15/285.15) = 282.9 m3/h x 10.10 kWh/m3 = 2857 kW.
    # Flue gas by hand: excess 1 + (8.6/9.6) 9.5/(20.946 - 9.5) = 1.7435; air 9.6 x 1.7435 x 1.2929 and
    # fuel 0.78 kg per m3: 22.42 kg/m3, so 1.762 kg/s x 1.10 x 300 K = 581 kW and x 95 K = 184 kW.
    table, _ = meter(make_ticks(FULL_LOAD), gas_engine())
    assert kW(table, "engine.gas") == pytest.approx(2857.0, rel=1e-3)
    assert table.higher_W["engine.gas"] == pytest.approx(282.9e3 * 11.20, rel=1e-3)
    assert kW(table, "engine.power") / kW(table, "engine.gas") == pytest.approx(0.420, abs=5e-4)
    assert kW(table, "engine.hot_water") == pytest.approx(660.0, rel=2e-3)
    assert kW(table, "engine.exhaust") == pytest.approx(581.4, rel=1e-3)
    assert kW(table, "engine.stack") == pytest.approx(184.1, rel=1e-3)
    assert kW(table, "engine.casing") == pytest.approx(0.026 * 2857.0, rel=1e-3)
    assert kW(table, "engine.generator") == pytest.approx(37.2)
    assert table.running["engine"].tolist() == [1.0]
    assert "breaker=closed" not in table.inputs["engine.exhaust"]
    assert table.inputs["engine.exhaust"] == (
        "gas_index",
        "gas_pressure",
        "gas_temperature",
        "oxygen",
        "exhaust_hot",
        "exhaust_cool",
    )


def test_a_tick_is_known_when_every_input_is_covered():
    """A tick that is covered by less than half, or by nothing, is unknown for the streams it feeds only."""
    means = FULL_LOAD | {"hot_flow": [0.01, 0.01, 0.01, math.nan]}
    covered = {"hot_flow": [60.0, 30.0, 29.0, 0.0], "breaker=closed": [60.0, 29.0, 60.0, 60.0]}
    table, findings = meter(make_ticks(means, ticks=4, covered_s=covered), gas_engine())
    water = table.streams.index("engine.hot_water")
    assert table.known[:, water].tolist() == [True, True, False, False]
    assert np.isnan(table.power_W[2:, water]).all()
    assert np.isnan(table.inlet_K["engine.hot_water"][2:]).all()
    assert table.known[:, table.streams.index("engine.exhaust")].all()
    assert table.running["engine"] == pytest.approx([1.0, math.nan, 1.0, 1.0], nan_ok=True)
    assert findings == ()


def test_creep_at_standstill_is_listed_with_its_energy():
    """0.4 m3/h on a stopped engine's gas meter is one finding; auxiliaries and derived streams are none."""
    # By hand: 0.4 m3/h x 1.05248 x 10.10 kWh/m3 = 4.252 kW over two minutes: 0.5103 MJ.
    still = [0.0, 0.0, 1.0, 1.0]
    means = FULL_LOAD | {
        "breaker=closed": still,
        "gas_index": np.where(np.array(still) > 0.0, 268.8, 0.4) * PER_HOUR,
        "generated": 1200e3 * np.array(still),
        "hot_flow": 32.0 * PER_HOUR * np.array(still),
        "oxygen": np.where(np.array(still) > 0.0, 0.095, 0.2095),
    }
    table, findings = meter(make_ticks(means, ticks=4), gas_engine())
    (creep,) = findings
    assert (creep.code, creep.stream) == (FindingCode.CREEP_AT_STANDSTILL, "gas")
    assert creep.numbers["power_W"] == pytest.approx(4252.0, rel=1e-3)
    assert creep.numbers["standstill_s"] == 120.0
    assert creep.energy_J == pytest.approx(4252.0 * 120.0, rel=1e-3)
    assert table.standstill_W["engine.gas"] == creep.numbers["power_W"]
    assert table.standstill_W["engine.own_use"] == pytest.approx(36e3)
    assert stream_W(table, "engine.exhaust")[0] == 0.0
    assert table.known.all()


def test_a_machine_that_never_stops_has_no_standstill_power():
    """Without a standstill its mean power is not a number, and nothing creeps."""
    table, findings = meter(make_ticks(FULL_LOAD), gas_engine())
    assert all(math.isnan(power) for power in table.standstill_W.values())
    assert findings == ()


def test_a_tag_above_a_value_tells_running():
    """Running is the tick mean above the value, standing still at it, unknown without a reading."""
    machine = make_machine(
        "unit", {"power": (Role.WORK_OUT, Power("tag", "x"))}, running=Running("tag", 20.0, None)
    )
    ticks = make_ticks({"tag": [20.0, 20.1, math.nan]}, ticks=3)
    table, _ = meter(ticks, make_settings([make_tag("tag")], machine))
    assert table.running["unit"] == pytest.approx([0.0, 1.0, math.nan], nan_ok=True)


def test_shaft_power():
    """7639.4 N m at 1500 revolutions a minute are 1200 kW."""
    # P = 2 pi n M: 2 pi x 25 1/s x 7639.4 N m.
    streams: dict[str, tuple[Role, Way]] = {"shaft": (Role.WORK_OUT, Shaft("torque", "speed"))}
    machine = make_machine("pump", streams, running=Running("speed", 0.0, None))
    settings = make_settings([make_tag("torque"), make_tag("speed")], machine)
    table, _ = meter(make_ticks({"torque": 7639.4, "speed": 25.0}), settings)
    assert kW(table, "pump.shaft") == pytest.approx(1200.0, rel=1e-5)


def test_every_way_of_metering_has_its_function():
    """The table of ways holds each record that a stream can have, and no other."""
    assert set(WAYS) == set(get_args(Way))
