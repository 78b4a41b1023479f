"""Power tables made by hand for the tests of balancing and influences: powers in kW, temperatures in degC."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from auditor.balancing import BalancingSettings, BaseRun, balance, finish, rebalance
from auditor.influences import Memory, propagate
from auditor.records.balances import MachineBalance, MachineFigures
from auditor.records.machines import Constant, Machine, Power, Role, Running, SameAs, Stream
from auditor.records.period import Grid, Period
from auditor.records.plant import Rules, Tag
from auditor.records.powers import Move, PowerTable, Source
from auditor.records.ticks import CellLedger, SecondLedger, TickTable
from auditor.records.uncertain import Assumed, Uncertainty

Floats = NDArray[np.float64]
START_US = 1_782_856_800_000_000  # 2026-07-01 00:00 in Stockholm
CELSIUS = 273.15
ASSUMED_W = Assumed("machines.m.streams.s.share", 1.0, 0.0, "W", "stated")


def make_grid(ticks: int, tick_s: int = 60, interval_s: int = 900) -> Grid:
    """Ticks from the start of a July."""
    start_us = START_US + tick_s * 1_000_000 * np.arange(ticks, dtype=np.int64)
    end_us = START_US + tick_s * 1_000_000 * ticks
    period = Period("2026-07", START_US, end_us, "Europe/Stockholm")
    return Grid(period, tick_s, interval_s, start_us, np.array([START_US, end_us]))


def make_machine(name: str, roles: Mapping[str, Role | tuple[Role, str]], **fields: object) -> Machine:
    """A machine of streams ``name: role``, or with ``(role, "stated")`` or ``(role, "other.stream")``."""

    def stream(key: str, role: Role | tuple[Role, str]) -> Stream:
        if not isinstance(role, tuple):
            return Stream(key, name, role, Power(f"{name}.{key}", "terminals"))
        role, way = role
        if way == "stated":
            return Stream(key, name, role, Constant(ASSUMED_W))
        return Stream(key, name, role, SameAs(*way.split(".")))

    plain: dict[str, object] = {
        "title": name.title(),
        "kind": "generic heat engine",
        "basis": None,
        "headline": "gross",
        "rated_power_W": None,
        "minimum_load": None,
        "running": Running(f"{name}.state", 0.5, None),
        "steady": None,
        "ceiling": None,
    }
    streams = {key: stream(key, role) for key, role in roles.items()}
    return Machine(name=name, streams=streams, **(plain | fields))  # type: ignore[arg-type]


@dataclass(frozen=True)
class Plant:
    """A power table with the tick table and settings that go with it."""

    powers: PowerTable
    ticks: TickTable
    settings: BalancingSettings

    def base(self) -> BaseRun:
        """The base run."""
        return balance(self.powers, self.ticks, self.settings)


def make_plant(
    machines: Sequence[Machine],
    power_kW: Mapping[str, float | Sequence[float] | Floats],
    *,
    ticks: int,
    tick_s: int = 60,
    interval_s: int = 900,
    celsius: Mapping[str, tuple[float | Floats, float | Floats]] | None = None,
    running: Mapping[str, Floats] | None = None,
    lower_kW: Mapping[str, float] | None = None,
    higher_kW: Mapping[str, float] | None = None,
    exergy_kW: Mapping[str, float] | None = None,
    native_s: Mapping[str, float] | None = None,
    rules: Rules | None = None,
    sources: Mapping[str, frozenset[str]] | None = None,
) -> Plant:
    """Streams by ``machine.stream`` key; NaN is not known. ``celsius`` holds (inlet, outlet) by stream."""
    grid = make_grid(ticks, tick_s, interval_s)
    keys = tuple(stream.key for machine in machines for stream in machine.streams.values())

    def spread(value: float | Sequence[float] | Floats, factor: float = 1.0, offset: float = 0.0) -> Floats:
        return np.broadcast_to(np.asarray(value, dtype=float) * factor + offset, ticks).copy()

    power_W = np.array([spread(power_kW[key], 1e3) for key in keys]).T
    inlet_K = {key: spread(pair[0], 1.0, CELSIUS) for key, pair in (celsius or {}).items()}
    outlet_K = {key: spread(pair[1], 1.0, CELSIUS) for key, pair in (celsius or {}).items()}
    powers = PowerTable(
        grid=grid,
        streams=keys,
        power_W=power_W,
        known=np.isfinite(power_W),
        lower_W={key: spread(value, 1e3) for key, value in (lower_kW or {}).items()},
        higher_W={key: spread(value, 1e3) for key, value in (higher_kW or {}).items()},
        exergy_W={key: spread(value, 1e3) for key, value in (exergy_kW or {}).items()},
        inlet_K=inlet_K,
        outlet_K=outlet_K,
        entropic_K={key: log_mean_K(inlet_K[key], outlet_K[key]) for key in inlet_K},
        running={m.name: spread((running or {}).get(m.name, 1.0)) for m in machines},
        sources={key: (sources or {}).get(key, frozenset()) for key in keys},
        all_sources=(),
        inputs={key: (key,) for key in keys},
        standstill_W={},
    )
    tags = {key: make_tag(key) for key in keys}
    return Plant(
        powers,
        make_ticks(grid, keys, power_W, native_s or {}),
        BalancingSettings({m.name: m for m in machines}, tags, rules or Rules()),
    )


def log_mean_K(inlet_K: Floats, outlet_K: Floats) -> Floats:
    """Logarithmic mean, in the textbook's own form."""
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = (inlet_K - outlet_K) / np.log(inlet_K / outlet_K)
    return np.where(inlet_K == outlet_K, inlet_K, mean)


