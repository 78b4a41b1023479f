"""Every comparison of meters that may show a wrong unit, reference state or setting."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from auditor.judging.level_units import level_questions
from auditor.judging.nameplate import nameplate_questions
from auditor.judging.own_past import own_past_questions
from auditor.judging.pressure_kinds import pressure_questions
from auditor.judging.second_meters import second_meter_questions
from auditor.judging.temperature_steps import temperature_questions

if TYPE_CHECKING:
    from auditor.records.balances import MachineBalance
    from auditor.records.findings import Finding
    from auditor.records.machines import Machine
    from auditor.records.plant import AirPressure, Fuel, GasMeter, Plant, Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable


@dataclass(frozen=True)
class Meters:
    """What the plant file says about its meters: all that the comparisons need."""

    machines: Mapping[str, Machine]
    tags: Mapping[str, Tag]
    fuels: Mapping[str, Fuel]
    gas_meters: Mapping[str, GasMeter]
    air_pressure: AirPressure | None
    coverage: float
    """Share of an interval's ticks that a comparison needs [1]."""

    @classmethod
    def from_plant(cls, plant: Plant) -> Meters:
        """Take the slice from a plant."""
        return cls(
            plant.machines,
            plant.tags,
            plant.fuels,
            plant.gas_meters,
            plant.site.air_pressure,
            plant.rules.interval_coverage,
        )


def meter_questions(
    meters: Meters, ticks: TickTable, powers: PowerTable, balances: Mapping[str, MachineBalance]
) -> list[Finding]:
    """Compare every meter with its second meter, its own past, the nameplate, the air and its kind.

    Returns
    -------
    list of Finding
        All of the code ``UNIT_SUSPECTED``; ``words["evidence"]`` tells which comparison it came from.
    """
    machines, tags = meters.machines, meters.tags
    asked = [
        *second_meter_questions(tags, machines, ticks, powers, meters.coverage),
        *own_past_questions(machines, meters.fuels, powers, meters.coverage),
        *nameplate_questions(machines, balances),
        *pressure_questions(machines, meters.gas_meters, tags, meters.air_pressure, ticks, balances),
        *temperature_questions(machines, tags, ticks, powers),
    ]
    return asked + level_questions(machines, meters.fuels, balances, asked)
