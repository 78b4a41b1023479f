"""Judge all machines of an audit: verdicts, findings in order of importance, the interval to work by hand."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from auditor.judging.closing import open_balance, withheld_figures
from auditor.judging.clusters import PERSISTENT, impossible_clusters
from auditor.judging.conflict_effect import with_effect
from auditor.judging.range_units import range_questions
from auditor.judging.recogniser import Meters, meter_questions
from auditor.judging.steps import steps_in_figures
from auditor.judging.units import unit_suspects
from auditor.judging.verdicts import judge_machine
from auditor.records.errors import Exit
from auditor.records.findings import Finding, FindingCode
from auditor.records.result import MachineJudgement, WorkedInterval
from auditor.records.verdicts import Closure, Status, Verdict

if TYPE_CHECKING:
    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.plant import Plant, Tag
    from auditor.records.powers import PowerTable
    from auditor.records.ticks import TickTable

_TIERS = (
    (FindingCode.IMPOSSIBLE_CLUSTER, FindingCode.OPEN_BALANCE),
    (FindingCode.UNIT_SUSPECTED, FindingCode.SWAPPED_PAIR, FindingCode.FROZEN),
    (FindingCode.CLOCK_STEP, FindingCode.CLOCK_OFFSET, FindingCode.STEP_IN_FIGURE),
    (FindingCode.WITHHELD_FIGURE, FindingCode.MISSING_EXPORT, FindingCode.GAP, FindingCode.COUNTER_RESET),
    (FindingCode.OUT_OF_RANGE, FindingCode.CONFLICT, FindingCode.CREEP_AT_STANDSTILL),
    (FindingCode.ZERO_WHILE_RUNNING, FindingCode.AT_RANGE_END, FindingCode.STOOD_LONG),
    (FindingCode.SPIKES, FindingCode.CHANGED_TOO_FAST, FindingCode.COARSE_STEPS),
    (
        FindingCode.HEATING_VALUE_CHANGED,
        FindingCode.REPEATED_HOUR,
        FindingCode.REJECTED_LINES,
        FindingCode.RENAMED_COLUMN,
    ),
)
"""Findings of an earlier tier stand first; within a tier the larger energy; anything else last."""

_HEADLINES = ("gross", "net", "heat", "total")


@dataclass(frozen=True)
class JudgingSettings:
    """The slice of the plant that judging needs."""

    machines: Mapping[str, Machine]
    tags: Mapping[str, Tag]
    interval_coverage: float
    meters: Meters

    @classmethod
    def from_plant(cls, plant: Plant) -> JudgingSettings:
        """Take the slice from a plant."""
        return cls(plant.machines, plant.tags, plant.rules.interval_coverage, Meters.from_plant(plant))


@dataclass(frozen=True)
class Judged:
    """What judging hands on."""

    judgements: Mapping[str, MachineJudgement]
    findings: tuple[Finding, ...]
    worked: WorkedInterval | None
    status: Exit


def judge(
    balances: Mapping[str, MachineBalance],
    powers: PowerTable,
    ticks: TickTable,
    settings: JudgingSettings,
    earlier: Iterable[Finding],
) -> Judged:
    """Judge every machine and order all findings, those of the earlier rooms included.

    Parameters
    ----------
    balances : mapping of machine to MachineBalance
    powers : PowerTable
        Base run; tells which tags and how much power a finding touches.
    ticks : TickTable
        Tells what a tag usually reads.
    settings : JudgingSettings
    earlier : iterable of Finding
        Findings of reading, cleaning and metering.
    """
    quantities = {name: tag.quantity for name, tag in settings.tags.items()}
    findings = [
        _sized(with_effect(finding, quantities.get(finding.tag or "", ""), powers, ticks), powers, ticks)
        for finding in earlier
    ]
    findings += [
        *unit_suspects(findings, ticks, settings.tags),
        *range_questions(findings, ticks, settings.tags),
    ]
    findings += [
        _sized(question, powers, ticks)
        for question in meter_questions(settings.meters, ticks, powers, balances)
    ]
    judgements: dict[str, MachineJudgement] = {}
    for name, balance in balances.items():
        machine = settings.machines[name]
        judgement = judge_machine(machine, balance, settings.interval_coverage)
        judgements[name] = judgement
        findings += impossible_clusters(machine, balance, judgement, powers, findings)
        findings += open_balance(machine, balance, powers.grid)
        findings += steps_in_figures(machine, balance, judgement)
        findings += withheld_figures(machine, balance)
    ordered = tuple(sorted(_said_once(findings), key=_rank))
    return Judged(judgements, ordered, _worked(balances, judgements), _status(balances, judgements, ordered))


def _said_once(findings: list[Finding]) -> list[Finding]:
    """Leave out a gap of a tag that is only the trace of its counter's reset, which is told already."""
    resets = {
        (finding.tag, finding.start_us) for finding in findings if finding.code is FindingCode.COUNTER_RESET
    }
    return [
        finding
        for finding in findings
        if finding.code is not FindingCode.GAP or (finding.tag, finding.start_us) not in resets
    ]


