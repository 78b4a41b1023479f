"""Readings out of range that would be usual in another unit: a question to a person, never a correction."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.findings import Finding, FindingCode

if TYPE_CHECKING:
    from auditor.records.plant import Tag
    from auditor.records.ticks import TickTable

TEMPERATURE_SCALES = {
    "K": (1.0, 0.0),
    "degC": (1.0, 273.15),
    "degF": (1.0 / 1.8, 459.67 / 1.8),
}
"""Kelvin of a raw reading: ``scale * raw + offset``."""

_USUAL = 0.15
"""A reading is usual within this share of the believable range around the tag's mean."""


def unit_suspects(findings: Iterable[Finding], ticks: TickTable, tags: Mapping[str, Tag]) -> list[Finding]:
    """Tell which temperatures that left their believable range would be usual in another unit.

    The first and the last rejected reading are both converted as kelvin, degrees Celsius and degrees
    Fahrenheit; if both come to lie near the tag's mean of the period, the unit is named.
    """
    suspected = []
    for finding in findings:
        tag = tags.get(finding.tag or "")
        if finding.code is not FindingCode.OUT_OF_RANGE or tag is None or tag.quantity != "temperature":
            continue
        unit = _better_unit(finding, tag, ticks)
        if unit is not None:
            suspected.append(
                replace(
                    finding,
                    code=FindingCode.UNIT_SUSPECTED,
                    words={**finding.words, "unit": unit, "declared": tag.unit},
                    suspects=(tag.name,),
                )
            )
    return suspected


def _better_unit(finding: Finding, tag: Tag, ticks: TickTable) -> str | None:
    try:
        raw = [float(finding.words[name]) for name in ("first", "last")]
    except (KeyError, ValueError):
        return None  # the finding sums up several stretches, or its readings are words
    mean_K = ticks.mean[:, ticks.column(tag.name)]
    if tag.believable is None or not np.isfinite(mean_K).any():
        return None
    usual_K = float(np.nanmean(mean_K))
    allowed_K = _USUAL * (tag.believable[1] - tag.believable[0])
    for unit, (scale, offset) in TEMPERATURE_SCALES.items():
        if not is_declared_unit(tag, scale, offset) and all(
            abs(scale * value + offset - usual_K) <= allowed_K for value in raw
        ):
            return unit
    return None


def is_declared_unit(tag: Tag, scale: float, offset: float) -> bool:
    """Whether a scale is that of the unit that a tag was declared in."""
    return abs(scale - tag.scale) < 1e-9 and abs(offset - tag.offset) < 1e-6
