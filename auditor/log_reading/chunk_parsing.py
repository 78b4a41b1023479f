"""A chunk of a file as far as it can be read without those before it: a pure step, done on any core."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from auditor.log_reading.cells import CellReader
from auditor.log_reading.chunks import Chunk
from auditor.log_reading.decide import Cells, decide_long, decide_wide
from auditor.log_reading.dialect import Dialect
from auditor.log_reading.file_end import FileEnd, cut_end
from auditor.log_reading.look import without_lines
from auditor.log_reading.stamps import Stamps, Texts, read_stamps
from auditor.log_reading.table import Columns, Learnt, Shape, as_texts, read_columns
from auditor.records.plant import Export, Tag


@dataclass(frozen=True)
class ParsedChunk:
    """The lines of a chunk as columns, stamps and decided cells."""

    chunk: Chunk
    text: bytes
    """The whole chunk in UTF-8."""
    strays: int
    head_lines: int
    """Lines above the data, in the first chunk of a file."""
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

    def parse(self, chunk: Chunk, learnt: Learnt) -> ParsedChunk:
        """Parse a chunk."""
        text, strays = chunk.text(self.codec)
        return self.parse_text(chunk, text, strays, learnt)

    def parse_text(self, chunk: Chunk, text: bytes, strays: int, learnt: Learnt) -> ParsedChunk:
        """Parse the lines of a chunk, which may stand behind lines that the chunk before left."""
        head_lines, data = 0, text
        if chunk.is_first:
            head_lines = min(self.dialect.first_data_line - 1, text.count(b"\n"))
            data = without_lines(text, head_lines)
        end = cut_end(data, self.dialect, self.export) if chunk.is_last else None
        data = data if end is None else end.body
        columns = read_columns(data, self.shape, learnt)
        texts = [as_texts(column) for column in columns.texts[: len(self.dialect.stamp)]]
        cells, unknown = self._decide(columns)
        stamps = read_stamps(texts, self.export.date_order)
        return ParsedChunk(chunk, text, strays, head_lines, end, data, columns, stamps, texts, cells, unknown)

    def without_tail(self, parsed: ParsedChunk, tail: bytes, learnt: Learnt) -> ParsedChunk:
        """Parse a chunk again that is neither first nor last, without its last lines."""
        text = parsed.data[: len(parsed.data) - len(tail)]
        middle = replace(parsed.chunk, is_first=False)
        again = self.parse_text(middle, text, parsed.strays, learnt)
        return replace(again, chunk=parsed.chunk, head_lines=parsed.head_lines)

    def _decide(self, columns: Columns) -> tuple[Cells, Mapping[str, int]]:
        sentinels = self.export.sentinels
        if not self.dialect.is_long:
            return decide_wide(columns, self.place, self.readers, sentinels), {}
        return decide_long(columns, [tag.column for tag in self.tags], self.readers, sentinels)
