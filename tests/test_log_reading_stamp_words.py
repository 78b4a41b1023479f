"""Stamps with words in them, serial days, and days and months that change places."""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path

import pytest
from log_reading_factory import Reading, make_export, read

from auditor.records.errors import PlantFileError
from auditor.records.findings import FindingCode

LOCAL = ("Jan", "Feb", "März", "Apr", "Mai", "Jun", "Jul", "Aug", "Sep", "Okt", "Nov", "Dez")


def read_stamp(folder: Path, *stamps: str, **changes: object) -> Reading:
    """Read one line per stamp, quoted, so that commas may stand in it."""
    rows = "".join(f'"{stamp}";{at}\n' for at, stamp in enumerate(stamps))
    return read(folder, {"log.csv": "t;a\n" + rows}, make_export({"a": "a"}, **changes))


@pytest.mark.parametrize(
    ("order", "stamp", "expected"),
    [
        pytest.param("day first", "05-Oct-2026 10:00", "2026-10-05T10:00:00", id="short name"),
        pytest.param("day first", "5. october 2026 10:00:01", "2026-10-05T10:00:01", id="full name"),
        pytest.param(
            "day first", "05OCT26 23:59", "2026-10-05T23:59:00", id="nothing between, two-digit year"
        ),
        pytest.param("month first", "Oct 5, 2026 10:00", "2026-10-05T10:00:00", id="month first"),
        pytest.param("year first", "2026-May-05 10:00", "2026-05-05T10:00:00", id="year first"),
        pytest.param("month first", "10/05/2026 12:00:00 AM", "2026-10-05T00:00:00", id="12 AM"),
        pytest.param("month first", "10/05/2026 12:30 pm", "2026-10-05T12:30:00", id="12 PM"),
        pytest.param("month first", "10/05/2026 1:05:07.5 p.m.", "2026-10-05T13:05:07.50", id="PM"),
        pytest.param("day first", "05.10.2026 24:00", "2026-10-06T00:00:00", id="24:00"),
    ],
)
def test_stamps_with_words(tmp_path: Path, order: str, stamp: str, expected: str) -> None:
    """Month names and halves of the day: English names are known, 12 AM is midnight (common practice)."""
    got = read_stamp(tmp_path, stamp, date_order=order)
    assert got.stamps == [expected]
    assert got.note.stamp_format


@pytest.mark.parametrize("stamp", ["5. März 2026 00:00", "5. MÄRZ 2026", "05-märz-26 00:00:00"])
def test_declared_month_names(tmp_path: Path, stamp: str) -> None:
    """Month names in local language: they are read once they are declared."""
    got = read_stamp(tmp_path, stamp, date_order="day first", month_names=LOCAL)
    assert got.stamps == ["2026-03-05T00:00:00"]


@pytest.mark.parametrize(
    ("order", "stamp"),
    [
        ("day first", "5. März 2026 00:00"),
        ("day first", "31-Feb-2026 00:00"),
        ("month first", "10/05/2026 13:00 PM"),
        ("month first", "10/05/2026 0:30 AM"),
        ("year first", "2026-10-05 10:00 XYZ"),
        ("spreadsheet days", "459312.5"),
    ],
)
def test_stamps_that_are_none(tmp_path: Path, order: str, stamp: str) -> None:
    """An unknown month, hour or zone name is no stamp; nothing is rolled over."""
    with pytest.raises(PlantFileError, match="no stamp of this export can be read"):
        read_stamp(tmp_path, stamp, date_order=order)


def test_zone_names_resolve_the_repeated_hour(tmp_path: Path) -> None:
    """Zone names behind the stamp: those of the declared clock tell both passes of the autumn hour apart."""
    got = read_stamp(
        tmp_path,
        "2026-10-25 02:30 CEST",
        "2026-10-25 02:30 (CET)",
        "2026-10-25 02:45 EST",
        clock="Europe/Stockholm",
    )
    assert got.stamps == ["2026-10-25T00:30:00", "2026-10-25T01:30:00"]
    assert got.note.lines_rejected == 1


