"""One file of pairs of columns: every pair read for itself, every line and every cell accounted for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.decide import Cells, decide_rows
from auditor.log_reading.file_reading import FileReader
from auditor.log_reading.pairs_layout import NO_PAIR, Unfolded, unfold
from auditor.log_reading.pieces import Fate
from auditor.log_reading.stamps import Stamps, Texts, read_stamps, style_of
from auditor.log_reading.table import Columns, as_texts


class PairsReader(FileReader):
    """Reads one file of pairs of columns once.

    A row here is one cell with its stamp. A line is a data line as soon as one of its pairs has a
    readable stamp; it is rejected where none has; it is passed over where every bound pair is empty.
    """

    _unfolded: Unfolded

    def _parse(self, data: bytes) -> tuple[Columns, Stamps, list[Texts]]:
        columns = self._columns(data)
        stamps = [as_texts(column) for column in columns.texts]
        place = [column for column in self._place if column is not None]
        self._unfolded = cells = unfold(columns, stamps, place)
        columns = replace(columns, line=cells.line, values=cells.values, words=(cells.words,))
        return columns, read_stamps([cells.stamps], style_of(self._export)), [cells.stamps]

    def _decide(self, columns: Columns) -> Cells:
        tags = np.array([tag for tag, column in enumerate(self._place) if column is not None], np.int64)
        pair = self._unfolded.pair
        tag_of_row = np.where(pair == NO_PAIR, -1, tags[pair])
        declared = (self._readers, self._export.sentinels)
        cells = decide_rows(columns.values, columns.words[0], tag_of_row, declared)
        for tag in tags.tolist():
            name = self._tags[tag].column
            self._tally.pairs[name] = self._tally.pairs.get(name, 0) + int((tag_of_row == tag).sum())
        return cells

    def _look_at_odd_lines(
        self, columns: Columns, stamps: Stamps, fate: NDArray[np.int8], first_line: int
    ) -> int | None:
        closed_at = super()._look_at_odd_lines(columns, stamps, fate, first_line)
        fate[self._unfolded.pair == NO_PAIR] = Fate.NO_DATA
        return closed_at

    def _fate_of_lines(
        self, columns: Columns, fate: NDArray[np.int8]
    ) -> tuple[NDArray[np.int64], NDArray[np.int8]]:
        """First row of each line, and the best fate among its rows."""
        starts = np.flatnonzero(np.diff(columns.line, prepend=-1))
        # From best to worst: data, then rejected, then passed over - the order of their numbers.
        best = np.minimum.reduceat(_RANK[fate], starts) if starts.size else np.zeros(0, np.int8)
        return starts, _FATE_OF_RANK[best]


_RANK = np.zeros(len(Fate), np.int8)
_RANK[[Fate.GOOD, Fate.OUTSIDE, Fate.BAD_STAMP, Fate.NO_DATA]] = [0, 1, 2, 3]
_FATE_OF_RANK = np.array([Fate.GOOD, Fate.OUTSIDE, Fate.BAD_STAMP, Fate.NO_DATA], np.int8)
