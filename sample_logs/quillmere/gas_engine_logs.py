"""What the instruments and loggers of Quillmere made of the true month: errors, faults, and files.

Each instrument has a constant calibration error, drawn once within its declared standard uncertainty,
and white noise from sample to sample (gas 0.6 %, flow 0.5 %, temperature 0.2 K). Counters only ever
show whole steps.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import timedelta, timezone
from pathlib import Path

import numpy as np
from energy_ledger import Instrument, minute_energy_kWh
from gas_engine_plant import (
    MONTH_END,
    MONTH_START,
    RETURN_WARMER,
    SEED,
    ZONE,
    GasEngineMonth,
    hot_volume_m3_per_h,
    local,
    low_volume_m3_per_h,
)
from logger_tools import (
    Array,
    Mask,
    Minutes,
    calibration_bias,
    clock_minutes,
    decimals,
    iso_text,
    stream,
    white_noise,
    within,
    write_gzip,
    write_text,
    write_zip,
)

WINTER_TIME = timezone(timedelta(hours=1))

EXCHANGE = (local(5, 10, 10), local(5, 10, 50))  # last reading of the old gas meter, first one of the new
FROZEN_RETURN = RETURN_WARMER
FROZEN_RETURN_C = 72.0
OUTAGE = (local(20, 9), local(20, 14))
LATE_FILE = "engine/engine_2025-10-20_late.csv.gz"
LATE_FILE_ARRIVES = local(23, 8)
GAS_CREEP_M3_PER_H = 0.4
LOW_FLOW_OFFSET_M3_PER_H = -0.3
LOW_METER_SERVICE = (local(22, 10), local(22, 10, 14))
GAS_INDEX_OLD = 845_231.4
GAS_INDEX_NEW = 3.2
GENERATOR_INDEX = 4_182_337.0
AUXILIARY_INDEX = 131_774.6
CYLINDERS = 12
MISFIRING_CYLINDER = 7


INSTRUMENTS = {
    "GM-01": Instrument("factor", 0.006, 0.006, 1),
    "GM-01 new": Instrument("factor", 0.006, 0.006, 1),
    "GM-02": Instrument("offset", 0.002, 0.0005, 4),
    "GM-03": Instrument("offset", 0.3, 0.2, 1),
    "GN-01": Instrument("factor", 0.005, 0.003, 0),
    "GN-02": Instrument("factor", 0.01, 0.003, 1),
    "EX-1": Instrument("offset", 1.5, 0.2, 1),
    "EX-2": Instrument("offset", 1.5, 0.2, 1),
    "EX-O2": Instrument("offset", 0.2, 0.03, 2),
    "AMB-T": Instrument("offset", 0.5, 0.2, 1),
    "HT-F": Instrument("factor", 0.01, 0.005, 2),
    "HT-S": Instrument("offset", 0.25, 0.2, 1),
    "HT-R": Instrument("offset", 0.25, 0.2, 1),
    "LT-F": Instrument("factor", 0.01, 0.005, 2),
    "LT-S": Instrument("offset", 0.25, 0.2, 1),
    "LT-R": Instrument("offset", 0.25, 0.2, 1),
}


@dataclass(frozen=True)
class Readings:
    """Readings at whole minutes, already rounded; NaN where nothing or a status word stands."""

    minutes: Minutes
    values: dict[str, Array]
    biases: dict[str, float]
    words: dict[str, dict[int, str]]  # by tag, then row


def counter(start: float, step: float, amounts: Array) -> Array:
    """Read a register that shows whole steps only, one reading more than there are amounts."""
    total = np.concatenate([[0.0], np.cumsum(amounts)])
    return np.round(np.floor((start + total) / step + 1e-9) * step, 6)


def gas_counter(month: GasEngineMonth, biases: dict[str, float]) -> Array:
    """Read the gas index: creep at standstill, and an exchange on 5 October."""
    noise = white_noise(SEED, "GM-01", len(month.minutes) - 1, INSTRUMENTS["GM-01"].noise)
    creep = np.where(month.running, 0.0, GAS_CREEP_M3_PER_H)
    amounts = minute_energy_kWh(month.operating_m3_per_h + creep)  # m3/h to m3, as kW to kWh
    first = int(np.flatnonzero(month.minutes == EXCHANGE[1])[0])
    old = counter(GAS_INDEX_OLD, 0.1, amounts * (1.0 + biases["GM-01"] + noise))
    new = counter(GAS_INDEX_NEW, 0.1, amounts[first:] * (1.0 + biases["GM-01 new"] + noise[first:]))
    index = np.where(month.minutes <= EXCHANGE[0], old, np.nan)
    index[first:] = new
    return index


def read_instruments(month: GasEngineMonth) -> Readings:
    """Read every instrument, with the measurement faults of the month."""
    minutes = month.minutes
    count = len(minutes)
    true = {
        "GM-02": month.gas_gauge_bar,
        "GM-03": month.gas_C,
        "EX-1": month.exhaust_hot_C,
        "EX-2": month.exhaust_cool_C,
        "EX-O2": month.oxygen_pct,
        "AMB-T": month.outdoor_C,
        "HT-F": hot_volume_m3_per_h(month),
        "HT-S": month.hot_supply_C,
        "HT-R": month.hot_return_C,
        "LT-F": low_volume_m3_per_h(month),
        "LT-S": month.low_supply_C,
        "LT-R": month.low_return_C,
    }
    biases = {
        tag: calibration_bias(SEED, tag, instrument.standard) for tag, instrument in INSTRUMENTS.items()
    }
    values: dict[str, Array] = {}
    for tag, quantity in true.items():
        instrument = INSTRUMENTS[tag]
        noise = white_noise(SEED, tag, count, instrument.noise)
        values[tag] = np.round(instrument.reading(quantity, biases[tag], noise), instrument.places)
    stopped_reading = LOW_FLOW_OFFSET_M3_PER_H + white_noise(SEED, "LT-F zero", count, 0.02)
    values["LT-F"] = np.where(month.low_flow > 0.0, values["LT-F"], np.round(stopped_reading, 2))
    values["HT-R"][within(minutes, *FROZEN_RETURN)] = FROZEN_RETURN_C
    values["EX-O2"] = np.minimum(values["EX-O2"], 20.95)
    values["GM-01"] = gas_counter(month, biases)
    for tag, start, step, power in (
        ("GN-01", GENERATOR_INDEX, 1.0, month.power_kW),
        ("GN-02", AUXILIARY_INDEX, 0.1, month.own_kW),
    ):
        noise = white_noise(SEED, tag, count - 1, INSTRUMENTS[tag].noise)
        values[tag] = counter(start, step, minute_energy_kWh(power) * (1.0 + biases[tag] + noise))
    words = status_words(month)
    for tag, rows in words.items():
        for row, word in rows.items():
            values[tag][row] = 0.0 if word == "off" else np.nan
    for tag in ("GM-02", "GM-03"):
        values[tag][minutes % 5 != 0] = np.nan
    for tag in ("HT-F", "HT-S", "HT-R", "LT-F", "LT-S", "LT-R"):
        values[tag][minutes % 2 != 0] = np.nan
    return Readings(minutes, values, biases, words)


def status_words(month: GasEngineMonth) -> dict[str, dict[int, str]]:
    """List the boiler-house logger's words: 'off' for a standing pump, 'mangler' for a lost scan."""
    words: dict[str, dict[int, str]] = {"HT-F": {}, "HT-S": {}, "LT-F": {}}
    for row in np.flatnonzero(month.hot_flow == 0.0):
        words["HT-F"][int(row)] = "off"
    lost = stream(SEED, "lost scans").randint(0, len(month.minutes) // 2, 14) * 2
    for row in lost:
        words["HT-S"][int(row)] = "mangler"
    for row in np.flatnonzero(within(month.minutes, *LOW_METER_SERVICE)):
        words["LT-F"][int(row)] = "service"
    return words


def cylinder_texts(month: GasEngineMonth) -> list[list[str]]:
    """Write cylinder exhaust temperatures, whole degC.

    They lie 125 K above the turbocharger outlet; one cylinder is cold from 9 October.
    """
    texts = []
    for number in range(1, CYLINDERS + 1):
        own = float(stream(SEED, f"cylinder {number}").uniform(-12.0, 12.0))
        misfire = -90.0 if number == MISFIRING_CYLINDER else 5.0
        # The others rise by 5 K; the 22 K at the turbocharger outlet are fuel that burns late, in the
        # manifold.
        hot = np.where(
            month.running,
            month.exhaust_hot_C + 125.0 + own + (misfire - 22.0) * month.misfire,
            month.exhaust_hot_C,
        )
        wander = 2.0 * stream(SEED, f"cylinder noise {number}").standard_normal(len(month.minutes))
        texts.append(decimals(hot + wander * month.running, 0))
    return texts


def write_engine(folder: Path, month: GasEngineMonth, readings: Readings) -> None:
    """Write the controller export: one packed file a UTC day, five hours of 20 October in a late one."""
    tags = ["GN-01", "GN-02", "EX-1", "EX-2", "EX-O2", "AMB-T"]
    columns = [decimals(readings.values[tag], INSTRUMENTS[tag].places) for tag in tags]
    breaker = month.running.astype(int).tolist()
    cylinders = cylinder_texts(month)
    stamps = [text + ":00Z" for text in iso_text(readings.minutes)]
    names = [f"CYL-{number}" for number in range(1, CYLINDERS + 1)]
    heading = ",".join(["utc", *tags, "BKR", "DMP", *names])
    inside = within(readings.minutes, MONTH_START - 60, MONTH_END + 60)
    outage = within(readings.minutes, *OUTAGE)
    days = readings.minutes // 1440

    def rows(chosen: Mask) -> list[str]:
        lines = [heading]
        for i in np.flatnonzero(chosen):
            measured = ",".join(column[i] for column in columns)
            # DMP is the order to the bypass damper, not its position: it reads 0 all month.
            lines.append(
                f"{stamps[i]},{measured},{breaker[i]},0," + ",".join(texts[i] for texts in cylinders)
            )
        return lines

    for day in np.unique(days[inside]):
        date = str(np.datetime64(int(day), "D"))
        write_gzip(folder / "engine" / f"engine_{date}.csv.gz", rows(inside & (days == day) & ~outage))
    write_gzip(folder / LATE_FILE, rows(outage))


def heat_weeks() -> list[tuple[str, int, int]]:
    """Give name, first minute and end of the boiler house's weekly files."""
    edges = [1, 6, 13, 20, 27]
    ends = [local(day) for day in edges[1:]] + [MONTH_END + 10]
    return [(f"2025-10-{day:02d}", local(day), end) for day, end in zip(edges, ends, strict=True)]


def write_heat(folder: Path, readings: Readings) -> None:
    """Write the boiler-house export: local clock, semicolons, decimal comma, day first, words."""
    tags = ["HT-F", "HT-S", "HT-R", "LT-F", "LT-S", "LT-R"]
    cells = []
    for tag in tags:
        column = decimals(readings.values[tag], INSTRUMENTS[tag].places, ",")
        for row, word in readings.words.get(tag, {}).items():
            column[row] = word
        cells.append(column)
    stamps = [f"{t[8:10]}-{t[5:7]}-{t[:4]} {t[11:]}" for t in iso_text(clock_minutes(readings.minutes, ZONE))]
    for name, start, end in heat_weeks():
        lines = ["tidspunkt;" + ";".join(tags)]
        for i in np.flatnonzero(within(readings.minutes, start, end) & (readings.minutes % 2 == 0)):
            lines.append(f"{stamps[i]};" + ";".join(column[i] for column in cells))
        write_text(folder / "heat" / f"kedelhus_{name}.csv", lines, line_end="\r\n")


def write_gas(folder: Path, readings: Readings) -> None:
    """Write the meter export: winter time, long layout, one zip a week.

    The index comes every minute, pressure and temperature every five.
    """
    clock = clock_minutes(readings.minutes, WINTER_TIME)
    stamps = [text.replace("T", " ") + ":00" for text in iso_text(clock)]
    texts = {
        tag: decimals(readings.values[tag], INSTRUMENTS[tag].places) for tag in ("GM-01", "GM-02", "GM-03")
    }
    weeks = (clock // 1440 + 3) // 7
    inside = within(readings.minutes, MONTH_START - 60, MONTH_END + 60)
    first_week = int(weeks[inside][0])
    for week in np.unique(weeks[inside]):
        lines = ["time,point,reading"]
        rows = np.flatnonzero(inside & (weeks == week))
        for i in rows:
            lines += [f"{stamps[i]},{tag},{column[i]}" for tag, column in texts.items() if column[i]]
        name = f"gas_2025-W{40 + int(week) - first_week}"
        date = iso_text(clock[rows[-1:]])[0][:10].split("-")
        write_zip(
            folder / "gas" / f"{name}.zip", f"{name}.csv", lines, (int(date[0]), int(date[1]), int(date[2]))
        )


SHIFT_NOTES = (
    "Quillmere Dairy Works, boiler house, notes of the shifts",
    "",
    "Sun 5 Oct   gas meter exchanged by the supplier, about 40 min",
    "Thu 9 Oct   engine sounds rough, nothing found",
    "Tue 14 Oct  return pocket of the jacket circuit cleaned, reading moves again",
    "Thu 16 Oct  new gas quality from the supplier",
    "Sat 18 Oct  work on the roof near the exhaust bypass",
    "Mon 20 Oct  controller's memory card exchanged, old card handed in on Thursday",
)


def write_logs(folder: Path, month: GasEngineMonth, readings: Readings) -> None:
    """Write every export below `folder`."""
    write_engine(folder, month, readings)
    write_heat(folder, readings)
    write_gas(folder, readings)
    write_text(folder / "notes.txt", SHIFT_NOTES)
