"""Everything that is said about one machine, in the order it is read."""

from __future__ import annotations

from dataclasses import dataclass

from auditor.records.machines import Machine
from auditor.records.result import AuditResult
from auditor.report import numbers
from auditor.report.elements import Figure, Table
from auditor.report.sections import balance, daily, performance, statements
from auditor.report.wording import names


@dataclass(frozen=True)
class MachineView:
    """One machine on paper."""

    anchor: str
    title: str
    intro: str
    pictures: tuple[Figure, ...]
    period: Table
    standstill: Table | None
    instruments: tuple[Table, ...]
    instruments_said: str
    ceiling: statements.CeilingWords | None
    refusals: tuple[str, ...]


def machine_view(number: int, machine: Machine, result: AuditResult) -> MachineView:
    """Write up one machine; ``number`` makes its anchors unique."""
    anchor = f"machine-{number}"
    days = daily.by_day(machine, result)
    figures = result.balances[machine.name]
    pictures = (
        balance.boundary_figure(anchor, machine, result),
        balance.bands_figure(anchor, machine, result),
        performance.over_time_figure(anchor, machine, days, result),
        performance.load_figure(anchor, machine, result),
        performance.rejection_figure(anchor, machine, days, result),
    )
    return MachineView(
        anchor=anchor,
        title=machine.title,
        intro=_intro(machine, result),
        pictures=tuple(picture for picture in pictures if picture is not None),
        period=statements.period_table(machine, figures, result),
        standstill=statements.standstill_table(machine, figures),
        instruments=statements.instrument_tables(machine, figures, result),
        instruments_said=statements.instruments_sentence(machine, figures, result),
        ceiling=statements.ceiling_words(machine, figures, result),
        refusals=statements.refusals(machine, figures, result),
    )


def _intro(machine: Machine, result: AuditResult) -> str:
    figures = result.balances[machine.name]
    still = f"stood still for {_hours(figures.stopped_s)}" if figures.stopped_s else "never stood still"
    parts = [f"{names.sentence(machine.kind)}. It ran for {_hours(figures.running_s)} and {still}"]
    if figures.unknown_s:
        parts.append(f"; for {_hours(figures.unknown_s)} nobody knows")
    return f"{''.join(parts)}."


def _hours(seconds: float) -> str:
    return f"{numbers.to_places(seconds / 3600.0, 1)}{numbers.NBSP}h"
