"""The slice of the plant that metering is handed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from auditor.records.machines import Machine, Stream
    from auditor.records.plant import Fluid, Fuel, GasMeter, Plant, Rules, Site, Tag


@dataclass(frozen=True)
class MeteringSettings:
    """What metering needs to know of the plant."""

    site: Site
    rules: Rules
    tags: Mapping[str, Tag]
    """In the order of the plant file."""
    fluids: Mapping[str, Fluid]
    fuels: Mapping[str, Fuel]
    gas_meters: Mapping[str, GasMeter]
    machines: Mapping[str, Machine]

    @classmethod
    def from_plant(cls, plant: Plant) -> MeteringSettings:
        """Cut the slice out of the whole plant."""
        return cls(
            site=plant.site,
            rules=plant.rules,
            tags=plant.tags,
            fluids=plant.fluids,
            fuels=plant.fuels,
            gas_meters=plant.gas_meters,
            machines=plant.machines,
        )

    def streams(self) -> dict[str, Stream]:
        """All streams by ``machine.stream`` key, in the order of the plant file."""
        return {
            stream.key: stream for machine in self.machines.values() for stream in machine.streams.values()
        }
