"""Stamps: texts to microseconds of the logger's own clock, whole columns at a time.

Stamps of one length and one arrangement of digits are read together, digit by digit, so there is no
format to guess: the declared order of the date and the places of the digits decide. Nothing is ever
rolled over; a 31 February is no stamp.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.calendar_days import days_since_1970, is_date
from auditor.log_reading.stamp_words import number_of_month, zone_names
from auditor.records.plant import DateOrder, Export

Part = Literal["both", "date", "time"]
NO_OFFSET = np.iinfo(np.int64).min
"""Marks a stamp whose text names no offset from UTC."""

DAY_US = 86_400_000_000
_MOST_SHAPES = 256
_FIRST_US = 631_152_000_000_000
"""1990-01-01 in microseconds since 1970-01-01; ``_LAST_US`` is 2101-01-01."""
_LAST_US = 4_133_980_800_000_000
_PIVOT = 70
"""Two-digit years from here on belong to the 1900s."""

_YEAR, _MONTH, _DAY = "(?P<Y>0000|00)", "(?P<M>00?)", "(?P<D>00?)"
_NAME = r"(?P<name>[^\W\d_]+\.?)"
_MARK, _AGAIN = r"(?P<mark>[-/. ])", r"(?P=mark)"
_LOOSE = r"[-/., ]{0,2}"
"""Between the parts of a date with a name in it: ``Oct 5, 2026``, ``5. Oct 2026``."""
_DATES = {
    "year first": f"(?:{_YEAR}{_MARK}{_MONTH}{_AGAIN}{_DAY}|(?P<Y2>0000)(?P<M2>00)(?P<D2>00))",
    "day first": f"(?:{_DAY}{_MARK}{_MONTH}{_AGAIN}{_YEAR}|(?P<D2>00)(?P<M2>00)(?P<Y2>0000))",
    "month first": f"(?:{_MONTH}{_MARK}{_DAY}{_AGAIN}{_YEAR}|(?P<M2>00)(?P<D2>00)(?P<Y2>0000))",
}
_TIME = (
    r"(?:(?P<h>00?)[:.h](?P<m>00)(?:[:.m](?P<s>00)s?(?:[.,](?P<f>0+))?)?"
    r"|(?P<h2>00)(?P<m2>00)(?:(?P<s2>00)(?:[.,](?P<f2>0+))?)?)"
)
_NAMED_DATES = {
    "year first": f"{_YEAR}{_LOOSE}{_NAME}{_LOOSE}{_DAY}",
    "day first": f"{_DAY}{_LOOSE}{_NAME}{_LOOSE}{_YEAR}",
    "month first": f"{_NAME}{_LOOSE}{_DAY}{_LOOSE}{_YEAR}",
}
_HALF = r"(?: ?(?P<half>[AaPp])\.?[Mm]\.?)?"
_ZONE = r"(?: ?(?P<z>[Zz]|UTC|GMT)| ?(?P<sign>[+-])(?P<zh>00):?(?P<zm>00)?| \(?(?P<zone>[A-Za-z]{2,5})\)?)?"
_BETWEEN = r"(?:[Tt_]|[ ,]+|-| - )"
_EPOCH = re.compile(r"(?P<units>0{1,14})(?:[.,](?P<f>0+))?")
_SERIAL = re.compile(r"(?P<units>0{5})(?:[.,](?P<f>0+))?")
_SERIAL_START_DAYS = -25_569
"""Day 0 of a spreadsheet's serial dates, 1899-12-30 (the 1900 date base system of ISO/IEC 29500-1)."""
_SERIAL_STEP_US = 1_000
"""A serial date is a binary fraction of a day, cut off: it is read to the nearest millisecond."""
_SPANS_US = {"h": 3_600_000_000, "m": 60_000_000, "s": 1_000_000}


@dataclass(frozen=True)
class Texts:
    """A column of texts: one buffer of bytes and the ends of each text in it."""

    data: NDArray[np.uint8]
    starts: NDArray[np.int64]
    ends: NDArray[np.int64]

    def __len__(self) -> int:
        return int(self.starts.shape[0])

    def at(self, row: int) -> str:
        """One text."""
        return bytes(self.data[self.starts[row] : self.ends[row]]).decode("utf-8", "replace")

    def take(self, rows: NDArray[np.int64]) -> Texts:
        """Pick some of the texts."""
        return Texts(self.data, self.starts[rows], self.ends[rows])


