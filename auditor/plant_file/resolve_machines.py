"""Machines: gates, headline, ceiling and streams, checked against what their kind can have."""

from __future__ import annotations

from auditor.plant_file.ceiling_premises import check_premises
from auditor.plant_file.evidence import number_tag, running_rule
from auditor.plant_file.faults import FaultBook, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.machine_parts import (
    FlowStream,
    FlueGasStream,
    FuelExergyCeiling,
    GasVolumeStream,
    LiquidFuelStream,
    MachinePart,
    ReservoirCeiling,
    SharedStream,
)
from auditor.plant_file.references import Declared, change_of
from auditor.plant_file.resolve_streams import check_share_cycles, resolve_stream
from auditor.plant_file.stream_place import Place
from auditor.records.kinds import KINDS, Kind
from auditor.records.machines import Ceiling, CeilingKind, Machine, Role, Running, Steady, Stream


def resolve_machines(declared: Declared, book: FaultBook) -> dict[str, Machine]:
    """Make the records of the machines."""
    machines = {name: _machine(name, part, declared, book) for name, part in declared.machines.items()}
    return {name: machine for name, machine in machines.items() if machine is not None}


def _machine(name: str, part: MachinePart, declared: Declared, book: FaultBook) -> Machine | None:
    path: KeyPath = ("machines", name)
    kind = None if part.kind is None else KINDS.get(part.kind)
    if kind is None and part.kind is not None:
        book.add((*path, "kind"), f'"{part.kind}" is no kind of machine', choices(part.kind, KINDS))
    streams = _streams(name, part, declared, book)
    running = _running(part, declared, path, book)
    steady = _steady(part, declared, path, book)
    if kind is not None:
        _check_roles(kind, part, path, book)
        _check_output(kind, part, path, book)
    _check_fuels(part, declared, path, book)
    ceiling = _ceiling(kind, part, declared, (path, book))
    check_share_cycles(name, part, book)
    if not book.clean(path) or running is None:
        return None
    return Machine(
        name=name,
        title=part.title or name,
        kind=part.kind,
        basis=part.heating_value,
        headline=part.headline,
        rated_power_W=None if part.rated_power is None else part.rated_power.value,
        minimum_load=None if part.minimum_load is None else part.minimum_load.value,
        running=running,
        steady=steady,
        ceiling=ceiling,
        streams=streams,
        line=book.line(path),
    )


def _streams(name: str, part: MachinePart, declared: Declared, book: FaultBook) -> dict[str, Stream]:
    path: KeyPath = ("machines", name)
    raw = part.streams or {}
    streams: dict[str, Stream] = {}
    for place, word in (((path), name), *(((*path, "streams", key), key) for key in raw)):
        if "." in word:
            book.add(
                place, f'the name "{word}" holds a dot', "a dot joins machine and stream: choose another name"
            )
    for key, stream_part in raw.items():
        stream = resolve_stream(stream_part, Place(name, key, raw, declared, book))
        if stream is not None:
            streams[key] = stream
    return streams


def _running(part: MachinePart, declared: Declared, path: KeyPath, book: FaultBook) -> Running | None:
    rule, place = part.running, (*path, "running")
    if rule is None or rule.tag is None:
        return None
    return running_rule(rule, declared, place, book)


def _steady(part: MachinePart, declared: Declared, path: KeyPath, book: FaultBook) -> Steady | None:
    rule, place = part.steady, (*path, "steady")
    if rule is None:
        return None
    tag = number_tag(rule.tag, "name a tag of power or flow", declared, (*place, "tag"), book)
    interval_s = None if declared.site is None else declared.site.interval_s
    if rule.within is not None and interval_s is not None and rule.within.value < interval_s:
        book.add(
            (*place, "within"),
            f"{rule.within.declared} is shorter than one interval, so there is nothing to compare",
            'write at least one interval, such as within = "30 min"',
        )
    if tag is None or rule.change_below is None or rule.within is None:
        return None
    change = book.attempt((*place, "change_below"), change_of, rule.change_below, tag)
    return None if change is None else Steady(rule.tag, change, rule.within.value)


