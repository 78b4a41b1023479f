"""Blocks of samples made by hand for the tests of cleaning; stamps in seconds from a start."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np

from auditor.cleaning import CleaningSettings, clean
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import Running
from auditor.records.period import Grid, Period
from auditor.records.plant import Distrust, Export, Tag
from auditor.records.samples import Disposition, Rejects, SampleBlock
from auditor.records.ticks import CarryOver, SecondKind, TickTable
from auditor.records.uncertain import Uncertainty

START_US = 1_782_856_800_000_000  # 2026-07-01 00:00 in Stockholm
Cell = float | str | None
"""A number, a word that reading rejected ("" is an empty cell), or nothing at all."""


@dataclass(frozen=True)
class Row:
    """One line of an export."""

    second: float
    cells: Mapping[str, Cell]
    pattern: int = 0


@dataclass(frozen=True)
class Setting:
    """Everything but the samples."""

    tags: Sequence[Tag]
    hours: float = 1.0
    start_s: float = 0.0
    tick_s: int = 60
    repeat: str = "keep first"
    distrust: Sequence[tuple[str, float, float]] = ()
    running: Mapping[str, Running] = field(default_factory=dict)
    users: Mapping[str, tuple[str, ...]] = field(default_factory=dict)

    @property
    def grid(self) -> Grid:
        """Ticks from the start of the period."""
        start_us = us(self.start_s)
        end_us = us(self.start_s + self.hours * 3600.0)
        return Grid(
            Period("made by hand", start_us, end_us, "Europe/Stockholm"),
            self.tick_s,
            self.tick_s,
            np.arange(start_us, end_us, self.tick_s * 1_000_000),
            np.array([*range(start_us, end_us, 86_400_000_000), end_us]),
        )

    @property
    def settings(self) -> CleaningSettings:
        """The slice of a plant with one export."""
        names = tuple(tag.name for tag in self.tags)
        export = Export(
            name="logger",
            files=("a/*.csv", "b/*.csv"),
            clock="UTC",
            repeated_hour="by order",
            date_order="year first",
            decimal=".",
            delimiter=None,
            encoding=None,
            layout=None,
            stamp_columns=(),
            sentinels=(),
            status_words={},
            when_stamps_repeat=self.repeat,  # type: ignore[arg-type]
            tags=names,
        )
        distrust = [Distrust(tag, us(start), us(end), "by hand", 1) for tag, start, end in self.distrust]
        tags = {tag.name: tag for tag in self.tags}
        return CleaningSettings({"logger": export}, tags, tuple(distrust), self.running, self.users)


def us(second: float) -> int:
    """Instant of a second after the start."""
    return START_US + round(second * 1_000_000)


def make_tag(name: str, between: str, **fields: object) -> Tag:
    """A tag that shows SI; any field of the record by keyword."""
    plain: dict[str, object] = {
        "export": "logger",
        "column": name,
        "unit": "1",
        "quantity": "any",
        "scale": 1.0,
        "offset": 0.0,
        "si_unit": "1",
        "stamp_marks": None,
        "hold_s": 3600.0,
        "calibration": Uncertainty(0.0, 0.0, "declared"),
    }
    return Tag(name=name, between=between, **(plain | fields))  # type: ignore[arg-type]


def make_block(rows: Sequence[Row], tags: Sequence[str], first_line: int = 2) -> SampleBlock:
    """Write rows as one block; a row's pattern is its file too."""
    values = np.full((len(tags), len(rows)), np.nan)
    rejected = np.zeros((len(tags), len(Disposition)), dtype=np.int64)
    entries: list[tuple[int, int, int, int, int]] = []
    words: dict[str, int] = {}
    for at, row in enumerate(rows):
        for index, tag in enumerate(tags):
            cell = row.cells.get(tag)
            if isinstance(cell, str):
                kind = Disposition.STATUS_WORD if cell else Disposition.EMPTY
                rejected[index, kind] += 1
                word = words.setdefault(cell, len(words))
                entries.append((index, int(kind), row.pattern, first_line + at, word))
            elif cell is not None:
                values[index, at] = cell
    columns = np.array(entries, dtype=np.int64).reshape(-1, 5).T
    return SampleBlock(
        export="logger",
        files=("a/one.csv", "b/two.csv"),
        pattern=(0, 1),
        instants_us=np.array([us(row.second) for row in rows], dtype=np.int64),
        source=np.array([row.pattern for row in rows], dtype=np.int16),
        line=np.arange(first_line, first_line + len(rows), dtype=np.int64),
        tags=tuple(tags),
        values=values,
        rejected=rejected,
        rejects=Rejects(
            columns[0].astype(np.int16),
            columns[1].astype(np.int8),
            columns[2].astype(np.int16),
            columns[3],
            columns[4].astype(np.int32),
            tuple(words),
        ),
    )


def make_blocks(rows: Sequence[Row], tags: Sequence[str], cuts: Iterable[int] = ()) -> list[SampleBlock]:
    """Write rows as blocks cut at some rows."""
    edges = [0, *sorted(set(cuts)), len(rows)]
    return [
        make_block(rows[first:last], tags, first_line=first + 2)
        for first, last in pairwise(edges)
        if last > first
    ]


def series(tag: str, cells: Mapping[float, Cell] | Sequence[tuple[float, Cell]]) -> list[Row]:
    """Rows of one tag from pairs of second and cell."""
    pairs = cells.items() if isinstance(cells, Mapping) else cells
    return [Row(second, {tag: cell}) for second, cell in pairs]


def run(
    setting: Setting,
    rows: Sequence[Row],
    cuts: Iterable[int] = (),
    carry: Mapping[str, CarryOver] | None = None,
) -> tuple[TickTable, tuple[Finding, ...]]:
    """Clean rows given as blocks."""
    names = [tag.name for tag in setting.tags]
    return clean({"logger": make_blocks(rows, names, cuts)}, setting.settings, setting.grid, carry)


def integral(table: TickTable, column: str) -> float:
    """Sum of mean times covered seconds: energy for a power."""
    at = table.column(column)
    return float(np.nansum(table.mean[:, at] * table.covered_s[:, at]))


def seconds(table: TickTable, tag: str) -> dict[str, float]:
    """The seconds of a tag by kind."""
    row = table.seconds.microseconds[table.seconds.tags.index(tag)]
    return {kind.word: float(row[kind]) / 1e6 for kind in SecondKind}


def cells(table: TickTable, tag: str) -> dict[str, int]:
    """The cells of a tag by disposition, zeros left out."""
    row = table.cells.counts[table.cells.tags.index(tag)]
    return {kind.word: int(row[kind]) for kind in Disposition if row[kind]}


def of_code(findings: Iterable[Finding], code: FindingCode) -> list[Finding]:
    """Findings of one kind."""
    return [finding for finding in findings if finding.code is code]


def longer(setting: Setting, **changes: object) -> Setting:
    """The setting with some fields changed."""
    return replace(setting, **changes)  # type: ignore[arg-type]