@dataclass(frozen=True)
class Stamps:
    """Stamps of one column (or of a date and a time column together)."""

    local_us: NDArray[np.int64]
    """Reading of the clock on the wall as microseconds since 1970-01-01, shape (n,)."""
    offset_us: NDArray[np.int64]
    """Offset from UTC that the text itself names; ``NO_OFFSET`` where it names none."""
    good: NDArray[np.bool_]


def texts_of(words: Sequence[str]) -> Texts:
    """Lay out a list of texts as a column."""
    pieces = [word.encode("utf-8", "replace") for word in words]
    ends = np.cumsum([len(piece) for piece in pieces], dtype=np.int64)
    starts = np.concatenate([np.zeros(1, np.int64), ends[:-1]]) if pieces else ends
    return Texts(np.frombuffer(b"".join(pieces) or b"\0", np.uint8), starts, ends)


@dataclass(frozen=True)
class StampStyle:
    """How the stamps of an export are written."""

    order: DateOrder
    months: tuple[str, ...] = ()
    """Declared names of the months; English ones without."""
    clock: str = "UTC"
    """Declared clock: the names of its zone may stand behind a stamp."""


def style_of(export: Export, order: DateOrder | None = None) -> StampStyle:
    """Style of an export's stamps, as declared or in another order of the date."""
    return StampStyle(order or export.date_order, export.month_names, export.clock)


def read_stamps(columns: Sequence[Texts], style: StampStyle) -> Stamps:
    """Read stamps of one column, or of a date and a time column.

    Parameters
    ----------
    columns : sequence of Texts
        One column, or two: date, then time of day.
    style : StampStyle
        Declared order of the date, or which epoch; names of months; clock.

    Returns
    -------
    Stamps
        Years outside 1970...2100 are not good; counted seconds not before 1990, where the wrong unit leads.
    """
    if len(columns) == 1 or style.order.startswith("epoch"):
        return _read_part(columns[0], style, "both")
    date, time = _read_part(columns[0], style, "date"), _read_part(columns[1], style, "time")
    return Stamps(date.local_us + time.local_us, time.offset_us, date.good & time.good)


def shape_in_words(text: str, style: StampStyle) -> str:
    """Describe how a stamp is written: ``day.month.year hour:minute:second``.

    Examples
    --------
    >>> shape_in_words("31.10.2025 23:59:00", StampStyle("day first"))
    'day.month.year hour:minute:second'
    >>> shape_in_words("2026-07-01T00:00:00.250Z", StampStyle("year first"))
    'year-month-dayThour:minute:second.fraction with its offset from UTC'
    """
    if style.order.startswith("epoch"):
        return style.order.removeprefix("epoch ") + " since 1970-01-01 UTC"
    if style.order == "spreadsheet days":
        return "days since 1899-12-30"
    stripped = text.strip().encode("utf-8", "replace").decode("latin-1")
    shape = _shape(stripped)
    plan = _plan(shape, style, "both") or _plan(shape, style, "date")
    if plan is None:
        return ""
    names = {
        "Y": "year",
        "M": "month",
        "D": "day",
        "h": "hour",
        "m": "minute",
        "s": "second",
        "f": "fraction",
        "name": "month's name",
    }
    spans = sorted((span, names[key]) for key, span in plan.spans.items() if key in names)
    out, place = "", 0
    for (start, end), name in spans:
        out, place = out + stripped[place:start] + name, end
    out += ", morning or afternoon" if plan.afternoon is not None else ""
    return out + (" with its offset from UTC" if plan.is_zoned else "")


@dataclass(frozen=True)
class _Plan:
    """Where the digits of one shape of stamp stand."""

    spans: dict[str, tuple[int, int]]
    is_utc: bool
    sign: int
    """-1 or +1 with an offset in the text, else 0."""
    month: int | None = None
    """With the name of a month in the text."""
    afternoon: bool | None = None
    """With a half of the day in the text."""
    zone_us: int | None = None
    """Offset of the zone that the text names."""

    @property
    def is_zoned(self) -> bool:
        return self.is_utc or self.sign != 0 or self.zone_us is not None


