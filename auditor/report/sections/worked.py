"""One interval worked by hand: readings, powers tick by tick, every equation with its numbers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.machines import Machine
from auditor.records.verdicts import Verdict
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.report.sections.worked_figures import Line, figure_lines
from auditor.report.sections.worked_laws import law_lines
from auditor.report.sections.worked_streams import stream_line
from auditor.report.wording import names, verdicts
from auditor.units import DISPLAY, DisplayUnit

if TYPE_CHECKING:
    from auditor.records.plant import Tag
    from auditor.records.result import AuditResult

_WHY = {
    "median efficiency": "It was chosen because its efficiency is the median of all credible intervals.",
    "impossible": "It was chosen because its figure is impossible: this is the arithmetic to be doubted.",
}


_MOST_COLUMNS = 6


@dataclass(frozen=True)
class Worked:
    """The worked interval in words, equations and tables."""

    title: str
    why: str
    readings: Table
    ticks: tuple[Table, ...]
    powers: tuple[Table, ...]
    """Several tables of few columns, so that they fit on paper."""
    streams: tuple[Line, ...]
    tick: str
    """The tick whose streams are written out."""
    figures: tuple[Line, ...]
    laws: tuple[Line, ...]
    """Tests of the first and second law."""
    verdict: str


def worked_interval(result: AuditResult) -> Worked | None:
    """Write out the chosen interval; None when none could be chosen."""
    chosen = result.worked
    if chosen is None:
        return None
    machine = result.plant.machines[chosen.machine]
    interval = result.balances[machine.name].interval
    start_us, end_us = int(interval.start_us[chosen.index]), int(interval.end_us[chosen.index])
    grid = result.ticks.grid
    first, last = np.searchsorted(grid.start_us, [start_us, end_us])
    inside = slice(int(first), int(last))
    places = [result.powers.streams.index(stream.key) for stream in machine.streams.values()]
    complete = result.powers.known[inside][:, places].all(axis=1)
    clock = Clock(result.plant.site.zone)
    tick = int(first) + int(np.argmax(complete))
    return Worked(
        title=f"{machine.title}, {clock.span(start_us, end_us)}",
        why=_WHY.get(chosen.why, names.sentence(chosen.why)),
        readings=_readings(machine, inside, result),
        ticks=_tick_tables(machine, inside, result),
        powers=_power_tables(machine, inside, result),
        streams=tuple(stream_line(stream, tick, result) for stream in machine.streams.values()),
        tick=clock.moment(int(grid.start_us[tick])),
        figures=figure_lines(machine, chosen.index, result),
        laws=law_lines(machine, chosen.index, inside, result),
        verdict=_verdict(machine, chosen.index, result),
    )


def _columns(machine: Machine, result: AuditResult) -> list[str]:
    """Tick columns that the machine's streams are made of, each once."""
    return list(
        dict.fromkeys(
            column for stream in machine.streams.values() for column in result.powers.inputs[stream.key]
        )
    )


def unit_of(column: str, result: AuditResult) -> DisplayUnit:
    """Choose the unit that a tick mean is shown in: of a counter or an amount, its rate."""
    tag = _column_tag(column, result)
    if tag is None or tag.states is not None:
        return DISPLAY["fraction"]
    rates = {"energy": "power", "volume": "volume flow", "mass": "mass flow"}
    quantity = rates.get(tag.quantity, tag.quantity) if tag.between in ("counter", "amount") else tag.quantity
    return DISPLAY[quantity]


def _column_tag(column: str, result: AuditResult) -> Tag | None:
    name = result.ticks.tags[result.ticks.column(column)] if column in result.ticks.columns else column
    return result.plant.tags.get(name)


def _shown(value: float, unit: DisplayUnit) -> str:
    return numbers.significant(float(unit.from_si(value)), 6)


