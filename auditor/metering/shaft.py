"""Shaft power from torque and rotational speed."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.metered import Metered
from auditor.physics import shaft_power_W

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import Shaft


def meter_shaft(way: Shaft, read: Reader) -> Metered:
    """Shaft power, ``P = 2 pi n M``, of tick means: torque or speed must be steady within a tick.

    The speed is in revolutions per second.
    """
    return Metered(shaft_power_W(read.value(way.torque), read.value(way.speed)))
