"""One awkward export, what is declared of it, and what reading and cleaning must make of it and say."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from log_reading_factory import Reading, make_export, read

from auditor.cleaning import CleaningSettings, clean
from auditor.log_reading import recognition_notes
from auditor.records.errors import PlantFileError
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import Running
from auditor.records.period import Grid, Period
from auditor.records.samples import Disposition
from auditor.records.ticks import TickTable

AB = {"a": "a", "b": "b"}
"""Two tags bound to columns of the same names."""
Sample = tuple[str, *tuple[float | None, ...]]
"""Stamp in UTC and the value of each tag."""


@dataclass(frozen=True)
class Case:
    """One awkward export."""

    number: int
    """Of the kind of awkwardness; several cases may share it."""
    name: str
    files: Mapping[str, bytes | str]
    columns: Mapping[str, str] = field(default_factory=lambda: AB)
    export: Mapping[str, Any] = field(default_factory=dict)
    """Fields of the export that differ from a plain one."""
    tags: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    """By tag: fields that differ from a value on straight lines with a hold of 300 s."""
    running: Mapping[str, Running] = field(default_factory=dict)
    users: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    period: tuple[str, str] = ("2026-07-01T00:00", "2026-07-02T00:00")
    """In UTC."""
    samples: Sequence[Sample] | None = None
    """Every row that is read; None where ``totals`` and ``cells`` say more."""
    lines: tuple[int, int, int, int] | None = None
    """Lines of all files together: all, data, skipped, rejected."""
    cells: Mapping[str, Mapping[str, int]] = field(default_factory=dict)
    """By tag: every cell by what became of it."""
    totals: Mapping[str, float] = field(default_factory=dict)
    """By tag: integral over the period, value times seconds (a counter: what it counted)."""
    found: Sequence[FindingCode] = ()
    """Codes of all findings; gaps are left out unless one is listed: the exports are shorter than a day."""
    said: Sequence[str] = ()
    """Each stands in the evidence, in the words of a finding, or in the refusal."""
    refused: bool = False
    """Whether the plant file has to be changed first."""


@dataclass(frozen=True)
class Outcome:
    """Everything that one case gave."""

    reading: Reading
    table: TickTable
    findings: tuple[Finding, ...]

    def cells(self, tag: str) -> dict[str, int]:
        """Cells of a tag by what became of them."""
        counts = self.table.cells.counts[self.table.cells.tags.index(tag)]
        return {kind.word: int(counts[kind]) for kind in Disposition if counts[kind]}

    def total(self, tag: str) -> float:
        """Integral over the period, with what a counter counted over gaps."""
        at = self.table.column(tag)
        known = float(np.nansum(self.table.mean[:, at] * self.table.covered_s[:, at]))
        return known + sum(bridge.amount for bridge in self.table.bridges if bridge.tag == tag)

    @property
    def words(self) -> str:
        """All that is said, line by line."""
        notes = [*self.reading.notes, *recognition_notes(self.reading.recognition)]
        said = [sentence for note in notes for sentence in note.evidence]
        return "\n".join([*said, *(word for finding in self.findings for word in finding.words.values())])


def us(stamp: str) -> int:
    """Microseconds of a stamp in UTC."""
    return round(datetime.fromisoformat(stamp).replace(tzinfo=UTC).timestamp() * 1e6)


def grid_of(case: Case) -> Grid:
    """Minutes of the period."""
    start, end = map(us, case.period)
    period = Period("the case", start, end, "UTC")
    return Grid(period, 60, 900, np.arange(start, end, 60_000_000), np.array([start, end]))


def outcome_of(folder: Path, case: Case) -> Outcome:
    """Read and clean a case."""
    export, tags = make_export(case.columns, **case.export)
    tags = {name: replace(tag, **case.tags.get(name, {})) for name, tag in tags.items()}
    reading = read(folder, case.files, (export, tags))
    settings = CleaningSettings({"x": export}, tags, (), case.running, case.users)
    table, cleaned = clean({"x": iter(reading.blocks)}, settings, grid_of(case))
    told = [finding for note in reading.notes for finding in note.findings]
    return Outcome(reading, table, (*reading.recognition.findings, *told, *cleaned))


def hold(folder: Path, case: Case) -> None:
    """Read and clean a case, and hold all that it says."""
    if case.refused:
        with pytest.raises(PlantFileError) as caught:
            outcome_of(folder, case)
        text = "\n".join(str(fault) for fault in caught.value.faults)
        assert [word for word in case.said if word not in text] == [], text
        return
    got = outcome_of(folder, case)
    if case.samples is not None:
        assert [(stamp, *values) for stamp, _, values in got.reading.rows] == list(case.samples)
    if case.lines is not None:
        assert tuple(map(sum, zip(*(_lines(note) for note in got.reading.notes), strict=True))) == case.lines
    for tag in case.columns:
        _all_cells_are_accounted_for(got, tag)
        if tag in case.cells:
            assert got.cells(tag) == case.cells[tag], tag
    for tag, total in case.totals.items():
        assert got.total(tag) == pytest.approx(total, rel=1e-9, abs=1e-9), tag
    codes = sorted(finding.code for finding in got.findings)
    ignored = set() if FindingCode.GAP in case.found else {FindingCode.GAP}
    assert [code for code in codes if code not in ignored] == sorted(case.found), got.findings
    assert [word for word in case.said if word not in got.words] == [], got.words


def _lines(note: Any) -> tuple[int, int, int, int]:
    return note.lines, note.lines_data, note.lines_skipped, note.lines_rejected


def _all_cells_are_accounted_for(got: Outcome, tag: str) -> None:
    cells = 0
    for block in got.reading.blocks:
        row = block.tags.index(tag)
        cells += int(block.rejected[row].sum()) + int(np.isfinite(block.values[row]).sum())
    assert sum(got.cells(tag).values()) == cells, tag


def minutes(head: str, *cells: object) -> str:
    """A file with a line each minute: its stamp, its cell, and its number from 0 in a second column."""
    more = ";{}" if head.count(";") > 1 else ""
    return f"{head}\n" + "".join(
        f"2026-07-01 {at // 60:02}:{at % 60:02};{cell}{more.format(at)}\n" for at, cell in enumerate(cells)
    )


def every(cases: Sequence[Case]) -> pytest.MarkDecorator:
    """One test for each case, named by number and words."""
    return pytest.mark.parametrize("case", cases, ids=[f"{case.number} {case.name}" for case in cases])
