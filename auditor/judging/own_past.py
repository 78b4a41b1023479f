"""Meters of a machine whose ratio to all others changes at one moment by a familiar factor."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from itertools import combinations
from typing import TYPE_CHECKING

from auditor.judging.familiar import OF_FLOW, OF_POWER, Familiar, candidates, named, of_fuel
from auditor.judging.ratio_steps import RatioStep, ratio_steps
from auditor.judging.series import interval_pair
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import FlowAndTemperatures, GasVolume, LiquidFuel, Power, Role, SameAs, Shaft

if TYPE_CHECKING:
    from collections.abc import Mapping

    from auditor.records.machines import Machine, Stream
    from auditor.records.plant import Fuel
    from auditor.records.powers import PowerTable

_ROLES = (Role.FUEL_IN, Role.HEAT_IN, Role.WORK_OUT, Role.USEFUL_HEAT)
"""Streams that rise and fall together; what is rejected or used by auxiliaries goes its own way."""
_SAME_MOMENT_US = 6 * 3_600_000_000
"""Steps of several ratios within this time are one event."""
_FINEST = 1e-3
"""A ratio of two logged numbers is not taken as known better than this: their last digits."""


@dataclass(frozen=True)
class Meter:
    """A measured stream: by which tag its size is logged, and which ratios its mistakes leave behind."""

    key: str
    """``machine.stream``."""
    tag: str
    machine: str
    familiar: tuple[Familiar, ...]


@dataclass(frozen=True)
class _Seen:
    """A step in the ratio of two meters."""

    pair: tuple[str, str]
    at_us: int
    step: RatioStep

    def reading(self, key: str) -> RatioStep:
        """Return the step as the change of one of the two meters' reading, the other taken as right."""
        if key == self.pair[0]:
            return self.step
        inverse = 1.0 / self.step.factor
        return replace(self.step, factor=inverse, factor_U=self.step.factor_U * inverse**2)


def own_past_questions(
    machines: Mapping[str, Machine], fuels: Mapping[str, Fuel], powers: PowerTable, coverage: float
) -> list[Finding]:
    """Find meters that read a familiar factor more or less from one moment on.

    Every two measured streams of a machine are compared. The suspects of a moment are the streams whose
    ratios changed to all others; with two streams only, either may be at fault and both are named.
    """
    meters: dict[str, Meter] = {}
    judged: set[tuple[str, str]] = set()
    seen: list[_Seen] = []
    for machine in machines.values():
        mine = [
            meter for stream in machine.streams_of(*_ROLES) if (meter := meter_of(stream, machines, fuels))
        ]
        meters |= {meter.key: meter for meter in mine}
        running = powers.running[machine.name] == 1.0
        for top, bottom in combinations(mine, 2):
            names = (top.key, bottom.key)
            if top.tag == bottom.tag or names in judged:
                continue
            watts = [powers.power_W[:, powers.streams.index(key)] for key in names]
            pair = interval_pair(powers.grid, watts[0], watts[1], running, coverage)
            if not pair.times_us.size:
                continue
            judged.add(names)
            seen += [
                _Seen(names, int(pair.times_us[step.index]), step)
                for step in ratio_steps(pair.times_us, pair.first, pair.second)
            ]
    found = [_question(event, judged, meters) for event in _events(seen)]
    asked = [question for question in found if question is not None]
    return [replace(question, end_us=_until(question, asked, powers)) for question in asked]


def _until(question: Finding, asked: list[Finding], powers: PowerTable) -> int:
    """Start of the next question about the same tag, or the end of the period."""
    later = [
        other.start_us
        for other in asked
        if other.tag == question.tag and other.start_us and other.start_us > (question.start_us or 0)
    ]
    return min(later, default=powers.grid.period.end_us)


def meter_of(stream: Stream, machines: Mapping[str, Machine], fuels: Mapping[str, Fuel]) -> Meter | None:
    """Find the meter of a stream, also where it is the stream of another machine; None where it has none."""
    way = stream.way
    if isinstance(way, SameAs):
        return meter_of(machines[way.machine].streams[way.stream], machines, fuels)
    if isinstance(way, GasVolume):
        return Meter(stream.key, way.volume, stream.machine, of_fuel(fuels[way.fuel], by_mass=False))
    if isinstance(way, LiquidFuel):
        tag = way.mass if way.mass is not None else way.volume
        fuel = fuels[way.fuel]
        return Meter(stream.key, str(tag), stream.machine, of_fuel(fuel, by_mass=way.mass is not None))
    if isinstance(way, Power):
        return Meter(stream.key, way.tag, stream.machine, OF_POWER)
    if isinstance(way, Shaft):
        return Meter(stream.key, way.torque, stream.machine, OF_POWER)
    if isinstance(way, FlowAndTemperatures):
        return Meter(stream.key, way.flow, stream.machine, OF_FLOW)
    return None  # made from other streams, so it has no meter of its own


def _events(seen: list[_Seen]) -> list[list[_Seen]]:
    """Put the steps of one moment together, in order of time."""
    events: list[list[_Seen]] = []
    for each in sorted(seen, key=lambda one: (one.at_us, one.pair)):
        if events and each.at_us - events[-1][0].at_us <= _SAME_MOMENT_US:
            events[-1].append(each)
        else:
            events.append([each])
    return events


def _question(
    event: list[_Seen], judged: set[tuple[str, str]], meters: Mapping[str, Meter]
) -> Finding | None:
    stepped = {each.pair for each in event}
    share = {
        key: sum(key in pair for pair in stepped) / sum(key in pair for pair in judged)
        for key in dict.fromkeys(key for pair in judged for key in pair)
    }
    most = max(share.values())
    suspects = [meters[key] for key, of_it in share.items() if of_it == most]
    asked: list[tuple[float, Meter, _Seen, tuple[Familiar, ...]]] = []
    for meter in suspects:
        best = min(
            (each for each in event if meter.key in each.pair),
            key=lambda each: each.step.factor_U / each.step.factor,
        )
        reading = best.reading(meter.key)
        U = math.hypot(reading.factor_U, _FINEST * reading.factor)
        hits = candidates(reading.factor, U, meter.familiar)
        if hits:
            asked.append((abs(math.log(hits[0].middle) - abs(math.log(reading.factor))), meter, best, hits))
    if not asked:
        return None
    asked.sort(key=lambda each: each[0])
    _, meter, best, _ = asked[0]
    reading = best.reading(meter.key)
    hits = tuple(dict.fromkeys(hit for each in asked for hit in each[3]))
    others = [key for key in best.pair if key != meter.key]
    return Finding(
        FindingCode.UNIT_SUSPECTED,
        tag=meter.tag,
        machine=meter.machine,
        start_us=min(each.at_us for each in event),
        numbers={
            "ratio": reading.factor,
            "ratio_U": math.hypot(reading.factor_U, _FINEST * reading.factor),
            "familiar": hits[0].middle,
        },
        words={
            "evidence": "own past",
            "other": meters[others[0]].tag,
            "candidates": named(hits),
        },
        suspects=tuple(dict.fromkeys(each[1].tag for each in asked)),
    )
