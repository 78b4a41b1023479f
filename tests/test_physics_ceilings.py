"""Ceilings and entropy balances against textbooks, closed forms and reference libraries."""

from __future__ import annotations

import csv
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from auditor import physics
from auditor.physics.liquids import ConstantHeatCarrier, TabulatedHeatCarrier, WaterHeatCarrier

DATA = Path(__file__).parent / "data" / "physics_check_values.csv"
ROWS = list(csv.DictReader(DATA.read_text(encoding="utf-8").splitlines()))
FUNCTIONS = {
    "carnot": lambda hot, cold: physics.carnot_ceiling(hot, cold),
    "entropic mean": lambda start, end: physics.entropic_mean_temperature_K(start, end),
    "finite source": lambda start, end, cold: physics.finite_source_and_sink_ceiling(start, end, cold, cold),
}
KELVIN = st.floats(min_value=200.0, max_value=2000.0)


def kelvin(row: dict[str, str]) -> list[float]:
    """Read ``hot=450 degC; cold=25 degC`` in kelvin."""
    amounts = (part.split("=")[1].split() for part in row["inputs"].split(";"))
    return [float(number) + {"degC": 273.15}[unit] for number, unit in amounts]


@pytest.mark.parametrize(
    "row", [r for r in ROWS if r["topic"] in FUNCTIONS], ids=lambda r: f"{r['topic']}, {r['check']}"
)
def test_ceilings_agree_with_published_figures(row: dict[str, str]) -> None:
    """Every printed figure comes out to half its last digit."""
    result = FUNCTIONS[row["topic"]](*kelvin(row)) / float(row["to_si"])

    exponent = Decimal(row["printed"]).as_tuple().exponent
    assert isinstance(exponent, int)
    assert abs(result - float(row["printed"])) <= 0.5 * 10.0**exponent, row["source"]


def test_air_source_has_two_ceilings_and_celsius_a_third_wrong_one() -> None:
    """Air from 300 to 120 degC over 25 degC: 47.98 % at its inlet, 37.56 % as a stream."""
    # Worked by hand: 1 - 298.15/573.15; 180/ln(573.15/393.15) = 477.5 K; 1 - 298.15/477.5.
    hot, cool, cold = 573.15, 393.15, 298.15

    assert physics.carnot_ceiling(hot, cold) == pytest.approx(0.4798, abs=5e-5)
    assert physics.entropic_mean_temperature_K(hot, cool) == pytest.approx(477.5, abs=0.05)
    stream = physics.finite_source_and_sink_ceiling(hot, cool, cold, cold)
    assert stream == pytest.approx(0.3756, abs=5e-5)
    assert physics.carnot_ceiling(300.0, 25.0) == pytest.approx(0.917, abs=5e-4)


def test_oil_and_air_of_a_waste_heat_engine() -> None:
    """Oil from 275 to 185 degC over air from 15 to 32 degC: 501.8 K, 296.57 K, 40.9 %."""
    # Worked by hand: 90/ln(548.15/458.15) and 17/ln(305.15/288.15).
    oil, air = (548.15, 458.15), (288.15, 305.15)

    assert physics.entropic_mean_temperature_K(*oil) == pytest.approx(501.8, abs=0.05)
    assert physics.entropic_mean_temperature_K(*air) == pytest.approx(296.57, abs=0.005)
    assert physics.finite_source_and_sink_ceiling(*oil, *air) == pytest.approx(0.409, abs=5e-4)


def test_rising_heat_capacity_lifts_the_ceiling() -> None:
    """Oil whose heat capacity rises from 2.14 to 2.47: 502.9 K and 41.0 %, not 501.8 K and 40.9 %."""
    # Second derivation: heat and entropy by fine trapezoids over the same straight line.
    temperature = np.linspace(458.15, 548.15, 200_001)
    capacity = np.interp(temperature, [458.15, 548.15], [2140.0, 2470.0])
    trapezoid = np.trapezoid
    by_quadrature = trapezoid(capacity, temperature) / trapezoid(capacity / temperature, temperature)
    oil = TabulatedHeatCarrier("oil", (458.15, 548.15), (2140.0, 2470.0))

    mean = physics.entropic_mean_temperature_of_carrier_K(oil, 548.15, 458.15)
    ceiling = physics.finite_source_and_sink_ceiling(548.15, 458.15, 288.15, 305.15, source_carrier=oil)

    assert mean == pytest.approx(by_quadrature, rel=1e-9)
    assert mean == pytest.approx(502.9, abs=0.05)
    assert ceiling == pytest.approx(0.410, abs=5e-4)


