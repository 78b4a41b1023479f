"""What counts when: gaps, standstill, coverage, sums over parts of a period, length of intervals, gates."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from balancing_factory import Plant, balanced, make_machine, make_plant, make_tag, make_ticks

from auditor.balancing import balance
from auditor.records.balances import MachineBalance
from auditor.records.machines import Machine, Role, Steady
from auditor.records.plant import Rules
from auditor.records.verdicts import Status

R = Role
KWH = 3.6e6
ENGINE = {"gas": R.FUEL_IN, "power": R.WORK_OUT, "heat": R.USEFUL_HEAT, "stack": R.REJECTED_HEAT}


def engine(**fields: object) -> Machine:
    """Fuel, work, useful heat and a stack."""
    return make_machine("m", ENGINE, **fields)


def wavy_plant(ticks: int = 2880, *, gaps: bool = True, tick_s: int = 60, **fields: object) -> Plant:
    """Two days at moving load with gaps in every stream, a stop, and an unknown state."""
    random = np.random.default_rng(5)
    minutes = np.arange(2880)
    fuel = 2500.0 + 300.0 * np.sin(minutes / 50.0) + random.normal(0, 20, 2880)
    power_kW = {"m.gas": fuel, "m.power": 0.4 * fuel, "m.heat": 0.45 * fuel, "m.stack": 0.15 * fuel}
    running = np.ones(2880)
    running[300:520] = 0.0
    if gaps:
        for place, key in enumerate(power_kW):
            start = 700 + 37 * place
            power_kW[key] = power_kW[key].copy()
            power_kW[key][start : start + 100] = np.nan
        running[1500:1530] = np.nan
    step = tick_s // 60
    power_kW = {key: value.reshape(-1, step).mean(axis=1)[: ticks // step] for key, value in power_kW.items()}
    return make_plant(
        [engine()],
        power_kW,
        ticks=ticks // step,
        tick_s=tick_s,
        running={"m": running[::step][: ticks // step]},
        **fields,
    )


def half(plant: Plant, ticks: slice) -> Plant:
    """A part of a plant's time."""
    grid = plant.powers.grid
    part_us = grid.start_us[ticks]
    period = replace(grid.period, start_us=int(part_us[0]), end_us=int(part_us[-1]) + grid.tick_s * 1_000_000)
    part = replace(grid, period=period, start_us=part_us)
    power_W = plant.powers.power_W[ticks]
    powers = replace(
        plant.powers,
        grid=part,
        power_W=power_W,
        known=np.isfinite(power_W),
        running={name: state[ticks] for name, state in plant.powers.running.items()},
    )
    return replace(plant, powers=powers, ticks=make_ticks(part, plant.powers.streams, power_W, {}))


def test_halves_of_a_period_add_up_to_it() -> None:
    """Energies, logged and common, of two halves sum to the whole to 1e-9."""
    plant = wavy_plant()
    whole = balanced(plant)["m"].period
    first, second = (balanced(half(plant, part))["m"].period for part in (slice(0, 1440), slice(1440, None)))
    energies = [key for key in whole if key.endswith("_J")]
    assert len(energies) >= 6
    for key in energies:
        assert first[key].value + second[key].value == pytest.approx(whole[key].value, rel=1e-9, abs=1e-3)
        assert first[key].common + second[key].common == pytest.approx(whole[key].common, rel=1e-9, abs=1e-3)


def test_intervals_add_up_to_the_period() -> None:
    """Interval powers times covered time are the common energies, and their ratio is the headline."""
    result = balanced(wavy_plant())["m"]
    interval, period = result.interval, result.period
    covered_s = interval.coverage * (interval.end_us - interval.start_us) / 1e6

    def energy(key: str) -> float:
        return float(np.nansum(interval.values[key] * covered_s))

    assert energy("fuel_in_W") == pytest.approx(period["fuel_in_J"].common, rel=1e-12)
    assert energy("work_gross_W") == pytest.approx(period["work_gross_J"].common, rel=1e-12)
    assert energy("work_gross_W") / energy("fuel_in_W") == pytest.approx(period["gross"].value, rel=1e-12)


