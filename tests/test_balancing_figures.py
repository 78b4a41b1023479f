"""Figures of machines against balances worked by hand and textbook arithmetic."""

from __future__ import annotations

import math

import numpy as np
import pytest
from balancing_factory import CELSIUS, Plant, balanced, make_machine, make_plant

from auditor.balancing import balance
from auditor.records.balances import MachineBalance
from auditor.records.machines import Ceiling, CeilingKind, Machine, Role
from auditor.records.verdicts import Closure, Status

KWH = 3.6e6
R = Role
OIL_TO_AIR = Ceiling(CeilingKind.FINITE, "oil", ("air",))


def waste_heat_engine(**fields: object) -> Machine:
    """Thermal oil in, work out, cooling air; the feed pump warms the fluid, the gear loses work."""
    roles = {
        "oil": R.HEAT_IN,
        "power": R.WORK_OUT,
        "own": R.OWN_USE,
        "feed": R.POWER_IN,
        "drive": (R.LOSS, "stated"),
        "air": R.REJECTED_HEAT,
    }
    return make_machine("orc", roles, **({"headline": "net", "ceiling": OIL_TO_AIR} | fields))


NOMINAL_KW = {
    "orc.oil": 4865.0,
    "orc.power": 1000.0,
    "orc.own": 160.0,
    "orc.feed": 50.0,
    "orc.drive": 50.0,
    "orc.air": 3865.0,
}
NOMINAL_C = {"orc.oil": (275.0, 185.0), "orc.air": (15.0, 32.0)}


def waste_heat_plant(ticks: int = 30, **fields: object) -> Plant:
    """One hour or less of the nominal point."""
    return make_plant([waste_heat_engine()], NOMINAL_KW, ticks=ticks, celsius=NOMINAL_C, **fields)


def kWh(result: MachineBalance, key: str) -> float:
    """Value of a period energy."""
    return result.period[key].value / KWH


def test_nominal_point_of_a_waste_heat_engine() -> None:
    """Efficiencies, ceiling and heats equal a balance worked by hand with logarithmic means.

    Oil 275 to 185 degC: 90/ln(548.15/458.15) = 501.8 K; air 15 to 32 degC: 17/ln(305.15/288.15)
    = 296.57 K; ceiling 40.9 %; of 3865 kW rejected the second law demands 4865 x 296.57/501.8 = 2875.
    """
    result = balanced(waste_heat_plant(ticks=60))["orc"]
    period = result.period
    assert period["gross"].value == pytest.approx(1000 / 4865)
    assert period["net"].value == pytest.approx(840 / 4865)
    assert period["gross"].value == pytest.approx(0.2055, abs=5e-5)
    assert period["net"].value == pytest.approx(0.1727, abs=5e-5)
    assert period["ceiling"].value == pytest.approx(0.409, abs=5e-5)
    assert period["source_temperature_K"].value == pytest.approx(501.8, abs=0.05)
    assert period["sink_temperature_K"].value == pytest.approx(296.57, abs=0.005)
    assert kWh(result, "rejected_J") == pytest.approx(3865)
    assert kWh(result, "demanded_rejection_J") == pytest.approx(2875, abs=0.5)
    assert kWh(result, "unavoidable_rest_J") == pytest.approx(990, abs=0.5)
    assert kWh(result, "residual_J") == pytest.approx(0, abs=1e-6)
    assert result.interval.values["rejected_W"] == pytest.approx([3865e3] * 4)


def test_the_rest_is_sink_temperature_times_entropy_generation() -> None:
    """Gouy and Stodola: what is rejected beyond the demanded equals T0 times the entropy generated.

    The 50 kW that gear and generator lose are taken to leave at the coldest temperature, 15 degC.
    """
    result = balanced(waste_heat_plant())["orc"]
    generation_kW_per_K = result.period["entropy_generation_W_per_K"].value / 1e3
    without_drive = generation_kW_per_K - 50 / (15 + CELSIUS)
    sink_K = result.period["sink_temperature_K"].value
    assert sink_K * without_drive == pytest.approx(2 * kWh(result, "unavoidable_rest_J"))
    assert without_drive == pytest.approx(3865 / 296.569 - 4865 / 501.806, rel=1e-4)


