"""A stated constant power while the machine runs."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.metered import Metered

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import Constant


def meter_constant(way: Constant, read: Reader) -> Metered:
    """Stated power where the machine runs, nothing where it stands still, unknown otherwise."""
    return Metered(read.number(way.power) * read.running())
