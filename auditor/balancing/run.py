"""From powers to figures: the base run, which freezes every decision, and moved runs, which keep them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.balancing.columns import Bools, Branches, Floats, machine_columns
from auditor.balancing.coverage import Coverage, cover
from auditor.balancing.figures import headline_key, recipes
from auditor.balancing.gates import is_steady, load, running_share, steps_per_interval
from auditor.balancing.layout import Layout, lay_out
from auditor.balancing.masks import FrozenSums, Steps, freeze
from auditor.records.balances import IntervalFigures, MachineFigures
from auditor.records.period import MICROSECONDS
from auditor.records.plant import Rules

if TYPE_CHECKING:
    from auditor.records.machines import Machine
    from auditor.records.plant import Plant, Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable


@dataclass(frozen=True)
class BalancingSettings:
    """The slice of the plant that balancing needs."""

    machines: Mapping[str, Machine]
    tags: Mapping[str, Tag]
    rules: Rules

    @classmethod
    def from_plant(cls, plant: Plant) -> BalancingSettings:
        """Take the slice from a plant."""
        return cls(plant.machines, plant.tags, plant.rules)


@dataclass(frozen=True)
class MachineRun:
    """Base run of one machine: its figures, and every decision that a moved run must keep."""

    layout: Layout
    branches: Branches
    sums: FrozenSums
    headline: str
    """Key of the figure whose inputs define the common ticks."""
    figures: MachineFigures
    interval: IntervalFigures
    coverage: Mapping[str, Coverage]
    """By key of the period figures."""
    slowest_input: str
    sources: frozenset[str]
    """Every source of uncertainty that touches one of its streams."""
    standstill_J: Mapping[str, float]
    running_s: float
    stopped_s: float
    unknown_s: float


@dataclass(frozen=True)
class BaseRun:
    """Base run of all machines."""

    machines: Mapping[str, MachineRun]
    rules: Rules

    @property
    def figures(self) -> dict[str, MachineFigures]:
        """Figures of every machine: what influences compare moved runs with."""
        return {name: run.figures for name, run in self.machines.items()}


def balance(powers: PowerTable, ticks: TickTable, settings: BalancingSettings) -> BaseRun:
    """Balance every machine: which ticks count for which figure, and the sums they give.

    A tick counts for a figure when all streams of the figure are known, or when the machine is known to
    stand still. Standstill counts as known, with zero for every stream: what its meters show then (creep,
    standby) is kept apart. Where the state is unknown but the streams are known, they count.

    Parameters
    ----------
    powers : PowerTable
        Base run of metering.
    ticks : TickTable
        For the steadiness tags and the native steps of the inputs.
    settings : BalancingSettings

    Returns
    -------
    BaseRun
        To be handed to :func:`rebalance` and :func:`finish`.
    """
    return BaseRun(
        machines={
            name: _run(machine, powers, ticks, settings) for name, machine in settings.machines.items()
        },
        rules=settings.rules,
    )


def rebalance(powers: PowerTable, base: BaseRun, source: str) -> dict[str, MachineFigures]:
    """Figures from powers with one source of uncertainty moved, every decision as in the base run.

    Masks, common ticks, gates and branches are those of the base run. Only machines that the source
    touches are computed and returned; the others have not moved.

    Parameters
    ----------
    powers : PowerTable
        Moved run of metering.
    base : BaseRun
    source : str
        Key of the source that was moved.

    Returns
    -------
    dict of machine to MachineFigures
    """
    moved = {}
    for name, run in base.machines.items():
        if source in run.sources:
            columns, _ = machine_columns(run.layout, powers, run.branches)
            moved[name] = run.sums.figures(name, columns)
    return moved


def _run(machine: Machine, powers: PowerTable, ticks: TickTable, settings: BalancingSettings) -> MachineRun:
    grid = powers.grid
    running = powers.running[machine.name]
    stopped = running == 0.0
    factor, slowest = steps_per_interval(machine, powers, ticks, settings.tags)
    steps = Steps(grid.ticks, grid.ticks_per_interval, factor, float(grid.tick_s))
    layout = lay_out(machine, settings.machines, powers)
    columns, branches = machine_columns(layout, powers, None)
    found = recipes(layout, columns)
    headline = headline_key(layout, [recipe.key for recipe in found])
    known = {name: np.isfinite(column) for name, column in columns.items()}
    sums, common = freeze(found, headline, known, stopped, steps)
    figures = sums.figures(machine.name, columns)
    streams = [(name, stream.key) for name, stream in machine.streams.items()]
    return MachineRun(
        layout=layout,
        branches=branches,
        sums=sums,
        headline=headline,
        figures=figures,
        interval=_interval_figures(
            figures, _Gates(machine, running, headline, common, ticks), sums, settings.rules
        ),
        coverage=cover(sums, columns, stopped, common),
        slowest_input=slowest,
        sources=frozenset().union(*(powers.sources[key] for _, key in streams)),
        standstill_J={name: _standstill_J(powers, key, stopped) for name, key in streams},
        running_s=float(np.count_nonzero(~stopped & np.isfinite(running))) * grid.tick_s,
        stopped_s=float(np.count_nonzero(stopped)) * grid.tick_s,
        unknown_s=float(np.count_nonzero(np.isnan(running))) * grid.tick_s,
    )


def _standstill_J(powers: PowerTable, key: str, stopped: Bools) -> float:
    power_W = powers.power_W[:, powers.streams.index(key)]
    return float(power_W[stopped & np.isfinite(power_W)].sum()) * powers.grid.tick_s


@dataclass(frozen=True)
class _Gates:
    """What the gates of the intervals are made of."""

    machine: Machine
    running: Floats
    headline: str
    common: Bools
    ticks: TickTable


def _interval_figures(
    figures: MachineFigures, gates: _Gates, sums: FrozenSums, rules: Rules
) -> IntervalFigures:
    """Values of every interval, where enough is known, with the gates beside them."""
    grid, steps = gates.ticks.grid, sums.steps
    start_us = grid.start_us[:: steps.ticks_per_step * steps.steps_per_interval]
    end_us = np.append(start_us[1:], grid.period.end_us)
    length_s = (end_us - start_us) / MICROSECONDS
    coverage = steps.by_interval(steps.by_step(gates.common)) * steps.tick_s / length_s
    stands_still = steps.by_interval(steps.by_step(gates.running != 0.0)) == 0.0
    values, entering_J = {}, np.zeros(length_s.shape)
    top = steps.by_interval(figures.interval.numerator)
    bottom = steps.by_interval(figures.interval.denominator)
    for place, row in enumerate(sums.rows):
        valid = bottom[place] > 0.0
        if row.recipe.is_power:
            # Standstill of a part must not pass for zero where the running part is not known.
            mask = sums.masks[row.interval_mask]
            live_s = steps.by_interval(mask.running_seconds)
            valid = valid & ((live_s > 0.0) | stands_still)
            # Nor may a mean over a few of the ticks that the interval's coverage tells of.
            own_share = steps.by_interval(mask.seconds) / length_s
            valid = valid & (own_share >= rules.interval_coverage * coverage)
        else:
            own_s = steps.by_interval(sums.masks[row.period_mask].seconds)
            valid = valid & (own_s / length_s >= rules.interval_coverage)
        value = np.full(length_s.shape, np.nan)
        np.divide(top[place], bottom[place], out=value, where=valid)
        values[row.recipe.key] = value
        if row.recipe.key == gates.headline:
            entering_J = top[place] if row.recipe.is_power else bottom[place]
    share = running_share(gates.running, steps)
    enough = coverage >= rules.interval_coverage
    return IntervalFigures(
        start_us=start_us,
        end_us=end_us,
        coverage=coverage,
        values=values,
        assessed=enough & ((entering_J > 0.0) | stands_still),
        running=share,
        load=load(gates.machine, values.get("work_gross_W"), length_s.shape[0]),
        steady=is_steady(gates.machine.steady, gates.ticks, steps, share),
        negative_input=entering_J < 0.0,
    )
