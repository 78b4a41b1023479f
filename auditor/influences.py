"""Uncertainty of every figure by influences: each source moved on its own, the whole chain repeated.

The chain (metering, then balancing) is handed in as a callable, so that no derivative is written by hand
and a meter that serves two streams is correlated correctly by itself.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, TypeAlias

import numpy as np
from numpy.typing import NDArray

from auditor.records.balances import Contribution, FigureSums, MachineFigures, MachineInfluences
from auditor.records.powers import Move, Source

if TYPE_CHECKING:
    from auditor.records.ticks import TickTable

COVERAGE_FACTOR = 2.0
"""k of the expanded uncertainty U = k u, about 95 % for a normal distribution."""

_ROUNDING = 1e-12
"""Relative change of a figure below which it is arithmetic, not influence."""

_LONGEST = 0.999
"""Correlation from tick to tick beyond which an estimate of it says no more."""

Floats: TypeAlias = NDArray[np.float64]
Chain: TypeAlias = Callable[[Move], Mapping[str, MachineFigures]]


@dataclass(frozen=True)
class Memory:
    """How the random shifts of one tag hang together from step to step."""

    neighbours: float = 0.0
    """Correlation of the shifts of neighbouring steps, -0.5 to 0 [1]."""
    inflation: float = 1.0
    """Factor on the variance of a sum over steps, for noise that outlasts one; at most their number [1]."""


_NO_MEMORY = Memory()


def step_memory(ticks: TickTable) -> dict[str, Memory]:
    """Memory of every random source, from the correlation ``r`` of its noise from tick to tick.

    Negative ``r``: readings of which differences are taken, as of a counter. With ``n`` ticks in a step
    the shifts of neighbouring steps are correlated by ``r / (n + 2 r (n - 1))``; for pure quantisation
    ``r = -0.5`` that is -0.5 again: over any number of steps all readings but the first and last cancel.

    Positive ``r``: the shift of a step allows for ``min((1 + r)/(1 - r), n)``; what the bound ``n`` cuts
    off lasts beyond the step and is given back to sums over many steps.

    Parameters
    ----------
    ticks : TickTable
        With ``noise_lag1`` per column.

    Returns
    -------
    dict of source key (``random:TAG``) to Memory

    Source
    ------
    Box, Jenkins and Reinsel, Time Series Analysis: first-order moving average (section 3.3) and
    first-order autoregression (section 3.2).
    """
    count = ticks.grid.ticks_per_interval
    found = {}
    for tag, lag in zip(ticks.tags, ticks.noise_lag1, strict=True):
        r = min(max(float(lag), -0.5), _LONGEST) if np.isfinite(lag) else 0.0
        factor = (1.0 + r) / (1.0 - r)
        found[f"random:{tag}"] = (
            Memory(neighbours=r / (count + 2.0 * r * (count - 1.0)))
            if r < 0.0
            else Memory(inflation=factor / min(factor, count))
        )
    return found


def propagate(
    chain: Chain,
    base: Mapping[str, MachineFigures],
    sources: Sequence[Source],
    memory: Mapping[str, Memory],
) -> dict[str, MachineInfluences]:
    """Move every source on its own and add up what that does to every figure.

    With ``f`` a figure, ``f+`` and ``f-`` the same with one source moved up and down by its standard
    uncertainty, sums ``N`` over ``D`` by step ``s``:

    - calibration and assumed numbers are the same error all the time:
      ``c = (f+ - f-) / 2`` for an interval and, from the sums of the whole period, for the period;
    - random parts are independent from step to step. The change of step ``s`` shifts a figure by
      ``c_s = (dN_s - f dD_s) / D``, where ``dN``, ``dD`` are half of the differences, and
      ``c**2 = (sum(c_s**2) + 2 r sum(c_s c_(s+1))) g`` with the correlation ``r`` of neighbours and the
      allowance ``g`` for noise that outlasts a step;
    - ``u**2 = sum(c**2)`` over the sources, ``U = 2 u``. Figures that are differences (margin, residual)
      are rows of their own, so what two of their parts share cancels before it is squared.

    The half difference is exact to second order; ``(f+ + f- - 2 f)/2`` over ``u`` says how curved the
    figure is over the width of the most curved source.

    Parameters
    ----------
    chain : callable
        From a move to the figures of the machines that it touches, every decision frozen as in the base
        run. A random move shifts every step by the standard uncertainty of the step's own mean.
    base : mapping of machine to MachineFigures
        The base run.
    sources : sequence of Source
        In a fixed order; each is moved on its own.
    memory : mapping of source key to Memory
        Of random sources (:func:`step_memory`); a source that is missing has none.

    Returns
    -------
    dict of machine to MachineInfluences
        U is NaN where a figure is not known. Without sources U is zero.

    Source
    ------
    JCGM 100:2008, 5.1.2 and 5.1.3 note 2 (numerical sensitivity), 5.2 (correlated inputs), 6.2 (k = 2).
    """
    tables = {name: _Table.of(figures) for name, figures in base.items()}
    for source in sources:
        up, down = chain(Move(source.key, 1.0)), chain(Move(source.key, -1.0))
        for name in base:
            if name in up:
                tables[name].take(source, up[name], down[name], memory.get(source.key, _NO_MEMORY))
    return {name: table.influences() for name, table in tables.items()}


@dataclass
class _Table:
    """Influence table of one machine while it is being filled."""

    interval: _Figures
    period: _Figures
    interval_variance: Floats
    changes: list[tuple[Source, Floats]] = field(default_factory=list)
    bends: list[Floats] = field(default_factory=list)

    @classmethod
    def of(cls, base: MachineFigures) -> _Table:
        interval = _Figures.of(base.interval, base.steps_per_interval)
        period = _Figures.of(base.period, max(1, base.period.numerator.shape[1]))
        return cls(interval, period, np.zeros(interval.value.shape))

    def take(self, source: Source, up: MachineFigures, down: MachineFigures, memory: Memory) -> None:
        if source.kind == "random":
            self.interval_variance += self.interval.random_variance(up.interval, down.interval, memory)
            variance = self.period.random_variance(up.period, down.period, memory)
            self.changes.append((source, self._felt(np.sqrt(variance[:, 0]))))
            return
        change, _ = self.interval.common_change(up.interval, down.interval)
        self.interval_variance += change**2
        change, bend = self.period.common_change(up.period, down.period)
        self.changes.append((source, self._felt(change[:, 0])))
        self.bends.append(np.abs(self._felt(bend[:, 0])))

    def _felt(self, change: Floats) -> Floats:
        """Take changes in the last digits of a figure for what they are: rounding."""
        return np.where(np.abs(change) > _ROUNDING * np.abs(self.period.value[:, 0]), change, 0.0)

    def influences(self) -> MachineInfluences:
        keys = self.period.sums.keys
        known = np.isfinite(self.period.value[:, 0])
        variance = np.where(
            known, sum((change**2 for _, change in self.changes), np.zeros(len(keys))), np.nan
        )
        u = np.sqrt(variance)
        bend = np.max(self.bends, axis=0, initial=0.0) if self.bends else np.zeros(len(keys))
        curvature = np.divide(bend, u, out=np.zeros(len(keys)), where=u > 0.0)
        interval_u = np.sqrt(np.where(np.isfinite(self.interval.value), self.interval_variance, np.nan))
        return MachineInfluences(
            interval_U=dict(zip(self.interval.sums.keys, COVERAGE_FACTOR * interval_u, strict=True)),
            period_U=dict(zip(keys, (COVERAGE_FACTOR * u).tolist(), strict=True)),
            contributions={key: self._ranked(row, float(variance[row])) for row, key in enumerate(keys)},
            curvature=dict(zip(keys, curvature.tolist(), strict=True)),
        )

    def _ranked(self, row: int, variance: float) -> tuple[Contribution, ...]:
        """Contributions to one period figure, the largest first, those of nothing left out."""
        listed = [
            Contribution(source.key, float(change[row]), float(change[row] ** 2 / variance))
            for source, change in self.changes
            if variance > 0.0 and change[row] != 0.0
        ]
        return tuple(sorted(listed, key=lambda each: -each.share))


@dataclass(frozen=True)
class _Figures:
    """Figures of the base run over stretches of equal length: intervals, or the period as one."""

    sums: FigureSums
    steps: int
    """Steps in one stretch."""
    value: Floats
    """Shape (figures, stretches); NaN where the denominator is not positive."""
    bottom: Floats
    """Sum of the denominator over each stretch; 1 in rows of plain sums."""

    @classmethod
    def of(cls, sums: FigureSums, steps: int) -> _Figures:
        bottom = np.where(sums.plain_sum[:, None], 1.0, _by_stretch(sums.denominator, steps))
        value = _over(_by_stretch(sums.numerator, steps), bottom, bottom > 0.0)
        return cls(sums, steps, value, bottom)

    def common_change(self, up: FigureSums, down: FigureSums) -> tuple[Floats, Floats]:
        """Half difference and bend, ``(f+ - f-)/2`` and ``(f+ + f- - 2 f)/2``, of every stretch."""
        high, low = self._moved(up), self._moved(down)
        return 0.5 * (high - low), 0.5 * (high + low) - self.value

    def _moved(self, moved: FigureSums) -> Floats:
        bottom = np.where(self.sums.plain_sum[:, None], 1.0, _by_stretch(moved.denominator, self.steps))
        return _over(_by_stretch(moved.numerator, self.steps), bottom, self.bottom > 0.0)

    def random_variance(self, up: FigureSums, down: FigureSums, memory: Memory) -> Floats:
        """Variance of every stretch from independent shifts of its steps."""
        top = 0.5 * (up.numerator - down.numerator)
        below = 0.5 * (up.denominator - down.denominator)
        value, bottom = self._by_step(self.value), self._by_step(self.bottom)
        shift = _over(top - value * below, bottom, bottom > 0.0)
        variance = _by_stretch(shift**2, self.steps)
        if memory.neighbours:
            pairs = shift * np.roll(shift, -1, axis=1)
            last = np.arange(shift.shape[1]) % self.steps == self.steps - 1
            last[-1:] = True
            variance = variance + 2.0 * memory.neighbours * _by_stretch(
                np.where(last, 0.0, pairs), self.steps
            )
        # At most all steps of a stretch share one error: then the variance is that of one, times their count.
        return np.maximum(variance, 0.0) * min(memory.inflation, float(self.steps))

    def _by_step(self, of_stretch: Floats) -> Floats:
        if self.steps == 1:
            return of_stretch
        return np.repeat(of_stretch, self.steps, axis=1)[:, : self.sums.numerator.shape[1]]


def _by_stretch(by_step: Floats, steps: int) -> Floats:
    if steps == 1:
        return by_step
    return np.add.reduceat(by_step, np.arange(0, by_step.shape[1], steps), axis=1)


def _over(top: Floats, bottom: Floats, where: NDArray[np.bool_]) -> Floats:
    unknown: Floats = np.full(np.broadcast_shapes(top.shape, bottom.shape), np.nan)
    return np.divide(top, bottom, out=unknown, where=where)