def test_power_into_the_fluid_is_taken_off_before_the_ceiling_binds() -> None:
    """The ceiling binds (work - pump work)/heat: 55 kW of pump work on 4865 kW are 1.1 points."""
    plant = make_plant([waste_heat_engine()], NOMINAL_KW | {"orc.feed": 55.0}, ticks=30, celsius=NOMINAL_C)
    period = balanced(plant)["orc"].period
    assert period["gross"].value - period["bound"].value == pytest.approx(0.0113, abs=5e-5)
    assert period["margin"].value == pytest.approx(period["bound"].value - period["ceiling"].value)
    assert period["ceiling_share"].value == pytest.approx(945 / 4865 / period["ceiling"].value)


def engine(**fields: object) -> Machine:
    """A gas engine with heat recovery: what it burns, gives and loses."""
    roles = {
        "gas": R.FUEL_IN,
        "power": R.WORK_OUT,
        "hot": R.USEFUL_HEAT,
        "exhaust": R.USEFUL_HEAT,
        "stack": R.REJECTED_HEAT,
        "low": R.REJECTED_HEAT,
        "casing": (R.LOSS, "stated"),
        "generator": (R.LOSS, "stated"),
        "slip": (R.LOSS, "stated"),
    }
    return make_machine("engine", roles, basis="lower", **fields)


FULL_KW = {
    "engine.gas": 2857.0,
    "engine.power": 1200.0,
    "engine.hot": 660.0,
    "engine.exhaust": 594.0,
    "engine.stack": 188.0,
    "engine.low": 70.0,
    "engine.casing": 75.0,
    "engine.generator": 37.0,
    "engine.slip": 33.0,
}


def test_full_load_balance_of_a_gas_engine_closes() -> None:
    """All nine streams of the invented engine's data sheet add up to the fuel; rejected 188 + 70."""
    plant = make_plant([engine()], FULL_KW, ticks=60)
    result = balanced(plant)["engine"]
    assert kWh(result, "residual_J") == pytest.approx(0, abs=1e-6)
    assert result.closure is Closure.CLOSES
    assert kWh(result, "rejected_J") == pytest.approx(258)
    assert result.period["gross"].value == pytest.approx(0.420, abs=5e-4)
    assert result.period["total"].value == pytest.approx((1200 + 660 + 594) / 2857)
    assert "demanded_rejection_J" not in result.period
    assert "entropy_generation_W_per_K" not in result.period


def test_month_of_a_gas_engine_by_hand() -> None:
    """496 h full, 184 h part load, 65 h stopped: 727.7 of 1752.5 MWh are 41.52 %, 85.6 % in total.

    Sums of energies by hand from the two operating points; a mean of hourly efficiencies is 41.32 %.
    """
    hours = np.repeat([0, 1, 2], [496, 184, 65])
    part = {"gas": 1823.0, "power": 720.0, "hot": 430.0, "exhaust": 392.0, "stack": 140.0, "low": 60.0}
    power_kW = {
        key: np.choose(hours, [full, part.get(key.partition(".")[2], 27.0), 0.0])
        for key, full in FULL_KW.items()
    }
    running = {"engine": np.where(hours < 2, 1.0, 0.0)}
    plant = make_plant([engine()], power_kW, ticks=745, tick_s=3600, interval_s=3600, running=running)
    result = balanced(plant)["engine"]
    assert kWh(result, "work_gross_J") / 1e3 == pytest.approx(727.7, abs=0.05)
    assert kWh(result, "fuel_in_J") / 1e3 == pytest.approx(1752.5, abs=0.05)
    assert result.period["gross"].value == pytest.approx(0.4152, abs=5e-5)
    assert result.period["total"].value == pytest.approx(0.856, abs=5e-4)
    assert (result.running_s, result.stopped_s) == (680 * 3600, 65 * 3600)
    assert result.period["gross"].coverage == 1.0