def _rank(finding: Finding) -> tuple[int, float, int, str]:
    tier = next((rank for rank, codes in enumerate(_TIERS) if finding.code in codes), len(_TIERS))
    energy = finding.energy_J if finding.energy_J is not None and np.isfinite(finding.energy_J) else 0.0
    where = "|".join(
        str(part) for part in (finding.code, finding.machine, finding.tag, finding.export, finding.file)
    )
    return tier, -energy, finding.start_us or 0, where


def _sized(finding: Finding, powers: PowerTable, ticks: TickTable) -> Finding:
    """Give a finding about a tag the energy that its streams carry in that time, where it has none yet.

    The energy is the mean running power of the largest stream that the tag feeds, times the stretch; of
    scattered cells no more than their number times the usual time between two.
    """
    if finding.energy_J is not None or finding.start_us is None or finding.end_us is None:
        return finding
    tags = {finding.tag} if finding.tag else set(finding.words.get("tags", "").split(", "))
    largest_W = 0.0
    for index, key in enumerate(powers.streams):
        columns = {column.partition("=")[0] for column in powers.inputs[key]}
        if not columns & tags:
            continue
        machine = key.partition(".")[0]
        running = (powers.running[machine] == 1.0) & powers.known[:, index]
        if running.any():
            largest_W = max(largest_W, abs(float(powers.power_W[running, index].mean())))
    if largest_W == 0.0:
        return finding
    touched_s = (finding.end_us - finding.start_us) / 1e6
    if finding.tag in ticks.tags and "count" in finding.numbers:
        step_s = float(ticks.native_step_s[ticks.tags.index(finding.tag)])
        touched_s = min(touched_s, np.nan_to_num(finding.numbers["count"] * step_s, nan=touched_s))
    return replace(finding, energy_J=float(largest_W * touched_s))


def _worked(
    balances: Mapping[str, MachineBalance], judgements: Mapping[str, MachineJudgement]
) -> WorkedInterval | None:
    """Choose the interval to be worked by hand: an impossible one if there is any, else a typical one.

    Typical: the credible interval whose headline efficiency is the median of its machine's.
    """
    for name, judgement in judgements.items():
        hits = np.flatnonzero(judgement.verdict == Verdict.IMPOSSIBLE)
        if hits.size >= PERSISTENT:
            return WorkedInterval(name, int(hits[hits.size // 2]), "impossible")
    for words in ((Verdict.CREDIBLE,), (Verdict.NO_CEILING, Verdict.IMPLAUSIBLE)):
        for name in _machines_with_work_first(balances):
            gross = balances[name].interval.values.get("gross", balances[name].interval.values.get("heat"))
            if gross is None:
                continue
            good = np.flatnonzero(np.isin(judgements[name].verdict, words) & np.isfinite(gross))
            if good.size:
                order = good[np.argsort(gross[good], kind="stable")]
                return WorkedInterval(name, int(order[order.size // 2]), "median efficiency")
    return None


def _machines_with_work_first(balances: Mapping[str, MachineBalance]) -> list[str]:
    return sorted(balances, key=lambda name: "gross" not in balances[name].period)


def _status(
    balances: Mapping[str, MachineBalance],
    judgements: Mapping[str, MachineJudgement],
    findings: tuple[Finding, ...],
) -> Exit:
    """Exit code of a published audit.

    A single impossible interval does not raise the alarm: noise gives some where the true margin is
    small. It takes the period's own coherent verdict, or a cluster that persists, or an open balance.
    """
    persistent = any(
        finding.code is FindingCode.IMPOSSIBLE_CLUSTER and finding.numbers["longest"] >= PERSISTENT
        for finding in findings
    )
    is_open = any(balance.closure is Closure.OPEN for balance in balances.values())
    if persistent or is_open or any(judgement.impossible_period for judgement in judgements.values()):
        return Exit.LOOK
    missing = any(finding.code is FindingCode.MISSING_EXPORT for finding in findings)
    figures = (balance.period.get(key) for balance in balances.values() for key in _HEADLINES)
    if missing or any(figure is not None and figure.status is not Status.FIRM for figure in figures):
        return Exit.PROVISIONAL
    return Exit.FIRM
