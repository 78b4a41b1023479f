"""How it was computed: equations of the ways that occur, assumptions, thresholds, names."""

from __future__ import annotations

from dataclasses import dataclass, fields, is_dataclass

from auditor.records.kinds import KINDS
from auditor.records.machines import Machine
from auditor.records.nomenclature import TERMS
from auditor.records.result import AuditResult
from auditor.records.uncertain import Assumed
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.report.wording import methods, names
from auditor.units import DISPLAY


@dataclass(frozen=True)
class Equation:
    """One equation in words and symbols."""

    name: str
    words: str
    symbols: str


def equations(result: AuditResult) -> tuple[Equation, ...]:
    """Ways of metering that occur at this site, then the figures made of them."""
    used = {
        type(stream.way) for machine in result.plant.machines.values() for stream in machine.streams.values()
    }
    found = [
        Equation(names.sentence(method.name), method.words, method.symbols)
        for way, method in methods.WAYS.items()
        if way in used
    ]
    present = {key for balance in result.balances.values() for key in balance.period}
    found += [
        Equation(names.sentence(TERMS[key].title), TERMS[key].meaning, symbols)
        for key, symbols in methods.EFFICIENCIES.items()
        if key in present
    ]
    found.append(
        Equation(
            "Rejected heat, implied", "What the balance leaves when nothing is metered.", methods.IMPLIED
        )
    )
    found.append(
        Equation("Closure residual", "A result; it is never spread over the streams.", methods.BALANCE)
    )
    if "demanded_rejection_J" in present:
        found.append(
            Equation(
                "Rejection the second law demands",
                "The least heat that an engine between the same temperatures has to reject, for steady "
                "machines that run on heat alone.",
                methods.DEMANDED,
            )
        )
    kinds = dict.fromkeys(
        machine.ceiling.kind for machine in result.plant.machines.values() if machine.ceiling
    )
    found += [
        Equation(
            names.sentence(methods.CEILINGS[kind][0]),
            "Computed at every tick and weighted by the heat that enters.",
            methods.CEILINGS[kind][1],
        )
        for kind in kinds
    ]
    return tuple(found)


def assumption_table(result: AuditResult) -> Table | None:
    """Every assumed number with its uncertainty and its source; None without any."""
    plant = result.plant
    found: dict[int, Assumed] = {}
    for root in (
        plant.site,
        *plant.fluids.values(),
        *plant.fuels.values(),
        *plant.gas_meters.values(),
        *plant.machines.values(),
    ):
        _collect(root, found)
    rows = tuple(
        (
            item.key,
            item.declared,
            f"{numbers.exact(item.value)} {item.unit}".removesuffix(" 1"),
            f"{numbers.exact(item.standard, 3)} {item.unit}".removesuffix(" 1"),
            item.source or "no source given",
        )
        for item in found.values()
    )
    if not rows:
        return None
    return Table(
        "Numbers that are assumed, not logged",
        ("Place in the plant file", "As declared", "Value", "Standard uncertainty", "Source"),
        rows,
        numeric=(2, 3),
        code=(0,),
        note="Values and standard uncertainties in SI units.",
    )


def _collect(node: object, found: dict[int, Assumed]) -> None:
    """Walk frozen records for assumed numbers, each once, in the order of the plant file."""
    if isinstance(node, Assumed):
        found.setdefault(id(node), node)
    elif is_dataclass(node) and not isinstance(node, type):
        for part in fields(node):
            _collect(getattr(node, part.name), found)
    elif isinstance(node, tuple):
        for item in node:
            _collect(item, found)
    elif hasattr(node, "values") and callable(node.values):
        for item in node.values():
            _collect(item, found)


def heating_value_table(result: AuditResult) -> Table | None:
    """Heating values of every fuel with the day they hold from; None without fuels."""
    clock = Clock(result.plant.site.zone)
    rows = []
    for fuel in result.plant.fuels.values():
        quantity = "heating value by volume" if fuel.phase == "gas" else "heating value by mass"
        unit = DISPLAY[quantity]
        for entry in fuel.values:
            shown = [
                numbers.exact(value.value / unit.size_si) if value is not None else "not declared"
                for value in (entry.lower, entry.higher)
            ]
            state = fuel.volume_state.declared if fuel.volume_state else "by mass"
            rows.append(
                (names.plain(fuel.name), clock.stamp(entry.from_us), *shown, unit.label, state, entry.source)
            )
    if not rows:
        return None
    columns = ("Fuel", "From", "Lower", "Higher", "Unit", "Reference state", "Source")
    return Table("Heating values", columns, tuple(rows), numeric=(2, 3))


