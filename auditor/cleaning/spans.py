"""Stretches of time cut exactly at the edges of ticks, and sums over them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.period import Grid


@dataclass(frozen=True)
class Spans:
    """Disjoint stretches of time in order, each cut into pieces that lie in one tick.

    Only what lies inside the period becomes a piece. Lengths are whole microseconds, so that sums of them
    are exact.
    """

    inside_us: NDArray[np.int64]
    """Length inside the period of each stretch, shape (N,)."""
    of: NDArray[np.intp] | None
    """Stretch of each piece, shape (P,); None when every stretch is one whole piece."""
    length_us: NDArray[np.int64]
    """Shape (P,)."""
    weight: NDArray[np.float64]
    """The lengths again, as numbers to multiply with."""
    position: NDArray[np.float64] | None
    """Where the middle of each piece lies in its stretch, 0 to 1; None with ``of``: one half."""
    first_piece: NDArray[np.intp]
    """First piece of each tick touched, shape (G,)."""
    ticks: NDArray[np.intp]
    """The ticks touched, shape (G,)."""
    covered_us: NDArray[np.int64]
    """Sum of lengths in each of them, shape (G,)."""


def cut(start_us: NDArray[np.int64], end_us: NDArray[np.int64], grid: Grid) -> Spans:
    """Cut stretches ``[start, end)``, disjoint and in order of time, at the edges of the grid's ticks."""
    origin, tick_us = grid.period.start_us, grid.tick_s * MICROSECONDS
    low = np.maximum(start_us, origin)
    high = np.minimum(end_us, grid.period.end_us)
    inside_us = np.maximum(high - low, 0)
    kept = np.flatnonzero(inside_us)
    if kept.size < inside_us.size:
        low, high = low[kept], high[kept]
    tick = (low - origin) // tick_us
    pieces = (high - 1 - origin) // tick_us - tick + 1
    whole = kept.size == inside_us.size and np.array_equal(inside_us, end_us - start_us)
    if whole and (pieces == 1).all():
        of, position, length = None, None, inside_us
    else:
        rank = np.repeat(np.arange(kept.size), pieces)
        tick = tick[rank] + np.arange(rank.size) - np.repeat(np.cumsum(pieces) - pieces, pieces)
        edge = origin + tick * tick_us
        of = kept[rank]
        piece_low = np.maximum(low[rank], edge)
        piece_high = np.minimum(high[rank], edge + tick_us)
        length = piece_high - piece_low
        begin = start_us[of]
        position = (piece_low - begin + piece_high - begin) / (2.0 * (end_us[of] - begin))
    first_piece = np.flatnonzero(np.diff(tick, prepend=-1))
    covered = np.add.reduceat(length, first_piece) if length.size else length
    return Spans(
        inside_us, of, length, length.astype(np.float64), position, first_piece, tick[first_piece], covered
    )


def add_constant(
    spans: Spans, values: NDArray[np.float64], bad: NDArray[np.intp], into: NDArray[np.float64]
) -> None:
    """Add the integral of a value that is constant over each stretch to the ticks, in value x microseconds.

    ``values`` has shape (N,), ``bad`` lists the stretches that do not count, ``into`` has one place per tick.
    """
    _add(spans, values if spans.of is None else values[spans.of], bad, into)


def add_line(
    spans: Spans, values: NDArray[np.float64], bad: NDArray[np.intp], into: NDArray[np.float64]
) -> None:
    """Add the integral of a straight line over each stretch: exact, as a line's mean is its middle.

    ``values`` has shape (N + 1,): the ends of the stretches, one after the other.
    """
    left, right = values[:-1], values[1:]
    if spans.of is None or spans.position is None:
        pieces = 0.5 * (left + right)
    else:
        pieces = left[spans.of] + (right - left)[spans.of] * spans.position
    _add(spans, pieces, bad, into)


def add_covered(spans: Spans, bad: NDArray[np.intp], into: NDArray[np.int64]) -> None:
    """Add the microseconds covered by all stretches but the bad ones to the ticks."""
    if not spans.length_us.size:
        return
    covered = spans.covered_us
    if bad.size:
        if spans.of is None:
            tick = np.searchsorted(spans.first_piece, bad, side="right") - 1
            covered = covered.copy()
            np.subtract.at(covered, tick, spans.length_us[bad])
        else:
            counts = np.ones(spans.inside_us.size, dtype=np.int64)
            counts[bad] = 0
            covered = np.add.reduceat(spans.length_us * counts[spans.of], spans.first_piece)
    into[spans.ticks] += covered


def _add(spans: Spans, pieces: NDArray[np.float64], bad: NDArray[np.intp], into: NDArray[np.float64]) -> None:
    if not pieces.size:
        return
    weighted = pieces * spans.weight
    if bad.size:
        if spans.of is None:
            weighted[bad] = 0.0
        else:
            dropped = np.zeros(spans.inside_us.size, dtype=np.bool_)
            dropped[bad] = True
            weighted[dropped[spans.of]] = 0.0
    into[spans.ticks] += np.add.reduceat(weighted, spans.first_piece)
