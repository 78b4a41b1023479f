"""Periods between local midnights, and the grid of ticks laid over them."""

from __future__ import annotations

import re
from collections.abc import Iterable
from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np

from auditor.records.errors import Fault, UsageError
from auditor.records.period import MICROSECONDS, Grid, Period

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_MONTH = re.compile(r"(\d{4})-(\d{2})")


def local_midnight_us(day: date, zone: str) -> int:
    """Return the instant at which a local day begins, in UTC microseconds.

    Where a clock change removes midnight, the day begins at the change; where one repeats it, at the
    first of the two.
    """
    return _instant_us(datetime(day.year, day.month, day.day, tzinfo=ZoneInfo(zone)))


def calendar_month(label: str, zone: str) -> Period:
    """Return the calendar month ``2026-07`` of a zone as a period.

    Raises
    ------
    UsageError
        If the text is not a month.
    """
    found = _MONTH.fullmatch(label)
    if found is None or not 1 <= int(found[2]) <= 12 or not 1 <= int(found[1]) < 9999:
        raise UsageError([Fault("--month", f"{label!r} is not a month", "write it as 2026-07")])
    first = date(int(found[1]), int(found[2]), 1)
    return between_dates(first, _last_day_of_month(first), zone)


def between_dates(start: date, end: date, zone: str) -> Period:
    """Return the period from one local date to another, both included.

    A whole calendar month is labelled as such (``2026-07``), anything else by its dates.

    Raises
    ------
    UsageError
        If the end lies before the start.
    """
    if end < start:
        raise UsageError([Fault("--from, --to", f"{end} lies before {start}", "give the earlier date first")])
    whole_month = start.day == 1 and end == _last_day_of_month(start)
    return Period(
        label=f"{start:%Y-%m}" if whole_month else f"{start}_{end}",
        start_us=local_midnight_us(start, zone),
        end_us=local_midnight_us(end + timedelta(days=1), zone),
        zone=zone,
    )


def month_labels(ranges_us: Iterable[tuple[int, int]], zone: str) -> list[str]:
    """Return the calendar months of a zone that stretches (first, last instant) touch, oldest first."""
    months: set[int] = set()
    for first_us, last_us in ranges_us:
        first, last = _local_date(first_us, zone), _local_date(last_us, zone)
        months.update(range(first.year * 12 + first.month - 1, last.year * 12 + last.month))
    return [f"{month // 12:04d}-{month % 12 + 1:02d}" for month in sorted(months)]


def make_grid(period: Period, tick_s: int, interval_s: int) -> Grid:
    """Lay ticks of equal length over a period, from its start to its end.

    Parameters
    ----------
    period
        The period; it runs from local midnight to local midnight.
    tick_s, interval_s
        Lengths of a tick and of an audit interval [s].

    Raises
    ------
    UsageError
        If the interval is not a whole number of ticks, or the period not a whole number of intervals
        (a day that a clock change shortens must still be one).
    """
    length_s, rest_us = divmod(period.end_us - period.start_us, MICROSECONDS)
    faults = []
    if tick_s <= 0 or interval_s <= 0 or interval_s % tick_s:
        found = f"an interval of {interval_s} s is not a whole number of ticks of {tick_s} s"
        faults.append(
            Fault("plant.toml, site.tick and site.interval", found, "choose a tick that divides it")
        )
    elif rest_us or length_s % interval_s:
        hours = f"the {length_s / 3600:g} h of period {period.label}"
        found = f"{hours} are no whole number of intervals of {interval_s} s"
        faults.append(Fault("plant.toml, site.interval", found, "choose an interval that divides an hour"))
    if faults:
        raise UsageError(faults)
    first, last = _local_date(period.start_us, period.zone), _local_date(period.end_us - 1, period.zone)
    tick_us = tick_s * MICROSECONDS
    return Grid(
        period=period,
        tick_s=tick_s,
        interval_s=interval_s,
        start_us=np.arange(period.start_us, period.end_us, tick_us, dtype=np.int64),
        day_start_us=np.array(_midnights_us(first, last, period.zone), dtype=np.int64),
    )


def _midnights_us(first: date, last: date, zone: str) -> list[int]:
    """Return the local midnights of every day from first to last, and the one after."""
    days = (last - first).days + 1
    return [local_midnight_us(first + timedelta(days=day), zone) for day in range(days + 1)]


def _last_day_of_month(first: date) -> date:
    return (first.replace(day=28) + timedelta(days=4)).replace(day=1) - timedelta(days=1)


def _local_date(instant_us: int, zone: str) -> date:
    return (_EPOCH + timedelta(microseconds=instant_us)).astimezone(ZoneInfo(zone)).date()


def _instant_us(moment: datetime) -> int:
    return (moment - _EPOCH) // timedelta(microseconds=1)
