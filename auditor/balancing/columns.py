"""Columns of one machine on the tick grid: the quantities that all its figures are sums of."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import reduce
from typing import TYPE_CHECKING, TypeAlias

import numpy as np
from numpy.typing import NDArray

from auditor.physics import (
    carnot_ceiling,
    ceiling_exists,
    entropy_flow_W_per_K,
    mean_temperature_of_heats_K,
)
from auditor.records.machines import CeilingKind, Role

if TYPE_CHECKING:
    from auditor.balancing.layout import Layout
    from auditor.records.powers import PowerTable

Floats: TypeAlias = NDArray[np.float64]
Bools: TypeAlias = NDArray[np.bool_]


@dataclass(frozen=True)
class Branches:
    """Choices between two formulas that a moved run must not make anew, shape (T,)."""

    demanded: Bools
    """The second law demands a rejection above zero."""
    hot_end: Bools
    """The hot ends of an exchanger's sides are nearer to crossing than the cold ends."""


def machine_columns(
    layout: Layout, powers: PowerTable, branches: Branches | None
) -> tuple[dict[str, Floats], Branches]:
    """Every column of one machine at every tick; NaN where an input is not known.

    ========================  =====================================================================
    fuel, heat, power_in ...  sums of the streams with that role [W]
    fuel_lower, fuel_higher   fuel on the other heating values [W]
    fuel_exergy               chemical exergy of the fuel [W]
    ceiling_work              most work the ceiling allows, ceiling times entering heat [W]
    source_heat, sink_heat    temperature of source and sink times the entering heat [W K]
    demanded                  rejection that the second law demands [W]
    entropy                   entropy generation, ``sum(Q_out/T_out) - sum(Q_in/T_in)`` [W/K]
    crossing                  how far the sides of an exchanger cross [K]
    ========================  =====================================================================

    Parameters
    ----------
    layout : Layout
    powers : PowerTable
        Base or moved run.
    branches : Branches or None
        Those of the base run when this is a moved one. Without them they are found here, and
        ``ceiling_work`` is NaN where the source is not hotter than the sink: there is no ceiling.

    Returns
    -------
    (columns, branches)
        Arrays of shape (T,) by column name.
    """
    columns = {
        column: _total(powers.power_W[:, place] for _, place in places)
        for column, places in layout.places.items()
    }
    columns |= _fuel_columns(layout, powers)
    nowhere = np.zeros(powers.grid.ticks, dtype=bool)
    demanded = hot_end = nowhere
    if layout.ceiling is not None and layout.ceiling.kind is CeilingKind.FUEL_EXERGY:
        # Combustion air that enters warm (or cold) counts as heat in; no heat is worth more than itself.
        columns["ceiling_work"] = columns["fuel_exergy"] + np.abs(columns.get("heat", 0.0))
    elif layout.ceiling is not None:
        hot_K, cold_K = _reservoirs_K(layout, powers)
        columns["source_heat"] = hot_K * columns["heat"]
        columns["sink_heat"] = cold_K * columns["heat"]
        work_W = carnot_ceiling(hot_K, cold_K) * columns["heat"]
        columns["ceiling_work"] = (
            np.where(ceiling_exists(hot_K, cold_K), work_W, np.nan) if branches is None else work_W
        )
        if layout.rejection_demanded:
            demanded_W = _demanded_W(layout, powers, hot_K, cold_K)
            # A smallest rejection below zero is none; a NaN stays one.
            demanded = ~(demanded_W <= 0.0) if branches is None else branches.demanded
            columns["demanded"] = np.where(demanded, demanded_W, 0.0)
    if layout.entropy:
        columns["entropy"] = _entropy_W_per_K(layout, powers)
    if layout.exchanger:
        hot_end_K, cold_end_K = _crossings_K(layout, powers)
        hot_end = hot_end_K > cold_end_K if branches is None else branches.hot_end
        columns["crossing"] = np.where(hot_end, hot_end_K, cold_end_K)
    return columns, branches or Branches(demanded, hot_end)


def _total(parts: Iterable[Floats]) -> Floats:
    return reduce(np.add, parts)


def _fuel_columns(layout: Layout, powers: PowerTable) -> dict[str, Floats]:
    """Fuel on its other bases, where every fuel stream has them."""
    fuels = layout.keys_of("fuel")
    tables = {"fuel_lower": powers.lower_W, "fuel_higher": powers.higher_W, "fuel_exergy": powers.exergy_W}
    return {
        column: _total(table[key] for key in fuels)
        for column, table in tables.items()
        if fuels and all(key in table for key in fuels)
    }


