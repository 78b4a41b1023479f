"""Periods and grids: months of 743 to 745 hours, labels, refusals."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from datetime import UTC, date, datetime

import numpy as np
import pytest

from auditor.cleaning import between_dates, calendar_month, make_grid, month_labels
from auditor.records.errors import UsageError


def us(*moment: int) -> int:
    """UTC microseconds of a moment given in UTC."""
    return int(datetime(*moment, tzinfo=UTC).timestamp()) * 1_000_000  # type: ignore[misc]


@pytest.mark.parametrize(
    ("month", "hours"),
    # Clock changes of the European Union: last Sundays of March and October at 01:00 UTC
    # (Directive 2000/84/EC, articles 2 and 3).
    [("2026-03", 743), ("2026-07", 744), ("2025-10", 745), ("2024-02", 696)],
)
def test_months_have_the_hours_of_their_clock_changes(month: str, hours: int) -> None:
    """March loses an hour and October gains one."""
    period = calendar_month(month, "Europe/Copenhagen")
    assert period.seconds == hours * 3600.0
    assert period.label == month


def test_days_have_23_24_and_25_hours() -> None:
    """Days run from local midnight to local midnight."""
    for month, special, hours in (("2026-03", 28, 23), ("2025-10", 25, 25)):
        grid = make_grid(calendar_month(month, "Europe/Stockholm"), 60, 900)
        lengths = np.diff(grid.day_start_us) / 3.6e9
        assert lengths[special] == hours
        assert (np.delete(lengths, special) == 24.0).all()
        assert grid.ticks * 60 == grid.period.seconds
        assert (np.diff(grid.start_us) == 60_000_000).all()


def test_period_starts_at_local_midnight() -> None:
    """July in Stockholm starts two hours before July in UTC."""
    period = calendar_month("2026-07", "Europe/Stockholm")
    assert (period.start_us, period.end_us) == (us(2026, 6, 30, 22), us(2026, 7, 31, 22))


def test_day_without_midnight_starts_at_the_change() -> None:
    """In Beirut the clocks went from 00:00 to 01:00 on 31 March 2024 (IANA time zone database)."""
    period = between_dates(date(2024, 3, 31), date(2024, 3, 31), "Asia/Beirut")
    assert period.start_us == us(2024, 3, 30, 22)
    assert period.seconds == 23 * 3600.0


def test_labels_of_dates_and_of_whole_months() -> None:
    """Dates are inclusive; a whole month is called a month however it was asked for."""
    part = between_dates(date(2026, 7, 3), date(2026, 7, 9), "Europe/Stockholm")
    assert part.label == "2026-07-03_2026-07-09"
    assert part.seconds == 7 * 86400.0
    assert between_dates(date(2026, 7, 1), date(2026, 7, 31), "UTC") == calendar_month("2026-07", "UTC")


@pytest.mark.parametrize("text", ["2026-13", "2026-00", "july", "2026-7", "0000-01", "2026-07-01"])
def test_what_is_no_month_is_refused(text: str) -> None:
    """The message shows what was given."""
    with pytest.raises(UsageError, match=text):
        calendar_month(text, "UTC")


def test_dates_in_the_wrong_order_are_refused() -> None:
    """An end before the start is no period."""
    with pytest.raises(UsageError, match="lies before"):
        between_dates(date(2026, 7, 9), date(2026, 7, 3), "UTC")


@pytest.mark.parametrize(("tick_s", "interval_s"), [(60, 90), (0, 900), (60, 7 * 3600)])
def test_ticks_and_intervals_must_divide(tick_s: int, interval_s: int) -> None:
    """Intervals are whole ticks, the period whole intervals."""
    with pytest.raises(UsageError, match=r"site\.(tick|interval)"):
        make_grid(calendar_month("2026-07", "UTC"), tick_s, interval_s)


def test_months_touched_by_stretches() -> None:
    """A stretch from late June (local) to August touches three months; overlaps are named once."""
    ranges = [(us(2026, 6, 30, 21, 59), us(2026, 8, 1)), (us(2026, 7, 5), us(2026, 7, 6))]
    assert month_labels(ranges, "Europe/Stockholm") == ["2026-06", "2026-07", "2026-08"]
    assert month_labels([(us(2026, 6, 30, 22), us(2026, 7, 1))], "Europe/Stockholm") == ["2026-07"]
    assert month_labels([], "UTC") == []


def test_grid_is_the_same_in_any_time_zone_of_the_machine() -> None:
    """Nothing depends on the clock or zone of the machine."""
    code = (
        "from auditor.cleaning import calendar_month; p = calendar_month('2025-10', 'Europe/Copenhagen');"
        "print([p.start_us, p.end_us])"
    )
    seen = []
    for zone in ("Asia/Tokyo", "America/New_York"):
        done = subprocess.run(
            [sys.executable, "-c", code],
            env={**os.environ, "TZ": zone},
            capture_output=True,
            text=True,
            check=True,
        )
        seen.append(json.loads(done.stdout))
    assert seen[0] == seen[1]
    assert seen[0][1] - seen[0][0] == 745 * 3_600_000_000