def test_real_air_has_a_slightly_higher_ceiling_than_constant_heat_capacity() -> None:
    """With the heat capacity of real air the 37.56 % become 37.62 %."""
    from CoolProp.CoolProp import PropsSI

    nodes = np.linspace(393.15, 573.15, 37)
    capacity = PropsSI("C", "T", nodes, "P", 101_325.0, "Air")
    air = TabulatedHeatCarrier("air", tuple(nodes.tolist()), tuple(capacity.tolist()))

    ceiling = physics.finite_source_and_sink_ceiling(573.15, 393.15, 298.15, 298.15, air)

    # dh/ds between the end states by the library itself, an independent path.
    h = [PropsSI("H", "T", t, "P", 101_325.0, "Air") for t in (573.15, 393.15)]
    s = [PropsSI("S", "T", t, "P", 101_325.0, "Air") for t in (573.15, 393.15)]
    assert ceiling == pytest.approx(1.0 - 298.15 * (s[0] - s[1]) / (h[0] - h[1]), abs=1e-6)
    assert ceiling == pytest.approx(0.3762, abs=5e-5)


def test_equal_or_crossed_temperatures_have_no_ceiling() -> None:
    """Where the source is not hotter the mask says so, and a heat pump's ratio is NaN, not infinite."""
    hot, cold = np.array([298.15, 290.0, np.nan, 310.0]), 298.15

    assert physics.ceiling_exists(hot, cold).tolist() == [False, False, False, True]
    assert physics.carnot_ceiling(298.15, 298.15) == 0.0
    assert np.isnan(physics.carnot_heating_cop(hot, cold)).tolist() == [True, True, True, False]
    assert np.isnan(physics.carnot_cooling_eer(hot, cold)).tolist() == [True, True, True, False]


def test_heat_pump_between_gliding_streams() -> None:
    """Water 40 to 80 degC from 20 to 10 degC: 7.46 is the bound, the outlets' 5.05 is none."""
    # Worked by hand: means 332.75 K and 288.12 K; 353.15/70 and 332.75/44.63.
    streams = (313.15, 353.15, 293.15, 283.15)

    assert physics.entropic_mean_temperature_K(313.15, 353.15) == pytest.approx(332.75, abs=0.005)
    assert physics.entropic_mean_temperature_K(293.15, 283.15) == pytest.approx(288.12, abs=0.005)
    assert physics.carnot_heating_cop(353.15, 283.15) == pytest.approx(5.05, abs=0.005)
    assert physics.lorenz_heating_cop(*streams) == pytest.approx(7.46, abs=0.005)
    assert physics.lorenz_cooling_eer(*streams) == pytest.approx(6.46, abs=0.005)
    assert 5.30 > physics.carnot_heating_cop(353.15, 283.15)
    assert 5.30 < physics.lorenz_heating_cop(*streams)


def test_textbook_heat_pump() -> None:
    """A pump from -15 to 45 degC has at best 5.30."""
    # OpenStax, College Physics, section 15.5, worked example (recalled from the book).
    assert physics.carnot_heating_cop(318.15, 258.15) == pytest.approx(5.30, abs=0.005)


def test_second_sink_at_a_lower_temperature_raises_the_ceiling() -> None:
    """A sink that is left out makes the ceiling too low: 31.6 % is 32.4 % with 5 % going to 25 degC."""
    # Entropy balance by hand: 1/501.8 = Q1/343.15 + 0.05/298.15, work = 1 - Q1 - 0.05.
    source, warm, cold = 501.8, 343.15, 298.15
    assert physics.carnot_ceiling(source, warm) == pytest.approx(0.316, abs=5e-4)
    for share, printed in ((0.05, 0.324), (0.30, 0.361)):
        rest = physics.smallest_rejection_W(1.0, source, warm, physics.entropy_flow_W_per_K(share, cold))
        together = physics.mean_temperature_of_heats_K([rest, share], [warm, cold])

        assert 1.0 - rest - share == pytest.approx(printed, abs=5e-4)
        assert physics.carnot_ceiling(source, together) == pytest.approx(1.0 - rest - share)


