"""Awkward exports by number: pairs of columns, one file per tag, groups of digits, words in stamps, quality.

What arrives is common practice of loggers and spreadsheets, no source; expected values are worked by hand.
"""

from __future__ import annotations

from pathlib import Path

from catalogue import Case, every, hold

from auditor.records.findings import FindingCode
from auditor.records.plant import FilePerTag, LongLayout, PairsLayout, Quality

AT = ("2026-07-01T00:00:00", "2026-07-01T00:01:00", "2026-07-01T00:02:00")
READ = [(AT[0], 1.0, 2.0), (AT[1], 3.0, 4.0), (AT[2], 5.0, 6.0)]
THREE_USED = {"a": {"used": 3}, "b": {"used": 3}}
ONLY_A = {"a": "a"}


def three(*stamps: str) -> dict[str, str]:
    """The three rows of ``READ`` under other stamps."""
    rows = zip(stamps, "135", "246", strict=True)
    return {"1.csv": "t;a;b\n" + "".join(f"{at};{a};{b}\n" for at, a, b in rows)}


NOON = ["2026-07-01T11:59:00", "2026-07-01T12:00:00", "2026-07-02T00:00:00"]
TABLES = [
    Case(
        3,
        "each tag with a stamp column of its own, of unequal length",
        {
            "1.csv": "t;a;t;b\n2026-07-01 00:00;1;2026-07-01 00:01;4\n"
            "2026-07-01 00:02;5;2026-07-01 00:03;8\n2026-07-01 00:04;9;;\n"
        },
        export={"layout": PairsLayout()},
        samples=[
            (AT[0], 1.0, None),
            (AT[1], None, 4.0),
            (AT[2], 5.0, None),
            ("2026-07-01T00:03:00", None, 8.0),
            ("2026-07-01T00:04:00", 9.0, None),
        ],
        lines=(4, 3, 1, 0),
        cells={"a": {"used": 3}, "b": {"used": 2}},
        said=["a 3, b 2"],
    ),
    Case(
        4,
        "one file per tag, named by the file",
        {
            "trend_a_07.csv": "t;v\n2026-07-01 00:00;1\n2026-07-01 00:01;3\n",
            "trend_b_07.csv": "t;v\n2026-07-01 00:00;2\n",
        },
        export={"layout": FilePerTag("v", "trend_{tag}_*.csv", None)},
        lines=(5, 3, 2, 0),
        cells={"a": {"used": 2}, "b": {"used": 1}},
        said=['it holds the tag "a"'],
    ),
    Case(
        4,
        "one file per tag, named by a line above the heading",
        {
            "1.csv": "Logger 7\nPoint: a\n\nt;v\n2026-07-01 00:00;1\n",
            "2.csv": "Logger 7\nPoint: b\n\nt;v\n2026-07-01 00:00;2\n",
        },
        export={"layout": FilePerTag("v", None, "Point: {tag}")},
        lines=(10, 2, 8, 0),
        cells={"a": {"used": 1}, "b": {"used": 1}},
    ),
    Case(
        62,
        "quality codes: only the declared good ones count",
        {
            "1.csv": "t,p,v,quality\n2026-07-01 00:00,a,1,192\n2026-07-01 00:01,a,2,0\n"
            "2026-07-01 00:02,a,3,substituted\n2026-07-01 00:03,a,4,good\n"
        },
        columns=ONLY_A,
        export={"layout": LongLayout("t", "p", "v", Quality("quality", ("192", "good")))},
        samples=[(AT[0], 1.0), (AT[1], None), (AT[2], None), ("2026-07-01T00:03:00", 4.0)],
        lines=(5, 4, 1, 0),
        cells={"a": {"used": 2, "status word": 2}},
        found=[FindingCode.STATUS_WORDS],
        said=["quality 0", "quality substituted"],
    ),
]

GROUPED = {
    "space": ("1 234.5", ".", "space"),
    "no-break space": ("1\u00a0234.5", ".", "space"),
    "thin space": ("1\u202f234,5", ",", "space"),
    "apostrophe": ("1'234.5", ".", "'"),
    "point": ("1.234,5", ",", "."),
    "comma": ("1,234.5", ".", ","),
}
NUMBERS = [
    Case(
        7,
        f"groups of three digits parted by a {name}",
        {"1.csv": f"t;a\n2026-07-01 00:00;{cell}\n2026-07-01 00:01;2\n"},
        columns=ONLY_A,
        export={"decimal": decimal, "thousands": mark},
        samples=[(AT[0], 1234.5), (AT[1], 2.0)],
        cells={"a": {"used": 2}},
    )
    for name, (cell, decimal, mark) in GROUPED.items()
]

STAMPS = [
    Case(
        11,
        "day numbers of a spreadsheet: 46204 is 2026-07-01",
        three("46204", "46204.00069444", "46204.00138889"),
        export={"date_order": "spreadsheet days"},
        samples=READ,
        cells=THREE_USED,
    ),
    Case(
        31,
        "names of months",
        three(*(f"01-Jul-2026 00:0{at}" for at in range(3))),
        export={"date_order": "day first"},
        samples=READ,
        cells=THREE_USED,
    ),
    Case(
        31,
        "names of months in another language",
        three(*(f"01. Juli 2026 00:0{at}" for at in range(3))),
        export={
            "date_order": "day first",
            "month_names": (
                *("Januar", "Februar", "März", "April", "Mai", "Juni", "Juli"),
                *("August", "September", "Oktober", "November", "Dezember"),
            ),
        },
        samples=READ,
        cells=THREE_USED,
    ),
    Case(
        31,
        "halves of the day: 11:59 AM, noon, midnight",
        three("7/1/2026 11:59 AM", "7/1/2026 12:00 PM", "7/2/2026 12:00 AM"),
        export={"date_order": "month first"},
        period=("2026-07-01T00:00", "2026-07-03T00:00"),
        samples=[(at, *values) for at, (_, *values) in zip(NOON, READ, strict=True)],
        cells=THREE_USED,
    ),
]


@every(TABLES)
def test_shape_of_the_table(tmp_path: Path, case: Case) -> None:
    """Whatever its shape, an export gives the same samples, and no line is lost."""
    hold(tmp_path, case)


@every(NUMBERS)
def test_groups_of_digits(tmp_path: Path, case: Case) -> None:
    """A declared mark between groups of digits is no decimal mark."""
    hold(tmp_path, case)


@every(STAMPS)
def test_ways_of_writing_a_stamp(tmp_path: Path, case: Case) -> None:
    """Names of months, halves of the day and day numbers are instants too."""
    hold(tmp_path, case)
