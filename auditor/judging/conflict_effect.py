"""What the choice between two values of a flow or an amount moves in energy."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.findings import Finding, FindingCode

if TYPE_CHECKING:
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

_PROPORTIONAL = ("mass", "mass flow", "volume", "volume flow")
"""Quantities in which the power of a stream is proportional, all its other inputs being the same."""


def with_effect(finding: Finding, quantity: str, powers: PowerTable, ticks: TickTable) -> Finding:
    """Give a conflict of a flow or an amount the energy that the choice moves.

    ``effect_J = |difference of the two sums| * sum(P) / sum(flow)``, over the ticks of the conflict in which
    both are known; of several streams that the tag feeds the largest.

    Parameters
    ----------
    finding : Finding
        Of any code; others are handed back as they are.
    quantity : str
        Quantity of the finding's tag.
    powers : PowerTable
    ticks : TickTable

    Returns
    -------
    Finding
        With the number ``effect_J`` and as large in ``energy_J``, where the effect is known.
    """
    is_sized = finding.code is FindingCode.CONFLICT and "effect_SI_s" in finding.numbers
    if not is_sized or quantity not in _PROPORTIONAL or finding.tag not in ticks.tags:
        return finding
    if finding.start_us is None or finding.end_us is None:
        return finding
    column = ticks.tags.index(finding.tag)
    tick_us = ticks.grid.tick_s * 1_000_000
    inside = (ticks.grid.start_us + tick_us > finding.start_us) & (ticks.grid.start_us < finding.end_us)
    flow = np.abs(ticks.mean[:, column])
    largest = 0.0
    for index, key in enumerate(powers.streams):
        if ticks.columns[column] not in powers.inputs[key]:
            continue
        both = inside & powers.known[:, index] & np.isfinite(flow)
        total = float(flow[both].sum())
        if total > 0.0:
            largest = max(largest, float(np.abs(powers.power_W[both, index]).sum()) / total)
    if largest == 0.0:
        return finding
    effect_J = abs(finding.numbers["effect_SI_s"]) * largest
    return replace(finding, energy_J=effect_J, numbers={**finding.numbers, "effect_J": effect_J})
