"""Awkward exports by number, 33 to 64: counters, sensors and odd texts, as far as reading and cleaning go.

What arrives is common practice of meters and loggers, no source; every expected value is worked by hand.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from catalogue import Case, every, hold, minutes

from auditor.records.findings import FindingCode
from auditor.records.machines import Running

ONLY_A = {"a": "a"}
METER = {"between": "counter", "si_unit": "J", "hold_s": 900.0, "full_scale": 100_000.0, "at_most": 300 / 900}
"""Five digits, at most 300 in a quarter of an hour."""


def quarter_hours(*readings: float) -> dict[str, str]:
    """A file with a reading every quarter of an hour."""
    stamps = [f"2026-07-01 {at // 4:02}:{at % 4 * 15:02}" for at in range(len(readings))]
    return {"1.csv": "t;a\n" + "".join(f"{at};{value}\n" for at, value in zip(stamps, readings, strict=True))}


COUNTERS = [
    Case(
        33,
        "a counter is its difference, whatever stands between",
        {"1.csv": minutes("t;a", 1000, "Bad", "", 1030)},
        columns=ONLY_A,
        tags={"a": {"between": "counter", "si_unit": "J", "hold_s": 900.0}},
        cells={"a": {"used": 2, "status word": 1, "empty": 1}},
        totals={"a": 30.0},
        found=[FindingCode.STATUS_WORDS],
    ),
    Case(
        33,
        "a counter over a gap longer than its hold: the sum is known",
        {"1.csv": "t;a\n2026-07-01 00:00;1000\n2026-07-01 00:01;1010\n2026-07-01 02:00;2000\n"},
        columns=ONLY_A,
        tags={"a": {"between": "counter", "si_unit": "J", "hold_s": 900.0}},
        cells={"a": {"used": 3}},
        totals={"a": 1000.0},
    ),
    Case(
        34,
        "roll-over with a declared full scale: (100 000 - 99 990) + 12 = 22",
        quarter_hours(99_990, 12),
        columns=ONLY_A,
        tags={"a": METER},
        cells={"a": {"used": 2}},
        totals={"a": 22.0},
    ),
    Case(
        34,
        "a fall without a declared full scale is no roll-over",
        quarter_hours(99_900, 99_990, 12, 22),
        columns=ONLY_A,
        tags={"a": METER | {"full_scale": None}},
        cells={"a": {"used": 4}},
        totals={"a": 90.0 + 10.0},
        found=[FindingCode.COUNTER_RESET],
        said=["fell"],
    ),
    Case(
        35,
        "reset: 45 231 to 3 as a roll-over would be 54 772 in a quarter of an hour, so it is missing",
        quarter_hours(45_000, 45_231, 3, 103, 203),
        columns=ONLY_A,
        tags={"a": METER},
        cells={"a": {"used": 5}},
        totals={"a": 231.0 + 200.0},
        found=[FindingCode.COUNTER_RESET],
        said=["fell"],
    ),
    Case(
        36,
        "one bad reading: 45 231, 4 523, 45 481 counts 250 over both steps",
        quarter_hours(45_000, 45_231, 4_523, 45_481, 45_700),
        columns=ONLY_A,
        tags={"a": METER | {"hold_s": 1800.0}},
        cells={"a": {"used": 4, "spike": 1}},
        totals={"a": 700.0},
        found=[FindingCode.SPIKES],
    ),
    Case(
        61,
        "read by hand at either end of the day: the sum is known, its place in time is not",
        {"1.csv": "t;a\n2026-07-01 00:00;1000\n2026-07-02 00:00;3400\n"},
        columns=ONLY_A,
        tags={"a": {"between": "counter", "si_unit": "J", "hold_s": 900.0}},
        cells={"a": {"used": 1, "outside period": 1}},
        totals={"a": 2400.0},
        found=[FindingCode.GAP],
    ),
    Case(
        58,
        "whole steps of a counter that is read every minute",
        {"1.csv": minutes("t;a", *(100 + at // 4 for at in range(41)))},
        columns=ONLY_A,
        tags={"a": {"between": "counter", "si_unit": "J", "at_most": 0.5 / 60, "hold_s": 900.0}},
        cells={"a": {"used": 41}},
        totals={"a": 10.0},
    ),
]

RUNS = {"running": {"m": Running("b", 20.0, None)}, "users": {"a": ("m",), "b": ("m",)}}
THREE_HOURS = ("2026-07-01T00:00", "2026-07-01T03:00")
STANDING = {"a": {"frozen_after_s": 3600.0, "between": "step", "hold_s": 60.0}, "b": {"hold_s": 60.0}}


def sensor(warmth: Sequence[float], power: float) -> dict[str, str]:
    """Three hours of minutes: a sensor, and the power of its machine with a little life."""
    rows = [
        f"2026-07-01 {at // 60:02}:{at % 60:02};{value};{power + at % 3 / 10}\n"
        for at, value in enumerate(warmth)
    ]
    return {"1.csv": "t;a;b\n" + "".join(rows)}


MOVING = [80 + at * at % 7 / 10 for at in range(60)]
SENSORS = [
    Case(
        47,
        "last good value held for two hours while the machine runs",
        sensor([*MOVING, *[72.5] * 120], 1000.0),
        tags=STANDING,
        period=THREE_HOURS,
        cells={"a": {"used": 60, "frozen": 120}, "b": {"used": 180}},
        totals={"a": 60.0 * sum(MOVING)},
        found=[FindingCode.FROZEN],
        **RUNS,
    ),
    Case(
        63,
        "a forced whole number without any noise",
        sensor([75] * 180, 1000.0),
        tags=STANDING,
        period=THREE_HOURS,
        cells={"a": {"frozen": 180}, "b": {"used": 180}},
        totals={"a": 0.0},
        found=[FindingCode.FROZEN],
        **RUNS,
    ),
    Case(
        48,
        "the same two hours with the machine at rest",
        sensor([*MOVING, *[72.5] * 120], 0.0),
        tags=STANDING,
        period=THREE_HOURS,
        cells={"a": {"used": 180}, "b": {"used": 180}},
        totals={"a": 60.0 * (sum(MOVING) + 120 * 72.5)},
        **RUNS,
    ),
    Case(
        48,
        "the same two hours of a value that is stored on change",
        sensor([*MOVING, *[72.5] * 120], 1000.0),
        tags=STANDING | {"a": STANDING["a"] | {"deadband": 0.5}},
        period=THREE_HOURS,
        cells={"a": {"used": 180}, "b": {"used": 180}},
        **RUNS,
    ),
    Case(
        49,
        "a flow about zero at standstill, below its cut-off",
        {"1.csv": minutes("t;a", -0.8, 0.3, 250, -0.8)},
        columns=ONLY_A,
        tags={"a": {"between": "step", "hold_s": 60.0, "cut_off": 1.0}},
        cells={"a": {"used": 4}},
        totals={"a": 60.0 * 250.0},
    ),
    Case(
        51,
        "kelvin in a column declared in degrees Celsius",
        {"1.csv": minutes("t;a", 548, 549, 550)},
        columns=ONLY_A,
        tags={"a": {"offset": 273.15, "believable": (223.15, 723.15)}},
        cells={"a": {"out of range": 3}},
        found=[FindingCode.OUT_OF_RANGE],
        said=["548", "550"],
    ),
]

FORMULAS = ["=1+1", "+1-2", "-2+3", "@SUM(A1)", "<script>x()</script>", "1"]
TEXTS = [
    Case(
        39,
        "a unit row that says otherwise",
        {"1.csv": "t;a\n;MW\n2026-07-01 00:00;1\n"},
        columns=ONLY_A,
        export={"units": {"a": "kW"}},
        refused=True,
        said=["logs/1.csv:2, column a", '"MW"', '"kW"'],
    ),
    Case(
        64,
        "formulas in cells and markup in a heading",
        {"1.csv": minutes("t;<b>a</b>", *FORMULAS)},
        columns={"a": "<b>a</b>"},
        cells={"a": {"used": 1, "unparseable": 3, "status word": 2}},
        lines=(7, 6, 1, 0),
        found=[FindingCode.STATUS_WORDS],
        said=["@SUM(A1)", "<script>x()</script>"],
    ),
]


@every(COUNTERS)
def test_counters(tmp_path: Path, case: Case) -> None:
    """What a counter counted is its believable differences, never an average."""
    hold(tmp_path, case)


@every(SENSORS)
def test_sensors(tmp_path: Path, case: Case) -> None:
    """A value is doubted only where its machine and its declaration give reason."""
    hold(tmp_path, case)


@every(TEXTS)
def test_odd_texts(tmp_path: Path, case: Case) -> None:
    """Texts are data: held against the plant file, never followed."""
    hold(tmp_path, case)
