"""Tests of the laws of thermodynamics on one interval, each as an equation with its numbers."""

from __future__ import annotations

from functools import reduce
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.machines import Machine, Role, Stream
from auditor.report import numbers
from auditor.report.sections.worked_figures import Line, at_interval, in_kW, printed_result, signed
from auditor.report.wording import names
from auditor.units import DISPLAY

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.result import AuditResult

_THERMAL = (Role.HEAT_IN, Role.USEFUL_HEAT, Role.REJECTED_HEAT)
_EXCESS = (
    ("work_gross_W", 1.0),
    ("useful_heat_W", 1.0),
    ("rejected_measured_W", 1.0),
    ("fuel_in_higher_W", -1.0),
    ("heat_in_W", -1.0),
    ("power_in_W", -1.0),
)


def law_lines(machine: Machine, index: int, inside: slice, result: AuditResult) -> tuple[Line, ...]:
    """First law on the higher heating value, entropy, and crossing temperatures, where they are tested."""
    at, U = at_interval(machine, index, result)
    lines = []
    if np.isfinite(at.get("energy_excess_W", np.nan)):
        parts = [(part, sign) for part, sign in _EXCESS if part in at]
        words = signed([(names.figure(part), sign) for part, sign in parts])
        sums = signed([(in_kW(at[part]), sign) for part, sign in parts])
        key = "energy_excess_W"
        said = _said(at[key], U.get(key, np.nan), "more out than in", "no more out than in")
        outcome = f"{printed_result(key, at, U)}: {said}"
        lines.append(Line("Energy out beyond energy in", f"{words} = {sums} = {outcome}"))
    if np.isfinite(at.get("entropy_generation_W_per_K", np.nan)):
        lines.append(_entropy(machine, inside, at, U, result))
    if np.isfinite(at.get("crossing_K", np.nan)):
        kelvin = numbers.shown(
            at["crossing_K"], U.get("crossing_K", np.nan), DISPLAY["temperature difference"]
        )
        lines.append(Line("Temperature crossing", f"{kelvin.text} (below zero: the sides do not cross)"))
    return tuple(lines)


def _entropy(
    machine: Machine, inside: slice, at: dict[str, float], U: dict[str, float], result: AuditResult
) -> Line:
    """Heat over temperature of every stream that carries heat, with the temperature that makes it exact."""
    parts = [
        (
            _over_temperature(stream, _temperature_K(machine, stream, inside, result), inside, result),
            _sign(stream),
        )
        for stream in (*machine.streams_of(*_THERMAL), *machine.streams_of(Role.LOSS))
    ]
    key = "entropy_generation_W_per_K"
    said = _said(-at[key], U.get(key, np.nan), "entropy falls", "entropy does not fall")
    outcome = f"{printed_result(key, at, U)}: {said}"
    return Line(
        "Entropy generation",
        f"{signed(parts)} = {outcome}. Temperatures are means weighted by heat; losses leave at the "
        "coldest one",
    )


def _sign(stream: Stream) -> float:
    return -1.0 if stream.role is Role.HEAT_IN else 1.0


def _over_temperature(stream: Stream, kelvin: NDArray[np.float64], inside: slice, result: AuditResult) -> str:
    watts = result.powers.power_W[inside, result.powers.streams.index(stream.key)]
    known = np.isfinite(watts) & np.isfinite(kelvin)
    mean = float(watts[known].mean()) if known.any() else np.nan
    flow = float((watts[known] / kelvin[known]).mean()) if known.any() else np.nan
    temperature = numbers.significant(mean / flow, 6) if flow else numbers.UNKNOWN
    return f"{in_kW(mean)} kW / {temperature} K"


def _temperature_K(
    machine: Machine, stream: Stream, inside: slice, result: AuditResult
) -> NDArray[np.float64]:
    """Temperature at which a stream carries its entropy at every tick [K]."""
    if stream.role is not Role.LOSS:
        return result.powers.entropic_K[stream.key][inside]
    thermal = [other.key for other in machine.streams_of(*_THERMAL)]
    ends = [
        table[key][inside] for key in thermal for table in (result.powers.inlet_K, result.powers.outlet_K)
    ]
    return reduce(np.fmin, ends)


def _said(excess: float, U: float, bad: str, good: str) -> str:
    """Say what a test found: an excess above zero is what the law forbids."""
    if not excess > 0.0:
        return good
    return f"{bad}, {'beyond' if excess > U else 'within'} the uncertainty"
