"""A stated share of another stream of the same machine."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.metering.metered import Metered

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.machines import ShareOf


def meter_share_of(way: ShareOf, read: Reader) -> Metered:
    """Share of another stream's power; of a fuel on the machine's basis."""
    of = read.other(f"{read.stream.machine}.{way.of}")
    return Metered(read.number(way.share) * of.power_W)