@pytest.mark.parametrize(
    ("serial", "expected"),
    [
        ("45931.25", "2025-10-01T06:00:00"),
        ("45931,0006944444", "2025-10-01T00:01:00"),
        ("36526", "2000-01-01T00:00:00"),
        ("46023.999988425926", "2026-01-01T23:59:59"),
    ],
)
def test_spreadsheet_days(tmp_path: Path, serial: str, expected: str) -> None:
    """Serial dates: 36526 is 2000-01-01 in the 1900 date base system (ISO/IEC 29500-1, from memory)."""
    got = read_stamp(tmp_path, serial, date_order="spreadsheet days", clock="UTC")
    assert got.stamps == [expected]
    assert got.note.stamp_format == "days since 1899-12-30"


def test_spreadsheet_days_follow_the_clock(tmp_path: Path) -> None:
    """Serial dates show the wall clock of the logger, not UTC."""
    got = read_stamp(tmp_path, "45931.25", date_order="spreadsheet days", clock="+01:00")
    assert got.stamps == ["2025-10-01T05:00:00"]


def test_day_and_month_that_change_places(tmp_path: Path) -> None:
    """A day/month flip after the 12th: both orders in one export are a fault that names the line."""
    with pytest.raises(PlantFileError) as caught:
        read_stamp(
            tmp_path,
            *("11/07/2026 00:00", "13/07/2026 00:00", "07/14/2026 00:00", "07/15/2026 00:00"),
            date_order="day first",
        )
    assert 'logs/log.csv:4, column t: "07/14/2026 00:00" can only be read month first' in str(caught.value)


def test_one_damaged_stamp_is_rejected(tmp_path: Path) -> None:
    """A single stamp in the other order is a damaged line, where others prove the declared order."""
    got = read_stamp(
        tmp_path, "13/07/2026 00:00", "07/14/2026 00:00", "15/07/2026 00:00", date_order="day first"
    )
    assert got.found() == [FindingCode.REJECTED_LINES]
    assert got.counts() == (4, 2, 1, 1)


def many_lines(stamp: str, number: str, rows: int = 60_000) -> list[str]:
    """Lines of a file that is only sampled; its day, 1 July, could be 7 January too."""
    start = datetime(2026, 7, 1)
    return [f"{start + timedelta(seconds=row):{stamp}};{number}" for row in range(rows)]


def sampled(folder: Path, lines: list[str], late: list[str], **changes: object) -> Reading:
    """Read a file above the size that is looked at whole, with some lines outside all samples."""
    place = int(len(lines) * 0.6)
    text = "\n".join(["t;a", *lines[:place], *late, *lines[place:], ""])
    return read(folder, {"log.csv": text}, make_export({"a": "a"}, **changes))


def test_date_order_is_proven_by_the_full_read(tmp_path: Path) -> None:
    """Date order: a contradiction that no sample shows stops the reading, with file, line, value and key."""
    lines = many_lines("%d/%m/%Y %H:%M:%S", "1.5")
    with pytest.raises(PlantFileError) as caught:
        sampled(tmp_path, lines, ["07/25/2026 00:00:00;1"], date_order="day first")
    told = str(caught.value)
    assert 'logs/log.csv:36002, column of the stamp: "07/25/2026 00:00:00"' in told
    assert 'exports.x.date_order = "month first"' in told


def test_decimal_mark_is_proven_by_the_full_read(tmp_path: Path) -> None:
    """Decimal mark: a contradiction that no sample shows stops the reading; one in a proven file does not."""
    lines = many_lines("%Y-%m-%d %H:%M:%S", "15")
    late = ["2026-07-01 10:00:00;1,5"]
    with pytest.raises(PlantFileError) as caught:
        sampled(tmp_path, lines, late)
    assert 'logs/log.csv:36002, column a: "1,5" cannot be read with exports.x.decimal = "."' in str(
        caught.value
    )
    got = sampled(tmp_path, lines, [*late, "2026-07-01 10:00:00;2.5"])
    assert got.rejected("a") == {"unparseable": 1}
    with pytest.raises(PlantFileError, match="cannot be decided"):
        sampled(tmp_path, lines, ["2026-07-01 10:00:00;1,500"])
