"""What metering gives: watts of every stream that crosses a boundary, with its temperatures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.period import Grid

SourceKind = Literal["calibration", "random", "assumed"]


@dataclass(frozen=True)
class Source:
    """One source of uncertainty: a tag's calibration part, its random part, or an assumed number."""

    key: str
    """``calibration:TAG``, ``random:TAG`` or ``assumed:PLANT.FILE.KEY``; another instrument under the same
    tag has a calibration of its own, ``calibration:TAG@2026-07-10``."""
    kind: SourceKind
    name: str
    """The tag, or the key in the plant file."""


@dataclass(frozen=True)
class Move:
    """A source moved by ``direction`` times its standard uncertainty; what influences are made of."""

    source: str
    """Key of a :class:`Source`."""
    direction: float
    """+1.0 or -1.0."""


@dataclass(frozen=True)
class PowerTable:
    """Power of every stream on the tick grid, in watts, positive in the direction of its role.

    ``known[t, s]`` is true where every input of the stream counts (tick coverage) and gave a number;
    ``power_W`` is NaN elsewhere. While its machine is known to stand still, the power is what the
    meters say (creep included); balancing decides what counts.
    """

    grid: Grid
    streams: tuple[str, ...]
    """``machine.stream`` keys; a ``same_as`` stream repeats the numbers of the stream it points at."""
    power_W: NDArray[np.float64]
    """Shape (T, streams); of fuels on the machine's declared basis."""
    known: NDArray[np.bool_]
    """Shape (T, streams)."""
    lower_W: Mapping[str, NDArray[np.float64]]
    """Fuel streams: power on the lower heating value, shape (T,), where declared."""
    higher_W: Mapping[str, NDArray[np.float64]]
    """Fuel streams: power on the higher heating value, shape (T,), where declared."""
    exergy_W: Mapping[str, NDArray[np.float64]]
    """Fuel streams with a declared exergy ratio: chemical exergy per second, shape (T,)."""
    inlet_K: Mapping[str, NDArray[np.float64]]
    """Streams with temperatures, shape (T,)."""
    outlet_K: Mapping[str, NDArray[np.float64]]
    entropic_K: Mapping[str, NDArray[np.float64]]
    """Entropic mean temperature, dh/ds between inlet and outlet, shape (T,)."""
    running: Mapping[str, NDArray[np.float64]]
    """Per machine: 1 running, 0 standing still, NaN unknown, shape (T,)."""
    sources: Mapping[str, frozenset[str]]
    """Per stream: keys of every source of uncertainty that touches it."""
    all_sources: tuple[Source, ...]
    """Every source, in a fixed order: tags in the order of the plant file, then assumed numbers."""
    inputs: Mapping[str, tuple[str, ...]]
    """Per stream: the columns of the tick table that it is made of."""
    standstill_W: Mapping[str, float]
    """Per stream: mean power shown while the machine stands still (creep), NaN if it never does."""
