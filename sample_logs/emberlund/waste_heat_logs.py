"""What the instruments and loggers of Emberlund made of the true month: errors, faults, and files.

Each instrument has a constant calibration error, drawn once within its declared standard uncertainty,
and white noise from sample to sample (power 0.3 %, flow 0.5 %, temperature 0.2 K).
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, timedelta, timezone
from pathlib import Path

import numpy as np
from energy_ledger import Instrument
from logger_tools import (
    Array,
    Mask,
    Minutes,
    calibration_bias,
    clock_minutes,
    decimals,
    iso_text,
    ramp,
    white_noise,
    within,
    write_gzip,
    write_text,
)
from waste_heat_plant import (
    CLEAR_DAYS,
    HOLD,
    MONTH_END,
    MONTH_START,
    SEED,
    ZONE,
    WasteHeatMonth,
    local,
)

UTC = UTC
WINTER_TIME = timezone(timedelta(hours=1))

OIL_FLOW_HIGH = (local(17, 10), MONTH_END)
OIL_FLOW_HIGH_FACTOR = 1.08
KELVIN = (local(20), local(21, 6))
MOVED_SENSOR = (local(28, 9), local(28, 11, 30))
PANEL_SWITCH = local(10, 9, 30)
CLOCK_AHEAD_MINUTES = 7
CLOCK_STEP = local(22, 10)
DEADBAND_K = 5.0
HEARTBEAT_MINUTES = 30
SUN_HOURS = (14, 17)
SUN_K = 8.0
PITOT_SERVICE = (local(22, 9), local(22, 9, 40))
# (tag, first minute, minutes, sentinel): the skid's data link dropped out.
LINK_LOSSES = (
    ("CA-M", local(5, 12), 3, -9999.0),
    ("TO-F", local(15, 5, 10), 25, -9999.0),
    ("CA-T2", local(18, 19, 20), 28, 9999.0),
    ("CA-M", local(21, 13), 12, -9999.0),
    ("TO-T2", local(29, 2, 40), 18, -9999.0),
)
# (tag, first minute, minutes, added): the daily exports were pulled before a correction; the monthly one
# is right.
DAILY_CONFLICTS = (("TO-F", local(2, 10), 20, 0.60), ("TO-T1", local(3, 16), 5, -1.5))


INSTRUMENTS = {
    "WX-T1": Instrument("offset", 3.0, 0.2, 1),
    "WX-T2": Instrument("offset", 3.0, 0.2, 1),
    "WX-M": Instrument("factor", 0.03, 0.005, 2),
    "TO-F": Instrument("factor", 0.02, 0.005, 2),
    "TO-T1": Instrument("offset", 0.5, 0.2, 1),
    "TO-T2": Instrument("offset", 0.5, 0.2, 1),
    "CA-T1": Instrument("offset", 0.5, 0.2, 1),
    "CA-T2": Instrument("offset", 0.5, 0.2, 1),
    "CA-M": Instrument("factor", 0.03, 0.005, 1),
    "CP": Instrument("factor", 0.005, 0.002, 3),
    "OR-G": Instrument("factor", 0.005, 0.003, 1),
    "OR-P": Instrument("factor", 0.005, 0.003, 1),
    "P_el": Instrument("factor", 0.01, 0.003, 0),
}
QUANTITIES = {
    "WX-T1": "exhaust_in_C",
    "WX-T2": "exhaust_out_C",
    "WX-M": "exhaust_flow",
    "TO-F": "oil_flow",
    "TO-T1": "oil_hot_C",
    "TO-T2": "oil_cold_C",
    "CA-T1": "outdoor_C",
    "CA-T2": "air_out_C",
    "CA-M": "air_flow",
    "CP": "condensing_bar",
    "OR-G": "gross_kW",
    "OR-P": "own_kW",
    "P_el": "gross_kW",
}


@dataclass(frozen=True)
class Readings:
    """Readings at whole true minutes, already rounded.

    NaN where a status word or a sentinel stands instead.
    """

    minutes: Minutes
    values: dict[str, Array]
    biases: dict[str, float]

    def on_power_clock(self, tag: str) -> Array:
        """Order power readings by the stamp they carry; where stamps repeat, the later row."""
        behind = np.roll(self.values[tag], CLOCK_AHEAD_MINUTES)
        return np.where(self.minutes < CLOCK_STEP, behind, self.values[tag])


def read_instruments(month: WasteHeatMonth) -> Readings:
    """Read every instrument, with the measurement faults of the month."""
    minutes = month.minutes
    values: dict[str, Array] = {}
    biases: dict[str, float] = {}
    for tag, instrument in INSTRUMENTS.items():
        true = getattr(month, QUANTITIES[tag])
        if tag == "P_el":  # the panel showed net power until somebody changed its wiring
            true = np.where(minutes < PANEL_SWITCH, month.gross_kW - month.own_kW, month.gross_kW)
        if tag == "TO-F":
            true = true * np.where(
                within(minutes, *OIL_FLOW_HIGH) | (minutes >= MONTH_END), OIL_FLOW_HIGH_FACTOR, 1.0
            )
        if tag == "TO-T1":
            true = true + np.where(within(minutes, *KELVIN), 273.15, 0.0)
        if tag == "CA-T1":
            true = np.where(within(minutes, *MOVED_SENSOR), 21.0, true + sun_on_sensor(minutes))
        bias = calibration_bias(SEED, tag, instrument.standard)
        noise = white_noise(SEED, tag, len(minutes), instrument.noise)
        values[tag] = np.round(instrument.reading(true, bias, noise), instrument.places)
        biases[tag] = bias
    for tag, start, length, _ in LINK_LOSSES:
        values[tag][within(minutes, start, start + length)] = np.nan
    values["WX-M"][np.array(pitot_words(minutes)) != ""] = np.nan
    scanned = minutes % 2 == 0
    for tag in ("WX-T2", "WX-M"):
        values[tag][~scanned] = np.nan
    values["WX-T1"] = stored_by_exception(minutes, values["WX-T1"], scanned)
    return Readings(minutes, values, biases)


def sun_on_sensor(minutes: Minutes) -> Array:
    """Give the error of the air sensor on clear afternoons: +8 K from 14:00 to 17:00, soft flanks."""
    excess = np.zeros(len(minutes))
    for day in CLEAR_DAYS:
        excess += ramp(minutes, local(day, SUN_HOURS[0]), 30) - ramp(
            minutes, local(day, SUN_HOURS[1]) - 30, 30
        )
    return SUN_K * excess


def pitot_words(minutes: Minutes) -> list[str]:
    """Give the status words of the exhaust flow: air blown through every morning, and one service."""
    shown = clock_minutes(minutes, ZONE) % 1440
    service = within(minutes, *PITOT_SERVICE)
    return [
        "service" if out else "spolning" if clock == 360 else ""
        for clock, out in zip(shown, service, strict=True)
    ]


def stored_by_exception(minutes: Minutes, scans: Array, scanned: Mask) -> Array:
    """Keep a scan only if it lies 5 K from the last stored value, or half an hour after it.

    The first scan of each file is stored too.
    """
    stored = np.full(len(scans), np.nan)
    starts = {start for _, start, _ in furnace_weeks()}
    last_value, last_minute = np.inf, -HEARTBEAT_MINUTES
    for index in np.flatnonzero(scanned):
        minute = int(minutes[index])
        moved = abs(scans[index] - last_value) >= DEADBAND_K
        if moved or minute - last_minute >= HEARTBEAT_MINUTES or minute in starts:
            stored[index] = last_value = scans[index]
            last_minute = minute
    return stored


def furnace_weeks() -> list[tuple[str, int, int]]:
    """Give name, first minute and end of the furnace's weekly files."""
    edges = [1, 8, 15, 22, 29]
    ends = [local(day) for day in edges[1:]] + [MONTH_END + 10]
    return [(f"2026-07-{day:02d}", local(day), end) for day, end in zip(edges, ends, strict=True)]


