"""Sentences for findings about files, their lines, their columns and their clocks."""

from __future__ import annotations

import math
from collections.abc import Callable

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.numbers import count, duration, file_size
from auditor.report.wording import names
from auditor.report.wording.data_findings import Text, many, place, subject, value, when


def _export(finding: Finding) -> str:
    return f"the export {finding.export}" if finding.export is not None else "an export"


def _file(finding: Finding) -> str:
    return finding.file or "of unknown name"


def _clock_step(finding: Finding, plant: Plant) -> Text:
    step = finding.numbers.get("step_s", math.nan)
    if "rejected" in finding.numbers:
        return (
            f"{many(finding, 'row')} of {_file(finding)} came too late",
            f"They lie up to {duration(abs(step))} behind the rows before them, too far to be put in "
            "order, and were rejected.",
            "Split the file where its stamps fall, or ask whether the logger's clock was set.",
        )
    if "reset" in finding.numbers:
        year = finding.words.get("year", "another year")
        off = f", {_years(step)} off" if math.isfinite(step) else ""
        return (
            f"the clock of {_export(finding)} was reset to {year}",
            f"{many(finding, 'row')} of {_file(finding)} carry stamps of {year}{off}, from {place(finding)} "
            "on. When they were written, the file does not tell; they were rejected.",
            "Change the battery of the logger's clock and set it; ask its maker whether these rows can be "
            "dated again.",
        )
    moved = f" by {duration(abs(step))} {'back' if step < 0 else 'forward'}" if math.isfinite(step) else ""
    return (
        f"the clock of {_export(finding)} was set",
        f"Its stamps jump{moved} {when(finding, plant)} ({place(finding)}), the usual step between two rows "
        "counted in. Which side of the jump is right, the file does not tell.",
        "Ask who set the logger's clock that day, and compare a start or stop of the machine in two exports.",
    )


def _years(seconds: float) -> str:
    """``55.5 years``: how far a clock is off that was reset."""
    return f"{abs(seconds) / 31_556_952.0:.1f}\u00a0years"


def _clock_offset(finding: Finding, plant: Plant) -> Text:
    if "others" in finding.words:
        return _clocks_apart(finding, plant)
    sign = finding.words.get("sign", "")
    told = f"It has {many(finding, 'row')} with {sign} ({place(finding)})."
    if not sign:
        told = f"Its stamps do not fit those of the other exports {when(finding, plant)}."
    return (
        f"{_export(finding)} seems to run on another clock",
        told,
        "Compare the moment of one start or stop in two exports, then correct the export's clock in the "
        "plant file.",
    )


def _apart(seconds: float) -> str:
    """``7.2 min``: an offset between clocks, tenths of a minute."""
    return f"{abs(seconds) / 60.0:.1f}\u00a0min"


def _clocks_apart(finding: Finding, plant: Plant) -> Text:
    """Tell of two exports that stamp the same events differently."""
    offset, spread = (finding.numbers.get(name, math.nan) for name in ("offset_s", "spread_s"))
    own, others = _export(finding), names.listing(finding.words["others"].split(", "))
    tags = names.listing(
        [names.tag(plant, name) for name in finding.words.get("tags", "").split(", ") if name]
    )
    seen = f"{count(finding.numbers.get('days', 0.0), 'day')} {when(finding, plant)}"
    side = "later" if offset > 0 else "earlier"
    kind = finding.words.get("kind")
    if kind == "drift":
        first, last = (finding.numbers.get(name, math.nan) for name in ("first_s", "last_s"))
        return (
            f"the clock of {own} drifts against {others}",
            f"From {_signed(first)} to {_signed(last)} (plus: its stamps are the later ones) on {seen}, by "
            f"{_apart(finding.numbers.get('drift_s_per_day', math.nan) * 30.0)} in 30 days; seen in {tags}. "
            "No stamp was shifted.",
            "Have the logger's clock set and tied to a time server; compare one start or stop in both "
            "exports.",
        )
    told = (
        f"{own} stamps the same events {_apart(offset)} {side} (± {_apart(spread)}) than {others}, "
        f"on {seen}; seen in {tags}."
    )
    if kind == "time rule":
        rule = 60 * round(abs(offset) / 3600.0)
        return (
            f"{own} looks {rule}\u00a0min off (time rule?)",
            f"{told} So much lies between summer time, winter time and UTC. No stamp was shifted.",
            "Ask whether this logger follows summer time, and correct the key clock of "
            f"exports.{finding.export} in the plant file.",
        )
    return (
        f"{own} and {others} are {_apart(offset)} apart",
        f"{told} Which of them is right, the logs do not tell; a meter that reports late looks the same. "
        "No stamp was shifted.",
        "Compare the moment of one start or stop in both exports, and ask whether a logger's clock was set.",
    )


def _signed(seconds: float) -> str:
    mark = "+" if seconds >= 0 else "\u2212"
    return f"{mark}{_apart(seconds)}"


