"""truth.json of Emberlund: what the plant really did, and what a faultless reader of its logs can know."""

from __future__ import annotations

from typing import Any

import numpy as np
from energy_ledger import (
    Ledger,
    bridged,
    by_local_day,
    held,
    instrument_entries,
    machine_entry,
    minute_energy_kWh,
    numbered,
    period_entry,
)
from fluid_properties import LinearHeatCapacity, entropy_change
from logger_tools import Array, within
from waste_heat_faults import faults_of
from waste_heat_logs import (
    INSTRUMENTS,
    KELVIN,
    MOVED_SENSOR,
    Readings,
)
from waste_heat_plant import (
    AIR,
    CASING_SHARE,
    CLEAR_DAYS,
    DRIVE_LOSS_SHARE,
    EXHAUST,
    MONTH_END,
    MONTH_START,
    OIL,
    SEED,
    ZONE,
    WasteHeatMonth,
)

FEED_SHARE = 0.3125  # of own use, as the plant file declares it
HOLD_MINUTES = 5
RUNNING_ABOVE_KW = 20.0
COIL_RUNNING_ABOVE_KG_PER_S = 2.0
COIL_STREAMS = ("exhaust", "oil", "casing", "stored")
ORC_STREAMS = ("oil", "power", "own_use", "feed", "drive", "air")

HOW = {
    "true": "What the plant did over the whole month, without any instrument.",
    "as_metered": (
        "What the logged readings say, with this generator's own fluid properties and the plant "
        "file's declared shares. Left out as not believable: the 30 hours in kelvin (TO-T1), the "
        "distrusted hours of CA-T1, sentinels and status words, and gaps longer than the plant "
        "file's hold. Left in: every calibration error, TO-F +8 %, the sun on CA-T1, the dead "
        "band of WX-T1, and the power controller's clock 7 minutes ahead."
    ),
    "energies": (
        "An energy is summed over the minutes in which every stream that enters it is believable:"
        " heat_in over the minutes of the oil readings, rejected_kWh over the minutes common to "
        "oil, own use and gross power, residual over those common to all streams. Nothing is "
        "scaled up for missing time."
    ),
    "ratios": (
        "An efficiency is the ratio of energies over the minutes common to its numerator and denominator."
    ),
    "ceiling": (
        "1 - T_sink/T_source with entropic mean temperatures (dh over ds by small steps) in each "
        "minute with oil heat, weighted by the oil heat; demanded_rejection_kWh is oil heat times"
        " T_sink/T_source over the same minutes."
    ),
    "coverage_pct": (
        "By energy: the believable energy of the figure's own stream (of its first stream for a "
        "sum, of its denominator for a ratio) over the same plus the unknown minutes at the mean "
        "running minute. Minutes known to stand still count as covered. firm from 90 %, "
        "provisional from 75 %, withheld below."
    ),
    "minutes": (
        "States are known at whole minutes and run on straight lines; a minute's energy is the "
        "mean of its ends."
    ),
    "stored": (
        "The coil's metal and oil store heat; it is part of the coil's true first law and is not metered."
    ),
}


def entropic_mean_K(fluid: LinearHeatCapacity, start_C: Array, end_C: Array) -> Array:
    """Entropic mean temperature of a stream, K: enthalpy change over entropy change."""
    change = entropy_change(fluid.enthalpy, start_C, end_C)
    safe = np.where(np.abs(change) > 1e-9, change, np.nan)
    return (fluid.enthalpy(end_C) - fluid.enthalpy(start_C)) / safe


def reversible_kW(heat_kW: Array, oil: tuple[Array, Array], air: tuple[Array, Array]) -> Array:
    """Power of a reversible engine between oil and air.

    Zero without oil heat, NaN where a reading is missing.
    """
    source = entropic_mean_K(OIL, *oil)
    sink = entropic_mean_K(AIR, *air)
    known = ~np.isnan(heat_kW + oil[0] + oil[1] + air[0] + air[1])
    turning = known & (heat_kW > 50.0) & (oil[0] > oil[1]) & (air[1] > air[0])
    return np.where(turning, heat_kW * (1.0 - sink / source), np.where(known, 0.0, np.nan))


def true_powers(month: WasteHeatMonth) -> dict[str, Array]:
    """Collect the true powers of both machines, kW."""
    oil, air = (month.oil_hot_C, month.oil_cold_C), (month.outdoor_C, month.air_out_C)
    return {
        "exhaust": month.exhaust_kW,
        "casing": month.casing_kW,
        "stored": month.stored_kW,
        "oil": month.oil_kW,
        "power": month.gross_kW,
        "own_use": month.own_kW,
        "feed": month.feed_kW,
        "drive": month.drive_kW,
        "air": month.air_kW,
        "reversible": reversible_kW(month.oil_kW, oil, air),
    }