def test_low_load_counts_by_energy() -> None:
    """20 h at 1000/2500 and 4 h at 200/800 kW are 39.10 %, not the 37.5 % of a mean of hours."""
    load = np.repeat([1.0, 0.0], [20, 4])
    power_kW = {"m.in": np.where(load, 2500.0, 800.0), "m.out": np.where(load, 1000.0, 200.0)}
    machine = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT}, rated_power_W=1e6)
    result = balanced(make_plant([machine], power_kW, ticks=24, tick_s=3600, interval_s=3600))["m"]
    assert result.period["gross"].value == pytest.approx(20_800 / 53_200)
    assert result.period["gross"].value == pytest.approx(0.3910, abs=5e-5)
    hourly = result.interval.values["gross"]
    assert hourly.mean() == pytest.approx(0.375)
    assert hourly[result.interval.load >= 0.3] == pytest.approx([0.4] * 20)
    assert result.interval.load[-1] == pytest.approx(0.2)


def test_missing_power_is_neither_zero_nor_spread() -> None:
    """Power missing for 4 of 24 h: 40.0 % over the common hours, coverage 83.3 %, provisional."""
    power_kW = {"m.in": 2500.0, "m.out": np.repeat([1000.0, np.nan, 1000.0], [10, 4, 10])}
    machine = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT})
    result = balanced(make_plant([machine], power_kW, ticks=24, tick_s=3600, interval_s=3600))["m"]
    gross, fuel = result.period["gross"], result.period["fuel_in_J"]
    assert gross.value == pytest.approx(20_000 / 50_000)
    assert gross.coverage == pytest.approx(0.833, abs=5e-4)
    assert gross.status is Status.PROVISIONAL
    assert fuel.value / KWH == pytest.approx(60_000)
    assert fuel.common / KWH == pytest.approx(50_000)
    assert (fuel.coverage, fuel.status) == (1.0, Status.FIRM)
    assert np.isnan(result.interval.values["gross"][10:14]).all()
    assert result.interval.values["fuel_in_W"][10:14] == pytest.approx([2.5e6] * 4)


def test_no_ceiling_between_equal_temperatures() -> None:
    """Source and sink at 25 degC: no ceiling, nothing divided by zero, efficiency still there."""
    flat = {"orc.oil": (25.0, 25.0), "orc.air": (25.0, 25.0)}
    result = balanced(make_plant([waste_heat_engine()], NOMINAL_KW, ticks=30, celsius=flat))["orc"]
    assert np.isnan(result.interval.values["ceiling"]).all()
    assert result.interval.values["source_temperature_K"] == pytest.approx([298.15] * 2)
    assert result.period["margin"].withheld_because == "no ceiling"
    assert result.period["net"].status is Status.FIRM
    unknown = NOMINAL_KW | {"orc.oil": math.nan}
    blind = balanced(make_plant([waste_heat_engine()], unknown, ticks=30, celsius=flat))["orc"]
    assert blind.period["margin"].withheld_because == "coverage"


def test_two_reservoirs_stand_on_the_hottest_and_the_coldest() -> None:
    """Source 300 to 120 degC, sink 25 degC: 47.98 % between inlets, 37.56 % between means.

    Arithmetic on 1 - 298.15/573.15 and 180/ln(573.15/393.15) = 477.5 K.
    """
    roles = {"hot": R.HEAT_IN, "power": R.WORK_OUT, "cold": R.REJECTED_HEAT}
    power_kW = {"m.hot": 100.0, "m.power": 42.0, "m.cold": 58.0}
    celsius = {"m.hot": (300.0, 120.0), "m.cold": (25.0, 25.0)}

    def ceiling(kind: CeilingKind, celsius: dict[str, tuple[float, float]] = celsius) -> float:
        machine = make_machine("m", roles, ceiling=Ceiling(kind, "hot", ("cold",)))
        plant = make_plant([machine], power_kW, ticks=15, celsius=celsius)
        return balanced(plant)["m"].period["ceiling"].value

    assert ceiling(CeilingKind.TWO_RESERVOIRS) == pytest.approx(0.4798, abs=5e-5)
    assert ceiling(CeilingKind.FINITE) == pytest.approx(0.3756, abs=5e-5)
    warming = {**celsius, "m.cold": (25.0, 60.0)}
    assert ceiling(CeilingKind.TWO_RESERVOIRS, warming) == pytest.approx(0.4798, abs=5e-5)


