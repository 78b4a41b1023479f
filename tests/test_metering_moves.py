"""Moved sources of uncertainty: shared meters, derivatives, random parts, frozen masks."""

from __future__ import annotations

import math

import numpy as np
import pytest
from metering_factory import (
    CELSIUS,
    KWH_PER_M3,
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
from uncertainties import ufloat

from auditor.metering import MeteringSettings, meter, meter_moved, random_shift
from auditor.records.machines import (
    Constant,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    LiquidFuel,
    Power,
    Role,
    Running,
    SameAs,
    ShareOf,
)
from auditor.records.plant import FlueGas, Fluid, GasMeter
from auditor.records.powers import Move, PowerTable
from auditor.records.ticks import TickTable

RUNNING = Running("power", 0.0, None)


def influence_W(
    ticks: TickTable, settings: MeteringSettings, base: PowerTable, source: str, key: str
) -> np.ndarray:
    """Half the difference of a stream's power when a source moves up and down."""
    up = meter_moved(ticks, settings, Move(source, +1.0), base)
    down = meter_moved(ticks, settings, Move(source, -1.0), base)
    return (stream_W(up, key) - stream_W(down, key)) / 2.0


def test_efficiency_of_an_engine_as_a_published_rule_and_a_library_say():
    """P = 4.2 MW (0.5 %), 0.250 kg/s (0.7 %) of 46 MJ/kg (1 %): 0.3652 with 1.3191 % of it."""
    # JCGM 100:2008, 5.1.6: relative variances of a quotient add; the same by the uncertainties library.
    fuel = make_fuel(heating_value(46.0e6), phase="liquid", standard=0.01)
    streams = {
        "fuel": (Role.FUEL_IN, LiquidFuel("fuel", "mass", None, None)),
        "power": (Role.WORK_OUT, Power("power", "terminals")),
    }
    settings = make_settings(
        [make_tag("mass", relative=0.007), make_tag("power", relative=0.005)],
        make_machine("engine", streams, running=RUNNING, basis="lower"),
        fuels={"fuel": fuel},
    )
    ticks = make_ticks({"mass": 0.250, "power": 4.2e6})
    base, _ = meter(ticks, settings)

    def efficiency(table: PowerTable) -> float:
        return float(stream_W(table, "engine.power")[0] / stream_W(table, "engine.fuel")[0])

    variance = 0.0
    for source in base.all_sources:
        up = efficiency(meter_moved(ticks, settings, Move(source.key, +1.0), base))
        down = efficiency(meter_moved(ticks, settings, Move(source.key, -1.0), base))
        variance += ((up - down) / 2.0) ** 2
    library = ufloat(4.2e6, 0.021e6) / (ufloat(0.250, 0.00175) * ufloat(46.0e6, 0.46e6))
    assert efficiency(base) == pytest.approx(0.36521739, rel=1e-8)
    assert math.sqrt(variance) == pytest.approx(library.std_dev, rel=2e-4)
    assert math.sqrt(variance) / efficiency(base) == pytest.approx(0.01319091, rel=2e-4)


def circuit() -> tuple[TickTable, MeteringSettings]:
    """One flow meter shared by two heat streams that together span one difference of temperature."""
    tags = [make_tag("flow", relative=0.01), make_tag("power", relative=0.01)]
    tags += [make_tag(name, absolute=0.25, offset=CELSIUS) for name in ("hot", "middle", "cold")]
    water = Fluid("water", "water", None, None, None, None, None)
    oil = declared_fluid(2350.0, 11.75)
    streams = {
        "first": (Role.HEAT_IN, FlowAndTemperatures("flow", None, "hot", "middle", "oil")),
        "second": (Role.HEAT_IN, FlowAndTemperatures("flow", None, "middle", "cold", "oil")),
        "water": (Role.HEAT_IN, FlowAndTemperatures("flow", "inlet", "hot", "cold", "water")),
    }
    settings = make_settings(
        tags, make_machine("unit", streams, running=RUNNING), fluids={"oil": oil, "water": water}
    )
    means = {"flow": 10.0, "power": 1.0, "hot": 363.15, "middle": 353.15, "cold": 343.15}
    return make_ticks(means, ticks=30, noise={"hot": 0.1}), settings


def test_a_shared_meter_cancels_in_a_difference():
    """Two equal streams of one flow meter move together: their difference does not move at all."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    for source in ("calibration:flow", "assumed:fluids.fluid.heat_capacity"):
        first = influence_W(ticks, settings, base, source, "unit.first")
        second = influence_W(ticks, settings, base, source, "unit.second")
        assert np.all(np.abs(first) > 0.004 * 235e3)
        # Equal heat by hand: 10 kg/s x 2.35 kJ/(kg K) x 10 K = 235 kW each.
        assert first == pytest.approx(second, rel=1e-12)
    # The temperature between them moves one up and the other down by 10 x 2350 x 0.25 = 5.875 kW.
    middle = "calibration:middle"
    assert influence_W(ticks, settings, base, middle, "unit.first") == pytest.approx(-5875.0)
    assert influence_W(ticks, settings, base, middle, "unit.second") == pytest.approx(+5875.0)


def test_calibration_moves_equal_the_derivatives_worked_by_hand():
    """The influence of flow, temperature and heat capacity is the derivative times the uncertainty."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    by_hand = {
        "calibration:flow": 0.1 * 2350.0 * 10.0,
        "calibration:hot": 10.0 * 2350.0 * 0.25,
        "assumed:fluids.fluid.heat_capacity": 10.0 * 11.75 * 10.0,
    }
    for source, expected_W in by_hand.items():
        assert influence_W(ticks, settings, base, source, "unit.first") == pytest.approx(expected_W)


