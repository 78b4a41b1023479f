"""Balancing: from the powers of streams to the figures of machines, interval by interval and for the period.

One base run freezes every decision (which ticks count, which formula applies); moved runs repeat only the
arithmetic. All figures are sums over sums, so that parts of a period add up to it.
"""

from __future__ import annotations

from auditor.balancing.finish import finish
from auditor.balancing.run import BalancingSettings, BaseRun, balance, rebalance

__all__ = ["BalancingSettings", "BaseRun", "balance", "finish", "rebalance"]