def with_sentinels(readings: Readings, tag: str, places: int) -> list[str]:
    """Write the cells of a tag of the skid, link losses as their sentinels."""
    values = readings.values[tag].copy()
    cells = decimals(values, places)
    for lost, start, length, sentinel in LINK_LOSSES:
        if lost == tag:
            for index in np.flatnonzero(within(readings.minutes, start, start + length)):
                cells[index] = f"{sentinel:.0f}"
    return cells


def write_furnace(folder: Path, readings: Readings) -> None:
    """Write the furnace export: preamble, heading row, unit row, cp1252, semicolons, decimal comma."""
    words = pitot_words(readings.minutes)
    numbers = decimals(readings.values["WX-M"], 2, ",")
    flow = [word or number for word, number in zip(words, numbers, strict=True)]
    inlet = decimals(readings.values["WX-T1"], 1, ",")
    outlet = decimals(readings.values["WX-T2"], 1, ",")
    stamps = [f"{t[8:10]}.{t[5:7]}.{t[:4]} {t[11:]}" for t in iso_text(clock_minutes(readings.minutes, ZONE))]
    for name, start, end in furnace_weeks():
        rows = np.flatnonzero(within(readings.minutes, start, end) & (readings.minutes % 2 == 0))
        lines = ["Anläggning;Emberlund Glassworks", "Utskrift;ugn 2, rökgas", ""]
        lines += ["Tid;WX-T1;WX-T2;WX-M", ";°C;°C;kg/s"]
        lines += [f"{stamps[i]};{inlet[i]};{outlet[i]};{flow[i]}" for i in rows]
        write_text(folder / "furnace" / f"ugn2_{name}.csv", lines, encoding="cp1252", line_end="\r\n")