def test_temperature_moves_of_water_equal_its_heat_capacity():
    """Moving the hot end of a water circuit moves its heat by V rho c_p, and by d(rho)/dT at the meter."""
    # IAPWS-IF97 by the iapws library as an oracle, 16 bar, 90 degC.
    from iapws import IAPWS97

    hot, hotter, cold = (IAPWS97(T=kelvin, P=1.6) for kelvin in (363.15, 363.25, 343.15))
    expansion = (hotter.rho - hot.rho) / 0.1
    expected = 10.0 * (hot.rho * hot.cp * 1e3 + expansion * (hot.h - cold.h) * 1e3) * 0.25
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    moved = influence_W(ticks, settings, base, "calibration:hot", "unit.water")
    assert moved == pytest.approx(expected, rel=1e-4)


def test_only_touched_streams_are_computed_again():
    """Streams that a source does not touch stay the very numbers of the base run."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    moved = meter_moved(ticks, settings, Move("calibration:cold", 1.0), base)
    assert np.array_equal(stream_W(moved, "unit.first"), stream_W(base, "unit.first"))
    assert moved.entropic_K["unit.first"] is base.entropic_K["unit.first"]
    assert np.all(moved.outlet_K["unit.second"] == base.outlet_K["unit.second"] + 0.25)
    assert np.all(moved.entropic_K["unit.second"] > base.entropic_K["unit.second"])
    assert meter_moved(ticks, settings, Move("calibration:power", 1.0), base) is base


def test_a_move_of_the_flow_leaves_temperatures_alone():
    """Moving a flow meter changes power and no temperature."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    moved = meter_moved(ticks, settings, Move("calibration:flow", 1.0), base)
    for key in ("unit.first", "unit.water"):
        assert stream_W(moved, key) == pytest.approx(1.01 * stream_W(base, key))
        assert np.array_equal(moved.entropic_K[key], base.entropic_K[key])


def test_the_order_of_sources_is_the_plant_files():
    """Tags come in the order of the plant file, calibration before random, assumed numbers last."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    assert [source.key for source in base.all_sources] == [
        "calibration:flow",
        "calibration:hot",
        "random:hot",
        "calibration:middle",
        "calibration:cold",
        "assumed:fluids.fluid.heat_capacity",
    ]


def test_a_share_of_a_temperature_is_taken_of_its_reading():
    """0.5 % of a reading of 100 degC is 0.5 K, and the gain of a meter keeps the sign of backflow."""
    streams = {"power": (Role.WORK_OUT, Power("tag", "terminals"))}
    machine = make_machine("unit", streams, running=Running("tag", 0.0, None))
    celsius = make_settings([make_tag("tag", relative=0.005, offset=CELSIUS)], machine)
    ticks = make_ticks({"tag": 373.15})
    base, _ = meter(ticks, celsius)
    assert influence_W(ticks, celsius, base, "calibration:tag", "unit.power") == pytest.approx(0.5)
    flow = make_settings([make_tag("tag", relative=0.01)], machine)
    ticks = make_ticks({"tag": [100.0, -50.0]}, ticks=2)
    base, _ = meter(ticks, flow)
    moved = influence_W(ticks, flow, base, "calibration:tag", "unit.power")
    assert moved == pytest.approx([1.0, -0.5])
    both = make_settings([make_tag("tag", absolute=3.0, relative=0.04)], machine)
    base, _ = meter(ticks, both)
    moved = influence_W(ticks, both, base, "calibration:tag", "unit.power")
    assert moved == pytest.approx([5.0, math.sqrt(13.0)])


def test_a_value_cut_off_to_zero_does_not_move():
    """Below its low-flow cut-off a reading is zero by declaration, whatever the meter's offset is."""
    machine = make_machine(
        "unit", {"power": (Role.WORK_OUT, Power("tag", "x"))}, running=Running("tag", 0.0, None)
    )
    settings = make_settings([make_tag("tag", absolute=2.0, cut_off=5.0)], machine)
    ticks = make_ticks({"tag": [0.0, 10.0]}, ticks=2)
    base, _ = meter(ticks, settings)
    moved = influence_W(ticks, settings, base, "calibration:tag", "unit.power")
    assert moved.tolist() == [0.0, 2.0]


