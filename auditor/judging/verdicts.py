"""Verdict of every interval of one machine: physics tests first, then the first word that applies."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.kinds import KINDS
from auditor.records.result import MachineJudgement
from auditor.records.verdicts import Reason, Verdict

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine

_STOPPED_BELOW = 0.5
"""An interval counts as stopped when the machine ran for less than this share of it."""


@dataclass(frozen=True)
class _Evidence:
    """Physics tests of every interval, each with its reason, whatever the gates say later."""

    impossible: NDArray[np.bool_]
    unproven: NDArray[np.bool_]
    implausible: NDArray[np.bool_]
    no_ceiling: NDArray[np.bool_]
    ceiling_unknown: NDArray[np.bool_]
    """No ceiling because a temperature or the fuel it stands on is not known."""
    flags: tuple[tuple[Reason, NDArray[np.bool_]], ...]


def judge_machine(machine: Machine, balance: MachineBalance, interval_coverage: float) -> MachineJudgement:
    """Give every interval of one machine its verdict and reasons.

    The first word that applies is the verdict (the order of :class:`Verdict`). The physics tests run
    for every interval with numbers; when an earlier word wins, their result stays in the reasons.

    Parameters
    ----------
    machine : Machine
        Its gates and its kind.
    balance : MachineBalance
        Interval figures [SI] with expanded uncertainties (k = 2).
    interval_coverage : float
        Least share of common ticks of an assessed interval [1].

    Returns
    -------
    MachineJudgement
        One verdict and its reasons per interval, hours and input energy by verdict.
    """
    figures = balance.interval
    evidence = _physics(machine, balance)
    missing = ~(figures.coverage >= interval_coverage)
    stopped = figures.running < _STOPPED_BELOW
    minimum = machine.minimum_load
    low_load = (figures.load < minimum) if minimum is not None else np.zeros(missing.shape, dtype=bool)
    partly_running = (figures.running >= _STOPPED_BELOW) & (figures.running < 1.0)
    negative = figures.negative_input & ~stopped
    choices = (
        (missing, Verdict.NOT_ASSESSED),
        (stopped, Verdict.STOPPED),
        (negative | ~figures.assessed, Verdict.NOT_ASSESSED),
        (low_load, Verdict.LOW_LOAD),
        (~figures.steady | partly_running, Verdict.TRANSIENT),
        (evidence.impossible, Verdict.IMPOSSIBLE),
        (evidence.unproven, Verdict.OVER_CEILING_UNPROVEN),
        (evidence.implausible, Verdict.IMPLAUSIBLE),
        (evidence.no_ceiling, Verdict.NO_CEILING),
    )
    verdict = np.select(
        [mask for mask, _ in choices],
        [np.int8(word) for _, word in choices],
        default=np.int8(Verdict.CREDIBLE),
    ).astype(np.int8)
    lacking = missing | (evidence.ceiling_unknown & ~stopped)
    flags = ((Reason.MISSING_INPUT, lacking), (Reason.NEGATIVE_INPUT, negative), *evidence.flags)
    return MachineJudgement(
        machine=machine.name,
        verdict=verdict,
        reasons=_reasons(flags, verdict.shape[0]),
        impossible_period=_period_impossible(balance),
        hours=_hours(verdict, figures.start_us, figures.end_us),
        energy_share=_energy_share(verdict, balance),
    )


def _physics(machine: Machine, balance: MachineBalance) -> _Evidence:
    value, U = _reader(balance.interval.values), _reader(balance.interval_U)
    shape = balance.interval.coverage
    margin, margin_U = value("margin", shape), U("margin", shape)
    excess, excess_U = value("energy_excess_W", shape), U("energy_excess_W", shape)
    entropy, entropy_U = value("entropy_generation_W_per_K", shape), U("entropy_generation_W_per_K", shape)
    over = margin - margin_U > 0.0
    within = (margin > 0.0) & ~over
    more_out = excess - excess_U > 0.0
    falls = entropy + entropy_U < 0.0
    crossing = value("crossing_K", shape) - U("crossing_K", shape) > 0.0
    above, below = _bands(machine, balance)
    ceiling_reason = Reason.FUEL_EXERGY if KINDS[machine.kind].burns_fuel else Reason.OVER_CEILING
    gives_work = machine.ceiling is not None
    undefined = ~np.isfinite(value("ceiling", shape)) if gives_work else np.zeros(shape.shape, dtype=bool)
    hot_K, cold_K = value("source_temperature_K", shape), value("sink_temperature_K", shape)
    not_hotter = undefined & np.isfinite(hot_K) & np.isfinite(cold_K)
    without = np.full(shape.shape, not gives_work)
    return _Evidence(
        impossible=over | more_out | falls | crossing,
        unproven=within,
        implausible=above | below,
        no_ceiling=undefined | without,
        ceiling_unknown=undefined & ~not_hotter,
        flags=(
            (ceiling_reason, over),
            (Reason.OVER_CEILING_WITHIN_U, within),
            (Reason.MORE_OUT_THAN_IN, more_out),
            (Reason.ENTROPY_FALLS, falls),
            (Reason.TEMPERATURE_CROSSING, crossing),
            (Reason.ABOVE_BAND, above),
            (Reason.BELOW_BAND, below),
            (Reason.NO_CEILING_TEMPERATURES, not_hotter),
            (Reason.NO_CEILING_FOR_KIND, without),
        ),
    )


def _bands(machine: Machine, balance: MachineBalance) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Outside the band of its kind by more than U, above and below, over all banded figures."""
    above = np.zeros(balance.interval.coverage.shape, dtype=bool)
    below = above.copy()
    value, U = _reader(balance.interval.values), _reader(balance.interval_U)
    for key, band in KINDS[machine.kind].bands.items():
        figure, figure_U = value(key, above), U(key, above)
        above |= figure - figure_U > band.high
        below |= figure + figure_U < band.low
    return above, below


