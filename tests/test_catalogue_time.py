"""Awkward exports by number, 17 to 32: clocks, order, repeats and rates.

Clock changes are those of the IANA time zone database: in Copenhagen 2025-10-26 and 2026-03-29, 01:00 UTC.
The rest is common practice of loggers, no source; every expected value is worked by hand.
"""

from __future__ import annotations

from pathlib import Path

from catalogue import Case, every, hold

from auditor.records.findings import FindingCode

HEAD = "t;a;b\n"
ONE, TWO, THREE = "2026-07-01 00:00;1;2\n", "2026-07-01 00:01;3;4\n", "2026-07-01 00:02;5;6\n"
AT = ("2026-07-01T00:00:00", "2026-07-01T00:01:00", "2026-07-01T00:02:00")
READ = [(AT[0], 1.0, 2.0), (AT[1], 3.0, 4.0), (AT[2], 5.0, 6.0)]
THREE_USED = {"a": {"used": 3}, "b": {"used": 3}}
ONLY_A = {"a": "a"}
COPENHAGEN = {"clock": "Europe/Copenhagen"}
AUTUMN = ("2025-10-25T22:00", "2025-10-26T23:00")
SPRING = ("2026-03-28T23:00", "2026-03-29T22:00")
HOURLY = {"a": {"between": "step", "hold_s": 3600.0}}


def hours(day: str, *clock_hours: int) -> str:
    """One reading of 1 in each hour of the clock."""
    return "t;a\n" + "".join(f"{day} {hour:02}:00;1\n" for hour in clock_hours)


BOTH_PASSES = hours("2025-10-26", 0, 1, 2, 2, *range(3, 24))
ONE_PASS = hours("2025-10-26", *range(24))

CLOCKS = [
    Case(
        17,
        "repeated hour told apart by order: 25 h",
        {"1.csv": BOTH_PASSES},
        columns=ONLY_A,
        export=COPENHAGEN,
        tags=HOURLY,
        period=AUTUMN,
        lines=(26, 25, 1, 0),
        cells={"a": {"used": 25}},
        totals={"a": 25 * 3600.0},
        said=["both passes told apart by the order of lines"],
    ),
    Case(
        17,
        "repeated hour with one pass only: dropped, the clock cannot say which",
        {"1.csv": ONE_PASS},
        columns=ONLY_A,
        export=COPENHAGEN,
        tags=HOURLY,
        period=AUTUMN,
        lines=(25, 23, 1, 1),
        cells={"a": {"used": 23, "bad stamp": 1}},
        totals={"a": 23 * 3600.0},
        found=[FindingCode.REPEATED_HOUR],
    ),
    Case(
        17,
        "repeated hour dropped by declaration",
        {"1.csv": BOTH_PASSES},
        columns=ONLY_A,
        export=COPENHAGEN | {"repeated_hour": "drop"},
        tags=HOURLY,
        period=AUTUMN,
        lines=(26, 23, 1, 2),
        cells={"a": {"used": 23, "bad stamp": 2}},
        totals={"a": 23 * 3600.0},
        found=[FindingCode.REPEATED_HOUR],
    ),
    Case(
        18,
        "the hour that spring skips is no gap: 23 h",
        {"1.csv": hours("2026-03-29", 0, 1, *range(3, 24))},
        columns=ONLY_A,
        export=COPENHAGEN,
        tags=HOURLY,
        period=SPRING,
        lines=(24, 23, 1, 0),
        cells={"a": {"used": 23}},
        totals={"a": 23 * 3600.0},
    ),
    Case(
        18,
        "stamps inside the skipped hour: this logger knows no summer time",
        {"1.csv": hours("2026-03-29", 1, 2, 3)},
        columns=ONLY_A,
        export=COPENHAGEN,
        tags=HOURLY,
        period=SPRING,
        samples=[("2026-03-29T00:00:00", 1.0), ("2026-03-29T01:00:00", 1.0)],
        lines=(4, 2, 1, 1),
        cells={"a": {"used": 2, "bad stamp": 1}},
        found=[FindingCode.CLOCK_OFFSET],
        said=["stamps in the hour that summer time skips"],
    ),
    Case(
        19,
        "a meter on winter time all year",
        {"1.csv": HEAD + "2026-07-01 01:00;1;2\n2026-07-01 01:01;3;4\n2026-07-01 01:02;5;6\n"},
        export={"clock": "+01:00"},
        samples=READ,
        cells=THREE_USED,
    ),
    *(
        Case(
            20,
            f"quarter-hours stamped at their {marks}",
            {"1.csv": "t;a\n" + "".join(f"2026-07-01 00:{15 * at:02};{at + 1}\n" for at in range(4))},
            columns=ONLY_A,
            tags={"a": {"between": "mean", "stamp_marks": marks, "hold_s": 900.0}},
            period=("2026-07-01T00:00", "2026-07-01T00:30"),
            totals={"a": 900.0 * total},
        )
        for marks, total in (("start", 1 + 2), ("end", 2 + 3))
    ),
    Case(
        21,
        "midnight as 24:00",
        {"1.csv": HEAD + "2026-06-30 24:00;1;2\n" + TWO + THREE},
        samples=READ,
        cells=THREE_USED,
    ),
    Case(
        22,
        "clock set back by four minutes",
        {"1.csv": "t;a\n2026-07-01 00:00;1\n2026-07-01 00:06;2\n2026-07-01 00:02;3\n2026-07-01 00:08;4\n"},
        columns=ONLY_A,
        samples=[
            (AT[0], 1.0),
            ("2026-07-01T00:02:00", 3.0),
            ("2026-07-01T00:06:00", 2.0),
            ("2026-07-01T00:08:00", 4.0),
        ],
        cells={"a": {"used": 4}},
        found=[FindingCode.CLOCK_STEP],
    ),
    Case(
        22,
        "clock lost with its battery",
        {"1.csv": HEAD + ONE + "1970-01-01 00:00;7;7\n" + TWO + THREE},
        samples=READ,
        lines=(5, 3, 1, 1),
        cells={"a": {"used": 3, "bad stamp": 1}, "b": {"used": 3, "bad stamp": 1}},
        found=[FindingCode.CLOCK_STEP],
        said=["1970"],
    ),
]