def test_rejection_that_the_second_law_demands() -> None:
    """A waste-heat engine with 4865 kW must reject 2875 kW; what is generated costs the rest."""
    demanded = physics.smallest_rejection_W(4865.0, 501.8, 296.57)
    generated = physics.entropy_generation_W_per_K(4865.0, 501.8, 3865.0, 296.57)

    assert demanded == pytest.approx(2875.0, abs=0.5)
    assert demanded == pytest.approx(4865.0 * (1.0 - physics.carnot_ceiling(501.8, 296.57)))
    assert 3865.0 - demanded == pytest.approx(296.57 * generated)
    assert physics.smallest_rejection_W(1000.0, 500.0, 300.0, 3.0) == 0.0
    assert np.isnan(physics.smallest_rejection_W(np.nan, 500.0, 300.0))


def test_lost_work_of_heat_that_only_cools_down() -> None:
    """1000 kW from 450 degC delivered at 90 degC: 1.370844 kW/K and 408.7172 kW of lost work."""
    # Gouy 1889 and Stodola 1905, recomputed; surroundings 25 degC.
    generated = physics.entropy_generation_W_per_K(1e6, 723.15, 1e6, 363.15)
    before = physics.exergy_of_heat_W(1e6, 723.15, 298.15)
    after = physics.exergy_of_heat_W(1e6, 363.15, 298.15)

    assert generated / 1e3 == pytest.approx(1.370844, abs=5e-7)
    assert before / 1e3 == pytest.approx(587.7066, abs=5e-5)
    assert after / 1e3 == pytest.approx(178.9894, abs=5e-5)
    assert 298.15 * generated / 1e3 == pytest.approx(408.7172, abs=5e-5)
    assert 298.15 * generated == pytest.approx(before - after)


def test_heats_that_do_not_sum_to_something_have_no_mean_temperature() -> None:
    """A stopped engine has no mean temperature; a small negative heat is weighed, not dropped."""
    temperatures = np.array([[350.0] * 4, [300.0] * 4])
    heats = np.array([[0.0, 100.0, 100.0, -5.0], [0.0, -1.0, np.nan, 0.0]])

    mean = physics.mean_temperature_of_heats_K(heats, temperatures)

    assert np.isnan(mean).tolist() == [True, False, True, True]
    assert mean[1] == pytest.approx(99.0 / (100.0 / 350.0 - 1.0 / 300.0))


@settings(derandomize=True, database=None, deadline=None)
@given(KELVIN, KELVIN)
def test_entropic_mean_lies_where_a_logarithmic_mean_lies(one: float, other: float) -> None:
    """Between geometric and arithmetic mean, and the same from either end."""
    mean = physics.entropic_mean_temperature_K(one, other)

    assert mean == physics.entropic_mean_temperature_K(other, one)
    assert np.sqrt(one * other) * (1 - 1e-12) <= mean <= 0.5 * (one + other) * (1 + 1e-12)


@settings(derandomize=True, database=None, deadline=None)
@given(KELVIN, st.floats(min_value=-1e-3, max_value=1e-3))
def test_entropic_mean_keeps_its_digits_for_the_smallest_glide(level: float, glide: float) -> None:
    """However near inlet and outlet are, the mean is the arithmetic one less a vanishing term."""
    outlet = level + glide

    mean = physics.entropic_mean_temperature_K(level, outlet)

    assert mean == pytest.approx(0.5 * (level + outlet), rel=1e-11)


@pytest.mark.parametrize(
    "carrier",
    [
        ConstantHeatCarrier("air", 1006.0),
        TabulatedHeatCarrier("oil", (280.0, 320.0, 370.0), (1900.0, 2050.0, 2140.0)),
        WaterHeatCarrier(),
    ],
    ids=lambda c: c.name,
)
def test_any_carrier_obeys_the_relations_between_its_properties(carrier: physics.HeatCarrier) -> None:
    """Enthalpy is the integral of c_p, entropy that of c_p/T, both add up, and the mean is in between."""
    temperature = np.linspace(285.0, 365.0, 8001)
    capacity = carrier.heat_capacity_J_per_kgK(temperature)
    middle = 0.5 * (temperature[1:] + temperature[:-1])
    mean_capacity = 0.5 * (capacity[1:] + capacity[:-1])

    heat = carrier.enthalpy_change_J_per_kg(285.0, 365.0)
    entropy = carrier.entropy_change_J_per_kgK(285.0, 365.0)
    mean = physics.entropic_mean_temperature_of_carrier_K(carrier, 285.0, 365.0)

    assert heat == pytest.approx(np.sum(mean_capacity) * 0.01, rel=1e-6)
    assert entropy == pytest.approx(np.sum(mean_capacity / middle) * 0.01, rel=1e-6)
    halves = carrier.enthalpy_change_J_per_kg([285.0, 325.0], [325.0, 365.0])
    assert np.sum(halves) == pytest.approx(heat, rel=1e-12)
    assert carrier.enthalpy_change_J_per_kg(365.0, 285.0) == pytest.approx(-heat)
    assert 285.0 < mean < 365.0
    assert mean == pytest.approx(heat / entropy, rel=1e-12)
    no_glide = physics.entropic_mean_temperature_of_carrier_K(carrier, 300.0, [300.0, 300.0009])
    np.testing.assert_allclose(no_glide, [300.0, 300.00045], atol=1e-6)


