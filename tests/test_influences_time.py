"""How uncertainty grows with time: calibration coherently, random parts in quadrature, meters that cancel."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import pytest
from balancing_factory import CELSIUS, balanced, make_machine, make_plant
from metering_factory import assumed, declared_fluid, make_settings, make_ticks
from metering_factory import make_tag as metered_tag

from auditor.balancing import BalancingSettings, balance, finish, rebalance
from auditor.influences import Memory, propagate, step_memory
from auditor.metering import MeteringSettings, meter, meter_moved
from auditor.records.balances import MachineBalance, MachineFigures
from auditor.records.machines import (
    Ceiling,
    CeilingKind,
    FlowAndTemperatures,
    Machine,
    Power,
    Role,
    Running,
    SameAs,
    ShareOf,
    Stream,
)
from auditor.records.powers import Move
from auditor.records.ticks import TickTable

R = Role
SIMPLE = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT})


def simple_U(steps: int, key: str = "gross") -> tuple[float, float]:
    """U of a period of equal quarter-hours from a random and from a calibration source of 1 %."""
    plant = make_plant([SIMPLE], {"m.in": 2500.0, "m.out": 1000.0}, ticks=15 * steps)
    random, calibration = (
        balanced(plant, {f"{kind}:out": {"m.out": 0.01}})["m"].period[key].expanded_U
        for kind in ("random", "calibration")
    )
    return random, calibration


@pytest.mark.parametrize("steps", [4, 100])
def test_random_falls_with_the_root_of_time_and_calibration_does_not(steps: int) -> None:
    """The random part of n quarter-hours is that of one over sqrt(n); a calibration stays what it is."""
    random, calibration = simple_U(steps)
    one_random, one_calibration = simple_U(1)
    assert one_random == pytest.approx(one_calibration) == pytest.approx(2 * 0.01 * 0.4)
    assert random == pytest.approx(one_random / np.sqrt(steps))
    assert calibration == pytest.approx(one_calibration)


def test_noise_that_outlasts_a_step_grows_the_period() -> None:
    """A variance factor of 4 for long sums doubles U of the period and leaves that of the intervals."""
    plant = make_plant([SIMPLE], {"m.in": 2500.0, "m.out": 1000.0}, ticks=150)
    errors = {"random:out": {"m.out": 0.01}}
    plain = balanced(plant, errors)["m"]
    long = balanced(plant, errors, {"random:out": Memory(inflation=4.0)})["m"]
    assert long.period["gross"].expanded_U == pytest.approx(2 * plain.period["gross"].expanded_U)
    assert long.interval_U["gross"] == pytest.approx(plain.interval_U["gross"])


def test_no_memory_makes_noise_worse_than_one_common_error() -> None:
    """However long noise lasts, two quarter-hours that share it wholly are no worse than one."""
    slow = make_plant([SIMPLE], {"m.in": 2500.0, "m.out": 1000.0}, ticks=30, native_s={"m.in": 1800.0})
    memory = {"random:out": Memory(inflation=50.0)}
    U = balanced(slow, {"random:out": {"m.out": 0.01}}, memory)["m"].interval_U["gross"]
    assert U == pytest.approx([2 * 0.01 * 0.4])


def test_random_part_of_a_longer_interval() -> None:
    """Intervals of two steps have the random part of one over sqrt(2)."""
    plant = make_plant([SIMPLE], {"m.in": 2500.0, "m.out": 1000.0}, ticks=60)
    slow = make_plant([SIMPLE], {"m.in": 2500.0, "m.out": 1000.0}, ticks=60, native_s={"m.in": 1800.0})
    errors = {"random:out": {"m.out": 0.01}}
    U, slow_U = (balanced(each, errors)["m"].interval_U["gross"] for each in (plant, slow))
    assert (U.shape, slow_U.shape) == ((4,), (2,))
    assert slow_U == pytest.approx(np.full(2, U[0] / np.sqrt(2)))


def test_one_meter_for_two_streams_cancels() -> None:
    """Useful heat and heat input through the same flow meter: its error leaves their ratio alone.

    By hand: (100 (1 + e)) / (80 (1 + e)) does not depend on e; their difference of 20 does, by 20 e.
    """
    machine = make_machine("m", {"in": R.HEAT_IN, "out": R.USEFUL_HEAT}, headline=None)
    plant = make_plant([machine], {"m.in": 100.0, "m.out": 80.0}, ticks=15)
    shared = balanced(plant, {"calibration:flow": {"m.in": 0.02, "m.out": 0.02}})["m"]
    apart = balanced(plant, {"calibration:a": {"m.in": 0.02}, "calibration:b": {"m.out": 0.02}})["m"]
    assert shared.period["heat"].expanded_U == pytest.approx(0.0, abs=1e-12)
    assert shared.contributions["heat"] == ()
    assert apart.period["heat"].expanded_U == pytest.approx(2 * 0.8 * 0.02 * np.sqrt(2), rel=1e-3)
    assert shared.interval_U["residual_W"] == pytest.approx([2 * 0.02 * 20e3])
    assert apart.interval_U["residual_W"] == pytest.approx([2 * 0.02 * np.hypot(100e3, 80e3)])


def test_periods_against_drawn_errors() -> None:
    """U of a period at moving load lies within 5 % of the scatter of 5,000 drawn months.

    Every draw has one calibration error per meter and one random error per meter and quarter-hour;
    the figures are computed from the drawn powers by a formula of the test's own.
    """
    random = np.random.default_rng(11)
    steps, draws = 96, 5000
    fuel = 1500.0 + 1000.0 * np.sin(np.arange(steps) / 9.0) ** 2
    power = 0.4 * fuel - 60.0
    plant = make_plant(
        [SIMPLE], {"m.in": np.repeat(fuel, 15), "m.out": np.repeat(power, 15)}, ticks=15 * steps
    )
    errors = {
        "calibration:in": {"m.in": 0.006},
        "calibration:out": {"m.out": 0.005},
        "random:in": {"m.in": 0.05},
        "random:out": {"m.out": 0.04},
    }
    result = balanced(plant, errors)["m"]

    def drawn(level: np.ndarray, calibration: float, noise: float) -> np.ndarray:
        common = calibration * random.standard_normal((draws, 1))
        return level * (1.0 + common + noise * random.standard_normal((draws, steps)))

    fuels, powers = drawn(fuel, 0.006, 0.05), drawn(power, 0.005, 0.04)
    period = powers.sum(axis=1) / fuels.sum(axis=1)
    assert result.period["gross"].expanded_U == pytest.approx(2 * period.std(), rel=0.05)
    lost_J = (fuels - powers).sum(axis=1) * 900e3
    assert result.period["rejected_J"].expanded_U == pytest.approx(2 * lost_J.std(), rel=0.05)
    interval = (powers / fuels).std(axis=0)
    assert np.median(result.interval_U["gross"] / (2 * interval)) == pytest.approx(1.0, abs=0.05)


# Through the whole of metering and balancing.


def run_chain(ticks: TickTable, settings: MeteringSettings) -> dict[str, MachineBalance]:
    """Balances with all sources of uncertainty moved through metering and balancing."""
    powers, _ = meter(ticks, settings)
    base = balance(powers, ticks, BalancingSettings(settings.machines, settings.tags, settings.rules))

    def chain(move: Move) -> Mapping[str, MachineFigures]:
        return rebalance(meter_moved(ticks, settings, move, powers), base, move.source)

    return finish(base, propagate(chain, base.figures, powers.all_sources, step_memory(ticks)))


def plain_machine(
    name: str, streams: Mapping[str, tuple[Role, object]], running: Running, **fields: object
) -> Machine:
    """A machine with streams metered in any way."""
    machine = make_machine(name, {}, running=running, **fields)
    return replace(machine, streams={key: Stream(key, name, *each) for key, each in streams.items()})


def counted_energy(lag1: float, steps: int) -> tuple[float, float]:
    """U of the energy of a counter of 1 kWh [kWh]: of all quarter-hours, and of the first one."""
    noise_W = 3.6e6 / np.sqrt(12.0) * np.sqrt(2.0) / 60.0
    ticks = make_ticks({"counter": 1e6}, ticks=15 * steps, noise={"counter": noise_W}, lag1={"counter": lag1})
    machine = plain_machine(
        "m", {"out": (R.WORK_OUT, Power("counter", "terminals"))}, Running("counter", 0.0, None)
    )
    result = run_chain(ticks, make_settings([metered_tag("counter")], machine))["m"]
    first_kWh = float(result.interval_U["work_gross_W"][0]) * 900.0 / 3.6e6
    return result.period["work_gross_J"].expanded_U / 3.6e6, first_kWh


def test_the_steps_of_a_counter_cancel_over_any_time() -> None:
    """A month of a 1 kWh counter is known to 0.41 kWh (one standard), not to 22.3 kWh.

    Two readings, each 1/sqrt(12) kWh: 0.408 kWh for one quarter-hour and for 2976 of them; without
    the correlation of neighbours it would be sqrt(2976) times that.
    """
    month, quarter = counted_energy(-0.5, 2976)
    assert quarter / 2 == pytest.approx(0.408, abs=0.001)
    assert month / 2 == pytest.approx(0.408, abs=0.001)
    independent = 0.408 * np.sqrt(2976)
    assert independent == pytest.approx(22.3, abs=0.05)


@pytest.mark.parametrize("lag1", [0.5, 0.95])
def test_correlated_noise_of_ticks_counts_in_full_over_a_month(lag1: float) -> None:
    """Over long sums the variance grows by (1 + r)/(1 - r), however many ticks a step has."""
    month, _ = counted_energy(lag1, 500)
    independent, _ = counted_energy(0.0, 500)
    assert month / independent == pytest.approx(np.sqrt((1 + lag1) / (1 - lag1)), rel=1e-6)


def heat_plant(gas_hot_C: float = 450.0) -> tuple[TickTable, MeteringSettings]:
    """A coil that warms oil and the engine that the oil drives, with the oil's meters in common."""
    means = {
        "oil_flow": 23.0,
        "oil_hot": 275.0 + CELSIUS,
        "oil_cold": 185.0 + CELSIUS,
        "gas_flow": 18.0,
        "gas_hot": gas_hot_C + CELSIUS,
        "gas_cold": 205.0 + CELSIUS,
        "air_flow": 226.0,
        "air_in": 15.0 + CELSIUS,
        "air_out": 32.0 + CELSIUS,
        "gross": 1e6,
    }
    relative = {"oil_flow": 0.02, "gas_flow": 0.03, "air_flow": 0.03, "gross": 0.005}
    tags = [
        metered_tag(name, relative=relative.get(name, 0.0), absolute=0.0 if name in relative else 0.5)
        for name in means
    ]
    noise = {"oil_flow": 0.1, "gross": 3e3, "oil_hot": 0.2}
    ticks = make_ticks(means, ticks=60, noise=noise)
    fluids = {
        name: replace(
            declared_fluid(),
            name=name,
            heat_capacity=assumed(f"fluids.{name}.heat_capacity", value, 0.005 * value),
        )
        for name, value in (("oil", 2350.0), ("gas", 1120.0), ("air", 1006.0))
    }

    def heat(name: str) -> FlowAndTemperatures:
        inlet, outlet = ("air_in", "air_out") if name == "air" else (f"{name}_hot", f"{name}_cold")
        return FlowAndTemperatures(f"{name}_flow", None, inlet, outlet, name)

    coil = plain_machine(
        "coil",
        {
            "gas": (R.HEAT_IN, heat("gas")),
            "oil": (R.USEFUL_HEAT, SameAs("orc", "oil")),
            "casing": (R.LOSS, ShareOf("gas", assumed("coil.casing", 0.015, 0.005))),
        },
        Running("gas_flow", 2.0, None),
        headline=None,
    )
    orc = plain_machine(
        "orc",
        {
            "oil": (R.HEAT_IN, heat("oil")),
            "power": (R.WORK_OUT, Power("gross", "terminals")),
            "drive": (R.LOSS, ShareOf("power", assumed("orc.drive", 0.05, 0.01))),
            "air": (R.REJECTED_HEAT, heat("air")),
        },
        Running("gross", 20e3, None),
        ceiling=Ceiling(CeilingKind.FINITE, "oil", ("air",)),
    )
    return ticks, make_settings(tags, coil, orc, fluids=fluids)


