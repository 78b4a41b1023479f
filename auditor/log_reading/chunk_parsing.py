"""A chunk of a file as far as it can be read without those before it: a pure step, done on any core."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Self

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import CellReader, cell_reader
from auditor.log_reading.chunks import Chunk
from auditor.log_reading.decide import Cells, decide_long, decide_wide
from auditor.log_reading.dialect import Dialect
from auditor.log_reading.encoding import codec_of_stream
from auditor.log_reading.exponents import keep_exponents
from auditor.log_reading.file_end import FileEnd, cut_end
from auditor.log_reading.look import number_columns, row_shape, without_lines
from auditor.log_reading.quality import reject_by_quality
from auditor.log_reading.recognition import RecognisedFile
from auditor.log_reading.stamps import Stamps, Texts, read_stamps, style_of
from auditor.log_reading.table import (
    Columns,
    Learnt,
    Shape,
    as_texts,
    count_feeds,
    line_ends,
    read_columns,
)
from auditor.records.plant import Export, LongLayout, Tag

Settled = tuple[Columns, Stamps, list[Texts], Cells, Mapping[str, int]]
"""Rows of a chunk as the last fields of :class:`ParsedChunk` hold them."""


@dataclass(frozen=True)
class Head:
    """The lines above the data."""

    lines: int
    rows: int
    """So many of them hold a stamp and a number: the file was sorted, its heading with the rest."""
    first_row: int
    """Place of the first such line, from 0."""
    first_text: str


@dataclass(frozen=True)
class ParsedChunk:
    """The lines of a chunk as columns, stamps and decided cells."""

    chunk: Chunk
    text: bytes
    """The whole chunk in UTF-8."""
    strays: int
    head: Head | None
    """What lies above the data, in the first chunk of a file."""
    end: FileEnd | None
    """What lies below the data, in the last chunk of a file."""
    data: bytes
    """The lines between the two."""
    columns: Columns
    stamps: Stamps
    texts: list[Texts]
    """The stamps as they stand there."""
    cells: Cells
    unknown: Mapping[str, int]
    """Long: cells of tags that the plant file does not name."""


@dataclass(frozen=True)
class ChunkParser:
    """What is needed to parse the chunks of one file."""

    dialect: Dialect
    export: Export
    codec: str
    shape: Shape
    place: Sequence[int | None]
    """Per tag its number column; None where the file lacks it."""
    tags: Sequence[Tag]
    readers: Sequence[CellReader]
    counters: frozenset[int]
    """Number columns that hold counters."""

    @classmethod
    def of(cls, file: RecognisedFile, export: Export, tags: Sequence[Tag]) -> Self:
        """Return the parser of one file of an export."""
        dialect, columns = file.dialect, file.dialect.columns
        numbers = number_columns(dialect)
        place = [numbers.index(columns[name]) if name in columns else None for name in export.tags]
        is_counter = [tag.between == "counter" for tag in tags]
        counters = {at for at, counts in zip(place, is_counter, strict=True) if at is not None and counts}
        counters |= {0} if dialect.is_long and any(is_counter) else set()
        return cls(
            dialect=dialect,
            export=export,
            codec=codec_of_stream(file.encoding),
            shape=row_shape(dialect, export, numbers),
            place=place,
            tags=tags,
            readers=[cell_reader(export, tag) for tag in tags],
            counters=frozenset(counters),
        )

    def parse(self, chunk: Chunk, learnt: Learnt) -> ParsedChunk:
        """Parse a chunk."""
        text, strays = chunk.text(self.codec)
        return self.parse_text(chunk, text, strays, learnt)

    def parse_text(self, chunk: Chunk, text: bytes, strays: int, learnt: Learnt) -> ParsedChunk:
        """Parse the lines of a chunk, which may stand behind lines that the chunk before left."""
        head, data = None, text
        if chunk.is_first:
            data = without_lines(text, min(self.dialect.first_data_line - 1, count_feeds(text)))
            head = self._head(text[: len(text) - len(data)])
        end = cut_end(data, self.dialect, self.export) if chunk.is_last else None
        data = data if end is None else end.body
        columns = keep_exponents(read_columns(data, self.shape, learnt), self.shape, self.counters)
        return ParsedChunk(chunk, text, strays, head, end, data, *self._settled(columns))

    def without_tail(self, parsed: ParsedChunk, tail: bytes, learnt: Learnt) -> ParsedChunk:
        """Parse a chunk again that is neither first nor last, without its last lines."""
        text = parsed.data[: len(parsed.data) - len(tail)]
        middle = replace(parsed.chunk, is_first=False)
        again = self.parse_text(middle, text, parsed.strays, learnt)
        return replace(again, chunk=parsed.chunk, head=parsed.head)

    def _head(self, text: bytes) -> Head:
        columns = read_columns(text, self.shape, Learnt())
        stamps, _ = self._stamps(columns)
        rows = columns.line[stamps.good & np.isfinite(columns.values).any(axis=0)]
        first_row = int(rows[0]) if rows.size else 0
        first_text = line_texts(text, rows[:1])[0] if rows.size else ""
        return Head(count_feeds(text), rows.size, first_row, first_text)

    def _stamps(self, columns: Columns) -> tuple[Stamps, list[Texts]]:
        texts = [as_texts(column) for column in columns.texts[: len(self.dialect.stamp)]]
        return read_stamps(texts, style_of(self.export)), texts

    def _settled(self, columns: Columns) -> Settled:
        """Read the stamps and decide the cells: here every row is a line."""
        return columns, *self._stamps(columns), *self._decide(columns)

    def _decide(self, columns: Columns) -> tuple[Cells, Mapping[str, int]]:
        sentinels = self.export.sentinels
        if not self.dialect.is_long:
            return decide_wide(columns, self.place, self.readers, sentinels), {}
        cells, unknown = decide_long(columns, [tag.column for tag in self.tags], self.readers, sentinels)
        quality = self.export.layout.quality if isinstance(self.export.layout, LongLayout) else None
        return cells if quality is None else reject_by_quality(cells, columns.texts[-2], quality), unknown


def line_texts(data: bytes, wanted: NDArray[np.int64]) -> list[str]:
    """Return some of the lines."""
    if not wanted.size:
        return []
    ends = line_ends(data) - 1
    starts = np.concatenate([[0], ends[:-1] + 1])
    spans = zip(starts[wanted].tolist(), ends[wanted].tolist(), strict=True)
    return [data[start:end].decode("utf-8", "replace") for start, end in spans]
