"""Counters with an exponent: the parser would take the number and hide how few digits were written."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import replace

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from auditor.log_reading.table import Columns, Shape, texts_of_rows


def keep_exponents(columns: Columns, shape: Shape, places: Collection[int]) -> Columns:
    """Read numbers with an exponent as the text that stands there.

    Parameters
    ----------
    columns : Columns
        Of a chunk.
    shape : Shape
        How its lines were cut.
    places : collection of int
        The number columns (as counted in ``columns.values``) that hold counters.
    """
    rows = _rows_with_exponent(columns) if places else np.zeros(0, np.int64)
    if not rows.size:
        return columns
    nothing = np.zeros(0, np.int64)
    wanted = [
        rows[np.isfinite(columns.values[place, rows])] if place in places else nothing
        for place in range(len(shape.numbers))
    ]
    values, words = columns.values.copy(), list(columns.words)
    found = texts_of_rows(columns.data, shape, columns.line, wanted)
    for place, (some, texts) in enumerate(found):
        if texts is None:
            continue
        values[place, some] = np.nan
        before, others = words[place]
        words[place] = (
            (some, texts)
            if others is None
            else (np.concatenate([before, some]), pa.concat_arrays([others, texts]))
        )
    return replace(columns, values=values, words=tuple(words))


def _rows_with_exponent(columns: Columns) -> NDArray[np.int64]:
    """Rows in which a digit is followed by ``e`` and a digit or a sign."""
    data = columns.data
    if b"e" not in data and b"E" not in data:
        return np.zeros(0, np.int64)
    letters = np.frombuffer(data, np.uint8)
    at = np.flatnonzero((letters | 32) == ord("e"))
    at = at[(at > 0) & (at < letters.size - 1)]
    after = letters[at + 1]
    is_digit = (
        (letters[at - 1] - np.uint8(48) < 10) | (letters[at - 1] == ord(".")) | (letters[at - 1] == ord(","))
    )
    at = at[is_digit & ((after - np.uint8(48) < 10) | (after == ord("+")) | (after == ord("-")))]
    if not at.size:
        return np.zeros(0, np.int64)
    lines = np.unique(np.searchsorted(np.flatnonzero(letters == 10), at))
    return np.flatnonzero(np.isin(columns.line, lines))
