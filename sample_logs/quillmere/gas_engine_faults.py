"""The list of seeded faults of Quillmere, with the size of each where one can be stated."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
from energy_ledger import fault
from gas_engine_logs import (
    EXCHANGE,
    FROZEN_RETURN,
    FROZEN_RETURN_C,
    GAS_CREEP_M3_PER_H,
    LATE_FILE,
    LATE_FILE_ARRIVES,
    LOW_FLOW_OFFSET_M3_PER_H,
    LOW_METER_SERVICE,
    OUTAGE,
)
from gas_engine_plant import (
    BYPASS_OPEN,
    BYPASS_SHARE,
    FLUE_GAS,
    MISFIRE,
    MONTH_END,
    MONTH_START,
    NEW_GAS,
    RETURN_WARMER_K,
    SHEET,
    ZONE,
    GasEngineMonth,
    Scenario,
    local,
    simulate,
)
from logger_tools import Array, moment_text, within

MONTH = (MONTH_START, MONTH_END)
SECOND_TWO_O_CLOCK = (local(26, 2), local(26, 4))
WATER_HEAT_CAPACITY = 4.19
entry = partial(fault, ZONE)


def energy_kWh(month: GasEngineMonth, power_kW: Array, span: tuple[int, int]) -> float:
    """Sum a power over a span of time within the month, kWh."""
    inside = within(month.minutes, *MONTH) & within(month.minutes, *span)
    return round(float(np.sum(power_kW[inside])) / 60.0, 1)


def machine_faults(month: GasEngineMonth) -> list[dict[str, Any]]:
    """List what went wrong with the engine."""
    healthy = simulate(Scenario(faults=False))
    cooled = FLUE_GAS.enthalpy(np.minimum(month.exhaust_cool_C, 120.0))
    unrecovered = month.exhaust_flow * (FLUE_GAS.enthalpy(month.exhaust_cool_C) - cooled)
    misfire = {
        "extra_fuel_kWh": energy_kWh(month, month.fuel_kW - healthy.fuel_kW, MISFIRE),
        "extra_unburnt_kWh": energy_kWh(month, month.unburnt_kW - healthy.unburnt_kW, MISFIRE),
        "exhaust_K": 22.0,
        "cylinder_K": -90.0,
    }
    bypass = {
        "share": BYPASS_SHARE,
        "heat_not_recovered_kWh": energy_kWh(month, unrecovered, BYPASS_OPEN),
    }
    return [
        entry("misfire of cylinder 7", MISFIRE, ["CYL-7", "EX-1"], **misfire),
        entry("exhaust bypass open, its order reads 0", BYPASS_OPEN, ["EX-2", "DMP"], **bypass),
    ]


def measurement_faults(month: GasEngineMonth) -> list[dict[str, Any]]:
    """List what went wrong with meters, clocks and files, and the change of gas quality."""
    exchange = {
        "unknown_minutes": EXCHANGE[1] - EXCHANGE[0],
        "true_fuel_kWh": energy_kWh(month, month.fuel_kW, EXCHANGE),
    }
    too_much = month.hot_flow * WATER_HEAT_CAPACITY * RETURN_WARMER_K
    frozen = {
        "shown_C": FROZEN_RETURN_C,
        "heat_overstated_kWh": energy_kWh(month, too_much, FROZEN_RETURN),
    }
    late: dict[str, float | str] = {
        "power_kWh": energy_kWh(month, month.power_kW, OUTAGE),
        "file": LATE_FILE,
        "arrives": moment_text(LATE_FILE_ARRIVES, ZONE),
    }
    quality = {"lower_from": SHEET[0][1], "lower_to": SHEET[1][1]}
    controller = ["GN-01", "GN-02", "EX-1", "EX-2", "EX-O2", "AMB-T", "BKR"]
    below_zero = LOW_FLOW_OFFSET_M3_PER_H
    return [
        entry("gas meter exchanged, 40 minutes unknown", EXCHANGE, ["GM-01"], **exchange),
        entry("hot return temperature frozen", FROZEN_RETURN, ["HT-R"], **frozen),
        entry("new gas quality (in plant.toml)", (NEW_GAS, MONTH_END), ["GM-01"], **quality),
        entry("controller's five hours come in a late file", OUTAGE, controller, **late),
        entry("end of summer time, seen by the heat logger only", SECOND_TWO_O_CLOCK, ["HT-F"]),
        entry("gas meter creeps at standstill", MONTH, ["GM-01"], m3_per_h=GAS_CREEP_M3_PER_H),
        entry("low-temperature flow below zero at standstill", MONTH, ["LT-F"], m3_per_h=below_zero),
        entry("low-temperature flow meter serviced, words", LOW_METER_SERVICE, ["LT-F"]),
    ]


def faults_of(month: GasEngineMonth) -> list[dict[str, Any]]:
    """List all seeded faults."""
    return machine_faults(month) + measurement_faults(month)