@pytest.mark.parametrize(("share", "expected"), [(0.0, 0.316), (0.05, 0.324), (0.30, 0.361)])
def test_a_reversible_engine_sits_on_its_ceiling(share: float, expected: float) -> None:
    """Source mean 501.8 K, sink 70 degC: 31.6 %; with 5 or 30 % of the input to 25 degC 32.4 and 36.1 %.

    Entropy balance by hand: Q_h/501.8 = x Q_h/298.15 + q/343.15, work = Q_h - x Q_h - q.
    """
    source_K = 90 / math.log(548.15 / 458.15)
    warm = 343.15 * (1 / source_K - share / 298.15)
    work = 1 - share - warm
    roles = {"hot": R.HEAT_IN, "power": R.WORK_OUT, "warm": R.REJECTED_HEAT, "cool": R.REJECTED_HEAT}
    machine = make_machine("m", roles, ceiling=Ceiling(CeilingKind.FINITE, "hot", ("warm", "cool")))
    power_kW = {"m.hot": 1.0, "m.power": work, "m.warm": warm, "m.cool": share}
    celsius = {"m.hot": (275.0, 185.0), "m.warm": (70.0, 70.0), "m.cool": (25.0, 25.0)}
    period = balanced(make_plant([machine], power_kW, ticks=15, celsius=celsius))["m"].period
    assert period["ceiling"].value == pytest.approx(expected, abs=5e-4)
    assert period["margin"].value == pytest.approx(0.0, abs=1e-12)
    assert period["entropy_generation_W_per_K"].value == pytest.approx(0.0, abs=1e-12)


def test_ceiling_is_weighted_by_heat_not_a_ceiling_of_mean_temperatures() -> None:
    """One tick at 1000 kW and 500 K, one at 200 kW and 400 K, sink 300 K: (400 + 50)/1200 = 37.5 %."""
    roles = {"hot": R.HEAT_IN, "power": R.WORK_OUT, "cold": R.REJECTED_HEAT}
    machine = make_machine("m", roles, ceiling=Ceiling(CeilingKind.TWO_RESERVOIRS, "hot", ("cold",)))
    hot_C = np.array([500.0, 400.0]) - CELSIUS
    cold_C = np.full(2, 300.0 - CELSIUS)
    plant = make_plant(
        [machine],
        {"m.hot": [1000.0, 200.0], "m.power": 100.0, "m.cold": 500.0},
        ticks=2,
        interval_s=120,
        celsius={"m.hot": (hot_C, hot_C), "m.cold": (cold_C, cold_C)},
    )
    assert balanced(plant)["m"].interval.values["ceiling"] == pytest.approx([0.375])


def test_useful_heat_takes_its_share_of_the_entropy() -> None:
    """Demanded rejection with useful heat: T0 (Q_h/T_h - Q_u/T_u), never below zero.

    1000 kW at 500 K; 300 K sink; useful heat at 400 K: none 600 kW, 400 kW then 300, 900 kW then 0.
    """
    roles = {"hot": R.HEAT_IN, "power": R.WORK_OUT, "useful": R.USEFUL_HEAT, "cold": R.REJECTED_HEAT}
    machine = make_machine("m", roles, ceiling=Ceiling(CeilingKind.FINITE, "hot", ("useful", "cold")))
    useful_kW = np.repeat([0.0, 400.0, 900.0], 15)
    flat = {"m.hot": 500.0, "m.useful": 400.0, "m.cold": 300.0}
    plant = make_plant(
        [machine],
        {"m.hot": 1000.0, "m.power": 50.0, "m.useful": useful_kW, "m.cold": 950.0 - useful_kW},
        ticks=45,
        celsius={key: (kelvin - CELSIUS, kelvin - CELSIUS) for key, kelvin in flat.items()},
    )
    demanded = balanced(plant)["m"].interval.values["demanded_rejection_W"]
    assert demanded == pytest.approx([600e3, 300e3, 0.0], abs=1e-6)


