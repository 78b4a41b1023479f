"""The site's clock: local moments in sentences and tables, standard time with a fixed offset in pictures."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

from auditor.records.period import Period

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_MONTHS = (
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
)


def _utc(instant_us: int) -> datetime:
    return _EPOCH + timedelta(microseconds=int(instant_us))


@dataclass(frozen=True)
class Clock:
    """Says instants as the site's own wall clock shows them."""

    zone: str

    def local(self, instant_us: int) -> datetime:
        """Wall-clock time of a UTC instant in microseconds."""
        return _utc(instant_us).astimezone(ZoneInfo(self.zone))

    def date(self, instant_us: int) -> str:
        """``28 Jul``."""
        when = self.local(instant_us)
        return f"{when.day}\u00a0{_MONTHS[when.month - 1][:3]}"

    def moment(self, instant_us: int) -> str:
        """``28 Jul, 09:00``; in an hour that the autumn change repeats with its offset."""
        when = self.local(instant_us)
        text = f"{self.date(instant_us)}, {_time(when)}"
        other = when.replace(fold=1 - when.fold)
        if other.utcoffset() != when.utcoffset():
            text += f"\u00a0({_offset(when.utcoffset())})"
        return text

    def span(self, start_us: int, end_us: int) -> str:
        """``from 28 Jul, 09:00 to 11:30``, with the second date where it is another day."""
        start, end = self.local(start_us), self.local(end_us)
        same_day = start.date() == end.date()
        until = _time(end) if same_day else self.moment(end_us)
        return f"from {self.moment(start_us)} to {until}"

    def stamp(self, instant_us: int) -> str:
        """``2026-07-28 09:00``, for tables; with the offset in a repeated hour."""
        when = self.local(instant_us)
        text = f"{when:%Y-%m-%d} {_time(when)}"
        other = when.replace(fold=1 - when.fold)
        return text if other.utcoffset() == when.utcoffset() else f"{text} {_offset(when.utcoffset())}"

    def period(self, period: Period) -> str:
        """``July 2026``, or ``3 July 2026 to 9 July 2026`` (both days included)."""
        first = self.local(period.start_us)
        last = self.local(period.end_us - 1)
        span = f"{_long_date(first)} to {_long_date(last)}"
        whole_month = len(period.label) == len("2026-07")
        if not whole_month:
            return span if first.date() != last.date() else _long_date(first)
        month = f"{_MONTHS[first.month - 1]} {first.year}"
        return f"{month}, unfinished: {span}" if period.unfinished else month


def _time(when: datetime) -> str:
    return f"{when:%H:%M:%S}" if when.second else f"{when:%H:%M}"


def _long_date(when: datetime) -> str:
    return f"{when.day}\u00a0{_MONTHS[when.month - 1]}\u00a0{when.year}"


def _offset(offset: timedelta | None) -> str:
    minutes = round((offset or timedelta(0)).total_seconds() / 60)
    sign = "+" if minutes >= 0 else "\u2212"
    return f"UTC{sign}{abs(minutes) // 60:02d}:{abs(minutes) % 60:02d}"


def standard_offset(zone: str, instant_us: int) -> tuple[int, str]:
    """Offset of the site's standard time (no summer time) near an instant.

    Returns
    -------
    tuple of int and str
        Microseconds to add to UTC, and its name, ``UTC+01:00``.
    """
    when = _utc(instant_us).astimezone(ZoneInfo(zone))
    offset = (when.utcoffset() or timedelta(0)) - (when.dst() or timedelta(0))
    return round(offset.total_seconds()) * 1_000_000, _offset(offset)
