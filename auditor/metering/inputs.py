"""The one place where a number that has an uncertainty is read, moved or not.

A way of metering asks a :class:`Reader` for its tick means and assumed numbers. The reader adds the
move, if the number is the one that moves, and notes what was asked for. So a meter shared by two
streams moves both of them, and the list of what touches a stream cannot differ from what it is
computed from.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from auditor.metering.calibrations import moved_calibration
from auditor.metering.shifts import calibration_shift, random_shift
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.metering.metered import Metered
    from auditor.metering.settings import MeteringSettings
    from auditor.records.machines import Machine, Stream
    from auditor.records.powers import Move, PowerTable
    from auditor.records.ticks import TickTable
    from auditor.records.uncertain import Assumed


@dataclass(frozen=True)
class Inputs:
    """Everything that one run over the streams reads from."""

    ticks: TickTable
    settings: MeteringSettings
    running: Mapping[str, FloatArray]
    """Per machine, as :func:`auditor.metering.running.running_of` gives it; never moved."""
    move: Move | None = None
    base: PowerTable | None = None
    """The unmoved table; there in a moved run."""

    def moves(self, kind: str, name: str) -> bool:
        """Whether this source is the one that is moved."""
        return self.move is not None and self.move.source == f"{kind}:{name}"

    def moved_column(self, column: str) -> bool:
        """Whether the tag of a column is the one that is moved."""
        tag = self.settings.tags[self.ticks.tags[self.ticks.column(column)]]
        return moved_calibration(tag, self.move) is not None or self.moves("random", tag.name)

    def mean(self, column: str) -> FloatArray:
        """Tick means of a column [SI], shape (T,), with the move."""
        index = self.ticks.column(column)
        mean = self.ticks.mean[:, index]
        tag = self.settings.tags[self.ticks.tags[index]]
        if self.move is None:
            return mean
        moved = moved_calibration(tag, self.move)
        if moved is not None:
            holds = moved.holds(self.ticks.grid.start_us)
            shift = np.where(holds, calibration_shift(mean, moved.tag), 0.0)
        elif self.moves("random", tag.name):
            shift = random_shift(self.ticks, column)
        else:
            return mean
        if any(then.cut_off is not None for _, _, then in tag.stretches):
            # Below its cut-off a value is zero by declaration: which side it lies on is not moved.
            shift = np.where(mean == 0.0, 0.0, shift)
        return mean + self.move.direction * shift

    def number(self, assumed: Assumed) -> float:
        """Return an assumed number [SI], with the move."""
        if self.move is not None and self.moves("assumed", assumed.key):
            return assumed.value + self.move.direction * assumed.standard
        return assumed.value


def counted(ticks: TickTable, column: str, tick_coverage: float) -> NDArray[np.bool_]:
    """Ticks of a column that count: enough of them is covered and the mean is a number."""
    index = ticks.column(column)
    enough = ticks.covered_s[:, index] >= tick_coverage * ticks.grid.tick_s * (1.0 - 1e-9)
    counts: NDArray[np.bool_] = enough & np.isfinite(ticks.mean[:, index])
    return counts


class Reader:
    """Hands one stream its numbers and notes them; lives as long as that stream is being metered."""

    def __init__(self, inputs: Inputs, stream: Stream, done: Mapping[str, Metered]) -> None:
        self.stream = stream
        self.settings = inputs.settings
        self._inputs = inputs
        self._done = done
        self._columns: dict[str, None] = {}
        self._gates: dict[str, None] = {}
        self._assumed: dict[str, Assumed] = {}

    @property
    def machine(self) -> Machine:
        """The machine whose boundary the stream crosses."""
        return self.settings.machines[self.stream.machine]

    @property
    def start_us(self) -> NDArray[np.int64]:
        """Start of each tick, shape (T,)."""
        return self._inputs.ticks.grid.start_us

    def signed(self, metered: Metered) -> Metered:
        """Return what was metered together with what was asked for."""
        return replace(
            metered,
            columns=tuple(self._columns),
            gates=tuple(self._gates),
            assumed=tuple(self._assumed.values()),
        )

    def value(self, column: str) -> FloatArray:
        """Tick means of a column [SI], shape (T,)."""
        self._columns[column] = None
        return self._inputs.mean(column)

    def temperature_K(self, column: str) -> FloatArray:
        """Tick means of a temperature [K]; NaN where it is not above absolute zero."""
        kelvin = self.value(column)
        return np.where(kelvin > 0.0, kelvin, np.nan)

    def number(self, assumed: Assumed) -> float:
        """Return an assumed number [SI]."""
        self._assumed[assumed.key] = assumed
        return self._inputs.number(assumed)

    def other(self, key: str) -> Metered:
        """Another stream that this one is made of."""
        metered = self._done[key]
        self._columns.update(dict.fromkeys(metered.columns))
        self._gates.update(dict.fromkeys(metered.gates))
        self._assumed.update({assumed.key: assumed for assumed in metered.assumed})
        return metered

    def running(self) -> FloatArray:
        """1 where the stream's machine runs, 0 where it stands still, NaN where that is not known."""
        self._gates[self.machine.running.tick_column] = None
        return self._inputs.running[self.stream.machine]

    def still(self) -> NDArray[np.bool_]:
        """Where the stream's machine is known to stand still; not a condition for the rest of the time."""
        still: NDArray[np.bool_] = self._inputs.running[self.stream.machine] == 0.0
        return still

    def entropic_K(self, columns: tuple[str, ...], compute: Callable[[], FloatArray]) -> FloatArray:
        """Entropic mean of the stream: as in the unmoved run where none of its temperatures moves.

        It depends on these columns alone and is the dearest number of a stream of water.
        """
        base = self._inputs.base
        if base is None or any(self._inputs.moved_column(column) for column in columns):
            return compute()
        return base.entropic_K[self.stream.key]
