"""Heat of carriers, flue gas and combustion air, against property libraries and exact balances."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from metering_factory import (
    CELSIUS,
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

from auditor.metering import MeteringSettings, meter
from auditor.metering.combustion_air import AIR_HEAT_CAPACITY_J_PER_KGK
from auditor.records.errors import PlantFileError
from auditor.records.findings import FindingCode
from auditor.records.machines import (
    CombustionAir,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    Role,
    Running,
)
from auditor.records.plant import FlueGas, Fluid, GasMeter

RUNNING = Running("flow", 0.0, None)
WATER = Fluid("water", "water", None, None, None, None, None)


def heat_plant(fluid: Fluid, role: Role, flow_at: str | None = None) -> MeteringSettings:
    """One machine with one stream of a carrier."""
    way = FlowAndTemperatures("flow", flow_at, "inlet", "outlet", "fluid")  # type: ignore[arg-type]
    machine = make_machine("unit", {"heat": (role, way)}, running=RUNNING)
    tags = [make_tag("flow"), make_tag("inlet"), make_tag("outlet")]
    return make_settings(tags, machine, fluids={"fluid": fluid})


def carrier_ticks(flow: float, inlet_C: float, outlet_C: float):
    """One tick of flow and two temperatures."""
    return make_ticks({"flow": flow, "inlet": inlet_C + CELSIUS, "outlet": outlet_C + CELSIUS})


@pytest.mark.parametrize(("flow_at", "density_at_C"), [("outlet", 90.1), ("inlet", 72.0)])
def test_water_heat_against_an_independent_property_library(flow_at: str, density_at_C: float):
    """Heat of a water circuit is volume x density at the meter x enthalpy difference, within 0.01 %."""
    # EN 1434-1:2015 (16 bar); properties by the iapws library's IAPWS-IF97 as an oracle.
    from iapws import IAPWS97

    cold, hot = IAPWS97(T=72.0 + CELSIUS, P=1.6), IAPWS97(T=90.1 + CELSIUS, P=1.6)
    at_meter = IAPWS97(T=density_at_C + CELSIUS, P=1.6)
    expected_W = 32.0 * PER_HOUR * at_meter.rho * (hot.h - cold.h) * 1e3
    ticks = carrier_ticks(32.0 * PER_HOUR, 72.0, 90.1)
    table, _ = meter(ticks, heat_plant(WATER, Role.USEFUL_HEAT, flow_at))
    assert stream_W(table, "unit.heat") == pytest.approx(expected_W, rel=1e-4)
    mean_K = (hot.h - cold.h) / (hot.s - cold.s)
    assert table.entropic_K["unit.heat"] == pytest.approx(mean_K, abs=1e-3)


def test_the_place_of_a_water_meter_matters_by_its_density():
    """A meter in the 70 degC pipe instead of the 90 degC pipe reads 1.3 % more heat for the same volume."""
    # Density of water at 1 bar: 977.8 kg/m3 at 70 degC, 965.3 kg/m3 at 90 degC (handbook tables of IAPWS).
    ticks = carrier_ticks(0.01, 70.0, 90.0)
    cold, _ = meter(ticks, heat_plant(WATER, Role.USEFUL_HEAT, "inlet"))
    hot, _ = meter(ticks, heat_plant(WATER, Role.USEFUL_HEAT, "outlet"))
    ratio = stream_W(cold, "unit.heat") / stream_W(hot, "unit.heat")
    assert ratio == pytest.approx(977.8 / 965.3, abs=2e-4)


def test_heat_is_positive_in_the_direction_of_its_role():
    """A carrier that brings heat cools, one that takes heat away warms; the other way round is negative."""
    fluid = declared_fluid(2350.0)
    cooling = carrier_ticks(23.0, 275.0, 185.0)
    warming = carrier_ticks(23.0, 185.0, 275.0)
    expected_W = 23.0 * 2350.0 * 90.0
    for role, positive, negative in (
        (Role.HEAT_IN, cooling, warming),
        (Role.USEFUL_HEAT, warming, cooling),
        (Role.REJECTED_HEAT, warming, cooling),
    ):
        settings = heat_plant(fluid, role)
        assert stream_W(meter(positive, settings)[0], "unit.heat") == pytest.approx(expected_W)
        assert stream_W(meter(negative, settings)[0], "unit.heat") == pytest.approx(-expected_W)


def test_waste_heat_engine_oil_and_air():
    """Oil of 23 kg/s from 275 to 185 degC brings 4865 kW, and its entropic mean is 501.8 K."""
    # Worked by hand: 23 x 2.35 x 90 = 4864.5 kW; 90/ln(548.15/458.15) = 501.8 K (Lorenz, 1894);
    # air 226 kg/s, 17 K: 3865 kW, 17/ln(305.15/288.15) = 296.57 K.
    oil, _ = meter(carrier_ticks(23.0, 275.0, 185.0), heat_plant(declared_fluid(2350.0), Role.HEAT_IN))
    assert stream_W(oil, "unit.heat") == pytest.approx(4865e3, rel=1e-3)
    assert oil.entropic_K["unit.heat"] == pytest.approx(501.8, abs=0.05)
    air, _ = meter(carrier_ticks(226.0, 15.0, 32.0), heat_plant(declared_fluid(1006.0), Role.REJECTED_HEAT))
    assert stream_W(air, "unit.heat") == pytest.approx(3865e3, rel=1e-3)
    assert air.entropic_K["unit.heat"] == pytest.approx(296.57, abs=0.005)


@pytest.mark.parametrize("factor", [1.0, 1.02])
def test_a_rising_heat_capacity_is_integrated(factor: float):
    """With 2.14 to 2.47 kJ/(kg K) the entropic mean of the oil is 502.9 K, not 501.8 K; a scale cancels."""
    # Integral of a straight line by hand: mean 2.305 x 90 = 207.45 kJ/kg; for the entropy
    # (2140 - b 458.15) ln(548.15/458.15) + b 90 with b = 330/90 J/(kg K2) gives 502.9 K.
    table = ((458.15, 2140.0), (548.15, 2470.0))
    fluid = declared_fluid(factor, heat_capacity_table=table)
    result, _ = meter(carrier_ticks(10.0, 275.0, 185.0), heat_plant(fluid, Role.HEAT_IN))
    assert stream_W(result, "unit.heat") == pytest.approx(factor * 10.0 * 207_450.0)
    assert result.entropic_K["unit.heat"] == pytest.approx(502.9, abs=0.05)


def test_a_table_of_density_is_read_at_the_meters_temperature():
    """A volume of oil counts with the density of the pipe the meter sits in, times its factor."""
    fluid = declared_fluid(
        2000.0,
        density=assumed("fluids.fluid.density", 1.0, 0.01),
        density_table=((400.0, 800.0), (600.0, 700.0)),
    )
    ticks = carrier_ticks(0.01, 500.0 - CELSIUS, 450.0 - CELSIUS)
    for place, density in (("inlet", 750.0), ("outlet", 775.0)):
        table, _ = meter(ticks, heat_plant(fluid, Role.HEAT_IN, place))
        assert stream_W(table, "unit.heat") == pytest.approx(0.01 * density * 2000.0 * 50.0)
        assert "assumed:fluids.fluid.density" in table.sources["unit.heat"]
    by_mass, _ = meter(ticks, heat_plant(fluid, Role.HEAT_IN))
    assert "assumed:fluids.fluid.density" not in by_mass.sources["unit.heat"]


def test_glycol_carries_less_heat_than_water_by_volume():
    """35 % propylene glycol at 60 degC carries about 5 % less heat by volume than water."""
    # Melinder, Properties of Secondary Working Fluids (2010), as carried by CoolProp.
    glycol = Fluid("brine", "propylene glycol", 0.35, None, None, None, None)
    ticks = carrier_ticks(0.01, 55.0, 65.0)
    brine, _ = meter(ticks, heat_plant(glycol, Role.USEFUL_HEAT, "inlet"))
    water, _ = meter(ticks, heat_plant(WATER, Role.USEFUL_HEAT, "inlet"))
    ratio = stream_W(brine, "unit.heat") / stream_W(water, "unit.heat")
    assert ratio == pytest.approx(0.95, abs=0.01)


@pytest.mark.parametrize("fluid", [WATER, declared_fluid(2350.0)])
def test_the_entropic_mean_is_steady_where_nothing_is_cooled(fluid: Fluid):
    """Equal inlet and outlet give no heat and their own temperature as entropic mean."""
    for glide_K in (0.0, 1e-6, 1e-3, 0.01):
        ticks = carrier_ticks(10.0, 80.0, 80.0 + glide_K)
        table, _ = meter(ticks, heat_plant(fluid, Role.USEFUL_HEAT))
        assert table.entropic_K["unit.heat"] == pytest.approx(353.15 + glide_K / 2, abs=1e-4)


def test_water_that_would_boil_is_unknown_and_told():
    """A reading above saturation gives no heat and one finding that names the stream."""
    table, findings = meter(carrier_ticks(10.0, 70.0, 250.0), heat_plant(WATER, Role.USEFUL_HEAT, "inlet"))
    assert not table.known.any()
    assert np.isnan(table.entropic_K["unit.heat"]).all()
    (found,) = findings
    assert (found.code, found.machine, found.stream) == (FindingCode.OUT_OF_RANGE, "unit", "heat")
    assert found.words["reason"] == "outside the range of the physics"
    assert found.numbers["affected_s"] == 60.0


def test_a_temperature_below_absolute_zero_is_unknown():
    """A broken sensor at -300 degC spoils its tick and not the run."""
    table, findings = meter(
        carrier_ticks(10.0, -300.0, 20.0), heat_plant(declared_fluid(1000.0), Role.USEFUL_HEAT)
    )
    assert not table.known.any()
    assert len(findings) == 1


# --- flue gas ---------------------------------------------------------------------------------

METHANE = FlueGas(
    air_demand=assumed("fuels.fuel.air_demand", 9.5484, 0.09),
    dry_flue_gas=assumed("fuels.fuel.flue_gas.dry", 8.5484, 0.08),
    fuel_density=assumed("fuels.fuel.flue_gas.density_fuel", 0.7158, 0.007),
    heat_capacity=assumed("fuels.fuel.flue_gas.heat_capacity", 1100.0, 11.0),
)
METHANE_LOWER_J_PER_M3 = 802.60e3 / 22.41396e-3


def flue_plant(
    flue_gas: FlueGas = METHANE,
    *,
    outlet: str | None = None,
    reference_K: float = 293.15,
    basis: str | None = "dry",
) -> MeteringSettings:
    """A boiler on methane with its flue gas and combustion air."""
    fuel = make_fuel(heating_value(METHANE_LOWER_J_PER_M3), flue_gas=flue_gas)
    streams = {
        "stack": (Role.REJECTED_HEAT, FlueGasHeat("gas", "oxygen", "hot", outlet)),
        "air": (Role.POWER_IN, CombustionAir("gas", "oxygen", "air")),
        "gas": (Role.FUEL_IN, GasVolume("fuel", "flow", "meter")),
    }
    machine = make_machine("boiler", streams, running=RUNNING, basis="lower")
    return make_settings(
        [make_tag(name) for name in ("flow", "hot", "cool", "air")] + [make_tag("oxygen", basis=basis)],
        machine,
        fuels={"fuel": fuel},
        gas_meters={"meter": GasMeter("meter", "already at the fuel's state", None, None, None)},
        reference_K=reference_K,
    )


def flue_ticks(oxygen: float, hot_C: float, *, flow: float = 0.1, cool_C: float = 120.0, air_C: float = 20.0):
    """One tick of the boiler."""
    return make_ticks(
        {
            "flow": flow,
            "oxygen": oxygen,
            "hot": hot_C + CELSIUS,
            "cool": cool_C + CELSIUS,
            "air": air_C + CELSIUS,
        }
    )


def wet_flue_gas_heat_capacity(excess: float, hot_K: float, cold_K: float) -> float:
    """Mean heat capacity [J/(kg K)] of methane's flue gas, by ideal-gas enthalpies of a library."""
    from CoolProp.CoolProp import PropsSI

    oxygen_in_air, argon, carbon_dioxide = 0.20946, 0.00934, 0.00041
    air = excess * 2.0 / oxygen_in_air
    moles = {
        "CarbonDioxide": 1.0 + air * carbon_dioxide,
        "Water": 2.0,
        "Oxygen": air * oxygen_in_air - 2.0,
        "Argon": air * argon,
        "Nitrogen": air * (1.0 - oxygen_in_air - argon - carbon_dioxide),
    }
    heat = mass = 0.0
    for gas, amount in moles.items():
        heat += amount * (
            PropsSI("Hmolar", "T", hot_K, "P", 100.0, gas) - PropsSI("Hmolar", "T", cold_K, "P", 100.0, gas)
        )
        mass += amount * PropsSI("M", gas)
    return heat / mass / (hot_K - cold_K)


