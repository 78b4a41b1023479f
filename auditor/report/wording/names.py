"""How machines, tags, streams, figures and sources are called in sentences."""

from __future__ import annotations

from auditor.records.machines import Machine, Role
from auditor.records.nomenclature import TERMS
from auditor.records.plant import Plant
from auditor.records.powers import Source

ROLES: dict[Role, tuple[str, str]] = {
    Role.FUEL_IN: ("fuel in", "fuel that enters"),
    Role.HEAT_IN: ("heat in", "heat that enters"),
    Role.POWER_IN: ("power in", "power that enters the working fluid; in the balance, not in an efficiency"),
    Role.WORK_OUT: ("work out", "work delivered"),
    Role.USEFUL_HEAT: ("useful heat", "heat delivered to a consumer"),
    Role.REJECTED_HEAT: ("rejected heat", "heat given to the surroundings"),
    Role.LOSS: ("loss", "leaves without a meter: radiation, unburnt fuel, generator"),
    Role.OWN_USE: ("own use", "taken off gross work for the net figure; outside the balance"),
}
"""Per role: its label, and what it stands for."""

INWARD = (Role.FUEL_IN, Role.HEAT_IN, Role.POWER_IN)


def plain(identifier: str) -> str:
    """Write an identifier of the plant file as words: ``own_use`` becomes ``own use``."""
    return identifier.replace("_", " ")


def machine(plant: Plant, name: str | None) -> str:
    """Title of a machine, lower case at the start where it begins with an ordinary word."""
    if name is None:
        return "the site"
    return plant.machines[name].title if name in plant.machines else name


def tag(plant: Plant, name: str | None) -> str:
    """Name a tag with the heading it has in the export: ``oil_flow (column TO-F)``."""
    if name is None:
        return "a tag"
    if name not in plant.tags or plant.tags[name].column == name:
        return name
    return f"{name} (column {plant.tags[name].column})"


def units(text: str) -> str:
    """Write the unit spellings of plain text as they stand on paper."""
    return text.replace("degC", "°C")


def figure(key: str) -> str:
    """Title of a figure of the nomenclature; the key in words when it is not one."""
    return TERMS[key].title if key in TERMS else plain(key)


def listing(words: tuple[str, ...] | list[str]) -> str:
    """Join words: ``a``, ``a and b``, ``a, b and c``."""
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} and {words[-1]}"


def sentence(text: str) -> str:
    """Capital letter first, whatever follows unchanged."""
    return text[:1].upper() + text[1:]


def basis(declared: Machine) -> str:
    """Say what an efficiency of the machine is counted against."""
    against = []
    if declared.streams_of(Role.FUEL_IN):
        against.append(f"the fuel's {declared.basis} heating value")
    if declared.streams_of(Role.HEAT_IN):
        against.append("the heat that enters")
    return listing(against) or "its input"


def source(plant: Plant, origin: Source) -> str:
    """One source of uncertainty in words, with what the plant file declares about it."""
    if origin.kind == "assumed":
        return f"assumed number {origin.name}"
    declared = plant.tags.get(origin.name)
    if origin.kind == "calibration":
        since = origin.key.removeprefix(f"calibration:{origin.name}").removeprefix("@")
        for change in declared.changes if declared and since else ():
            declared = change.tag if change.since == since else declared
        words = declared.calibration.declared if declared and declared.calibration else ""
        known = f"calibration of {tag(plant, origin.name)}" + (f" from {since} on" if since else "")
        return known + (f": {words}" if words else "")
    if declared is not None and declared.random is not None:
        return f"scatter of {tag(plant, origin.name)}: {declared.random.declared}"
    return f"scatter of {tag(plant, origin.name)}, estimated from its own readings"
