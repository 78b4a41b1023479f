"""Awkward exports by number: columns that were renamed while the month ran.

What arrives is common practice of loggers, no source; every expected value is worked by hand.
"""

from __future__ import annotations

from pathlib import Path

from catalogue import Case, every, hold, us

from auditor.records.findings import FindingCode
from auditor.records.plant import Heading

CHANGE = us("2026-07-01T00:02")
BEFORE = "t;PT101\n2026-07-01 00:00;1\n2026-07-01 00:01;2\n"
AFTER = "t;PT-101A\n2026-07-01 00:02;5\n2026-07-01 00:03;6\n"
READ = [(f"2026-07-01T00:0{at}:00", value) for at, value in enumerate((1.0, 2.0, 5.0, 6.0))]
CASES = [
    Case(
        15,
        "a tag renamed with a new logger: both names, the date, the jump",
        {"1.csv": BEFORE, "2.csv": AFTER},
        columns={"a": "PT101"},
        tags={"a": {"headings": (Heading("PT101"), Heading("PT-101A"))}},
        samples=READ,
        cells={"a": {"used": 4}},
        found=[FindingCode.RENAMED_COLUMN],
        said=["PT101", "PT-101A"],
    ),
    Case(
        15,
        "both names for a while with equal values: each counts once",
        {"1.csv": BEFORE + "2026-07-01 00:02;5\n", "2.csv": AFTER},
        columns={"a": "PT101"},
        tags={"a": {"headings": (Heading("PT101"), Heading("PT-101A")), "between": "step", "hold_s": 60.0}},
        cells={"a": {"used": 4, "duplicate": 1}},
        totals={"a": 60.0 * (1 + 2 + 5 + 6)},
        found=[],
    ),
    Case(
        15,
        "the old name is not believed after its last day",
        {"1.csv": BEFORE + "2026-07-01 00:02;99\n", "2.csv": AFTER},
        columns={"a": "PT101"},
        tags={
            "a": {
                "headings": (Heading("PT101", None, CHANGE), Heading("PT-101A", CHANGE, None)),
                "between": "step",
                "hold_s": 60.0,
            }
        },
        totals={"a": 60.0 * (1 + 2 + 5 + 6)},
        found=[FindingCode.RENAMED_COLUMN],
    ),
]


@every(CASES)
def test_renamed_columns(tmp_path: Path, case: Case) -> None:
    """One signal under several headings is one tag, and where it changed its name is told."""
    hold(tmp_path, case)
