"""Machines, the streams that cross their balance boundaries, and the ways a stream is metered."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from auditor.records.uncertain import Assumed


class Role(StrEnum):
    """What a stream is in the balance of its machine."""

    FUEL_IN = "fuel in"
    HEAT_IN = "heat in"
    POWER_IN = "power in"
    """In the first law, not in the denominator of an efficiency."""
    WORK_OUT = "work out"
    USEFUL_HEAT = "useful heat"
    REJECTED_HEAT = "rejected heat"
    LOSS = "loss"
    """Leaves without being metered: radiation, unburnt fuel, generator."""
    OWN_USE = "own use"
    """Taken off gross work for the net figure; outside the first law."""


@dataclass(frozen=True)
class GasVolume:
    """Fuel power from a gas volume: ``volume`` tag, meter, fuel."""

    fuel: str
    volume: str
    meter: str


@dataclass(frozen=True)
class LiquidFuel:
    """Fuel power from a liquid fuel's mass, or from its volume and temperature."""

    fuel: str
    mass: str | None
    """Tag of mass, mass flow or a counter of mass."""
    volume: str | None
    temperature: str | None
    """Tag of the fuel's temperature at the meter; needed with ``volume`` and an expansion coefficient."""


@dataclass(frozen=True)
class Power:
    """Electrical power from a power tag or an energy tag."""

    tag: str
    measured_at: str
    """Free words for the boundary table: ``generator terminals``."""


@dataclass(frozen=True)
class Shaft:
    """Shaft power from torque and rotational speed."""

    torque: str
    speed: str


@dataclass(frozen=True)
class FlowAndTemperatures:
    """Heat carried by a liquid or gas: mass flow times the enthalpy difference of inlet and outlet."""

    flow: str
    """Tag of mass flow or of volume flow (then the density at the meter's place is taken)."""
    flow_at: Literal["inlet", "outlet"] | None
    """Where a volume-flow meter sits; None for a mass flow."""
    inlet: str
    """Temperature tag where the carrier enters the machine's boundary (or exchanger)."""
    outlet: str
    fluid: str


@dataclass(frozen=True)
class FlueGasHeat:
    """Sensible heat of flue gas between two temperatures, its mass flow from a fuel stream and dry oxygen."""

    of: str
    """The fuel-in stream of the same machine."""
    oxygen: str
    inlet: str
    """Temperature tag of the hot side."""
    outlet: str | None
    """Temperature tag of the cool side; None: the site's reference temperature."""


@dataclass(frozen=True)
class CombustionAir:
    """Sensible heat of the combustion air against the reference temperature; negative for cold air."""

    of: str
    oxygen: str
    temperature: str
    """Tag of the air that enters."""


@dataclass(frozen=True)
class ShareOf:
    """A stated share of another stream of the same machine."""

    of: str
    share: Assumed


@dataclass(frozen=True)
class Constant:
    """A stated constant power while the machine runs."""

    power: Assumed
    """[W]."""


@dataclass(frozen=True)
class SameAs:
    """The very stream of another machine, seen from this one's side."""

    machine: str
    stream: str


Way = (
    GasVolume
    | LiquidFuel
    | Power
    | Shaft
    | FlowAndTemperatures
    | FlueGasHeat
    | CombustionAir
    | ShareOf
    | Constant
    | SameAs
)


@dataclass(frozen=True)
class Stream:
    """One stream that crosses a machine's balance boundary."""

    name: str
    machine: str
    role: Role
    way: Way
    line: int = 0

    @property
    def key(self) -> str:
        """``machine.stream``, its name in the power table."""
        return f"{self.machine}.{self.name}"


@dataclass(frozen=True)
class Running:
    """When the machine runs: a tag above a value, or a state tag in a state."""

    tag: str
    above: float | None
    state: str | None

    @property
    def tick_column(self) -> str:
        """The column of the tick table to look at."""
        return self.tag if self.state is None else f"{self.tag}={self.state}"


@dataclass(frozen=True)
class Steady:
    """An interval is steady when the tag's interval means around it change by less than a limit."""

    tag: str
    change_below: float
    """SI of the tag's tick mean."""
    within_s: float


class CeilingKind(StrEnum):
    """Kinds of ceiling; always printed with the figure."""

    TWO_RESERVOIRS = "two reservoirs"
    FINITE = "finite source and sink"
    FUEL_EXERGY = "fuel exergy"


@dataclass(frozen=True)
class Ceiling:
    """Which limit the machine is held against, and the streams whose temperatures give it."""

    kind: CeilingKind
    source: str | None
    """Stream name; None for fuel exergy."""
    sinks: tuple[str, ...]
    """Stream names; empty for fuel exergy."""


@dataclass(frozen=True)
class Machine:
    """What is audited: a boundary with streams, and the gates of its verdicts."""

    name: str
    title: str
    kind: str
    """A key of the table of machine kinds, e.g. ``gas engine``."""
    basis: Literal["lower", "higher"] | None
    """Heating-value basis of the headline; None without fuel streams."""
    headline: Literal["gross", "net"] | None
    """None for a machine that gives no work."""
    rated_power_W: float | None
    minimum_load: float | None
    """Share of rated gross power [1]."""
    running: Running
    steady: Steady | None
    ceiling: Ceiling | None
    streams: Mapping[str, Stream]
    """In the order of the plant file."""
    line: int = 0

    def streams_of(self, *roles: Role) -> tuple[Stream, ...]:
        """Streams with one of the roles, in the order of the plant file."""
        return tuple(stream for stream in self.streams.values() if stream.role in roles)