@lru_cache(maxsize=1024)
def _plan(shape: str, style: StampStyle, part: Part) -> _Plan | None:
    """Find the places of year, month... in a shape (a stamp with ``0`` for every digit)."""
    found = _match(shape, style.order, part)
    if found is None:
        return None
    spans = {
        key.rstrip("2"): found.span(key)
        for key, text in found.groupdict().items()
        if text is not None and key not in ("mark", "z", "sign", "half", "zone")
    }
    named = found.groupdict()
    month = zone_us = None
    if (name := named.get("name")) is not None:
        month = number_of_month(name.encode("latin-1").decode("utf-8", "replace"), style.months)
        if month is None:
            return None
    if (zone := named.get("zone")) is not None:
        zone_us = zone_names(style.clock).get(zone)
        if zone_us is None:
            return None
    sign = {"-": -1, "+": 1}.get(named.get("sign") or "", 0)
    half = named.get("half")
    afternoon = None if half is None else half in "Pp"
    return _Plan(spans, named.get("z") is not None, sign, month, afternoon, zone_us)


def _match(shape: str, order: DateOrder, part: Part) -> re.Match[str] | None:
    if order.startswith("epoch"):
        return _EPOCH.fullmatch(shape)
    if part == "time":
        return re.fullmatch(_TIME + _HALF + _ZONE, shape)
    if order == "spreadsheet days":
        return _SERIAL.fullmatch(shape)
    # A letter beyond ASCII is several bytes here, each a mark of its own in Latin-1.
    named = _NAMED_DATES[order].replace(r"[^\W\d_]", r"[A-Za-z\x80-\xff]")
    date = named if re.match(named, shape) else _DATES[order]
    if part == "date":
        # A date column may carry an idle midnight of its own.
        return re.fullmatch(date + rf"(?:{_BETWEEN}[0:.]+)?", shape)
    glued = "" if re.fullmatch("0{12}|0{14}", shape) else _BETWEEN
    return re.fullmatch(date + rf"(?:{glued}{_TIME}{_HALF}{_ZONE})?", shape)


def _shape(text: str) -> str:
    return re.sub("[0-9]", "0", text)


def _read_part(texts: Texts, style: StampStyle, part: Part) -> Stamps:
    n = len(texts)
    out = Stamps(np.zeros(n, np.int64), np.full(n, NO_OFFSET), np.zeros(n, np.bool_))
    if n == 0:
        return out
    starts, ends = _without_blanks(texts)
    lengths = ends - starts
    if lengths[0] > 0 and (lengths == lengths[0]).all():
        return _read_alike(texts.data, starts, int(lengths[0]), (style, part, out))
    for length in np.unique(lengths):
        if 0 < length <= 40:
            rows = np.flatnonzero(lengths == length)
            _read_length(texts.data, starts[rows], int(length), rows, (style, part, out))
    return out


def _without_blanks(texts: Texts) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    starts, ends = texts.starts, texts.ends
    for _ in range(8):
        lead = (starts < ends) & (texts.data[np.minimum(starts, texts.data.size - 1)] == 32)
        if not lead.any():
            break
        starts = starts + lead
    for _ in range(8):
        trail = (starts < ends) & (texts.data[np.maximum(ends - 1, 0)] == 32)
        if not trail.any():
            break
        ends = ends - trail
    return starts, ends


def _read_alike(
    data: NDArray[np.uint8], starts: NDArray[np.int64], length: int, into: tuple[StampStyle, Part, Stamps]
) -> Stamps:
    """Read stamps of one length; a long export repeats each for many tags, and it is read once."""
    style, part, out = into
    is_new = np.ones(starts.size, np.bool_)
    if (np.diff(starts) == length).all():
        words = data[starts[0] : starts[0] + starts.size * length].view(f"V{length}").view(f"S{length}")
        is_new[1:] = words[1:] != words[:-1]
    if 2 * np.count_nonzero(is_new) > starts.size:
        _read_length(data, starts, length, None, into)
        return out
    first = np.flatnonzero(is_new)
    once = Stamps(out.local_us[first], out.offset_us[first], out.good[first])
    _read_length(data, starts[first], length, None, (style, part, once))
    at = np.cumsum(is_new) - 1
    return Stamps(once.local_us[at], once.offset_us[at], once.good[at])


