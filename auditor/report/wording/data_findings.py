"""Sentences for findings about the readings of single tags and streams."""

from __future__ import annotations

import math
from collections.abc import Callable

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.clock import Clock
from auditor.report.numbers import count, duration, energy, power, significant
from auditor.report.wording import names

Text = tuple[str, str, str]
"""Title, sentence and check."""


def when(finding: Finding, plant: Plant) -> str:
    """``from 28 Jul, 09:00 to 11:30``, or the single moment; empty where the finding has no time."""
    clock = Clock(plant.site.zone)
    if finding.start_us is None:
        return ""
    # A stretch that ends just after its last stamp is told by that stamp.
    last_us = None if finding.end_us is None else finding.end_us - finding.end_us % 1_000_000
    if last_us is None or last_us <= finding.start_us:
        return f"at {clock.moment(finding.start_us)}"
    return clock.span(finding.start_us, last_us)


def length(finding: Finding) -> float:
    """Length of the finding's stretch of time [s]; NaN without both ends."""
    if finding.start_us is None or finding.end_us is None:
        return math.nan
    return (finding.end_us - finding.start_us) / 1e6


def place(finding: Finding) -> str:
    """``line 512 of power/day-28.csv``, or less where less is known."""
    file = finding.file or (f"the export {finding.export}" if finding.export else "the exports")
    return f"line {finding.line} of {file}" if finding.line is not None else file


def size(finding: Finding, said: str) -> str:
    """Put the finding's energy into a sentence with ``{}`` for it; nothing where it has none."""
    if finding.energy_J is None or not finding.energy_J:
        return ""
    return " " + said.format(energy(abs(finding.energy_J)))


def many(finding: Finding, one: str, plural: str | None = None) -> str:
    """``12 readings``; ``some readings`` where the number is not known."""
    number = finding.numbers.get("count")
    words = plural if plural is not None else f"{one}s"
    return f"some {words}" if number is None else count(number, one, words)


def subject(finding: Finding, plant: Plant) -> str:
    """``tag oil_flow (column TO-F)``; the stream or the export where no tag is named."""
    if finding.tag is not None:
        return f"tag {names.tag(plant, finding.tag)}"
    if finding.stream is not None:
        return f"the stream {names.plain(finding.stream)} of {names.machine(plant, finding.machine)}"
    return f"the export {finding.export}" if finding.export is not None else "a tag"


def value(finding: Finding, plant: Plant, si: float) -> str:
    """Write a value in the unit of the finding's tag, four digits."""
    declared = plant.tags.get(finding.tag or "")
    if declared is None or not math.isfinite(si):
        return ""
    return f"{significant((si - declared.offset) / declared.scale, 4)}\u00a0{names.units(declared.unit)}"


def _gap(finding: Finding, plant: Plant) -> Text:
    tags = [name for name in finding.words.get("tags", "").split(", ") if name]
    title = f"no readings from {subject(finding, plant)}"
    if finding.tag is None and tags:
        title = f"no readings from {count(len(tags), 'tag')} of the export {finding.export}"
    told = {
        "never logged": "It was never logged in this period.",
        "late start": f"Logging began late: nothing {when(finding, plant)}.",
        "early end": f"Logging ended early: nothing {when(finding, plant)}.",
    }.get(finding.words.get("kind", ""), f"Nothing usable was logged {when(finding, plant)}.")
    listed = f" Tags: {names.listing(tags)}." if len(tags) > 1 else ""
    lasted = finding.numbers.get("gap_s", length(finding))
    return (
        title,
        f"{told}{listed} These {duration(lasted)} are left out of every figure that needs them; nothing "
        f"was filled in.{size(finding, 'About {} passed in that time.')}",
        "Ask whoever keeps the logger whether the export can be run again for this stretch.",
    )


def _frozen(finding: Finding, plant: Plant) -> Text:
    at = value(finding, plant, finding.numbers.get("value_SI", math.nan))
    return (
        f"{subject(finding, plant)} stood still",
        f"It showed one and the same value{f', {at},' if at else ''} {when(finding, plant)} "
        f"({duration(length(finding))}), starting with {place(finding)}. A live sensor moves a little; "
        f"these readings were rejected.{size(finding, 'About {} passed in that time.')}",
        "Compare it with a hand-held instrument at the same place, and look whether the logger still "
        "received it.",
    )


