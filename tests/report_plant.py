"""An invented site for the report's tests: an exhaust coil, a waste-heat engine and a gas engine."""

from __future__ import annotations

from pathlib import Path

from auditor.records.machines import (
    Ceiling,
    CeilingKind,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    Machine,
    Power,
    Role,
    Running,
    SameAs,
    ShareOf,
    Steady,
    Stream,
)
from auditor.records.plant import (
    Distrust,
    Export,
    FlueGas,
    Fluid,
    Fuel,
    GasMeter,
    HeatingValue,
    Plant,
    Rules,
    Site,
    Tag,
    VolumeState,
)
from auditor.records.uncertain import Assumed, Uncertainty

HOSTILE = "<script>alert(1)</script>"
"""A tag name that must never become markup."""

KWH_PER_M3 = 3.6e6
START_US = 1_782_856_800_000_000
"""2026-07-01 00:00 in Stockholm (UTC+02:00)."""

_KINDS = {
    "kW": ("power", 1e3, 0.0, "W"),
    "kWh": ("energy", 3.6e6, 0.0, "J"),
    "degC": ("temperature", 1.0, 273.15, "K"),
    "kg/s": ("mass flow", 1.0, 0.0, "kg/s"),
    "m3/h": ("volume flow", 1.0 / 3600.0, 0.0, "m3/s"),
    "m3": ("volume", 1.0, 0.0, "m3"),
    "bar": ("pressure", 1e5, 0.0, "Pa"),
    "%": ("fraction", 0.01, 0.0, "1"),
}

_TAGS = {
    "furnace": (
        ("exhaust_in", "WX-T1", "degC"),
        ("exhaust_out", "WX-T2", "degC"),
        ("exhaust_flow", "WX-M", "kg/s"),
    ),
    "oil": (
        ("oil_flow", "TO-F", "kg/s"),
        ("oil_hot", "TO-T1", "degC"),
        ("oil_cold", "TO-T2", "degC"),
        ("air_in", "CA-T1", "degC"),
        ("air_out", "CA-T2", "degC"),
        ("air_flow", "CA-M", "kg/s"),
    ),
    "power": (
        ("gross_power", "OR-G", "kW"),
        (HOSTILE, "=1+1", "kW"),
    ),
    "engine": (
        ("generated", "GN-01", "kWh"),
        ("oxygen", "EX-O2", "%"),
        ("exhaust_hot", "EX-1", "degC"),
        ("exhaust_cool", "EX-2", "degC"),
        ("gas_index", "GM-01", "m3"),
        ("gas_pressure", "GM-02", "bar"),
        ("gas_temperature", "GM-03", "degC"),
        ("hot_flow", "HT-F", "m3/h"),
        ("hot_supply", "HT-S", "degC"),
        ("hot_return", "HT-R", "degC"),
    ),
}


def _tag(export: str, name: str, column: str, unit: str) -> Tag:
    quantity, scale, offset, si = _KINDS[unit]
    counter = unit in ("kWh", "m3")
    return Tag(
        name=name,
        export=export,
        column=column,
        unit=unit,
        quantity=quantity,
        scale=scale,
        offset=offset,
        si_unit=si,
        between="counter" if counter else "line",
        stamp_marks=None,
        hold_s=300.0,
        calibration=Uncertainty(0.0, 0.01, "standard 1 %"),
        believable=(253.15, 623.15) if unit == "degC" else None,
        frozen_after_s=7200.0 if name == "oil_hot" else None,
    )


def _export(name: str) -> Export:
    return Export(
        name=name,
        files=(f"{name}/*.csv",),
        clock="UTC",
        repeated_hour="by order",
        date_order="year first",
        decimal=".",
        delimiter=None,
        encoding=None,
        layout=None,
        stamp_columns=(),
        sentinels=(-9999.0,),
        status_words={},
        when_stamps_repeat="keep first",
        tags=tuple(tag[0] for tag in _TAGS[name]),
    )


def assumed(key: str, value: float, standard: float, unit: str = "1") -> Assumed:
    """A stated number with the words it was declared in."""
    return Assumed(key, value, standard, unit, f"{value:g} (standard {standard:g})", "survey of 2024")


def _fluid(name: str, capacity: float) -> Fluid:
    return Fluid(
        name=name,
        kind="declared",
        mass_fraction=None,
        heat_capacity=assumed(f"fluids.{name}.heat_capacity", capacity, capacity * 0.005, "J/(kg K)"),
        heat_capacity_table=None,
        density=None,
        density_table=None,
    )


def _streams(machine: str, **streams: tuple[Role, object]) -> dict[str, Stream]:
    return {name: Stream(name, machine, role, way) for name, (role, way) in streams.items()}  # type: ignore[arg-type]


def _machine(name: str, title: str, kind: str, streams: dict[str, Stream], **rest: object) -> Machine:
    fields: dict[str, object] = {
        "basis": None,
        "headline": None,
        "rated_power_W": None,
        "minimum_load": None,
        "running": Running("gross_power", 20e3, None),
        "steady": None,
        "ceiling": None,
    }
    return Machine(name=name, title=title, kind=kind, streams=streams, **(fields | rest))  # type: ignore[arg-type]