def _read_length(
    data: NDArray[np.uint8],
    starts: NDArray[np.int64],
    length: int,
    rows: NDArray[np.int64] | None,
    into: tuple[StampStyle, Part, Stamps],
) -> None:
    """Read all stamps of one length, one arrangement of digits after the other."""
    style, part, out = into
    steps = np.diff(starts)
    if steps.size == 0 or (steps == length).all():
        letters = data[starts[0] : starts[0] + starts.size * length].reshape(-1, length)
    else:
        letters = data[starts[:, None] + np.arange(length)]
    left = np.arange(starts.size)
    for _ in range(_MOST_SHAPES):
        some = letters if left.size == starts.size else letters[left]
        digits = some - np.uint8(48)
        is_digit = digits < 10
        alike = np.where(is_digit[0], is_digit, some == some[0]).all(axis=1)
        shape = _shape(bytes(some[0]).decode("latin-1"))
        plan = _plan(shape, style, part)
        if plan is not None:
            at = left[alike]
            local, offset, good = _compute(digits if alike.all() else digits[alike], plan, style.order)
            where = at if rows is None else rows[at]
            out.local_us[where], out.offset_us[where], out.good[where] = local, offset, good
        left = left[~alike]
        if left.size == 0:
            return


def _compute(
    digits: NDArray[np.uint8], plan: _Plan, order: DateOrder
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]]:
    """Wall time, offset from UTC and whether there is such a time, of stamps of one shape."""
    n = digits.shape[0]
    if "units" in plan.spans:
        is_serial = order == "spreadsheet days"
        local = _serial_us(digits, plan) if is_serial else _epoch_us(digits, plan, order)
        offset = np.full(n, NO_OFFSET) if is_serial else np.zeros(n, np.int64)
        return local, offset, (local >= _FIRST_US) & (local < _LAST_US)
    local, good = _time_of_day_us(digits, plan)
    if "Y" in plan.spans:
        year, day = _number(digits, plan, "Y"), _number(digits, plan, "D")
        month = _number(digits, plan, "M") if plan.month is None else np.full(n, plan.month)
        if plan.spans["Y"][1] - plan.spans["Y"][0] == 2:
            year = year + np.where(year < _PIVOT, 2000, 1900)
        good &= is_date(year, month, day)
        local = local + days_since_1970(year, month, day) * DAY_US
    if not plan.is_zoned:
        return local, np.full(n, NO_OFFSET), good
    if plan.zone_us is not None:
        return local, np.full(n, plan.zone_us), good
    hour, minute = _number(digits, plan, "zh"), _number(digits, plan, "zm")
    good &= (hour < 15) & (minute < 60)
    return local, plan.sign * (hour * _SPANS_US["h"] + minute * _SPANS_US["m"]), good


def _number(digits: NDArray[np.uint8], plan: _Plan, key: str) -> NDArray[np.int64]:
    start, end = plan.spans.get(key, (0, 0))
    total = np.zeros(digits.shape[0], np.int64)
    for place in range(start, min(end, start + 18)):
        total = total * 10 + digits[:, place]
    return total


def _fraction_us(digits: NDArray[np.uint8], plan: _Plan) -> NDArray[np.int64]:
    start, end = plan.spans.get("f", (0, 0))
    total = np.zeros(digits.shape[0], np.int64)
    for place in range(start, start + 6):
        total = total * 10 + (digits[:, place] if place < end else 0)
    return total


def _epoch_us(digits: NDArray[np.uint8], plan: _Plan, order: DateOrder) -> NDArray[np.int64]:
    scale = 1_000_000 if order == "epoch seconds" else 1_000
    return _number(digits, plan, "units") * scale + _fraction_us(digits, plan) * scale // 1_000_000


def _serial_us(digits: NDArray[np.uint8], plan: _Plan) -> NDArray[np.int64]:
    start, end = plan.spans.get("f", (0, 0))
    share = np.zeros(digits.shape[0])
    for place in reversed(range(start, min(end, start + 15))):
        share = (share + digits[:, place]) / 10.0
    steps = np.rint(share * (DAY_US // _SERIAL_STEP_US)).astype(np.int64)
    return (_number(digits, plan, "units") + _SERIAL_START_DAYS) * DAY_US + steps * _SERIAL_STEP_US


def _time_of_day_us(digits: NDArray[np.uint8], plan: _Plan) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    hour, minute, second = (_number(digits, plan, key) for key in "hms")
    fraction = _fraction_us(digits, plan)
    good = (minute < 60) & (second < 60) & ((hour < 24) | ((hour == 24) & (minute + second + fraction == 0)))
    if plan.afternoon is not None:
        # 12 AM is midnight and 12 PM noon: common practice.
        good &= (hour >= 1) & (hour <= 12)
        hour = hour % 12 + (12 if plan.afternoon else 0)
    local = hour * _SPANS_US["h"] + minute * _SPANS_US["m"] + second * _SPANS_US["s"] + fraction
    return local, good