def _check_roles(kind: Kind, part: MachinePart, path: KeyPath, book: FaultBook) -> None:
    roles = {name: getattr(stream, "role", None) for name, stream in (part.streams or {}).items()}
    for name, role in roles.items():
        if role is not None and role not in kind.roles:
            words = ", ".join(f'"{each.value}"' for each in Role if each in kind.roles)
            book.add(
                (*path, "streams", name, "role"),
                f'a machine of the kind "{kind.name}" has no stream with the role "{role.value}"',
                f"write one of {words}, or correct the machine's kind",
            )
    if not roles or None in roles.values():
        return
    needed = [Role.FUEL_IN if kind.burns_fuel else Role.HEAT_IN]
    needed += [Role.WORK_OUT] if kind.gives_work else []
    for role in needed:
        if role not in roles.values():
            book.add(
                (*path, "streams"),
                f'no stream has the role "{role.value}", which a machine of the kind "{kind.name}" needs',
                f'declare the stream with role = "{role.value}", or correct the machine\'s kind',
            )


def _check_output(kind: Kind, part: MachinePart, path: KeyPath, book: FaultBook) -> None:
    """Check the keys that only a machine with work out has."""
    if kind.gives_work:
        if part.headline is None and book.clean((*path, "headline")):
            book.add(
                (*path, "headline"),
                'the key "headline" is missing',
                'add headline = "gross" or headline = "net": the figure on page one',
            )
        roles = [getattr(stream, "role", None) for stream in (part.streams or {}).values()]
        if part.headline == "net" and roles and Role.OWN_USE not in roles and None not in roles:
            book.add(
                (*path, "headline"),
                'the headline is "net", but no stream has the role "own use" that makes it so',
                'declare what the auxiliaries take with role = "own use", or write headline = "gross"',
            )
        if part.minimum_load is not None and part.minimum_load.value >= 1.0:
            book.add(
                (*path, "minimum_load"),
                f"{part.minimum_load.declared} of the rated power leaves no interval to judge",
                'write for example minimum_load = "30 %"',
            )
        if part.minimum_load is not None and part.rated_power is None and book.clean((*path, "rated_power")):
            book.add(
                (*path, "rated_power"),
                'the key "rated_power" is missing, but minimum_load is a share of it',
                'add rated_power = "1000 kW", or remove minimum_load',
            )
        return
    for key in ("headline", "rated_power", "minimum_load"):
        if getattr(part, key) is not None:
            book.add((*path, key), f'a machine of the kind "{kind.name}" gives no work', "remove the key")


def _check_fuels(part: MachinePart, declared: Declared, path: KeyPath, book: FaultBook) -> None:
    """Check the heating-value basis, and that every fuel states it on every date."""
    streams = part.streams or {}
    burns = any(getattr(stream, "role", None) == Role.FUEL_IN for stream in streams.values())
    basis = part.heating_value
    if basis is None:
        if burns and book.clean((*path, "heating_value")):
            book.add(
                (*path, "heating_value"),
                'the key "heating_value" is missing',
                'add heating_value = "lower" or heating_value = "higher": the basis of the headline figure; '
                "the two differ by about 11 % for natural gas",
            )
        return
    if streams and not burns and all(getattr(stream, "role", None) for stream in streams.values()):
        book.add((*path, "heating_value"), "the machine has no fuel stream", "remove the key")
    for name in dict.fromkeys(_fuel_names(part, declared)):
        fuel = declared.fuels.get(name)
        for index, entry in enumerate(fuel.values if fuel is not None else ()):
            place = ("fuels", name, "values", index, basis)
            if getattr(entry, basis) is None and book.clean(place):
                book.add(
                    place,
                    f'the {basis} heating value is missing, but machine "{path[1]}" is judged on it',
                    f"add {basis} to this entry, or change the machine's heating_value",
                )