def _out_of_range(finding: Finding, plant: Plant) -> Text:
    declared = plant.tags.get(finding.tag or "")
    if declared is None:
        reason = finding.words.get("reason", "outside what can be computed")
        return (
            f"{subject(finding, plant)} could not be computed",
            f"All its inputs were there {when(finding, plant)}, but {many(finding, 'tick')} of them gave "
            f"no number: {reason}.{size(finding, 'About {} passed in that time.')}",
            "Look at the inputs of that time: a temperature, an oxygen reading or a date in the plant "
            "file is out.",
        )
    limits = ""
    if declared.believable is not None:
        ends = [significant((end - declared.offset) / declared.scale, 4) for end in declared.believable]
        limits = f" of {ends[0]} to {ends[1]}\u00a0{names.units(declared.unit)}"
    first, last = finding.words.get("first"), finding.words.get("last")
    shown = f" (the first “{first}”, the last “{last}”)" if first is not None and last is not None else ""
    return (
        f"{subject(finding, plant)} left its believable range",
        f"{many(finding, 'reading')}{shown} {when(finding, plant)} lay outside the range{limits} and "
        f"were rejected.{size(finding, 'Up to {} passed in that time.')}",
        f"Look at {place(finding)}: if the value is real, widen the range in the plant file; if not, "
        "look at the sensor, its unit and its wiring.",
    )


def _status_words(finding: Finding, plant: Plant) -> Text:
    words = [word for word in finding.words.get("words", "").split(", ") if word]
    quoted = f" ({names.listing([f'“{word}”' for word in words])})" if words else ""
    return (
        f"{subject(finding, plant)} logged words instead of numbers",
        f"{many(finding, 'cell')} held a word{quoted} {when(finding, plant)}, the first in "
        f"{place(finding)}. They count as missing.",
        "Ask the logger's maker what the word stands for; if it stands for a number, declare it as a "
        "status word.",
    )


def _counter_reset(finding: Finding, plant: Plant) -> Text:
    fell = finding.words.get("kind", "fell") == "fell"
    told = "Its count fell" if fell else "Its count rose faster than its meter can count"
    lasted = finding.numbers.get("missing_s", length(finding))
    return (
        f"{subject(finding, plant)}, a counter, {'was reset or exchanged' if fell else 'jumped'}",
        f"{told} {when(finding, plant)}. What passed in these {duration(lasted)} is unknown: it counts "
        f"as missing, never as negative.{size(finding, 'About {} passed in that time.')}",
        "Look in the maintenance log for a meter exchange, and write down the last and the first index "
        "reading.",
    )


def _conflict(finding: Finding, plant: Plant) -> Text:
    export = plant.exports.get(finding.export or "")
    rule = f" The rule “{export.when_stamps_repeat}” decided." if export else ""
    kept = finding.words.get("kept")
    if kept is not None and kept != finding.file:
        rule = f" The values of {kept} were kept, because its pattern stands first in the plant file."
    return (
        f"{subject(finding, plant)} has two values for one stamp",
        f"{many(finding, 'stamp')} {when(finding, plant)} carried values that differ.{rule}"
        f"{size(finding, 'The choice moves the energy by {}.')}",
        f"Open {place(finding)} beside "
        f"{kept if kept not in (None, finding.file) else 'the lines that repeat it'} and decide which "
        "of them is the original.",
    )


def _distrusted(finding: Finding, plant: Plant) -> Text:
    reason = finding.words.get("reason", "")
    return (
        f"{subject(finding, plant)} was excluded by declaration",
        f"The plant file excludes it {when(finding, plant)}{f': “{reason}”' if reason else ''}."
        f"{size(finding, 'About {} passed in that time.')}",
        "Take the entry out of the plant file once its reason no longer holds.",
    )


def _creep(finding: Finding, plant: Plant) -> Text:
    watts, still_s = (finding.numbers.get(name, math.nan) for name in ("power_W", "standstill_s"))
    shown = f"{power(watts)} in the mean" if math.isfinite(watts) else "a flow"
    during = f" over {duration(still_s)}" if math.isfinite(still_s) else ""
    return (
        f"{subject(finding, plant)} goes on at standstill",
        f"Its meters show {shown} while the machine stands "
        f"still{during}.{size(finding, 'That is {} in the period.')} It is kept out of every efficiency.",
        "Close the valve and read the meter: one that still counts needs its zero set; else something leaks.",
    )


WRITERS: dict[FindingCode, Callable[[Finding, Plant], Text]] = {
    FindingCode.GAP: _gap,
    FindingCode.FROZEN: _frozen,
    FindingCode.OUT_OF_RANGE: _out_of_range,
    FindingCode.STATUS_WORDS: _status_words,
    FindingCode.COUNTER_RESET: _counter_reset,
    FindingCode.CONFLICT: _conflict,
    FindingCode.DISTRUSTED: _distrusted,
    FindingCode.CREEP_AT_STANDSTILL: _creep,
}
