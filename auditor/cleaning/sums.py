"""Sums of one tag over the ticks, and how the rules for values between stamps fill them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.spans import Spans, add_constant, add_covered, add_line, cut
from auditor.records.period import MICROSECONDS

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.chain import Chain
    from auditor.records.period import Grid
    from auditor.records.plant import Tag


@dataclass(frozen=True)
class Isolated:
    """Means or amounts farther from their neighbour than a hold: how long they last is known at the end."""

    instants_us: NDArray[np.int64]
    values: NDArray[np.float64]
    good: NDArray[np.bool_]


class Sums:
    """Integrals, covered time and numbers of samples of one tag; local to one call of ``clean``."""

    def __init__(self, tag: Tag, grid: Grid) -> None:
        self.tag = tag
        self.grid = grid
        self.hold_us = round(tag.hold_s * MICROSECONDS)
        self.integral = np.zeros((len(tag.tick_columns), grid.ticks))
        """SI x microseconds, one row per tick column."""
        self.covered_us = np.zeros(grid.ticks, dtype=np.int64)
        self.samples = np.zeros(grid.ticks, dtype=np.int32)
        self.rejected_us = 0
        self._state_columns = _state_columns(tag)

    def add_chain(self, chain: Chain, spans: Spans) -> NDArray[np.bool_] | None:
        """Fill the stretches between the events of a chain by the tag's rule.

        ``spans`` are the stretches from each event to the next, at most a hold long.

        - ``step`` and ``state``: a value holds until the next event, at most a hold; a rejected cell holds
          as *rejected* just so.
        - ``line``: straight between two accepted samples at most a hold apart. If they are farther apart
          nothing is covered after the older one. Next to a rejected cell the stretch is rejected.
        - ``mean`` and ``amount``: the stretch that ends (or starts) at the stamp belongs to it, as long as
          it is at most a hold long; those farther apart are :meth:`isolated`.

        Returns
        -------
        ndarray or None
            Stretches that are covered; None: all.
        """
        covered, rejected = self._sides(chain)
        if rejected is not None:
            self.rejected_us += int(spans.inside_us[np.flatnonzero(rejected)].sum())
        bad = np.zeros(0, dtype=np.intp) if covered is None else np.flatnonzero(~covered)
        if self.tag.between == "line":
            add_line(spans, chain.values, bad, self.integral[0])
        else:
            right = self.tag.stamp_marks == "end" and self.tag.between in ("mean", "amount")
            values = chain.values[1:] if right else chain.values[:-1]
            if self.tag.between == "amount":
                values = values * MICROSECONDS / np.diff(chain.instants_us)
            self._add_values(spans, values, bad)
        add_covered(spans, bad, self.covered_us)
        return covered

    @property
    def instantaneous(self) -> bool:
        """Whether a value belongs to the instant of its stamp, not to a stretch of time beside it."""
        return self.tag.between not in ("mean", "amount")

    def isolated(self, chain: Chain, *, leads: bool) -> list[Isolated]:
        """Return the means or amounts of a chain whose stretch is not bounded by a near neighbour.

        ``leads`` tells that nothing was logged before the chain.
        """
        if self.instantaneous:
            return []
        far = np.diff(chain.instants_us) > self.hold_us
        at_end = self.tag.stamp_marks == "end"
        owner = np.concatenate(([leads], far)) if at_end else np.append(far, False)
        return self._isolated_where(chain, owner)

    def isolated_last(self, chain: Chain) -> list[Isolated]:
        """Return the last mean or amount of all if its stretch starts at its stamp; a chain of one event."""
        starts = not self.instantaneous and self.tag.stamp_marks == "start"
        return self._isolated_where(chain, np.array([starts]))

    def add_isolated(self, isolated: list[Isolated], native_us: int) -> int | None:
        """Fill the stretches of isolated values, each one native step long.

        One whose stamp belongs to another period is left out. Returns the start of the first stretch.
        """
        instants = np.concatenate([part.instants_us for part in isolated])
        values = np.concatenate([part.values for part in isolated])
        good = np.concatenate([part.good for part in isolated])
        start = instants - native_us if self.tag.stamp_marks == "end" else instants
        if not start.size:
            return None
        self.reject(start[~good], start[~good] + native_us)
        if self.tag.between == "amount":
            values = values * MICROSECONDS / native_us
        spans = cut(start[good], start[good] + native_us, self.grid)
        none = np.zeros(0, dtype=np.intp)
        self._add_values(spans, values[good], none)
        add_covered(spans, none, self.covered_us)
        return int(start[0])

    def from_outside(self, chain: Chain, spans: Spans, covered: NDArray[np.bool_] | None) -> list[int]:
        """Return the stamps outside the period of samples that cover a part of it."""
        period = self.grid.period
        instants = chain.instants_us
        at_end = not self.instantaneous and self.tag.stamp_marks == "end"
        held = self.tag.between in ("step", "state")
        found = []
        before = int(np.searchsorted(instants, period.start_us, side="left")) - 1
        if not at_end and 0 <= before < spans.inside_us.size and spans.inside_us[before] > 0:
            found += [int(instants[before])] if covered is None or covered[before] else []
        after = int(np.searchsorted(instants, period.end_us + at_end, side="left"))
        uses_right = at_end or self.tag.between == "line"
        if not held and uses_right and 0 < after < instants.size and spans.inside_us[after - 1] > 0:
            found += [int(instants[after])] if covered is None or covered[after - 1] else []
        return found

    def _isolated_where(self, chain: Chain, owner: NDArray[np.bool_]) -> list[Isolated]:
        at_end = self.tag.stamp_marks == "end"
        stamps = chain.instants_us - at_end
        inside = (stamps >= self.grid.period.start_us) & (stamps < self.grid.period.end_us)
        chosen = np.flatnonzero(owner & inside)
        if not chosen.size:
            return []
        good = np.ones(chosen.size, dtype=np.bool_) if chain.good is None else chain.good[chosen]
        return [Isolated(chain.instants_us[chosen], chain.values[chosen], good)]

    def take_out(self, ticks: slice | NDArray[np.bool_]) -> tuple[int, int]:
        """Move ticks from covered to rejected; returns their samples and the time they covered [us]."""
        covered_us = int(self.covered_us[ticks].sum())
        samples = int(self.samples[ticks].sum())
        self.rejected_us += covered_us
        self.covered_us[ticks] = 0
        self.integral[:, ticks] = 0.0
        self.samples[ticks] = 0
        return samples, covered_us

    def reject(self, start_us: NDArray[np.int64], end_us: NDArray[np.int64]) -> None:
        """Count stretches as rejected, as far as they lie in the period."""
        period = self.grid.period
        inside = np.minimum(end_us, period.end_us) - np.maximum(start_us, period.start_us)
        self.rejected_us += int(np.maximum(inside, 0).sum())

    def _sides(self, chain: Chain) -> tuple[NDArray[np.bool_] | None, NDArray[np.bool_] | None]:
        """Tell which stretches are covered (None: all) and which rejected (None: none)."""
        between = self.tag.between
        held = between in ("step", "state")
        if chain.good is None and held:
            return None, None
        if chain.good is not None and held:
            return chain.good[:-1], ~chain.good[:-1]
        near = np.diff(chain.instants_us) <= self.hold_us
        if chain.good is None:
            return (None if near.all() else near), None
        left, right = chain.good[:-1], chain.good[1:]
        if between == "line":
            return left & right & near, ~left | (~right & near)
        owner = right if self.tag.stamp_marks == "end" else left
        return owner & near, ~owner & near

    def _add_values(self, spans: Spans, values: NDArray[np.float64], bad: NDArray[np.intp]) -> None:
        if self._state_columns is None:
            add_constant(spans, values, bad, self.integral[0])
            return
        known = np.where(np.isfinite(values), values, 0.0).astype(np.intp)
        column = self._state_columns[np.clip(known, 0, self._state_columns.size - 1)]
        for index in range(self.integral.shape[0]):
            add_constant(spans, (column == index).astype(np.float64), bad, self.integral[index])


def _state_columns(tag: Tag) -> NDArray[np.intp] | None:
    """Column of each raw text of a state; None for a tag that is none."""
    if tag.states is None:
        return None
    names = list(dict.fromkeys(tag.states.values()))
    by_text = {text.strip(): name for text, name in tag.states.items()}
    texts = dict.fromkeys(text.strip() for text in tag.states)
    return np.array([names.index(by_text[text]) for text in texts], dtype=np.intp)
