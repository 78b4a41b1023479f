"""The true plant of Emberlund: what the furnace, the coil and the engine really did, minute by minute.

Every quantity is the state at a whole minute. Where the nominal figures of such a plant leave a choice,
it is made here:

* One degree of condensing temperature costs 10.5 kW. A fan that stands still raises it by 9 K and costs
  95 kW, and a warm afternoon costs the same per kelvin. Below 15 degC the fans slow down and hold the
  condensing temperature.
* The oil pump puts 40 kW of heat into the oil and the pipes between coil and engine lose as much, so
  the oil heat is the same at both ends of the loop. The fans sit behind the air outlet sensors: their
  heat is not in CA-T2.
* The coil's metal and its oil form one store between exhaust and oil (18 minutes). It is what damps the
  furnace's reversals; its term is part of the coil's first law and its change over the month is nearly
  nothing.
* The furnace hold is from 20:30 on 6 July to 05:40 on 7 July; the engine stands still for nine hours of
  it.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
from fluid_properties import ZERO_CELSIUS_K, LinearHeatCapacity, entropy_change
from logger_tools import Array, Mask, Minutes, clock_minutes, minute_of, ramp, slow_wander

SEED = 20260701
ZONE = ZoneInfo("Europe/Stockholm")
MARGIN_MINUTES = 180  # simulated before and after the month, so that exports may have natural ends

# True heat capacities, equal to the plant file's constants at the mid points. As the coil fouls, the oil's
# mean temperature falls by 9 K: -0.3 % in the mean of the month (declared standard 0.5 %), -0.7 % at its
# end. The exhaust's rises by 11 K: +0.2 % (1 %). Air moves by 0.05 % between 15 and 35 degC (0.2 %).
OIL = LinearHeatCapacity(2.35, 230.0, 8.0e-4)
EXHAUST = LinearHeatCapacity(1.12, 327.5, 1.6e-4)
AIR = LinearHeatCapacity(1.006, 23.5, 5.0e-5)

NOMINAL_OIL_HEAT_KW = 4865.0
OIL_FLOW_KG_PER_S = 23.0
EXHAUST_FLOW_KG_PER_S = 18.0
AIR_FLOW_KG_PER_S = 226.0
CASING_SHARE = 0.015
DRIVE_LOSS_SHARE = 0.05
STORE_MINUTES = 18.0
CLEAN_EFFECTIVENESS = (450.0 - 205.0) / (450.0 - 185.0)
FOULED_EFFECTIVENESS = (450.0 - 228.0) / (450.0 - 180.4)  # on 31 July: oil 262/180.4 degC, 4476 kW given
NOMINAL_EFFICIENCY = 1000.0 / NOMINAL_OIL_HEAT_KW
KW_PER_KELVIN_OF_CONDENSING = 10.5


def local(day: int, hour: int = 0, minute: int = 0, month: int = 7) -> int:
    """Minute of a local wall-clock moment in July 2026 (or another month)."""
    return minute_of(datetime(2026, month, day, hour, minute, tzinfo=ZONE))


MONTH_START = local(1)
MONTH_END = local(1, month=8)
HOLD = (local(6, 20, 30), local(7, 5, 40))
FAN_OFF = (local(11, 13), local(14, 9))
CLEAR_DAYS = (9, 10, 12, 13, 19, 20, 24, 25, 26, 30)


@dataclass(frozen=True)
class Scenario:
    """What happens in the month.

    With both switched off the plant stands at its nominal point apart from the reversals.
    """

    faults: bool = True
    weather: bool = True


@dataclass(frozen=True)
class WasteHeatMonth:
    """True states at whole minutes, kW, kg/s and degC."""

    minutes: Minutes
    running: Mask
    outdoor_C: Array
    exhaust_in_C: Array
    exhaust_out_C: Array
    exhaust_flow: Array
    exhaust_kW: Array
    casing_kW: Array
    stored_kW: Array
    oil_hot_C: Array
    oil_cold_C: Array
    oil_flow: Array
    oil_kW: Array
    gross_kW: Array
    own_kW: Array
    feed_kW: Array
    drive_kW: Array
    air_flow: Array
    air_out_C: Array
    air_kW: Array
    condensing_bar: Array

    def coil_closure_kW(self) -> Array:
        """First law of the coil; zero but for rounding."""
        return self.exhaust_kW - self.casing_kW - self.stored_kW - self.oil_kW

    def engine_closure_kW(self) -> Array:
        """First law of the engine; zero but for rounding."""
        return self.oil_kW + self.feed_kW - self.gross_kW - self.drive_kW - self.air_kW

    def coil_entropy_kW_per_K(self) -> Array:
        """Entropy generated in the coil: casing heat leaves at outdoor temperature, the store is oil-hot."""
        given = self.exhaust_flow * entropy_change(EXHAUST.enthalpy, self.exhaust_in_C, self.exhaust_out_C)
        taken = self.oil_flow * entropy_change(OIL.enthalpy, self.oil_cold_C, self.oil_hot_C)
        store = self.stored_kW / (self.oil_hot_C + ZERO_CELSIUS_K)
        return given + taken + store + self.casing_kW / (self.outdoor_C + ZERO_CELSIUS_K)

    def engine_entropy_kW_per_K(self) -> Array:
        """Entropy generated in the engine, its drive losses leaving at outdoor temperature."""
        given = self.oil_flow * entropy_change(OIL.enthalpy, self.oil_hot_C, self.oil_cold_C)
        taken = self.air_flow * entropy_change(AIR.enthalpy, self.outdoor_C, self.air_out_C)
        return given + taken + self.drive_kW / (self.outdoor_C + ZERO_CELSIUS_K)


def outdoor_temperature(minutes: Minutes, scenario: Scenario) -> Array:
    """Air temperature: day means that wander, a daily wave that is larger on clear days, gusts."""
    if not scenario.weather:
        return np.full(len(minutes), 15.0)
    shown = clock_minutes(minutes, ZONE)
    hour = (shown % 1440) / 60.0
    day_means = 16.8 + 2.4 * slow_wander(SEED, "day mean", minutes, 2600)
    days = np.arange(0, 34)
    clear = np.array([6.5 if day in CLEAR_DAYS else 3.6 for day in days])
    day_place = (shown - clock_minutes(np.array([MONTH_START]), ZONE)[0]) / 1440.0 + 1.0
    amplitude = np.interp(day_place, days + 0.5, clear)
    wave = np.cos(2.0 * np.pi * (hour - 15.5) / 24.0) + 0.15 * np.cos(4.0 * np.pi * (hour - 14.0) / 24.0)
    air: Array = day_means + amplitude * wave + 0.25 * slow_wander(SEED, "gusts", minutes, 9)
    return air


def furnace_temperature(minutes: Minutes, scenario: Scenario) -> Array:
    """Exhaust temperature before the coil: saw-tooth of the 20-minute reversals, 380 degC when held."""
    phase = (minutes % 20).astype(float)
    saw = np.where(phase <= 18.0, phase / 9.0 - 1.0, 1.0 - (phase - 18.0))
    hold = hold_depth(minutes, scenario)
    drift = 2.0 * slow_wander(SEED, "glass pull", minutes, 700) if scenario.weather else 0.0
    return 450.0 - 70.0 * hold + (15.0 - 9.0 * hold) * saw + drift


def hold_depth(minutes: Minutes, scenario: Scenario) -> Array:
    """1 while the furnace is held, 0 otherwise, 40-minute flanks."""
    if not scenario.faults:
        return np.zeros(len(minutes))
    return ramp(minutes, HOLD[0] - 20, 40) - ramp(minutes, HOLD[1] - 10, 40)


def opening(minutes: Minutes, scenario: Scenario) -> Array:
    """Share of the exhaust that goes through the coil: 0 with open bypass, 10 min down, 45 min up."""
    if not scenario.faults:
        return np.ones(len(minutes))
    return 1.0 - ramp(minutes, HOLD[0], 10) + ramp(minutes, HOLD[1], 45)


def coil(minutes: Minutes, scenario: Scenario) -> dict[str, Array]:
    """Exhaust coil with fouling and one heat store; steps through the minutes."""
    count = len(minutes)
    inlet = furnace_temperature(minutes, scenario)
    share = opening(minutes, scenario)
    swing = 1.0 + 0.012 * slow_wander(SEED, "draught", minutes, 90) if scenario.weather else np.ones(count)
    flow = EXHAUST_FLOW_KG_PER_S * share * swing
    age = np.clip((minutes - MONTH_START) / (MONTH_END - MONTH_START), 0.0, 1.0) * scenario.faults
    effectiveness = CLEAN_EFFECTIVENESS + age * (FOULED_EFFECTIVENESS - CLEAN_EFFECTIVENESS)

    outlet, oil_heat, cold = np.empty(count), np.empty(count), np.empty(count)
    stored_kWmin = NOMINAL_OIL_HEAT_KW * STORE_MINUTES
    inlet_enthalpy = EXHAUST.enthalpy(inlet)
    for now in range(count):
        oil_heat[now] = share[now] * stored_kWmin / STORE_MINUTES
        cold[now] = 185.0 + 0.0101 * (oil_heat[now] - NOMINAL_OIL_HEAT_KW)
        outlet[now] = inlet[now] - effectiveness[now] * (inlet[now] - cold[now])
        given = flow[now] * (inlet_enthalpy[now] - float(EXHAUST.enthalpy(outlet[now])))
        stored_kWmin += (1.0 - CASING_SHARE) * given - oil_heat[now]
    exhaust_kW = flow * (inlet_enthalpy - EXHAUST.enthalpy(outlet))
    casing_kW = CASING_SHARE * exhaust_kW
    return {
        "exhaust_in_C": inlet,
        "exhaust_out_C": outlet,
        "exhaust_flow": flow,
        "exhaust_kW": exhaust_kW,
        "casing_kW": casing_kW,
        "stored_kW": exhaust_kW - casing_kW - oil_heat,
        "oil_kW": oil_heat,
        "oil_cold_C": cold,
    }


def standstill_oil(hot: Array, cold: Array, oil_flow: Array) -> tuple[Array, Array]:
    """Oil temperatures at the sensors: while the pump stands both cool slowly and carry no heat."""
    hot, cold = hot.copy(), cold.copy()
    for now in np.flatnonzero(oil_flow == 0.0):
        hot[now] = hot[now - 1] + (150.0 - hot[now - 1]) / 400.0
        cold[now] = cold[now - 1] + (130.0 - cold[now - 1]) / 500.0
    return hot, cold


def simulate(scenario: Scenario | None = None) -> WasteHeatMonth:
    """Simulate the true month, with three hours before and after it."""
    scenario = scenario or Scenario()
    minutes = np.arange(MONTH_START - MARGIN_MINUTES, MONTH_END + MARGIN_MINUTES + 1, dtype=np.int64)
    parts = coil(minutes, scenario)
    outdoor = outdoor_temperature(minutes, scenario)
    heat = parts["oil_kW"]
    load = heat / NOMINAL_OIL_HEAT_KW
    turning = heat > 0.0
    oil_flow = np.where(turning, OIL_FLOW_KG_PER_S, 0.0)
    hot = OIL.temperature(OIL.enthalpy(parts["oil_cold_C"]) + heat / OIL_FLOW_KG_PER_S)
    hot, cold = standstill_oil(hot, parts["oil_cold_C"], oil_flow)

    fan_off = (
        ramp(minutes, FAN_OFF[0], 12) - ramp(minutes, FAN_OFF[1], 12)
        if scenario.faults
        else np.zeros(len(minutes))
    )
    condenser_air = outdoor + 9.0 * fan_off
    derating = KW_PER_KELVIN_OF_CONDENSING * np.maximum(condenser_air - 15.0, 0.0) * load
    part_load = 1.0 - 0.35 * (1.0 - np.minimum(load, 1.0)) ** 2
    ideal = NOMINAL_EFFICIENCY * heat * (1.0 + 0.00223 * (hot - 275.0)) * part_load
    running = load > 0.12
    gross = np.where(running, np.maximum(ideal - derating, 0.0), 0.0)
    drive = DRIVE_LOSS_SHARE * gross

    feed_electric = 55.0 * load
    feed = 50.0 * load
    fan_speed = np.clip(1.0 - 0.02 * np.maximum(15.0 - outdoor, 0.0), 0.7, 1.0) * np.clip(
        load * 2.0, 0.2, 1.0
    )
    air_flow = np.where(turning, AIR_FLOW_KG_PER_S * fan_speed * (1.0 - 0.22 * fan_off), 0.0)
    fans = np.where(turning, 65.0 * fan_speed**3 * (1.0 - 0.25 * fan_off), 0.0)
    own = np.where(
        turning, feed_electric + 40.0 + fans, 12.0
    )  # 12 kW stand-by: controls and oil trace heating
    air = heat + feed - gross - drive
    air_out = AIR.temperature(AIR.enthalpy(outdoor) + air / np.maximum(air_flow, 1e-9) * turning)
    return WasteHeatMonth(
        minutes=minutes,
        running=running,
        outdoor_C=outdoor,
        oil_hot_C=hot,
        oil_flow=oil_flow,
        gross_kW=gross,
        own_kW=own,
        feed_kW=feed,
        drive_kW=drive,
        air_flow=air_flow,
        air_out_C=air_out,
        air_kW=air,
        condensing_bar=1.10 * (1.0 + 0.035 * np.where(turning, condenser_air - 15.0, -22.0)),
        **(parts | {"oil_cold_C": cold}),
    )
