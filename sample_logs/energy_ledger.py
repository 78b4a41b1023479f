"""From states at whole minutes to energies, figures and entries of truth.json.

States are known at whole minutes; between two minutes they run on a straight line. The energy of a
minute is therefore the mean of its two ends, for the true plant and for its logged image alike.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
from logger_tools import Array, Mask, Minutes, clock_minutes, moment_text


def minute_energy_kWh(power_kW: Array) -> Array:
    """Give the energy of each minute between neighbouring instants, kWh."""
    return (power_kW[:-1] + power_kW[1:]) / 120.0


def bridged(values: Array, hold_minutes: int) -> Array:
    """Draw straight lines across gaps of at most `hold_minutes` between two readings; NaN elsewhere."""
    present = np.flatnonzero(~np.isnan(values))
    everywhere = np.arange(len(values))
    filled = np.interp(everywhere, present, values[present])
    after = np.searchsorted(present, everywhere, side="left").clip(0, len(present) - 1)
    before = np.searchsorted(present, everywhere, side="right").clip(1, len(present)) - 1
    too_far = present[after] - present[before] > hold_minutes
    outside = (everywhere < present[0]) | (everywhere > present[-1])
    return np.where(too_far | outside, np.nan, filled)


def held(values: Array) -> Array:
    """Keep the last stored value until the next one (exception storage)."""
    index = np.where(np.isnan(values), 0, np.arange(len(values)))
    return values[np.maximum.accumulate(index)]


def total(energy_kWh: Array, believable: Mask) -> float:
    """Sum the energy over the believable minutes."""
    return float(np.sum(energy_kWh[believable]))


def status_of(coverage: float) -> str:
    """Name the status of a figure of this coverage by energy (90 % and 75 % in both plant files)."""
    return "firm" if coverage >= 0.90 else "provisional" if coverage >= 0.75 else "withheld"


def coverage_of(energy_kWh: Array, believable: Mask, stopped: Mask) -> float:
    """Give the coverage by energy.

    Known-stopped minutes count as covered, unknown ones weigh as the mean running minute.
    """
    running = believable & ~stopped
    known = float(np.sum(energy_kWh[running]))
    unknown_minutes = int(np.sum(~believable & ~stopped))
    mean_running = known / max(int(running.sum()), 1)
    return known / (known + unknown_minutes * mean_running)


def figure(
    true: float, as_metered: float | None, unit: str, coverage: float, note: str = ""
) -> dict[str, Any]:
    """Make one entry of truth.json."""
    entry: dict[str, Any] = {
        "true": round(true, 4),
        "as_metered": None if as_metered is None else round(as_metered, 4),
        "unit": unit,
        "coverage_pct": round(100.0 * coverage, 2),
        "expected_status": status_of(coverage),
    }
    if note:
        entry["note"] = note
    return entry


def ratio_figure(pairs: Mapping[str, tuple[Array, Array]], coverage: float, note: str = "") -> dict[str, Any]:
    """Make a ratio of energies in percent, from (numerator, denominator) minutes, true and metered."""
    values = {
        name: 100.0 * float(np.sum(top)) / float(np.sum(bottom)) for name, (top, bottom) in pairs.items()
    }
    return figure(values["true"], values["metered"], "%", coverage, note)


@dataclass(frozen=True)
class Ledger:
    """Minute energies of one machine over the month, kWh: what is true, and what the logs show.

    NaN: not believable. `stopped` marks minutes that are known to stand still from the logs.
    """

    true: Mapping[str, Array]
    metered: Mapping[str, Array]
    stopped: Mask

    def common(self, *names: str) -> Mask:
        """Tell the minutes in which all named streams are believable."""
        known: Mask = np.logical_and.reduce([~np.isnan(self.metered[name]) for name in names])
        return known

    def coverage(self, name: str, known: Mask) -> float:
        """Give the share of a stream's energy that lies in `known` minutes."""
        return coverage_of(np.nan_to_num(self.metered[name]), known, self.stopped)

    def energy(self, signs: Mapping[str, float], note: str = "") -> dict[str, Any]:
        """Make a figure that is a signed sum of streams, over the minutes in which all are believable."""
        known = self.common(*signs)
        true = sum(sign * float(np.sum(self.true[name])) for name, sign in signs.items())
        metered = sum(sign * total(self.metered[name], known) for name, sign in signs.items())
        return figure(true, metered, "kWh", self.coverage(next(iter(signs)), known), note)

    def ratio(self, signs: Mapping[str, float], below: str, note: str = "") -> dict[str, Any]:
        """Make a ratio of energies over the minutes in which all its streams are believable."""
        known = self.common(*signs, below)
        zero = np.zeros(len(known))
        true = sum((sign * self.true[name] for name, sign in signs.items()), start=zero)
        metered = sum((sign * self.metered[name][known] for name, sign in signs.items()), start=zero[known])
        pairs = {"true": (true, self.true[below]), "metered": (metered, self.metered[below][known])}
        return ratio_figure(pairs, self.coverage(below, known), note)


