"""Streams: what each points at, checked, and their records."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from auditor.plant_file.faults import FaultBook, choices
from auditor.plant_file.machine_parts import (
    CombustionAirStream,
    ConstantStream,
    FlowStream,
    FlueGasStream,
    GasVolumeStream,
    LiquidFuelStream,
    MachinePart,
    PowerStream,
    ShaftStream,
    SharedStream,
    ShareStream,
)
from auditor.plant_file.parts import Part
from auditor.plant_file.references import find
from auditor.plant_file.resolve_carriers import (
    combustion_air,
    flow_and_temperatures,
    flue_gas,
    gas_volume,
    liquid_fuel,
)
from auditor.plant_file.stated import stated
from auditor.plant_file.stream_place import Place
from auditor.records.machines import (
    Constant,
    Power,
    Role,
    SameAs,
    Shaft,
    ShareOf,
    Stream,
    Way,
)

_HEAT_ROLES = frozenset({Role.HEAT_IN, Role.USEFUL_HEAT, Role.REJECTED_HEAT, Role.LOSS})
_POWER_ROLES = frozenset({Role.WORK_OUT, Role.POWER_IN, Role.OWN_USE, Role.LOSS})
_STATED_ROLES = frozenset({Role.POWER_IN, Role.OWN_USE, Role.LOSS})

ROLES_BY_FORM: Mapping[type[Part], frozenset[Role]] = {
    GasVolumeStream: frozenset({Role.FUEL_IN}),
    LiquidFuelStream: frozenset({Role.FUEL_IN}),
    PowerStream: _POWER_ROLES | _HEAT_ROLES,
    ShaftStream: _POWER_ROLES,
    FlowStream: _HEAT_ROLES,
    FlueGasStream: _HEAT_ROLES,
    CombustionAirStream: frozenset({Role.POWER_IN}),
    ShareStream: _STATED_ROLES,
    ConstantStream: _STATED_ROLES,
    SharedStream: frozenset(Role),
}
"""Roles that a stream metered in each way may have. A heat meter that logs energy is a power, so a power
may be heat. Combustion air is no heat input of an efficiency: it corrects the first law."""


def resolve_stream(part: Part, place: Place) -> Stream | None:
    """Make the record of one stream; None when something of it is at fault."""
    form = type(part)
    if form not in _RESOLVERS:
        return None
    role: Role | None = getattr(part, "role", None)
    allowed = ROLES_BY_FORM[form]
    if role is not None and role not in allowed:
        words = ", ".join(f'"{each.value}"' for each in Role if each in allowed)
        way = getattr(part, "by", "another machine")
        place.book.add(
            (*place.path, "role"),
            f'a stream metered by {way} cannot be "{role.value}"',
            f"write one of {words}, or meter the stream in another way",
        )
    way_record = _RESOLVERS[form](part, place)
    if not place.book.clean(place.path) or way_record is None or role is None:
        return None
    return Stream(place.name, place.machine, role, way_record, place.book.line(place.path))


def _power(part: PowerStream, place: Place) -> Way:
    place.tag("tag", part.tag, "power")
    if part.role == Role.WORK_OUT and part.measured_at is None:
        place.book.add(
            (*place.path, "measured_at"),
            'the key "measured_at" is missing',
            'add where the work is measured: measured_at = "generator terminals"',
        )
    return Power(part.tag, part.measured_at or "")


def _shaft(part: ShaftStream, place: Place) -> Way:
    place.tag("torque", part.torque, "torque")
    place.tag("speed", part.speed, "rotational speed")
    return Shaft(part.torque, part.speed)


def _share(part: ShareStream, place: Place) -> Way | None:
    if part.of is not None and part.of not in place.siblings:
        names = [name for name in place.siblings if name != place.name]
        place.book.add(
            (*place.path, "of"),
            f'this machine has no stream "{part.of}"',
            f"correct it; {choices(part.of, names)}",
        )
    number = None
    if part.share is not None:
        if not 0.0 <= part.share.value <= 1.0:
            place.book.add(
                (*place.path, "share"),
                f"a share of {part.share.declared} is not between 0 and 1",
                'write it such as 0.035, or "3.5 %"',
            )
        number = stated(part.share, part, place.path, place.book, under="share", source=part.source or "")
    return None if number is None else ShareOf(part.of, number)


def _constant(part: ConstantStream, place: Place) -> Way | None:
    if part.power is None:
        return None
    number = stated(part.power, part, place.path, place.book, under="power", source=part.source or "")
    return None if number is None else Constant(number)


def _shared(part: SharedStream, place: Place) -> Way | None:
    if part.same_as is None:
        return None
    path = (*place.path, "same_as")
    machine, _, stream = part.same_as.partition(".")
    target = find("machine", machine, place.declared.machines, path, place.book)
    if target is None:
        return None
    if machine == place.machine:
        place.book.add(
            path, f'"{part.same_as}" is a stream of this very machine', "name a stream of another machine"
        )
        return None
    streams = target.streams or {}
    if stream not in streams:
        place.book.add(
            path, f'machine "{machine}" has no stream "{stream}"', f"correct it; {choices(stream, streams)}"
        )
        return None
    twin = streams[stream]
    if isinstance(twin, SharedStream):
        place.book.add(
            path,
            f'"{part.same_as}" points at yet another stream ("{twin.same_as}")',
            f'point at the metered stream itself: same_as = "{twin.same_as}"',
        )
        return None
    role, other = part.role, getattr(twin, "role", None)
    if (
        role is not None
        and other is not None
        and _carrier(role) != _carrier(other)
        and Role.LOSS not in (role, other)
    ):
        place.book.add(
            (*place.path, "role"),
            f'"{part.same_as}" is "{other.value}" there, which cannot be "{role.value}" here',
            "heat stays heat, power stays power, and fuel stays fuel: correct one of the roles",
        )
    return SameAs(machine, stream)


def _carrier(role: Role) -> str:
    if role == Role.FUEL_IN:
        return "fuel"
    return "power" if role in (Role.WORK_OUT, Role.POWER_IN, Role.OWN_USE) else "heat"


_RESOLVERS: Mapping[type[Part], Callable[[Any, Place], Way | None]] = {
    GasVolumeStream: gas_volume,
    LiquidFuelStream: liquid_fuel,
    PowerStream: _power,
    ShaftStream: _shaft,
    FlowStream: flow_and_temperatures,
    FlueGasStream: flue_gas,
    CombustionAirStream: combustion_air,
    ShareStream: _share,
    ConstantStream: _constant,
    SharedStream: _shared,
}


def check_share_cycles(name: str, part: MachinePart, book: FaultBook) -> None:
    """Check that no stream is, through others, a share of itself."""
    streams = part.streams or {}
    of = {
        key: each.of for key, each in streams.items() if isinstance(each, ShareStream) and each.of in streams
    }
    for start in of:
        seen = [start]
        while seen[-1] in of and of[seen[-1]] not in seen:
            seen.append(of[seen[-1]])
        if of.get(seen[-1]) == start:
            chain = " of ".join(f'"{key}"' for key in (*seen, start))
            book.add(
                ("machines", name, "streams", start, "of"),
                f"the stream is a share of itself: {chain}",
                "let one of them be a share of a metered stream",
            )