def test_one_heating_value_moves_both_bases_and_every_machine():
    """The fuel's common factor moves lower, higher and exergy of two engines by the same share."""
    fuel = make_fuel(
        heating_value(10.0 * KWH_PER_M3, 11.0 * KWH_PER_M3),
        standard=0.004,
        exergy=assumed("fuels.fuel.exergy", 1.04),
        exergy_of="lower",
    )
    stream = {"gas": (Role.FUEL_IN, GasVolume("fuel", "volume", "meter"))}
    running = Running("volume", 0.0, None)
    settings = make_settings(
        [make_tag("volume")],
        make_machine("first", stream, running=running, basis="lower"),
        make_machine(
            "second", {"gas": (Role.FUEL_IN, SameAs("first", "gas"))}, running=running, basis="higher"
        ),
        fuels={"fuel": fuel},
        gas_meters={"meter": GasMeter("meter", "already at the fuel's state", None, None, None)},
    )
    ticks = make_ticks({"volume": 0.1})
    base, _ = meter(ticks, settings)
    moved = meter_moved(ticks, settings, Move("assumed:fuels.fuel.values", -1.0), base)
    for key in ("first.gas", "second.gas"):
        for after, before in (
            (stream_W(moved, key), stream_W(base, key)),
            (moved.lower_W[key], base.lower_W[key]),
            (moved.higher_W[key], base.higher_W[key]),
            (moved.exergy_W[key], base.exergy_W[key]),
        ):
            assert after / before == pytest.approx(0.996)


def noisy(ticks: int, per_interval: int, lag1: float = 0.0, relative: float = 0.01) -> float:
    """Random and calibration influence on the mean of the first interval, as their ratio."""
    machine = make_machine(
        "unit", {"power": (Role.WORK_OUT, Power("tag", "x"))}, running=Running("tag", 0.0, None)
    )
    settings = make_settings([make_tag("tag", relative=relative)], machine)
    table = make_ticks(
        {"tag": 100.0},
        ticks=ticks,
        noise={"tag": 2.0},
        lag1={"tag": lag1},
        ticks_per_interval=per_interval,
    )
    base, _ = meter(table, settings)
    first = slice(0, per_interval)
    random = influence_W(table, settings, base, "random:tag", "unit.power")[first].mean()
    calibration = influence_W(table, settings, base, "calibration:tag", "unit.power")[first].mean()
    assert calibration == pytest.approx(1.0)
    return float(random)


def test_the_random_part_falls_with_the_samples_and_the_calibration_does_not():
    """Four and sixteen times the ticks halve and quarter the random part of a mean; calibration stays."""
    # JCGM 100:2008, 4.2.3: s/sqrt(n).
    assert [noisy(64, count) for count in (1, 4, 16)] == pytest.approx([2.0, 1.0, 0.5])


@pytest.mark.parametrize(("lag1", "factor"), [(0.5, 1.7), (0.8, 3.0), (0.9, 4.4)])
def test_memory_widens_the_random_part(lag1: float, factor: float):
    """A correlation of 0.5, 0.8, 0.9 from tick to tick widens the mean by 1.7, 3.0, 4.4."""
    # sqrt((1 + r)/(1 - r)), Bayley and Hammersley (1946), rounded to one decimal.
    assert noisy(64, 64, lag1) / noisy(64, 64) == pytest.approx(factor, abs=0.06)


def test_memory_never_makes_a_mean_worse_than_one_tick():
    """However long the memory, all ticks share at most one error."""
    assert noisy(64, 16, 0.999) == pytest.approx(2.0)
    assert noisy(64, 16, 1.0) == pytest.approx(2.0)


def test_the_steps_of_a_counter_cancel_within_an_interval():
    """Of sixteen counter differences only the first and last reading are left: u/n, not u/sqrt(n)."""
    # A reading with u: each difference has sqrt(2) u, neighbours correlate with -0.5, and the mean of
    # n differences is (last - first)/n with sqrt(2) u / n.
    assert noisy(64, 16, -0.5) == pytest.approx(2.0 / 16)
    readings = np.random.RandomState(7).standard_normal((20_000, 17)) * 2.0 / math.sqrt(2.0)
    simulated = np.diff(readings, axis=1).mean(axis=1).std()
    assert noisy(64, 16, -0.5) == pytest.approx(simulated, rel=0.03)


