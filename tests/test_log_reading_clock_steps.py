"""Clocks that were set back, rows that were only written late, and clocks that lost their battery."""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from log_reading_factory import make_export, read

from auditor.log_reading.resets import ANY_TIME, believed_range, stamp_days
from auditor.records.findings import FindingCode

TEN = datetime(2026, 7, 1, 10)


def minutes(*spans: tuple[datetime, int]) -> list[str]:
    """Stamps every minute: from each start so many."""
    return [
        (start + timedelta(minutes=at)).strftime("%Y-%m-%d %H:%M")
        for start, count in spans
        for at in range(count)
    ]


def as_file(stamps: list[str]) -> str:
    """One column of numbers, the place of the line."""
    return "t;a\n" + "".join(f"{stamp};{place}\n" for place, stamp in enumerate(stamps))


@pytest.mark.parametrize("chunk", [1 << 23, 200])
def test_a_clock_set_back_is_sized_with_the_usual_step(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, chunk: int
) -> None:
    """A row at 10:06, the next at 10:00 where 10:07 was due: set back by 7 min, wherever chunks end."""
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", chunk)
    stamps = minutes((TEN, 7), (TEN, 60))
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}))
    (finding,) = got.note.findings
    assert finding.code is FindingCode.CLOCK_STEP
    assert (finding.line, finding.numbers["step_s"], finding.numbers["count"]) == (9, -420.0, 1)
    assert got.counts() == (68, 67, 1, 0)


def test_rows_written_late_are_no_step_of_the_clock(tmp_path: Path) -> None:
    """Ten rows of 09:30 that follow 10:06, then 10:07: a buffer emptied late, put in order and noted."""
    stamps = minutes((TEN, 7), (TEN - timedelta(minutes=30), 10), (TEN + timedelta(minutes=7), 10))
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}))
    assert got.found() == []
    assert got.stamps == sorted(got.stamps) and len(got.stamps) == 27
    assert got.note.backward_steps == 1
    assert any("written late" in line for line in got.note.evidence)


def test_a_forward_jump_is_a_gap_and_no_step(tmp_path: Path) -> None:
    """A clock set ahead and a logger that stood still write the same rows: the gap is told by cleaning."""
    got = read(
        tmp_path,
        {"log.csv": as_file(minutes((TEN, 7), (TEN + timedelta(hours=1), 7)))},
        make_export({"a": "a"}),
    )
    assert got.found() == []


@pytest.mark.parametrize("year", [1970, 1980, 2000])
def test_a_reset_clock_is_told_and_its_rows_are_rejected(tmp_path: Path, year: int) -> None:
    """Forty minutes of a clock without battery amid a day: no row of them is used, the others all are."""
    stamps = minutes((TEN, 300), (datetime(year, 1, 1), 40), (TEN + timedelta(minutes=340), 300))
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}))
    (finding,) = got.note.findings
    assert (finding.code, finding.line, finding.numbers["reset"]) == (FindingCode.CLOCK_STEP, 302, 40)
    assert finding.words["year"] == str(year)
    expected = datetime(year, 1, 1) - (TEN + timedelta(minutes=300))
    assert finding.numbers["step_s"] == expected.total_seconds()
    assert got.rejected("a") == {"bad stamp": 40}
    assert got.counts() == (641, 600, 1, 40)
    assert (got.stamps[0], got.stamps[-1]) == ("2026-07-01T10:00:00", "2026-07-01T20:39:00")
    assert got.note.first_us is not None and got.note.first_us > 1_780_000_000_000_000


def test_a_whole_file_of_a_reset_clock_is_known_by_the_others(tmp_path: Path) -> None:
    """Of three daily files the second is dated 1970."""
    files = {
        "1.csv": as_file(minutes((TEN, 60))),
        "2.csv": as_file(minutes((datetime(1970, 1, 1, 1), 60))),
        "3.csv": as_file(minutes((TEN + timedelta(days=2), 60))),
    }
    got = read(tmp_path, files, make_export({"a": "a"}))
    notes = {note.file: note for note in got.notes}
    assert (notes["2.csv"].lines_data, notes["2.csv"].lines_rejected, notes["2.csv"].first_us) == (
        0,
        60,
        None,
    )
    assert [finding.numbers.get("reset") for finding in notes["2.csv"].findings] == [60]
    assert len(got.stamps) == 120


def days(*dates: str, rows: int = 100) -> list:
    """Rows of some days, a minute apart."""
    return [
        stamp_days(np.datetime64(date, "us").astype(np.int64) + 60_000_000 * np.arange(rows))
        for date in dates
    ]


def test_an_archive_of_many_years_is_believed() -> None:
    """Files of fifteen years, a pause of seven years that ends in May, a single file: nothing is a reset."""
    years = days(*(f"{year}-03-01" for year in range(2011, 2026)))
    low, high = believed_range(years)
    assert low < years[0].first_us[0] and high > years[-1].last_us[-1]
    pause = days("2015-05-04", rows=10) + days("2022-08-01")
    assert believed_range(pause)[0] < pause[0].first_us[0]
    alone = days("2000-01-01")
    assert believed_range(alone)[0] < alone[0].first_us[0]
    assert believed_range(days("1970-01-01"))[0] > days("1989-12-31")[0].last_us[0]
    assert believed_range([]) == ANY_TIME


def test_a_long_past_january_is_a_reset() -> None:
    """A few rows of 1 January 2000 beside those of 2026 are not believed."""
    seen = days("2000-01-01", rows=10) + days("2026-01-05", "2026-01-06")
    low, _ = believed_range(seen)
    assert seen[0].last_us[0] < low < seen[1].first_us[0]