def _reservoirs_K(layout: Layout, powers: PowerTable) -> tuple[Floats, Floats]:
    """Temperatures of source and sink that the ceiling stands on.

    Two reservoirs: the hottest at which heat enters and the coldest at which it can leave, the inlets of
    the streams. Finite: the entropic means; several sinks as ``sum(Q) / sum(Q / T)``.
    """
    machine, ceiling = layout.machine, layout.ceiling
    assert ceiling is not None and ceiling.source is not None
    source = machine.streams[ceiling.source].key
    sinks = tuple(machine.streams[name].key for name in ceiling.sinks)
    if ceiling.kind is CeilingKind.TWO_RESERVOIRS:
        return powers.inlet_K[source], reduce(np.minimum, (powers.inlet_K[key] for key in sinks))
    return powers.entropic_K[source], _mean_K(sinks, powers)


def _mean_K(keys: tuple[str, ...], powers: PowerTable) -> Floats:
    if len(keys) == 1:
        return powers.entropic_K[keys[0]]
    heats = np.stack([powers.power_W[:, powers.streams.index(key)] for key in keys])
    return mean_temperature_of_heats_K(heats, np.stack([powers.entropic_K[key] for key in keys]))


def _demanded_W(layout: Layout, powers: PowerTable, hot_K: Floats, cold_K: Floats) -> Floats:
    """``T_0 (Q_h / T_h - sum(Q_u / T_u))``: what must leave at the temperature of the rejecting sinks.

    Left negative where useful heat alone carries more entropy away than comes in.
    """
    ceiling = layout.ceiling
    assert ceiling is not None
    rejecting = tuple(
        stream.key
        for stream in (layout.machine.streams[name] for name in ceiling.sinks)
        if stream.role is Role.REJECTED_HEAT
    )
    if rejecting and len(rejecting) < len(ceiling.sinks) and ceiling.kind is CeilingKind.FINITE:
        cold_K = _mean_K(rejecting, powers)
    entering = _total(
        entropy_flow_W_per_K(powers.power_W[:, place], hot_K) for _, place in layout.places["heat"]
    )
    demanded_W: Floats = cold_K * (entering - _flows_W_per_K(layout, powers, "useful"))
    return demanded_W


def _flows_W_per_K(layout: Layout, powers: PowerTable, column: str) -> Floats:
    """Entropy that the streams of one role column carry; zero without streams."""
    nothing = np.zeros(powers.grid.ticks)
    flows = (
        entropy_flow_W_per_K(powers.power_W[:, place], powers.entropic_K[key])
        for key, place in layout.places.get(column, ())
    )
    return reduce(np.add, flows, nothing)


def _entropy_W_per_K(layout: Layout, powers: PowerTable) -> Floats:
    """Entropy leaving less entropy entering.

    Losses have no thermometer. They are taken to leave at the coldest temperature of the machine's
    streams, where they carry the most: for want of a thermometer entropy must not seem to fall.
    """
    leaving = _flows_W_per_K(layout, powers, "useful") + _flows_W_per_K(layout, powers, "rejected")
    if "loss" in layout.places:
        thermal = [key for column in ("heat", "useful", "rejected") for key in layout.keys_of(column)]
        ends = (table[key] for key in thermal for table in (powers.inlet_K, powers.outlet_K))
        coldest_K = reduce(np.fmin, ends)
        loss_W = _total(powers.power_W[:, place] for _, place in layout.places["loss"])
        leaving = leaving + entropy_flow_W_per_K(loss_W, coldest_K)
    return leaving - _flows_W_per_K(layout, powers, "heat")


def _crossings_K(layout: Layout, powers: PowerTable) -> tuple[Floats, Floats]:
    """How far the warmed side is above the warming one, at the hot ends and at the cold ends.

    In counterflow the warmed stream may leave hotter than the warming one leaves; never hotter than that
    one enters, nor may that one leave colder than the warmed stream enters. Which end of a shared stream
    is its inlet depends on the machine it is seen from, so the ends are told by their temperatures.
    """
    hot, cold = layout.keys_of("heat"), layout.keys_of("useful")

    def hottest(keys: tuple[str, ...]) -> Floats:
        return reduce(np.maximum, [np.maximum(powers.inlet_K[key], powers.outlet_K[key]) for key in keys])

    def coldest(keys: tuple[str, ...]) -> Floats:
        return reduce(np.minimum, [np.minimum(powers.inlet_K[key], powers.outlet_K[key]) for key in keys])

    return hottest(cold) - hottest(hot), coldest(cold) - coldest(hot)
