"""The head of the statement: can it be trusted, how did the machines do, what comes first."""

from __future__ import annotations

from dataclasses import dataclass

from auditor.records.balances import MachineBalance
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import Machine
from auditor.records.result import AuditResult, MachineJudgement
from auditor.records.verdicts import Closure, Verdict
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.report.sections import labels
from auditor.report.wording import names, verdicts
from auditor.report.wording.findings import FindingText, first_things
from auditor.units import DISPLAY


@dataclass(frozen=True)
class Summary:
    """Everything on the first page."""

    site: str
    period: str
    period_said: str
    machines: str
    verdict: str
    verdict_said: str
    trust: tuple[str, ...]
    """One sentence per machine."""
    danger: str
    in_danger: bool
    """Something impossible or an open balance was found."""
    headlines: tuple[Table, ...]
    first_things: tuple[FindingText, ...]
    finding_count: str


def summary(result: AuditResult) -> Summary:
    """Write the head of the statement."""
    plant = result.plant
    word, said = verdicts.OVERALL[result.status]
    danger = _danger(result)
    first = first_things(result.findings, plant)
    return Summary(
        site=plant.site.name,
        period=Clock(plant.site.zone).period(result.period),
        period_said=result.period_said,
        machines=names.listing([machine.title for machine in plant.machines.values()]),
        verdict=word,
        verdict_said=said,
        trust=tuple(_trust(plant.machines[name], result) for name in result.balances),
        danger=danger or _no_danger(result),
        in_danger=bool(danger),
        headlines=tuple(_headlines(plant.machines[name], result) for name in result.balances),
        first_things=first,
        finding_count=numbers.count(len(result.findings), "finding"),
    )


def _trust(machine: Machine, result: AuditResult) -> str:
    balance, judgement = result.balances[machine.name], result.judgements[machine.name]
    key = labels.headline_ratio(machine, balance)
    covered = numbers.percent(balance.period[key].coverage) if key is not None else numbers.UNKNOWN
    total = int(judgement.verdict.shape[0])
    bad = int((judgement.verdict == Verdict.IMPOSSIBLE).sum())
    impossible = numbers.count(
        bad, f"of {numbers.count(total, 'interval')} is", f"of {numbers.count(total, 'interval')} are"
    )
    return (
        f"{machine.title}: readings cover {covered} of the energy; the energy balance {closure(balance)}; "
        f"{impossible.replace('no of', 'none of')} impossible."
    )


def closure(balance: MachineBalance) -> str:
    """Residual with U in energy and in percent of the input, and what it says."""
    said = verdicts.CLOSURES[balance.closure]
    residual = balance.period.get("residual_J")
    if balance.closure is Closure.NOT_TESTABLE or residual is None:
        return said
    size = numbers.figure("residual_J", residual.value, residual.expanded_U).text
    entering = input_energy(balance)
    if not entering > 0.0:
        return f"{said} (residual {size})"
    share = numbers.shown(residual.value / entering, residual.expanded_U / entering, DISPLAY["fraction"])
    return f"{said} (residual {size}, {share.text} of the input)"


def input_energy(balance: MachineBalance) -> float:
    """Fuel and heat that entered [J]; NaN without either."""
    parts = [balance.period[key].value for key in ("fuel_in_J", "heat_in_J") if key in balance.period]
    return sum(parts) if parts else float("nan")


def _headlines(machine: Machine, result: AuditResult) -> Table:
    balance, rules = result.balances[machine.name], result.plant.rules
    rows = []
    for key in labels.headline_keys(machine, balance):
        figure = balance.period[key]
        counted = labels.against(machine, key)
        rows.append(
            (
                names.sentence(labels.title(machine, key)),
                labels.value(figure, rules) + (f", {counted}" if counted and labels.is_shown(figure) else ""),
                labels.standing(figure),
            )
        )
    period = Clock(result.plant.site.zone).period(result.period)
    return Table(f"{machine.title}, {period}", ("Figure", "Value", "How far to believe it"), tuple(rows))


def _danger(result: AuditResult) -> str:
    """Say what cannot be true; empty when nothing is."""
    impossible = [_impossible(name, result.judgements[name], result) for name in result.balances]
    said = [sentence for sentence in impossible if sentence]
    opened = [
        f"the energy balance of {result.plant.machines[name].title} does not close"
        for name, balance in result.balances.items()
        if balance.closure is Closure.OPEN
    ]
    if not said and not opened:
        return ""
    all_said = names.sentence("; ".join([*said, *opened]))
    return f"{all_said}. Do not rely on the figures concerned before this is settled."


def _no_danger(result: AuditResult) -> str:
    """Say that nothing impossible was found, and what could not be tested."""
    untested = [
        result.plant.machines[name].title
        for name, balance in result.balances.items()
        if balance.closure is Closure.NOT_TESTABLE
    ]
    rest = f" The balance of {names.listing(untested)} could not be tested." if untested else ""
    return (
        "Nothing impossible was found: no interval breaks a law of thermodynamics beyond its "
        f"uncertainty.{rest}"
    )


def _impossible(name: str, judgement: MachineJudgement, result: AuditResult) -> str:
    count = int((judgement.verdict == Verdict.IMPOSSIBLE).sum())
    if not count and not judgement.impossible_period:
        return ""
    title = result.plant.machines[name].title
    if not count:
        return f"the period figure of {title} breaks a law of thermodynamics beyond its uncertainty"
    suspects = _suspects(name, result.findings)
    blame = f" (first suspect: {names.tag(result.plant, suspects[0])})" if suspects else ""
    verb = "shows" if count == 1 else "show"
    return f"{numbers.count(count, 'interval')} of {title} {verb} what no machine can do{blame}"


def _suspects(machine: str, findings: tuple[Finding, ...]) -> tuple[str, ...]:
    for finding in findings:
        if finding.code is FindingCode.IMPOSSIBLE_CLUSTER and finding.machine == machine and finding.suspects:
            return finding.suspects
    return ()
