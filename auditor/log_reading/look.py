"""One file looked at: its encoding, its dialect, its range of time, and what speaks for them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import read_number
from auditor.log_reading.clocks import Clock, clock_of
from auditor.log_reading.dialect import Dialect, find_dialect, heading_key, split_fields
from auditor.log_reading.doubts import Contradiction, flips, number_in_doubt
from auditor.log_reading.encoding import Encoding
from auditor.log_reading.file_per_tag import name_in_file, tags_named
from auditor.log_reading.listing import Claim
from auditor.log_reading.pairs_layout import line_by_line
from auditor.log_reading.resets import StampDays, stamp_days
from auditor.log_reading.samples import Sample, Sampled, line_at, take_samples
from auditor.log_reading.stamps import NO_OFFSET, Stamps, Texts, read_stamps, shape_in_words, style_of
from auditor.log_reading.table import Columns, Learnt, Shape, as_texts, distinct, read_columns
from auditor.records.plant import DateOrder, Export, FilePerTag, Tag

HEAD_LINES = 400
_HOUR_US = 3_600_000_000
_ORDERS: tuple[DateOrder, ...] = (
    "year first",
    "day first",
    "month first",
    "epoch seconds",
    "epoch milliseconds",
    "spreadsheet days",
)


@dataclass(frozen=True)
class Look:
    """What one claimed file turned out to be."""

    claim: Claim
    encoding: Encoding
    dialect: Dialect
    head: tuple[str, ...]
    first_us: int
    """Earliest and latest stamp of the samples; the wrong way round when there is none."""
    last_us: int
    days: tuple[StampDays, ...]
    """Stamps of the samples by day: a clock that was reset shows there."""
    is_whole: bool
    """All of it was looked at."""
    is_ordered: bool
    is_descending: bool
    stamp_format: str
    long_names: tuple[str, ...]
    """Long: names of tags in the samples."""
    bad_stamp: tuple[int, str] | None
    """Line and text of the first stamp that cannot be read."""
    date_contradiction: Contradiction | None
    dates_proven: bool
    """A stamp can be read with the declared order only."""
    decimal_contradiction: Contradiction | None
    decimal_proven: bool
    grouped: Contradiction | None
    """A number whose digits are grouped by a mark that is not declared."""
    date_flips: int
    """Stamps that can only be read with day and month the other way round."""
    point: str = ""
    """With one file per tag: the name of its tag."""

    @property
    def has_stamps(self) -> bool:
        """Whether any stamp could be read."""
        return self.first_us <= self.last_us


@dataclass(frozen=True)
class OtherTag:
    """With one file per tag: a file that holds no tag of the plant file."""

    name: str | None
    """None where the file does not say it."""
    pattern: str
    """Where the name was looked for."""


def row_shape(dialect: Dialect, export: Export, numbers: Sequence[int]) -> Shape:
    """Say what to cut out of the lines of a file."""
    quality = () if dialect.quality_column is None else (dialect.quality_column,)
    texts = dialect.stamp if dialect.tag_column is None else (*dialect.stamp, *quality, dialect.tag_column)
    texts = dialect.pair_stamps or texts
    return Shape(
        dialect.delimiter,
        export.decimal,
        dialect.fields,
        len(dialect.headings),
        texts,
        tuple(numbers),
        bool(dialect.pair_stamps),
    )


def number_columns(dialect: Dialect) -> list[int]:
    """Columns with the numbers of bound tags, in order of tags, each once."""
    if dialect.value_column is not None:
        return [dialect.value_column]
    return list(dict.fromkeys(dialect.columns.values()))


def to_instants(
    stamps: Stamps, clock: Clock
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]]:
    """UTC of stamps, what a second pass of a repeated hour would add, and the hour that spring skips."""
    named = stamps.offset_us != NO_OFFSET
    if named.all():
        return (
            stamps.local_us - stamps.offset_us,
            np.zeros_like(stamps.local_us),
            np.zeros(named.shape, np.bool_),
        )
    utc_us, second_us, skipped = clock.to_utc(stamps.local_us)
    if named.any():
        utc_us = np.where(named, stamps.local_us - np.where(named, stamps.offset_us, 0), utc_us)
        second_us, skipped = np.where(named, 0, second_us), skipped & ~named
    return utc_us, second_us, skipped


def look_at(claim: Claim, export: Export, tags: Mapping[str, Tag]) -> Look | OtherTag | tuple[str, ...]:
    """Look into a file.

    Returns
    -------
    Look or OtherTag or tuple of str
        The fields of its first lines where no line names any declared heading.
    """
    sampled = take_samples(claim.stored, export.encoding)
    head = sampled.samples[0].lines(HEAD_LINES)
    point, layout = "", export.layout
    if isinstance(layout, FilePerTag):
        name = name_in_file(layout, claim.stored.path, head)
        tags = tags_named(name, tags) if name else {}
        if not name or not tags:
            return OtherTag(name, layout.file_name or layout.preamble or "")
        point = name
    dialect = find_dialect(head, export, tags)
    if dialect is None:
        return _all_fields(head)
    seen = _Seen(claim, export, dialect, sampled)
    for place, sample in enumerate(sampled.samples):
        seen.add(sample, is_head=place == 0)
    proof, against, grouped = _decimal_proof(sampled.samples[0], dialect, export)
    return Look(
        claim=claim,
        encoding=sampled.encoding,
        dialect=dialect,
        head=tuple(head),
        first_us=seen.first_us,
        last_us=seen.last_us,
        days=tuple(seen.days),
        is_whole=sampled.is_whole,
        is_ordered=seen.falls == 0,
        is_descending=seen.rises == 0 and seen.falls > 0,
        stamp_format=seen.stamp_format,
        long_names=tuple(seen.names),
        bad_stamp=seen.bad_stamp,
        date_contradiction=seen.against,
        dates_proven=seen.proven,
        decimal_contradiction=against,
        decimal_proven=proof,
        grouped=grouped,
        date_flips=seen.flips,
        point=point,
    )


class _Seen:
    """What the stamps of one file's samples say, gathered sample by sample."""

    def __init__(self, claim: Claim, export: Export, dialect: Dialect, sampled: Sampled) -> None:
        self._claim, self._export, self._dialect, self._encoding = claim, export, dialect, sampled.encoding
        self._shape = row_shape(dialect, export, ())
        self._clock = clock_of(export.clock)
        # Pairs of a large file need not keep step on a line: reading waits longer for those that lag.
        is_jittery = bool(dialect.pair_stamps) and not sampled.is_whole
        self._tolerance_us = _HOUR_US if is_jittery else 0
        self._before_us: int | None = None
        self.first_us, self.last_us = np.iinfo(np.int64).max, np.iinfo(np.int64).min
        self.days: list[StampDays] = []
        self.falls, self.rises = 0, 0
        self.stamp_format = ""
        self.names: dict[str, None] = {}
        self.bad_stamp: tuple[int, str] | None = None
        self.against: Contradiction | None = None
        self.proven = False
        self.flips = 0
        """Stamps that can be read with day and month the other way round only."""

    def add(self, sample: Sample, is_head: bool) -> None:
        data, skipped = sample.data, 0
        if is_head:
            skipped = self._dialect.first_data_line - 1
            data = without_lines(data, skipped)
        if not data:
            return
        columns = read_columns(data, self._shape, Learnt())
        texts = [as_texts(column) for column in columns.texts]
        if self._dialect.is_long:
            self.names |= dict.fromkeys(heading_key(name) for name in distinct(columns.texts[-1])[1])
            texts = texts[: len(self._dialect.stamp)]
        if self._dialect.pair_stamps:
            columns = replace(columns, line=np.repeat(columns.line, len(texts)))
            texts = [line_by_line(texts)]
        stamps = read_stamps(texts, style_of(self._export))
        self._add_stamps(stamps, texts)
        bad = np.flatnonzero(~stamps.good & (texts[0].ends > texts[0].starts))
        self.flips += flips(bad, texts, self._export).size
        if bad.size and (self.bad_stamp is None or self.against is None):
            self._add_bad(bad, texts, (sample, columns, skipped, is_head))
        if not self.proven and self._export.date_order in _ORDERS[:3]:
            others = [
                read_stamps(texts, style_of(self._export, order)).good
                for order in _ORDERS[:3]
                if order != self._export.date_order
            ]
            self.proven = bool((stamps.good & ~np.any(others, axis=0)).any())

    def _add_stamps(self, stamps: Stamps, texts: list[Texts]) -> None:
        utc_us, second_us, skipped = to_instants(stamps, self._clock)
        good = np.flatnonzero(stamps.good & ~skipped)
        if not good.size:
            return
        if not self.stamp_format:
            words = [shape_in_words(column.at(int(good[0])), style_of(self._export)) for column in texts]
            time = texts[1].at(int(good[0])).strip() if len(texts) > 1 else ""
            self.stamp_format = words[0] + (", the time of day in a column of its own" if time else "")
        self.first_us = min(self.first_us, int(utc_us[good].min()))
        self.last_us = max(self.last_us, int((utc_us + second_us)[good].max()))
        self.days.append(stamp_days(utc_us[good]))
        if second_us[good].any():
            self.days.append(stamp_days((utc_us + second_us)[good]))
        # A second pass of the repeated hour is no fall: the span it may cover counts as level.
        early, late = utc_us[good], (utc_us + second_us)[good]
        if self._before_us is not None:
            early = np.concatenate([[self._before_us], early])
            late = np.concatenate([[self._before_us], late])
        self.falls += int((late[1:] < early[:-1] - self._tolerance_us).sum())
        self.rises += int((early[1:] > late[:-1]).sum())
        self._before_us = int(late[-1])

    def _add_bad(
        self, bad: NDArray[np.int64], texts: list[Texts], where: tuple[Sample, Columns, int, bool]
    ) -> None:
        sample, columns, skipped, is_head = where

        def line_of(row: int) -> int:
            start = 1 if is_head else line_at(self._claim.stored, self._encoding, sample.offset)
            return start + skipped + int(columns.line[row])

        if self.bad_stamp is None:
            row = int(bad[0])
            self.bad_stamp = (line_of(row), " ".join(column.at(row).strip() for column in texts))
        for order in _ORDERS:
            if self.against is not None or order == self._export.date_order:
                continue
            other = read_stamps([column.take(bad) for column in texts], style_of(self._export, order)).good
            if other.any():
                row = int(bad[np.argmax(other)])
                text = " ".join(column.at(row).strip() for column in texts)
                heading = self._dialect.headings[self._dialect.stamp[0]]
                self.against = Contradiction(line_of(row), text, heading, order)