def metered_powers(readings: Readings) -> tuple[dict[str, Array], dict[str, Array]]:
    """Compute powers from the readings (NaN: not believable) and the signals that tell a standstill."""
    value = {
        tag: bridged(readings.values[tag], HOLD_MINUTES)
        for tag in ("WX-T2", "WX-M", "TO-F", "TO-T2", "CA-T2", "CA-M")
    }
    value["WX-T1"] = held(readings.values["WX-T1"])
    minutes = readings.minutes
    value["TO-T1"] = np.where(within(minutes, *KELVIN), np.nan, readings.values["TO-T1"])
    value["CA-T1"] = np.where(within(minutes, *MOVED_SENSOR), np.nan, readings.values["CA-T1"])
    gross, own = readings.on_power_clock("OR-G"), readings.on_power_clock("OR-P")
    exhaust = value["WX-M"] * (EXHAUST.enthalpy(value["WX-T1"]) - EXHAUST.enthalpy(value["WX-T2"]))
    oil = value["TO-F"] * (OIL.enthalpy(value["TO-T1"]) - OIL.enthalpy(value["TO-T2"]))
    air = value["CA-M"] * (AIR.enthalpy(value["CA-T2"]) - AIR.enthalpy(value["CA-T1"]))
    powers = {
        "exhaust": exhaust,
        "casing": CASING_SHARE * exhaust,
        "oil": oil,
        "power": gross,
        "own_use": own,
        "feed": FEED_SHARE * own,
        "drive": DRIVE_LOSS_SHARE * gross,
        "air": air,
        "reversible": reversible_kW(oil, (value["TO-T1"], value["TO-T2"]), (value["CA-T1"], value["CA-T2"])),
    }
    return powers, {"coil": value["WX-M"], "orc": gross}


def coil_figures(ledger: Ledger) -> dict[str, Any]:
    """Figures of the coil."""
    residual = ledger.energy(
        {"exhaust": 1.0, "casing": -1.0, "oil": -1.0},
        "true: what metal and oil store; as metered: dead band of WX-T1, TO-F +8 % from 17 July",
    )
    return {
        "heat_in_kWh": ledger.energy({"exhaust": 1.0}),
        "useful_heat_kWh": ledger.energy({"oil": 1.0}, "TO-F +8 % from 17 July is in the metered figure"),
        "loss_kWh": ledger.energy({"casing": 1.0}),
        "residual_kWh": residual,
        "heat_pct": ledger.ratio({"oil": 1.0}, "exhaust"),
    }


def orc_figures(ledger: Ledger) -> dict[str, Any]:
    """Figures of the engine."""
    implied = {"oil": 1.0, "feed": 1.0, "power": -1.0, "drive": -1.0}
    return {
        "heat_in_kWh": ledger.energy({"oil": 1.0}, "TO-F +8 % from 17 July is in the metered figure"),
        "power_in_kWh": ledger.energy({"feed": 1.0}),
        "work_gross_kWh": ledger.energy({"power": 1.0}),
        "own_use_kWh": ledger.energy({"own_use": 1.0}),
        "work_net_kWh": ledger.energy({"power": 1.0, "own_use": -1.0}),
        "rejected_kWh": ledger.energy(implied),
        "rejected_measured_kWh": ledger.energy({"air": 1.0}, "the sun on CA-T1 is in the metered figure"),
        "loss_kWh": ledger.energy({"drive": 1.0}),
        "residual_kWh": ledger.energy(implied | {"air": -1.0}),
        "gross_pct": ledger.ratio({"power": 1.0}, "oil"),
        "net_pct": ledger.ratio({"power": 1.0, "own_use": -1.0}, "oil"),
        "ceiling_pct": ledger.ratio({"reversible": 1.0}, "oil", "finite source (oil) and sink (air)"),
        "demanded_rejection_kWh": ledger.energy({"oil": 1.0, "reversible": -1.0}),
    }


def clean_days() -> list[str]:
    """List the days without a dated fault.

    Fouling, the clock offset and the dead band are there on every day.
    """
    dirty = {6, 7, *range(11, 15), *range(17, 32), *CLEAR_DAYS, 15}
    return [f"2026-07-{day:02d}" for day in range(1, 32) if day not in dirty]


def truth_of(month: WasteHeatMonth, readings: Readings) -> dict[str, Any]:
    """Build the whole of truth.json."""
    first = int(np.flatnonzero(month.minutes == MONTH_START)[0])
    last = int(np.flatnonzero(month.minutes == MONTH_END)[0])
    ticks = slice(first, last)
    true = {name: minute_energy_kWh(power)[ticks] for name, power in true_powers(month).items()}
    powers, signals = metered_powers(readings)
    metered = {name: minute_energy_kWh(power)[ticks] for name, power in powers.items()}
    limits = {"coil": COIL_RUNNING_ABOVE_KG_PER_S, "orc": RUNNING_ABOVE_KW}
    stopped = {
        name: np.nan_to_num(signal, nan=np.inf)[ticks] < limits[name] for name, signal in signals.items()
    }
    coil, orc = (Ledger(true, metered, stopped[name]) for name in ("coil", "orc"))
    turning = (month.exhaust_flow > COIL_RUNNING_ABOVE_KG_PER_S)[ticks]
    machines = {
        "coil": machine_entry(coil_figures(coil), coil, COIL_STREAMS, turning),
        "orc": machine_entry(orc_figures(orc), orc, ORC_STREAMS, month.running[ticks]),
    }
    daily = {
        f"{name}_kWh": true[name]
        for name in ("exhaust", "oil", "power", "own_use", "feed", "drive", "air", "stored")
    }
    return {
        "site": "Emberlund Glassworks",
        "period": period_entry(MONTH_START, MONTH_END, ZONE),
        "seed": SEED,
        "how": HOW,
        "machines": machines,
        "faults": numbered(faults_of(month, readings)),
        "instruments": instrument_entries(INSTRUMENTS, readings.biases),
        "clean_days": clean_days(),
        "days": by_local_day(month.minutes[ticks], ZONE, daily),
    }
