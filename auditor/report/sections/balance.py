"""The energy balance of a machine: boundary, bands and table."""

# ruff: noqa: RUF001 - text for paper uses the trade's own signs

from __future__ import annotations

from dataclasses import replace

import numpy as np

from auditor.records.balances import MachineBalance
from auditor.records.machines import Machine, Role, SameAs, Stream
from auditor.records.nomenclature import TERMS
from auditor.records.plant import Plant
from auditor.records.powers import PowerTable
from auditor.records.result import AuditResult
from auditor.records.verdicts import Closure
from auditor.report import numbers
from auditor.report.drawings.bands import Flow, energy_bands
from auditor.report.drawings.boundary import Crossing, boundary
from auditor.report.elements import Figure, Table
from auditor.report.sections import labels
from auditor.report.sections.summary import closure
from auditor.report.wording import names
from auditor.report.wording.methods import WAYS
from auditor.units import DISPLAY

_IN = (
    ("fuel_in_J", Role.FUEL_IN, "fuel"),
    ("heat_in_J", Role.HEAT_IN, "heat"),
    ("power_in_J", Role.POWER_IN, "work"),
)
_OUT = (
    ("work_gross_J", Role.WORK_OUT, "work"),
    ("useful_heat_J", Role.USEFUL_HEAT, "useful"),
    ("rejected_measured_J", Role.REJECTED_HEAT, "rejected"),
    ("loss_J", Role.LOSS, "loss"),
)


def standing(plant: Plant, stream: Stream) -> str:
    """``measured``, ``computed`` or ``assumed``; a stream of another machine as it stands there."""
    while isinstance(stream.way, SameAs):
        stream = plant.machines[stream.way.machine].streams[stream.way.stream]
    return WAYS[type(stream.way)].standing


def mean_power_W(powers: PowerTable, stream: Stream) -> float:
    """Mean power of a stream while its machine runs, over the ticks it is known; NaN without any."""
    place = powers.streams.index(stream.key)
    chosen = powers.known[:, place] & (powers.running[stream.machine] != 0.0)
    return float(powers.power_W[chosen, place].mean()) if chosen.any() else float("nan")


def boundary_figure(anchor: str, machine: Machine, result: AuditResult) -> Figure:
    """Draw the box with its streams, and the table of them."""
    plant, powers = result.plant, result.powers
    crossings, rows = [], []
    for stream in machine.streams.values():
        size = numbers.power(mean_power_W(powers, stream))
        way = WAYS[type(stream.way)]
        inward = stream.role in names.INWARD
        role, meaning = names.ROLES[stream.role]
        crossings.append(
            Crossing(names.plain(stream.name), role, f"mean {size}", standing(plant, stream), inward)
        )
        inputs = ", ".join(powers.inputs[stream.key])
        rows.append(
            (
                names.plain(stream.name),
                "in" if inward else "out",
                f"{role}: {meaning}",
                standing(plant, stream),
                f"{way.name}{_where(stream)}",
                inputs,
                size,
            )
        )
    counted = [
        sum(crossing.standing == word for crossing in crossings)
        for word in ("measured", "computed", "assumed")
    ]
    said = [str(number) if number else "none" for number in counted]
    caption = (
        f"{numbers.count(len(crossings), 'stream crosses', 'streams cross')} the balance boundary of "
        f"{machine.title}: {said[0]} measured directly (full line), {said[1]} computed from several readings "
        f"(dashed), {said[2]} assumed (dotted). Powers are means while the machine runs."
    )
    table = Table(
        "Streams across the boundary",
        ("Stream", "Way", "Role", "Standing", "Metered by", "Tags", "Mean power"),
        tuple(rows),
        numeric=(6,),
        code=(5,),
    )
    return Figure(
        f"{anchor}-boundary", "Balance boundary", caption, (table,), boundary(machine.title, crossings)
    )


def _where(stream: Stream) -> str:
    """Where a power is metered, or which stream of which machine this is."""
    if isinstance(stream.way, SameAs):
        return f" {stream.way.machine}, {names.plain(stream.way.stream)}"
    place = getattr(stream.way, "measured_at", "")
    return f", at the {place}" if place else ""


