"""Pictures of how a machine ran: efficiency over time and against load, rejected heat by day."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.records.kinds import KINDS
from auditor.records.machines import CeilingKind
from auditor.records.verdicts import Verdict
from auditor.report import numbers
from auditor.report.charts.against_load import DRAWN, efficiency_against_load
from auditor.report.charts.over_time import axis_top, drawable, efficiency_over_time, height_px
from auditor.report.charts.rejection import rejected_heat_by_day
from auditor.report.charts.thinning import MOST_POINTS, group_size
from auditor.report.clock import standard_offset
from auditor.report.elements import Figure, Table
from auditor.report.sections import labels
from auditor.report.sections.daily import Days, daily_table
from auditor.report.wording import names
from auditor.report.wording.methods import CEILINGS
from auditor.report.wording.verdicts import MEANINGS
from auditor.units import DISPLAY

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.machines import Machine
    from auditor.records.result import AuditResult, MachineJudgement


def verdict_table(judgement: MachineJudgement) -> Table:
    """Hours and share of energy by verdict, with what each word means."""
    rows = [
        (
            word.word,
            numbers.to_places(judgement.hours.get(word.word, 0.0), 2),
            numbers.percent(judgement.energy_share.get(word.word, 0.0)),
            MEANINGS[word],
        )
        for word in Verdict
        if word is not Verdict.LOW or judgement.hours.get(word.word, 0.0) > 0.0
    ]
    total = numbers.to_places(sum(judgement.hours.values()), 2)
    return Table(
        "Hours and energy by verdict",
        ("Verdict", "Hours", "Share of input energy", "Meaning"),
        tuple(rows),
        numeric=(1, 2),
        total=("all", total, numbers.percent(sum(judgement.energy_share.values())), ""),
        note="The first verdict that applies, from the top, is the one that is given.",
    )


def over_time_figure(anchor: str, machine: Machine, days: Days, result: AuditResult) -> Figure | None:
    """Headline efficiency, its ceiling and the verdict strip; None for a machine without an efficiency."""
    balance, judgement = result.balances[machine.name], result.judgements[machine.name]
    key = labels.headline_ratio(machine, balance)
    if key is None or key not in balance.interval.values:
        return None
    values = balance.interval.values[key]
    ceiling = balance.interval.values.get("ceiling") if machine.ceiling is not None else None
    named = CEILINGS[machine.ceiling.kind][0] if machine.ceiling is not None else ""
    offset = standard_offset(result.plant.site.zone, result.period.start_us)
    title = labels.title(machine, key)
    U = balance.interval_U.get(key, np.full(values.shape, np.nan))
    drawn = ceiling if _ceiling_is_drawn(machine) else None
    chart = efficiency_over_time(
        balance.interval,
        (title, values, U),
        (named, drawn) if drawn is not None else None,
        judgement.verdict,
        offset,
    )
    shown = drawable(values, judgement.verdict)
    caption = " ".join(
        (
            _range_sentence(title, shown, ceiling, f"{named} ({_mark(machine)})"),
            _strip_sentence(judgement),
            _beyond_sentence(shown, axis_top(shown, drawn)),
            _thinning_sentence(values.shape[0]),
            f"The time axis is the site's standard time ({offset[1]}) throughout, so that no hour is "
            "shown twice.",
        )
    )
    tables = (daily_table(days, balance), verdict_table(judgement))
    heading = f"{names.sentence(title)} over time"
    return Figure(
        f"{anchor}-time", heading, caption, tables, chart=chart, height=height_px(judgement.verdict)
    )


def _ceiling_is_drawn(machine: Machine) -> bool:
    """Tell whether the ceiling fits on the axis: that of a fuel, near 100 %, would flatten all else."""
    return machine.ceiling is not None and machine.ceiling.kind is not CeilingKind.FUEL_EXERGY


def _mark(machine: Machine) -> str:
    return "dashed" if _ceiling_is_drawn(machine) else "above this axis, not drawn"


def _range_sentence(
    title: str, shown: NDArray[np.float64], ceiling: NDArray[np.float64] | None, named: str
) -> str:
    finite = shown[np.isfinite(shown)]
    if not finite.size:
        return f"No interval gave a {title}."
    low, middle, high = np.percentile(finite, [10, 50, 90])
    said = (
        f"Half of the intervals lie above {numbers.percent(middle)}; eight in ten lie between "
        f"{numbers.percent(low)} and {numbers.percent(high)}."
    )
    if ceiling is not None and np.isfinite(ceiling).any():
        ends = [numbers.percent(float(end)) for end in np.nanpercentile(ceiling, [1, 99])]
        between = f"at {ends[0]}" if ends[0] == ends[1] else f"between {ends[0]} and {ends[1]}"
        said += f" The {named} lies {between}."
    return f"{said} The shaded band is the uncertainty (k = 2)."


def _strip_sentence(judgement: MachineJudgement) -> str:
    parts = [
        f"{numbers.to_places(judgement.hours[word.word], 1)}{numbers.NBSP}h {word.word}"
        for word in sorted(Verdict, key=lambda word: -judgement.hours.get(word.word, 0.0))
        if judgement.hours.get(word.word, 0.0) > 0.0
    ]
    return f"The strip below tells the verdict of every moment: {names.listing(parts)}."


def _beyond_sentence(shown: NDArray[np.float64], top: float) -> str:
    beyond = int((shown > top).sum() + (shown < 0.0).sum())
    if not beyond:
        return ""
    return f"{names.sentence(numbers.count(beyond, 'interval lies', 'intervals lie'))} beyond the axis."


def _thinning_sentence(points: int) -> str:
    size = group_size(points)
    if size == 1:
        return ""
    return (
        f"Of every {size} neighbouring intervals the lowest and the highest are drawn (at most "
        f"{MOST_POINTS} points)."
    )


def load_figure(anchor: str, machine: Machine, result: AuditResult) -> Figure | None:
    """Headline efficiency against load (against input where no load is known)."""
    balance, judgement = result.balances[machine.name], result.judgements[machine.name]
    key = labels.headline_ratio(machine, balance)
    if key is None or key not in balance.interval.values:
        return None
    title = labels.title(machine, key)
    load, load_title, unit = _load(machine, balance)
    values = balance.interval.values[key]
    ceiling = balance.interval.values.get("ceiling") if _ceiling_is_drawn(machine) else None
    drawn = np.isin(judgement.verdict, DRAWN)
    chart = efficiency_against_load(
        (f"{load_title}, {unit}", load), (title, values), ceiling, judgement.verdict
    )
    table = _load_table((load, load_title, unit), values, drawn)
    caption = (
        "Each point is one interval; its shape is its verdict. "
        f"{_spread_sentence(title, load_title, unit, load, drawn)}{_band_sentence(machine, key)}"
    )
    return Figure(
        f"{anchor}-load", f"{names.sentence(title)} against load", caption, (table,), chart=chart, height=400
    )


def _load(machine: Machine, balance: MachineBalance) -> tuple[NDArray[np.float64], str, str]:
    if np.isfinite(balance.interval.load).any():
        return balance.interval.load * 100.0, "load", "% of rated power"
    key = next((key for key in ("heat_in_W", "fuel_in_W") if key in balance.interval.values), None)
    if key is None:
        return np.full(balance.interval.start_us.shape, np.nan), "input", "kW"
    return balance.interval.values[key] / DISPLAY["power"].size_si, "input", "kW"


def _spread_sentence(
    title: str, load_title: str, unit: str, load: NDArray[np.float64], drawn: NDArray[np.bool_]
) -> str:
    seen = load[drawn & np.isfinite(load)]
    if not seen.size:
        return f"No interval has both a {title} and a known {load_title}."
    low, high = (numbers.significant(float(end)) for end in np.percentile(seen, [1, 99]))
    return f"The {load_title} ran from {low} to {high} {unit}."


def _band_sentence(machine: Machine, key: str) -> str:
    kind = KINDS.get(machine.kind)
    if kind is None or key not in kind.bands:
        return ""
    low, high = kind.bands[key]
    return (
        f" For this kind of machine {numbers.percent(low, 0)} to {numbers.percent(high, 0)} is held to "
        "be plausible."
    )


def _load_table(
    load: tuple[NDArray[np.float64], str, str],
    values: NDArray[np.float64],
    drawn: NDArray[np.bool_],
) -> Table:
    """Ten classes of load: number of intervals, and the range of the efficiency in each."""
    known = drawn & np.isfinite(load[0]) & np.isfinite(values)
    x, y = load[0][known], values[known]
    rows = []
    if x.size:
        step = _nice_step(float(x.max() - min(x.min(), 0.0)))
        place = np.floor(x / step).astype(int)
        for index in np.unique(place):
            inside = y[place == index]
            low, middle, high = np.percentile(inside, [10, 50, 90])
            rows.append(
                (
                    f"{numbers.significant(index * step)} to {numbers.significant((index + 1) * step)}",
                    numbers.whole(inside.size),
                    *(numbers.percent(float(value)) for value in (low, middle, high)),
                )
            )
    title = names.sentence(f"{load[1]}, {load[2]}")
    return Table(
        f"Efficiency by {load[1]}",
        (title, "Intervals", "One in ten below", "Half below", "Nine in ten below"),
        tuple(rows),
        numeric=(1, 2, 3, 4),
    )


def _nice_step(reach: float) -> float:
    """Choose a round class width that gives about ten classes."""
    raw = max(reach, 1e-9) / 10.0
    power = 10.0 ** np.floor(np.log10(raw))
    return float(power * next(factor for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= raw * 0.999))


def rejection_figure(anchor: str, machine: Machine, days: Days, result: AuditResult) -> Figure | None:
    """Rejected heat by day; None where the machine rejects nothing that is known."""
    implied = days.energy_J.get("rejected_W")
    if implied is None:
        return None
    balance = result.balances[machine.name]
    demanded, measured = days.energy_J.get("demanded_rejection_W"), days.energy_J.get("rejected_measured_W")
    size = DISPLAY["energy"].size_si
    chart = rejected_heat_by_day(
        list(days.label),
        implied / size,
        demanded / size if demanded is not None else None,
        measured / size if measured is not None else None,
    )
    caption = " ".join(_rejection_sentences(machine, balance, result))
    table = rejection_table(balance, result)
    return Figure(f"{anchor}-rejection", "Rejected heat", caption, (table,), chart=chart, height=380)


def _rejection_sentences(machine: Machine, balance: MachineBalance, result: AuditResult) -> list[str]:
    def said(key: str) -> str:
        return labels.value(balance.period[key], result.plant.rules)

    sentences = (
        [f"Of what went in, the balance leaves {said('rejected_J')} to be rejected."]
        if "rejected_J" in balance.period
        else []
    )
    if "demanded_rejection_J" in balance.period:
        rest = f"; the rest is {said('unavoidable_rest_J')}" if "unavoidable_rest_J" in balance.period else ""
        sentences.append(
            f"The second law demands {said('demanded_rejection_J')} of it for the temperatures at hand, "
            f"whatever the machine{rest}. The rest is what a reversible engine would not have "
            "rejected; it is no saving that could be had."
        )
    else:
        sentences.append(_no_demand(machine))
    if "rejected_measured_J" in balance.period:
        sentences.append(f"Metered were {said('rejected_measured_J')} (diamonds).")
    else:
        sentences.append("None of it is metered, so that nothing tests this figure.")
    return sentences


def _no_demand(machine: Machine) -> str:
    kind = KINDS.get(machine.kind)
    if kind is not None and kind.internal_combustion:
        return (
            "How much of it the second law demands is not shown: for an engine that burns its fuel "
            "inside, neither jacket nor exhaust temperature tells it."
        )
    return "How much of it the second law demands is not shown: not every temperature it depends on is known."


def rejection_table(balance: MachineBalance, result: AuditResult) -> Table:
    """Rejected heat of the period, implied and measured, demanded and rest."""
    rows = []
    for key in ("rejected_J", "rejected_measured_J", "demanded_rejection_J", "unavoidable_rest_J"):
        figure = balance.period.get(key)
        if figure is not None:
            rows.append(
                (
                    names.sentence(names.figure(key)),
                    labels.value(figure, result.plant.rules),
                    labels.standing(figure),
                )
            )
    return Table("Rejected heat of the period", ("Part", "Energy", "Standing"), tuple(rows), numeric=(1,))
