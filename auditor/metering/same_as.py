"""The very stream of another machine, seen from this one's side."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from auditor.metering.heating_values import on_basis
from auditor.metering.metered import Metered

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import SameAs


def meter_same_as(way: SameAs, read: Reader) -> Metered:
    """Numbers of the other stream; of a fuel on this machine's own basis."""
    twin = read.other(f"{way.machine}.{way.stream}")
    power = on_basis(twin.lower_W, twin.higher_W, read.machine.basis)
    return twin if power is None else replace(twin, power_W=power)
