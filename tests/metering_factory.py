"""Tick tables and plants made by hand for the tests of metering: every number in SI, every tag exact."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from auditor.metering import MeteringSettings
from auditor.records.machines import Machine, Role, Running, Stream, Way
from auditor.records.period import Grid, Period
from auditor.records.plant import (
    AirPressure,
    Fluid,
    Fuel,
    GasMeter,
    HeatingValue,
    Rules,
    Site,
    Tag,
    VolumeState,
)
from auditor.records.powers import PowerTable
from auditor.records.ticks import CellLedger, SecondLedger, TickTable
from auditor.records.uncertain import Assumed, Uncertainty

Floats = NDArray[np.float64]
START_US = 1_759_269_600_000_000  # 2025-10-01 00:00 in Copenhagen
TICK_US = 60_000_000
KWH_PER_M3 = 3.6e6  # J/m3
PER_HOUR = 1.0 / 3600.0
CELSIUS = 273.15


def assumed(key: str, value: float, standard: float = 0.0) -> Assumed:
    """A number that nobody logs."""
    return Assumed(key, value, standard, "1", f"{value}")


def make_tag(name: str, *, absolute: float = 0.0, relative: float = 0.0, **fields: object) -> Tag:
    """A tag that shows SI, with a standard uncertainty; any field of the record by keyword."""
    plain: dict[str, object] = {
        "export": "logger",
        "column": name.upper(),
        "unit": "1",
        "quantity": "any",
        "scale": 1.0,
        "offset": 0.0,
        "si_unit": "1",
        "between": "line",
        "stamp_marks": None,
        "hold_s": 300.0,
        "calibration": Uncertainty(absolute, relative, "declared"),
    }
    return Tag(name=name, **(plain | fields))  # type: ignore[arg-type]


def make_grid(ticks: int, ticks_per_interval: int = 15) -> Grid:
    """One-minute ticks from the start of an October."""
    start_us = START_US + TICK_US * np.arange(ticks, dtype=np.int64)
    end_us = START_US + TICK_US * ticks
    period = Period("2025-10", START_US, end_us, "Europe/Copenhagen")
    return Grid(period, 60, 60 * ticks_per_interval, start_us, np.array([START_US, end_us]))


def make_ticks(
    means: Mapping[str, float | Sequence[float] | Floats],
    *,
    ticks: int = 1,
    noise: Mapping[str, float] | None = None,
    lag1: Mapping[str, float] | None = None,
    covered_s: Mapping[str, Sequence[float]] | None = None,
    ticks_per_interval: int = 15,
) -> TickTable:
    """A tick table of these columns; a state's column is named ``tag=state``."""
    columns, shape = tuple(means), (ticks, len(means))
    table = np.column_stack([np.broadcast_to(np.asarray(means[name], float), ticks) for name in columns])
    covered = np.full(shape, 60.0)
    for name, seconds in (covered_s or {}).items():
        covered[:, columns.index(name)] = seconds
    tags = tuple(name.partition("=")[0] for name in columns)
    none = np.zeros((len(tags), 0), dtype=np.int64)
    return TickTable(
        grid=make_grid(ticks, ticks_per_interval),
        columns=columns,
        mean=table,
        covered_s=covered,
        samples=np.ones(shape, dtype=np.int32),
        noise=np.column_stack([np.full(ticks, (noise or {}).get(name, 0.0)) for name in columns]),
        noise_lag1=np.array([(lag1 or {}).get(name, 0.0) for name in columns]),
        native_step_s=np.full(len(columns), 60.0),
        tags=tags,
        cells=CellLedger(tags, none, none[:, 0:0].sum(axis=1), {}, {}, {}),
        seconds=SecondLedger(tags, none),
        bridges=(),
        carry={},
    )


def make_fuel(*entries: HeatingValue, phase: str = "gas", standard: float = 0.0, **fields: object) -> Fuel:
    """A fuel at 0 degC and 101.325 kPa, dry."""
    state = VolumeState(273.15, 101_325.0, True, "0 degC, 101.325 kPa, dry") if phase == "gas" else None
    factor = assumed("fuels.fuel.values", 1.0, standard)
    return Fuel("fuel", phase, state, entries, factor, **fields)  # type: ignore[arg-type]


def heating_value(
    lower: float | None, higher: float | None = None, *, from_us: int = START_US
) -> HeatingValue:
    """Heating values [J/m3] or [J/kg] from an instant on."""
    low = None if lower is None else assumed("fuels.fuel.values.lower", lower)
    high = None if higher is None else assumed("fuels.fuel.values.higher", higher)
    return HeatingValue(from_us, low, high, "supplier's sheet")


def declared_fluid(heat_capacity: float | None = None, standard: float = 0.0, **fields: object) -> Fluid:
    """A fluid with one heat capacity [J/(kg K)], or whatever the fields say."""
    capacity = (
        None if heat_capacity is None else assumed("fluids.fluid.heat_capacity", heat_capacity, standard)
    )
    plain: dict[str, object] = {
        "name": "fluid",
        "kind": "declared",
        "mass_fraction": None,
        "heat_capacity": capacity,
        "heat_capacity_table": None,
        "density": None,
        "density_table": None,
    }
    return Fluid(**(plain | fields))  # type: ignore[arg-type]


def make_machine(
    name: str,
    streams: Mapping[str, tuple[Role, Way]],
    *,
    running: Running,
    basis: str | None = None,
) -> Machine:
    """A machine of these streams."""
    return Machine(
        name=name,
        title=name.title(),
        kind="gas engine",
        basis=basis,  # type: ignore[arg-type]
        headline="gross",
        rated_power_W=None,
        minimum_load=None,
        running=running,
        steady=None,
        ceiling=None,
        streams={key: Stream(key, name, role, way) for key, (role, way) in streams.items()},
    )


def make_settings(
    tags: Sequence[Tag],
    *machines: Machine,
    fluids: Mapping[str, Fluid] | None = None,
    fuels: Mapping[str, Fuel] | None = None,
    gas_meters: Mapping[str, GasMeter] | None = None,
    air_pressure: AirPressure | None = None,
    reference_K: float | None = 298.15,
) -> MeteringSettings:
    """The slice of a plant at 25 degC reference temperature."""
    site = Site("Quillmere", "Europe/Copenhagen", 40.0, air_pressure, reference_K, 60, 900)
    return MeteringSettings(
        site=site,
        rules=Rules(),
        tags={tag.name: tag for tag in tags},
        fluids=fluids or {},
        fuels=fuels or {},
        gas_meters=gas_meters or {},
        machines={machine.name: machine for machine in machines},
    )


def stream_W(table: PowerTable, key: str) -> Floats:
    """Power of one stream by tick."""
    return table.power_W[:, table.streams.index(key)]