@pytest.mark.parametrize(
    ("oxygen", "excess", "hot_C", "printed"),
    [
        (0.03, 1.14966, 200.0, 0.083243),
        (0.03, 1.14966, 120.0, 0.045854),
        (0.08, 1.55323, 450.0, 0.266590),
        (0.10, 1.81790, 500.0, 0.344904),
    ],
)
def test_flue_gas_loss_of_methane_against_an_exact_balance(
    oxygen: float, excess: float, hot_C: float, printed: float
):
    """Flue gas from fuel volume and dry oxygen carries what an exact balance of methane says."""
    # Exact balance with the NASA-7 thermodynamics of GRI-Mech 3.0 (cantera), air at 20 degC, lower
    # heating value 802.60 kJ/mol: 8.324, 4.585, 26.659 and 34.490 % of it.
    capacity = wet_flue_gas_heat_capacity(excess, hot_C + CELSIUS, 293.15)
    flue_gas = replace(METHANE, heat_capacity=assumed("cp", capacity))
    table, _ = meter(flue_ticks(oxygen, hot_C), flue_plant(flue_gas))
    share = stream_W(table, "boiler.stack") / stream_W(table, "boiler.gas")
    assert share == pytest.approx(printed, rel=1.5e-3)


def test_flue_gas_between_two_tags():
    """Flue gas that cools from 420 to 120 degC and on to the reference gives both heats."""
    ticks = flue_ticks(0.095, 420.0)
    through, _ = meter(ticks, flue_plant(outlet="cool"))
    whole, _ = meter(ticks, flue_plant(reference_K=298.15))
    ratio = stream_W(through, "boiler.stack") / stream_W(whole, "boiler.stack")
    assert ratio == pytest.approx(300.0 / 395.0)
    assert through.entropic_K["boiler.stack"] == pytest.approx(300.0 / np.log(693.15 / 393.15))


