"""Figures of one machine in tables and paragraphs: period, instruments, ceiling, refusals."""

from __future__ import annotations

from dataclasses import dataclass

from auditor.records.balances import MachineBalance
from auditor.records.kinds import KINDS
from auditor.records.machines import Machine
from auditor.records.nomenclature import TERMS
from auditor.records.result import AuditResult
from auditor.records.verdicts import Closure, Status
from auditor.report import numbers
from auditor.report.elements import Table
from auditor.report.sections import labels
from auditor.report.wording import names, verdicts
from auditor.report.wording.cautions import CEILING
from auditor.report.wording.methods import CEILINGS
from auditor.units import DISPLAY

_MOST_SOURCES = 8
_LEAST_SHARE = 0.001
"""Smaller shares of the variance are told in one line."""


def period_table(machine: Machine, balance: MachineBalance, result: AuditResult) -> Table:
    """Every period figure in the order of the nomenclature."""
    rows = []
    for key in TERMS:
        figure = balance.period.get(key)
        if figure is None:
            continue
        size = numbers.figure(key, figure.value, figure.expanded_U)
        logged, common = (
            numbers.figure(key, energy, float("nan")).value for energy in (figure.logged, figure.common)
        )
        shown = labels.is_shown(figure)
        is_energy = TERMS[key].quantity == "energy"
        rows.append(
            (
                names.sentence(labels.title(machine, key)),
                size.value if shown else "withheld",
                f"{size.U}{numbers.NBSP}{size.U_unit}".rstrip() if shown else "",
                size.unit,
                labels.against(machine, key) or TERMS[key].sign,
                numbers.percent(figure.coverage),
                figure.status.value
                if figure.status is not Status.WITHHELD
                else verdicts.withheld(figure.withheld_because, figure.coverage, result.plant.rules),
                logged if is_energy and shown else "",
                common if is_energy and shown else "",
            )
        )
    return Table(
        "Figures of the period",
        ("Figure", "Value", "± U", "Unit", "Basis or sign", "Coverage", "Standing", "Logged", "Common"),
        tuple(rows),
        numeric=(1, 2, 5, 7, 8),
        note="U is the expanded uncertainty (k = 2, about 95 %). Ratios are energies over energies, "
        "never means of ratios. Logged: all known time; common: only the time that all inputs of the "
        "headline figure share; both in the unit of the row. Coverage is by energy. "
        + " ".join(f"{names.sentence(status.value)}: {said}." for status, said in verdicts.STATUSES.items()),
    )


def instrument_tables(machine: Machine, balance: MachineBalance, result: AuditResult) -> tuple[Table, ...]:
    """Per headline figure: which instruments make its uncertainty."""
    origins = {source.key: source for source in result.powers.all_sources}
    tables = []
    for key in labels.headline_keys(machine, balance):
        parts = balance.contributions.get(key, ())
        if not parts or not labels.is_shown(balance.period[key]):
            continue
        told = [part for part in parts[:_MOST_SOURCES] if part.share >= _LEAST_SHARE]
        rows = []
        for part in told:
            origin = origins.get(part.source)
            said = names.source(result.plant, origin) if origin is not None else part.source
            rows.append((names.sentence(said), _change(key, part.change), numbers.percent(part.share)))
        rest = parts[len(told) :]
        total = None
        if rest:
            share = numbers.percent(sum(part.share for part in rest))
            total = (numbers.count(len(rest), "other source", "other sources together"), "", share)
        tables.append(
            Table(
                f"What makes the uncertainty of the {labels.title(machine, key)}",
                ("Source", "One standard uncertainty moves it by", "Share of the variance"),
                tuple(rows),
                numeric=(1, 2),
                total=total,
            )
        )
    return tuple(tables)


def _change(key: str, change: float) -> str:
    unit = DISPLAY[TERMS[key].quantity]
    label = "points" if TERMS[key].quantity == "fraction" else unit.label
    return f"{numbers.significant(change / unit.size_si, 2)}{numbers.NBSP}{label}"


