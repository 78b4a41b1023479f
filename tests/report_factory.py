"""A whole `AuditResult` made up for the report's tests: gaps, refusals, impossible intervals and all."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray
from report_plant import HOSTILE, START_US, make_plant

from auditor.records.balances import Contribution, IntervalFigures, MachineBalance, PeriodFigure
from auditor.records.errors import Exit
from auditor.records.findings import Finding, FindingCode
from auditor.records.period import Grid, Period
from auditor.records.plant import Plant
from auditor.records.powers import PowerTable, Source
from auditor.records.result import AuditResult, MachineJudgement, WorkedInterval
from auditor.records.samples import Disposition, ReadingNote
from auditor.records.ticks import CellLedger, Example, SecondKind, SecondLedger, TickTable
from auditor.records.verdicts import Closure, Reason, Status, Verdict

TICK_S = 60
PER_INTERVAL = 15
HOUR_US = 3_600_000_000
Arrays = dict[str, NDArray[np.float64]]


def make_grid(days: int) -> Grid:
    """A grid of whole days of the invented July."""
    start = START_US + np.arange(days * 1440, dtype=np.int64) * TICK_S * 1_000_000
    end_us = START_US + days * 24 * HOUR_US
    label = "2026-07" if days == 31 else f"2026-07-01_2026-07-{days:02d}"
    period = Period(label, START_US, end_us, "Europe/Stockholm")
    midnights = START_US + np.arange(days + 1, dtype=np.int64) * 24 * HOUR_US
    return Grid(period, TICK_S, TICK_S * PER_INTERVAL, start, midnights)


def _signals(ticks: int) -> Arrays:
    """Tick means in SI: a slow daily wave of load, and a little noise."""
    rng = np.random.default_rng(20260701)
    hours = np.arange(ticks) / 60.0
    load = 0.85 + 0.12 * np.sin(2 * np.pi * hours / 24.0)

    def noisy(values: NDArray[np.float64] | float, share: float) -> NDArray[np.float64]:
        return np.asarray(values * load**0 * (1.0 + share * rng.standard_normal(ticks)))

    signals = {
        "exhaust_in": noisy(723.15, 0.002),
        "exhaust_out": noisy(478.15, 0.002),
        "exhaust_flow": noisy(18.0 * load, 0.005),
        "oil_flow": noisy(23.0 * load, 0.003),
        "oil_hot": noisy(548.15, 0.0004),
        "oil_cold": noisy(458.15, 0.0004),
        "air_in": noisy(288.15 + 5.0 * np.sin(2 * np.pi * hours / 24.0), 0.0004),
        "air_out": noisy(305.15 + 5.0 * np.sin(2 * np.pi * hours / 24.0), 0.0004),
        "air_flow": noisy(226.0 * load, 0.005),
        "gross_power": noisy(1e6 * load, 0.003),
        HOSTILE: noisy(160e3, 0.003),
        "generated": noisy(1.2e6 * load, 0.003),
        "oxygen": noisy(0.095, 0.005),
        "exhaust_hot": noisy(693.15, 0.001),
        "exhaust_cool": noisy(393.15, 0.001),
        "gas_index": noisy(0.0747 * load, 0.006),
        "gas_pressure": noisy(10e3, 0.01),
        "gas_temperature": noisy(285.15, 0.0005),
        "hot_flow": noisy(32.0 / 3600.0 * load, 0.003),
        "hot_supply": noisy(363.25, 0.0004),
        "hot_return": noisy(345.15, 0.0004),
    }
    signals["oil_hot"][2000:2300] = np.nan  # a gap of five hours
    signals["oil_flow"][5 * 1440 : 5 * 1440 + 600] /= 2.6  # makes the engine beat its ceiling
    return signals


def _powers(grid: Grid, s: Arrays) -> PowerTable:
    oil = s["oil_flow"] * 2350.0 * (s["oil_hot"] - s["oil_cold"])
    exhaust = s["exhaust_flow"] * 1120.0 * (s["exhaust_in"] - s["exhaust_out"])
    gas = s["gas_index"] * (111325.0 / 101325.0) * (273.15 / s["gas_temperature"]) * 10.10 * 3.6e6
    water = s["hot_flow"] * 970.0 * 4190.0 * (s["hot_supply"] - s["hot_return"])
    flue = 0.208 * gas
    streams = {
        "coil.exhaust": (exhaust, ("exhaust_flow", "exhaust_in", "exhaust_out")),
        "coil.oil": (oil, ("oil_flow", "oil_hot", "oil_cold")),
        "coil.casing": (0.015 * exhaust, ("exhaust_flow", "exhaust_in", "exhaust_out")),
        "orc.oil": (oil, ("oil_flow", "oil_hot", "oil_cold")),
        "orc.power": (s["gross_power"], ("gross_power",)),
        "orc.own_use": (s[HOSTILE], (HOSTILE,)),
        "orc.feed": (0.3125 * s[HOSTILE], (HOSTILE,)),
        "orc.drive": (0.05 * s["gross_power"], ("gross_power",)),
        "orc.air": (
            s["air_flow"] * 1006.0 * (s["air_out"] - s["air_in"]),
            ("air_flow", "air_in", "air_out"),
        ),
        "engine.gas": (gas, ("gas_index", "gas_pressure", "gas_temperature")),
        "engine.power": (s["generated"], ("generated",)),
        "engine.hot_water": (water, ("hot_flow", "hot_supply", "hot_return")),
        "engine.exhaust": (flue, ("gas_index", "oxygen", "exhaust_hot", "exhaust_cool")),
        "engine.casing": (0.026 * gas, ("gas_index", "gas_pressure", "gas_temperature")),
    }
    table = np.column_stack([power for power, _ in streams.values()])
    tags = list(s)
    sources = [Source(f"calibration:{tag}", "calibration", tag) for tag in tags]
    sources += [Source(f"random:{tag}", "random", tag) for tag in tags]
    sources.append(Source("assumed:fuels.natural_gas.standard", "assumed", "fuels.natural_gas.standard"))
    return PowerTable(
        grid=grid,
        streams=tuple(streams),
        power_W=table,
        known=np.isfinite(table),
        lower_W={"engine.gas": gas},
        higher_W={"engine.gas": gas * 11.20 / 10.10},
        exergy_W={"engine.gas": gas * 1.04},
        inlet_K={"orc.oil": s["oil_hot"], "orc.air": s["air_in"]},
        outlet_K={"orc.oil": s["oil_cold"], "orc.air": s["air_out"]},
        entropic_K={
            "orc.oil": (s["oil_hot"] - s["oil_cold"]) / np.log(s["oil_hot"] / s["oil_cold"]),
            "orc.air": (s["air_out"] - s["air_in"]) / np.log(s["air_out"] / s["air_in"]),
        },
        running=dict.fromkeys(("coil", "orc", "engine"), np.ones(grid.ticks)),
        sources={
            key: frozenset(f"calibration:{tag}" for tag in inputs) for key, (_, inputs) in streams.items()
        },
        all_sources=tuple(sources),
        inputs={key: inputs for key, (_, inputs) in streams.items()},
        standstill_W=dict.fromkeys(streams, float("nan")),
    )


def _interval_means(powers: PowerTable, key: str) -> NDArray[np.float64]:
    return powers.power_W[:, powers.streams.index(key)].reshape(-1, PER_INTERVAL).mean(axis=1)


def _means(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return values.reshape(-1, PER_INTERVAL).mean(axis=1)


def _coil_values(powers: PowerTable) -> Arrays:
    exhaust, oil = _interval_means(powers, "coil.exhaust"), _interval_means(powers, "coil.oil")
    loss = _interval_means(powers, "coil.casing")
    return {
        "heat_in_W": exhaust,
        "useful_heat_W": oil,
        "loss_W": loss,
        "residual_W": exhaust - oil - loss,
        "heat": oil / exhaust,
        "entropy_generation_W_per_K": oil / 501.8 - exhaust / 592.2,
    }


def _orc_values(powers: PowerTable) -> Arrays:
    heat, gross = _interval_means(powers, "orc.oil"), _interval_means(powers, "orc.power")
    own, feed = _interval_means(powers, "orc.own_use"), _interval_means(powers, "orc.feed")
    loss, air = _interval_means(powers, "orc.drive"), _interval_means(powers, "orc.air")
    source, sink = _means(powers.entropic_K["orc.oil"]), _means(powers.entropic_K["orc.air"])
    ceiling = 1.0 - sink / source
    implied = heat + feed - gross - loss
    demanded = heat * (1.0 - ceiling)
    bound = (gross - feed) / heat
    return {
        "heat_in_W": heat,
        "power_in_W": feed,
        "work_gross_W": gross,
        "own_use_W": own,
        "work_net_W": gross - own,
        "rejected_W": implied,
        "rejected_measured_W": air,
        "loss_W": loss,
        "residual_W": implied - air,
        "demanded_rejection_W": demanded,
        "unavoidable_rest_W": implied - demanded,
        "gross": gross / heat,
        "net": (gross - own) / heat,
        "bound": bound,
        "ceiling": ceiling,
        "margin": bound - ceiling,
        "ceiling_share": gross / heat / ceiling,
        "source_temperature_K": source,
        "sink_temperature_K": sink,
        "entropy_generation_W_per_K": _orc_entropy(powers),
    }


def _orc_entropy(powers: PowerTable) -> NDArray[np.float64]:
    """Entropy leaving with air and losses (at the coldest temperature) less entropy of the oil."""
    air, oil, drive = (
        powers.power_W[:, powers.streams.index(key)] for key in ("orc.air", "orc.oil", "orc.drive")
    )
    leaving = air / powers.entropic_K["orc.air"] + drive / powers.inlet_K["orc.air"]
    return _means(leaving - oil / powers.entropic_K["orc.oil"])


def _engine_values(powers: PowerTable) -> Arrays:
    fuel, gross = _interval_means(powers, "engine.gas"), _interval_means(powers, "engine.power")
    heat = _interval_means(powers, "engine.hot_water") + _interval_means(powers, "engine.exhaust")
    loss = _interval_means(powers, "engine.casing")
    return {
        "fuel_in_W": fuel,
        "fuel_in_lower_W": fuel,
        "fuel_in_higher_W": fuel * 11.20 / 10.10,
        "fuel_exergy_W": fuel * 1.04,
        "work_gross_W": gross,
        "work_net_W": gross,
        "useful_heat_W": heat,
        "rejected_W": fuel - gross - heat - loss,
        "loss_W": loss,
        "gross": gross / fuel,
        "net": gross / fuel,
        "heat": heat / fuel,
        "total": (gross + heat) / fuel,
        "bound": gross / fuel,
        "ceiling": np.full_like(fuel, 1.04),
        "margin": gross / fuel - 1.04,
        "ceiling_share": gross / fuel / 1.04,
    }


_ABOVE = {
    "heat": ("useful_heat_W", "heat_in_W"),
    "gross": ("work_gross_W", "heat_in_W"),
    "net": ("work_net_W", "heat_in_W"),
    "bound": ("work_gross_W", "heat_in_W"),
}


def _period(values: Arrays, interval_s: float, withheld: tuple[str, ...]) -> dict[str, PeriodFigure]:
    figures = {}
    assessed = np.isfinite(np.sum([array for array in values.values()], axis=0))
    coverage = float(assessed.mean())
    denominator = values.get("fuel_in_W", values.get("heat_in_W"))
    assert denominator is not None
    for key, array in values.items():
        ratio = not key.endswith("_W")
        name = key if ratio else f"{key.removesuffix('_W')}_J"
        if key in ("source_temperature_K", "sink_temperature_K", "entropy_generation_W_per_K"):
            value = float(np.nanmean(array))
        elif ratio:
            value = float(np.sum((array * denominator)[assessed]) / denominator[assessed].sum())
        else:
            value = float(array[assessed].sum() * interval_s)
        refused = key in withheld
        firm = coverage >= 0.9
        logged = float(np.nansum(array) * interval_s)
        figures[name] = PeriodFigure(
            key=name,
            value=value,
            expanded_U=0.02 * abs(value)
            if key != "residual_W"
            else 0.02 * float(np.nansum(denominator)) * interval_s,
            coverage=coverage if not refused else 0.61,
            status=Status.WITHHELD if refused else Status.FIRM if firm else Status.PROVISIONAL,
            withheld_because="coverage" if refused else "",
            logged=float("nan") if ratio else logged,
            common=float("nan") if ratio else value,
        )
    return figures


def _balance(name: str, grid: Grid, values: Arrays, withheld: tuple[str, ...] = ()) -> MachineBalance:
    start = grid.start_us[::PER_INTERVAL]
    interval_s = float(grid.interval_s)
    count = start.shape[0]
    assessed = np.isfinite(np.sum([array for array in values.values()], axis=0))
    power = values.get("work_gross_W")
    interval = IntervalFigures(
        start_us=start,
        end_us=start + grid.interval_s * 1_000_000,
        coverage=assessed.astype(float),
        values=values,
        assessed=assessed,
        running=np.ones(count),
        load=power / 1.1e6 if power is not None else np.full(count, np.nan),
        steady=np.ones(count, dtype=bool),
        negative_input=np.zeros(count, dtype=bool),
    )
    closure = {"coil": Closure.OPEN, "orc": Closure.CLOSES, "engine": Closure.NOT_TESTABLE}[name]
    shares = (
        Contribution("calibration:gas_index" if name == "engine" else "calibration:oil_flow", 0.0041, 0.72),
        Contribution("calibration:generated" if name == "engine" else "calibration:oil_hot", -0.0022, 0.21),
        Contribution(f"random:{HOSTILE}", 0.0006, 0.07),
    )
    return MachineBalance(
        machine=name,
        interval=interval,
        interval_U={key: np.abs(array) * 0.03 for key, array in values.items()},
        period=_period(values, interval_s, withheld),
        contributions={key: shares for key in ("gross", "net", "heat", "total") if key in values},
        curvature={},
        closure=closure,
        interval_s=interval_s,
        slowest_input="",
        running_s=count * interval_s,
        stopped_s=0.0,
        unknown_s=0.0,
        standstill_J={},
    )


def _judgement(name: str, balance: MachineBalance) -> MachineJudgement:
    figures = balance.interval
    count = figures.start_us.shape[0]
    verdict = np.full(count, Verdict.CREDIBLE, dtype=np.int8)
    reasons: list[tuple[str, ...]] = [()] * count
    verdict[~figures.assessed] = Verdict.NOT_ASSESSED
    for index in np.flatnonzero(~figures.assessed):
        reasons[index] = (Reason.MISSING_INPUT.value,)
    margin = figures.values.get("margin")
    if margin is not None and name == "orc":
        impossible = margin > 0.02
        verdict[impossible] = Verdict.IMPOSSIBLE
        for index in np.flatnonzero(impossible):
            reasons[index] = (Reason.OVER_CEILING.value,)
        verdict[30:40] = Verdict.STOPPED
        verdict[40:44] = Verdict.TRANSIENT
        verdict[60:66] = Verdict.LOW_LOAD
        verdict[80:82] = Verdict.OVER_CEILING_UNPROVEN
        verdict[90:92] = Verdict.IMPLAUSIBLE
    hours = {v.word: float((verdict == v).sum()) * balance.interval_s / 3600.0 for v in Verdict}
    total = sum(hours.values())
    return MachineJudgement(
        name, verdict, tuple(reasons), False, hours, {word: share / total for word, share in hours.items()}
    )


def _tick_table(grid: Grid, signals: Arrays) -> TickTable:
    tags = tuple(signals)
    mean = np.column_stack(list(signals.values()))
    covered = np.where(np.isfinite(mean), float(TICK_S), 0.0)
    counts = np.zeros((len(tags), len(Disposition)), dtype=np.int64)
    counts[:, Disposition.USED] = np.isfinite(mean).sum(axis=0)
    counts[tags.index("oil_hot"), Disposition.FROZEN] = 300
    counts[tags.index("gas_index"), Disposition.STATUS_WORD] = 12
    micro = np.zeros((len(tags), len(SecondKind)), dtype=np.int64)
    micro[:, SecondKind.COVERED] = (covered.sum(axis=0) * 1e6).astype(np.int64)
    micro[:, SecondKind.REJECTED] = int(grid.period.seconds * 1e6) - micro[:, SecondKind.COVERED]
    frozen = ("oil_hot", Disposition.FROZEN)
    words = ("gas_index", Disposition.STATUS_WORD)
    first = {
        frozen: Example("oil/day-02.csv", 560, START_US + 2000 * 60_000_000, "275.0"),
        words: Example("engine/july.csv", 77, None, HOSTILE),
    }
    return TickTable(
        grid=grid,
        columns=tags,
        mean=mean,
        covered_s=covered,
        samples=np.isfinite(mean).astype(np.int32),
        noise=np.zeros_like(mean),
        noise_lag1=np.zeros(len(tags)),
        native_step_s=np.full(len(tags), 60.0),
        tags=tags,
        cells=CellLedger(
            tags, counts, counts.sum(axis=1), first, first, {"gas_index": {HOSTILE: 8, "Wartung": 4}}
        ),
        seconds=SecondLedger(tags, micro),
        bridges=(),
        carry={},
    )


def _notes(plant: Plant, grid: Grid) -> tuple[ReadingNote, ...]:
    notes = []
    for export in (*plant.exports, None):
        file = f"{export}/july.csv" if export else "scan/notes.bin"
        notes.append(
            ReadingNote(
                export=export,
                file=file,
                pattern=0 if export else None,
                bytes=4_200_123,
                sha256=hashlib.sha256(file.encode()).hexdigest(),
                encoding="utf-8" if export else "",
                delimiter="," if export else "",
                layout="wide",
                heading_line=1,
                unit_line=2,
                columns=("time", "TO-F"),
                unclaimed_columns=("<b>remarks</b>",) if export == "oil" else (),
                unclaimed_cells={"<b>remarks</b>": 44_640} if export == "oil" else {},
                stamp_format="year-month-day hour:minute:second" if export else "",
                evidence=("the first field of every line reads as a stamp",) if export else (),
                lines=44_642,
                lines_data=44_640 if export else 0,
                lines_skipped=2,
                lines_rejected=0 if export else 44_640,
                first_us=grid.period.start_us if export else None,
                last_us=grid.period.end_us if export else None,
                backward_steps=0,
                findings=(),
            )
        )
    return tuple(notes)


def make_findings() -> tuple[Finding, ...]:
    """One finding of every kind, as sparse as a room may leave it, and the fuller ones first."""
    day = 24 * HOUR_US
    full = (
        Finding(
            FindingCode.IMPOSSIBLE_CLUSTER,
            machine="orc",
            start_us=START_US + 5 * day,
            end_us=START_US + 5 * day + 10 * HOUR_US,
            energy_J=9.4e9,
            numbers={"count": 40.0},
            words={"reasons": Reason.OVER_CEILING.value},
            suspects=("oil_flow", HOSTILE),
        ),
        Finding(
            FindingCode.OPEN_BALANCE,
            machine="coil",
            start_us=START_US + 9 * day,
            end_us=START_US + 31 * day,
            energy_J=3.6e10,
            numbers={"residual_J": 3.6e10, "residual_U_J": 2.1e10, "open": 1.0},
        ),
        Finding(
            FindingCode.GAP,
            export="oil",
            tag="oil_hot",
            start_us=START_US + 2000 * 60_000_000,
            end_us=START_US + 2300 * 60_000_000,
            energy_J=8.6e10,
            numbers={"gap_s": 18000.0},
        ),
        Finding(
            FindingCode.STEP_IN_FIGURE,
            machine="orc",
            start_us=START_US + 16 * day,
            end_us=START_US + 31 * day,
            energy_J=2.2e11,
            numbers={"before": 0.2055, "after": 0.1903, "score": 22.0},
            words={"figure": "gross"},
        ),
        Finding(
            FindingCode.WITHHELD_FIGURE,
            machine="engine",
            numbers={"coverage": 0.61},
            words={"figure": "total", "because": "coverage"},
        ),
    )
    codes = {finding.code for finding in full}
    return full + tuple(Finding(code) for code in FindingCode if code not in codes)


def make_result(days: int = 31, status: Exit = Exit.LOOK) -> AuditResult:
    """The whole made-up audit of some days of July 2026."""
    plant, grid = make_plant(), make_grid(days)
    signals = _signals(grid.ticks)
    powers = _powers(grid, signals)
    values: Mapping[str, Arrays] = {
        "coil": _coil_values(powers),
        "orc": _orc_values(powers),
        "engine": _engine_values(powers),
    }
    refused = {"engine": ("total", "heat")}
    balances = {name: _balance(name, grid, array, refused.get(name, ())) for name, array in values.items()}
    judgements = {name: _judgement(name, balance) for name, balance in balances.items()}
    return AuditResult(
        version="0.1.0",
        plant=plant,
        plant_sha256=hashlib.sha256(plant.text.encode()).hexdigest(),
        period=grid.period,
        period_said="",
        notes=_notes(plant, grid),
        ticks=_tick_table(grid, signals),
        powers=powers,
        balances=balances,
        judgements=judgements,
        findings=make_findings(),
        worked=WorkedInterval("orc", 100, "median efficiency"),
        status=status,
    )
