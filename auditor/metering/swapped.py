"""Pairs of thermometers that are perhaps swapped: the stream flows backwards for most of the time."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Final

import numpy as np

from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import FlowAndTemperatures, Role

if TYPE_CHECKING:
    from auditor.records.machines import Stream
    from auditor.records.powers import PowerTable

MOST_OF_THE_TIME: Final = 0.8
"""Share of the running time with heat the wrong way round; valves and starts explain less. Common practice,
no source."""
LEAST_APART_K: Final = 1.0
"""Temperatures nearer to each other may cross by the errors of their thermometers. Common practice, no
source."""
_FEWEST_S: Final = 3600.0

_COOLS_DOWN = (Role.HEAT_IN, Role.POWER_IN)


def swapped_pairs(stream: Stream, table: PowerTable) -> Iterator[Finding]:
    """Ask whether the inlet and outlet of a stream are swapped.

    A carrier that brings heat must leave the machine cooler than it came, one that takes heat away warmer:
    which of the two is by the stream's role, so that a cooling or a source circuit, whose return is the
    warmer one, raises no question. Looked at are ticks in which the machine runs and heat is metered.
    """
    way = stream.way
    if not isinstance(way, FlowAndTemperatures):
        return
    index = table.streams.index(stream.key)
    heat_W = table.power_W[:, index]
    looked_at = table.known[:, index] & (table.running[stream.machine] == 1.0) & (heat_W != 0.0)
    looked_at_s = float(np.count_nonzero(looked_at) * table.grid.tick_s)
    if looked_at_s < _FEWEST_S:
        return
    rise_K = table.outlet_K[stream.key] - table.inlet_K[stream.key]
    wrong_K = rise_K if stream.role in _COOLS_DOWN else -rise_K
    wrong = looked_at & (wrong_K > LEAST_APART_K) & (heat_W < 0.0)
    share = float(np.count_nonzero(wrong) / np.count_nonzero(looked_at))
    if share < MOST_OF_THE_TIME:
        return
    yield Finding(
        FindingCode.SWAPPED_PAIR,
        machine=stream.machine,
        stream=stream.name,
        start_us=table.grid.period.start_us,
        end_us=table.grid.period.end_us,
        energy_J=abs(float(heat_W[wrong].sum())) * table.grid.tick_s,
        numbers={"share_of_time": share, "apart_K": float(wrong_K[wrong].mean())},
        words={"tags": f"{way.inlet}, {way.outlet}"},
        suspects=(way.inlet, way.outlet),
    )
