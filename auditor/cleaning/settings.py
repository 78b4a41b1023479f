"""What cleaning needs to know of the plant."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from auditor.records.machines import (
    CombustionAir,
    FlowAndTemperatures,
    FlueGasHeat,
    GasVolume,
    LiquidFuel,
    Machine,
    Power,
    Running,
    SameAs,
    Shaft,
    Way,
)
from auditor.records.plant import Distrust, Export, Plant, Tag


@dataclass(frozen=True)
class CleaningSettings:
    """The slice of the plant file that decides what becomes of a sample."""

    exports: Mapping[str, Export]
    tags: Mapping[str, Tag]
    """In the order of the plant file, which is the order of the tick table's columns."""
    distrust: tuple[Distrust, ...]
    running: Mapping[str, Running]
    """Per machine: when it runs."""
    users: Mapping[str, tuple[str, ...]]
    """Per tag: the machines whose streams use it; a tag no machine uses is absent."""

    @classmethod
    def from_plant(cls, plant: Plant) -> CleaningSettings:
        """Take from a plant what cleaning needs."""
        users: dict[str, list[str]] = {}
        for machine in plant.machines.values():
            for tag in dict.fromkeys(_tags_of(machine, plant)):
                users.setdefault(tag, []).append(machine.name)
        return cls(
            exports=plant.exports,
            tags=plant.tags,
            distrust=plant.distrust,
            running={name: machine.running for name, machine in plant.machines.items()},
            users={tag: tuple(names) for tag, names in users.items()},
        )


def _tags_of(machine: Machine, plant: Plant) -> Iterator[str]:
    """Give the tags that the streams of a machine are made of, those of streams shared with others too."""
    for stream in machine.streams.values():
        way: Way = stream.way
        while isinstance(way, SameAs):
            way = plant.machines[way.machine].streams[way.stream].way
        yield from (tag for tag in _tags_of_way(way, plant) if tag is not None)


def _tags_of_way(way: Way, plant: Plant) -> tuple[str | None, ...]:
    match way:
        case GasVolume():
            meter = plant.gas_meters[way.meter]
            return way.volume, meter.pressure, meter.temperature
        case LiquidFuel():
            return way.mass, way.volume, way.temperature
        case Power():
            return (way.tag,)
        case Shaft():
            return way.torque, way.speed
        case FlowAndTemperatures():
            return way.flow, way.inlet, way.outlet
        case FlueGasHeat():
            return way.oxygen, way.inlet, way.outlet
        case CombustionAir():
            return way.oxygen, way.temperature
        case _:
            return ()
