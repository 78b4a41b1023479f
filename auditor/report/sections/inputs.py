"""What was read: every file with its digest, how it was understood, and what nobody claimed."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from dataclasses import dataclass

from auditor.records.plant import Export
from auditor.records.result import AuditResult
from auditor.records.samples import ReadingNote
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.report.wording import names

_DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab", "": "none found"}


@dataclass(frozen=True)
class ExportInputs:
    """One export: how its files were understood, and the files."""

    name: str
    recognised: tuple[str, ...]
    files: Table


def input_digest(notes: Iterable[ReadingNote]) -> str:
    """One SHA-256 over the digests and names of all files, in order of their paths."""
    lines = sorted(f"{note.sha256}  {note.file}\n" for note in notes)
    return hashlib.sha256("".join(lines).encode()).hexdigest()


def exports(result: AuditResult) -> tuple[ExportInputs, ...]:
    """Every declared export with its files; an export without files says so."""
    return tuple(_export(export, result) for export in result.plant.exports.values())


def _export(export: Export, result: AuditResult) -> ExportInputs:
    notes = [note for note in result.notes if note.export == export.name]
    shapes: dict[str, int] = {}
    for note in notes:
        shapes[_shape(note, export)] = shapes.get(_shape(note, export), 0) + 1
    recognised = [f"{numbers.count(count, 'file')}: {shape}" for shape, count in shapes.items()]
    evidence = _evidence(notes)
    declared = (
        f"Declared: files {', '.join(export.files)}; clock {export.clock}; {export.date_order}; "
        f"decimal mark “{export.decimal}”."
    )
    recognised = [declared, *(recognised or ["No file of this export was found."]), *evidence]
    return ExportInputs(
        export.name, tuple(recognised), _files(f"Files of the export {export.name}", notes, result)
    )


def _evidence(notes: list[ReadingNote]) -> list[str]:
    """Each piece of evidence once, with the number of files it was found in where these are not all."""
    found: dict[str, int] = {}
    for note in notes:
        for said in dict.fromkeys(note.evidence):
            found[said] = found.get(said, 0) + 1
    evidence = []
    for said, number in found.items():
        some = "" if number == len(notes) else f" ({number} of {len(notes)} files)"
        evidence.append(f"{names.sentence(said).rstrip('.')}{some}.")
    return evidence


def _shape(note: ReadingNote, export: Export) -> str:
    units = f", units in line {note.unit_line}" if note.unit_line is not None else ", no line of units"
    return (
        f"{note.encoding or 'encoding unknown'}, delimiter "
        f"{_DELIMITERS.get(note.delimiter, note.delimiter)}, {note.layout} layout, headings in line "
        f"{note.heading_line}{units}, stamps as {note.stamp_format or 'unknown'}."
    )


def _files(caption: str, notes: list[ReadingNote], result: AuditResult) -> Table:
    clock = Clock(result.plant.site.zone)
    rows = tuple(
        (
            note.file,
            numbers.file_size(note.bytes),
            _range(note, clock),
            *(
                numbers.whole(lines)
                for lines in (note.lines, note.lines_data, note.lines_skipped, note.lines_rejected)
            ),
            note.sha256,
        )
        for note in notes
    )
    return Table(
        caption,
        ("File", "Size", "First and last stamp", "Lines", "Read", "Skipped", "Rejected", "SHA-256"),
        rows,
        numeric=(1, 3, 4, 5, 6),
        note="Stamps in the site's clock. Skipped lines are headings, units, blank lines, preambles and "
        "footers.",
        code=(0, 7),
        whole=(0,),
    )


def _range(note: ReadingNote, clock: Clock) -> str:
    if note.first_us is None or note.last_us is None:
        return "no stamp"
    first, last = (clock.stamp(stamp).replace(" ", numbers.NBSP) for stamp in (note.first_us, note.last_us))
    return f"{first} to {last}"


def unclaimed_files(result: AuditResult) -> Table | None:
    """Files that no pattern of the plant file matches; None without any."""
    notes = [note for note in result.notes if note.export is None]
    return _files("Files that no export claims (not used)", notes, result) if notes else None


def unclaimed_columns(result: AuditResult) -> Table | None:
    """Columns that no tag names, with their cells; None without any."""
    cells: dict[tuple[str, str], int] = {}
    for note in result.notes:
        if note.export is None:
            continue
        for column in note.unclaimed_columns:
            place = (note.export, column)
            cells[place] = cells.get(place, 0) + note.unclaimed_cells.get(column, 0)
    if not cells:
        return None
    rows = tuple((export, column, numbers.whole(count)) for (export, column), count in cells.items())
    return Table(
        "Columns that no tag names (not used)", ("Export", "Heading", "Cells"), rows, numeric=(2,), code=(1,)
    )
