"""Verdicts: precedence, reasons that survive an earlier word, and the published worked numbers."""

from __future__ import annotations

from types import MappingProxyType

import numpy as np
import pytest

from auditor.judging import judge_machine
from auditor.records.balances import IntervalFigures, MachineBalance, PeriodFigure
from auditor.records.machines import Ceiling, CeilingKind, Machine, Running
from auditor.records.verdicts import Closure, Reason, Status, Verdict

QUARTER_US = 900_000_000


def engine(kind: str = "organic Rankine engine", *, minimum_load: float | None = 0.3) -> Machine:
    """Return a machine with the gates that the verdicts look at."""
    ceiling = Ceiling(CeilingKind.FINITE, "oil", ("air",))
    if kind == "gas engine":
        ceiling = Ceiling(CeilingKind.FUEL_EXERGY, None, ())
    return Machine(
        name="engine",
        title="Engine",
        kind=kind,
        basis="lower" if kind == "gas engine" else None,
        headline="gross",
        rated_power_W=1e6,
        minimum_load=minimum_load,
        running=Running("power", 2e4, None),
        steady=None,
        ceiling=None if kind == "heat exchanger" else ceiling,
        streams=MappingProxyType({}),
    )


def balance(
    values: dict[str, float],
    U: dict[str, float],
    *,
    coverage: float = 1.0,
    running: float = 1.0,
    load: float = 1.0,
    steady: bool = True,
    negative_input: bool = False,
    period: dict[str, PeriodFigure] | None = None,
) -> MachineBalance:
    """One interval with the given figures."""
    figures = IntervalFigures(
        start_us=np.array([0]),
        end_us=np.array([QUARTER_US]),
        coverage=np.array([coverage]),
        values={key: np.array([value]) for key, value in values.items()},
        assessed=np.array([coverage >= 0.8]),
        running=np.array([running]),
        load=np.array([load]),
        steady=np.array([steady]),
        negative_input=np.array([negative_input]),
    )
    return MachineBalance(
        machine="engine",
        interval=figures,
        interval_U={key: np.array([value]) for key, value in U.items()},
        period=period or {},
        contributions={},
        curvature={},
        closure=Closure.CLOSES,
        interval_s=900.0,
        slowest_input="",
        running_s=900.0,
        stopped_s=0.0,
        unknown_s=0.0,
        standstill_J={},
    )


IMPOSSIBLE = {"gross": 0.5, "bound": 0.5, "ceiling": 0.4, "margin": 0.1, "heat_in_W": 2e6}
CREDIBLE = {"gross": 0.2, "bound": 0.2, "ceiling": 0.4, "margin": -0.2, "heat_in_W": 4e6}
U_SMALL = {"margin": 0.01, "gross": 0.01, "ceiling": 0.001}


def verdict_of(machine: Machine, one: MachineBalance) -> tuple[Verdict, tuple[str, ...]]:
    """Verdict and reasons of the only interval."""
    judged = judge_machine(machine, one, 0.8)
    return Verdict(judged.verdict[0]), judged.reasons[0]


@pytest.mark.parametrize(
    ("gates", "expected"),
    [
        ({"coverage": 0.79, "running": 0.0, "load": 0.0, "steady": False}, Verdict.NOT_ASSESSED),
        ({"running": 0.0, "load": 0.0, "steady": False}, Verdict.STOPPED),
        ({"negative_input": True, "load": 0.1, "steady": False}, Verdict.NOT_ASSESSED),
        ({"load": 0.29, "steady": False}, Verdict.LOW_LOAD),
        ({"steady": False}, Verdict.TRANSIENT),
        ({"running": 0.9}, Verdict.TRANSIENT),
        ({}, Verdict.IMPOSSIBLE),
    ],
)
def test_the_first_word_that_applies_is_the_verdict(gates: dict[str, float], expected: Verdict) -> None:
    """Each gate wins over every later word, and the physics result stays in the reasons."""
    word, reasons = verdict_of(engine(), balance(IMPOSSIBLE, U_SMALL, **gates))
    assert word is expected
    assert Reason.OVER_CEILING in reasons


