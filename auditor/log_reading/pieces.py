"""Rows of one chunk of one file: samples in order of time, and the cells that never became a number."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import shortest
from auditor.log_reading.decide import Cells
from auditor.log_reading.long_layout import pivot
from auditor.records.samples import Disposition, Rejects

_KINDS = len(Disposition)


class Fate(IntEnum):
    """What becomes of a row of a chunk."""

    GOOD = 0
    BAD_STAMP = 1
    OUTSIDE = 2
    """Its stamp lies outside the stretch that was asked for."""
    NO_DATA = 3
    """A blank line, or a heading that comes again."""


@dataclass(frozen=True)
class Piece:
    """Some rows of one file in order of time, with what reading rejected beside them."""

    instants_us: NDArray[np.int64]
    line: NDArray[np.int64]
    values: NDArray[np.float64]
    """Shape (k, n)."""
    rejected: NDArray[np.int64]
    """Shape (k, kinds)."""
    rejects: Rejects
    """``source`` is 0 throughout."""

    def split(self, at: int) -> tuple[Piece, Piece]:
        """Rows before ``at`` and the others, each with the rejects of its lines."""
        late = self._row_of_rejects() >= at
        moved = np.zeros_like(self.rejected)
        np.add.at(moved, (self.rejects.tag[late], self.rejects.disposition[late]), 1)
        first = Piece(
            self.instants_us[:at],
            self.line[:at],
            self.values[:, :at],
            self.rejected - moved,
            _some(self.rejects, ~late),
        )
        rest = Piece(
            self.instants_us[at:], self.line[at:], self.values[:, at:], moved, _some(self.rejects, late)
        )
        return first, rest

    def reject_instants(self) -> NDArray[np.int64]:
        """Stamp of the row of each reject [us]; 0 where no line gave a row."""
        if not self.line.size:
            return np.zeros(self.rejects.line.shape, np.int64)
        return self.instants_us[self._row_of_rejects()]

    def _row_of_rejects(self) -> NDArray[np.int64]:
        """Row of each reject: that of its line, or of the last line before it that gave a row."""
        if not (self.line.size and self.rejects.line.size):
            return np.zeros(self.rejects.line.shape, np.int64)
        order = np.argsort(self.line, kind="stable")
        place = np.searchsorted(self.line[order], self.rejects.line, side="right") - 1
        return order[np.maximum(place, 0)]

    def without_first(self, count: int) -> Piece:
        """Reject the numbers of the first rows: their stamps cannot be put in order."""
        tag, row = np.nonzero(np.isfinite(self.values[:, :count]))
        rejected = self.rejected.copy()
        np.add.at(rejected[:, Disposition.BAD_STAMP], tag, 1)
        more = Rejects(
            tag=tag.astype(np.int16),
            disposition=np.full(tag.size, Disposition.BAD_STAMP, np.int8),
            source=np.zeros(tag.size, np.int16),
            line=self.line[row],
            word=np.arange(tag.size, dtype=np.int32),
            words=tuple(shortest(float(number)) for number in self.values[tag, row]),
        )
        return Piece(
            self.instants_us[count:],
            self.line[count:],
            self.values[:, count:],
            rejected,
            join_rejects([self.rejects, more], [0, 0]),
        )


def make_piece(
    cells: Cells,
    instants_us: NDArray[np.int64],
    line: NDArray[np.int64],
    fate: NDArray[np.int8],
    bad_stamps: Sequence[str],
    k: int,
) -> Piece:
    """Put the good rows of a chunk in order of time and account for the cells of the others.

    Parameters
    ----------
    cells : Cells
        Decided cells.
    instants_us, line, fate : ndarray
        Per row: instant, line of the file, and a :class:`Fate`.
    bad_stamps : sequence of str
        The stamps of the ``BAD_STAMP`` rows as they stand, in order.
    k : int
        Number of tags.
    """
    is_good = fate == Fate.GOOD
    rejected, rejects = _account(cells, line, fate, bad_stamps, k)
    values, tag_of_row = cells.values, cells.tag_of_row
    if not is_good.all():
        values, instants_us, line = values[:, is_good], instants_us[is_good], line[is_good]
        tag_of_row = None if tag_of_row is None else tag_of_row[is_good]
    if tag_of_row is not None:
        values, instants_us, line = pivot(values[0], tag_of_row, instants_us, line, k)
    if (np.diff(instants_us) < 0).any():
        order = np.argsort(instants_us, kind="stable")
        values, instants_us, line = values[:, order], instants_us[order], line[order]
    return Piece(instants_us, line, values, rejected, rejects)


def _some(rejects: Rejects, chosen: NDArray[np.bool_]) -> Rejects:
    return Rejects(
        rejects.tag[chosen],
        rejects.disposition[chosen],
        rejects.source[chosen],
        rejects.line[chosen],
        rejects.word[chosen],
        rejects.words,
    )


def no_rejects() -> Rejects:
    """Nothing rejected."""
    return Rejects(
        np.zeros(0, np.int16),
        np.zeros(0, np.int8),
        np.zeros(0, np.int16),
        np.zeros(0, np.int64),
        np.zeros(0, np.int32),
        (),
    )


def join_rejects(parts: Sequence[Rejects], sources: Sequence[int]) -> Rejects:
    """Put rejects one behind the other, each with the index of its file; words become distinct."""
    if len(parts) == 1 and not parts[0].source.any() and sources[0] == 0:
        return parts[0]
    index: dict[str, int] = {}
    word = [
        np.array([index.setdefault(text, len(index)) for text in part.words] or [0], np.int32)[part.word]
        for part in parts
    ]
    return Rejects(
        tag=np.concatenate([part.tag for part in parts]),
        disposition=np.concatenate([part.disposition for part in parts]),
        source=np.concatenate(
            [np.full(part.tag.size, at, np.int16) for part, at in zip(parts, sources, strict=True)]
        ),
        line=np.concatenate([part.line for part in parts]),
        word=np.concatenate(word),
        words=tuple(index),
    )


def _account(
    cells: Cells, line: NDArray[np.int64], fate: NDArray[np.int8], bad_stamps: Sequence[str], k: int
) -> tuple[NDArray[np.int64], Rejects]:
    """Count every cell that gives no number, and list those of rows inside the stretch."""
    kept = fate[cells.row] == Fate.GOOD
    row, tag, kind, word = (a[kept] for a in (cells.row, cells.tag, cells.disposition, cells.word))
    rejected = np.zeros((k, _KINDS), np.int64)
    np.add.at(rejected, (tag, kind), 1)
    bad, outside = np.flatnonzero(fate == Fate.BAD_STAMP), np.flatnonzero(fate == Fate.OUTSIDE)
    at = len(cells.words) + np.arange(bad.size)
    if cells.tag_of_row is None:
        own = cells.present
        rejected[own, Disposition.OUTSIDE_PERIOD] += outside.size
        rejected[own, Disposition.BAD_STAMP] += bad.size
        more = (np.repeat(bad, own.size), np.tile(own, bad.size), np.repeat(at, own.size))
    else:
        lost = cells.tag_of_row[outside]
        np.add.at(rejected[:, Disposition.OUTSIDE_PERIOD], lost[lost >= 0], 1)
        is_known = cells.tag_of_row[bad] >= 0
        more = (bad[is_known], cells.tag_of_row[bad[is_known]], at[is_known])
        np.add.at(rejected[:, Disposition.BAD_STAMP], more[1], 1)
    row, tag, word = (np.concatenate(pair) for pair in zip((row, tag, word), more, strict=True))
    kind = np.concatenate([kind, np.full(more[0].size, Disposition.BAD_STAMP)])
    order = np.lexsort((tag, row))
    listed = Rejects(
        tag=tag[order].astype(np.int16),
        disposition=kind[order].astype(np.int8),
        source=np.zeros(order.size, np.int16),
        line=line[row[order]],
        word=word[order].astype(np.int32),
        words=(*cells.words, *bad_stamps),
    )
    return rejected, join_rejects([listed, no_rejects()], [0, 0]) if listed.words else listed
