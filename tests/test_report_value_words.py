"""Findings of the value tests in sentences, with their numbers; which tags are tested for standing still."""

from __future__ import annotations

from dataclasses import replace

import pytest
from report_plant import START_US, make_plant

from auditor.records.findings import Finding, FindingCode
from auditor.report.wording.findings import finding_sentences
from auditor.report.wording.ledgers import standing

PLANT = make_plant()
HOUR_US = 3_600_000_000
FULL = [
    (
        Finding(
            FindingCode.ZERO_WHILE_RUNNING,
            tag="oil_flow",
            file="oil/a.csv",
            line=62,
            start_us=START_US,
            end_us=START_US + 4 * HOUR_US,
            energy_J=3.6e9,
            numbers={"zero_s": 14_400.0, "count": 240.0},
            words={"evidence": "oil_hot", "state": ""},
        ),
        ["(4\u00a0h)", "line 62 of oil/a.csv", "missing, not as zero", "1\u202f000\u00a0kWh", "oil_hot"],
    ),
    (
        Finding(
            FindingCode.AT_RANGE_END,
            tag="oil_flow",
            start_us=START_US,
            end_us=START_US + HOUR_US,
            numbers={"count": 60.0, "at_end_s": 3600.0, "share_of_time": 0.25, "share_of_amount": 0.2857},
        ),
        ["60\u00a0readings", "25.0\u00a0% of its time", "28.6\u00a0% of its sum", "only a bound"],
    ),
    (
        Finding(
            FindingCode.STOOD_LONG,
            tag="hot_return",
            start_us=START_US,
            end_us=START_US + 3 * HOUR_US,
            numbers={"stood_s": 10_800.0, "usual_s": 120.0, "value_SI": 345.15},
        ),
        ["72.00\u00a0°C", "frozen_after", "nothing was rejected"],
    ),
    (
        Finding(
            FindingCode.COARSE_STEPS,
            tag="oil_flow",
            numbers={"share": 0.1, "interval_s": 60.0, "smallest_interval_s": 120.0},
        ),
        ["10.0\u00a0% of what it counts", "or more are honest"],
    ),
    (
        Finding(
            FindingCode.SWAPPED_PAIR,
            machine="orc",
            stream="oil",
            energy_J=3.6e9,
            numbers={"share_of_time": 0.97, "apart_K": 20.0},
            words={"tags": "oil_hot, oil_flow"},
        ),
        ["97.0\u00a0% of its running time", "20.0\u00a0K", "Nothing was swapped", "oil_hot", "swapped?"],
    ),
    (
        Finding(
            FindingCode.SPIKES,
            tag="oil_flow",
            file="oil/a.csv",
            line=22,
            numbers={"count": 3.0},
            words={"first": "101", "last": "40"},
        ),
        ["3\u00a0readings", "“101” in line 22 of oil/a.csv", "were rejected"],
    ),
]


@pytest.mark.parametrize(("finding", "pieces"), FULL, ids=lambda value: getattr(value, "code", ""))
def test_a_finding_of_values_tells_its_numbers(finding: Finding, pieces: list[str]) -> None:
    """What a person needs to look it up and to weigh it."""
    text = " ".join(finding_sentences(finding, PLANT))
    assert [piece for piece in pieces if piece not in text] == [], text


def test_not_tested_is_a_state_that_is_told() -> None:
    """A tag is tested after a time, not tested, or may stand still by its nature."""
    tested = PLANT.tags["oil_hot"]
    assert standing(tested) == "tested, 2\u00a0h"
    assert standing(replace(tested, frozen_after_s=None)) == "not tested"
    assert standing(replace(tested, between="step", deadband=5.0)) == "not tested: it may"
    assert standing(replace(tested, between="state", states={"0": "open"})) == "not tested: it may"