def bands_figure(anchor: str, machine: Machine, result: AuditResult) -> Figure:
    """Bands of energy in and out with the residual, and the balance table."""
    balance = result.balances[machine.name]
    tables = (balance_table(machine, balance, result),)
    if refused := _refused(balance):
        caption = (
            f"The energy flow is not drawn: {names.listing(refused)} "
            f"{'is' if len(refused) == 1 else 'are'} withheld."
        )
        return Figure(f"{anchor}-bands", "Energy flow", caption, tables)
    flows_in, flows_out = _sides(machine, balance)
    testable = balance.closure is not Closure.NOT_TESTABLE
    rest_key = "residual_J" if testable else "rejected_J"
    told = f"Into {machine.title} went: {_told(flows_in)}. Out came: {_told(flows_out)}."
    if rest_key in balance.period:
        rest = _flow(machine, rest_key, "residual" if testable else "difference", balance)
        left_over = balance.period[rest_key].common
        (flows_out if left_over >= 0.0 else flows_in).append(rest)
        side = "out" if left_over >= 0.0 else "in"
        edge = "dashed" if testable else "dotted"
        told += f" What is left, {rest.name}, is {rest.size} and is drawn as a {edge} band {side}."
    caption = f"{told} The width of a band is its energy. The balance {closure(balance)}."
    drawing = energy_bands(machine.title, flows_in, flows_out)
    return Figure(f"{anchor}-bands", "Energy flow", caption, tables, drawing)


def _sides(machine: Machine, balance: MachineBalance) -> tuple[list[Flow], list[Flow]]:
    """Bands in and out; what came out below zero is drawn on the other side and says so."""
    sides: tuple[list[Flow], list[Flow]] = ([], [])
    for own, parts in enumerate((_IN, _OUT)):
        for key, _, style in parts:
            if key in balance.period:
                turned = balance.period[key].common < 0.0
                flow = _flow(machine, key, style, balance)
                sides[1 - own if turned else own].append(
                    replace(flow, name=f"{flow.name}, below zero") if turned else flow
                )
    return sides


def _told(flows: list[Flow]) -> str:
    return names.listing([f"{flow.name} {flow.size}" for flow in flows]) or "nothing known"


def _refused(balance: MachineBalance) -> list[str]:
    keys = [key for key, _, _ in (*_IN, *_OUT) if key in balance.period]
    return [TERMS[key].title for key in keys if not labels.is_shown(balance.period[key])]


def _flow(machine: Machine, key: str, style: str, balance: MachineBalance) -> Flow:
    figure = balance.period[key]
    size = numbers.figure(key, figure.common, figure.expanded_U)
    title = {"residual_J": "residual", "rejected_J": "rejected, by difference"}.get(
        key, labels.title(machine, key)
    )
    return Flow(title, f"{size.value}{numbers.NBSP}{size.unit}", abs(figure.common), style)


def balance_table(machine: Machine, balance: MachineBalance, result: AuditResult) -> Table:
    """Energies over the common ticks, in megawatt-hours and in percent of the input."""
    rows = []
    for sign, keys in (("+", _IN), ("−", _OUT)):
        for key, role, _ in keys:
            if key in balance.period:
                streams = [names.plain(stream.name) for stream in machine.streams_of(role)]
                rows.append(
                    _row(f"{sign} {labels.title(machine, key)}", names.listing(streams), key, balance, result)
                )
    total = None
    if balance.closure is not Closure.NOT_TESTABLE and "residual_J" in balance.period:
        total = _row("= closure residual", "what the balance leaves over", "residual_J", balance, result)
    elif "rejected_J" in balance.period:
        total = _row(
            "= rejected heat, implied",
            "by difference: nothing to test it against",
            "rejected_J",
            balance,
            result,
        )
    return Table(
        "Energy balance",
        ("Part", "Streams", "MWh", "± U, MWh", "% of input", "± U, points"),
        tuple(rows),
        numeric=(2, 3, 4, 5),
        total=total,
        note="Energies over the time that is common to all inputs of the headline figure, standstill "
        "left out. Input is fuel and heat; the last column is the uncertainty of the energy over that "
        "input.",
    )


def _row(name: str, streams: str, key: str, balance: MachineBalance, result: AuditResult) -> tuple[str, ...]:
    figure = balance.period[key]
    if not labels.is_shown(figure):
        return name, streams, labels.value(figure, result.plant.rules), "", "", ""
    size = numbers.figure(key, figure.common, figure.expanded_U)
    parts = [balance.period[part].common for part in ("fuel_in_J", "heat_in_J") if part in balance.period]
    entering = sum(parts)
    if not np.isfinite(entering) or entering <= 0.0:
        return name, streams, size.value, size.U, "", ""
    share = numbers.shown(figure.common / entering, figure.expanded_U / entering, DISPLAY["fraction"])
    return name, streams, size.value, size.U, share.value, share.U
