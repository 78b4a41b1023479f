"""Runs of impossible intervals, and the tags most likely at fault where the data path shows it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.findings import Finding, FindingCode
from auditor.records.verdicts import Verdict

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.period import Grid
    from auditor.records.powers import PowerTable
    from auditor.records.result import MachineJudgement

_JOIN_S = 3600.0
"""Impossible intervals less than this far apart belong to one cluster."""

PERSISTENT = 4
"""Impossible intervals in one cluster from which on a person must look (one hour of quarter-hours).

With a true margin of zero, noise alone puts 2.3 % of intervals over their limit; four neighbours by
noise alone are then rarer than one in a million.
"""

_DATA_PATH = (
    FindingCode.UNIT_SUSPECTED,
    FindingCode.FROZEN,
    FindingCode.OUT_OF_RANGE,
    FindingCode.COUNTER_RESET,
    FindingCode.CLOCK_STEP,
    FindingCode.CONFLICT,
)
"""Faults of the data path that explain an impossible figure, the most telling first."""


def runs(flag: NDArray[np.bool_], start_us: NDArray[np.int64], join_s: float) -> list[tuple[int, int]]:
    """Group true intervals into runs; gaps shorter than ``join_s`` [s] are joined.

    Returns
    -------
    list of (first, last)
        Indices of the first and last true interval of each run, in order of time.
    """
    where = np.flatnonzero(flag)
    if where.size == 0:
        return []
    breaks = np.flatnonzero(np.diff(start_us[where]) > join_s * 1e6)
    firsts = np.concatenate(([0], breaks + 1))
    lasts = np.concatenate((breaks, [where.size - 1]))
    return [(int(where[a]), int(where[b])) for a, b in zip(firsts, lasts, strict=True)]


def impossible_clusters(
    machine: Machine,
    balance: MachineBalance,
    judgement: MachineJudgement,
    powers: PowerTable,
    known: Iterable[Finding],
) -> list[Finding]:
    """Group impossible intervals by what they break; one finding per set of reasons.

    The energy is what the figures exceed their limits by, summed over the impossible intervals. A
    finding of several clusters tells how many there are, on how many days, and between which times of
    the day, counted from local midnight: what recurs at the same time of the day has a daily cause.
    """
    figures = balance.interval
    impossible = judgement.verdict == Verdict.IMPOSSIBLE
    tags = _input_tags(machine, powers)
    found = list(known)
    groups: dict[tuple[str, ...], list[tuple[int, int]]] = {}
    for first, last in runs(impossible, figures.start_us, _JOIN_S):
        reasons: dict[str, None] = {}
        for index in np.flatnonzero(impossible[first : last + 1]) + first:
            reasons.update(dict.fromkeys(judgement.reasons[index]))
        groups.setdefault(tuple(reasons), []).append((first, last))
    return [
        replace(
            _sized_and_placed(machine, balance, impossible, clusters, powers.grid),
            words={"reasons": "; ".join(reasons)},
            suspects=_suspects_of(found, tags, balance, clusters),
        )
        for reasons, clusters in groups.items()
    ]


def _sized_and_placed(
    machine: Machine,
    balance: MachineBalance,
    impossible: NDArray[np.bool_],
    clusters: list[tuple[int, int]],
    grid: Grid,
) -> Finding:
    """Return the finding of one group of clusters with its times, counts and energy."""
    figures = balance.interval
    members = np.concatenate(
        [np.flatnonzero(impossible[first : last + 1]) + first for first, last in clusters]
    )
    length_s = (figures.end_us - figures.start_us) / 1e6
    excess_W = _excess_W(figures.values, impossible.shape)
    day = np.searchsorted(grid.day_start_us, figures.start_us[members], side="right") - 1
    into_day_s = (figures.start_us[members] - grid.day_start_us[day]) / 1e6
    return Finding(
        FindingCode.IMPOSSIBLE_CLUSTER,
        machine=machine.name,
        start_us=int(figures.start_us[clusters[0][0]]),
        end_us=int(figures.end_us[clusters[-1][1]]),
        energy_J=float((excess_W * length_s)[members].sum()),
        numbers={
            "count": float(members.size),
            "clusters": float(len(clusters)),
            "longest": float(max(int(impossible[first : last + 1].sum()) for first, last in clusters)),
            "days": float(np.unique(day).size),
            "earliest_s": float(into_day_s.min()),
            "latest_s": float((into_day_s + length_s[members]).max()),
        },
    )


def _suspects_of(
    found: list[Finding],
    tags: tuple[str, ...],
    balance: MachineBalance,
    clusters: list[tuple[int, int]],
) -> tuple[str, ...]:
    figures = balance.interval
    suspects: dict[str, None] = {}
    for first, last in clusters:
        start_us, end_us = int(figures.start_us[first]), int(figures.end_us[last])
        suspects.update(dict.fromkeys(_suspects(found, tags, start_us, end_us)))
    return tuple(suspects)


def _excess_W(values: Mapping[str, NDArray[np.float64]], shape: tuple[int, ...]) -> NDArray[np.float64]:
    """Power by which the figures exceed what the laws allow; zero where they do not.

    The largest of: work above the ceiling, energy out above energy in, and the heat that would have to
    leave at the sink's temperature besides the measured for entropy not to fall.
    """
    nothing = np.zeros(shape)

    def known(key: str) -> NDArray[np.float64]:
        return np.nan_to_num(values.get(key, nothing))

    over = known("margin") * (known("fuel_in_W") + known("heat_in_W"))
    missing_rejection = -known("entropy_generation_W_per_K") * known("sink_temperature_K")
    return np.maximum(np.maximum(over, known("energy_excess_W")), np.maximum(missing_rejection, nothing))


def _input_tags(machine: Machine, powers: PowerTable) -> tuple[str, ...]:
    tags: dict[str, None] = {}
    for stream in machine.streams.values():
        tags.update(dict.fromkeys(column.partition("=")[0] for column in powers.inputs[stream.key]))
    return tuple(tags)


def _suspects(findings: list[Finding], tags: tuple[str, ...], start_us: int, end_us: int) -> tuple[str, ...]:
    """Input tags with a data-path fault that overlaps the cluster, most telling kind of fault first."""
    suspects: dict[str, None] = {}
    for code in _DATA_PATH:
        for finding in findings:
            if finding.code is not code or finding.tag not in tags:
                continue
            if finding.start_us is None or finding.end_us is None:
                continue
            if finding.start_us < end_us and finding.end_us > start_us:
                suspects[str(finding.tag)] = None
    return tuple(suspects)