def _fuel_names(part: MachinePart, declared: Declared) -> list[str]:
    """Fuels that a machine burns, also through the streams of others."""
    names = []
    for stream in (part.streams or {}).values():
        metered = _metered(stream, declared)
        if isinstance(metered, GasVolumeStream | LiquidFuelStream) and metered.fuel is not None:
            names.append(metered.fuel)
    return names


def _metered(stream: object, declared: Declared) -> object:
    """Find the metered stream behind one that is the same as another machine's."""
    if not isinstance(stream, SharedStream) or stream.same_as is None:
        return stream
    machine, _, name = stream.same_as.partition(".")
    target = declared.machines.get(machine)
    return None if target is None else (target.streams or {}).get(name)


def _ceiling(
    kind: Kind | None, part: MachinePart, declared: Declared, noting: tuple[KeyPath, FaultBook]
) -> Ceiling | None:
    path, book = noting
    place: KeyPath = (*path, "ceiling")
    ceiling = part.ceiling
    if ceiling is None:
        if kind is not None and kind.gives_work and book.clean(place):
            words = " or ".join(f'ceiling = {{ kind = "{each.value}", ... }}' for each in kind.ceilings)
            book.add(place, 'the key "ceiling" is missing', f'add {words}, or ceiling = "none"')
        return None
    if not isinstance(ceiling, FuelExergyCeiling | ReservoirCeiling) or ceiling.kind is None:
        return None
    if kind is not None and CeilingKind(ceiling.kind) not in kind.ceilings:
        valid = " or ".join(f'{{ kind = "{each.value}" }}' for each in kind.ceilings)
        book.add(
            (*place, "kind"),
            f'"{ceiling.kind}" is no ceiling of a machine of the kind "{kind.name}". {kind.reason}',
            f"write ceiling = {valid}" if valid else 'remove the key, or write ceiling = "none"',
        )
        return None
    if isinstance(ceiling, FuelExergyCeiling):
        _check_exergy(part, declared, path, book)
        return Ceiling(CeilingKind.FUEL_EXERGY, None, ())
    sinks = (Role.REJECTED_HEAT, Role.USEFUL_HEAT)
    _check_reservoir(ceiling.source, (Role.HEAT_IN,), part, declared, ((*place, "source"), book))
    for sink in ceiling.sink or ():
        _check_reservoir(sink, sinks, part, declared, ((*place, "sink"), book))
    check_premises(ceiling, part, place, book)
    return Ceiling(CeilingKind(ceiling.kind), ceiling.source, ceiling.sink)


def _check_exergy(part: MachinePart, declared: Declared, path: KeyPath, book: FaultBook) -> None:
    for name in dict.fromkeys(_fuel_names(part, declared)):
        fuel = declared.fuels.get(name)
        if fuel is not None and fuel.exergy is None:
            book.add(
                ("fuels", name, "exergy"),
                f'the key "exergy" is missing, but it is the ceiling of machine "{path[1]}"',
                'add exergy = { value = 1.04, of = "lower", standard = 0.01 }, or write ceiling = "none"',
            )


def _check_reservoir(
    name: str | None,
    roles: tuple[Role, ...],
    part: MachinePart,
    declared: Declared,
    noting: tuple[KeyPath, FaultBook],
) -> None:
    """Check that a source or sink is a stream of this machine with temperatures and a fitting role."""
    path, book = noting
    streams = part.streams or {}
    if name is None:
        return
    fitting = [key for key, stream in streams.items() if getattr(stream, "role", None) in roles]
    if name not in streams:
        book.add(
            path, f'this machine has no stream "{name}"', f"name one of its streams; {choices(name, fitting)}"
        )
        return
    role = getattr(streams[name], "role", None)
    words = " or ".join(f'"{each.value}"' for each in roles)
    if role is not None and role not in roles:
        book.add(
            path, f'the stream "{name}" has the role "{role.value}", not {words}', choices(name, fitting)
        )
        return
    metered = _metered(streams[name], declared)
    if isinstance(metered, FlowStream | FlueGasStream | None):
        return
    book.add(
        path,
        f'the stream "{name}" has no temperatures',
        'name a stream by = "flow and temperatures"; a ceiling stands on measured temperatures',
    )
