"""One file of pairs of columns: every pair read for itself, every line and every cell accounted for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.chunk_parsing import ChunkParser, ParsedChunk, Settled
from auditor.log_reading.decide import Cells, decide_rows
from auditor.log_reading.file_reading import FileReader
from auditor.log_reading.pairs_layout import NO_PAIR, unfold
from auditor.log_reading.pieces import Fate, Piece
from auditor.log_reading.stamps import read_stamps, style_of
from auditor.log_reading.table import Columns, as_texts

_NO_TAG = -1


class PairsParser(ChunkParser):
    """Parses the chunks of one file of pairs of columns: a row is one cell with its stamp."""

    def _settled(self, columns: Columns) -> Settled:
        places = [(tag, column) for tag, column in enumerate(self.place) if column is not None]
        texts = [as_texts(column) for column in columns.texts]
        cells = unfold(columns, texts, [column for _, column in places])
        columns = replace(columns, line=cells.line, values=cells.values, words=(cells.words,))
        tags = np.array([tag for tag, _ in places], np.int64)
        tag_of_row = np.where(cells.pair == NO_PAIR, _NO_TAG, tags[cells.pair])
        declared = (self.readers, self.export.sentinels)
        decided = decide_rows(cells.values, cells.words, tag_of_row, declared)
        return columns, read_stamps([cells.stamps], style_of(self.export)), [cells.stamps], decided, {}


class PairsReader(FileReader):
    """Reads one file of pairs of columns once.

    A row here is one cell with its stamp. A line is a data line as soon as one of its pairs has a
    readable stamp; it is rejected where none has; it is passed over where every bound pair is empty.
    """

    _parser_type = PairsParser

    def _rows(self, parsed: ParsedChunk, first_line: int) -> Piece | None:
        pairs = self._tally.pairs
        tag_of_row = _tag_of_row(parsed.cells)
        for tag, place in enumerate(self._parser.place):
            if place is not None:
                name = self._tags[tag].column
                pairs[name] = pairs.get(name, 0) + int((tag_of_row == tag).sum())
        return super()._rows(parsed, first_line)

    def _look_at_odd_lines(self, parsed: ParsedChunk, fate: NDArray[np.int8], first_line: int) -> int | None:
        closed_at = super()._look_at_odd_lines(parsed, fate, first_line)
        fate[_tag_of_row(parsed.cells) < 0] = Fate.NO_DATA
        return closed_at

    def _fate_of_lines(
        self, columns: Columns, fate: NDArray[np.int8]
    ) -> tuple[NDArray[np.int64], NDArray[np.int8]]:
        """First row of each line, and the best fate among its rows."""
        starts = np.flatnonzero(np.diff(columns.line, prepend=-1))
        # From best to worst: data, then rejected, then passed over - the order of their numbers.
        best = np.minimum.reduceat(_RANK[fate], starts) if starts.size else np.zeros(0, np.int8)
        return starts, _FATE_OF_RANK[best]


def _tag_of_row(cells: Cells) -> NDArray[np.int64]:
    if cells.tag_of_row is None:
        raise ValueError("rows of pairs of columns each have a tag")
    return cells.tag_of_row


_RANK = np.zeros(len(Fate), np.int8)
_RANK[[Fate.GOOD, Fate.OUTSIDE, Fate.BAD_STAMP, Fate.NO_DATA]] = [0, 1, 2, 3]
_FATE_OF_RANK = np.array([Fate.GOOD, Fate.OUTSIDE, Fate.BAD_STAMP, Fate.NO_DATA], np.int8)