def test_fuel_exergy_is_the_ceiling_of_combustion() -> None:
    """Natural gas: exergy 1.04 of the lower heating value; a ceiling above 1 on that basis."""
    machine = engine(ceiling=Ceiling(CeilingKind.FUEL_EXERGY, None, ()))
    plant = make_plant(
        [machine],
        FULL_KW,
        ticks=15,
        exergy_kW={"engine.gas": 2857 * 1.04},
        lower_kW={"engine.gas": 2857.0},
        higher_kW={"engine.gas": 2857 * 1.109},
    )
    result = balanced(plant)["engine"]
    assert result.period["ceiling"].value == pytest.approx(1.04)
    assert result.period["margin"].value == pytest.approx(1200 / 2857 - 1.04)
    out_kWh = (1200 + 660 + 594 + 188 + 70) / 4
    assert kWh(result, "energy_excess_J") == pytest.approx(out_kWh - 2857 * 1.109 / 4)


def test_no_first_law_test_on_an_undeclared_higher_heating_value() -> None:
    """Without the higher heating value condensation could explain any excess: no test, no figure."""
    assert "energy_excess_J" not in balanced(make_plant([engine()], FULL_KW, ticks=15))["engine"].period


def test_heat_exchanger_closes_and_may_cross_in_counterflow_only() -> None:
    """Hot 90 to 70, cold 60 to 75 degC is legal (75 > 70); cold leaving at 95 is 5 K beyond hot inlet."""
    machine = make_machine(
        "m", {"hot": R.HEAT_IN, "cold": R.USEFUL_HEAT, "casing": (R.LOSS, "stated")}, headline=None
    )
    power_kW = {"m.hot": 4939.0, "m.cold": 4865.0, "m.casing": 74.0}

    def exchanged(cold_out_C: float) -> MachineBalance:
        celsius = {"m.hot": (90.0, 70.0), "m.cold": (60.0, cold_out_C)}
        return balanced(make_plant([machine], power_kW, ticks=15, celsius=celsius))["m"]

    legal, crossed = exchanged(75.0), exchanged(95.0)
    assert legal.interval.values["crossing_K"] == pytest.approx([-10.0])
    assert crossed.interval.values["crossing_K"] == pytest.approx([5.0])
    assert kWh(legal, "residual_J") == pytest.approx(0, abs=1e-6)
    assert legal.period["heat"].value == pytest.approx(4865 / 4939)
    assert "ceiling" not in legal.period


def test_lagged_exchanger_with_small_differences_does_not_lose_entropy() -> None:
    """Casing losses carry entropy too: 92 to 72 degC warming 68 to 88 degC with 5 % loss is possible."""
    machine = make_machine(
        "m", {"hot": R.HEAT_IN, "cold": R.USEFUL_HEAT, "casing": (R.LOSS, "stated")}, headline=None
    )
    celsius = {"m.hot": (92.0, 72.0), "m.cold": (68.0, 88.0)}
    plant = make_plant(
        [machine], {"m.hot": 100.0, "m.cold": 95.0, "m.casing": 5.0}, ticks=15, celsius=celsius
    )
    hot_K, cold_K = 20 / math.log(365.15 / 345.15), 20 / math.log(361.15 / 341.15)
    expected = 95e3 / cold_K + 5e3 / 341.15 - 100e3 / hot_K
    assert balanced(plant)["m"].period["entropy_generation_W_per_K"].value == pytest.approx(expected)
    assert expected > 0.0 > 95e3 / cold_K - 100e3 / hot_K


def test_a_rejection_found_by_difference_tests_nothing() -> None:
    """Without a metered way out the residual is not testable, and a stated share is no meter."""
    for roles in (
        {"in": R.FUEL_IN, "out": R.WORK_OUT},
        {"in": R.FUEL_IN, "out": R.WORK_OUT, "rest": (R.REJECTED_HEAT, "stated")},
    ):
        power_kW = {"m.in": 100.0, "m.out": 40.0, "m.rest": 60.0}
        result = balanced(make_plant([make_machine("m", roles)], power_kW, ticks=15))["m"]
        assert result.closure is Closure.NOT_TESTABLE
        assert result.period["residual_J"].withheld_because == "not testable"
        assert "residual_W" not in result.interval.values
        assert kWh(result, "rejected_J") == pytest.approx(15.0)


