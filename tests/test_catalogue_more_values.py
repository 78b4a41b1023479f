"""Awkward exports by number: values that cannot be, judged by their neighbours and by other evidence.

What arrives is common practice of meters and loggers, no source; every expected value is worked by hand.
"""

from __future__ import annotations

from pathlib import Path

from catalogue import Case, every, hold, minutes

from auditor.records.findings import FindingCode
from auditor.records.machines import Running
from auditor.records.plant import ChangeRule, SpikeRule

ONLY_A = {"a": "a"}
STEP = {"between": "step", "hold_s": 60.0}
TEN_MINUTES = ("2026-07-01T00:00", "2026-07-01T00:10")
CASES = [
    Case(
        58,
        "one scan far from its neighbours",
        {"1.csv": minutes("t;a", 20, 21, 20, 21, 900, 20, 21, 20, 21, 20)},
        columns=ONLY_A,
        tags={"a": STEP | {"spike": SpikeRule(50.0, None)}},
        period=TEN_MINUTES,
        cells={"a": {"used": 9, "spike": 1}},
        totals={"a": 60.0 * (5 * 20 + 4 * 21)},
        found=[FindingCode.SPIKES],
        said=["900"],
    ),
    Case(
        58,
        "a step of the process is no spike",
        {"1.csv": minutes("t;a", 20, 21, 20, 21, 20, 900, 901, 900, 901, 900)},
        columns=ONLY_A,
        tags={"a": STEP | {"spike": SpikeRule(50.0, None)}},
        period=TEN_MINUTES,
        cells={"a": {"used": 10}},
    ),
    Case(
        58,
        "a change faster than the declared 5 in a minute",
        {"1.csv": minutes("t;a", 20, 24, 28, 60, 61, 32, 36, 40, 44, 48)},
        columns=ONLY_A,
        tags={"a": STEP | {"hold_s": 600.0, "change_at_most": ChangeRule(5.0, 60.0)}},
        period=TEN_MINUTES,
        cells={"a": {"used": 8, "changed too fast": 2}},
        found=[FindingCode.CHANGED_TOO_FAST],
        said=["60", "61"],
    ),
    Case(
        47,
        "zero written for a lost line while the breaker is closed",
        {"1.csv": minutes("t;a;b", *[1000] * 4, *[0] * 3, *[1000] * 3)},
        tags={"a": STEP | {"not_zero_while": Running("b", -1.0, None)}, "b": STEP},
        period=TEN_MINUTES,
        cells={"a": {"used": 7, "zero while running": 3}, "b": {"used": 10}},
        totals={"a": 60.0 * 7 * 1000.0},
        found=[FindingCode.ZERO_WHILE_RUNNING],
    ),
    Case(
        47,
        "zero while nothing speaks against it",
        {"1.csv": minutes("t;a;b", *[1000] * 4, *[0] * 3, *[1000] * 3)},
        tags={"a": STEP | {"not_zero_while": Running("b", 100.0, None)}, "b": STEP},
        period=TEN_MINUTES,
        cells={"a": {"used": 10}, "b": {"used": 10}},
    ),
    Case(
        50,
        "readings at the end of the instrument's range are used, and told",
        {"1.csv": minutes("t;a", 90, 95, 102.4, 102.4, 102.4, 99, 95, 90, 91, 90)},
        columns=ONLY_A,
        tags={"a": STEP | {"saturates_at": (None, 102.4)}},
        period=TEN_MINUTES,
        cells={"a": {"used": 10}},
        found=[FindingCode.AT_RANGE_END],
    ),
]


@every(CASES)
def test_values_that_cannot_be(tmp_path: Path, case: Case) -> None:
    """A declared limit rejects what lies beyond it, under a name of its own, and nothing else."""
    hold(tmp_path, case)