def test_combustion_air_brings_heat_above_the_reference_and_takes_it_below():
    """Air demand x excess x density gives the air; at 11 degC it is short of 25 degC by about 24 kW."""
    # 282.9 m3/h of gas, 9.6 m3/m3, 9.5 % oxygen: 1.70 kg/s of air; x 1.006 x -14 K = -24.0 kW.
    gas = FlueGas(
        air_demand=assumed("a", 9.6),
        dry_flue_gas=assumed("v", 8.6),
        fuel_density=assumed("d", 0.78),
        heat_capacity=assumed("c", 1100.0),
    )
    for air_C, expected_W in ((11.0, -24.0e3), (25.0, 0.0), (39.0, 24.0e3)):
        ticks = flue_ticks(0.095, 420.0, flow=282.9 * PER_HOUR, air_C=air_C)
        table, _ = meter(ticks, flue_plant(gas, reference_K=298.15))
        assert stream_W(table, "boiler.air") == pytest.approx(expected_W, abs=0.1e3)


def test_heat_capacity_of_air_against_a_property_library():
    """The stated heat capacity of air holds within 0.25 % from -30 to 60 degC."""
    from CoolProp.CoolProp import PropsSI

    for celsius in (-30.0, 0.0, 25.0, 60.0):
        capacity = PropsSI("C", "T", celsius + CELSIUS, "P", 101_325.0, "Air")
        assert pytest.approx(capacity, rel=2.5e-3) == AIR_HEAT_CAPACITY_J_PER_KGK


def test_no_flue_gas_where_the_machine_stands_still():
    """At standstill the analyser sees air: no flue gas then, but an unknown one while running."""
    still, findings = meter(flue_ticks(0.2095, 40.0, flow=0.0), flue_plant())
    assert stream_W(still, "boiler.stack") == 0.0
    assert stream_W(still, "boiler.air") == 0.0
    assert still.known.all() and findings == ()
    running, findings = meter(flue_ticks(0.2095, 40.0), flue_plant())
    assert running.known[:, running.streams.index("boiler.gas")].all()
    assert np.isnan(stream_W(running, "boiler.stack")).all()
    assert [found.stream for found in findings] == ["stack", "air"]


@pytest.mark.parametrize("basis", ["wet", None])
def test_oxygen_that_is_not_stated_to_be_dry_is_refused(basis: str | None):
    """An analyser of wet flue gas, or of who knows what, is a fault of the plant file, named with its tag."""
    with pytest.raises(PlantFileError, match=r"tags\.oxygen\.basis"):
        meter(flue_ticks(0.05, 200.0), flue_plant(basis=basis))
