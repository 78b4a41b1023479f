"""Readings at the end of an instrument's range: the true value lies at least, or at most, there."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.marks import Marks

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.period import Grid
    from auditor.records.plant import Tag


def range_end_marks(tag: Tag, grid: Grid) -> Marks | None:
    """Return what notes the readings at or beyond a declared end; None where no end is declared.

    Such readings are used, for nothing better is known; but what they enter is a bound.
    """
    if tag.saturates_at is None:
        return None
    low = -np.inf if tag.saturates_at[0] is None else tag.saturates_at[0]
    high = np.inf if tag.saturates_at[1] is None else tag.saturates_at[1]

    def at_an_end(values: NDArray[np.float64]) -> NDArray[np.bool_]:
        return (values <= low) | (values >= high)

    return Marks(tag, grid, at_an_end)
