"""The calibrations of a tag: one for each instrument that was read under its name."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.plant import Tag
    from auditor.records.powers import Move


@dataclass(frozen=True)
class Calibration:
    """One calibration of a tag, and when it holds."""

    key: str
    """``calibration:TAG``, of a later one ``calibration:TAG@2026-07-10``."""
    tag: Tag
    """As it was when the calibration was declared."""
    from_us: int
    until_us: int

    def holds(self, start_us: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Tell which ticks it holds in, by their start."""
        within: NDArray[np.bool_] = (start_us >= self.from_us) & (start_us < self.until_us)
        return within


def calibrations_of(tag: Tag) -> tuple[Calibration, ...]:
    """Give the calibrations of a tag in order of time.

    The error of an instrument is the same all the time, and so does not shrink with the number of
    samples; that of another instrument has nothing to do with it. Two instruments, each of standard
    uncertainty u and each in place for half of the energy, leave ``u / sqrt(2)`` on the sum.

    Source
    ------
    JCGM 100:2008, 5.1.2 (independent quantities) and 5.2.4 (readings of one instrument are correlated by
    its calibration).
    """
    began = [(tag.stretches[0][0], "", tag)]
    began += [
        (change.from_us, f"@{change.since}", change.tag) for change in tag.changes if change.new_calibration
    ]
    ends = [*(start_us for start_us, _, _ in began[1:]), tag.stretches[-1][1]]
    return tuple(
        Calibration(f"calibration:{tag.name}{since}", then, start_us, end_us)
        for (start_us, since, then), end_us in zip(began, ends, strict=True)
    )


def moved_calibration(tag: Tag, move: Move | None) -> Calibration | None:
    """Return the calibration of a tag that is moved; None when none is."""
    if move is None:
        return None
    return next((each for each in calibrations_of(tag) if each.key == move.source), None)
