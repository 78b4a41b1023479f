"""Figures of one interval, each as an equation with its numbers."""

# ruff: noqa: RUF001 - text for paper uses the trade's own signs

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.machines import CeilingKind, Machine
from auditor.records.nomenclature import TERMS
from auditor.report import numbers
from auditor.report.sections import labels
from auditor.report.wording import names
from auditor.units import DISPLAY, DisplayUnit

if TYPE_CHECKING:
    from auditor.records.result import AuditResult


@dataclass(frozen=True)
class Line:
    """One equation: what it gives, and how."""

    name: str
    equation: str


_SIGNED = (
    ("fuel_in_W", 1.0),
    ("heat_in_W", 1.0),
    ("power_in_W", 1.0),
    ("work_gross_W", -1.0),
    ("useful_heat_W", -1.0),
    ("loss_W", -1.0),
    ("rejected_measured_W", -1.0),
)
_TOPS = {
    "gross": ("work_gross_W",),
    "net": ("work_gross_W", "−own_use_W"),
    "heat": ("useful_heat_W",),
    "total": ("work_gross_W", "useful_heat_W"),
    "bound": ("work_gross_W", "−power_in_W"),
}


def at_interval(
    machine: Machine, index: int, result: AuditResult
) -> tuple[dict[str, float], dict[str, float]]:
    """Figures of one interval and their expanded uncertainties, SI, by key of the nomenclature."""
    balance = result.balances[machine.name]
    at = {key: float(values[index]) for key, values in balance.interval.values.items()}
    U = {key: float(values[index]) for key, values in balance.interval_U.items()}
    return at, U


def figure_lines(machine: Machine, index: int, result: AuditResult) -> tuple[Line, ...]:
    """First law, efficiencies, ceiling and margin of one interval, with numbers and uncertainties."""
    at, U = at_interval(machine, index, result)
    lines = [_first_law(key, at, U) for key in ("residual_W", "rejected_W") if key in at]
    entering = sum(at[key] for key in ("fuel_in_W", "heat_in_W") if key in at)
    for key, parts in _TOPS.items():
        if key in at:
            lines.append(_ratio(machine, key, parts, entering, at, U))
    if machine.ceiling is not None and "ceiling" in at:
        lines.append(_ceiling(machine, at, U, entering))
    if "margin" in at:
        lines.append(_margin(at, U))
    return tuple(lines)


def in_kW(watts: float) -> str:
    """Write a power in kilowatts with the digits that an equation needs."""
    return numbers.significant(watts / DISPLAY["power"].size_si, 6)


def printed_result(key: str, at: dict[str, float], U: dict[str, float]) -> str:
    """Write the result of an equation: with the digits to check it, then as its uncertainty allows."""
    unit = DISPLAY[TERMS[key].quantity]
    if key == "margin":
        unit = DisplayUnit("points", unit.size_si)
    exact = numbers.significant(float(unit.from_si(at[key])), 5)
    size = numbers.shown(at[key], U.get(key, float("nan")), unit)
    return (
        f"{exact}{numbers.NBSP}{unit.label}, that is {size.text}"
        if size.U
        else f"{exact}{numbers.NBSP}{unit.label}"
    )


def _first_law(key: str, at: dict[str, float], U: dict[str, float]) -> Line:
    parts = [(part, sign) for part, sign in _SIGNED if part in at]
    if key == "rejected_W":
        parts = [(part, sign) for part, sign in parts if part != "rejected_measured_W"]
    words = signed([(names.figure(part), sign) for part, sign in parts])
    sums = signed([(in_kW(at[part]), sign) for part, sign in parts])
    return Line(names.sentence(names.figure(key)), f"{words} = {sums} = {printed_result(key, at, U)}")


def signed(parts: list[tuple[str, float]]) -> str:
    """Join terms by plus and minus."""
    text = ""
    for word, sign in parts:
        glue = (" + " if sign > 0 else " − ") if text else ("" if sign > 0 else "−")
        text += f"{glue}({word})" if word.startswith(numbers.MINUS) else f"{glue}{word}"
    return text


def _ratio(
    machine: Machine,
    key: str,
    parts: tuple[str, ...],
    entering: float,
    at: dict[str, float],
    U: dict[str, float],
) -> Line:
    known = [(part.lstrip("−"), -1.0 if part.startswith("−") else 1.0) for part in parts]
    known = [(part, sign) for part, sign in known if part in at]
    top = signed([(in_kW(at[part]), sign) for part, sign in known])
    top = f"({top})" if len(known) > 1 else top
    return Line(
        names.sentence(labels.title(machine, key)),
        f"{top} / {in_kW(entering)} = {printed_result(key, at, U)}",
    )


def _ceiling(machine: Machine, at: dict[str, float], U: dict[str, float], entering: float) -> Line:
    assert machine.ceiling is not None
    if machine.ceiling.kind is CeilingKind.FUEL_EXERGY:
        exergy = at.get("fuel_exergy_W", np.nan)
        return Line("Ceiling", f"{in_kW(exergy)} / {in_kW(entering)} = {printed_result('ceiling', at, U)}")
    hot, cold = (at.get(f"{side}_temperature_K", np.nan) for side in ("source", "sink"))
    by_hand = numbers.percent(1.0 - cold / hot, 3) if hot else numbers.UNKNOWN
    return Line(
        "Ceiling",
        f"1 − {numbers.significant(cold, 6)} K / {numbers.significant(hot, 6)} K = {by_hand}; taken tick "
        f"by tick and weighted by heat: {printed_result('ceiling', at, U)}",
    )


def _margin(at: dict[str, float], U: dict[str, float]) -> Line:
    margin, spread = at["margin"], U.get("margin", float("nan"))
    said = ""
    if np.isfinite(margin) and np.isfinite(spread):
        beyond = margin - spread > 0.0
        above = (
            "above the ceiling by more than its uncertainty"
            if beyond
            else "above the ceiling, within its uncertainty"
        )
        said = f": {above if margin > 0.0 else 'below the ceiling'}"
    equation = (
        f"{numbers.percent(at.get('bound', np.nan), 3)} − {numbers.percent(at.get('ceiling', np.nan), 3)}"
    )
    return Line("Margin", f"{equation} = {printed_result('margin', at, U)}{said}")
