"""truth.json of Quillmere: what the engine really did, and what a faultless reader of its logs can know."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from energy_ledger import (
    Ledger,
    bridged,
    by_local_day,
    instrument_entries,
    machine_entry,
    minute_energy_kWh,
    numbered,
    period_entry,
)
from fluid_properties import ZERO_CELSIUS_K, water_density, water_enthalpy
from gas_engine_faults import faults_of
from gas_engine_logs import (
    FROZEN_RETURN,
    INSTRUMENTS,
    Readings,
)
from gas_engine_plant import (
    AIR_DEMAND,
    AIR_DENSITY_NORMAL,
    AIR_HEAT_CAPACITY,
    COMPRESSIBILITY_RATIO,
    DRY_FLUE_GAS,
    EXERGY_OVER_LOWER,
    FLUE_GAS,
    HEATING_VALUE_FACTOR,
    MONTH_END,
    MONTH_START,
    NEW_GAS,
    OXYGEN_IN_AIR_PCT,
    REFERENCE_C,
    SEED,
    SHEET,
    ZONE,
    GasEngineMonth,
)
from logger_tools import Array, within

# Values the plant file declares, used for what the logs show.
DECLARED_AIR_DEMAND = 9.6
DECLARED_DRY_FLUE_GAS = 8.6
DECLARED_FUEL_DENSITY = 0.78
ALTITUDE_M = 40.0
CUT_OFF_M3_PER_H = 0.5
CASING_SHARE, GENERATOR_SHARE, UNBURNT_SHARE = 0.026, 0.031, 0.012
WATER_HOLD_MINUTES = 5
GAS_HOLD_MINUTES = 15

HOW = {
    "true": "What the plant did over the whole month, without any instrument.",
    "as_metered": (
        "What the logged readings say, with this generator's own water and flue-gas properties "
        "and the plant file's declared heating values, combustion constants, shares and altitude."
        " Left out as not believable: the 31 hours of the frozen HT-R (hot water only), the 40 "
        "minutes of the gas-meter exchange, status words, and gaps longer than the plant file's "
        "hold. Left in: every calibration error, the creep of the gas meter at standstill, the "
        "weather's influence on air pressure. The late file of 20 October is read; LT-F below its"
        " cut-off counts as 0."
    ),
    "energies": (
        "An energy is summed over the minutes in which every stream that enters it is believable:"
        " useful_heat over the minutes common to hot water and exhaust, residual over those "
        "common to all streams. The sums of single streams over their own believable minutes "
        "stand under `streams`. Nothing is scaled up for missing time."
    ),
    "ratios": (
        "An efficiency is the ratio of energies over the minutes common to its numerator and denominator."
    ),
    "basis": (
        "Efficiencies are on the lower heating value; fuel_in_higher_kWh is the same fuel on the higher one."
    ),
    "power_in_kWh": "Sensible heat of the combustion air against 25 degC: negative, and in no efficiency.",
    "ceiling": (
        "Fuel exergy over lower heating value, 104 %; the second law demands no rejection of a "
        "combustion engine."
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
    "hours": (
        "The breaker is closed through the ramps, so it runs a little longer than the timetable's 680 hours."
    ),
}


def true_powers(month: GasEngineMonth) -> dict[str, Array]:
    """Collect the true powers, kW."""
    return {
        "gas": month.fuel_kW,
        "gas_higher": month.fuel_higher_kW,
        "air": month.air_kW,
        "power": month.power_kW,
        "own_use": month.own_kW,
        "hot_water": month.hot_kW,
        "exhaust": month.exhaust_kW,
        "stack": month.stack_kW,
        "low_water": month.low_kW,
        "casing": month.casing_kW + month.warming_kW,
        "generator": month.generator_kW,
        "unburnt": month.unburnt_kW,
    }


def tick_mean(values: Array) -> Array:
    """Mean of the two ends of each minute."""
    return 0.5 * (values[:-1] + values[1:])


def metered_gas(readings: Readings) -> Array:
    """Compute normal cubic metres of each minute from the readings; NaN through the exchange."""
    amounts = np.diff(readings.values["GM-01"])
    amounts = np.where(amounts < 0.0, np.nan, amounts)
    station_kPa = 101.325 * math.exp(-9.80665 * ALTITUDE_M / (287.05 * 288.15))
    gauge = tick_mean(bridged(readings.values["GM-02"], GAS_HOLD_MINUTES))
    temperature = tick_mean(bridged(readings.values["GM-03"], GAS_HOLD_MINUTES))
    reduction = (station_kPa + 100.0 * gauge) / 101.325 * ZERO_CELSIUS_K / (temperature + ZERO_CELSIUS_K)
    return amounts * reduction


def metered_flue_gas(readings: Readings, normal_m3: Array) -> tuple[Array, Array]:
    """Compute flue gas and combustion air of each minute, kg, from the fuel and the dry oxygen."""
    oxygen = np.minimum(tick_mean(readings.values["EX-O2"]), 20.9)
    excess = oxygen / (OXYGEN_IN_AIR_PCT - oxygen) * DECLARED_DRY_FLUE_GAS / DECLARED_AIR_DEMAND
    air = normal_m3 * DECLARED_AIR_DEMAND * AIR_DENSITY_NORMAL * (1.0 + excess)
    # At standstill oxygen stands at that of air and the quotient grows without meaning: creeping gas
    # burns nothing.
    air = np.where(oxygen > 20.0, 0.0, air)
    return air + normal_m3 * DECLARED_FUEL_DENSITY, air


def metered_water(readings: Readings, circuit: str) -> Array:
    """Compute the heat power of a water circuit, its flow meter in the supply."""
    flow, supply, back = (
        bridged(readings.values[f"{circuit}-{end}"], WATER_HOLD_MINUTES) for end in ("F", "S", "R")
    )
    if circuit == "LT":
        flow = np.where(np.abs(flow) < CUT_OFF_M3_PER_H, 0.0, flow)
    if circuit == "HT":
        back = np.where(within(readings.minutes, *FROZEN_RETURN), np.nan, back)
    return (
        flow / 3600.0 * water_density(supply) * (water_enthalpy_or_nan(supply) - water_enthalpy_or_nan(back))
    )


def water_enthalpy_or_nan(temperature_C: Array) -> Array:
    """Water enthalpy that keeps missing readings missing."""
    return np.where(np.isnan(temperature_C), np.nan, water_enthalpy(np.nan_to_num(temperature_C)))


def metered_energies(readings: Readings) -> dict[str, Array]:
    """Compute energies of each minute from the readings, kWh; NaN: not believable."""
    minutes = readings.minutes[:-1]
    normal_m3 = metered_gas(readings)
    lower = np.where(minutes >= NEW_GAS, SHEET[1][1], SHEET[0][1])
    higher = np.where(minutes >= NEW_GAS, SHEET[1][2], SHEET[0][2])
    gas = normal_m3 * lower
    flue_kg, air_kg = metered_flue_gas(readings, normal_m3)
    hot = FLUE_GAS.enthalpy(tick_mean(readings.values["EX-1"]))
    cool = FLUE_GAS.enthalpy(tick_mean(readings.values["EX-2"]))
    outdoor = tick_mean(readings.values["AMB-T"])
    power = np.diff(readings.values["GN-01"])
    return {
        "gas": gas,
        "gas_higher": normal_m3 * higher,
        "air": air_kg * AIR_HEAT_CAPACITY * (outdoor - REFERENCE_C) / 3600.0,
        "power": power,
        "own_use": np.diff(readings.values["GN-02"]),
        "hot_water": minute_energy_kWh(metered_water(readings, "HT")),
        "exhaust": flue_kg * (hot - cool) / 3600.0,
        "stack": flue_kg * (cool - FLUE_GAS.enthalpy(REFERENCE_C)) / 3600.0,
        "low_water": minute_energy_kWh(metered_water(readings, "LT")),
        "casing": CASING_SHARE * gas,
        "generator": GENERATOR_SHARE * power,
        "unburnt": UNBURNT_SHARE * gas,
    }


def engine_figures(ledger: Ledger) -> dict[str, Any]:
    """Figures of the engine."""
    net = {"power": 1.0, "own_use": -1.0}
    useful = {"hot_water": 1.0, "exhaust": 1.0}
    lost = {"casing": 1.0, "generator": 1.0, "unburnt": 1.0}
    implied = {"gas": 1.0, "air": 1.0, "power": -1.0, **{name: -1.0 for name in (*useful, *lost)}}
    rejected = {"stack": 1.0, "low_water": 1.0}
    return {
        "fuel_in_kWh": ledger.energy({"gas": 1.0}, "lower heating value"),
        "fuel_in_higher_kWh": ledger.energy({"gas_higher": 1.0}),
        "power_in_kWh": ledger.energy({"air": 1.0}, "combustion air against 25 degC"),
        "work_gross_kWh": ledger.energy({"power": 1.0}),
        "own_use_kWh": ledger.energy({"own_use": 1.0}),
        "work_net_kWh": ledger.energy(net),
        "useful_heat_kWh": ledger.energy(useful),
        "rejected_kWh": ledger.energy(implied),
        "rejected_measured_kWh": ledger.energy(rejected),
        "loss_kWh": ledger.energy(
            lost, "true: with the misfire's unburnt fuel; as metered: the declared shares"
        ),
        "residual_kWh": ledger.energy(implied | {name: -1.0 for name in rejected}),
        "gross_pct": ledger.ratio({"power": 1.0}, "gas"),
        "net_pct": ledger.ratio(net, "gas"),
        "heat_pct": ledger.ratio(useful, "gas"),
        "total_pct": ledger.ratio({"power": 1.0} | useful, "gas"),
        "ceiling_pct": ledger.ratio(
            {"gas": EXERGY_OVER_LOWER}, "gas", "fuel exergy over lower heating value"
        ),
    }


def truth_of(month: GasEngineMonth, readings: Readings) -> dict[str, Any]:
    """Build the whole of truth.json."""
    first = int(np.flatnonzero(month.minutes == MONTH_START)[0])
    last = int(np.flatnonzero(month.minutes == MONTH_END)[0])
    ticks = slice(first, last)
    true = {name: minute_energy_kWh(power)[ticks] for name, power in true_powers(month).items()}
    metered = {name: energy[ticks] for name, energy in metered_energies(readings).items()}
    running = month.running[ticks]
    ledger = Ledger(true, metered, ~running)
    machine = machine_entry(engine_figures(ledger), ledger, tuple(true), running)
    return {
        "site": "Quillmere Dairy Works",
        "period": period_entry(MONTH_START, MONTH_END, ZONE),
        "seed": SEED,
        "how": HOW,
        "machines": {"engine": machine},
        "faults": numbered(faults_of(month)),
        "instruments": instrument_entries(INSTRUMENTS, readings.biases),
        "properties": {
            "heating_value_true_over_declared": HEATING_VALUE_FACTOR,
            "air_demand_true": AIR_DEMAND,
            "dry_flue_gas_true": DRY_FLUE_GAS,
            "compressibility_ratio_true": COMPRESSIBILITY_RATIO,
            "barometer_mean_kPa": round(float(month.barometer_kPa[ticks].mean()), 4),
        },
        "clean_days": [f"2025-10-{day:02d}" for day in (1, 2, 3, 6, 7, 8)],
        "days": by_local_day(
            month.minutes[ticks], ZONE, {f"{name}_kWh": energy for name, energy in true.items()}
        ),
    }
