"""Every bound cell of a chunk: a raw number, a state, or the disposition that says why not."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from auditor.log_reading.cells import CellReader, shortest
from auditor.log_reading.dialect import heading_key
from auditor.log_reading.long_layout import rows_by_tag
from auditor.log_reading.numbers_text import NumberStyle, settle_numbers
from auditor.log_reading.table import Columns, distinct, take
from auditor.records.samples import Disposition


@dataclass(frozen=True)
class Cells:
    """Decided cells of the rows of a chunk, stamps not yet looked at."""

    values: NDArray[np.float64]
    """Wide: shape (k, n). Long: shape (1, n). NaN where there is no number."""
    present: NDArray[np.int64]
    """Tags that have cells in this file."""
    tag_of_row: NDArray[np.int64] | None
    """Long: index of the tag of each row; -1 for one that the plant file does not name."""
    row: NDArray[np.int64]
    """Rejected cells: row, tag, disposition, and index into ``words``."""
    tag: NDArray[np.int64]
    disposition: NDArray[np.int64]
    word: NDArray[np.int64]
    words: tuple[str, ...]


def decide_wide(
    columns: Columns, place: Sequence[int | None], readers: Sequence[CellReader], sentinels: Sequence[float]
) -> Cells:
    """Decide every bound cell of a wide chunk.

    ``place`` says for each tag which number column is its own, None where this file lacks it.
    """
    if list(place) == list(range(columns.values.shape[0])):
        values = columns.values
    else:
        values = np.full((len(place), columns.line.size), np.nan)
        for tag, column in enumerate(place):
            if column is not None:
                values[tag] = columns.values[column]
    found = _Rejected()
    for tag, (column, reader) in enumerate(zip(place, readers, strict=True)):
        if column is not None:
            rows, texts = columns.words[column]
            if texts is not None:
                rows, texts = settle_numbers(values[tag], rows, texts, reader.style)
            index, words = (rows, []) if texts is None else distinct(texts)
            found.add(tag, _decide(values[tag], (rows, index, words), reader, sentinels))
    present = np.array([tag for tag, column in enumerate(place) if column is not None], np.int64)
    return found.cells(values, present, None)


def decide_long(
    columns: Columns, names: Sequence[str], readers: Sequence[CellReader], sentinels: Sequence[float]
) -> tuple[Cells, dict[str, int]]:
    """Decide every cell of a long chunk: its last text column is the tag, its only number the value.

    Quality codes are another matter: see :mod:`~auditor.log_reading.quality`.

    Returns
    -------
    cells, unknown
        And how many rows name a tag that the plant file does not bind, by name.
    """
    codes, found_names = distinct(columns.texts[-1])
    bound = {heading_key(name): tag for tag, name in enumerate(names)}
    tag_of_code = np.array([bound.get(heading_key(name), -1) for name in found_names], np.int64)
    counts = np.bincount(codes, minlength=len(found_names)).tolist()
    unknown: dict[str, int] = {}
    for name, count, tag in zip(found_names, counts, tag_of_code.tolist(), strict=True):
        if tag < 0:
            unknown[heading_key(name)] = unknown.get(heading_key(name), 0) + count
    cells = decide_rows(columns.values, columns.words[0], tag_of_code[codes], (readers, sentinels))
    return cells, unknown


def decide_rows(
    numbers: NDArray[np.float64],
    texts_of_rows: tuple[NDArray[np.int64], pa.Array | None],
    tag_of_row: NDArray[np.int64],
    declared: tuple[Sequence[CellReader], Sequence[float]],
) -> Cells:
    """Decide one cell per row, each of the tag that ``tag_of_row`` says (-1: of none that is bound).

    Parameters
    ----------
    numbers : ndarray
        Shape (1, n); NaN where the cell is no plain number.
    texts_of_rows : tuple
        The rows without a number, and the texts that stand there.
    tag_of_row : ndarray
        Shape (n,).
    declared : tuple
        Readers of the tags, and sentinels.
    """
    readers, sentinels = declared
    values = numbers.copy()
    rows, texts = texts_of_rows
    if texts is not None:
        for style in {reader.style: None for reader in readers}:
            tags = [tag for tag, reader in enumerate(readers) if reader.style == style]
            rows, texts = _settle_rows(values[0], (rows, texts), np.isin(tag_of_row, tags), style)
    index, words = (rows, []) if texts is None else distinct(texts)
    found = _Rejected()
    for tag, (own, reader) in enumerate(zip(rows_by_tag(tag_of_row, len(readers)), readers, strict=True)):
        part = values[0, own]
        mine = np.flatnonzero(tag_of_row[rows] == tag)
        decided = _decide(part, (np.searchsorted(own, rows[mine]), index[mine], words), reader, sentinels)
        values[0, own] = part
        found.add(tag, (own[decided[0]], *decided[1:]))
    values[0, tag_of_row < 0] = np.nan
    return found.cells(values, np.arange(len(readers)), tag_of_row)


def _settle_rows(
    values: NDArray[np.float64],
    texts_of_rows: tuple[NDArray[np.int64], pa.Array],
    is_own: NDArray[np.bool_],
    style: NumberStyle,
) -> tuple[NDArray[np.int64], pa.Array]:
    """Settle the numbers of the tags of one style, which share a column with those of others."""
    rows, texts = texts_of_rows
    if style.is_plain:
        return rows, texts
    own = is_own[rows]
    if own.all():
        return settle_numbers(values, rows, texts, style)
    mine, others = np.flatnonzero(own), np.flatnonzero(~own)
    left, left_texts = settle_numbers(values, rows[mine], take(texts, mine), style)
    return np.concatenate([rows[others], left]), pa.concat_arrays([take(texts, others), left_texts])


_Decided = tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64], list[str]]
"""Rows, dispositions, indices into the words, words."""


class _Rejected:
    """Collects the rejected cells of one tag after the other."""

    def __init__(self) -> None:
        nothing = np.zeros(0, np.int64)
        self._parts = [(nothing, nothing, nothing, nothing)]
        self._words: list[str] = []

    def add(self, tag: int, decided: _Decided) -> None:
        row, disposition, word, words = decided
        if row.size:
            self._parts.append((row, np.full(row.size, tag), disposition, word + len(self._words)))
            self._words += words

    def cells(
        self, values: NDArray[np.float64], present: NDArray[np.int64], tag_of_row: NDArray[np.int64] | None
    ) -> Cells:
        row, tag, disposition, word = (np.concatenate(part) for part in zip(*self._parts, strict=True))
        return Cells(values, present, tag_of_row, row, tag, disposition, word, tuple(self._words))


def _decide(
    values: NDArray[np.float64],
    cells: tuple[NDArray[np.int64], NDArray[np.int64], Sequence[str]],
    reader: CellReader,
    sentinels: Sequence[float],
) -> _Decided:
    """Decide the cells of one tag in place; ``cells`` are those without a number: row, text, texts."""
    rows, index, texts = cells
    words = list(texts)
    meanings = [reader.meaning(text) for text in texts]
    parts = [(np.zeros(0, np.int64),) * 3]
    states = np.array([meaning.state for meaning in meanings])
    if rows.size:
        values[rows] = np.array([meaning.number for meaning in meanings])[index]
        kinds = np.array([meaning.disposition for meaning in meanings])[index]
        rejected = kinds != Disposition.USED
        parts.append((rows[rejected], kinds[rejected], index[rejected]))
    for sentinel in sentinels:
        hit = np.flatnonzero(values == sentinel)
        if hit.size:
            parts.append((hit, np.full(hit.size, Disposition.SENTINEL), np.full(hit.size, len(words))))
            words.append(shortest(sentinel))
            values[hit] = np.nan
    if reader.states:
        parts += _number_states(values, reader, words)
        if rows.size:
            is_state = np.isfinite(states[index])
            values[rows[is_state]] = states[index[is_state]]
    row, kind, word = (np.concatenate(part) for part in zip(*parts, strict=True))
    return row, kind, word, words


def _number_states(
    values: NDArray[np.float64], reader: CellReader, words: list[str]
) -> list[tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]]:
    """Turn the numbers of a state tag into indices of states, in place; unknown ones are words."""
    filled = np.flatnonzero(np.isfinite(values))
    numbers, which = np.unique(values[filled], return_inverse=True)
    known = reader.state_numbers()
    states = np.array([known.get(float(number), np.nan) for number in numbers], np.float64)
    values[filled] = states[which]
    unknown = np.isnan(states[which])
    if not unknown.any():
        return []
    start = len(words)
    words += [shortest(float(number)) for number in numbers]
    rows = filled[unknown]
    return [(rows, np.full(rows.size, Disposition.STATUS_WORD), start + which[unknown])]
