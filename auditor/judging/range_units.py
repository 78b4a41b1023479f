"""Powers and flows that left their believable range for a time and would be usual by a familiar ratio."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.familiar import MOST_NAMED, OF_FLOW, OF_POWER, Familiar, named
from auditor.judging.series import tag_means
from auditor.records.findings import Finding, FindingCode

if TYPE_CHECKING:
    from auditor.records.plant import Tag
    from auditor.records.ticks import TickTable

_FAMILIAR: Mapping[str, tuple[Familiar, ...]] = {"W": OF_POWER, "m3/s": OF_FLOW, "kg/s": OF_FLOW}
"""By SI unit of a tag that is logged as a rate."""
_LEAST_READINGS = 12
_AT_A_STRETCH = 0.8
"""Scattered spikes are no change of unit: the readings must follow one another but for this share."""
_OF_USUAL = 0.05


def range_questions(findings: Iterable[Finding], ticks: TickTable, tags: Mapping[str, Tag]) -> list[Finding]:
    """Tell which rejected powers and flows are usual for their tag once a familiar ratio is taken out.

    The first and the last rejected reading must both come to lie among the tag's usual readings; where it
    has none, inside its believable range.
    """
    suspected = []
    for finding in findings:
        tag = tags.get(finding.tag or "")
        if finding.code is not FindingCode.OUT_OF_RANGE or tag is None or not _at_a_stretch(finding, ticks):
            continue
        hits = _hits(finding, tag, ticks)
        if hits:
            suspected.append(
                replace(
                    finding,
                    code=FindingCode.UNIT_SUSPECTED,
                    numbers={**finding.numbers, "familiar": hits[0].middle},
                    words={**finding.words, "evidence": "range", "candidates": named(hits)},
                    suspects=(tag.name,),
                )
            )
    return suspected


def _at_a_stretch(finding: Finding, ticks: TickTable) -> bool:
    count = finding.numbers.get("count", 0.0)
    if count < _LEAST_READINGS or finding.start_us is None or finding.end_us is None:
        return False
    step_s = float(ticks.native_step_s[ticks.tags.index(str(finding.tag))])
    # A tag without one believable reading has no usual step: then it is all of its readings.
    return math.isnan(step_s) or count * step_s >= _AT_A_STRETCH * (finding.end_us - finding.start_us) / 1e6


def _hits(finding: Finding, tag: Tag, ticks: TickTable) -> tuple[Familiar, ...]:
    familiar = _FAMILIAR.get(tag.si_unit, ())
    try:
        raw = [float(finding.words[name]) for name in ("first", "last")]
    except (KeyError, ValueError):
        return ()  # the readings are words, or several stretches were summed up
    odd = [tag.scale * value + tag.offset for value in raw]
    if odd[0] == odd[1] or min(odd) <= 0.0 or tag.believable is None:
        return ()  # the same number twice is a stuck or a saturated meter, no unit
    low, high = _usual(tag_means(ticks, tag.name), tag.believable[1])
    hits = [
        each
        for each in familiar
        if any(all(low <= value * by <= high for value in odd) for by in (each.middle, 1.0 / each.middle))
    ]
    return tuple(hits) if len(hits) <= MOST_NAMED else ()


def _usual(read: np.ndarray, largest: float) -> tuple[float, float]:
    """Least and largest usual value: of what was believed and is not near zero, else of the range."""
    read = read[np.isfinite(read)]
    upper = float(np.quantile(read, 0.95)) if read.size else 0.0
    if upper <= 0.0:
        return _OF_USUAL * largest, largest
    return float(np.quantile(read[read > _OF_USUAL * upper], 0.05)), upper
