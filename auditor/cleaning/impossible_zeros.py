"""Exact zeros while other evidence says that they cannot be: whole ticks become rejected ones."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.marks import Marks
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.cells import CellBook
    from auditor.cleaning.tally import Tally
    from auditor.records.machines import Running
    from auditor.records.period import Grid
    from auditor.records.plant import Tag
    from auditor.records.ticks import Example


@dataclass(frozen=True)
class ZeroStretch:
    """Neighbouring ticks taken out because of a zero that cannot be."""

    tag: str
    start_us: int
    end_us: int
    cells: int
    covered_us: int
    first: Example | None


def zero_marks(tag: Tag, grid: Grid) -> Marks | None:
    """Return what notes the exact zeros of a tag, of the logged number; None where none is declared false."""
    if tag.not_zero_while is None:
        return None
    zero = tag.offset
    return Marks(tag, grid, lambda values: np.equal(values, zero))


def speaking_ticks(rule: Running, tally: Tally) -> NDArray[np.bool_]:
    """Tell for each tick whether a tag speaks against a zero, without doubt.

    It is in the state for all of its covered time, or above the value in the mean, and so it is in the ticks
    on either side: in the tick of a start or a stop, and next to one, a zero may be true.
    """
    sums = tally.sums
    integral = sums.integral[tally.tag.tick_columns.index(rule.tick_column)]
    speaks = sums.covered_us > 0
    if rule.above is None:
        speaks &= integral >= sums.covered_us
    else:
        speaks &= integral > rule.above * sums.covered_us
    result = speaks.copy()
    result[1:] &= speaks[:-1]
    result[:-1] &= speaks[1:]
    return result


def take_out_zeros(tallies: Mapping[str, Tally], book: CellBook) -> list[ZeroStretch]:
    """Reject zeros of tags that declare ``not_zero_while``, wherever that other tag speaks against them.

    Rejected are the whole ticks that such a zero reaches by the rule of its tag (of a line also the way down
    to it and up from it): their time moves from covered to rejected, their used cells to zero while running.
    """
    speaking = {
        tally.tag.name: speaking_ticks(tally.tag.not_zero_while, tallies[tally.tag.not_zero_while.tag])
        for tally in tallies.values()
        if tally.tag.not_zero_while is not None
    }
    found: list[ZeroStretch] = []
    for tally in tallies.values():
        if tally.zeros is not None:
            found += _take_out(tally, tally.zeros, speaking[tally.tag.name], book)
    return found


def _take_out(tally: Tally, zeros: Marks, speaking: NDArray[np.bool_], book: CellBook) -> list[ZeroStretch]:
    out = zeros.ticks(speaking) & (tally.sums.covered_us > 0)
    edges = np.flatnonzero(np.diff(np.concatenate(([False], out, [False])).astype(np.int8)))
    tick_us = tally.grid.tick_s * MICROSECONDS
    found = []
    for first, stop in edges.reshape(-1, 2).tolist():
        cells, covered_us = tally.sums.take_out(slice(first, stop))
        inside = np.zeros(out.size, dtype=np.bool_)
        inside[first:stop] = True
        examples = zeros.examples(inside)
        book.move(tally.tag.name, Disposition.USED, Disposition.ZERO_WHILE_RUNNING, cells, examples)
        start_us = tally.grid.period.start_us
        found.append(
            ZeroStretch(
                tally.tag.name,
                start_us + first * tick_us,
                start_us + stop * tick_us,
                cells,
                covered_us,
                examples[0] if examples else None,
            )
        )
    return found