def _repeated_hour(finding: Finding, plant: Plant) -> Text:
    return (
        f"the hour that autumn repeats is missing in {_export(finding)}",
        f"The clock of this export shows one hour twice {when(finding, plant)}. {many(finding, 'row')} "
        "of that hour could not be placed and were dropped.",
        "Let the logger stamp in standard time or UTC; this month cannot be mended without another record.",
    )


def _unclaimed_file(finding: Finding, plant: Plant) -> Text:
    number, size = finding.numbers.get("count", 1.0), finding.numbers.get("bytes")
    shown = f" ({file_size(int(size))})" if size is not None else ""
    if number > 1:
        title = f"{count(number, 'file')} in {_file(finding)} belong to no export"
        told = f"No pattern of the plant file matches them{shown}; they were not used."
    else:
        title = f"the file {_file(finding)} belongs to no export"
        told = f"No pattern of the plant file matches it{shown}; it was not used."
    return (
        title,
        told,
        "If it should be used, add a pattern for it to an export; if not, move it out of the logs folder.",
    )


def _unclaimed_column(finding: Finding, plant: Plant) -> Text:
    columns = [name for name in finding.words.get("columns", "").split(", ") if name]
    number = finding.numbers.get("count", float(len(columns)))
    one = number == 1
    listed = f": {names.listing(columns)}" if columns else ""
    return (
        f"{count(number, 'column')} of {_export(finding)} {'is' if one else 'are'} not used",
        f"No tag of the plant file names {'it' if one else 'them'}{listed}.",
        "If an input is among them, declare a tag for it; if one was renamed, correct its tag.",
    )


def _renamed_column(finding: Finding, plant: Plant) -> Text:
    old, new = finding.words.get("old", ""), finding.words.get("new", "")
    before, after = (finding.numbers.get(name, math.nan) for name in ("before", "after"))
    declared = plant.tags.get(finding.tag or "")
    known = declared is not None and math.isfinite(before) and math.isfinite(after)
    step = value(finding, plant, after - before + (declared.offset if known and declared else 0.0))
    said = f": {value(finding, plant, before)} before, {value(finding, plant, after)} after" if known else ""
    return (
        f"{subject(finding, plant)} goes on under another heading",
        f"“{old}” ends and “{new}” begins {when(finding, plant)}{said}"
        + (f", a step of {step} over {duration(finding.numbers['gap_s'])}." if known else "."),
        "If the step is larger than the process explains, ask what was exchanged that day, and declare the "
        "new instrument as a change of the tag.",
    )


def _unreadable_file(finding: Finding, plant: Plant) -> Text:
    reason = finding.words.get("reason", "")
    return (
        f"the file {_file(finding)} could not be read",
        f"It was left out{f' ({reason})' if reason else ''}. The other files were audited.",
        "Open it by hand: a half-copied or damaged file has to be exported again.",
    )


def _incomplete_line(finding: Finding, plant: Plant) -> Text:
    return (
        f"the last line of {finding.file or 'a file'} is incomplete",
        "The file ends in the middle of a line, as a copy in progress does. That line was left out.",
        "Nothing to do if the next run finds it complete; else copy the file again.",
    )


def _rejected_lines(finding: Finding, plant: Plant) -> Text:
    first = finding.words.get("first", "")
    return (
        f"{many(finding, 'line')} of {finding.file or _export(finding)} could not be used",
        f"Their stamp could not be read, or they have another number of fields than the heading"
        f"{f'. The first reads “{first}”' if first else ''}.",
        f"Look at {place(finding)}.",
    )


def _lost_digits(finding: Finding, plant: Plant) -> Text:
    first = finding.words.get("first", "")
    return (
        f"{many(finding, 'reading')} of the counter {finding.tag or 'of unknown name'} lost digits",
        "They are written with an exponent and too few digits to see the counter move"
        f"{f'; the first reads “{first}”' if first else ''} ({place(finding)}). They were not used.",
        "Export the counter again from the logger: a file that was saved in a spreadsheet cannot be mended.",
    )


def _missing_export(finding: Finding, plant: Plant) -> Text:
    patterns = finding.words.get("files", "")
    return (
        f"the export {finding.export or 'of unknown name'} is missing",
        "No file of it covers "
        f"{when(finding, plant) or 'the period'}{f' (looked for: {patterns})' if patterns else ''}. "
        "Every figure that needs its tags is incomplete or withheld.",
        "Bring the export and run the audit again.",
    )


WRITERS: dict[FindingCode, Callable[[Finding, Plant], Text]] = {
    FindingCode.CLOCK_STEP: _clock_step,
    FindingCode.CLOCK_OFFSET: _clock_offset,
    FindingCode.REPEATED_HOUR: _repeated_hour,
    FindingCode.UNCLAIMED_FILE: _unclaimed_file,
    FindingCode.UNCLAIMED_COLUMN: _unclaimed_column,
    FindingCode.RENAMED_COLUMN: _renamed_column,
    FindingCode.UNREADABLE_FILE: _unreadable_file,
    FindingCode.INCOMPLETE_LINE: _incomplete_line,
    FindingCode.REJECTED_LINES: _rejected_lines,
    FindingCode.LOST_DIGITS: _lost_digits,
    FindingCode.MISSING_EXPORT: _missing_export,
}
