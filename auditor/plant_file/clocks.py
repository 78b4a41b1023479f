"""Moments of the plant file, on the site's own clock, as instants."""

from __future__ import annotations

from datetime import UTC, date, datetime, time, timedelta
from zoneinfo import ZoneInfo

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_MICROSECOND = timedelta(microseconds=1)


def instant_us(moment: date, zone: str, *, later: bool = False) -> int:
    """Instant of a moment that a person wrote down.

    A bare date is its local midnight; a moment with an offset is taken at its word. A clock change
    makes one local hour happen twice: its moments are taken at the first passing, or at the second
    with ``later`` (so that the end of an exclusion covers both). Moments in the hour that a clock
    change skips become the instant of the change.

    Parameters
    ----------
    moment : date or datetime
        As written.
    zone : str
        IANA zone of the site.
    later : bool
        Take the second passing of a repeated hour.

    Returns
    -------
    int
        UTC microseconds since 1970-01-01.

    Examples
    --------
    >>> from datetime import datetime
    >>> instant_us(datetime(2025, 10, 26, 2, 30), "Europe/Copenhagen") // 60_000_000 % 1440
    30
    >>> instant_us(datetime(2025, 10, 26, 2, 30), "Europe/Copenhagen", later=True) // 60_000_000 % 1440
    90
    """
    wall = moment if isinstance(moment, datetime) else datetime.combine(moment, time())
    if wall.tzinfo is not None:
        return _microseconds(wall)
    first = _microseconds(wall.replace(tzinfo=ZoneInfo(zone), fold=0))
    second = _microseconds(wall.replace(tzinfo=ZoneInfo(zone), fold=1))
    if first <= second:
        return second if later else first
    return _change_us(second, first, ZoneInfo(zone))


def _microseconds(moment: datetime) -> int:
    return (moment.astimezone(UTC) - _EPOCH) // _MICROSECOND


def _change_us(before_us: int, after_us: int, zone: ZoneInfo) -> int:
    """First instant after a clock change that lies between two instants."""
    new_offset = _offset(after_us, zone)
    while after_us - before_us > 1:
        middle_us = (before_us + after_us) // 2
        if _offset(middle_us, zone) == new_offset:
            after_us = middle_us
        else:
            before_us = middle_us
    return after_us


def _offset(instant_us_: int, zone: ZoneInfo) -> timedelta | None:
    return (_EPOCH + instant_us_ * _MICROSECOND).astimezone(zone).utcoffset()