def test_ticks_of_one_and_five_minutes_give_equal_energies() -> None:
    """The tick is a grid, not a measure: energies do not depend on it."""
    fine = balanced(wavy_plant(gaps=False))["m"].period
    coarse = balanced(wavy_plant(gaps=False, tick_s=300))["m"].period
    for key in ("fuel_in_J", "work_gross_J", "residual_J", "rejected_J"):
        assert coarse[key].value == pytest.approx(fine[key].value, rel=1e-12, abs=1e-3)


def test_a_lost_heat_meter_withholds_heat_but_not_work() -> None:
    """Useful heat unknown for half of the time: gross stays firm, heat, total and residual do not."""
    heat_kW = np.repeat([1000.0, np.nan], 60)
    power_kW = {"m.gas": 2500.0, "m.power": 1000.0, "m.heat": heat_kW, "m.stack": 500.0}
    result = balanced(make_plant([engine()], power_kW, ticks=120))["m"]
    lost = slice(4, 8)
    for key in ("heat", "total", "residual_W", "rejected_W", "useful_heat_W"):
        assert np.isnan(result.interval.values[key][lost]).all(), key
        assert np.isfinite(result.interval.values[key][:4]).all(), key
    assert result.interval.values["gross"] == pytest.approx([0.4] * 8)
    assert result.interval.assessed.all()
    assert result.period["gross"].status is Status.FIRM
    for key in ("heat", "total", "residual_J"):
        figure = result.period[key]
        assert (figure.status, figure.withheld_because) == (Status.WITHHELD, "coverage"), key
        assert figure.coverage == pytest.approx(0.5)
    assert result.period["useful_heat_J"].value / KWH == pytest.approx(1000)


@pytest.mark.parametrize(
    ("known_h", "status"),
    [(90, Status.FIRM), (89, Status.PROVISIONAL), (75, Status.PROVISIONAL), (74, Status.WITHHELD)],
)
def test_coverage_decides_the_status(known_h: int, status: Status) -> None:
    """Firm from 90 % of the energy on, withheld below 75 %."""
    power_kW = {"m.in": 100.0, "m.out": np.where(np.arange(100) < known_h, 40.0, np.nan)}
    machine = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT})
    result = balanced(make_plant([machine], power_kW, ticks=100, tick_s=3600, interval_s=3600))["m"]
    assert result.period["gross"].status is status


def test_unknown_time_weighs_like_the_mean_running_input() -> None:
    """Input 100 and 300 kW for 10 h each, unknown for 10 h (200 kW), stopped for 70 h: 4000/6000."""
    fuel_kW = np.repeat([100.0, 300.0, np.nan, 5.0], [10, 10, 10, 70])
    running = np.repeat([1.0, 1.0, np.nan, 0.0], [10, 10, 10, 70])
    machine = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT})
    plant = make_plant(
        [machine],
        {"m.in": fuel_kW, "m.out": 40.0},
        ticks=100,
        tick_s=3600,
        interval_s=3600,
        running={"m": running},
    )
    result = balanced(plant)["m"]
    assert result.period["fuel_in_J"].coverage == pytest.approx(4000 / 6000)
    assert result.period["gross"].coverage == pytest.approx(4000 / 6000)
    assert (result.running_s, result.stopped_s, result.unknown_s) == (72_000, 252_000, 36_000)


