"""What balancing and influences give: interval and period figures of every machine, with U."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.verdicts import Closure, Status


@dataclass(frozen=True)
class IntervalFigures:
    """Figures of one machine by interval. Keys of ``values`` are keys of the nomenclature.

    Powers are means over those ticks of the interval that are common to all inputs of the headline figure
    (known standstill counts, with zero); where there is no such tick, over the ticks known to the figure
    itself. Where none of them runs although the machine does, the power is not known: standstill of a part
    does not pass for zero. A power that knows fewer of these ticks than the rule's share is NaN.

    Ratios are sums over sums, over all ticks known to the figure, and NaN where these cover less of the
    interval than the rule asks. A figure that the machine cannot have has no key.
    """

    start_us: NDArray[np.int64]
    """Shape (I,)."""
    end_us: NDArray[np.int64]
    coverage: NDArray[np.float64]
    """Share of the interval's ticks that is common to all inputs of the headline figure [1]."""
    values: Mapping[str, NDArray[np.float64]]
    assessed: NDArray[np.bool_]
    """Coverage reaches the rule, and the denominator is positive or the machine stands still throughout."""
    running: NDArray[np.float64]
    """Share of the ticks of known state that run; NaN when no tick's state is known."""
    load: NDArray[np.float64]
    """Mean gross power over rated power [1]; NaN without either."""
    steady: NDArray[np.bool_]
    """True where the machine has no steadiness rule."""
    negative_input: NDArray[np.bool_]


@dataclass(frozen=True)
class PeriodFigure:
    """One figure of one machine over the whole period."""

    key: str
    """Key of the nomenclature."""
    value: float
    """SI; NaN when nothing is known."""
    expanded_U: float
    """Expanded uncertainty, k = 2, SI; NaN when not known."""
    coverage: float
    """Coverage by energy [1] (of the stream, or of the common ticks for a ratio)."""
    status: Status
    withheld_because: str
    """A short code for the reason, empty if not withheld: ``coverage``, ``not testable``, ``no input``..."""
    logged: float
    """Energy over all known ticks of the stream(s) but known standstill, SI; NaN for ratios."""
    common: float
    """Energy over the ticks common to all inputs of the headline figure, SI; NaN for ratios."""


@dataclass(frozen=True)
class FigureSums:
    """Sums over time that figures are made of, by step of the site's interval.

    Every figure is ``sum(numerator) / sum(denominator)`` over the steps that it covers: a mean power is
    energy over seconds, an efficiency energy over energy, a ceiling heat times ceiling over heat. Kept by
    step, so that figures of any number of steps and the part of each step in them follow by addition.
    """

    keys: tuple[str, ...]
    """Keys of the nomenclature, one per row."""
    numerator: NDArray[np.float64]
    """Shape (figures, steps)."""
    denominator: NDArray[np.float64]
    """Shape (figures, steps); zero in rows of ``plain_sum``."""
    plain_sum: NDArray[np.bool_]
    """Rows that are the sum of the numerator itself (energies), shape (figures,)."""


@dataclass(frozen=True)
class MachineFigures:
    """Figures of one machine in one run of the chain, base or moved, as sums by step."""

    machine: str
    interval: FigureSums
    period: FigureSums
    steps_per_interval: int
    """Steps (site intervals) in one interval of this machine."""


@dataclass(frozen=True)
class Contribution:
    """Share of one source of uncertainty in one period figure."""

    source: str
    """Key of a source."""
    change: float
    """Change of the figure when the source moves by its standard uncertainty, SI, signed.

    Of a random source, whose shifts differ from time to time, the magnitude.
    """
    share: float
    """Share of the variance [1]."""


@dataclass(frozen=True)
class MachineInfluences:
    """What the sources of uncertainty do to the figures of one machine, all of them together."""

    interval_U: Mapping[str, NDArray[np.float64]]
    """Expanded uncertainty (k = 2) by figure key, shape (I,), SI."""
    period_U: Mapping[str, float]
    """Expanded uncertainty (k = 2) by figure key, SI."""
    contributions: Mapping[str, tuple[Contribution, ...]]
    """Per period figure, largest share first."""
    curvature: Mapping[str, float]
    """Per period figure: ``(f+ + f- - 2 f0)/2`` over ``u``, the largest of any source [1]."""


@dataclass(frozen=True)
class MachineBalance:
    """Everything that balancing and influences say about one machine."""

    machine: str
    interval: IntervalFigures
    interval_U: Mapping[str, NDArray[np.float64]]
    """Expanded uncertainty (k = 2) by figure key, shape (I,), SI."""
    period: Mapping[str, PeriodFigure]
    contributions: Mapping[str, tuple[Contribution, ...]]
    """Per period figure, largest share first."""
    curvature: Mapping[str, float]
    """Per period figure: ``(f+ + f- - 2 f0)/2`` over ``u``, the largest of any source [1]."""
    closure: Closure
    interval_s: float
    """Length of its intervals: the site's, or longer where an input is slower."""
    slowest_input: str
    """The tag that decides it; empty when it is the site's interval."""
    running_s: float
    stopped_s: float
    unknown_s: float
    standstill_J: Mapping[str, float]
    """Per stream (by its name): energy its meters show while the machine is known to stand still.

    Kept out of every figure above and printed beside them.
    """