def instruments_sentence(machine: Machine, balance: MachineBalance, result: AuditResult) -> str:
    """Which instrument to improve first, in one sentence."""
    key = labels.headline_ratio(machine, balance)
    parts = balance.contributions.get(key or "", ())
    if key is None or not parts or not labels.is_shown(balance.period[key]):
        return "No headline figure with an uncertainty is published for this machine."
    origins = {source.key: source for source in result.powers.all_sources}
    origin = origins.get(parts[0].source)
    said = names.source(result.plant, origin) if origin is not None else parts[0].source
    return (
        f"To make the {labels.title(machine, key)} more certain, begin with the {said}: it makes "
        f"{numbers.percent(parts[0].share, 0)} of the variance."
    )


@dataclass(frozen=True)
class CeilingWords:
    """What the ceiling of one machine is, and what it takes for granted."""

    name: str
    equation: str
    streams: str
    premises: tuple[str, ...]
    value: str
    caution: str


def ceiling_words(machine: Machine, balance: MachineBalance, result: AuditResult) -> CeilingWords | None:
    """Ceiling of the machine in words; None where it has none."""
    if machine.ceiling is None:
        return None
    name, equation, premises = CEILINGS[machine.ceiling.kind]
    streams = ""
    if machine.ceiling.source is not None:
        sinks = names.listing([names.plain(sink) for sink in machine.ceiling.sinks])
        streams = f"Source: {names.plain(machine.ceiling.source)}. Sink: {sinks}."
    said = []
    if "ceiling" in balance.period:
        said.append(f"Over the period it is {labels.value(balance.period['ceiling'], result.plant.rules)}.")
    bound, share = balance.period.get("bound"), balance.period.get("ceiling_share")
    if bound is not None and labels.is_shown(bound):
        said.append(f"The efficiency it binds is {labels.value(bound, result.plant.rules)}.")
    if share is not None and labels.is_shown(share):
        said.append(
            f"That is {labels.value(share, result.plant.rules)} of the ceiling: a yardstick of quality."
        )
    return CeilingWords(name, equation, streams, premises, " ".join(said), CEILING)


def refusals(machine: Machine, balance: MachineBalance, result: AuditResult) -> tuple[str, ...]:
    """List what is not said about this machine, and why."""
    said = []
    for key in TERMS:
        figure = balance.period.get(key)
        if (
            figure is not None
            and figure.status is Status.WITHHELD
            and figure.withheld_because != "not testable"
        ):
            because = verdicts.withheld(figure.withheld_because, figure.coverage, result.plant.rules)
            said.append(f"The {labels.title(machine, key)} is withheld: {because}.")
    if balance.closure is Closure.NOT_TESTABLE:
        said.append(
            "The energy balance is not tested: at least one stream is found by difference, and a "
            "difference always closes."
        )
    kind = KINDS.get(machine.kind)
    if machine.ceiling is None and kind is not None:
        said.append(f"No ceiling is given. {names.units(kind.note.partition(' Bands:')[0])}")
    elif kind is not None and kind.internal_combustion:
        said.append(f"No Carnot ceiling is given. {names.units(kind.note.partition(' Bands:')[0])}")
    if balance.slowest_input:
        said.append(
            f"Nothing finer than {numbers.duration(balance.interval_s)} is judged, because "
            f"{names.tag(result.plant, balance.slowest_input)} is not logged more often."
        )
    return tuple(said)


def standstill_table(machine: Machine, balance: MachineBalance) -> Table | None:
    """Energy that meters show while the machine stands still; None without any."""
    shown = {name: joules for name, joules in balance.standstill_J.items() if joules}
    if not shown:
        return None
    rows = tuple((names.plain(name), numbers.energy(joules)) for name, joules in shown.items())
    return Table(
        "Shown by the meters while the machine stood still",
        ("Stream", "Energy"),
        rows,
        numeric=(1,),
        note="Creep of a meter, standby power or a leaking valve; kept out of every figure above.",
    )
