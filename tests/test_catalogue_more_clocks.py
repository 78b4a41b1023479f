"""Awkward exports by number: clocks that were set or lost, and rows that were only written late.

What arrives is common practice of loggers, no source; every expected value is worked by hand.
"""

from __future__ import annotations

from pathlib import Path

from catalogue import Case, every, hold

from auditor.records.findings import FindingCode

ONLY_A = {"a": "a"}
MINUTES = [f"2026-07-01 00:{at:02}" for at in range(12)]


def rows(stamps: list[str]) -> dict[str, str]:
    """A file with these stamps, each with its place as value."""
    return {"1.csv": "t;a\n" + "".join(f"{stamp};{place}\n" for place, stamp in enumerate(stamps))}


CASES = [
    Case(
        22,
        "clock lost with its battery, and the year that it then shows",
        rows([*MINUTES[:3], "1970-01-01 00:00", "1970-01-01 00:01", *MINUTES[5:]]),
        columns=ONLY_A,
        lines=(13, 10, 1, 2),
        cells={"a": {"used": 10, "bad stamp": 2}},
        found=[FindingCode.CLOCK_STEP],
        said=["1970"],
    ),
    Case(
        22,
        "clock set back by five minutes for good",
        rows([*MINUTES[:8], *MINUTES[4:]]),
        columns=ONLY_A,
        lines=(17, 16, 1, 0),
        found=[FindingCode.CLOCK_STEP, FindingCode.CONFLICT],
    ),
    Case(
        30,
        "two rows written late are no step of the clock",
        rows([*MINUTES[:3], *MINUTES[5:8], *MINUTES[3:5], *MINUTES[8:]]),
        columns=ONLY_A,
        lines=(13, 12, 1, 0),
        cells={"a": {"used": 12}},
        said=["rows that were written late"],
    ),
]


@every(CASES)
def test_clocks_that_were_set_or_lost(tmp_path: Path, case: Case) -> None:
    """A clock that was set is told from rows that came late, and a lost one from a set one."""
    hold(tmp_path, case)
