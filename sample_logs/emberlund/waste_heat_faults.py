"""The list of seeded faults of Emberlund, with the size of each where one can be stated."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
from energy_ledger import fault
from logger_tools import within
from waste_heat_logs import (
    CLOCK_AHEAD_MINUTES,
    CLOCK_STEP,
    DAILY_CONFLICTS,
    DEADBAND_K,
    KELVIN,
    LINK_LOSSES,
    MOVED_SENSOR,
    OIL_FLOW_HIGH,
    OIL_FLOW_HIGH_FACTOR,
    PANEL_SWITCH,
    PITOT_SERVICE,
    SUN_HOURS,
    SUN_K,
    Readings,
)
from waste_heat_plant import (
    CLEAR_DAYS,
    FAN_OFF,
    HOLD,
    MONTH_END,
    MONTH_START,
    ZONE,
    Scenario,
    WasteHeatMonth,
    local,
    simulate,
)

MONTH = (MONTH_START, MONTH_END)
entry = partial(fault, ZONE)


def power_lost_to_fouling(month: WasteHeatMonth) -> dict[str, float]:
    """Compute the gross energy lost to fouling alone, against a clean coil in the same weather."""
    clean = simulate(Scenario(faults=False))
    inside = within(month.minutes, *MONTH)
    others = within(month.minutes, HOLD[0] - 60, HOLD[1] + 300) | within(month.minutes, *FAN_OFF)
    lost = np.where(others, 0.0, clean.gross_kW - month.gross_kW)[inside]
    return {
        "gross_lost_kWh_outside_hold_and_fan_fault": round(float(np.sum(lost)) / 60.0, 1),
        "gross_lost_kW_on_last_day": round(float(np.mean(lost[-1440:])), 2),
    }


def machine_faults(month: WasteHeatMonth) -> list[dict[str, Any]]:
    """List what went wrong with the plant."""
    fouling = power_lost_to_fouling(month)
    return [
        entry("coil fouling, linear over the month", MONTH, ["WX-T2", "TO-T1"], **fouling),
        entry("furnace hold, engine stopped for nine hours", HOLD, [], source_C=380.0),
        entry("fan 3 stands still, its state bit stays 1", FAN_OFF, ["FAN3"], condensing_K=9.0),
    ]


def lasting_measurement_faults(month: WasteHeatMonth, readings: Readings) -> list[dict[str, Any]]:
    """List what went wrong with meters, clocks and stores for hours or more."""
    kept = int(np.sum(~np.isnan(readings.values["WX-T1"][within(month.minutes, *MONTH)])))
    storage = {"deadband_K": DEADBAND_K, "stored_values": kept}
    clock = {"minutes_ahead": CLOCK_AHEAD_MINUTES, "repeated_stamps": CLOCK_AHEAD_MINUTES}
    hours = (KELVIN[1] - KELVIN[0]) / 60
    power_tags = ["OR-G", "OR-P", "P_el"]
    return [
        entry("inlet temperature stored by exception", MONTH, ["WX-T1"], **storage),
        entry("power controller ahead, then set back", (MONTH_START, CLOCK_STEP), power_tags, **clock),
        entry("panel power goes from net to gross", (PANEL_SWITCH, MONTH_END), ["P_el"]),
        entry("oil flow transmitter reads high", OIL_FLOW_HIGH, ["TO-F"], factor=OIL_FLOW_HIGH_FACTOR),
        entry("oil inlet temperature in kelvin", KELVIN, ["TO-T1"], added=273.15, hours=hours),
        entry("air sensor moved (distrusted in plant.toml)", MOVED_SENSOR, ["CA-T1"]),
        entry("pitot serviced, status words", PITOT_SERVICE, ["WX-M"]),
    ]


def short_measurement_faults() -> list[dict[str, Any]]:
    """List sunny afternoons, losses of the data link, and daily exports that differ."""
    sun = []
    for day in CLEAR_DAYS:
        span = (local(day, SUN_HOURS[0]), local(day, SUN_HOURS[1]))
        sun.append(entry("sun on the air sensor", span, ["CA-T1"], added_K=SUN_K))
    losses = []
    for tag, start, length, value in LINK_LOSSES:
        losses.append(entry("data link lost", (start, start + length), [tag], written=value))
    conflicts = []
    for tag, start, length, added in DAILY_CONFLICTS:
        title = "daily export differs from the monthly one, which is right"
        conflicts.append(entry(title, (start, start + length), [tag], added=added))
    return sun + losses + conflicts


def faults_of(month: WasteHeatMonth, readings: Readings) -> list[dict[str, Any]]:
    """List all seeded faults."""
    lasting = lasting_measurement_faults(month, readings)
    return machine_faults(month) + lasting + short_measurement_faults()
