"""How much of a period a figure covers, by energy, and what may be published of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.verdicts import Status

if TYPE_CHECKING:
    from auditor.balancing.columns import Bools, Floats
    from auditor.balancing.masks import FrozenSums
    from auditor.records.plant import Rules


@dataclass(frozen=True)
class Coverage:
    """What stands behind one period figure."""

    share: float
    """By energy of the machine's input [1]."""
    logged: float
    """Energy over all ticks known to the figure [J]; NaN for ratios."""
    common: float
    """Energy over those of them that are common to all inputs of the headline [J]; NaN for ratios."""


def cover(
    sums: FrozenSums, columns: Mapping[str, Floats], stopped: Bools, common: Bools
) -> dict[str, Coverage]:
    """Coverage of every period figure of one machine.

    ``share = sum(w over ticks known to the figure) / sum(w over all ticks)``. The weight ``w`` of a tick is
    the machine's input (fuel and heat) where it is known, the mean running input where it is not, and zero
    while the machine is known to stand still. A machine that stood still all the time is covered in full.
    A machine whose input is never known is weighed by time.

    Parameters
    ----------
    sums : FrozenSums
        Figures and their masks.
    columns : mapping of str to ndarray, shape (T,)
        Columns of the machine [W].
    stopped, common : ndarray of bool, shape (T,)
        Known to stand still; common to all inputs of the headline figure.

    Returns
    -------
    dict of period key to Coverage
    """
    weight = _weights(columns, stopped)
    whole = float(weight.sum())
    covered = {}
    for row in sums.rows:
        live = sums.masks[row.period_mask].live
        share = min(float(weight[live].sum()) / whole, 1.0) if whole > 0.0 else 1.0
        recipe = row.recipe
        if not recipe.is_power:
            covered[recipe.key] = Coverage(share, np.nan, np.nan)
            continue
        energies = [
            sum(
                factor * float(np.where(ticks, columns[column], 0.0).sum()) * sums.steps.tick_s
                for column, factor in recipe.numerator.items()
            )
            for ticks in (live, live & common)
        ]
        covered[recipe.energy_key] = Coverage(share, *energies)
    return covered


def _weights(columns: Mapping[str, Floats], stopped: Bools) -> Floats:
    entering = [columns[name] for name in ("fuel", "heat") if name in columns]
    if not entering:
        return np.where(stopped, 0.0, 1.0)
    input_W = np.maximum(np.sum(entering, axis=0), 0.0)
    known = np.isfinite(input_W)
    running = input_W[known & ~stopped]
    usual = float(running.mean()) if running.size else 0.0
    if usual <= 0.0:
        return np.where(stopped, 0.0, 1.0)
    return np.where(stopped, 0.0, np.where(known, input_W, usual))


def status_of(share: float, rules: Rules) -> Status:
    """Firm, provisional or withheld by coverage."""
    if share >= rules.firm_coverage:
        return Status.FIRM
    return Status.PROVISIONAL if share >= rules.publish_coverage else Status.WITHHELD