def rule_table(result: AuditResult) -> Table:
    """Every threshold that decides something, with its value."""
    plant, rules = result.plant, result.plant.rules
    rows = [
        ("A tick counts from", numbers.percent(rules.tick_coverage, 0), "of it covered by readings"),
        (
            "An interval is assessed from",
            numbers.percent(rules.interval_coverage, 0),
            "of its ticks common to all inputs",
        ),
        ("A period figure is firm from", numbers.percent(rules.firm_coverage, 0), "of the energy covered"),
        (
            "A period figure is withheld below",
            numbers.percent(rules.publish_coverage, 0),
            "of the energy covered",
        ),
        ("Length of a tick", numbers.duration(plant.site.tick_s), "the base grid of all means"),
        ("Length of an interval", numbers.duration(plant.site.interval_s), "one verdict each"),
    ]
    for machine in plant.machines.values():
        rows += _gates(machine, result)
    return Table("Rules and thresholds", ("Rule", "Value", "Of what"), tuple(rows), numeric=(1,))


def _gates(machine: Machine, result: AuditResult) -> list[tuple[str, str, str]]:
    tag = names.tag(result.plant, machine.running.tag)
    if machine.running.state is not None:
        rows = [(f"{machine.title} runs when", machine.running.state, f"is the state of {tag}")]
    else:
        declared = result.plant.tags[machine.running.tag]
        limit = ((machine.running.above or 0.0) - declared.offset) / declared.scale
        rate = " per hour" if declared.between in ("counter", "amount") else ""
        value = limit * 3600.0 if rate else limit
        rows = [(f"{machine.title} runs above", f"{numbers.exact(value)} {declared.unit}{rate}", f"of {tag}")]
    if machine.minimum_load is not None:
        rows.append(
            (
                f"{machine.title}: low load below",
                numbers.percent(machine.minimum_load, 0),
                "of rated gross power",
            )
        )
    if machine.rated_power_W is not None:
        rows.append((f"{machine.title}: rated power", numbers.power(machine.rated_power_W), "gross"))
    if machine.steady is not None:
        within = numbers.duration(machine.steady.within_s)
        declared = result.plant.tags[machine.steady.tag]
        change = machine.steady.change_below / (
            1.0 if declared.between in ("counter", "amount") else declared.scale
        )
        unit = (
            f"{declared.unit}" if declared.between not in ("counter", "amount") else f"{declared.si_unit}/s"
        )
        rows.append(
            (
                f"{machine.title}: steady below",
                f"{numbers.exact(change)} {unit}",
                f"change of {names.tag(result.plant, machine.steady.tag)} within {within}",
            )
        )
    kind = KINDS.get(machine.kind)
    said = names.units(kind.note) if kind is not None else ""
    for key, band in (kind.bands if kind is not None else {}).items():
        ends = f"{numbers.percent(band.low, 0)} to {numbers.percent(band.high, 0)}"
        rows.append((f"{machine.title}: plausible {names.figure(key)}", ends, said))
        said = "as above"
    return rows


def nomenclature_table(result: AuditResult) -> Table:
    """Names, units, meanings and signs of the figures that occur."""
    present = {
        key for balance in result.balances.values() for key in (*balance.period, *balance.interval.values)
    }
    rows = tuple(
        (names.sentence(term.title), _unit(key), term.meaning, term.sign)
        for key, term in TERMS.items()
        if key in present and not (key.endswith("_W") and f"{key.removesuffix('_W')}_J" in present)
    )
    return Table("Names of the figures", ("Figure", "Unit", "Meaning", "Sign"), rows)


def _unit(key: str) -> str:
    label = "points" if key == "margin" else DISPLAY[TERMS[key].quantity].label
    return f"{label}, and kW over an interval" if key.endswith("_J") else label
