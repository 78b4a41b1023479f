"""Combined uncertainties against published worked examples and the `uncertainties` library."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np
import pytest
import uncertainties
from balancing_factory import balanced, make_machine, make_plant
from uncertainties import umath

from auditor.influences import propagate
from auditor.records.balances import FigureSums, MachineFigures, MachineInfluences
from auditor.records.machines import Role
from auditor.records.powers import Move, Source

R = Role
Formula = Callable[..., float]


def influences_of(
    formulas: Mapping[str, Formula],
    values: Mapping[str, float],
    shifts: Mapping[str, Mapping[str, float]],
) -> MachineInfluences:
    """Influences on formulas of numbers; ``shifts`` holds, per source, the standard shift of each number."""

    def figures(numbers: Mapping[str, float]) -> dict[str, MachineFigures]:
        results = np.array([[formula(**numbers)] for formula in formulas.values()])
        sums = FigureSums(
            tuple(formulas), results, np.zeros_like(results), np.ones(len(formulas), dtype=bool)
        )
        return {"m": MachineFigures("m", sums, sums, 1)}

    def chain(move: Move) -> dict[str, MachineFigures]:
        return figures(
            {key: value + move.direction * shifts[move.source].get(key, 0.0) for key, value in values.items()}
        )

    sources = [Source(key, "calibration", key) for key in shifts]
    return propagate(chain, figures(values), sources, {})["m"]


def test_end_gauge_of_the_guide() -> None:
    """JCGM 100:2008, annex H.1: combined standard uncertainty 32 nm (31.7), parts 25, 9.7, 2.9, 16.6 nm.

    l = l_s + d - l_s (delta_alpha theta + alpha_s delta_theta), numbers of H.1.3 and table H.1.
    """
    values = {
        "l_s": 50.000623e-3,
        "d": 215e-9,
        "alpha": 11.5e-6,
        "theta": -0.1,
        "d_alpha": 0.0,
        "d_theta": 0.0,
    }
    standard = {
        "l_s": 25e-9,
        "d": 9.7e-9,
        "alpha": 1.2e-6,
        "theta": 0.41,
        "d_alpha": 0.58e-6,
        "d_theta": 0.029,
    }

    def length(l_s: float, d: float, alpha: float, theta: float, d_alpha: float, d_theta: float) -> float:
        return l_s + d - l_s * (d_alpha * theta + alpha * d_theta)

    assert length(**values) == pytest.approx(50.000838e-3, abs=5e-10)
    found = influences_of({"length": length}, values, {key: {key: u} for key, u in standard.items()})
    assert found.period_U["length"] / 2 == pytest.approx(31.71e-9, abs=0.01e-9)
    parts = {each.source: abs(each.change) for each in found.contributions["length"]}
    # Table H.1 prints 16.6 for 0.029 x 11.5e-6 x 50.000623e6 nm = 16.675.
    assert parts["d_theta"] == pytest.approx(16.675e-9, abs=0.001e-9)
    assert (parts["l_s"], parts["d"]) == (pytest.approx(25e-9, rel=1e-6), pytest.approx(9.7e-9, rel=1e-6))
    assert parts["d_alpha"] == pytest.approx(2.9e-9, abs=0.01e-9)
    assert [each.source for each in found.contributions["length"]] == ["l_s", "d_theta", "d", "d_alpha"]


def test_simultaneous_resistance_and_reactance_of_the_guide() -> None:
    """JCGM 100:2008, annex H.2: R 127.732(71), X 219.847(295), Z 254.260(236) ohm from correlated readings.

    Each of the five sets of readings of table H.2 is one source that shifts V, I and phi together by its
    deviation over sqrt(n (n - 1)): the products of the columns are the covariances of the means.
    """
    sets = np.array(
        [
            (5.007, 19.663e-3, 1.0456),
            (4.994, 19.639e-3, 1.0438),
            (5.005, 19.640e-3, 1.0468),
            (4.990, 19.685e-3, 1.0428),
            (4.999, 19.678e-3, 1.0433),
        ]
    )
    names = ("V", "I", "phi")
    means = dict(zip(names, sets.mean(axis=0), strict=True))
    parts = (sets - sets.mean(axis=0)) / math.sqrt(5 * 4)
    formulas: dict[str, Formula] = {
        "R": lambda V, I, phi: V / I * math.cos(phi),  # noqa: E741
        "X": lambda V, I, phi: V / I * math.sin(phi),  # noqa: E741
        "Z": lambda V, I, phi: V / I,  # noqa: E741
    }
    shifts = {f"set {row}": dict(zip(names, part, strict=True)) for row, part in enumerate(parts)}
    found = influences_of(formulas, means, shifts)
    for key, value, standard in (("R", 127.732, 0.071), ("X", 219.847, 0.295), ("Z", 254.260, 0.236)):
        assert formulas[key](**means) == pytest.approx(value, abs=1e-3)
        assert found.period_U[key] / 2 == pytest.approx(standard, abs=1e-3)


def test_quotient_of_power_and_fuel() -> None:
    """4.2 MW (0.5 %) from 0.250 kg/s (0.7 %) of 46 MJ/kg (1 %): 0.365217 +- 0.0048176.

    JCGM 100:2008, 5.1.6: relative variances add. The guide's rule is the limit of small uncertainties;
    half differences over the full width lie a ten-thousandth above it.
    """
    values = {"P": 4.2e6, "m": 0.250, "H": 46.0e6}
    relative = {"P": 0.005, "m": 0.007, "H": 0.010}

    def U(scale: float) -> float:
        shifts = {key: {key: scale * relative[key] * value} for key, value in values.items()}
        return influences_of({"eta": lambda P, m, H: P / (m * H)}, values, shifts).period_U["eta"]

    assert U(0.01) / 2 * 100 == pytest.approx(0.00481755, rel=1e-6)
    assert U(1.0) / 2 == pytest.approx(0.00481755, rel=2e-4)


def test_difference_of_two_meters() -> None:
    """100 +- 2 less 60 +- 1.5 is 40 +- 2.5 (JCGM 100:2008, 5.1.2)."""
    found = influences_of(
        {"difference": lambda a, b: a - b}, {"a": 100.0, "b": 60.0}, {"a": {"a": 2.0}, "b": {"b": 1.5}}
    )
    assert found.period_U["difference"] == pytest.approx(5.0)


@pytest.mark.parametrize(("heat_kW", "efficiency", "U"), [(2400.0, 0.4167, 0.0253), (2200.0, 0.4545, 0.0276)])
def test_efficiency_of_two_meters(heat_kW: float, efficiency: float, U: float) -> None:
    """1000 kW +- 1 % from 2400 or 2200 kW +- 6 % (k = 2): 41.67 +- 2.53 and 45.45 +- 2.76 points.

    Relative variances added by hand; the half difference over the full 3 % lies 0.002 points above.
    """
    machine = make_machine("m", {"in": R.HEAT_IN, "out": R.WORK_OUT})
    plant = make_plant([machine], {"m.in": heat_kW, "m.out": 1000.0}, ticks=15)
    errors = {"calibration:out": {"m.out": 0.005}, "calibration:in": {"m.in": 0.03}}
    result = balanced(plant, errors)["m"]
    assert result.period["gross"].value == pytest.approx(efficiency, abs=5e-5)
    assert result.period["gross"].expanded_U == pytest.approx(U, abs=1e-4)
    assert result.interval_U["gross"] == pytest.approx([result.period["gross"].expanded_U])
    lower = result.period["gross"].value - result.period["gross"].expanded_U
    assert (lower > 0.409) == (heat_kW == 2200.0)


def test_curvature_is_told() -> None:
    """A quotient by a number with u = 15 % bends by u/(1 - u**2) over its half difference: 0.15.

    For f = a/b: (f+ + f- - 2f)/2 over (f+ - f-)/2 is u exactly.
    """
    found = influences_of({"eta": lambda a, b: a / b}, {"a": 40.0, "b": 100.0}, {"b": {"b": 15.0}})
    assert found.curvature["eta"] == pytest.approx(0.15)
    assert influences_of({"s": lambda a: a}, {"a": 1.0}, {"a": {"a": 0.5}}).curvature["s"] == 0.0


def test_gas_engine_against_the_uncertainties_library() -> None:
    """Margins, residual and efficiencies with a fuel meter shared by four streams, to 0.1 %.

    The library differentiates; the fuel meter of 0.6 % is common to fuel, casing, slip and exhaust.
    """
    roles = {
        "gas": R.FUEL_IN,
        "power": R.WORK_OUT,
        "hot": R.USEFUL_HEAT,
        "exhaust": R.USEFUL_HEAT,
        "stack": R.REJECTED_HEAT,
        "casing": (R.LOSS, "stated"),
    }
    power_kW = {
        "gas": 2857.0,
        "power": 1200.0,
        "hot": 660.0,
        "exhaust": 594.0,
        "stack": 258.0,
        "casing": 75.0,
    }
    plant = make_plant(
        [make_machine("m", roles)], {f"m.{key}": value for key, value in power_kW.items()}, ticks=30
    )
    fuel_side = ("gas", "exhaust", "stack", "casing")
    errors = {
        "calibration:gas": {f"m.{key}": 0.006 for key in fuel_side},
        "calibration:power": {"m.power": 0.005},
        "calibration:hot": {"m.hot": 0.02},
        "assumed:casing": {"m.casing": 0.2},
    }
    result = balanced(plant, errors)["m"]
    gas, power, hot, casing = (uncertainties.ufloat(1.0, u) for u in (0.006, 0.005, 0.02, 0.2))
    E = {
        "gas": gas * 2857,
        "power": power * 1200,
        "hot": hot * 660,
        "exhaust": gas * 594,
        "stack": gas * 258,
        "casing": gas * casing * 75,
    }
    leaving = E["power"] + E["hot"] + E["exhaust"] + E["casing"]
    expected = {
        "gross": E["power"] / E["gas"],
        "heat": (E["hot"] + E["exhaust"]) / E["gas"],
        "total": (E["power"] + E["hot"] + E["exhaust"]) / E["gas"],
        "rejected_W": (E["gas"] - leaving) * 1e3,
        "residual_W": (E["gas"] - leaving - E["stack"]) * 1e3,
    }
    for key, number in expected.items():
        assert result.interval.values[key] == pytest.approx([number.nominal_value] * 2), key
        assert result.interval_U[key] == pytest.approx([2 * number.std_dev] * 2, rel=1e-3), key


def test_entropic_ceiling_against_the_uncertainties_library() -> None:
    """Margin to the ceiling with a source temperature that enters heat and ceiling, to 0.1 %."""
    values = {"m": 23.0, "hot": 548.15, "cold": 458.15, "a1": 288.15, "a2": 305.15, "P": 950.0}
    standard = {"m": 0.46, "hot": 0.5, "cold": 0.5, "a1": 0.5, "a2": 0.5, "P": 5.0}

    def margin(log: Callable, m: float, hot: float, cold: float, a1: float, a2: float, P: float) -> float:
        source, sink = (hot - cold) / log(hot / cold), (a2 - a1) / log(a2 / a1)
        return P / (m * 2.35 * (hot - cold)) - (1 - sink / source)

    found = influences_of(
        {"margin": lambda **numbers: margin(math.log, **numbers)},
        values,
        {key: {key: u} for key, u in standard.items()},
    )
    numbers = {key: uncertainties.ufloat(value, standard[key]) for key, value in values.items()}
    assert found.period_U["margin"] == pytest.approx(2 * margin(umath.log, **numbers).std_dev, rel=1e-3)