@pytest.mark.parametrize(
    ("efficiency", "U", "ceiling", "expected"),
    [
        # Worked example, ceiling 40.9 %: P = 1000 +/- 1 %, Q = 2400 +/- 6 % (k = 2) gives 41.67 +/- 2.53 %.
        (1000 / 2400, 1000 / 2400 * np.hypot(0.01, 0.06), 0.409, Verdict.OVER_CEILING_UNPROVEN),
        # The same with Q = 2200: 45.45 +/- 2.76 %.
        (1000 / 2200, 1000 / 2200 * np.hypot(0.01, 0.06), 0.409, Verdict.IMPOSSIBLE),
        # A source cooling from 300 to 120 degC, sink 25 degC: 37.56 % (log-mean), not 47.98 % (inlet).
        (0.42, 0.01, 0.3756, Verdict.IMPOSSIBLE),
        (0.42, 0.01, 0.4798, Verdict.IMPLAUSIBLE),
        (0.20, 0.01, 0.3756, Verdict.CREDIBLE),
    ],
)
def test_worked_numbers_of_the_ceiling(
    efficiency: float, U: float, ceiling: float, expected: Verdict
) -> None:
    """Figures from the two-reservoir and finite-source formulas, computed by hand (own working)."""
    values = {"gross": efficiency, "ceiling": ceiling, "margin": efficiency - ceiling, "heat_in_W": 2.4e6}
    word, reasons = verdict_of(engine(), balance(values, {"margin": U, "gross": U}))
    assert word is expected
    if expected is Verdict.OVER_CEILING_UNPROVEN:
        # 41.7 % is far outside what such engines reach: that is said although the earlier word wins.
        assert Reason.ABOVE_BAND in reasons


def test_a_gas_engine_at_42_percent_is_credible_against_fuel_exergy() -> None:
    """Fuel exergy about 1.04 of the lower heating value (natural gas) is no false alarm for any engine."""
    values = {"gross": 0.42, "total": 0.85, "ceiling": 1.04, "margin": -0.62, "fuel_in_W": 2.857e6}
    word, reasons = verdict_of(engine("gas engine"), balance(values, {"margin": 0.01, "gross": 0.005}))
    assert word is Verdict.CREDIBLE
    assert reasons == ()


def test_without_temperatures_there_is_no_ceiling() -> None:
    """Source no hotter than the sink, or a temperature unknown: no ceiling, never zero or infinite."""
    values = {"gross": 0.2, "ceiling": np.nan, "margin": np.nan, "heat_in_W": 4e6}
    word, reasons = verdict_of(engine(), balance(values, {}))
    assert word is Verdict.NO_CEILING
    assert reasons == (Reason.MISSING_INPUT.value,)
    alike = values | {"source_temperature_K": 298.15, "sink_temperature_K": 298.15}
    word, reasons = verdict_of(engine(), balance(alike, {}))
    assert word is Verdict.NO_CEILING
    assert reasons == (Reason.NO_CEILING_TEMPERATURES.value,)


def test_an_exchanger_is_tested_by_crossing_and_first_law() -> None:
    """Heat cannot flow from cold to hot; a kind without work has no ceiling."""
    crossed = {"heat": 0.95, "crossing_K": 5.0, "heat_in_W": 1e6}
    word, reasons = verdict_of(engine("heat exchanger"), balance(crossed, {"crossing_K": 1.0, "heat": 0.02}))
    assert word is Verdict.IMPOSSIBLE
    assert Reason.TEMPERATURE_CROSSING in reasons
    sound = {"heat": 0.95, "crossing_K": -5.0, "heat_in_W": 1e6}
    word, reasons = verdict_of(engine("heat exchanger"), balance(sound, {"crossing_K": 1.0, "heat": 0.02}))
    assert word is Verdict.NO_CEILING
    assert reasons == (Reason.NO_CEILING_FOR_KIND.value,)


@pytest.mark.parametrize(("entropy", "expected"), [(-20.0, Verdict.IMPOSSIBLE), (-5.0, Verdict.CREDIBLE)])
def test_clausius_beyond_its_uncertainty(entropy: float, expected: Verdict) -> None:
    """Entropy that falls by more than U is impossible; within U it is not proven."""
    values = CREDIBLE | {"entropy_generation_W_per_K": entropy}
    word, _ = verdict_of(engine(), balance(values, U_SMALL | {"entropy_generation_W_per_K": 10.0}))
    assert word is expected


def test_the_period_is_judged_by_its_own_coherent_figures() -> None:
    """Single intervals are not the period: its own margin decides."""

    def margin(value: float, U: float) -> dict[str, PeriodFigure]:
        return {"margin": PeriodFigure("margin", value, U, 1.0, Status.FIRM, "", np.nan, np.nan)}

    assert judge_machine(
        engine(), balance(CREDIBLE, U_SMALL, period=margin(0.03, 0.01)), 0.8
    ).impossible_period
    assert not judge_machine(
        engine(), balance(CREDIBLE, U_SMALL, period=margin(0.03, 0.05)), 0.8
    ).impossible_period


def test_hours_and_energy_add_up() -> None:
    """Every hour and all input energy stand under one verdict."""
    judged = judge_machine(engine(), balance(CREDIBLE, U_SMALL), 0.8)
    assert judged.hours["credible"] == pytest.approx(0.25)
    assert sum(judged.hours.values()) == pytest.approx(0.25)
    assert judged.energy_share["credible"] == pytest.approx(1.0)
    assert set(judged.hours) == {word.word for word in Verdict}