def _reader(
    table: Mapping[str, NDArray[np.float64]],
) -> Callable[[str, NDArray[np.generic]], NDArray[np.float64]]:
    """Read a figure by key; a figure that this machine does not have is unknown everywhere."""

    def read(key: str, like: NDArray[np.generic]) -> NDArray[np.float64]:
        found = table.get(key)
        return np.full(like.shape, np.nan) if found is None else found

    return read


def _reasons(
    flags: tuple[tuple[Reason, NDArray[np.bool_]], ...], intervals: int
) -> tuple[tuple[str, ...], ...]:
    names = [reason.value for reason, _ in flags]
    table = np.stack([mask for _, mask in flags], axis=1) if intervals else np.zeros((0, len(flags)), bool)
    # Few distinct combinations occur in a month: make each tuple once and look it up by row.
    distinct, which = np.unique(table, axis=0, return_inverse=True)
    tuples = [tuple(name for name, hit in zip(names, row, strict=True) if hit) for row in distinct]
    return tuple(tuples[index] for index in which.ravel())


def _period_impossible(balance: MachineBalance) -> bool:
    """Whether the period's own coherent figures break the first or the second law beyond U."""
    margin = balance.period.get("margin")
    excess = balance.period.get("energy_excess_J")
    entropy = balance.period.get("entropy_generation_W_per_K")
    return bool(
        (margin is not None and margin.value - margin.expanded_U > 0.0)
        or (excess is not None and excess.value - excess.expanded_U > 0.0)
        or (entropy is not None and entropy.value + entropy.expanded_U < 0.0)
    )


def _hours(
    verdict: NDArray[np.int8], start_us: NDArray[np.int64], end_us: NDArray[np.int64]
) -> dict[str, float]:
    hours = (end_us - start_us) / 3.6e9
    sums = np.bincount(verdict, weights=hours, minlength=len(Verdict))
    return {word.word: float(sums[word]) for word in Verdict}


def _energy_share(verdict: NDArray[np.int8], balance: MachineBalance) -> dict[str, float]:
    values = balance.interval.values
    power = np.zeros(verdict.shape)
    for key in ("fuel_in_W", "heat_in_W"):
        if key in values:
            power += np.nan_to_num(values[key])
    hours = (balance.interval.end_us - balance.interval.start_us) / 3.6e9
    energy = np.maximum(power, 0.0) * hours * np.nan_to_num(balance.interval.coverage)
    total = energy.sum()
    sums = np.bincount(verdict, weights=energy, minlength=len(Verdict))
    return {word.word: float(sums[word] / total) if total > 0.0 else 0.0 for word in Verdict}
