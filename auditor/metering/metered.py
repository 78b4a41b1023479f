"""What one way of metering gives for one stream."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from auditor.physics.arrays import FloatArray
    from auditor.records.uncertain import Assumed


@dataclass(frozen=True)
class Metered:
    """Powers and temperatures of one stream on the tick grid, each of shape (T,)."""

    power_W: FloatArray
    """Positive in the direction of the stream's role; NaN where an input has no number."""
    lower_W: FloatArray | None = None
    higher_W: FloatArray | None = None
    exergy_W: FloatArray | None = None
    inlet_K: FloatArray | None = None
    outlet_K: FloatArray | None = None
    entropic_K: FloatArray | None = None
    fuel: str | None = None
    """Name of the fuel, for streams of gas."""
    fuel_m3_per_s: FloatArray | None = None
    """Its volume flow at the fuel's reference state."""
    columns: tuple[str, ...] = ()
    """Columns whose numbers it was made of, in the order they were asked for."""
    gates: tuple[str, ...] = ()
    """Columns that only decided whether the machine runs; no uncertainty comes from them."""
    assumed: tuple[Assumed, ...] = ()
    """Assumed numbers that it was made of."""

    @property
    def inputs(self) -> tuple[str, ...]:
        """All columns of the tick table that must count for the stream to be known."""
        return tuple(dict.fromkeys((*self.columns, *self.gates)))
