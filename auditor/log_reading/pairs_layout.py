"""Pairs of columns: each tag with stamps of its own, put one below the other as if every cell were a line."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from auditor.log_reading.stamps import Texts
from auditor.log_reading.table import Columns, take

NO_PAIR = -1
"""Stands for the tag of a line on which no bound pair has anything."""


@dataclass(frozen=True)
class Unfolded:
    """The cells of all pairs, line by line; a pair that has ended gives none."""

    line: NDArray[np.int64]
    """Line of each cell, from 0 within the chunk, shape (m,)."""
    pair: NDArray[np.int64]
    """Which pair; ``NO_PAIR`` for a line on which every pair is empty."""
    stamps: Texts
    values: NDArray[np.float64]
    """Shape (1, m)."""
    words: tuple[NDArray[np.int64], pa.Array | None]
    """Cells without a number, and the texts that stand there."""


def line_by_line(columns: Sequence[Texts]) -> Texts:
    """Put columns of texts of one length together: all texts of the first line, of the second..."""
    shifts = np.cumsum([0, *(column.data.size for column in columns[:-1])])
    starts = np.stack([column.starts + at for column, at in zip(columns, shifts, strict=True)], axis=1)
    ends = np.stack([column.ends + at for column, at in zip(columns, shifts, strict=True)], axis=1)
    return Texts(np.concatenate([column.data for column in columns]), starts.ravel(), ends.ravel())


def unfold(columns: Columns, stamps: Sequence[Texts], place: Sequence[int]) -> Unfolded:
    """Take the cells of pairs apart.

    Parameters
    ----------
    columns : Columns
        Of a chunk; its number columns hold the values.
    stamps : sequence of Texts
        Stamp column of each pair.
    place : sequence of int
        Number column of each pair.

    Returns
    -------
    Unfolded
        A cell for every pair that has a stamp or a value on a line.
    """
    n, pairs = columns.line.size, len(place)
    every = line_by_line(stamps)
    values = columns.values[list(place)].T.ravel()
    has_value = np.isfinite(values).reshape(n, pairs)
    texts: list[tuple[NDArray[np.int64], pa.Array]] = []
    for at, column in enumerate(place):
        rows, words = columns.words[column]
        if words is None or not rows.size:
            continue
        filled = ~_is_blank(words)
        has_value[rows[filled], at] = True
        texts.append((rows * pairs + at, words))
    is_there = has_value.ravel() | ~_blank(every)
    is_alone = ~is_there.reshape(n, pairs).any(axis=1)
    kept = is_there.copy()
    kept[np.flatnonzero(is_alone) * pairs] = True
    cells = np.flatnonzero(kept)
    pair = np.where(is_there[cells], cells % pairs, NO_PAIR)
    return Unfolded(
        columns.line[cells // pairs],
        pair,
        every.take(cells),
        values[None, cells],
        _words(texts, is_there, kept),
    )


def _words(
    texts: list[tuple[NDArray[np.int64], pa.Array]],
    is_there: NDArray[np.bool_],
    kept: NDArray[np.bool_],
) -> tuple[NDArray[np.int64], pa.Array | None]:
    """Cells that hold text, of those that are there."""
    new_place = np.cumsum(kept) - 1
    rows, parts = [], []
    for cells, words in texts:
        some = np.flatnonzero(is_there[cells])
        if some.size:
            rows.append(new_place[cells[some]])
            parts.append(words if some.size == cells.size else take(words, some))
    if not rows:
        return np.zeros(0, np.int64), None
    return np.concatenate(rows), pa.concat_arrays(parts)


def _is_blank(words: pa.Array) -> NDArray[np.bool_]:
    _, ends, data = words.buffers()
    offsets = np.frombuffer(ends, np.int32, len(words) + 1, words.offset * 4).astype(np.int64)
    letters = np.frombuffer(data, np.uint8) if data is not None and data.size else np.zeros(1, np.uint8)
    return _blank(Texts(letters, offsets[:-1], offsets[1:]))


def _blank(texts: Texts) -> NDArray[np.bool_]:
    """Whether a text is empty or holds nothing but blanks."""
    filled = np.cumsum(np.concatenate([np.zeros(1, np.int64), (texts.data > 32).astype(np.int64)]))
    blank: NDArray[np.bool_] = filled[texts.ends] == filled[texts.starts]
    return blank