def _readings(machine: Machine, inside: slice, result: AuditResult) -> Table:
    rows = []
    for column in _columns(machine, result):
        place, unit = result.ticks.column(column), unit_of(column, result)
        mean = result.ticks.mean[inside, place]
        known = np.isfinite(mean)
        value = float(mean[known].mean()) if known.any() else float("nan")
        tag = _calibrated(_column_tag(column, result), int(result.ticks.grid.start_us[inside][0]))
        lag1 = float(np.nan_to_num(result.ticks.noise_lag1[place]))
        U = _reading_U(tag, value, result.ticks.noise[inside, place][known], lag1)
        size = numbers.shown(value, U, unit)
        declared = tag.calibration.declared if tag is not None and tag.calibration is not None else "state"
        rows.append(
            (
                column,
                _shown(value, unit),
                f"{size.U}{numbers.NBSP}{size.U_unit}".rstrip(),
                unit.label,
                declared,
            )
        )
    return Table(
        "Means of the readings over the interval",
        ("Tag", "Mean", "± U", "Unit", "Declared uncertainty"),
        tuple(rows),
        numeric=(1, 2),
        code=(0,),
        note="U joins the declared part, which never shrinks, and the scatter of the readings (k = 2).",
    )


def _calibrated(tag: Tag | None, instant_us: int) -> Tag | None:
    """Return a tag as it was when the calibration that holds at an instant was declared."""
    for change in tag.changes if tag is not None else ():
        if change.new_calibration and change.from_us <= instant_us:
            tag = change.tag
    return tag


def _reading_U(
    tag: Tag | None, value: float, noise: np.ndarray[tuple[int], np.dtype[np.float64]], lag1: float
) -> float:
    """Return the expanded uncertainty of the interval mean of one tag [SI]."""
    if tag is None or tag.calibration is None or not noise.size:
        return float("nan")
    stretch = (1.0 + lag1) / max(1.0 - lag1, 0.05)
    random = float(np.nansum(noise**2)) / noise.size**2 * stretch
    fixed = tag.calibration.absolute**2 + (tag.calibration.relative * (value - tag.offset)) ** 2
    return 2.0 * float(np.sqrt(fixed + random))


def _tick_tables(machine: Machine, inside: slice, result: AuditResult) -> tuple[Table, ...]:
    columns = _columns(machine, result)
    units = [unit_of(column, result) for column in columns]
    means = result.ticks.mean[inside][:, [result.ticks.column(column) for column in columns]]
    heads = [f"{column}, {unit.label}" for column, unit in zip(columns, units, strict=True)]
    cells = [[_shown(value, unit) for value, unit in zip(row, units, strict=True)] for row in means.tolist()]
    return _narrow("Means of every tick", heads, _clock_times(inside, result), cells)


def _power_tables(machine: Machine, inside: slice, result: AuditResult) -> tuple[Table, ...]:
    streams = list(machine.streams.values())
    table = result.powers.power_W[inside][:, [result.powers.streams.index(stream.key) for stream in streams]]
    known = np.isfinite(table).all(axis=1)
    means = table[known].mean(axis=0) if known.any() else np.full(len(streams), np.nan)
    kW = DISPLAY["power"]
    cells = [[_shown(watts, kW) for watts in row] for row in (*table.tolist(), means.tolist())]
    heads = [f"{names.plain(stream.name)}, kW" for stream in streams]
    times = [*_clock_times(inside, result), "mean where all are known"]
    return _narrow("Powers of every tick", heads, times, cells)


def _clock_times(inside: slice, result: AuditResult) -> list[str]:
    clock = Clock(result.plant.site.zone)
    return [f"{clock.local(int(start)):%H:%M:%S}" for start in result.ticks.grid.start_us[inside]]


def _narrow(caption: str, heads: list[str], times: list[str], cells: list[list[str]]) -> tuple[Table, ...]:
    """Lay one wide table out as several with few columns each."""
    parts = range(0, len(heads), _MOST_COLUMNS)
    return tuple(
        Table(
            caption if len(parts) == 1 else f"{caption}, part {number} of {len(parts)}",
            ("Tick", *heads[first : first + _MOST_COLUMNS]),
            tuple(
                (time, *row[first : first + _MOST_COLUMNS]) for time, row in zip(times, cells, strict=True)
            ),
            numeric=tuple(range(1, 1 + len(heads[first : first + _MOST_COLUMNS]))),
        )
        for number, first in enumerate(parts, start=1)
    )


def _verdict(machine: Machine, index: int, result: AuditResult) -> str:
    judgement = result.judgements[machine.name]
    word = Verdict(int(judgement.verdict[index]))
    known = {reason.value: said for reason, said in verdicts.REASONS.items()}
    reasons = [known.get(reason, reason) for reason in judgement.reasons[index]]
    because = f" Reasons: {'; '.join(reasons)}." if reasons else ""
    return f"Verdict: {word.word}. {verdicts.MEANINGS[word]}{because}"
