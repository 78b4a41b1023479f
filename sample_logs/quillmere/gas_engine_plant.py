"""The true plant of Quillmere: what the gas engine really did, minute by minute.

Every quantity is the state at a whole minute. Where the nominal figures of such a plant leave a choice,
it is made here:

* Combustion air comes from outdoors. At 11 degC it brings 24 kW less than air at the 25 degC reference;
  the charge-air cooler has that much less to do, so the low-temperature circuit carries about 46 kW at
  full load, not 70 kW.
* 1.80 kg/s of exhaust at full load needs 9.75 % of dry oxygen (9.5 % would give 1.76 kg/s). The flow is
  kept.
* The exhaust leaves the turbocharger at 420 degC (430 degC at part load); the cylinders' own exhaust is
  125 K hotter, which is what the turbine takes out.
* Casing heat is 75 kW at full and 60 kW at part load: nearly independent of load, as a warm block's is.
* At 40 m altitude the gas needs 269.9 m3/h of operating volume at full load (268.8 m3/h would be at sea
  level).
* Heat that warms the exhaust path after a start is lost again at standstill; it is booked as a loss at
  once, so the plant has no store.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
from fluid_properties import (
    ZERO_CELSIUS_K,
    LinearHeatCapacity,
    entropy_change,
    water_density,
    water_enthalpy,
    water_temperature,
)
from logger_tools import Array, Mask, Minutes, clock_minutes, minute_of, ramp, slow_wander

SEED = 20251001
ZONE = ZoneInfo("Europe/Copenhagen")
MARGIN_MINUTES = 180
RAMP_MINUTES = (
    15  # start, stop and load changes; centred on the full hour, so that energies equal the timetable's
)

# True properties and what the plant file declares for them: flue gas 1.10 kJ/(kg K) within 1 % (true mean
# between 120 and 420 degC 1.100, between 25 and 120 degC 1.087), air demand 9.6 within 1 %,
# compressibility 1.000 within 0.001, heating values within 0.4 %.
FLUE_GAS = LinearHeatCapacity(1.10, 270.0, 6.0e-5)
AIR_HEAT_CAPACITY = 1.006
AIR_DENSITY_NORMAL = 1.2929
AIR_DEMAND = 9.63
DRY_FLUE_GAS = 8.62
FUEL_DENSITY_NORMAL = 0.78
COMPRESSIBILITY_RATIO = 1.0003
HEATING_VALUE_FACTOR = 1.0012  # true over supplier's sheet
OXYGEN_IN_AIR_PCT = 20.95
REFERENCE_C = 25.0
EXERGY_OVER_LOWER = 1.04

RATED_KW = 1200.0
PART_KW = 720.0
FULL_FUEL_KW = 2857.0
EXHAUST_FULL_KG_PER_S = 1.80
HOT_WATER_KG_PER_S = 8.60
LOW_WATER_KG_PER_S = 4.131  # 15 m3/h at 42 degC
STATION_PRESSURE_KPA = 101.325 * (1.0 - 0.0065 * 40.0 / 288.15) ** 5.25588


def local(day: int, hour: int = 0, minute: int = 0, month: int = 10) -> int:
    """Minute of a local wall-clock moment in October 2025 (or another month)."""
    return minute_of(datetime(2025, month, day, hour, minute, tzinfo=ZONE))


MONTH_START = local(1)
MONTH_END = local(1, month=11)
MISFIRE = (local(9), MONTH_END)
NEW_GAS = local(16)
BYPASS_OPEN = (local(18, 14), MONTH_END)
BYPASS_SHARE = 0.30
RETURN_WARMER = (local(13, 5), local(14, 12))
RETURN_WARMER_K = 2.25
SHEET = ((MONTH_START, 10.10, 11.20), (NEW_GAS, 9.965, 11.05))  # from, lower, higher, kWh per normal m3


@dataclass(frozen=True)
class Scenario:
    """What happens in the month: machine faults and the change of gas quality."""

    faults: bool = True


@dataclass(frozen=True)
class GasEngineMonth:
    """True states at whole minutes: kW, kg/s, m3/h, degC."""

    minutes: Minutes
    running: Mask
    misfire: Array
    outdoor_C: Array
    fuel_kW: Array
    fuel_higher_kW: Array
    normal_m3_per_h: Array
    operating_m3_per_h: Array
    gas_gauge_bar: Array
    gas_C: Array
    barometer_kPa: Array
    power_kW: Array
    own_kW: Array
    air_kW: Array
    generator_kW: Array
    casing_kW: Array
    unburnt_kW: Array
    warming_kW: Array
    exhaust_flow: Array
    oxygen_pct: Array
    exhaust_hot_C: Array
    exhaust_cool_C: Array
    exhaust_kW: Array
    stack_kW: Array
    hot_flow: Array
    hot_supply_C: Array
    hot_return_C: Array
    hot_kW: Array
    low_flow: Array
    low_supply_C: Array
    low_return_C: Array
    low_kW: Array

    def closure_kW(self) -> Array:
        """First law; zero but for rounding."""
        entering = self.fuel_kW + self.air_kW
        useful = self.hot_kW + self.exhaust_kW
        lost = self.generator_kW + self.casing_kW + self.unburnt_kW + self.warming_kW
        return entering - self.power_kW - useful - self.stack_kW - self.low_kW - lost

    def entropy_kW_per_K(self) -> Array:
        """Entropy generated: exergy of the burnt fuel less that of work and heat, over T_ref.

        Losses to the surroundings and the air near the reference carry no exergy here.
        """
        reference_K = REFERENCE_C + ZERO_CELSIUS_K
        reference = np.full(len(self.minutes), REFERENCE_C)

        def exergy(heat: Array, entropy_flow: Array) -> Array:
            return heat - reference_K * entropy_flow

        hot = self.hot_flow * entropy_change(water_enthalpy, self.hot_return_C, self.hot_supply_C)
        low = self.low_flow * entropy_change(water_enthalpy, self.low_return_C, self.low_supply_C)
        gas = self.exhaust_flow * entropy_change(FLUE_GAS.enthalpy, reference, self.exhaust_hot_C)
        leaving = self.power_kW + exergy(self.hot_kW, hot) + exergy(self.low_kW, low)
        leaving = leaving + exergy(self.exhaust_kW + self.stack_kW, gas)
        return (EXERGY_OVER_LOWER * (self.fuel_kW - self.unburnt_kW) - leaving) / reference_K


def timetable_kW(minutes: Minutes) -> Array:
    """Weekdays full load 06-22 and 60 % at night; weekends full load 06-22, stopped at night."""
    shown = clock_minutes(minutes, ZONE)
    hour = (shown % 1440) // 60
    weekday = (shown // 1440 + 3) % 7 < 5  # 1 January 1970 was a Thursday
    day = (hour >= 6) & (hour < 22)
    wanted = np.where(day, RATED_KW, np.where(weekday, PART_KW, 0.0))
    half = RAMP_MINUTES // 2
    padded = np.concatenate([np.full(half, wanted[0]), wanted, np.full(half, wanted[-1])])
    return (
        sum((padded[k : k + len(wanted)] for k in range(RAMP_MINUTES)), start=np.zeros(len(wanted)))
        / RAMP_MINUTES
    )


def minutes_since(flags: Mask) -> Array:
    """Minutes since the flag was last False; large where it has been True from the beginning."""
    index = np.arange(len(flags))
    last_false = np.maximum.accumulate(np.where(flags, -100_000, index))
    return (index - last_false).astype(float)


def cooling_down(values: Array, running: Mask, towards: Array | float, time_constant: float) -> Array:
    """At standstill a temperature falls from its last running value towards the surroundings."""
    index = np.arange(len(values))
    last_run = np.maximum.accumulate(np.where(running, index, 0))
    share = np.exp(-(index - last_run) / time_constant)
    return np.where(running, values, towards + (values[last_run] - towards) * share)


def gas_supply(minutes: Minutes, normal_m3_per_h: Array) -> dict[str, Array]:
    """Pressure, temperature and barometer at the meter, and the operating volume they give."""
    gauge = 0.10 + 0.002 * slow_wander(SEED, "governor", minutes, 240)
    temperature = 12.0 + 1.2 * slow_wander(SEED, "gas pipe", minutes, 1500)
    barometer = STATION_PRESSURE_KPA - 0.15 + 0.65 * slow_wander(SEED, "barometer", minutes, 2100)
    expansion = 101.325 / (barometer + 100.0 * gauge) * (temperature + ZERO_CELSIUS_K) / ZERO_CELSIUS_K
    return {
        "gas_gauge_bar": gauge,
        "gas_C": temperature,
        "barometer_kPa": barometer,
        "operating_m3_per_h": normal_m3_per_h * expansion / COMPRESSIBILITY_RATIO,
    }


def exhaust_side(minutes: Minutes, scenario: Scenario, power: Array, outdoor: Array) -> dict[str, Array]:
    """Fuel, air and exhaust at a given power."""
    running = power > 0.0
    misfire = (minutes >= MISFIRE[0]) * 1.0 * running * scenario.faults
    plain_fuel = np.where(running, 272.0 + (FULL_FUEL_KW - 272.0) * power / RATED_KW, 0.0)
    full_extra, part_extra = RATED_KW / 0.406 - FULL_FUEL_KW, PART_KW / 0.382 - 1823.0
    slope = (full_extra - part_extra) / (RATED_KW - PART_KW)
    extra = misfire * (full_extra + slope * (power - RATED_KW))
    fuel = plain_fuel + extra
    lower = np.where((minutes >= NEW_GAS) & scenario.faults, SHEET[1][1], SHEET[0][1])
    higher = np.where((minutes >= NEW_GAS) & scenario.faults, SHEET[1][2], SHEET[0][2])
    normal = fuel / (lower * HEATING_VALUE_FACTOR)
    fuel_flow = normal / 3600.0 * FUEL_DENSITY_NORMAL
    full_fuel_flow = FULL_FUEL_KW / (SHEET[0][1] * HEATING_VALUE_FACTOR) / 3600.0 * FUEL_DENSITY_NORMAL
    air_flow = (EXHAUST_FULL_KG_PER_S - full_fuel_flow) * plain_fuel / FULL_FUEL_KW
    demand = np.maximum(normal, 1e-9) / 3600.0 * AIR_DEMAND * AIR_DENSITY_NORMAL
    excess = (air_flow / demand - 1.0) * AIR_DEMAND / DRY_FLUE_GAS
    oxygen = np.where(running, OXYGEN_IN_AIR_PCT * excess / (1.0 + excess), 20.9)

    flow = air_flow + fuel_flow
    steady_hot = 430.0 - 10.0 * (power - PART_KW) / (RATED_KW - PART_KW)
    healthy_gain = flow * (FLUE_GAS.enthalpy(steady_hot + 22.0) - FLUE_GAS.enthalpy(steady_hot)) * misfire
    steady_hot = steady_hot + 22.0 * misfire
    warm = 1.0 - np.exp(-minutes_since(running) / 5.0)
    hot = np.where(running, outdoor + 30.0 + (steady_hot - outdoor - 30.0) * warm, 0.0)
    bypass = BYPASS_SHARE * ramp(minutes, BYPASS_OPEN[0], 3) * scenario.faults
    cool = np.minimum(hot, 120.0 + bypass * np.maximum(hot - 120.0, 0.0))
    return {
        "misfire": misfire,
        "fuel_kW": fuel,
        "fuel_higher_kW": fuel * higher / lower,
        "normal_m3_per_h": normal,
        "air_kW": air_flow * AIR_HEAT_CAPACITY * (outdoor - REFERENCE_C),
        "unburnt_kW": 0.012 * plain_fuel + extra - healthy_gain - misfire * 10.0 * power / RATED_KW,
        "warming_kW": flow * (FLUE_GAS.enthalpy(steady_hot) - FLUE_GAS.enthalpy(hot)),
        "exhaust_flow": flow,
        "oxygen_pct": oxygen,
        "exhaust_hot_C": cooling_down(hot, running, outdoor + 15.0, 90.0),
        "exhaust_cool_C": cooling_down(cool, running, outdoor + 10.0, 120.0),
        "exhaust_kW": flow * (FLUE_GAS.enthalpy(hot) - FLUE_GAS.enthalpy(cool)),
        "stack_kW": flow * (FLUE_GAS.enthalpy(cool) - FLUE_GAS.enthalpy(REFERENCE_C)),
    }


def water_side(
    minutes: Minutes, running: Mask, hot_kW: Array, low_kW: Array, outdoor: Array
) -> dict[str, Array]:
    """Temperatures and flows of the jacket and the low-temperature circuit."""
    warmer = RETURN_WARMER_K * (ramp(minutes, RETURN_WARMER[0], 30) - ramp(minutes, RETURN_WARMER[1], 30))
    returned = 72.0 + 0.5 * slow_wander(SEED, "dairy return", minutes, 180) + warmer
    pumped = running | (minutes_since(~running) <= 10.0)
    supplied = water_temperature(water_enthalpy(returned) + hot_kW / HOT_WATER_KG_PER_S)
    low_return = 38.0 + 0.12 * (outdoor - 11.0) + 0.3 * slow_wander(SEED, "cooler", minutes, 60)
    low_supply = water_temperature(water_enthalpy(low_return) + low_kW / LOW_WATER_KG_PER_S)
    return {
        "hot_flow": np.where(pumped, HOT_WATER_KG_PER_S, 0.0),
        "hot_supply_C": cooling_down(supplied, pumped, 45.0, 700.0),
        "hot_return_C": cooling_down(returned, pumped, 42.0, 600.0),
        "low_flow": np.where(running, LOW_WATER_KG_PER_S, 0.0),
        "low_supply_C": cooling_down(low_supply, running, 20.0, 300.0),
        "low_return_C": cooling_down(low_return, running, 18.0, 300.0),
    }


def outdoor_temperature(minutes: Minutes) -> Array:
    """Air temperature in the intake duct: October, falling by 3 K over the month."""
    hour = (clock_minutes(minutes, ZONE) % 1440) / 60.0
    age = (minutes - MONTH_START) / (MONTH_END - MONTH_START)
    daily = 2.8 * np.cos(2.0 * np.pi * (hour - 15.0) / 24.0)
    return (
        12.3
        - 3.0 * age
        + 1.8 * slow_wander(SEED, "weather", minutes, 2300)
        + daily
        + 0.2 * slow_wander(SEED, "gusts", minutes, 9)
    )


def simulate(scenario: Scenario | None = None) -> GasEngineMonth:
    """Simulate the true month, with three hours before and after it."""
    scenario = scenario or Scenario()
    minutes = np.arange(MONTH_START - MARGIN_MINUTES, MONTH_END + MARGIN_MINUTES + 1, dtype=np.int64)
    outdoor = outdoor_temperature(minutes)
    power = timetable_kW(minutes)
    power = power * (1.0 + 0.0012 * slow_wander(SEED, "governing", minutes, 5))
    running = power > 0.0
    gas_side = exhaust_side(minutes, scenario, power, outdoor)
    generator = 0.031 * power
    casing = np.where(running, 37.5 + 37.5 * power / RATED_KW, 0.0)
    hot_kW = (
        np.where(running, 85.0 + 575.0 * power / RATED_KW, 0.0)
        + 10.0 * gas_side["misfire"] * power / RATED_KW
    )
    gone = power + generator + casing + hot_kW + gas_side["unburnt_kW"] + gas_side["warming_kW"]
    low_kW = gas_side["fuel_kW"] + gas_side["air_kW"] - gone - gas_side["exhaust_kW"] - gas_side["stack_kW"]
    return GasEngineMonth(
        minutes=minutes,
        running=running,
        outdoor_C=outdoor,
        power_kW=power,
        own_kW=np.where(running, 13.5 + 22.5 * power / RATED_KW, 4.0),
        generator_kW=generator,
        casing_kW=casing,
        hot_kW=hot_kW,
        low_kW=low_kW,
        **gas_side,
        **gas_supply(minutes, gas_side["normal_m3_per_h"]),
        **water_side(minutes, running, hot_kW, low_kW, outdoor),
    )


def hot_volume_m3_per_h(month: GasEngineMonth) -> Array:
    """Volume flow of the jacket water where its meter sits, in the supply."""
    return month.hot_flow / water_density(month.hot_supply_C) * 3600.0


def low_volume_m3_per_h(month: GasEngineMonth) -> Array:
    """Volume flow of the low-temperature water where its meter sits, in the supply."""
    return month.low_flow / water_density(month.low_supply_C) * 3600.0