def make_ticks(grid: Grid, columns: Sequence[str], mean: Floats, native_s: Mapping[str, float]) -> TickTable:
    """One column per stream, with the stream's power as its mean."""
    none = np.zeros((len(columns), 0), dtype=np.int64)
    return TickTable(
        grid=grid,
        columns=tuple(columns),
        mean=mean,
        covered_s=np.where(np.isfinite(mean), float(grid.tick_s), 0.0),
        samples=np.ones(mean.shape, dtype=np.int32),
        noise=np.zeros(mean.shape),
        noise_lag1=np.zeros(len(columns)),
        native_step_s=np.array([native_s.get(column, 60.0) for column in columns]),
        tags=tuple(columns),
        cells=CellLedger(tuple(columns), none, none.sum(axis=1), {}, {}, {}),
        seconds=SecondLedger(tuple(columns), none),
        bridges=(),
        carry={},
    )


def make_tag(name: str, **fields: object) -> Tag:
    """A power tag in watts."""
    plain: dict[str, object] = {
        "export": "logger",
        "column": name,
        "unit": "W",
        "quantity": "power",
        "scale": 1.0,
        "offset": 0.0,
        "si_unit": "W",
        "between": "line",
        "stamp_marks": None,
        "hold_s": 300.0,
        "calibration": Uncertainty(0.0, 0.0, "none"),
    }
    return Tag(name=name, **(plain | fields))  # type: ignore[arg-type]


def with_relative_sources(plant: Plant, errors: Mapping[str, Mapping[str, float]]) -> tuple[Plant, Chain]:
    """Give streams relative standard uncertainties: source key to stream key to share of the power.

    The chain moves all streams of a source together, as one meter that they share would.
    """
    touched = {
        key: frozenset(source for source, shares in errors.items() if key in shares)
        for key in plant.powers.streams
    }
    sources = tuple(
        Source(key, key.partition(":")[0], key.partition(":")[2])  # type: ignore[arg-type]
        for key in errors
    )
    plant = replace(plant, powers=replace(plant.powers, sources=touched, all_sources=sources))
    base = plant.base()

    def chain(move: Move) -> Mapping[str, MachineFigures]:
        factors = np.array(
            [1.0 + move.direction * errors[move.source].get(k, 0.0) for k in plant.powers.streams]
        )
        moved = replace(plant.powers, power_W=plant.powers.power_W * factors)
        return rebalance(moved, base, move.source)

    return plant, chain


Chain = Callable[[Move], Mapping[str, MachineFigures]]


def balanced(
    plant: Plant,
    errors: Mapping[str, Mapping[str, float]] | None = None,
    memory: Mapping[str, Memory] | None = None,
) -> dict[str, MachineBalance]:
    """Balances of all machines, U from relative errors of streams (zero without them)."""
    plant, chain = with_relative_sources(plant, errors or {})
    base = plant.base()
    return finish(base, propagate(chain, base.figures, plant.powers.all_sources, memory or {}))
