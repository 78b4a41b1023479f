"""Sentences for findings about balances and figures of a machine."""

from __future__ import annotations

import math
from collections.abc import Callable

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.clock import Clock
from auditor.report.numbers import count, percent, shown
from auditor.report.wording import names
from auditor.report.wording.data_findings import Text, size, when
from auditor.report.wording.unit_findings import unit_suspected
from auditor.report.wording.verdicts import withheld
from auditor.units import DISPLAY


def _open_balance(finding: Finding, plant: Plant) -> Text:
    title = names.machine(plant, finding.machine)
    residual_J = finding.numbers.get("residual_J", math.nan)
    residual = shown(abs(residual_J), finding.numbers.get("residual_U_J", math.nan), DISPLAY["energy"]).text
    open_now = bool(finding.numbers.get("open", 1.0))
    way = "enters that nobody finds again" if residual_J > 0 else "leaves than enters"
    return (
        f"the energy balance of {title} {'does not close' if open_now else 'only just closes'}",
        f"{residual} more {way}, counted over the whole period; most days are out of balance "
        f"{when(finding, plant)}. One balance alone cannot say which meter is wrong.",
        "Compare the meter with the largest share of the uncertainty (ranking below) with a second "
        "instrument.",
    )


def _impossible(finding: Finding, plant: Plant) -> Text:
    title = names.machine(plant, finding.machine)
    number = finding.numbers.get("count", math.nan)
    reasons = [reason for reason in finding.words.get("reasons", "").split("; ") if reason]
    because = f" ({names.listing(reasons)})" if reasons else ""
    daily = (
        " They come back at the same time of the day: look first for a sensor that stands in the sun or "
        "in a draught then, or for a daily routine."
        if _is_daily(finding)
        else ""
    )
    return (
        f"{title} shows what no machine can do",
        f"{count(number, 'interval')} {_recurring(finding, plant)} {'breaks' if number == 1 else 'break'} a "
        f"law of thermodynamics beyond the uncertainty{because}."
        f"{size(finding, 'Together they exceed the limit by {}.')} A sensor is wrong before the machine "
        f"is.{daily}",
        "Compare the inputs of this machine with hand-held instruments, one after the other, and look at "
        "the raw lines of that time.",
    )


def _recurring(finding: Finding, plant: Plant) -> str:
    """When the intervals of one or several clusters lay."""
    clusters, days = (finding.numbers.get(name, 1.0) for name in ("clusters", "days"))
    if clusters < 2:
        return when(finding, plant)
    said = f"in {count(clusters, 'stretch', 'stretches')} on {count(days, 'day')} {when(finding, plant)}"
    if _is_daily(finding):
        first, last = (_time_of_day(finding.numbers[name]) for name in ("earliest_s", "latest_s"))
        said += f", always between {first} and {last},"
    return said


def _is_daily(finding: Finding) -> bool:
    """Whether the clusters fall on several days, and within the same six hours of each."""
    spread_s = finding.numbers.get("latest_s", math.nan) - finding.numbers.get("earliest_s", math.nan)
    return finding.numbers.get("days", 1.0) >= 3 and spread_s <= 6 * 3600.0


def _time_of_day(seconds: float) -> str:
    minutes = round(seconds / 60.0)
    return f"{minutes // 60:02d}:{minutes % 60:02d}"


def _step(finding: Finding, plant: Plant) -> Text:
    key = finding.words.get("figure", "")
    before, after = (finding.numbers.get(name, math.nan) for name in ("before", "after"))
    clock = Clock(plant.site.zone)
    since = clock.moment(finding.start_us) if finding.start_us is not None else "one moment"
    until = f" until {clock.moment(finding.end_us)}" if finding.end_us is not None else ""
    return (
        f"a step in the {names.figure(key)} of {names.machine(plant, finding.machine)}",
        f"From {since} on it stands at {percent(after)} instead of {percent(before)}."
        f"{size(finding, f'Counted as input for the same output, that is {{}}{until}.')} "
        "A step this sudden is more often a meter or its settings than the machine.",
        "Ask what was changed that day: a meter, its settings, what the signal means, or the machine itself.",
    )


def _heating_value(finding: Finding, plant: Plant) -> Text:
    fuel = finding.words.get("fuel", finding.stream or "the fuel")
    before, after = (finding.numbers.get(name, math.nan) for name in ("before", "after"))
    change = (
        f", different by {percent(after / before - 1.0)}" if before and math.isfinite(before * after) else ""
    )
    since = (
        f" from {Clock(plant.site.zone).moment(finding.start_us)} on" if finding.start_us is not None else ""
    )
    source = finding.words.get("source", "")
    return (
        f"the heating value of {names.plain(fuel)} changed",
        f"The plant file gives a new value{since}{change}{f' (source: {source})' if source else ''}. "
        "Efficiencies before and after stand on different values: that step is not the "
        f"machine's.{size(finding, 'It moves the input by {}.')}",
        "Keep the supplier's sheet for both values with this statement.",
    )


def _withheld(finding: Finding, plant: Plant) -> Text:
    key = finding.words.get("figure", "")
    because = withheld(
        finding.words.get("because", ""), finding.numbers.get("coverage", math.nan), plant.rules
    )
    return (
        f"the {names.figure(key)} of {names.machine(plant, finding.machine)} is withheld",
        f"It is not published: {because}.",
        "Bring the missing readings (see gaps and rejected readings) and run the audit again.",
    )


WRITERS: dict[FindingCode, Callable[[Finding, Plant], Text]] = {
    FindingCode.OPEN_BALANCE: _open_balance,
    FindingCode.IMPOSSIBLE_CLUSTER: _impossible,
    FindingCode.UNIT_SUSPECTED: unit_suspected,
    FindingCode.STEP_IN_FIGURE: _step,
    FindingCode.HEATING_VALUE_CHANGED: _heating_value,
    FindingCode.WITHHELD_FIGURE: _withheld,
}