def write_skid(folder: Path, month: WasteHeatMonth, readings: Readings) -> None:
    """Write the skid exports: one monthly in UTC, three daily with other column order."""
    tags = ["TO-F", "TO-T1", "TO-T2", "CA-T1", "CA-T2", "CA-M", "CP"]
    cells = {tag: with_sentinels(readings, tag, INSTRUMENTS[tag].places) for tag in tags}
    stands = month.oil_flow == 0.0
    fans = np.where(stands, "0", "1").tolist()  # the bit of fan 3 is the order, not the motor: it stays 1
    bypass = np.where(within(month.minutes, *HOLD), "1", "0").tolist()
    stamps = [text.replace("T", " ") for text in iso_text(readings.minutes)]
    heading = "time,TO-F,TO-T1,TO-T2,CA-T1,CA-T2,CA-M,CP,FAN1,FAN2,FAN3,FAN4,DMPR"
    rows = np.flatnonzero(within(readings.minutes, MONTH_START - 120, MONTH_END + 120))
    lines = [heading]
    for i in rows:
        measured = ",".join(cells[tag][i] for tag in tags)
        lines.append(f"{stamps[i]},{measured},{fans[i]},{fans[i]},{fans[i]},{fans[i]},{bypass[i]}")
    write_gzip(folder / "month" / "skid_2026-07.csv.gz", lines)

    changed = {tag: list(column) for tag, column in cells.items()}
    for tag, start, length, added in DAILY_CONFLICTS:
        span = within(readings.minutes, start, start + length)
        texts = decimals(readings.values[tag] + added, INSTRUMENTS[tag].places)
        for i in np.flatnonzero(span):
            changed[tag][i] = texts[i]
    order = ["CA-M", "CA-T1", "CA-T2", "TO-F", "TO-T1", "TO-T2"]
    for day in (1, 2, 3):
        start = (local(day) // 1440 + 1) * 1440  # a UTC day
        lines = ["time," + ",".join(order)]
        for i in np.flatnonzero(within(readings.minutes, start, start + 1440)):
            lines.append(f"{stamps[i]}," + ",".join(changed[tag][i] for tag in order))
        write_text(folder / "day" / f"skid_2026-07-{day:02d}.csv", lines)


def write_power(folder: Path, readings: Readings) -> None:
    """Write the power controller's weekly files on its own clock, 7 minutes ahead until set back."""
    shown = readings.minutes + np.where(readings.minutes < CLOCK_STEP, CLOCK_AHEAD_MINUTES, 0)
    clock = clock_minutes(shown, WINTER_TIME)
    stamps = [text.replace("T", " ") + ":00" for text in iso_text(clock)]
    gross, own, panel = (
        decimals(readings.values[tag], INSTRUMENTS[tag].places) for tag in ("OR-G", "OR-P", "P_el")
    )
    weeks = (clock // 1440 + 3) // 7  # 1 January 1970 was a Thursday
    inside = within(readings.minutes, MONTH_START - 90, MONTH_END + 90)
    first_week = int(weeks[inside][0])
    for week in np.unique(weeks[inside]):
        lines = ["stamp,OR-G,OR-P,P_el"]
        lines += [
            f"{stamps[i]},{gross[i]},{own[i]},{panel[i]}" for i in np.flatnonzero(inside & (weeks == week))
        ]
        write_gzip(folder / "power" / f"controller_2026-W{27 + int(week) - first_week}.csv.gz", lines)


SHIFT_NOTES = (
    "Emberlund, shift book, engine house",
    "",
    "06/07 evening   furnace held for burner work, bypass open, engine down overnight",
    "09/07           quiet",
    "10/07 morning   panel rewired by the contractor, display looks better now",
    "14/07 morning   fan 3 found standing, belt replaced",
    "17/07 morning   oil flow transmitter exchanged",
    "22/07 morning   controller clock set, was some minutes fast; pitot serviced",
    "28/07 morning   air sensor in the workshop for calibration",
)


def write_logs(folder: Path, month: WasteHeatMonth, readings: Readings) -> None:
    """Write every export below `folder`."""
    write_furnace(folder, readings)
    write_skid(folder, month, readings)
    write_power(folder, readings)
    write_text(folder / "shift_notes.txt", SHIFT_NOTES)
