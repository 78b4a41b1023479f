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
    period = grid.period
    low, high, kept = start_us, end_us, None
    whole_us = inside_us = end_us - start_us
    if not low.size or low[0] < period.start_us or high[-1] > period.end_us or inside_us.min() <= 0:
        low, high = np.maximum(start_us, period.start_us), np.minimum(end_us, period.end_us)
        inside_us = np.maximum(high - low, 0)
        kept = np.flatnonzero(inside_us)
        low, high = low[kept], high[kept]
    if not low.size:
        none, nothing = np.zeros(0, dtype=np.intp), np.zeros(0)
        return Spans(inside_us, none, none, nothing, nothing, none, none, none)
    # Ticks are few and stretches many: the edges of ticks are looked up among the stretches.
    tick_us = grid.tick_s * MICROSECONDS
    first, last = (int(low[0]) - period.start_us) // tick_us, (int(high[-1]) - 1 - period.start_us) // tick_us
    ticks = np.arange(first, last + 1)
    edges = period.start_us + ticks[1:] * tick_us
    after = np.searchsorted(low, edges, side="left")
    is_cut = high[after - 1] > edges
    starts = after + np.cumsum(is_cut) - is_cut
    of: NDArray[np.intp] | None
    if kept is None and not is_cut.any():
        of, position, length = None, None, inside_us
    else:
        of, piece_low, length = _pieces(low, high, starts[is_cut], edges[is_cut])
        of = of if kept is None else kept[of]
        position = np.full(of.size, 0.5)
        part = np.flatnonzero(length != whole_us[of])
        begin = start_us[of[part]]
        ahead = piece_low[part] - begin
        position[part] = (ahead + ahead + length[part]) / (2.0 * whole_us[of[part]])
    first_piece = np.append(0, starts)
    touched = np.append(first_piece[1:], length.size) > first_piece
    first_piece, ticks = first_piece[touched], ticks[touched]
    covered = np.add.reduceat(length, first_piece)
    return Spans(inside_us, of, length, length.astype(np.float64), position, first_piece, ticks, covered)


def _pieces(
    low: NDArray[np.int64], high: NDArray[np.int64], new: NDArray[np.intp], edges: NDArray[np.int64]
) -> tuple[NDArray[np.intp], NDArray[np.int64], NDArray[np.int64]]:
    """Cut stretches at edges; ``new`` are the places that the pieces behind the edges get.

    Returns the stretch, the start and the length of each piece.
    """
    if not new.size:
        return np.arange(low.size), low, high - low
    behind = np.zeros(low.size + new.size, dtype=np.intp)
    behind[new] = 1
    of = np.arange(behind.size) - np.cumsum(behind)
    piece_low, piece_high = low[of], high[of]
    piece_low[new] = edges
    piece_high[new - 1] = edges
    return of, piece_low, piece_high - piece_low


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
