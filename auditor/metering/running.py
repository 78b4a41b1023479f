"""When a machine runs, tick by tick."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.metering.inputs import counted
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.records.machines import Running
    from auditor.records.plant import Rules
    from auditor.records.ticks import TickTable

_MOST_OF_THE_TICK = 0.5


def running_of(running: Running, ticks: TickTable, rules: Rules) -> FloatArray:
    """Whether a machine runs.

    Parameters
    ----------
    running : Running
        A tag above a value, judged on the tick mean; or a state that lasted half of the tick.
    ticks : TickTable
        The tick means.
    rules : Rules
        With the share of a tick that must be covered.

    Returns
    -------
    ndarray, shape (T,) [1]
        1 running, 0 standing still, NaN where the tag does not say.
    """
    column = running.tick_column
    mean = ticks.mean[:, ticks.column(column)]
    runs = mean >= _MOST_OF_THE_TICK if running.above is None else mean > running.above
    return np.where(counted(ticks, column, rules.tick_coverage), runs.astype(np.float64), np.nan)
