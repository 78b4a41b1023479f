"""The kinds of machine that can be audited: what they burn and give, their ceilings, their believable bands.

A band is a range of efficiencies outside which a person should look at the instruments before believing the
machine. It is no law and no guarantee; each band says where it comes from.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import NamedTuple

from auditor.records.machines import CeilingKind, Role


class Band(NamedTuple):
    """Believable range of one efficiency [1]."""

    low: float
    high: float


@dataclass(frozen=True)
class Kind:
    """One row of the table of machine kinds."""

    name: str
    burns_fuel: bool
    gives_work: bool
    internal_combustion: bool
    """Burns its fuel inside the cylinder: no stream that leaves it is the source of its work."""
    roles: frozenset[Role]
    """Roles that its streams may have."""
    ceilings: tuple[CeilingKind, ...]
    """Ceilings it may be held against; empty for kinds that give no work."""
    bands: Mapping[str, Band]
    """Believable band by figure (a key of the nomenclature), on the lower heating value where fuel burns."""
    reason: str
    """Why these ceilings and no others."""
    bands_from: str
    """Where the bands come from."""

    @property
    def note(self) -> str:
        """Both reasons in one paragraph."""
        return f"{self.reason} Bands: {self.bands_from}"


_NO_SOURCE = "common practice, no source."
_IN_AND_OUT = frozenset({Role.POWER_IN, Role.USEFUL_HEAT, Role.REJECTED_HEAT, Role.LOSS})
_ENGINE = _IN_AND_OUT | {Role.FUEL_IN, Role.WORK_OUT, Role.OWN_USE}
_HEAT_ENGINE = _IN_AND_OUT | {Role.HEAT_IN, Role.WORK_OUT, Role.OWN_USE}
_EXCHANGER = _IN_AND_OUT | {Role.HEAT_IN}
_BOILER = _IN_AND_OUT | {Role.FUEL_IN, Role.HEAT_IN}
_RESERVOIRS = (CeilingKind.FINITE, CeilingKind.TWO_RESERVOIRS)

_INTERNAL_COMBUSTION = (
    "Jacket and exhaust carry what is left of the heat, they are not its source: their temperatures would "
    "make every such engine impossible. The strict limit on its work is the chemical exergy of its fuel."
)
_EXTERNAL_HEAT = "All its heat enters from streams with temperatures, so these set the limit on its work."
_NO_WORK = (
    "It gives no work, so nothing limits that; crossing temperatures and falling entropy are tested instead."
)

_ROWS = (
    Kind(
        name="gas engine",
        burns_fuel=True,
        gives_work=True,
        internal_combustion=True,
        roles=_ENGINE,
        ceilings=(CeilingKind.FUEL_EXERGY,),
        bands=MappingProxyType({"gross": Band(0.25, 0.52), "total": Band(0.30, 1.00)}),
        reason=_INTERNAL_COMBUSTION,
        bands_from=f"{_NO_SOURCE} At full load 0.36 to 0.46 gross and 0.80 to 0.90 in total, "
        "0.95 with condensation; the band leaves room for part load and for heat that nobody takes.",
    ),
    Kind(
        name="diesel genset",
        burns_fuel=True,
        gives_work=True,
        internal_combustion=True,
        roles=_ENGINE,
        ceilings=(CeilingKind.FUEL_EXERGY,),
        bands=MappingProxyType({"gross": Band(0.20, 0.52), "total": Band(0.20, 1.00)}),
        reason=_INTERNAL_COMBUSTION,
        bands_from=f"{_NO_SOURCE} At full load 0.33 to 0.45 gross; large slow engines reach 0.50.",
    ),
    Kind(
        name="organic Rankine engine",
        burns_fuel=False,
        gives_work=True,
        internal_combustion=False,
        roles=_HEAT_ENGINE,
        ceilings=_RESERVOIRS,
        bands=MappingProxyType({"gross": Band(0.04, 0.26)}),
        reason=_EXTERNAL_HEAT,
        bands_from=f"{_NO_SOURCE} Gross 0.08 to 0.12 from sources of 100 to 150 degC, "
        "0.15 to 0.24 from 250 to 310 degC; the band leaves room for part load.",
    ),
    Kind(
        name="generic heat engine",
        burns_fuel=False,
        gives_work=True,
        internal_combustion=False,
        roles=_HEAT_ENGINE,
        ceilings=_RESERVOIRS,
        bands=MappingProxyType({}),
        reason=_EXTERNAL_HEAT,
        bands_from="none, for nothing is known of the machine but its streams.",
    ),
    Kind(
        name="heat exchanger",
        burns_fuel=False,
        gives_work=False,
        internal_combustion=False,
        roles=_EXCHANGER,
        ceilings=(),
        bands=MappingProxyType({"heat": Band(0.70, 1.00)}),
        reason=_NO_WORK,
        bands_from=f"{_NO_SOURCE} Well-lagged exchangers lose 0.5 to 5 %; above 1 more leaves than enters.",
    ),
    Kind(
        name="boiler",
        burns_fuel=True,
        gives_work=False,
        internal_combustion=False,
        roles=_BOILER,
        ceilings=(),
        bands=MappingProxyType({"heat": Band(0.60, 1.08)}),
        reason=_NO_WORK,
        bands_from=f"{_NO_SOURCE} 0.88 to 0.95 for gas, 0.86 to 0.93 for oil, up to 1.07 with condensation "
        "(on the lower heating value); the band leaves room for cycling at low load.",
    ),
)

KINDS: Mapping[str, Kind] = MappingProxyType({kind.name: kind for kind in _ROWS})
"""Every kind by name, in the order they are listed to a person."""
