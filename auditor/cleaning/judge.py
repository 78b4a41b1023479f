"""What becomes of each number of one tag: used, out of range, distrusted, repeated, outside the period."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.dated import rows_by_stretch, stamp_shift_us
from auditor.cleaning.repeats import one_event_per_stamp, resolve
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.repeats import Resolved
    from auditor.cleaning.view import View
    from auditor.records.plant import Tag

NO_NUMBER = -1


@dataclass(frozen=True)
class Judged:
    """The rows of one tag by what became of its number there."""

    codes: NDArray[np.int8] | None
    """A :class:`Disposition` per row, -1 where there is no number; None: every row is used."""
    good: NDArray[np.bool_] | None
    """Rows with a believed number, at most one per stamp, also outside the period; None: all."""
    event: NDArray[np.bool_] | None
    """Rows where something was logged, believed or not, at most one per stamp; None: all."""
    resolved: Resolved | None
    """What became of values that share a stamp; None: none do."""


def judge(
    view: View,
    row_of: int,
    tag: Tag,
    distrust_us: tuple[tuple[int, int], ...],
    since_us: int | None,
    doubts: NDArray[np.int8] | None = None,
) -> Judged:
    """Judge the numbers of one tag, row ``row_of`` of the view.

    An empty cell is no event: in a table of slow and fast signals it only says that this one was not due.
    A cell that held something unusable is an event, and ends the stretch of the value before it. Order of
    the tests: outside the period, distrusted, out of range, spoken against by its neighbours (``doubts``),
    repeated.

    Rows before ``since_us`` belong to what the period before has dealt with, and are outside.
    """
    numbers = view.numbers[row_of, 1:]
    finite = view.finite[row_of]
    inside = view.tick_counts(stamp_shift_us(tag)).inside
    windows = _distrusted_rows(view, tag, distrust_us)
    out = None
    for rows, then in rows_by_stretch(tag, view.rows.instants_us):
        out = _out_of_range((numbers, finite), rows, then, out)
        if then.cut_off is not None and tag.between != "counter":
            numbers[rows][np.abs(numbers[rows]) < then.cut_off] = 0.0
    known_rows = 0 if since_us is None else int(np.searchsorted(view.rows.instants_us, since_us, side="left"))
    if not (windows is not None or out is not None or doubts is not None or known_rows) and (
        view.repeats is None and finite.all()
    ):
        codes = None
        if inside is not None:
            codes = np.where(inside, Disposition.USED, Disposition.OUTSIDE_PERIOD).astype(np.int8)
        return Judged(codes, None, None, None)
    codes = np.where(finite, Disposition.USED, NO_NUMBER).astype(np.int8)
    good = finite.copy()
    if out is not None:
        codes[out] = Disposition.OUT_OF_RANGE
        good &= ~out
    if windows is not None:
        codes[windows & finite] = Disposition.DISTRUSTED
        good &= ~windows
    if doubts is not None:
        doubted = good & (doubts > 0)
        codes[doubted] = doubts[doubted]
        good &= ~doubted
    good[:known_rows] = False
    event = finite.copy()
    event[view.rows.broken[row_of]] = True
    event[:known_rows] = False
    resolved = None
    if view.repeats is not None:
        resolved = resolve(view.repeats, view.rows.raw[row_of], good)
        codes[resolved.duplicate] = Disposition.DUPLICATE
        codes[resolved.lost] = Disposition.CONFLICT_LOST
        good[resolved.duplicate] = False
        good[resolved.lost] = False
        one_event_per_stamp(view.repeats, event, good)
    if inside is not None:
        codes[finite & ~inside] = Disposition.OUTSIDE_PERIOD
    return Judged(codes, good, None if event.all() else event, resolved)


def _out_of_range(
    cells: tuple[NDArray[np.float64], NDArray[np.bool_]],
    rows: slice,
    tag: Tag,
    known: NDArray[np.bool_] | None,
) -> NDArray[np.bool_] | None:
    """Add the numbers of some rows that are not believable to those known; None: none are."""
    if tag.believable is None:
        return known
    numbers, finite = cells
    low, high = tag.believable
    here = finite[rows] & ~((numbers[rows] >= low) & (numbers[rows] <= high))
    if not here.any():
        return known
    out = np.zeros(finite.size, dtype=np.bool_) if known is None else known
    out[rows] = here
    return out


def _distrusted_rows(
    view: View, tag: Tag, distrust_us: tuple[tuple[int, int], ...]
) -> NDArray[np.bool_] | None:
    instants = view.rows.instants_us
    shift = stamp_shift_us(tag)
    found: NDArray[np.bool_] | None = None
    for start_us, end_us in distrust_us:
        first, last = np.searchsorted(instants, (start_us + shift, end_us + shift), side="left")
        if last > first:
            found = np.zeros(instants.size, dtype=np.bool_) if found is None else found
            found[first:last] = True
    return found


def ends_of(mask: NDArray[np.bool_] | None, count: int) -> tuple[int, int] | None:
    """Return the first and last row of a mask, of all ``count`` when it is None; None when it is empty."""
    if mask is None:
        return (0, count - 1) if count else None
    first = int(np.argmax(mask)) if count else 0
    return (first, count - 1 - int(np.argmax(mask[::-1]))) if count and mask[first] else None
