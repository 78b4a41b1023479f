"""One file that nobody has declared: where its table begins, its headings, units and stamps."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import read_number
from auditor.log_reading.dialect import heading_key, split_fields
from auditor.log_reading.encoding import as_ascii_like, codec_of_stream, find_encoding, to_utf8
from auditor.log_reading.listing import READ_ERRORS, StoredFile, open_stored, reason_of
from auditor.log_reading.samples import line_feeds, split_lines
from auditor.log_reading.stamps import DAY_US, StampStyle, read_stamps, texts_of
from auditor.records.plant import DateOrder
from auditor.units import UnitError, meanings, split_qualifier

HEAD_BYTES = 1 << 17
_HEAD_LINES = 150
_STAMP_PLACES = 4
"""The stamp stands in one of the first columns."""
_RUNS_ON = 0.9
"""Share of steps in one direction from which numbers may be seconds."""
CALENDAR: tuple[DateOrder, ...] = ("year first", "day first", "month first")
EPOCHS: tuple[DateOrder, ...] = ("epoch seconds", "epoch milliseconds")
_DELIMITERS = (";", "\t", ",")
_TIME_OF_DAY = re.compile(r"\d{1,2}:\d{2}(:\d{2})?([.,]\d+)?")
_STAMP_SHAPE = re.compile(r"\[?[yYmMdDhHsSjJtT]{1,4}([-:./ ][yYmMdDhHsSjJtT]{1,4})+\]?")


@dataclass(frozen=True)
class Table:
    """Where the table of a file begins and how its lines are cut. Columns count from 0, lines from 1."""

    delimiter: str
    headings: tuple[str, ...]
    heading_line: int
    units: tuple[str, ...]
    """Text of the unit row for each column; empty where there is none."""
    unit_line: int | None
    first_line: int
    stamp: tuple[int, ...]
    is_epoch: bool

    @property
    def orders(self) -> tuple[DateOrder, ...]:
        """Orders in which its stamps may be read."""
        return EPOCHS if self.is_epoch else CALENDAR


@dataclass(frozen=True)
class Sighting:
    """A file that holds a table with stamps."""

    stored: StoredFile
    table: Table
    known: frozenset[str]
    """Preamble, heading and unit row as they stand."""
    lines: tuple[str, ...]
    """The first lines of data."""


def look_first(stored: StoredFile) -> Sighting | str:
    """Look at the head of a file; a text says why it is no export."""
    if stored.set_aside:
        return stored.set_aside
    try:
        head = _head(stored)
    except READ_ERRORS as error:
        return reason_of(error)
    table = find_table(head)
    if isinstance(table, str):
        return table
    data = head[table.first_line - 1 :]
    known = frozenset(line.strip() for line in head[: table.first_line - 1]) - {""}
    return Sighting(stored, table, known, tuple(line for line in data if line.strip()))


def _head(stored: StoredFile) -> list[str]:
    with open_stored(stored) as stream:
        raw = stream.read(HEAD_BYTES)
    encoding = find_encoding((raw,), None)
    with open_stored(stored) as stream:
        text = as_ascii_like(stream, encoding).read(HEAD_BYTES)
    data = line_feeds(to_utf8(text, codec_of_stream(encoding))[0]).decode("utf-8", "replace")
    lines = split_lines(data)[: _HEAD_LINES + 1]
    return lines[:-1] if len(lines) > 1 else lines


def find_table(head: Sequence[str]) -> Table | str:
    """Find the table in the first lines of a file, or say why there is none.

    Examples
    --------
    >>> table = find_table(["Tid;T1;P", ";°C;kW", "01.07.2026 00:00;20,5;3", "01.07.2026 00:01;20,6;3"])
    >>> table.headings, table.units, table.first_line
    (('Tid', 'T1', 'P'), ('', '°C', 'kW'), 3)
    """
    best: tuple[int, int, str, tuple[int, ...], bool] | None = None
    for delimiter in _DELIMITERS:
        rows = [split_fields(line, delimiter) for line in head]
        found = _stamp_columns(rows)
        if found is None:
            continue
        stamp, good, is_epoch = found
        widths = Counter(len(row) for row, is_good in zip(rows, good, strict=True) if is_good)
        width = widths.most_common(1)[0][0]
        candidate = (int(good.sum()), width, delimiter, stamp, is_epoch)
        if width > len(stamp) and (best is None or candidate[:2] > best[:2]):
            best = candidate
    if best is None:
        return _why_no_stamps(head)
    _, _, delimiter, stamp, is_epoch = best
    rows = [split_fields(line, delimiter) for line in head]
    good = _read(rows, stamp, EPOCHS if is_epoch else CALENDAR)
    first = next(at for at in range(len(rows)) if good[at] and len(rows[at]) > len(stamp))
    return _table(rows, first, delimiter, stamp, is_epoch)


def _stamp_columns(rows: Sequence[Sequence[str]]) -> tuple[tuple[int, ...], NDArray[np.bool_], bool] | None:
    """Columns of the stamp, the lines in which it can be read, and whether it is a number of seconds."""
    width = max((len(row) for row in rows), default=0)
    goods = [_read(rows, (place,), CALENDAR) for place in range(min(width, _STAMP_PLACES))]
    counts = [int(good.sum()) for good in goods]
    if counts and max(counts) >= 1:
        place = next(at for at, count in enumerate(counts) if count >= 0.9 * max(counts))
        stamp: tuple[int, ...] = (place,)
        both = _read(rows, (place, place + 1), CALENDAR)
        if both.sum() >= 0.9 * counts[place] and _is_dates_only(rows, place):
            return (place, place + 1), both, False
        return stamp, goods[place], False
    good = _read(rows, (0,), EPOCHS)
    if good.sum() < 2:
        return None
    # Any large number could be seconds since 1970; time runs on from row to row.
    steps = np.diff(
        [float(row[0].replace(",", ".")) for row, is_good in zip(rows, good, strict=True) if is_good]
    )
    runs_on = max((steps >= 0).mean(), (steps <= 0).mean()) >= _RUNS_ON and steps.any()
    return ((0,), good, True) if runs_on else None


def _read(
    rows: Sequence[Sequence[str]], stamp: tuple[int, ...], orders: Sequence[DateOrder]
) -> NDArray[np.bool_]:
    columns = [texts_of([row[place] if place < len(row) else "" for row in rows]) for place in stamp]
    good = [read_stamps(columns, StampStyle(order)).good for order in orders]
    return np.asarray(np.any(good, axis=0), np.bool_)


def _is_dates_only(rows: Sequence[Sequence[str]], place: int) -> bool:
    column = [texts_of([row[place] if place < len(row) else "" for row in rows])]
    reads = [read_stamps(column, StampStyle(order)) for order in CALENDAR]
    return all(not (read.local_us[read.good] % DAY_US).any() for read in reads)


def _why_no_stamps(head: Sequence[str]) -> str:
    firsts = [re.split(r"[;\t,]", line)[0].strip() for line in head]
    if sum(_TIME_OF_DAY.fullmatch(text) is not None for text in firsts) > len(head) / 2:
        return "its first column holds times of day without a date"
    return "no column of it holds time stamps"


def _table(
    rows: Sequence[Sequence[str]], first: int, delimiter: str, stamp: tuple[int, ...], is_epoch: bool
) -> Table | str:
    above = [at for at in range(first - 1, -1, -1) if _may_be_headings(rows[at])]
    if not above:
        return "no heading row stands above its data"
    heading, unit_row = above[0], None
    if _is_unit_row(rows[heading]) and len(above) > 1:
        heading, unit_row = above[1], above[0]
    elif len(above) > 1 and above[1] == heading - 1 and _is_unit_row(rows[above[1]]):
        unit_row = above[1]
    headings = [heading_key(text) for text in rows[heading]]
    while len(headings) > 1 and not headings[-1]:
        headings.pop()
    if len(headings) <= max(stamp):
        return "no heading row stands above its data"
    if not _has_values(rows[first:], len(headings), stamp):
        return "beside its dates it holds no columns of numbers"
    units = ["" if unit_row is None else text.strip() for text in rows[unit_row or 0]]
    units += [""] * len(headings)
    return Table(
        delimiter=delimiter,
        headings=tuple(headings),
        heading_line=heading + 1,
        units=tuple(units[: len(headings)]),
        unit_line=None if unit_row is None else unit_row + 1,
        first_line=first + 1,
        stamp=stamp,
        is_epoch=is_epoch,
    )


def _may_be_headings(row: Sequence[str]) -> bool:
    filled = [text.strip() for text in row if text.strip()]
    numbers = [text for text in filled if is_number(text)]
    return len(filled) >= 2 and 2 * len(numbers) < len(filled)


def is_number(text: str) -> bool:
    """Whether a text is a number with either decimal mark."""
    return read_number(text, ".") is not None or read_number(text, ",") is not None


def _is_unit_row(row: Sequence[str]) -> bool:
    filled = [text.strip() for text in row if text.strip()]
    return 2 * sum(_is_unit(text) for text in filled) > len(filled)


@lru_cache(maxsize=4096)
def _is_unit(text: str) -> bool:
    if _STAMP_SHAPE.fullmatch(text) is not None:
        return True
    try:
        meanings(split_qualifier(text)[0])
    except UnitError:
        return False
    return True


def _has_values(rows: Sequence[Sequence[str]], width: int, stamp: tuple[int, ...]) -> bool:
    for place in range(width):
        if place in stamp:
            continue
        cells = [row[place].strip() for row in rows if place < len(row) and row[place].strip()]
        if cells and 2 * sum(is_number(text) for text in cells) > len(cells):
            return True
    return False