def by_local_day(month: Minutes, zone: ZoneInfo, streams: Mapping[str, Array]) -> list[dict[str, Any]]:
    """Sum true energies by local day, kWh; `month` holds the first minute of each minute energy."""
    days = clock_minutes(month, zone) // 1440
    table = []
    for day in np.unique(days):
        inside = days == day
        row: dict[str, Any] = {
            "date": str(np.datetime64(int(day), "D")),
            "hours": round(int(inside.sum()) / 60, 2),
        }
        table.append(row | {name: round(float(energy[inside].sum()), 2) for name, energy in streams.items()})
    return table


def fault(
    zone: ZoneInfo, title: str, span: tuple[int, int], tags: Sequence[str], **effect: float | str
) -> dict[str, Any]:
    """Make one entry of the list of faults; its number is given by its place in the list."""
    start, end = (moment_text(minute, zone) for minute in span)
    return {"title": title, "from": start, "until": end, "tags": list(tags), "effect": effect}


def numbered(faults: Sequence[dict[str, Any]]) -> list[dict[str, Any]]:
    """Give faults their numbers, from 1."""
    return [{"id": str(number), **entry} for number, entry in enumerate(faults, 1)]


def machine_entry(
    figures: Mapping[str, Any], ledger: Ledger, streams: Sequence[str], running: Mask
) -> dict[str, Any]:
    """Make the entry of one machine: its figures, the sums of its single streams, its hours."""
    sums: dict[str, dict[str, float | None]] = {}
    for name in streams:
        metered = ledger.metered.get(name)
        sums[name] = {
            "true_kWh": round(float(np.sum(ledger.true[name])), 3),
            "as_metered_kWh": None if metered is None else round(float(np.nansum(metered)), 3),
        }
    ran = int(running.sum()) / 60.0
    hours = {"running": round(ran, 3), "stopped": round(len(running) / 60.0 - ran, 3)}
    return {"figures": figures, "streams": sums, "hours": hours}


@dataclass(frozen=True)
class Instrument:
    """Errors of one instrument: one calibration error for good, and white noise from sample to sample."""

    kind: str  # "factor": errors are shares of the reading; "offset": errors are in the unit
    standard: float
    noise: float
    places: int  # decimals that are logged

    def reading(self, true: Array, bias: float, noise: Array) -> Array:
        """Read a true quantity, unrounded."""
        return true * (1.0 + bias + noise) if self.kind == "factor" else true + bias + noise


def instrument_entries(
    instruments: Mapping[str, Instrument], biases: Mapping[str, float]
) -> dict[str, dict[str, Any]]:
    """Make the entries of the instruments."""
    return {
        tag: {
            "bias": biases[tag],
            "bias_kind": instrument.kind,
            "declared_standard": instrument.standard,
            "noise": instrument.noise,
        }
        for tag, instrument in instruments.items()
    }


def period_entry(start: int, end: int, zone: ZoneInfo) -> dict[str, Any]:
    """Make the entry of the period."""
    return {
        "from": moment_text(start, zone),
        "until": moment_text(end, zone),
        "hours": (end - start) / 60,
    }
