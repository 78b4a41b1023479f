"""Blocks of one export made ready for cleaning: every stamp whole, every rejected cell at its row."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.samples import SampleBlock

NO_ROWS = np.zeros(0, dtype=np.intp)
_LINE_BITS = 40
"""A line number fits into so many bits; the index of its file stands above them."""


@dataclass(frozen=True)
class Rows:
    """Rows of one export in order of time. All rows of a stamp stand in the same piece."""

    instants_us: NDArray[np.int64]
    """Shape (n,), not falling."""
    raw: NDArray[np.float64]
    """Raw numbers, NaN = none, shape (tags of the export, n)."""
    file: NDArray[np.int32]
    """Index into the list of all files named so far."""
    pattern: NDArray[np.int16]
    line: NDArray[np.int64]
    broken: tuple[NDArray[np.intp], ...]
    """Per tag: rows where something was logged that reading could not use, rising."""
    next_us: int | None = None
    """The stamp after the last row, where one is known."""

    def part(self, start: int, stop: int) -> Rows:
        """Return the rows from ``start`` up to ``stop``."""
        if start == 0 and stop == self.instants_us.size:
            return self
        return Rows(
            instants_us=self.instants_us[start:stop],
            raw=self.raw[:, start:stop],
            file=self.file[start:stop],
            pattern=self.pattern[start:stop],
            line=self.line[start:stop],
            broken=tuple(
                at[(at >= start) & (at < stop)] - start if at.size else NO_ROWS for at in self.broken
            ),
        )


def rows_of_rejects(block: SampleBlock) -> NDArray[np.intp]:
    """Return the row of each of a block's rejects, -1 for one whose file gave no row.

    A reject whose line is not the line of a row belongs to the last row before it in the same file (a row
    may be made of several lines of a long export).
    """
    rejects = block.rejects
    if not (rejects.line.size and block.line.size):
        return np.full(rejects.line.shape, -1, dtype=np.intp)
    keys = (block.source.astype(np.int64) << _LINE_BITS) | block.line
    wanted = (rejects.source.astype(np.int64) << _LINE_BITS) | rejects.line
    order = None if (keys[1:] >= keys[:-1]).all() else np.argsort(keys, kind="stable")
    ranked = keys if order is None else keys[order]
    at = np.searchsorted(ranked, wanted, side="right") - 1
    before_first = (at < 0) | (ranked[at] >> _LINE_BITS != rejects.source)
    at[before_first] += 1
    foreign = (at >= keys.size) | (ranked[np.minimum(at, keys.size - 1)] >> _LINE_BITS != rejects.source)
    found = at if order is None else order[np.minimum(at, keys.size - 1)]
    found[foreign | (rejects.disposition == Disposition.BAD_STAMP)] = -1
    return found


def rows_of(
    block: SampleBlock, at_row: NDArray[np.intp], tags: tuple[str, ...], file_numbers: NDArray[np.int32]
) -> Rows:
    """Arrange a block by the tags of its export.

    ``at_row`` is what :func:`rows_of_rejects` gave, ``file_numbers`` are the numbers of the block's files.
    """
    logged = (at_row >= 0) & (block.rejects.disposition != Disposition.EMPTY)
    place = {tag: index for index, tag in enumerate(block.tags)}
    if block.tags == tags:
        raw = block.values
    else:
        raw = np.full((len(tags), block.instants_us.size), np.nan)
        for index, tag in enumerate(tags):
            if tag in place:
                raw[index] = block.values[place[tag]]
    tag_rows = at_row[logged]
    tag_of = block.rejects.tag[logged]
    broken = tuple(
        np.unique(tag_rows[tag_of == place[tag]]) if tag_rows.size and tag in place else NO_ROWS
        for tag in tags
    )
    return Rows(
        instants_us=block.instants_us,
        raw=raw,
        file=file_numbers[block.source],
        pattern=np.asarray(block.pattern, dtype=np.int16)[block.source],
        line=block.line,
        broken=broken,
    )


def whole_stamps(pieces: Iterable[Rows]) -> Iterator[Rows]:
    """Join pieces so that no stamp is torn: each waits for the next one, which may go on with its last stamp.

    Raises
    ------
    ValueError
        If the rows are not in order of time.
    """
    waiting: Rows | None = None
    for piece in pieces:
        if not piece.instants_us.size:
            continue
        first_us = int(piece.instants_us[0])
        if (piece.instants_us[1:] < piece.instants_us[:-1]).any():
            raise ValueError("samples of an export are not in order of time")
        if waiting is None:
            waiting = piece
            continue
        if waiting.instants_us[-1] > first_us:
            raise ValueError("blocks of an export are not in order of time")
        torn = int(np.searchsorted(waiting.instants_us, first_us, side="left"))
        if torn:
            yield replace(waiting.part(0, torn), next_us=first_us)
        rest = waiting.part(torn, waiting.instants_us.size)
        waiting = joined(rest, piece) if rest.instants_us.size else piece
    if waiting is not None:
        yield waiting


def joined(first: Rows, second: Rows) -> Rows:
    """Return the rows of both, in this order."""
    shift = first.instants_us.size
    return Rows(
        instants_us=np.concatenate((first.instants_us, second.instants_us)),
        raw=np.concatenate((first.raw, second.raw), axis=1),
        file=np.concatenate((first.file, second.file)),
        pattern=np.concatenate((first.pattern, second.pattern)),
        line=np.concatenate((first.line, second.line)),
        broken=tuple(
            np.concatenate((one, other + shift)) if one.size or other.size else NO_ROWS
            for one, other in zip(first.broken, second.broken, strict=True)
        ),
    )
