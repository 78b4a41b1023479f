"""Events of one tag in order, and what a distrusted time does to the stretches between them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray


@dataclass(frozen=True)
class Chain:
    """Events of one tag in order: every stretch between neighbours belongs to one of them."""

    instants_us: NDArray[np.int64]
    values: NDArray[np.float64]
    """SI; without meaning where the event is a rejected cell."""
    good: NDArray[np.bool_] | None
    """Accepted samples; None: all."""

    def ends_us(self, hold_us: int) -> NDArray[np.int64]:
        """Return where each stretch ends: at the next event, at most a hold later."""
        return self.instants_us[:-1] + np.minimum(np.diff(self.instants_us), hold_us)


def broken_chain(
    chain: Chain, moments_us: list[int], hold_us: int, between: Literal["step", "line"]
) -> tuple[Chain, NDArray[np.int64]] | None:
    """Put a rejected event into each stretch in which a distrusted time begins.

    The new event takes over the rest of the stretch, so that of a step what lies before it stays. Of a line
    nothing stays, as a line needs both its ends.

    Parameters
    ----------
    chain
        The events.
    moments_us
        When the distrusted times begin, rising.
    hold_us
        Longest stretch that an event covers.
    between
        Whether values hold like steps or run in lines.

    Returns
    -------
    tuple or None
        The new chain and the ends of its stretches; None when none of the moments lies in a stretch.
    """
    ends_us = chain.ends_us(hold_us)
    if between == "line":
        ends_us = np.where(ends_us == chain.instants_us[1:], ends_us, chain.instants_us[:-1])
    moments = np.array(moments_us, dtype=np.int64)
    after = np.searchsorted(chain.instants_us, moments, side="left")
    bounded = (after > 0) & (after < chain.instants_us.size)
    moments, after = moments[bounded], after[bounded]
    inside = (moments < ends_us[after - 1]) & (moments != chain.instants_us[after])
    if not inside.any():
        return None
    moments, after = moments[inside], after[inside]
    good = np.ones(chain.instants_us.size, dtype=np.bool_) if chain.good is None else chain.good
    broken = Chain(
        np.insert(chain.instants_us, after, moments),
        np.insert(chain.values, after, np.nan),
        np.insert(good, after, False),
    )
    if between == "line":
        return broken, broken.ends_us(hold_us)
    return broken, np.minimum(np.insert(ends_us, after, ends_us[after - 1]), broken.instants_us[1:])