@pytest.mark.parametrize(
    ("residual_kW", "closure"),
    [(60.0, Closure.CLOSES), (100.0, Closure.WATCH), (-100.0, Closure.WATCH), (-130.0, Closure.OPEN)],
)
def test_closure_is_judged_by_the_uncertainty_of_the_residual(residual_kW: float, closure: Closure) -> None:
    """Standards of 25, 5, 28 and 10 kW make 39.17, U = 78.3: 60 closes, 100 is watched, 130 is open."""
    roles = {"in": R.FUEL_IN, "out": R.WORK_OUT, "heat": R.USEFUL_HEAT, "rest": R.REJECTED_HEAT}
    power_kW = {"m.in": 2440.0 + residual_kW, "m.out": 1000.0, "m.heat": 1400.0, "m.rest": 40.0}
    standard_kW = {"m.in": 25.0, "m.out": 5.0, "m.heat": 28.0, "m.rest": 10.0}
    errors = {f"calibration:{key}": {key: u / power_kW[key]} for key, u in standard_kW.items()}
    result = balanced(make_plant([make_machine("m", roles)], power_kW, ticks=60), errors)["m"]
    residual = result.period["residual_J"]
    assert residual.value / KWH == pytest.approx(residual_kW)
    assert residual.expanded_U / KWH / 2 == pytest.approx(39.17, abs=0.01)
    assert result.closure is closure


@pytest.mark.parametrize("useful_kW", [799.0, 801.0])
def test_a_branch_is_not_taken_anew_in_a_moved_run(useful_kW: float) -> None:
    """Demanded 300 (1000/500 - Q_u/400): at 799 kW its U is the whole slope on both sides, at 801 zero.

    A source of 1 % moves the useful heat by 8 kW across the zero of the demanded rejection at 800 kW.
    """
    roles = {"hot": R.HEAT_IN, "power": R.WORK_OUT, "useful": R.USEFUL_HEAT, "cold": R.REJECTED_HEAT}
    machine = make_machine("m", roles, ceiling=Ceiling(CeilingKind.TWO_RESERVOIRS, "hot", ("cold",)))
    flat = {"m.hot": 500.0, "m.useful": 400.0, "m.cold": 300.0}
    celsius = {key: (kelvin - CELSIUS, kelvin - CELSIUS) for key, kelvin in flat.items()}
    power_kW = {"m.hot": 1000.0, "m.power": 50.0, "m.useful": useful_kW, "m.cold": 150.0}
    plant = make_plant([machine], power_kW, ticks=15, celsius=celsius)
    result = balanced(plant, {"calibration:useful": {"m.useful": 0.01}})["m"]
    demanded_W = result.interval.values["demanded_rejection_W"]
    assert demanded_W == pytest.approx([max(0.0, 300 * (2.0 - useful_kW / 400) * 1e3)], abs=1e-6)
    U_W = 2 * 0.75 * 0.01 * 799e3 if useful_kW < 800 else 0.0
    assert result.interval_U["demanded_rejection_W"] == pytest.approx([U_W])


def test_a_shared_stream_of_a_meter_is_a_meter() -> None:
    """A rejected stream that points at another machine's metered stream keeps the balance testable."""
    first = make_machine("a", {"in": R.HEAT_IN, "out": R.WORK_OUT, "rest": (R.REJECTED_HEAT, "b.in")})
    second = make_machine("b", {"in": R.HEAT_IN, "out": R.USEFUL_HEAT}, headline=None)
    power_kW = {"a.in": 100.0, "a.out": 40.0, "a.rest": 60.0, "b.in": 60.0, "b.out": 55.0}
    plant = make_plant([first, second], power_kW, ticks=15)
    run = balance(plant.powers, plant.ticks, plant.settings).machines
    assert run["a"].layout.testable and run["b"].layout.testable
    assert kWh(balanced(plant)["b"], "residual_J") == pytest.approx(1.25)
