"""What streams a machine has in the power table, and which figures and tests they allow."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from auditor.records.machines import CeilingKind, Constant, Role, SameAs, ShareOf

if TYPE_CHECKING:
    from auditor.records.machines import Ceiling, Machine, Stream
    from auditor.records.powers import PowerTable

_ROLE_COLUMNS = {
    "fuel": Role.FUEL_IN,
    "heat": Role.HEAT_IN,
    "power_in": Role.POWER_IN,
    "work": Role.WORK_OUT,
    "own_use": Role.OWN_USE,
    "useful": Role.USEFUL_HEAT,
    "rejected": Role.REJECTED_HEAT,
    "loss": Role.LOSS,
}


@dataclass(frozen=True)
class Layout:
    """What columns a machine has, and where their streams stand in the power table."""

    machine: Machine
    places: Mapping[str, tuple[tuple[str, int], ...]]
    """Per role column: (stream key, index in the power table), only roles that occur."""
    ceiling: Ceiling | None
    """None where the power table lacks a temperature (or an exergy) that the ceiling needs."""
    rejection_demanded: bool
    """A heat engine that runs on heat alone, all its temperatures known."""
    entropy: bool
    """Everything that carries heat over the boundary has a temperature, and no fuel burns."""
    exchanger: bool
    """Heat in, heat out, nothing else: temperatures of its sides must not cross."""
    testable: bool
    """Every way out is metered or stated, so that the first law can be tested."""

    def keys_of(self, column: str) -> tuple[str, ...]:
        """Stream keys of a role column."""
        return tuple(key for key, _ in self.places.get(column, ()))


def lay_out(machine: Machine, machines: Mapping[str, Machine], powers: PowerTable) -> Layout:
    """Find a machine's streams in the power table and say which tests its streams allow."""
    index = {key: place for place, key in enumerate(powers.streams)}
    places = {
        column: tuple((stream.key, index[stream.key]) for stream in machine.streams_of(role))
        for column, role in _ROLE_COLUMNS.items()
        if machine.streams_of(role)
    }
    thermal = [key for column in ("heat", "useful", "rejected") for key, _ in places.get(column, ())]
    all_warm = all(key in powers.entropic_K for key in thermal)
    rejects = [stream for stream in machine.streams_of(Role.REJECTED_HEAT) if _metered(stream, machines)]
    burns, works = "fuel" in places, "work" in places
    only_passes_heat_on = not burns and not works and "useful" in places and "rejected" not in places
    testable = bool(rejects) or only_passes_heat_on
    ceiling = machine.ceiling if _has_what_it_needs(machine, powers) else None
    heat_engine = works and not burns and "heat" in places and ceiling is not None
    return Layout(
        machine=machine,
        places=places,
        ceiling=ceiling,
        rejection_demanded=heat_engine and all_warm,
        entropy=not burns and "heat" in places and all_warm and testable,
        exchanger=only_passes_heat_on and "heat" in places and "power_in" not in places and all_warm,
        testable=testable,
    )


def _metered(stream: Stream, machines: Mapping[str, Machine]) -> bool:
    """Whether a stream is metered, rather than a stated share or constant."""
    way = stream.way
    while isinstance(way, SameAs):
        way = machines[way.machine].streams[way.stream].way
    return not isinstance(way, ShareOf | Constant)


def _has_what_it_needs(machine: Machine, powers: PowerTable) -> bool:
    ceiling = machine.ceiling
    if ceiling is None:
        return False
    if ceiling.kind is CeilingKind.FUEL_EXERGY:
        fuels = machine.streams_of(Role.FUEL_IN)
        return bool(fuels) and all(stream.key in powers.exergy_W for stream in fuels)
    names = (ceiling.source, *ceiling.sinks)
    keys = [machine.streams[name].key for name in names if name is not None]
    return all(key in powers.entropic_K and key in powers.inlet_K for key in keys)