def test_standstill_is_covered_and_its_creep_kept_apart() -> None:
    """A gas meter that creeps at 4 kW for 100 h of standstill: 400 kWh beside, none of it in the figures."""
    running = np.repeat([1.0, 0.0], 100)
    power_kW = {"m.in": np.where(running, 100.0, 4.0), "m.out": np.where(running, 40.0, np.nan)}
    machine = make_machine("m", {"in": R.FUEL_IN, "out": R.WORK_OUT})
    plant = make_plant([machine], power_kW, ticks=200, tick_s=3600, interval_s=3600, running={"m": running})
    result = balanced(plant)["m"]
    assert result.period["fuel_in_J"].value / KWH == pytest.approx(10_000)
    assert result.standstill_J["in"] / KWH == pytest.approx(400)
    assert (result.period["gross"].value, result.period["gross"].coverage) == (pytest.approx(0.4), 1.0)
    stopped = result.interval.values["fuel_in_W"][100:]
    assert (stopped == 0.0).all()
    assert np.isnan(result.interval.values["gross"][100:]).all()
    assert result.interval.assessed.all()
    assert (result.interval.coverage == 1.0).all()


def test_a_month_of_standstill_is_known_but_has_no_efficiency() -> None:
    """Zero energy, firm; no efficiency, because nothing went in."""
    plant = make_plant(
        [engine()],
        dict.fromkeys([f"m.{name}" for name in ENGINE], 3.0),
        ticks=30,
        running={"m": np.zeros(30)},
    )
    period = balanced(plant)["m"].period
    assert (period["fuel_in_J"].value, period["fuel_in_J"].status) == (0.0, Status.FIRM)
    assert (period["gross"].status, period["gross"].withheld_because) == (Status.WITHHELD, "no input")


def test_standstill_of_a_part_does_not_pass_for_zero() -> None:
    """Stopped for 7 ticks, running with an unknown heat meter for 8: the heat is not known, not zero."""
    running = np.repeat([0.0, 1.0], [7, 8])
    power_kW = {"m.gas": 2500.0, "m.power": 1000.0, "m.heat": np.nan, "m.stack": 500.0}
    values = balanced(make_plant([engine()], power_kW, ticks=15, running={"m": running}))["m"].interval.values
    assert np.isnan(values["useful_heat_W"]).all()
    assert values["fuel_in_W"] == pytest.approx([2.5e6 * 8 / 15])


@pytest.mark.parametrize(("known", "assessed"), [(12, True), (11, False)])
def test_an_interval_is_assessed_from_four_fifths_on(known: int, assessed: bool) -> None:
    """12 of 15 common ticks are enough, 11 are not; the powers are shown all the same."""
    fuel_kW = np.where(np.arange(15) < known, 2500.0, np.nan)
    power_kW = {"m.gas": fuel_kW, "m.power": 1000.0, "m.heat": 1000.0, "m.stack": 500.0}
    interval = balanced(make_plant([engine()], power_kW, ticks=15))["m"].interval
    assert interval.assessed.tolist() == [assessed]
    assert np.isfinite(interval.values["gross"]).tolist() == [assessed]
    assert interval.values["fuel_in_W"] == pytest.approx([2.5e6])
    assert interval.coverage == pytest.approx([known / 15])


def test_a_negative_input_is_not_assessed() -> None:
    """Heat that flows backwards makes no efficiency."""
    machine = make_machine("m", {"in": R.HEAT_IN, "out": R.WORK_OUT})
    interval = balanced(make_plant([machine], {"m.in": -100.0, "m.out": 10.0}, ticks=15))["m"].interval
    assert interval.negative_input.all() and not interval.assessed.any()
    assert np.isnan(interval.values["gross"]).all()


def test_no_interval_is_finer_than_the_slowest_input() -> None:
    """A meter read every 30 minutes makes half-hours; one stored by exception makes nothing slower."""
    power_kW = dict.fromkeys([f"m.{name}" for name in ENGINE], 100.0)
    plant = make_plant([engine()], power_kW, ticks=60, native_s={"m.gas": 1800.0})
    slow = balanced(plant)["m"]
    assert (slow.interval_s, slow.slowest_input) == (1800.0, "m.gas")
    assert slow.interval.start_us.shape == (2,)
    tags = {**plant.settings.tags, "m.gas": make_tag("m.gas", deadband=5.0)}
    held = balanced(replace(plant, settings=replace(plant.settings, tags=tags)))["m"]
    assert (held.interval_s, held.slowest_input) == (900.0, "")


