"""What the stamps of an export prove, and what they only show."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from auditor.drafting.gathering import Gathered
from auditor.drafting.proposals import StampEvidence
from auditor.log_reading.stamps import DAY_US as _DAY_US
from auditor.log_reading.stamps import NO_OFFSET, Stamps, StampStyle, read_stamps, shape_in_words, texts_of
from auditor.records.plant import DateOrder

_HOUR_US = 3_600_000_000
_MINUTE_US = 60_000_000
_SUNDAY = 3
"""Days are counted from 1970-01-01, a Thursday; clocks change in the night to a Sunday."""
_EPOCH = "the stamps count from 1970 and so are UTC, unless the logger counts on a clock of its own"
_MONTHS = "January February March April May June July August September October November December".split()
_MOST_SHOWN = 2
_STRAYS = 0.01
"""Torn lines may read as another order: so small a share of them does not count against a proof."""


def stamp_evidence(gathered: Gathered) -> StampEvidence:
    """Decide the order of the date where only one can be, and say what the stamps show of their clock."""
    pieces = [piece for piece in (*gathered.pieces, *gathered.heads) if piece.lines]
    texts = _joined([piece.stamps() for piece in pieces])
    columns = [texts_of(column) for column in texts]
    reads = {order: read_stamps(columns, StampStyle(order)) for order in pieces[0].table.orders}
    reads = {order: read for order, read in reads.items() if read.good.any()}
    shown = [" ".join(parts).strip() for parts in zip(*texts, strict=True)]
    order, because = _order(reads, shown)
    likely: DateOrder = order if order is not None else next(iter(reads))
    read = reads[likely]
    good = np.flatnonzero(read.good)
    in_time = good[np.argsort(read.local_us[good], kind="stable")] if order else good
    ends = np.cumsum([len(piece.lines) for piece in gathered.pieces])
    runs = [rows[read.good[rows]] for rows in np.split(np.arange(ends[-1]), ends[:-1])]
    steps = [np.diff(read.local_us[rows]) for rows in runs]
    if likely.startswith("epoch"):
        clock: tuple[str, ...] = (_EPOCH,)
    else:
        clock = _clock(read, shown, runs, steps)
    return StampEvidence(
        order=order,
        because=because,
        first=shown[int(in_time[0])],
        last=shown[int(in_time[-1])],
        clock=clock,
        step_s=_step_s(steps),
    )


def _joined(stamps: Sequence[list[list[str]]]) -> list[list[str]]:
    width = min(len(columns) for columns in stamps)
    return [[text for columns in stamps for text in columns[place]] for place in range(width)]


def _order(reads: dict[DateOrder, Stamps], shown: Sequence[str]) -> tuple[DateOrder | None, str]:
    if len(reads) == 1:
        order, read = next(iter(reads.items()))
        text = shown[int(np.flatnonzero(read.good)[0])]
        words = shape_in_words(text, StampStyle(order))
        return order, f'"{text}" can only be read so' + (f": {words}" if words else "")
    alone: dict[DateOrder, NDArray[np.int64]] = {}
    for order, read in reads.items():
        others = np.any([other.good for name, other in reads.items() if name != order], axis=0)
        alone[order] = np.flatnonzero(read.good & ~others)
    proven = sorted((name for name in reads if alone[name].size), key=lambda name: -alone[name].size)
    if not proven:
        at = int(np.flatnonzero(np.any([read.good for read in reads.values()], axis=0))[0])
        dates = " or ".join(
            f"{_date(int(read.local_us[at]))} ({name})" for name, read in reads.items() if read.good[at]
        )
        return None, f'no day above 12 was seen, so "{shown[at]}" may be {dates}'
    first = proven[0]
    rest = sum(alone[name].size for name in proven[1:])
    if rest <= _STRAYS * alone[first].size:
        return first, f'"{shown[int(alone[first][0])]}" can only be read so'
    examples = " but ".join(f'"{shown[int(alone[name][0])]}" can only be read {name}' for name in proven)
    return None, f"{examples}: are these files of one logger?"


def _date(local_us: int) -> str:
    year, month, day = str(np.datetime64(local_us, "us"))[:10].split("-")
    return f"{int(day)} {_MONTHS[int(month) - 1]} {year}"


def _clock(
    read: Stamps,
    shown: Sequence[str],
    runs: Sequence[NDArray[np.int64]],
    steps: Sequence[NDArray[np.int64]],
) -> tuple[str, ...]:
    zoned = np.flatnonzero(read.good & (read.offset_us != NO_OFFSET))
    if zoned.size:
        whole = zoned.size == int(read.good.sum())
        named = ", ".join(_offset(int(value)) for value in np.unique(read.offset_us[zoned]))
        return (
            f"{'every stamp names' if whole else 'some stamps name'} an offset of its own: {named}"
            f' ("{shown[int(zoned[0])]}")',
        )
    said = ["no stamp names an offset from UTC"]
    for sign, what in ((-1, "falls back by an hour"), (1, "leaps an hour")):
        found: dict[tuple[str, str], None] = {}
        for rows, step in zip(runs, steps, strict=True):
            for at in _hour_steps(read.local_us[rows], step, sign):
                found[(shown[int(rows[at])], shown[int(rows[at + 1])])] = None
        said += [f'the clock {what} from "{one}" to "{two}"' for one, two in list(found)[:_MOST_SHOWN]]
    if len(said) == 1:
        said.append("no repeated and no skipped hour was seen in the lines looked at")
        said += [
            f"the night to Sunday {night} ran through, though clocks change then in {where}"
            for night, where in _quiet_nights([read.local_us[rows] for rows in runs], steps)[:_MOST_SHOWN]
        ]
    return tuple(said)


def _quiet_nights(
    runs_us: Sequence[NDArray[np.int64]], steps_us: Sequence[NDArray[np.int64]]
) -> list[tuple[str, str]]:
    """Find nights of a clock change whose small hours stand in the log without a leap or a fall."""
    found: dict[tuple[str, str], None] = {}
    for local_us, steps in zip(runs_us, steps_us, strict=True):
        if not steps.size or not 0.0 < np.median(steps) <= _HOUR_US / 2:
            continue
        for day in np.unique(local_us // _DAY_US):
            where = _changes_in(int(day))
            small = (local_us >= day * _DAY_US) & (local_us < day * _DAY_US + 4 * _HOUR_US)
            inside = np.diff(local_us[small])
            is_quiet = inside.size > 0 and inside.min() >= 0 and inside.max() < _HOUR_US / 2
            if where and is_quiet and inside.sum() > 3 * _HOUR_US:
                found[(_date(int(day) * _DAY_US), where)] = None
    return list(found)


def _changes_in(day: int) -> str:
    """Say where clocks change on a day since 1970-01-01.

    Europe: Directive 2000/84/EC, last Sundays of March and October. North America: second Sunday of March
    and first of November (United States Energy Policy Act of 2005; from memory).
    """
    _, month, of_month = (int(part) for part in str(np.datetime64(day, "D")).split("-"))
    if day % 7 != _SUNDAY:
        return ""
    if month in (3, 10) and of_month >= 25:
        return "Europe"
    return "North America" if (month, (of_month + 6) // 7) in ((3, 2), (11, 1)) else ""


def _offset(offset_us: int) -> str:
    minutes = offset_us // _MINUTE_US
    sign = "-" if minutes < 0 else "+"
    return "UTC" if minutes == 0 else f"{sign}{abs(minutes) // 60:02d}:{abs(minutes) % 60:02d}"


def _hour_steps(local_us: NDArray[np.int64], steps_us: NDArray[np.int64], sign: int) -> NDArray[np.int64]:
    """Find rows after which the clock moves by an hour more or less, in the small hours of a Sunday."""
    usual = float(np.median(steps_us)) if steps_us.size > 2 else 0.0
    if not 0.0 < usual <= _HOUR_US / 2:
        return np.zeros(0, np.int64)
    small_hours = (local_us[:-1] // _HOUR_US) % 24 <= 3
    sunday = (local_us[:-1] // _DAY_US) % 7 == _SUNDAY
    by_an_hour = np.abs(steps_us - sign * _HOUR_US - usual) <= 0.5 * usual
    return np.flatnonzero(small_hours & sunday & by_an_hour)


def _step_s(steps_us: Sequence[NDArray[np.int64]]) -> float:
    apart = np.abs(np.concatenate(steps_us))
    apart = apart[apart > 0]
    return float(np.median(apart)) / 1e6 if apart.size else math.nan