def without_lines(data: bytes, count: int) -> bytes:
    """Cut off the first lines."""
    place = 0
    for _ in range(count):
        end = data.find(b"\n", place)
        if end < 0:
            return b""
        place = end + 1
    return data[place:]


def _decimal_proof(
    sample: Sample, dialect: Dialect, export: Export
) -> tuple[bool, Contradiction | None, Contradiction | None]:
    """Whether fractions prove the declared decimal mark; the first number that speaks against it.

    Third, the first number whose digits are grouped by a mark that is not declared.
    """
    data = without_lines(sample.data[: 1 << 16], dialect.first_data_line - 1)
    data = data[: data.rfind(b"\n") + 1]
    numbers = number_columns(dialect)
    if not data or not numbers:
        return False, None, None
    columns = read_columns(data, row_shape(dialect, export, numbers), Learnt())
    finite = columns.values[np.isfinite(columns.values)]
    is_proven = bool((finite != np.floor(finite)).any())
    found: dict[str, Contradiction] = {}
    dated = _dated(columns, dialect, export)
    for place, (rows, texts) in zip(numbers, columns.words, strict=True):
        index, words = (rows, []) if texts is None else distinct(texts)
        for number, word in enumerate(words):
            value = read_number(word.strip(), export.decimal, export.thousands)
            is_proven |= value is not None and not value.is_integer()
            doubt = number_in_doubt(word.strip(), export, is_proven=False)
            own = rows[(index == number) & dated[rows]] if value is None and doubt is not None else rows[:0]
            if doubt is not None and own.size:
                line = dialect.first_data_line + int(columns.line[own[0]])
                against = Contradiction(line, word.strip(), dialect.headings[place], doubt[1])
                found.setdefault(doubt[0], against)
    return is_proven, found.get("decimal"), found.get("grouped")


def _dated(columns: Columns, dialect: Dialect, export: Export) -> NDArray[np.bool_]:
    """Rows with a stamp: a total below the data is none of them."""
    texts = [as_texts(column) for column in columns.texts]
    if dialect.pair_stamps:
        good = [read_stamps([column], style_of(export)).good for column in texts]
        any_good: NDArray[np.bool_] = np.any(good, axis=0)
        return any_good
    return read_stamps(texts[: len(dialect.stamp)], style_of(export)).good


def _all_fields(head: Sequence[str]) -> tuple[str, ...]:
    fields: dict[str, None] = {}
    for line in head[:40]:
        for delimiter in (";", "\t", ","):
            if delimiter in line:
                fields |= dict.fromkeys(heading_key(field) for field in split_fields(line, delimiter)[:500])
    return tuple(name for name in fields if name)
