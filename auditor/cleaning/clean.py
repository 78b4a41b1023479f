"""From blocks of samples to the tick table and its two ledgers."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.cells import CellBook, Cells
from auditor.cleaning.frozen import take_out_frozen
from auditor.cleaning.impossible_zeros import take_out_zeros
from auditor.cleaning.noise import TickSeries, tick_noise
from auditor.cleaning.notices import findings_of
from auditor.cleaning.rows import Rows, rows_of, rows_of_rejects, whole_stamps
from auditor.cleaning.screen import screened
from auditor.cleaning.tally import Tally
from auditor.cleaning.value_notices import value_findings
from auditor.cleaning.view import View
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition
from auditor.records.ticks import CarryOver, SecondKind, SecondLedger, TickTable

if TYPE_CHECKING:
    from auditor.cleaning.settings import CleaningSettings
    from auditor.records.findings import Finding
    from auditor.records.period import Grid
    from auditor.records.plant import Export
    from auditor.records.samples import SampleBlock


def clean(
    exports: Mapping[str, Iterable[SampleBlock]],
    settings: CleaningSettings,
    grid: Grid,
    carry: Mapping[str, CarryOver] | None = None,
) -> tuple[TickTable, tuple[Finding, ...]]:
    """Turn samples into time-weighted means of every tag on the base grid.

    Every raw cell ends in one disposition and every microsecond of the period in one kind, exactly. The
    blocks are gone through once, in order; only sums over ticks are kept. Where the blocks are cut makes no
    difference to any total.

    Parameters
    ----------
    exports
        Per export its blocks in order of time; an export without samples may be absent. They should reach
        from one longest hold before the period to one after it; what lies farther outside is counted and
        left.
    settings
        The slice of the plant file that says what becomes of a sample.
    grid
        The ticks.
    carry
        Per tag what the period before handed over.

    Returns
    -------
    tuple
        The tick table, and what was noticed.

    Raises
    ------
    ValueError
        If the blocks of an export are not in order of time.
    RuntimeError
        If a ledger does not add up: a fault of the program.
    """
    book = CellBook(tuple(settings.tags))
    tallies = _tallies(settings, grid, carry or {})
    for name, export in settings.exports.items():
        own = [tallies[tag] for tag in export.tags]
        own_tags = [tally.tag for tally in own]
        pieces = whole_stamps(_near_rows(exports.get(name, ()), export, book, grid, own))
        for rows, doubts in screened(pieces, own_tags, {tally.tag.name: tally.distrust_us for tally in own}):
            view = View(rows, export, own_tags, grid)
            for tally in own:
                tally.absorb(view, book, doubts.get(tally.tag.name))
            # Not to be held while the next rows are waited for.
            del rows, view
    for tally in tallies.values():
        tally.finish(book)
    zeros = take_out_zeros(tallies, book)
    frozen = take_out_frozen(tallies, settings, book)
    findings = findings_of(tallies, settings, book, frozen, grid)
    findings += value_findings(tallies, settings, book, zeros)
    return _table(tallies, book, grid), findings


def _tallies(settings: CleaningSettings, grid: Grid, carry: Mapping[str, CarryOver]) -> dict[str, Tally]:
    rows = {tag: row for export in settings.exports.values() for row, tag in enumerate(export.tags)}
    tallies = {}
    for name, tag in settings.tags.items():
        own = [entry for entry in settings.distrust if entry.tag == name]
        tallies[name] = Tally(tag, rows[name], grid, own)
        if name in carry:
            tallies[name].start_from(carry[name])
    return tallies


def _near_rows(
    blocks: Iterable[SampleBlock], export: Export, book: CellBook, grid: Grid, tallies: list[Tally]
) -> Iterator[Rows]:
    """Enter every block in the ledger of cells, and give the rows that can touch the period."""
    longest_us = max((tally.sums.hold_us for tally in tallies), default=0)
    window_us = (grid.period.start_us - longest_us, grid.period.end_us + longest_us + 1)
    for block in blocks:
        at_row = rows_of_rejects(block)
        book.enter_block(block, at_row)
        rows = rows_of(block, at_row, export.tags, book.number_files(block))
        first, last = np.searchsorted(rows.instants_us, window_us, side="left").tolist()
        for far in (rows.part(0, first), rows.part(last, rows.instants_us.size)):
            for row, tag in enumerate(export.tags):
                cells = Cells(far.instants_us, far.raw[row], far.raw[row], far.file, far.line)
                book.enter(tag, Disposition.OUTSIDE_PERIOD, cells, np.flatnonzero(np.isfinite(far.raw[row])))
        yield rows.part(first, last)


def _table(tallies: Mapping[str, Tally], book: CellBook, grid: Grid) -> TickTable:
    """Turn the sums into means, column by column; the sums are used up."""
    columns = [(column, tally) for tally in tallies.values() for column in range(len(tally.tag.tick_columns))]
    shape = (len(columns), grid.ticks)
    mean, covered_s, noise = np.empty(shape), np.empty(shape), np.empty(shape)
    samples = np.empty(shape, dtype=np.int32)
    lag1 = np.zeros(len(columns))
    native_s = np.array([tally.native_step_s for _, tally in columns])
    for row, (column, tally) in enumerate(columns):
        covered_us = tally.sums.covered_us
        mean[row] = np.nan
        np.divide(tally.sums.integral[column], covered_us, out=mean[row], where=covered_us > 0)
        covered_s[row] = covered_us / MICROSECONDS
        samples[row] = tally.sums.samples
        series = TickSeries(mean[row], covered_s[row] / grid.tick_s, samples[row], float(native_s[row]))
        noise[row], lag1[row] = tick_noise(tally.tag, series, grid)
        for change in tally.tag.changes:
            later = grid.start_us >= change.from_us
            noise[row, later] = tick_noise(change.tag, series, grid)[0][later]
    seconds = np.array([tally.seconds() for tally in tallies.values()], dtype=np.int64)
    carries = {name: tally.carry for name, tally in tallies.items()}
    return TickTable(
        grid=grid,
        columns=tuple(tally.tag.tick_columns[column] for column, tally in columns),
        mean=mean.T,
        covered_s=covered_s.T,
        samples=samples.T,
        noise=noise.T,
        noise_lag1=lag1,
        native_step_s=native_s,
        tags=tuple(tally.tag.name for _, tally in columns),
        cells=book.ledger(),
        seconds=SecondLedger(tuple(tallies), seconds.reshape(len(tallies), len(SecondKind))),
        bridges=tuple(bridge for tally in tallies.values() for bridge in tally.bridges),
        carry={name: known for name, known in carries.items() if known is not None},
    )