def test_a_last_interval_may_be_short() -> None:
    """40 ticks make two quarter-hours and a rest of ten minutes, which sums like the others."""
    power_kW = {"m.gas": 2500.0, "m.power": 1000.0, "m.heat": 500.0, "m.stack": 500.0}
    interval = balanced(make_plant([engine()], power_kW, ticks=40))["m"].interval
    assert ((interval.end_us - interval.start_us) / 1e6).tolist() == [900, 900, 600]
    assert interval.coverage == pytest.approx([1, 1, 1])


def steadiness(power_kW: np.ndarray, running: np.ndarray | None = None) -> list[bool]:
    """Steady flags of quarter-hours by a limit of 50 kW within 30 minutes."""
    steady = Steady("m.power", 50e3, 1800.0)
    machine = make_machine("m", {"in": R.FUEL_IN, "power": R.WORK_OUT}, steady=steady)
    plant = make_plant(
        [machine],
        {"m.in": 2500.0, "m.power": power_kW},
        ticks=power_kW.size,
        running=None if running is None else {"m": running},
    )
    return balanced(plant)["m"].interval.steady.tolist()


def test_a_step_unsettles_the_intervals_on_both_sides() -> None:
    """A step of 100 kW between the third and fourth quarter-hour: these two are not steady."""
    assert steadiness(np.repeat([800.0, 900.0], 45)) == [True, True, False, False, True, True]
    assert steadiness(np.repeat([800.0, 840.0], 45)) == [True] * 6


def test_swings_faster_than_an_interval_are_steady() -> None:
    """A saw-tooth of 5 minutes and 120 kW has equal interval means."""
    assert steadiness(800.0 + np.tile([-60.0, -30.0, 0.0, 30.0, 60.0], 18)) == [True] * 6


def test_a_start_is_not_steady_and_a_gap_judges_nothing() -> None:
    """The interval after standstill is not steady; one beside a gap is, by its other neighbour."""
    running = np.repeat([0.0, 1.0], [15, 75])
    assert steadiness(np.full(90, 800.0), running)[:3] == [False, False, True]
    power_kW = np.full(90, 800.0)
    power_kW[30:45] = np.nan
    assert steadiness(power_kW) == [True, True, False, True, True, True]


def test_rules_are_those_of_the_plant_file() -> None:
    """A stricter interval rule leaves an interval of 12 common ticks unassessed."""
    fuel_kW = np.where(np.arange(15) < 12, 2500.0, np.nan)
    power_kW = {"m.gas": fuel_kW, "m.power": 1000.0, "m.heat": 1000.0, "m.stack": 500.0}
    strict = make_plant([engine()], power_kW, ticks=15, rules=Rules(interval_coverage=0.9))
    assert not balanced(strict)["m"].interval.assessed.any()


def test_common_ticks_are_those_of_the_headline() -> None:
    """With net as headline a lost own-use meter uncovers the interval, but leaves the gross figure."""
    roles = {"in": R.FUEL_IN, "out": R.WORK_OUT, "own": R.OWN_USE}
    machine = make_machine("m", roles, headline="net")
    plant = make_plant([machine], {"m.in": 2500.0, "m.out": 1000.0, "m.own": np.nan}, ticks=15)
    result: MachineBalance = balanced(plant)["m"]
    assert result.interval.coverage == pytest.approx([0.0])
    assert result.interval.values["gross"] == pytest.approx([0.4])
    assert result.interval.values["fuel_in_W"] == pytest.approx([2.5e6])
    assert balance(plant.powers, plant.ticks, plant.settings).machines["m"].headline == "net"
