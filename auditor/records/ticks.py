"""What cleaning gives: time-weighted means on the base grid, and the two ledgers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import IntEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.period import Grid
    from auditor.records.samples import Disposition


class SecondKind(IntEnum):
    """What became of a second of the period, per tag."""

    COVERED = 0
    STALE = 1
    """Beyond the hold after the last sample (or the counter gap was too long)."""
    REJECTED = 2
    """Logged, but the value was rejected."""
    NEVER_LOGGED = 3
    """Before the first or after the last sample of the tag, beyond its hold."""

    @property
    def word(self) -> str:
        """The word printed in ledgers."""
        return self.name.lower().replace("_", " ")


@dataclass(frozen=True)
class Example:
    """One raw cell of a disposition, for the ledger's first and last example."""

    file: str
    line: int
    instant_us: int | None
    raw: str
    """Raw text where reading kept it, else the raw number in shortest form."""


@dataclass(frozen=True)
class CellLedger:
    """Every raw cell of every bound tag, by disposition."""

    tags: tuple[str, ...]
    counts: NDArray[np.int64]
    """Shape (tags, len(Disposition)); each row sums to the number of raw cells of its tag."""
    raw_cells: NDArray[np.int64]
    """Shape (tags,), counted independently while reading."""
    first: Mapping[tuple[str, Disposition], Example]
    last: Mapping[tuple[str, Disposition], Example]
    words: Mapping[str, Mapping[str, int]]
    """Per tag: each status word verbatim with its count."""


@dataclass(frozen=True)
class SecondLedger:
    """Every microsecond of the period, per tag, by kind."""

    tags: tuple[str, ...]
    microseconds: NDArray[np.int64]
    """Shape (tags, len(SecondKind)); each row sums to the length of the period."""


@dataclass(frozen=True)
class Bridge:
    """A counter difference across a gap that is too long to be spread: known in sum, not in time."""

    tag: str
    start_us: int
    end_us: int
    amount: float
    """SI amount (joule, m3, kg)."""


@dataclass(frozen=True)
class CarryOver:
    """What cleaning must remember of one tag from one block, file or month to the next."""

    instant_us: int
    value: float
    """Last accepted sample, SI."""
    equal_since_us: int
    """Start of the run of equal values that the last sample belongs to."""


@dataclass(frozen=True)
class TickTable:
    """Time-weighted means of every tag on the base grid, SI.

    ``columns`` are the tags' ``tick_columns``. ``mean[t, c]`` is the mean over the covered part of the
    tick and NaN where nothing is covered; counters and amounts are rates per second.
    """

    grid: Grid
    columns: tuple[str, ...]
    mean: NDArray[np.float64]
    """Shape (T, columns)."""
    covered_s: NDArray[np.float64]
    """Shape (T, columns)."""
    samples: NDArray[np.int32]
    """Accepted samples inside the tick, shape (T, columns)."""
    noise: NDArray[np.float64]
    """Standard uncertainty of the tick mean from the random part alone, shape (T, columns), SI."""
    noise_lag1: NDArray[np.float64]
    """Lag-1 autocorrelation of that random part from tick to tick, shape (columns,) [1]."""
    native_step_s: NDArray[np.float64]
    """Typical time between samples, shape (columns,); NaN without samples."""
    tags: tuple[str, ...]
    """Tag of each column, shape (columns,)."""
    cells: CellLedger
    seconds: SecondLedger
    bridges: tuple[Bridge, ...]
    carry: Mapping[str, CarryOver]

    def column(self, name: str) -> int:
        """Index of a column by name."""
        return self.columns.index(name)
