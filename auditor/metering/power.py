"""Electrical power from a power tag or an energy tag."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.metered import Metered

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import Power


def meter_power(way: Power, read: Reader) -> Metered:
    """Electrical power; the tick mean of an energy counter is a power [W] already."""
    return Metered(read.value(way.tag))