def test_random_shift_of_intervals_with_gaps_and_a_short_end():
    """An interval with fewer covered ticks is less certain; one without any has no shift."""
    covered = [60.0] * 4 + [60.0, 0.0, 0.0, 0.0] + [0.0] * 4 + [60.0] * 2
    ticks = make_ticks(
        {"tag": 1.0}, ticks=14, noise={"tag": 2.0}, covered_s={"tag": covered}, ticks_per_interval=4
    )
    expected = [1.0] * 4 + [2.0] * 4 + [0.0] * 4 + [math.sqrt(2.0)] * 2
    assert random_shift(ticks, "tag") == pytest.approx(expected)


def test_a_random_source_needs_noise():
    """A tag without noise is no random source, and an exact one is no source at all."""
    ticks, settings = circuit()
    base, _ = meter(ticks, settings)
    assert "random:hot" in base.sources["unit.first"]
    assert "random:middle" not in base.sources["unit.first"]


def test_masks_stay_as_they_were_and_a_lost_influence_is_mirrored():
    """Oxygen pushed below zero still has its influence, and no known tick is lost."""
    gas = FlueGas(
        *(assumed(name, value) for name, value in zip("avdc", (9.6, 8.6, 0.78, 1100.0), strict=True))
    )
    fuel = make_fuel(heating_value(KWH_PER_M3), flue_gas=gas)
    streams = {
        "gas": (Role.FUEL_IN, GasVolume("fuel", "flow", "meter")),
        "stack": (Role.REJECTED_HEAT, FlueGasHeat("gas", "oxygen", "hot", None)),
    }
    settings = make_settings(
        [make_tag("flow"), make_tag("hot"), make_tag("oxygen", absolute=0.002, basis="dry")],
        make_machine("boiler", streams, running=Running("flow", 0.0, None), basis="lower"),
        fuels={"fuel": fuel},
        gas_meters={"meter": GasMeter("meter", "already at the fuel's state", None, None, None)},
    )
    ticks = make_ticks({"flow": 0.1, "oxygen": [0.001, 0.05, 0.3], "hot": 473.15}, ticks=3)
    base, _ = meter(ticks, settings)
    up = meter_moved(ticks, settings, Move("calibration:oxygen", +1.0), base)
    down = meter_moved(ticks, settings, Move("calibration:oxygen", -1.0), base)
    index = base.streams.index("boiler.stack")
    assert base.known[:, index].tolist() == [True, True, False]
    assert up.known is base.known and down.known is base.known
    known_up, known_down = stream_W(up, "boiler.stack")[:2], stream_W(down, "boiler.stack")[:2]
    assert np.all(known_up > stream_W(base, "boiler.stack")[:2])
    assert np.all(known_down < stream_W(base, "boiler.stack")[:2])
    assert known_up[0] + known_down[0] == pytest.approx(2.0 * stream_W(base, "boiler.stack")[0])
    assert np.isnan(stream_W(up, "boiler.stack")[2])


def test_running_is_decided_once():
    """The tag that tells whether a machine runs moves no constant stream and no running time."""
    streams = {
        "power": (Role.WORK_OUT, Power("power", "terminals")),
        "casing": (Role.LOSS, Constant(assumed("machines.unit.casing", 75e3, 5e3))),
        "generator": (Role.LOSS, ShareOf("power", assumed("machines.unit.generator", 0.03, 0.005))),
    }
    settings = make_settings(
        [make_tag("power", absolute=10.0)],
        make_machine("unit", streams, running=Running("power", 5.0, None)),
    )
    ticks = make_ticks({"power": [0.0, 8.0, 1000.0]}, ticks=3)
    base, _ = meter(ticks, settings)
    assert base.running["unit"].tolist() == [0.0, 1.0, 1.0]
    assert base.sources["unit.casing"] == {"assumed:machines.unit.casing"}
    assert base.inputs["unit.casing"] == ("power",)
    moved = meter_moved(ticks, settings, Move("calibration:power", -1.0), base)
    assert moved.running is base.running
    assert stream_W(moved, "unit.casing").tolist() == [0.0, 75e3, 75e3]
    share = influence_W(ticks, settings, base, "assumed:machines.unit.generator", "unit.generator")
    assert share == pytest.approx([0.0, 0.04, 5.0])
    coupled = influence_W(ticks, settings, base, "calibration:power", "unit.generator")
    assert coupled == pytest.approx(0.3)
