"""Sentences for findings of the value tests: single readings, zeros, ends of ranges, swapped pairs."""

from __future__ import annotations

import math
from collections.abc import Callable

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.numbers import duration, percent, significant
from auditor.report.wording import names
from auditor.report.wording.data_findings import Text, length, many, place, size, subject, value, when


def _spikes(finding: Finding, plant: Plant) -> Text:
    first = finding.words.get("first")
    shown = f", the first “{first}” in {place(finding)}," if first is not None else ""
    declared = plant.tags.get(finding.tag or "")
    if declared is not None and declared.between == "counter":
        return (
            f"{subject(finding, plant)}, a counter, has readings that are off",
            f"{many(finding, 'single reading')}{shown} {when(finding, plant)} did not fit between the "
            "readings before and after it, and were left out. What was counted across them is kept.",
            f"Look at {place(finding)}: a reading torn on its way to the logger looks like this.",
        )
    return (
        f"{subject(finding, plant)} has spikes",
        f"{many(finding, 'reading')}{shown} {when(finding, plant)} stood far from both neighbours and "
        f"were rejected.{size(finding, 'Up to {} passed in that time.')}",
        f"Look at {place(finding)}: if the plant can really do that, raise the limit in the plant file; "
        "if not, look at the wiring, the shield and the transmission of this signal.",
    )


def _changed_too_fast(finding: Finding, plant: Plant) -> Text:
    first = finding.words.get("first")
    shown = f", the first “{first}” in {place(finding)}," if first is not None else ""
    return (
        f"{subject(finding, plant)} changed faster than it can",
        f"{many(finding, 'reading')}{shown} {when(finding, plant)} lay farther from the last believed "
        f"reading than the plant file lets it change, and were rejected."
        f"{size(finding, 'Up to {} passed in that time.')}",
        f"Look at {place(finding)}: a loose contact or a sensor pulled out jumps like this; if the plant "
        "can really do it, raise change_at_most in the plant file.",
    )


def _zero_while_running(finding: Finding, plant: Plant) -> Text:
    evidence, state = finding.words.get("evidence"), finding.words.get("state")
    told = f"while {names.tag(plant, evidence)} says that cannot be" if evidence else "while it cannot be"
    if evidence and state:
        told = f"while {names.tag(plant, evidence)} was “{state}”"
    lasted = finding.numbers.get("zero_s", length(finding))
    return (
        f"{subject(finding, plant)} showed zero {told}",
        f"Exact zeros {when(finding, plant)} ({duration(lasted)}), the first in {place(finding)}: they count "
        f"as missing, not as zero.{size(finding, 'About {} passed in that time.')}",
        "Ask whoever keeps the logger whether it writes zero when it loses the signal.",
    )


def _at_range_end(finding: Finding, plant: Plant) -> Text:
    lasted, of_time, of_amount = (
        finding.numbers.get(name, math.nan) for name in ("at_end_s", "share_of_time", "share_of_amount")
    )
    shares = f" ({percent(of_time)} of its time, {percent(of_amount)} of its sum)"
    told = f" for {duration(lasted)}{shares if math.isfinite(of_time) else ''}" if lasted == lasted else ""
    return (
        f"{subject(finding, plant)} was at the end of its range",
        f"{many(finding, 'reading')} {when(finding, plant)} stood at the end of what it can show{told}. "
        "There the true value lies beyond the reading: every figure made of it is only a bound, low at the "
        f"upper end, high at the lower one.{size(finding, 'It showed {} in that time.')}",
        "Compare the span set in the instrument with what the plant does, and widen it.",
    )


def _stood_long(finding: Finding, plant: Plant) -> Text:
    at = value(finding, plant, finding.numbers.get("value_SI", math.nan))
    usual = finding.numbers.get("usual_s", math.nan)
    habit = f", though on most days it never stands longer than {duration(usual)}" if usual == usual else ""
    return (
        f"{subject(finding, plant)} stood still for unusually long",
        f"It showed one and the same value{f', {at},' if at else ''} {when(finding, plant)} "
        f"({duration(length(finding))}) while the machine ran{habit}. No frozen_after is declared for it, so "
        f"nothing was rejected.{size(finding, 'About {} passed in that time.')}",
        "Was the sensor alive? If not, declare frozen_after for this tag in the plant file, or exclude the "
        "stretch.",
    )


def _coarse_steps(finding: Finding, plant: Plant) -> Text:
    share, smallest = (finding.numbers.get(name, math.nan) for name in ("share", "smallest_interval_s"))
    interval = finding.numbers.get("interval_s", math.nan)
    told = "The steps of its reading are coarse against what it counts in one interval"
    if math.isfinite(share):
        told = f"One step of its reading is {percent(share)} of what it counts in {duration(interval)}"
    return (
        f"{subject(finding, plant)}, a counter, is too coarse for the interval",
        f"{told}: single intervals scatter by as much, sums over the period do not."
        + (f" Intervals of {duration(smallest)} or more are honest." if math.isfinite(smallest) else ""),
        "Choose a longer interval in the plant file, or have the logger read a finer register.",
    )


def _swapped_pair(finding: Finding, plant: Plant) -> Text:
    tags = [name for name in finding.words.get("tags", "").split(", ") if name]
    pair = names.listing([names.tag(plant, name) for name in tags])
    of_time, apart_K = (finding.numbers.get(name, math.nan) for name in ("share_of_time", "apart_K"))
    how_long = f"for {percent(of_time)} of its running time" if math.isfinite(of_time) else "for long"
    apart = f", by {significant(apart_K, 3)}\u00a0K in the mean" if math.isfinite(apart_K) else ""
    return (
        f"inlet and outlet of {subject(finding, plant)} are perhaps swapped",
        f"{how_long} the outlet was on the wrong side of the inlet for its role{apart}, so the stream flows "
        f"backwards in the balance. Nothing was swapped.{size(finding, 'This touches {}.')}",
        f"Are {pair or 'the two thermometers'} swapped? Put a hand-held thermometer on both pipes while the "
        "machine runs; correct the plant file or the wiring.",
    )


WRITERS: dict[FindingCode, Callable[[Finding, Plant], Text]] = {
    FindingCode.SPIKES: _spikes,
    FindingCode.CHANGED_TOO_FAST: _changed_too_fast,
    FindingCode.ZERO_WHILE_RUNNING: _zero_while_running,
    FindingCode.AT_RANGE_END: _at_range_end,
    FindingCode.STOOD_LONG: _stood_long,
    FindingCode.COARSE_STEPS: _coarse_steps,
    FindingCode.SWAPPED_PAIR: _swapped_pair,
}
