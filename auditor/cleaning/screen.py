"""Samples that their neighbours speak against, found while the pieces of an export stream by."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.dated import rows_by_stretch, stamp_shift_us
from auditor.cleaning.rates import slow_enough
from auditor.cleaning.rows import joined
from auditor.cleaning.spikes import AHEAD, BEHIND, far_from_neighbours
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.rows import Rows
    from auditor.records.plant import Tag

Doubts = Mapping[str, "NDArray[np.int8]"]
"""Per tag a :class:`Disposition` for each row of a piece, 0 where the neighbours say nothing against it."""

_MEMORY = AHEAD + BEHIND


def screened(
    pieces: Iterable[Rows], tags: Iterable[Tag], distrust_us: Mapping[str, tuple[tuple[int, int], ...]]
) -> Iterator[tuple[Rows, Doubts]]:
    """Give the rows of an export with the samples that their neighbours speak against.

    Rows wait until every tag that is tested for spikes has the two samples that follow, or cannot have them
    any more because a hold has gone by; what waits is joined to the next piece. So it makes no difference
    where the pieces are cut. Without such tests the pieces pass as they are.

    Parameters
    ----------
    pieces
        Rows of one export in order of time, no stamp torn.
    tags
        The tags of the export, in the order of the rows' numbers.
    distrust_us
        Per tag the times that a person excluded, by the instant a sample belongs to.
    """
    tests = [
        _Test(tag, row, distrust_us.get(tag.name, ()))
        for row, tag in enumerate(tags)
        if tag.spike is not None or tag.change_at_most is not None
    ]
    if not tests:
        for piece in pieces:
            yield piece, {}
            # Not to be held while the next one is waited for.
            del piece
        return
    waiting: Rows | None = None
    for piece in pieces:
        waiting = piece if waiting is None else joined(waiting, piece)
        ready = min(test.ready(waiting) for test in tests)
        if ready:
            yield _part(waiting, ready), _doubts(tests, waiting, ready)
            waiting = waiting.part(ready, waiting.instants_us.size)
            if not waiting.instants_us.size:
                waiting = None
    if waiting is not None:
        yield waiting, _doubts(tests, waiting, waiting.instants_us.size)


def _part(rows: Rows, stop: int) -> Rows:
    if stop == rows.instants_us.size:
        return rows
    return replace(rows.part(0, stop), next_us=int(rows.instants_us[stop]))


def _doubts(tests: list[_Test], rows: Rows, stop: int) -> dict[str, NDArray[np.int8]]:
    found = {test.tag.name: test.judge(rows, stop) for test in tests}
    return {name: codes for name, codes in found.items() if codes.any()}


class _Test:
    """Memory of one tested tag: the samples before the rows at hand; local to one call of ``clean``."""

    def __init__(self, tag: Tag, row: int, distrust_us: tuple[tuple[int, int], ...]) -> None:
        self.tag = tag
        self.row = row
        self.distrust_us = distrust_us
        self.hold_us = round(tag.hold_s * MICROSECONDS)
        self._instants = np.zeros(0, dtype=np.int64)
        self._values = np.zeros(0)
        self._believed: tuple[int, float] | None = None

    def ready(self, rows: Rows) -> int:
        """Return how many rows can be judged; the rest needs the samples that follow."""
        count = rows.instants_us.size
        if self.tag.spike is None:
            return count
        _, stamps = self._samples(rows)
        if not stamps.size or rows.instants_us[-1] > stamps[-1] + self.hold_us:
            return count
        # The last two samples wait, and with them whatever comes after the first of them.
        first_open = stamps[-AHEAD:][0]
        return int(np.searchsorted(rows.instants_us, first_open, side="left"))

    def judge(self, rows: Rows, stop: int) -> NDArray[np.int8]:
        """Judge the first rows, up to ``stop``, and remember what the later ones need."""
        numbers, _ = self._numbers(rows)
        at, stamps = self._samples(rows)
        codes = np.zeros(stop, dtype=np.int8)
        values = numbers[at]
        if self.tag.spike is not None:
            before = self._instants.size
            spikes = far_from_neighbours(
                np.concatenate((self._values, values)),
                np.concatenate((self._instants, stamps)),
                self.tag.spike,
                self.hold_us,
                self.tag.resolution,
            )[before:]
            codes[at[spikes & (at < stop)]] = Disposition.SPIKE
        judged = at < stop
        if self.tag.change_at_most is not None:
            calm = at[judged][codes[at[judged]] == 0]
            codes[calm[~self._slow(numbers[calm], rows.instants_us[calm])]] = Disposition.CHANGED_TOO_FAST
        self._values = np.concatenate((self._values, values[judged]))[-_MEMORY:]
        self._instants = np.concatenate((self._instants, stamps[judged]))[-_MEMORY:]
        _same_for_repeats(codes, numbers, rows)
        return codes

    def _slow(self, values: NDArray[np.float64], stamps: NDArray[np.int64]) -> NDArray[np.bool_]:
        if not values.size or self.tag.change_at_most is None:
            return np.ones(values.size, dtype=np.bool_)
        lead = 0
        if self._believed is not None:
            lead = 1
            stamps = np.concatenate((np.array([self._believed[0]], dtype=np.int64), stamps))
            values = np.concatenate(([self._believed[1]], values))
        believed = slow_enough(values, stamps, self.tag.change_at_most, self.hold_us)
        last = int(np.flatnonzero(believed)[-1])
        self._believed = (int(stamps[last]), float(values[last]))
        return believed[lead:]

    def _numbers(self, rows: Rows) -> tuple[NDArray[np.float64], NDArray[np.bool_]]:
        """Return every number in SI, and which are finite and believable, by the tag as it is then."""
        raw = rows.raw[self.row]
        numbers = np.full(raw.shape, np.nan)
        good = np.zeros(raw.shape, dtype=np.bool_)
        for part, then in rows_by_stretch(self.tag, rows.instants_us):
            numbers[part] = raw[part] * then.scale + then.offset
            good[part] = np.isfinite(numbers[part])
            if then.believable is not None:
                low, high = then.believable
                good[part] &= (numbers[part] >= low) & (numbers[part] <= high)
        return numbers, good

    def _samples(self, rows: Rows) -> tuple[NDArray[np.intp], NDArray[np.int64]]:
        """Return the rows of the samples to compare, the first one of each stamp, and their stamps."""
        _, good = self._numbers(rows)
        shift = stamp_shift_us(self.tag)
        for start_us, end_us in self.distrust_us:
            first, last = np.searchsorted(rows.instants_us, (start_us + shift, end_us + shift), side="left")
            good[first:last] = False
        at = np.flatnonzero(good)
        stamps = rows.instants_us[at]
        first_of_stamp = np.diff(stamps, prepend=-(2**62)) > 0
        return at[first_of_stamp], stamps[first_of_stamp]


def _same_for_repeats(codes: NDArray[np.int8], numbers: NDArray[np.float64], rows: Rows) -> None:
    """Give equal values of one stamp the same fate; only where a stamp with a doubted value is repeated."""
    instants = rows.instants_us[: codes.size]
    repeats = np.flatnonzero(instants[1:] == instants[:-1]) + 1
    for row in repeats.tolist():
        if codes[row] == 0 and codes[row - 1] and numbers[row] == numbers[row - 1]:
            codes[row] = codes[row - 1]