def log_mean(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Logarithmic mean temperature."""
    return (first - second) / np.log(first / second)


def test_whole_chain_against_drawn_errors() -> None:
    """U of efficiency, ceiling, margin and residual lies within 5 % of the scatter of 5,000 drawn hours.

    The draws go through formulas of the test's own; the oil's flow, temperatures and heat capacity are
    common to heat, ceiling, margin and both residuals.
    """
    ticks, settings = heat_plant()
    result = run_chain(ticks, settings)
    random, draws = np.random.default_rng(3), 5000

    def normal(standard: float) -> np.ndarray:
        return standard * random.standard_normal(draws)

    def level(name: str) -> float:
        return float(ticks.mean[0, ticks.column(name)])

    noise = {"oil_flow": 0.1, "gross": 3e3, "oil_hot": 0.2}
    drawn = {}
    for name, tag in settings.tags.items():
        u = tag.calibration.absolute + tag.calibration.relative * level(name)
        drawn[name] = level(name) + normal(u) + normal(noise.get(name, 0.0) / np.sqrt(60))
    cp = {name: f.heat_capacity.value * (1 + normal(0.005)) for name, f in settings.fluids.items()}
    oil_W = drawn["oil_flow"] * cp["oil"] * (drawn["oil_hot"] - drawn["oil_cold"])
    gas_W = drawn["gas_flow"] * cp["gas"] * (drawn["gas_hot"] - drawn["gas_cold"])
    air_W = drawn["air_flow"] * cp["air"] * (drawn["air_out"] - drawn["air_in"])
    ceiling = 1 - log_mean(drawn["air_out"], drawn["air_in"]) / log_mean(drawn["oil_hot"], drawn["oil_cold"])
    gross = drawn["gross"] / oil_W
    expected = {
        ("orc", "gross"): gross,
        ("orc", "ceiling"): ceiling,
        ("orc", "margin"): gross - ceiling,
        ("orc", "residual_J"): 3600 * (oil_W - drawn["gross"] * (1.05 + normal(0.01)) - air_W),
        ("coil", "residual_J"): 3600 * (gas_W * (1 - 0.015 - normal(0.005)) - oil_W),
        ("coil", "heat"): oil_W / gas_W,
    }
    for (machine, key), values in expected.items():
        figure = result[machine].period[key]
        assert figure.expanded_U == pytest.approx(2 * values.std(), rel=0.05), (machine, key)
        assert abs(figure.value - values.mean()) < 0.1 * values.std(), (machine, key)


def test_crossing_stays_at_the_end_where_it_was_found() -> None:
    """Ends 20.0 and 20.1 K apart: U is that of the two thermometers of the nearer end, 2 sqrt(2) 0.5 K."""
    ticks, settings = heat_plant(gas_hot_C=295.1)
    still = replace(ticks, noise=np.zeros_like(ticks.noise))
    result = run_chain(still, settings)["coil"]
    assert result.interval.values["crossing_K"] == pytest.approx(np.full(4, -20.0))
    assert result.interval_U["crossing_K"] == pytest.approx(np.full(4, 2 * 0.5 * np.sqrt(2)))


def test_sources_are_ranked_by_their_share() -> None:
    """Shares add up to one, the largest first; the flow meters of 3 and 2 % lead the coil's balance."""
    ticks, settings = heat_plant()
    contributions: Sequence = run_chain(ticks, settings)["coil"].contributions["residual_J"]
    shares = [each.share for each in contributions]
    assert sum(shares) == pytest.approx(1.0)
    assert shares == sorted(shares, reverse=True)
    assert [each.source for each in contributions[:2]] == ["calibration:gas_flow", "calibration:oil_flow"]
    flow = contributions[0]
    assert flow.change == pytest.approx(0.03 * 18.0 * 1120.0 * 245.0 * (1 - 0.015) * 3600.0, rel=1e-6)


def test_untouched_machines_are_left_alone() -> None:
    """Moving the air flow computes the engine anew and not the coil."""
    ticks, settings = heat_plant()
    powers, _ = meter(ticks, settings)
    base = balance(powers, ticks, BalancingSettings(settings.machines, settings.tags, settings.rules))
    move = Move("calibration:air_flow", 1.0)
    assert list(rebalance(meter_moved(ticks, settings, move, powers), base, move.source)) == ["orc"]


def test_gates_and_branches_stay_as_they_were() -> None:
    """A calibration that would push running, steadiness or coverage over a limit changes none of them.

    At 20 kW the running limit lies within the power's uncertainty, yet all ticks count in both moves.
    """
    machine = plain_machine(
        "m",
        {"in": (R.HEAT_IN, Power("heat", "x")), "out": (R.WORK_OUT, Power("gross", "x"))},
        Running("gross", 20e3, None),
    )
    ticks = make_ticks({"heat": 100e3, "gross": 20.1e3}, ticks=15)
    tags = [metered_tag("heat"), metered_tag("gross", relative=0.05)]
    result = run_chain(ticks, make_settings(tags, machine))["m"]
    assert result.period["gross"].expanded_U == pytest.approx(2 * 0.05 * 0.201)
    assert result.running_s == 900.0
