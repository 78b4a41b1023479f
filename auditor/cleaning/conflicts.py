"""Differing values for one stamp: what the choice between them is worth."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.cells import Cells
    from auditor.cleaning.repeats import Resolved
    from auditor.cleaning.view import View
    from auditor.records.plant import Tag


@dataclass(frozen=True)
class Conflicts:
    """Values of one tag that lost against another of the same stamp, struct of arrays."""

    instants_us: NDArray[np.int64]
    effect: NDArray[np.float64]
    """Integral of kept less lost value over the time it covers [SI s]; of a counter the bare difference."""
    lost_file: NDArray[np.int32]
    lost_line: NDArray[np.int64]
    kept_file: NDArray[np.int32]
    """-1 where neither is kept."""


def conflicts_of(view: View, resolved: Resolved, cells: Cells, hold_us: int, tag: Tag) -> list[Conflicts]:
    """Return the conflicts of one piece that lie in the period."""
    period = view.grid.period
    stamps = cells.instants_us[resolved.lost]
    inside = (stamps >= period.start_us) & (stamps < period.end_us)
    lost, winner = resolved.lost[inside], resolved.winner[inside]
    if not lost.size:
        return []
    stamps = stamps[inside]
    effect = cells.values[winner] - cells.values[lost]
    if tag.between == "state":
        effect = np.zeros(lost.size)
    elif tag.between not in ("amount", "counter"):
        following = np.searchsorted(cells.instants_us, stamps, side="right")
        beyond = stamps[-1] if view.rows.next_us is None else view.rows.next_us
        next_us = np.append(cells.instants_us, beyond)[following]
        effect = effect * np.minimum(next_us - stamps, hold_us) / MICROSECONDS
    return [
        Conflicts(
            instants_us=stamps,
            effect=effect,
            lost_file=cells.file[lost],
            lost_line=cells.line[lost],
            kept_file=np.where(winner == lost, -1, cells.file[winner]),
        )
    ]
