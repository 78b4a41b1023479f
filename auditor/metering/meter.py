"""From tick means to watts: the base run over all streams, and the runs with one source moved."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from auditor.metering.inputs import Inputs, Reader, counted
from auditor.metering.metered import Metered
from auditor.metering.noticed import findings_of
from auditor.metering.running import running_of
from auditor.metering.settings import MeteringSettings
from auditor.metering.sources import ordered_sources, sources_of
from auditor.metering.ways import WAYS, made_of
from auditor.physics.arrays import FloatArray
from auditor.records.powers import Move, PowerTable

if TYPE_CHECKING:
    from auditor.records.findings import Finding
    from auditor.records.machines import Stream
    from auditor.records.ticks import TickTable


def meter(ticks: TickTable, settings: MeteringSettings) -> tuple[PowerTable, tuple[Finding, ...]]:
    """Meter every stream of every machine.

    Parameters
    ----------
    ticks : TickTable
        Tick means in SI.
    settings : MeteringSettings
        The slice of the plant.

    Returns
    -------
    PowerTable
        Streams in the order of the plant file.
    tuple of Finding
        Heating values that changed, power shown at standstill, ticks that physics refuses.

    Raises
    ------
    ValueError
        If the plant contradicts itself: a check of the plant file let it through.
    PlantFileError
        If an oxygen tag is not stated to measure dry flue gas.
    """
    running = {
        name: running_of(machine.running, ticks, settings.rules)
        for name, machine in settings.machines.items()
    }
    streams = settings.streams()
    metered = _metered(streams, Inputs(ticks, settings, running))
    known = {key: _known(metered[key], ticks, settings) for key in streams}
    sources = {key: sources_of(metered[key], ticks, settings) for key in streams}
    table = PowerTable(
        grid=ticks.grid,
        streams=tuple(streams),
        power_W=_power_W(metered, known, ticks),
        known=np.array(list(known.values()), dtype=np.bool_).reshape(len(known), ticks.grid.ticks).T,
        lower_W=_collected("lower_W", metered, known),
        higher_W=_collected("higher_W", metered, known),
        exergy_W=_collected("exergy_W", metered, known),
        inlet_K=_collected("inlet_K", metered, known),
        outlet_K=_collected("outlet_K", metered, known),
        entropic_K=_collected("entropic_K", metered, known),
        running=running,
        sources=sources,
        all_sources=ordered_sources(metered, sources, settings),
        inputs={key: metered[key].inputs for key in streams},
        standstill_W={
            key: _standstill_mean_W(metered[key].power_W, known[key], running[stream.machine])
            for key, stream in streams.items()
        },
    )
    return table, findings_of(table, metered, ticks, settings)


def meter_moved(ticks: TickTable, settings: MeteringSettings, move: Move, base: PowerTable) -> PowerTable:
    """Meter again with one source of uncertainty moved.

    Only the streams that the source touches are computed anew. What is known, what runs and which
    heating value is valid stay as they are in ``base``. Where the moved number leaves the range of
    its physics (an oxygen reading pushed below zero), the move the other way is mirrored,
    ``2 f(x) - f(x - u)``, so that the influence is not lost.

    Parameters
    ----------
    ticks, settings
        As given to :func:`meter`.
    move : Move
        Source and direction.
    base : PowerTable
        What :func:`meter` gave.

    Returns
    -------
    PowerTable
        Shares every array that is not touched with ``base``.
    """
    touched = [key for key in base.streams if move.source in base.sources[key]]
    if not touched:
        return base
    inputs = Inputs(ticks, settings, base.running, move, base)
    moved = _metered(touched, inputs)
    opposite: Mapping[str, Metered] = {}
    if any(_leaves_range(moved[key], key, base) for key in touched):
        back = replace(inputs, move=replace(move, direction=-move.direction))
        opposite = _metered(touched, back)
    runs = _MovedRuns(tuple(touched), moved, opposite)
    power_W = base.power_W.copy(order="K")
    for key in touched:
        index = base.streams.index(key)
        power_W[:, index] = runs.settled("power_W", key, base.power_W[:, index], base.known[:, index])
    return replace(
        base,
        power_W=power_W,
        lower_W=_renewed("lower_W", runs, base),
        higher_W=_renewed("higher_W", runs, base),
        exergy_W=_renewed("exergy_W", runs, base),
        inlet_K=_renewed("inlet_K", runs, base),
        outlet_K=_renewed("outlet_K", runs, base),
        entropic_K=_renewed("entropic_K", runs, base),
    )


@dataclass(frozen=True)
class _MovedRuns:
    touched: tuple[str, ...]
    moved: Mapping[str, Metered]
    opposite: Mapping[str, Metered]
    """Moved the other way; empty where it is not needed."""

    def settled(self, name: str, key: str, base: FloatArray, known: NDArray[np.bool_]) -> FloatArray:
        """Keep to the ticks known in the base run; mirror the other run where a number left its range."""
        settled = np.where(known, getattr(self.moved[key], name), np.nan)
        if key not in self.opposite:
            return settled
        lost = known & np.isnan(settled)
        mirrored = 2.0 * base - getattr(self.opposite[key], name)
        return np.where(lost, np.where(np.isnan(mirrored), base, mirrored), settled)


def _renewed(name: str, runs: _MovedRuns, base: PowerTable) -> dict[str, FloatArray]:
    values: dict[str, FloatArray] = dict(getattr(base, name))
    for key in runs.touched:
        if key in values:
            known = base.known[:, base.streams.index(key)]
            values[key] = runs.settled(name, key, values[key], known)
    return values


def _metered(keys: Iterable[str], inputs: Inputs) -> dict[str, Metered]:
    """Meter the streams and whatever they are made of, each after what it is made of."""
    streams = inputs.settings.streams()
    done: dict[str, Metered] = {}
    for key in _in_order(keys, streams):
        stream = streams[key]
        read = Reader(inputs, stream, done)
        done[key] = read.signed(WAYS[type(stream.way)](stream.way, read))
    return done


def _in_order(keys: Iterable[str], streams: Mapping[str, Stream]) -> tuple[str, ...]:
    order: dict[str, None] = {}
    for key in keys:
        chain = [key]
        while (earlier := made_of(streams[chain[-1]])) is not None:
            if earlier in chain:
                raise ValueError(f"streams made of each other: {' -> '.join([*chain, earlier])}")
            chain.append(earlier)
        order.update(dict.fromkeys(reversed(chain)))
    return tuple(order)


def _known(metered: Metered, ticks: TickTable, settings: MeteringSettings) -> NDArray[np.bool_]:
    known: NDArray[np.bool_] = np.isfinite(metered.power_W)
    for column in metered.inputs:
        known = known & counted(ticks, column, settings.rules.tick_coverage)
    return known


def _where(known: NDArray[np.bool_], values: FloatArray) -> FloatArray:
    return np.where(known, values, np.nan)


def _power_W(
    metered: Mapping[str, Metered], known: Mapping[str, NDArray[np.bool_]], ticks: TickTable
) -> FloatArray:
    # Stored stream by stream, shown tick by tick: whoever takes one stream gets one piece of memory.
    rows = np.empty((len(known), ticks.grid.ticks))
    for index, (key, counts) in enumerate(known.items()):
        rows[index] = _where(counts, metered[key].power_W)
    return rows.T


def _collected(
    name: str, metered: Mapping[str, Metered], known: Mapping[str, NDArray[np.bool_]]
) -> dict[str, FloatArray]:
    values = {key: getattr(metered[key], name) for key in known}
    return {key: _where(known[key], array) for key, array in values.items() if array is not None}


def _standstill_mean_W(power_W: FloatArray, known: NDArray[np.bool_], running: FloatArray) -> float:
    still = known & (running == 0.0)
    return float(np.mean(power_W[still])) if still.any() else float("nan")


def _leaves_range(moved: Metered, key: str, base: PowerTable) -> bool:
    known = base.known[:, base.streams.index(key)]
    return bool((known & np.isnan(moved.power_W)).any())