def test_constant_carrier_and_logarithmic_mean_are_one() -> None:
    """For a constant heat capacity dh/ds is the logarithmic mean, at any glide."""
    inlet, outlet = np.array([573.15, 300.5, 300.0]), np.array([393.15, 300.0, 300.0])

    np.testing.assert_allclose(
        physics.entropic_mean_temperature_of_carrier_K(ConstantHeatCarrier("gas", 1100.0), inlet, outlet),
        physics.entropic_mean_temperature_K(inlet, outlet),
        rtol=1e-10,
    )


@pytest.mark.parametrize("glide_K", [0.002, 0.1, 5.0])
def test_a_steep_heat_capacity_counts_at_any_glide(glide_K: float) -> None:
    """The mean leans to where the fluid takes most heat, however small the glide."""
    # By hand, for c_p = a + b (T - T0) and glide g << T: T_m = T0 + g/2 + b g^2 / (12 c_mean) - ...;
    # the lean of b g^2 / (12 c_mean) is what a logarithmic mean does not see.
    steep = TabulatedHeatCarrier("melting wax", (300.0, 310.0), (1000.0, 3000.0))
    mean_capacity = 1000.0 + 100.0 * glide_K
    lean_K = 200.0 * glide_K**2 / (12.0 * mean_capacity)

    mean = physics.entropic_mean_temperature_of_carrier_K(steep, 300.0, 300.0 + glide_K)
    logarithmic = physics.entropic_mean_temperature_K(300.0, 300.0 + glide_K)

    assert mean - logarithmic == pytest.approx(lean_K, rel=0.02, abs=2e-9)


def test_tables_are_never_extrapolated() -> None:
    """Outside its table a fluid answers NaN, at its ends it answers, and a missing density is None."""
    oil = TabulatedHeatCarrier("oil", (300.0, 400.0), (2000.0, 2400.0), (300.0, 350.0), (900.0, 860.0))

    assert oil.heat_capacity_J_per_kgK([299.9, 300.0, 400.0, 400.1, np.nan]).tolist() == (
        pytest.approx([np.nan, 2000.0, 2400.0, np.nan, np.nan], nan_ok=True)
    )
    assert oil.density_kg_per_m3([325.0, 360.0]).tolist() == pytest.approx([880.0, np.nan], nan_ok=True)
    assert np.isnan(oil.enthalpy_change_J_per_kg([299.9, 350.0], [350.0, 400.1])).all()
    assert np.isnan(physics.entropic_mean_temperature_of_carrier_K(oil, 400.1, 350.0))
    assert TabulatedHeatCarrier("oil", (300.0, 400.0), (2e3, 2e3)).density_kg_per_m3(350.0) is None
    assert ConstantHeatCarrier("gas", 1100.0).density_kg_per_m3(350.0) is None


@pytest.mark.parametrize(
    ("temperatures", "values"),
    [((300.0,), (2e3,)), ((300.0, 300.0), (2e3, 2e3)), ((25.0, -5.0), (1.0, 1.0)),
     ((300.0, 400.0), (2e3,)), ((300.0, 400.0), (2e3, 0.0))],
)  # fmt: skip
def test_a_table_that_is_none_is_refused(temperatures: tuple[float, ...], values: tuple[float, ...]) -> None:
    """Too short, not rising, unequal or not positive: the caller hears of it at once."""
    with pytest.raises(ValueError, match="oil, heat capacity"):
        TabulatedHeatCarrier("oil", temperatures, values)
