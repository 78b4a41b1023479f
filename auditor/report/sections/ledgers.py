"""The two ledgers on paper: where every cell of every tag ended, and what became of every second."""

from __future__ import annotations

import numpy as np

from auditor.records.result import AuditResult
from auditor.records.samples import Disposition
from auditor.records.ticks import Example, SecondKind
from auditor.report import numbers
from auditor.report.clock import Clock
from auditor.report.elements import Table
from auditor.report.wording import names
from auditor.report.wording.ledgers import DISPOSITIONS, SECONDS, standing


def cell_table(result: AuditResult) -> Table:
    """Cells per tag and disposition; only dispositions that occur get a column."""
    cells = result.ticks.cells
    present = [kind for kind in Disposition if cells.counts[:, kind].any()]
    rows = tuple(
        (
            tag,
            *(numbers.whole(cells.counts[index, kind]) for kind in present),
            numbers.whole(cells.raw_cells[index]),
        )
        for index, tag in enumerate(cells.tags)
    )
    sums = cells.counts.sum(axis=0)
    absent = [kind.word for kind in Disposition if kind not in present]
    note = f"No cell ended as {names.listing(absent)}. " if absent else ""
    return Table(
        "Raw cells by where they ended",
        ("Tag", *(names.sentence(kind.word) for kind in present), "Raw cells"),
        rows,
        numeric=tuple(range(1, len(present) + 2)),
        total=(
            "all tags",
            *(numbers.whole(sums[kind]) for kind in present),
            numbers.whole(cells.raw_cells.sum()),
        ),
        note=f"{note}{_agreement(result)}",
        code=(0,),
    )


def _agreement(result: AuditResult) -> str:
    cells = result.ticks.cells
    off = [tag for index, tag in enumerate(cells.tags) if cells.counts[index].sum() != cells.raw_cells[index]]
    if off:
        return (
            f"The counts do not add up to the raw cells for {names.listing(off)}: please report this "
            "as a fault."
        )
    return "Every row adds up to its raw cells, which were counted independently while reading."


def second_table(result: AuditResult) -> Table:
    """Hours of the period per tag, by kind."""
    seconds = result.ticks.seconds
    length_us = round(result.period.seconds * 1e6)
    rows = tuple(
        (
            tag,
            *(numbers.to_places(us / 3.6e9, 2) for us in seconds.microseconds[index].tolist()),
            numbers.to_places(seconds.microseconds[index].sum() / 3.6e9, 2),
            numbers.percent(float(seconds.microseconds[index, SecondKind.COVERED] / length_us)),
            standing(result.plant.tags[tag]),
        )
        for index, tag in enumerate(seconds.tags)
    )
    exact = bool((seconds.microseconds.sum(axis=1) == length_us).all())
    said = (
        "Every row adds up to the length of the period to the microsecond"
        if exact
        else "Rows do not add up: please report this as a fault"
    )
    return Table(
        "Time of the period by tag, in hours",
        ("Tag", *(names.sentence(kind.word) for kind in SecondKind), "Sum", "Covered", "Standing still"),
        rows,
        numeric=tuple(range(1, len(SecondKind) + 3)),
        note=f"{said} ({numbers.to_places(result.period.seconds / 3600.0, 2)} h). "
        + " ".join(f"{names.sentence(kind.word)}: {SECONDS[kind]}." for kind in SecondKind)
        + " Standing still: after how long a value that does not move while its machine runs is rejected; "
        "not tested without frozen_after, nor where a state or a value stored on change may stand.",
        code=(0,),
    )


_NO_EXAMPLES = frozenset({Disposition.USED, Disposition.OUTSIDE_PERIOD, Disposition.CARRIED_IN})
"""Nothing is wrong with these cells."""


def example_table(result: AuditResult) -> Table | None:
    """First and last example of every disposition that a tag lost cells to; None without any."""
    cells = result.ticks.cells
    clock = Clock(result.plant.site.zone)
    rows = []
    for index, tag in enumerate(cells.tags):
        for kind in Disposition:
            first = cells.first.get((tag, kind))
            if kind in _NO_EXAMPLES or first is None:
                continue
            last = cells.last.get((tag, kind), first)
            rows.append(
                (
                    tag,
                    kind.word,
                    numbers.whole(cells.counts[index, kind]),
                    _example(first, clock),
                    _example(last, clock),
                )
            )
    if not rows:
        return None
    return Table(
        "First and last example of cells that were not used",
        ("Tag", "Ended as", "Cells", "First example", "Last example"),
        tuple(rows),
        numeric=(2,),
        note="All dispositions with their counts and examples stand in dispositions.csv beside this file.",
        code=(0, 3, 4),
    )


def _example(example: Example, clock: Clock) -> str:
    when = f", {clock.stamp(example.instant_us)}" if example.instant_us is not None else ""
    return f"{example.file}:{example.line}{when}: “{example.raw}”"


def word_table(result: AuditResult) -> Table | None:
    """Status words verbatim with their counts; None when there are none."""
    rows = tuple(
        (tag, word, numbers.whole(count))
        for tag in result.ticks.cells.tags
        for word, count in sorted(
            result.ticks.cells.words.get(tag, {}).items(), key=lambda item: (-item[1], item[0])
        )
    )
    if not rows:
        return None
    return Table(
        "Words in place of numbers, as they stand in the files",
        ("Tag", "Word", "Cells"),
        rows,
        numeric=(2,),
        code=(0, 1),
    )


def disposition_meanings(result: AuditResult) -> tuple[tuple[str, str], ...]:
    """Word and meaning of every disposition that occurs."""
    present = np.flatnonzero(result.ticks.cells.counts.any(axis=0))
    return tuple((Disposition(int(kind)).word, DISPOSITIONS[Disposition(int(kind))]) for kind in present)