def _coil() -> Machine:
    streams = _streams(
        "coil",
        exhaust=(
            Role.HEAT_IN,
            FlowAndTemperatures("exhaust_flow", None, "exhaust_in", "exhaust_out", "furnace_exhaust"),
        ),
        oil=(Role.USEFUL_HEAT, SameAs("orc", "oil")),
        casing=(Role.LOSS, ShareOf("exhaust", assumed("machines.coil.streams.casing.share", 0.015, 0.005))),
    )
    return _machine("coil", "Exhaust coil", "heat exchanger", streams)


def _orc() -> Machine:
    streams = _streams(
        "orc",
        oil=(Role.HEAT_IN, FlowAndTemperatures("oil_flow", None, "oil_hot", "oil_cold", "thermal_oil")),
        power=(Role.WORK_OUT, Power("gross_power", "generator terminals")),
        own_use=(Role.OWN_USE, Power(HOSTILE, "motor control centre")),
        feed=(Role.POWER_IN, ShareOf("own_use", assumed("machines.orc.streams.feed.share", 0.3125, 0.03))),
        drive=(Role.LOSS, ShareOf("power", assumed("machines.orc.streams.drive.share", 0.05, 0.01))),
        air=(Role.REJECTED_HEAT, FlowAndTemperatures("air_flow", None, "air_in", "air_out", "cooling_air")),
    )
    return _machine(
        "orc",
        f"Organic Rankine engine {HOSTILE}",
        "organic Rankine engine",
        streams,
        headline="net",
        rated_power_W=1e6,
        minimum_load=0.3,
        steady=Steady("gross_power", 50e3, 1800.0),
        ceiling=Ceiling(CeilingKind.FINITE, "oil", ("air",)),
    )


def _engine() -> Machine:
    streams = _streams(
        "engine",
        gas=(Role.FUEL_IN, GasVolume("natural_gas", "gas_index", "gas_meter")),
        power=(Role.WORK_OUT, Power("generated", "generator terminals")),
        hot_water=(
            Role.USEFUL_HEAT,
            FlowAndTemperatures("hot_flow", "outlet", "hot_return", "hot_supply", "water"),
        ),
        exhaust=(Role.USEFUL_HEAT, FlueGasHeat("gas", "oxygen", "exhaust_hot", "exhaust_cool")),
        casing=(Role.LOSS, ShareOf("gas", assumed("machines.engine.streams.casing.share", 0.026, 0.005))),
    )
    return _machine(
        "engine",
        "Gas engine",
        "gas engine",
        streams,
        basis="lower",
        headline="gross",
        rated_power_W=1.2e6,
        minimum_load=0.3,
        running=Running("generated", 50e3, None),
        ceiling=Ceiling(CeilingKind.FUEL_EXERGY, None, ()),
    )


def _gas() -> Fuel:
    key = "fuels.natural_gas"
    return Fuel(
        name="natural_gas",
        phase="gas",
        volume_state=VolumeState(273.15, 101325.0, True, "0 degC, 101.325 kPa, dry"),
        values=(
            HeatingValue(
                START_US,
                assumed(f"{key}.values", 10.10 * KWH_PER_M3, 0.0, "J/m3"),
                assumed(f"{key}.values", 11.20 * KWH_PER_M3, 0.0, "J/m3"),
                "supplier's sheet",
            ),
        ),
        value_standard=assumed(f"{key}.standard", 1.0, 0.004),
        flue_gas=FlueGas(
            assumed(f"{key}.air_demand", 9.6, 0.1, "m3/m3"),
            assumed(f"{key}.flue_gas.dry", 8.6, 0.1, "m3/m3"),
            assumed(f"{key}.flue_gas.density_fuel", 0.78, 0.01, "kg/m3"),
            assumed(f"{key}.flue_gas.heat_capacity", 1100.0, 11.0, "J/(kg K)"),
        ),
        exergy=assumed(f"{key}.exergy", 1.04, 0.01),
        exergy_of="lower",
    )


def make_plant() -> Plant:
    """The invented plant, as its file would declare it."""
    tags = {row[0]: _tag(export, *row) for export, rows in _TAGS.items() for row in rows}
    meter = GasMeter(
        "gas_meter",
        "operating volume",
        "gas_pressure",
        "gas_temperature",
        assumed("gas_meters.gas_meter.compressibility_ratio", 1.0, 0.001),
    )
    water = Fluid("water", "water", None, None, None, None, None)
    fluids = {
        "thermal_oil": _fluid("thermal_oil", 2350.0),
        "furnace_exhaust": _fluid("furnace_exhaust", 1120.0),
        "cooling_air": _fluid("cooling_air", 1006.0),
        "water": water,
    }
    return Plant(
        path=Path("fernholt/plant.toml"),
        folder=Path("fernholt"),
        text=f'schema = 1\n[site]\nname = "Fernholt & Daughters"\n# {HOSTILE}\n',
        site=Site("Fernholt & Daughters", "Europe/Stockholm", 85.0, None, 298.15, 60, 900),
        rules=Rules(),
        exports={name: _export(name) for name in _TAGS},
        tags=tags,
        fluids=fluids,
        fuels={"natural_gas": _gas()},
        gas_meters={"gas_meter": meter},
        machines={"coil": _coil(), "orc": _orc(), "engine": _engine()},
        distrust=(
            Distrust("air_in", START_US, START_US + 9_000_000_000, "sensor moved for calibration", 88),
        ),
    )
