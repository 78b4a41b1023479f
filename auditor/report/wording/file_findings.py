"""Sentences for findings about files, their lines, their columns and their clocks."""

from __future__ import annotations

import math
from collections.abc import Callable

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.numbers import count, duration, file_size
from auditor.report.wording import names
from auditor.report.wording.data_findings import Text, many, place, when


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
    moved = f" by {duration(abs(step))} {'back' if step < 0 else 'forward'}" if math.isfinite(step) else ""
    return (
        f"the clock of {_export(finding)} was set",
        f"Its stamps jump{moved} {when(finding, plant)} ({place(finding)}). Which side of the jump is "
        "right, the file does not tell.",
        "Ask who set the logger's clock that day, and compare a start or stop of the machine in two exports.",
    )


def _clock_offset(finding: Finding, plant: Plant) -> Text:
    sign = finding.words.get("sign", "")
    offset = finding.numbers.get("offset_s", math.nan)
    if math.isfinite(offset):
        told = (
            f"Its stamps are about {duration(abs(offset))} {'late' if offset > 0 else 'early'} "
            f"{when(finding, plant)}."
        )
    elif sign:
        told = f"It has {many(finding, 'row')} with {sign} ({place(finding)})."
    else:
        told = f"Its stamps do not fit those of the other exports {when(finding, plant)}."
    return (
        f"{_export(finding)} seems to run on another clock",
        told,
        "Compare the moment of one start or stop in two exports, then correct the export's clock in the "
        "plant file.",
    )


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
    FindingCode.UNREADABLE_FILE: _unreadable_file,
    FindingCode.INCOMPLETE_LINE: _incomplete_line,
    FindingCode.REJECTED_LINES: _rejected_lines,
    FindingCode.LOST_DIGITS: _lost_digits,
    FindingCode.MISSING_EXPORT: _missing_export,
}
