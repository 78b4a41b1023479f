"""The last step of balancing: figures and influences put together, with status and closure."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.balancing.coverage import status_of
from auditor.records.balances import MachineBalance, PeriodFigure
from auditor.records.verdicts import Closure, Status

if TYPE_CHECKING:
    from auditor.balancing.coverage import Coverage
    from auditor.balancing.run import BaseRun, MachineRun
    from auditor.records.balances import MachineInfluences
    from auditor.records.plant import Rules

_CEILING_FIGURES = ("ceiling", "margin", "ceiling_share")

_WATCH = 1.5
"""A residual up to this many U is watched, not called open."""


def finish(base: BaseRun, influences: Mapping[str, MachineInfluences]) -> dict[str, MachineBalance]:
    """Put the base run and the influences together into what is published.

    Parameters
    ----------
    base : BaseRun
    influences : mapping of machine to MachineInfluences
        Of the same base run.

    Returns
    -------
    dict of machine to MachineBalance
    """
    return {name: _finish(run, influences[name], base.rules) for name, run in base.machines.items()}


def _finish(run: MachineRun, influence: MachineInfluences, rules: Rules) -> MachineBalance:
    interval_U = {
        key: np.where(np.isfinite(value), influence.interval_U[key], np.nan)
        for key, value in run.interval.values.items()
    }
    values = period_values(run)
    period = {
        key: _period_figure(key, value, influence.period_U[key], run.coverage[key], rules)
        for key, value in values.items()
    }
    if np.isfinite(values.get("source_temperature_K", np.nan)):
        period |= {key: _without_ceiling(period[key]) for key in _CEILING_FIGURES if key in period}
    if not run.layout.testable:
        period["residual_J"] = PeriodFigure(
            "residual_J", np.nan, np.nan, 0.0, Status.WITHHELD, "not testable", np.nan, np.nan
        )
    steps = run.sums.steps
    return MachineBalance(
        machine=run.figures.machine,
        interval=run.interval,
        interval_U=interval_U,
        period=period,
        contributions={key: influence.contributions[key] for key in period if key in influence.contributions},
        curvature={key: influence.curvature[key] for key in period if key in influence.curvature},
        closure=_closure(period.get("residual_J")),
        interval_s=steps.tick_s * steps.ticks_per_step * steps.steps_per_interval,
        slowest_input=run.slowest_input,
        running_s=run.running_s,
        stopped_s=run.stopped_s,
        unknown_s=run.unknown_s,
        standstill_J=run.standstill_J,
    )


def period_values(run: MachineRun) -> dict[str, float]:
    """Value of every period figure: sums over sums; NaN where the denominator is not positive.

    Halves of a period add up to it, because everything is a sum over ticks.
    """
    sums = run.figures.period
    top, bottom = sums.numerator.sum(axis=1), sums.denominator.sum(axis=1)
    values = np.full(top.shape, np.nan)
    np.divide(top, bottom, out=values, where=bottom > 0.0)
    values = np.where(sums.plain_sum, top, values)
    return {key: float(value) for key, value in zip(sums.keys, values, strict=True) if key != "crossing_K"}


def _period_figure(key: str, value: float, U: float, coverage: Coverage, rules: Rules) -> PeriodFigure:
    status = status_of(coverage.share, rules)
    because = "coverage" if status is Status.WITHHELD else ""
    if status is not Status.WITHHELD and not np.isfinite(value):
        status, because = Status.WITHHELD, "no input"
    return PeriodFigure(key, value, U, coverage.share, status, because, coverage.logged, coverage.common)


def _without_ceiling(figure: PeriodFigure) -> PeriodFigure:
    """Name the true reason where temperatures are known, but the source is not hotter than the sink."""
    if np.isfinite(figure.value):
        return figure
    return replace(figure, status=Status.WITHHELD, withheld_because="no ceiling")


def _closure(residual: PeriodFigure | None) -> Closure:
    """Judge the residual of the period by its own U."""
    if residual is None or residual.status is Status.WITHHELD or not np.isfinite(residual.expanded_U):
        return Closure.NOT_TESTABLE
    if abs(residual.value) <= residual.expanded_U:
        return Closure.CLOSES
    return Closure.WATCH if abs(residual.value) <= _WATCH * residual.expanded_U else Closure.OPEN
