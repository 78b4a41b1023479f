"""Labels of the figures of one machine: gross or net, electrical or shaft, and their basis."""

from __future__ import annotations

from auditor.records.balances import MachineBalance, PeriodFigure
from auditor.records.machines import CombustionAir, Machine, Role, Shaft
from auditor.records.nomenclature import TERMS
from auditor.records.plant import Rules
from auditor.records.verdicts import Status
from auditor.report import numbers
from auditor.report.wording import names, verdicts

RATIOS = ("gross", "net", "heat", "total")
_AGAINST_INPUT = (*RATIOS, "bound", "ceiling", "margin")


def title(machine: Machine, key: str) -> str:
    """``net electrical efficiency``; other figures by the nomenclature."""
    if key in ("gross", "net"):
        return f"{key} {'shaft' if _at_the_shaft(machine) else 'electrical'} efficiency"
    if key in ("work_gross_J", "work_net_J"):
        return f"{key.split('_')[1]} {'shaft work' if _at_the_shaft(machine) else 'electrical energy'}"
    if key in ("power_in_J", "power_in_W") and _only_air(machine):
        return "combustion air"
    return TERMS[key].title


def _only_air(machine: Machine) -> bool:
    """Whether nothing else than combustion air enters beside the input: cold air then counts below zero."""
    streams = machine.streams_of(Role.POWER_IN)
    return bool(streams) and all(isinstance(stream.way, CombustionAir) for stream in streams)


def _at_the_shaft(machine: Machine) -> bool:
    works = machine.streams_of(Role.WORK_OUT)
    return bool(works) and all(isinstance(stream.way, Shaft) for stream in works)


def against(machine: Machine, key: str) -> str:
    """Say what the figure is counted against; empty for figures that stand for themselves."""
    if key in _AGAINST_INPUT:
        return f"of {names.basis(machine)}"
    if key == "ceiling_share":
        return "of the ceiling"
    if key.startswith("fuel_in_") and key.removesuffix("_J").endswith(("higher", "lower")):
        return "on the value named"
    if key == "fuel_in_J":
        return f"on the {machine.basis} heating value"
    return ""


def headline_keys(machine: Machine, balance: MachineBalance) -> tuple[str, ...]:
    """Choose the three figures of the first page: two efficiencies and the energy delivered, or the like."""
    has_heat = bool(machine.streams_of(Role.USEFUL_HEAT))
    if machine.headline is not None:
        other = {"gross": "net", "net": "gross"}[machine.headline]
        wanted = [machine.headline, *(["total"] if has_heat else []), other, f"work_{machine.headline}_J"]
        wanted = [*wanted[:2], wanted[-1], *wanted[2:-1], "ceiling"]
    else:
        wanted = ["heat", "useful_heat_J", "fuel_in_J", "heat_in_J"]
    return tuple(key for key in wanted if key in balance.period)[:3]


def headline_ratio(machine: Machine, balance: MachineBalance) -> str | None:
    """Choose the efficiency that the machine is judged by."""
    keys = [key for key in headline_keys(machine, balance) if key in RATIOS]
    return keys[0] if keys else None


def is_shown(figure: PeriodFigure | None) -> bool:
    """Tell whether the figure may be printed as a number."""
    return figure is not None and figure.status is not Status.WITHHELD and figure.value == figure.value


def value(figure: PeriodFigure, rules: Rules) -> str:
    """Write the figure with its uncertainty, or the reason why it is not published."""
    if figure.status is Status.WITHHELD:
        return f"withheld: {verdicts.withheld(figure.withheld_because, figure.coverage, rules)}"
    return numbers.figure(figure.key, figure.value, figure.expanded_U).text


def standing(figure: PeriodFigure) -> str:
    """``firm, readings cover 97.2 % of the energy``."""
    if figure.status is Status.WITHHELD:
        return figure.status.value
    return f"{figure.status.value}, {numbers.percent(figure.coverage)} of the energy covered"
