"""Sums by local day: the numbers behind the charts, short enough to be read and printed."""

# ruff: noqa: RUF001 - text for paper uses the trade's own signs

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.verdicts import Verdict
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.units import DISPLAY

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.result import AuditResult

_ENERGIES = (
    ("fuel_in_W", "Fuel in"),
    ("heat_in_W", "Heat in"),
    ("work_gross_W", "Gross work"),
    ("useful_heat_W", "Useful heat"),
    ("rejected_W", "Rejected, implied"),
    ("rejected_measured_W", "Rejected, measured"),
    ("demanded_rejection_W", "Demanded by second law"),
    ("unavoidable_rest_W", "Rest"),
)

_REJECTION = ("rejected_W", "rejected_measured_W", "demanded_rejection_W", "unavoidable_rest_W")


@dataclass(frozen=True)
class Days:
    """Sums of one machine by local day, in order of time."""

    label: tuple[str, ...]
    energy_J: dict[str, NDArray[np.float64]]
    """Per power key, over the common ticks; NaN on days without any. Parts of the rejection only where all
    of them are known, so that they can be compared."""
    hours: dict[Verdict, NDArray[np.float64]]


def by_day(machine: Machine, result: AuditResult) -> Days:
    """Sum the intervals of one machine by the local day they start in."""
    balance, judgement = result.balances[machine.name], result.judgements[machine.name]
    interval = balance.interval
    midnights = result.ticks.grid.day_start_us
    count = midnights.shape[0] - 1
    day = np.clip(np.searchsorted(midnights, interval.start_us, side="right") - 1, 0, count - 1)
    length_s = (interval.end_us - interval.start_us) / 1e6
    values = {key: interval.values[key] for key, _ in _ENERGIES if key in interval.values}
    rejection = [values[key] for key in _REJECTION if key in values]
    together = np.isfinite(np.sum(rejection, axis=0)) if rejection else np.ones(length_s.shape, dtype=bool)
    energies = {
        key: _sums(
            np.where(together | (key not in _REJECTION), power, np.nan) * length_s * interval.coverage,
            day,
            count,
        )
        for key, power in values.items()
    }
    hours = {
        word: np.bincount(day, np.where(judgement.verdict == word, length_s / 3600.0, 0.0), count).astype(
            np.float64
        )
        for word in Verdict
    }
    clock = Clock(result.plant.site.zone)
    labels = tuple(clock.date(int(midnight)) for midnight in midnights[:-1])
    return Days(labels, energies, hours)


def _sums(values: NDArray[np.float64], day: NDArray[np.int64], count: int) -> NDArray[np.float64]:
    known = np.isfinite(values)
    sums = np.bincount(day[known], weights=values[known], minlength=count)
    seen = np.bincount(day[known], minlength=count) > 0
    return np.where(seen, sums, np.nan)


def daily_table(days: Days, balance: MachineBalance) -> Table:
    """One row per local day; efficiencies are ratios of the day's energies."""
    keys = [(key, title) for key, title in _ENERGIES if key in days.energy_J]
    entering = sum(days.energy_J[key] for key in ("fuel_in_W", "heat_in_W") if key in days.energy_J)
    ratio_key, top = (
        ("gross", "work_gross_W") if "work_gross_W" in days.energy_J else ("heat", "useful_heat_W")
    )
    ratio = np.full(len(days.label), np.nan)
    if top in days.energy_J:
        np.divide(days.energy_J[top], entering, out=ratio, where=np.asarray(entering) > 0.0)
    assessed = sum(hours for word, hours in days.hours.items() if word is not Verdict.NOT_ASSESSED)
    rows = []
    for index, label in enumerate(days.label):
        cells = [_mwh(days.energy_J[key][index]) for key, _ in keys]
        rows.append(
            (
                label,
                *cells,
                numbers.percent(float(ratio[index])) if np.isfinite(ratio[index]) else "–",
                numbers.to_places(float(np.asarray(assessed)[index]), 2),
                numbers.to_places(float(days.hours[Verdict.IMPOSSIBLE][index]), 2),
            )
        )
    columns = ("Local day", *(f"{title}, MWh" for _, title in keys), f"{ratio_key.capitalize()} efficiency")
    columns = (*columns, "Hours assessed", "Hours impossible")
    return Table(
        "Sums by local day",
        columns,
        tuple(rows),
        numeric=tuple(range(1, len(columns))),
        note="Energies over the time common to all inputs of the headline figure. Every interval of "
        f"{numbers.duration(balance.interval_s)} stands in intervals.csv beside this file.",
    )


def _mwh(joules: float) -> str:
    if not np.isfinite(joules):
        return "–"
    return numbers.to_places(joules / DISPLAY["energy"].size_si, 2)
