"""What a ceiling from temperatures takes for granted: all heat in at its source, all heat out at its sinks.

An engine whose heat also enters elsewhere, or leaves colder than the sinks that are named, may lawfully
beat the ceiling that source and sinks alone give: such a ceiling would call a sound machine impossible.
"""

from __future__ import annotations

from auditor.plant_file.faults import FaultBook
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.machine_parts import MachinePart, ReservoirCeiling
from auditor.records.machines import Role

_HEAT_OUT = (Role.REJECTED_HEAT, Role.USEFUL_HEAT)


def check_premises(ceiling: ReservoirCeiling, part: MachinePart, place: KeyPath, book: FaultBook) -> None:
    """Note every stream of heat that the ceiling of its machine leaves out.

    A source or a sink that is no such stream itself has been noted already; its side is left alone.
    """
    roles = {name: getattr(stream, "role", None) for name, stream in (part.streams or {}).items()}
    sinks = ceiling.sink or ()
    if roles.get(ceiling.source or "") is Role.HEAT_IN:
        for name in (name for name, role in roles.items() if role is Role.HEAT_IN and name != ceiling.source):
            book.add(
                (*place, "source"),
                f'the stream "{name}" brings heat in too, so "{ceiling.source}" alone sets no limit',
                'draw the boundary so that all heat enters by one stream, or write ceiling = "none"',
            )
    if sinks and all(roles.get(sink) in _HEAT_OUT for sink in sinks):
        for name in (name for name, role in roles.items() if role in _HEAT_OUT and name not in sinks):
            named = ", ".join(f'"{sink}"' for sink in (*sinks, name))
            book.add(
                (*place, "sink"),
                f'the stream "{name}" takes heat out too, so the sinks named set no limit',
                f'write sink = [{named}], or write ceiling = "none"',
            )
