"""Tags of which something changes at a date: what holds at each stamp."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.plant import Tag


def stamp_shift_us(tag: Tag) -> int:
    """Return what to take off a stamp to find the tick it belongs to.

    A stamp at the end of its stretch belongs to the time just before it.
    """
    return 1 if tag.stamp_marks == "end" and tag.between in ("mean", "amount") else 0


def rows_by_stretch(tag: Tag, instants_us: NDArray[np.int64]) -> Iterator[tuple[slice, Tag]]:
    """Give the rows of each stretch, stamps in order of time, with the tag as it is then."""
    shift_us = stamp_shift_us(tag)
    for start_us, end_us, then in tag.stretches:
        first, last = np.searchsorted(instants_us, (start_us + shift_us, end_us + shift_us)).tolist()
        if first < last:
            yield slice(first, last), then