# Stored on change: 1000 at 00:00, then 800, 600, 400, 200 and 0 at 00:50, 52, 54, 56 and 58.
ON_CHANGE = "t;a\n" + "".join(
    f"2026-07-01 {at // 60:02}:{at % 60:02};{value}\n"
    for at, value in ((0, 1000), (50, 800), (52, 600), (54, 400), (56, 200), (58, 0), (60, 0))
)
FIRST_HOUR = ("2026-07-01T00:00", "2026-07-01T01:00")
RATES = [
    *(
        Case(
            24,
            f"stored on change, {between} between the samples",
            {"1.csv": ON_CHANGE},
            columns=ONLY_A,
            tags={"a": {"between": between, "hold_s": 3600.0}},
            period=FIRST_HOUR,
            totals={"a": 60.0 * minutes},
        )
        for between, minutes in (
            ("step", 1000 * 50 + (800 + 600 + 400 + 200 + 0) * 2),
            ("line", 900 * 50 + (700 + 500 + 300 + 100 + 0) * 2),
        )
    ),
    Case(
        25,
        "a value every quarter of an hour beside one every minute",
        {
            "1.csv": HEAD
            + "".join(f"2026-07-01 00:{at:02};{at};{'' if at % 15 else 100 + at}\n" for at in range(60))
        },
        tags={"a": {"between": "step", "hold_s": 60.0}, "b": {"between": "step", "hold_s": 900.0}},
        period=FIRST_HOUR,
        cells={"a": {"used": 60}, "b": {"used": 4, "empty": 56}},
        totals={"a": 60.0 * sum(range(60)), "b": 900.0 * (100 + 115 + 130 + 145)},
    ),
    Case(
        26,
        "stamps that tremble by seconds",
        {"1.csv": "t;a\n2026-07-01 00:00:03;1\n2026-07-01 00:01:01;2\n2026-07-01 00:02:04;3\n"},
        columns=ONLY_A,
        tags={"a": {"between": "step", "hold_s": 90.0}},
        period=FIRST_HOUR,
        samples=[
            ("2026-07-01T00:00:03", 1.0),
            ("2026-07-01T00:01:01", 2.0),
            ("2026-07-01T00:02:04", 3.0),
        ],
        totals={"a": 58 * 1.0 + 63 * 2.0 + 90 * 3.0},
    ),
]

