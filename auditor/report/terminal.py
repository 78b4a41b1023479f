"""Plain texts for a terminal: the summary of an audit, and what ``check`` recognised."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from typing import TYPE_CHECKING, Any

from auditor.records.errors import Exit
from auditor.records.verdicts import Status
from auditor.report.numbers import figure as shown_figure
from auditor.report.statement import finding_entry
from auditor.report.tables import local_iso
from auditor.report.wording.findings import finding_sentences, first_things
from auditor.report.wording.verdicts import withheld

if TYPE_CHECKING:
    from auditor.records.balances import MachineBalance
    from auditor.records.findings import Finding
    from auditor.records.machines import Machine
    from auditor.records.plant import Plant, Rules, Tag
    from auditor.records.result import AuditResult, CheckResult
    from auditor.records.samples import ReadingNote

_HEADLINES = ("gross", "net", "heat", "total")
_STATUS_SENTENCES = {
    Exit.FIRM: "Published, firm.",
    Exit.PROVISIONAL: "Published, provisional: some figures lack coverage, or an export is missing or late.",
    Exit.LOOK: "Published, but a person must look: impossible intervals, or a balance that does not close.",
}


def audit_summary(result: AuditResult, report: str) -> str:
    """Where the report lies, the headline figures of each machine, and the first findings."""
    lines = [f"Report: {report}", f"{result.plant.site.name}, {result.period.label}"]
    if result.period_said:
        lines.append(f"({result.period_said})")
    lines.append(_STATUS_SENTENCES[result.status])
    for name, balance in result.balances.items():
        lines += _machine_lines(result.plant.machines[name], balance, result.plant.rules)
    first = first_things(result.findings, result.plant)
    if first:
        lines.append("First things to do:")
    for number, (title, sentence, check) in enumerate(first, start=1):
        lines.append(f"  {number}. {title}. {sentence} {check}")
    return "\n".join(lines)


def _machine_lines(machine: Machine, balance: MachineBalance, rules: Rules) -> list[str]:
    basis = f", {machine.basis} heating value" if machine.basis else ""
    lines = [f"{machine.title}{basis}: balance {balance.closure.value}"]
    for key in _HEADLINES:
        figure = balance.period.get(key)
        if figure is None:
            continue
        if figure.status is Status.WITHHELD:
            lines.append(f"  {key:<6} withheld: {withheld(figure.withheld_because, figure.coverage, rules)}")
        else:
            text = shown_figure(key, figure.value, figure.expanded_U).text
            lines.append(f"  {key:<6} {text} ({figure.status.value})")
    return lines


def check_text(checked: CheckResult) -> str:
    """Everything that was recognised, file by file and tag by tag, with the evidence."""
    plant = checked.plant
    lines = [f"{plant.site.name}: {plant.path.name} is complete", ""]
    for export in plant.exports.values():
        notes = [note for note in checked.notes if note.export == export.name]
        lines.append(f"Export {export.name}: clock {export.clock}, {_count(len(notes), 'file')}")
        for note in notes:
            lines += _note_lines(note, plant.site.zone)
        lines += [f"  {_tag_line(plant.tags[tag])}" for tag in export.tags]
        lines.append("")
    lines += list(_unclaimed_lines(checked))
    lines += list(_finding_lines(checked.findings, plant))
    return "\n".join(lines)


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def _note_lines(note: ReadingNote, zone: str) -> list[str]:
    span = "no readable stamp"
    if note.first_us is not None and note.last_us is not None:
        first, last = local_iso((note.first_us, note.last_us), zone)
        span = f"{first} to {last}"
    delimiter = {"\t": "tab", ",": "comma", ";": "semicolon"}.get(note.delimiter, note.delimiter)
    return [
        f"  {note.file}: {note.layout}, {note.encoding}, {delimiter}, stamps {note.stamp_format}",
        f"    {span}; {note.lines} lines = {note.lines_data} read + {note.lines_skipped} skipped"
        f" + {note.lines_rejected} rejected",
        *(f"    {sentence}" for sentence in note.evidence),
    ]


def _tag_line(tag: Tag) -> str:
    unit = tag.unit or "state"
    columns = ", ".join(f'"{heading.name}"' for heading in tag.headings) or f'"{tag.column}"'
    parts = [f"tag {tag.name}: column {columns}, {unit}, {tag.between}"]
    if tag.stamp_marks:
        parts.append(f"stamp marks the {tag.stamp_marks}")
    parts.append(f"held {tag.hold_s / 60.0:g} min")
    if tag.calibration is not None:
        parts.append(f"uncertainty {tag.calibration.declared}")
    parts += [
        f"from {change.since} on {change.tag.unit}"
        + (
            f" and uncertainty {change.tag.calibration.declared}"
            if change.new_calibration and change.tag.calibration is not None
            else ""
        )
        for change in tag.changes
    ]
    return ", ".join(parts)


def _used_tags(plant: Plant) -> set[str]:
    """Tags that some part of the plant file points at: the text of a way names its tags in its fields."""
    used: set[str] = set()
    for machine in plant.machines.values():
        used.add(machine.running.tag)
        if machine.steady is not None:
            used.add(machine.steady.tag)
        for stream in machine.streams.values():
            fields = (getattr(stream.way, name) for name in stream.way.__dataclass_fields__)
            used.update(value for value in fields if isinstance(value, str))
    for meter in plant.gas_meters.values():
        used.update(tag for tag in (meter.pressure, meter.temperature) if tag)
    if plant.site.air_pressure is not None and plant.site.air_pressure.tag:
        used.add(plant.site.air_pressure.tag)
    return used & set(plant.tags)


def _unclaimed_lines(checked: CheckResult) -> Iterator[str]:
    unused = [tag for tag in checked.plant.tags if tag not in _used_tags(checked.plant)]
    if unused:
        yield f"Tags that no machine uses: {', '.join(unused)}"
    for note in checked.notes:
        if note.export is None:
            yield f"Nobody claims the file {note.file} ({note.bytes} bytes)"
        elif note.unclaimed_columns:
            yield f"Nobody claims these columns of {note.file}: {', '.join(note.unclaimed_columns)}"


def _finding_lines(findings: Iterable[Finding], plant: Plant) -> Iterator[str]:
    for finding in findings:
        title, sentence, check = finding_sentences(finding, plant)
        yield f"- {title}. {sentence} {check}"


def check_json(checked: CheckResult) -> str:
    """Return the same for other programs."""
    zone = checked.plant.site.zone
    files: list[dict[str, Any]] = []
    for note in checked.notes:
        entry = {name: getattr(note, name) for name in note.__dataclass_fields__ if name != "findings"}
        entry["unclaimed_cells"] = dict(sorted(note.unclaimed_cells.items()))
        for end in ("first", "last"):
            instant = entry.pop(f"{end}_us")
            entry[end] = None if instant is None else local_iso((instant,), zone)[0]
        files.append(entry)
    content = {
        "site": checked.plant.site.name,
        "files": files,
        "tags": {
            tag.name: {"export": tag.export, "column": tag.column, "unit": tag.unit, "between": tag.between}
            for tag in checked.plant.tags.values()
        },
        "unused_tags": [tag for tag in checked.plant.tags if tag not in _used_tags(checked.plant)],
        "findings": [finding_entry(finding, zone) for finding in checked.findings],
    }
    return json.dumps(content, indent=1, ensure_ascii=False)
