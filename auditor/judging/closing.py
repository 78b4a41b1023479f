"""Open balances: since when a residual leaves its uncertainty, and how much it is."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.records.findings import Finding, FindingCode
from auditor.records.verdicts import Closure, Status

if TYPE_CHECKING:
    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.period import Grid

_HEADLINES = ("gross", "net", "heat", "total")


def open_balance(machine: Machine, balance: MachineBalance, grid: Grid) -> list[Finding]:
    """Report a first-law balance that does not close, or closes only within 1.5 U.

    The finding starts on the first day from which on most days are open; the energy is the residual of
    the whole period. With one balance no meter can be accused, so there are no suspects.
    """
    if balance.closure not in (Closure.OPEN, Closure.WATCH):
        return []
    residual = balance.period["residual_J"]
    start_us = _open_since_us(balance, grid)
    return [
        Finding(
            FindingCode.OPEN_BALANCE,
            machine=machine.name,
            start_us=start_us,
            end_us=grid.period.end_us,
            energy_J=abs(residual.value),
            numbers={
                "residual_J": residual.value,
                "residual_U_J": residual.expanded_U,
                "open": float(balance.closure is Closure.OPEN),
            },
        )
    ]


def _open_since_us(balance: MachineBalance, grid: Grid) -> int:
    """Local midnight of the day on which the balance opened (start of the period if always open)."""
    figures = balance.interval
    residual = figures.values["residual_W"]
    U = balance.interval_U["residual_W"]
    known = np.isfinite(residual) & np.isfinite(U)
    day = np.searchsorted(grid.day_start_us, figures.start_us, side="right") - 1
    days = grid.day_start_us.size - 1
    sums = np.bincount(day[known], weights=residual[known], minlength=days)
    # Within a day the calibration part dominates and adds coherently: the sum of U bounds the day's U.
    limits = np.bincount(day[known], weights=U[known], minlength=days)
    is_open = np.abs(sums) > limits
    has_data = np.bincount(day[known], minlength=days) > 0
    # The best split: as many closed days before and open days after it as possible.
    score = np.where(has_data, np.where(is_open, 1, -1), 0)
    after = np.concatenate((np.cumsum(score[::-1])[::-1], [0]))
    before = np.concatenate(([0], np.cumsum(-score)))
    split = int(np.argmax(before + after))
    return int(grid.day_start_us[min(split, days - 1)])


def withheld_figures(machine: Machine, balance: MachineBalance) -> list[Finding]:
    """One finding per headline efficiency that is withheld, with the code of its reason."""
    found = []
    for key in _HEADLINES:
        figure = balance.period.get(key)
        if figure is None or figure.status is not Status.WITHHELD:
            continue
        found.append(
            Finding(
                FindingCode.WITHHELD_FIGURE,
                machine=machine.name,
                numbers={"coverage": figure.coverage},
                words={"figure": key, "because": figure.withheld_because},
            )
        )
    return found