BY_FOLDER = {"files": ("month/*", "day/*")}
REPEATS = [
    Case(
        27,
        "lines written twice",
        {"1.csv": HEAD + ONE + TWO + TWO + THREE},
        cells={"a": {"used": 3, "duplicate": 1}, "b": {"used": 3, "duplicate": 1}},
        lines=(5, 4, 1, 0),
    ),
    Case(
        27,
        "a monthly export over daily ones",
        {"month/1.csv": HEAD + ONE + TWO + THREE, "day/1.csv": HEAD + ONE + TWO, "day/2.csv": HEAD + THREE},
        export=BY_FOLDER,
        cells={"a": {"used": 3, "duplicate": 3}, "b": {"used": 3, "duplicate": 3}},
        lines=(9, 6, 3, 0),
    ),
    Case(
        28,
        "a monthly export that contradicts a daily one: the pattern named first wins",
        {"month/1.csv": HEAD + ONE + TWO + THREE, "day/1.csv": HEAD + TWO.replace(";3;", ";9;")},
        export=BY_FOLDER,
        tags={"a": {"between": "step", "hold_s": 60.0}},
        cells={"a": {"used": 3, "conflict lost": 1}, "b": {"used": 3, "duplicate": 1}},
        totals={"a": 60.0 * (1 + 3 + 5)},
        found=[FindingCode.CONFLICT],
        said=["month/1.csv"],
    ),
    Case(
        28,
        "two values for a stamp of one file, neither believed by declaration",
        {"1.csv": HEAD + ONE + TWO + TWO.replace(";3;", ";9;") + THREE},
        export={"when_stamps_repeat": "reject both"},
        cells={"a": {"used": 2, "conflict lost": 2}, "b": {"used": 3, "duplicate": 1}},
        found=[FindingCode.CONFLICT],
    ),
    Case(
        29,
        "a file that came late and is named out of turn",
        {"2.csv": HEAD + ONE, "1.csv": HEAD + TWO, "0.csv": HEAD + THREE},
        samples=READ,
        cells=THREE_USED,
    ),
    Case(
        30,
        "newest line first",
        {"1.csv": HEAD + THREE + TWO + ONE},
        samples=READ,
        cells=THREE_USED,
        said=["its rows run from new to old"],
    ),
    Case(
        32,
        "fractions of a second",
        {"1.csv": "t;a\n2026-07-01 00:00:00.25;1\n2026-07-01 00:00:00.5;2\n2026-07-01 00:00:01;3\n"},
        columns=ONLY_A,
        tags={"a": {"between": "step", "hold_s": 1.0}},
        samples=[("2026-07-01T00:00:00.25", 1.0), ("2026-07-01T00:00:00.50", 2.0), (AT[0][:-1] + "1", 3.0)],
        totals={"a": 0.25 * 1 + 0.5 * 2 + 1.0 * 3},
    ),
    Case(
        32,
        "a burst of events within one stamp, the last one wins by declaration",
        {"1.csv": "t;a\n2026-07-01 00:00;1\n2026-07-01 00:00;7\n2026-07-01 00:00;2\n2026-07-01 00:01;3\n"},
        columns=ONLY_A,
        export={"when_stamps_repeat": "keep later"},
        tags={"a": {"between": "step", "hold_s": 60.0}},
        cells={"a": {"used": 2, "conflict lost": 2}},
        totals={"a": 60.0 * (2 + 3)},
        found=[FindingCode.CONFLICT],
    ),
]

SECONDS = 1_782_864_000
"""2026-07-01 00:00 UTC, seconds after 1970 without leap seconds (POSIX)."""
STAMPS = [
    Case(
        31,
        name,
        {"1.csv": HEAD + "".join(f"{at};{a};{b}\n" for at, a, b in zip(stamps, "135", "246", strict=True))},
        export={"date_order": order},
        samples=READ,
        cells=THREE_USED,
    )
    for name, order, stamps in (
        ("year of two digits", "day first", [f"01.07.26 00:0{at}" for at in range(3)]),
        ("letters T and Z", "year first", [f"2026-07-01T00:0{at}:00Z" for at in range(3)]),
        ("offset in the stamp", "year first", [f"2026-07-01T02:0{at}:00+02:00" for at in range(3)]),
        ("no separators", "year first", [f"202607010{at:03}00" for at in range(3)]),
        ("month first", "month first", [f"07/01/2026 00:0{at}" for at in range(3)]),
        ("epoch seconds", "epoch seconds", [str(SECONDS + 60 * at) for at in range(3)]),
        ("epoch milliseconds", "epoch milliseconds", [f"{SECONDS + 60 * at}000" for at in range(3)]),
    )
] + [
    Case(
        31,
        "epoch milliseconds declared as seconds",
        {"1.csv": f"t;a;b\n{SECONDS}000;1;2\n"},
        export={"date_order": "epoch seconds"},
        refused=True,
        said=["exports.x.date_order", f'"{SECONDS}000"'],
    ),
]


@every(CLOCKS)
def test_clocks(tmp_path: Path, case: Case) -> None:
    """Every stamp is an instant of its declared clock, or is rejected and told."""
    hold(tmp_path, case)


@every(RATES)
def test_rates(tmp_path: Path, case: Case) -> None:
    """Whatever the rate of the samples, they are weighted by time."""
    hold(tmp_path, case)


@every(REPEATS)
def test_repeats_and_order(tmp_path: Path, case: Case) -> None:
    """Nothing is counted twice, nothing is averaged, and order does not matter."""
    hold(tmp_path, case)


@every(STAMPS)
def test_ways_of_writing_a_stamp(tmp_path: Path, case: Case) -> None:
    """The declared order reads every way of writing the same instant."""
    hold(tmp_path, case)
