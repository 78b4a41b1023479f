"""Words in stamps: names of months, halves of the day, names of zones."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import UTC, datetime
from functools import lru_cache
from zoneinfo import ZoneInfo

_ENGLISH = "January February March April May June July August September October November December".split()
"""Known without a declaration; their first three letters too (the names of RFC 5322, section 3.3)."""
_YEARS = (1990, 2040)


@lru_cache(maxsize=32)
def months_by_name(declared: Sequence[str]) -> dict[str, int]:
    """Give the number of each month by its name in small letters.

    Declared names stand alone: a word that is the name of one month in one language and of another
    one elsewhere is never guessed at.
    """
    if declared:
        return {name.casefold().rstrip("."): month for month, name in enumerate(declared, start=1)}
    full = {name.casefold(): month for month, name in enumerate(_ENGLISH, start=1)}
    return {**full, **{name[:3]: month for name, month in full.items()}}


def number_of_month(word: str, declared: Sequence[str]) -> int | None:
    """Return the number of a month's name; None for any other word.

    Examples
    --------
    >>> number_of_month("Oct", ()), number_of_month("Okt", ())
    (10, None)
    """
    return months_by_name(tuple(declared)).get(word.casefold().rstrip("."))


@lru_cache(maxsize=32)
def zone_names(clock: str) -> dict[str, int]:
    """Offsets from UTC [us] by the names that the zone of a clock goes by (tz database), such as CET.

    A name is taken only from the declared clock's own zone: elsewhere the same letters mean another
    offset. A name that meant two offsets over the years is left out.
    """
    if clock == "UTC" or re.fullmatch(r"[+-].*", clock):
        return {}
    zone, found, doubtful = ZoneInfo(clock), dict[str, int](), set[str]()
    for year in range(*_YEARS):
        for month in (1, 4, 7, 10):
            moment = datetime(year, month, 15, tzinfo=UTC).astimezone(zone)
            name, offset = moment.tzname() or "", moment.utcoffset()
            if offset is None or not name.isalpha():
                continue
            offset_us = round(offset.total_seconds()) * 1_000_000
            if found.setdefault(name, offset_us) != offset_us:
                doubtful.add(name)
    return {name: offset_us for name, offset_us in found.items() if name not in doubtful}
