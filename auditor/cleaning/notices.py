"""Findings of cleaning: gaps, resets, conflicts, values that were not believed."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.events import FEW_TICKS
from auditor.records.findings import Finding, FindingCode
from auditor.records.period import MICROSECONDS, Grid
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from auditor.cleaning.cells import CellBook
    from auditor.cleaning.conflicts import Conflicts
    from auditor.cleaning.frozen import FrozenStretch
    from auditor.cleaning.settings import CleaningSettings
    from auditor.cleaning.tally import Tally
    from auditor.records.plant import Distrust

MOST_ALIKE = 20
"""So many findings of one kind and tag (or export) stand alone; the smaller ones are summed up in one."""


def findings_of(
    tallies: Mapping[str, Tally],
    settings: CleaningSettings,
    book: CellBook,
    frozen: Sequence[FrozenStretch],
    grid: Grid,
) -> tuple[Finding, ...]:
    """Return everything that cleaning noticed, by kind, then in the order of the plant file, then of time."""
    found: list[Finding] = []
    for export in settings.exports:
        own = [tally for tally in tallies.values() if tally.tag.export == export]
        found += few(_gap_findings(export, own, grid))
    for stretch in frozen:
        found.append(_frozen_finding(stretch, tallies[stretch.tag], settings))
    for code, kind in (
        (FindingCode.OUT_OF_RANGE, Disposition.OUT_OF_RANGE),
        (FindingCode.STATUS_WORDS, Disposition.STATUS_WORD),
    ):
        found += (
            cell_finding(code, kind, tally, book) for tally in tallies.values() if count_of(tally, kind, book)
        )
    for tally in tallies.values():
        found += few(_reset_findings(tally, book))
    for tally in tallies.values():
        found += few(_conflict_findings(tally, book))
    found += (_distrust_finding(entry, tallies, grid) for entry in settings.distrust if _inside(entry, grid))
    return tuple(found)


def touched_J(tally: Tally, seconds: float) -> float | None:
    """Return what a tag of power or energy would have shown in so many seconds at its mean; else None."""
    covered_us = int(tally.sums.covered_us.sum())
    if tally.tag.si_unit not in ("W", "J") or not covered_us:
        return None
    return abs(float(tally.sums.integral[0].sum())) / covered_us * seconds


def _gap_findings(export: str, tallies: Iterable[Tally], grid: Grid) -> list[Finding]:
    """Return the gaps of an export: tags that vanish and come back within the same ticks share a finding."""
    tick_us = grid.tick_s * MICROSECONDS
    together: dict[tuple[int, int], list[tuple[int, int, Tally]]] = {}
    for tally in tallies:
        for start, end in tally.log.gaps:
            together.setdefault((start // tick_us, end // tick_us), []).append((start, end, tally))
    found = []
    for key in sorted(together):
        gaps = together[key]
        start = min(gap[0] for gap in gaps)
        end = max(gap[1] for gap in gaps)
        inside_us = min(end, grid.period.end_us) - max(start, grid.period.start_us)
        energies = [touched_J(tally, inside_us / MICROSECONDS) for _, _, tally in gaps]
        at_start, at_end = start == grid.period.start_us, end == grid.period.end_us
        kind = (
            "never logged"
            if at_start and at_end
            else "late start"
            if at_start
            else "early end"
            if at_end
            else "gap"
        )
        found.append(
            Finding(
                code=FindingCode.GAP,
                export=export,
                tag=gaps[0][2].tag.name if len(gaps) == 1 else None,
                start_us=start,
                end_us=end,
                energy_J=max((energy for energy in energies if energy is not None), default=None),
                numbers={"gap_s": inside_us / MICROSECONDS, "tags": len(gaps)},
                words={"tags": ", ".join(gap[2].tag.name for gap in gaps), "kind": kind},
            )
        )
    return found


def _frozen_finding(stretch: FrozenStretch, tally: Tally, settings: CleaningSettings) -> Finding:
    users = settings.users[stretch.tag]
    first = stretch.run.first
    seconds = (stretch.end_us - stretch.start_us) / MICROSECONDS
    return Finding(
        code=FindingCode.FROZEN,
        export=tally.tag.export,
        file=None if first is None else first.file,
        line=None if first is None else first.line,
        tag=stretch.tag,
        machine=users[0] if len(users) == 1 else None,
        start_us=stretch.start_us,
        end_us=stretch.end_us,
        energy_J=touched_J(tally, seconds),
        numbers={
            "frozen_s": seconds,
            "covered_s": stretch.covered_us / MICROSECONDS,
            "count": stretch.cells,
            "value_SI": stretch.value,
        },
        words={"machines": ", ".join(users)},
    )


def count_of(tally: Tally, kind: Disposition, book: CellBook) -> int:
    """Return how many cells of a tag ended in a disposition."""
    return int(book.counts[book.place[tally.tag.name], kind])


def cell_finding(code: FindingCode, kind: Disposition, tally: Tally, book: CellBook) -> Finding:
    """Return the finding of all cells of a tag that ended in one disposition."""
    name = tally.tag.name
    first, last = book.first.get((name, kind)), book.last.get((name, kind))
    words = {} if first is None or last is None else {"first": first.raw, "last": last.raw}
    if kind == Disposition.STATUS_WORD and name in book.words:
        words["words"] = ", ".join(word for word, _ in book.words[name].most_common())
    return Finding(
        code=code,
        export=tally.tag.export,
        file=None if first is None else first.file,
        line=None if first is None else first.line,
        tag=name,
        start_us=None if first is None else first.instant_us,
        end_us=None if last is None or last.instant_us is None else last.instant_us + 1,
        numbers={"count": count_of(tally, kind, book)},
        words=words,
    )


def _reset_findings(tally: Tally, book: CellBook) -> Iterator[Finding]:
    for reset in tally.resets:
        seconds = (reset.end_us - reset.start_us) / MICROSECONDS
        yield Finding(
            code=FindingCode.COUNTER_RESET,
            export=tally.tag.export,
            file=book.file_name(reset.file),
            line=reset.line if reset.file >= 0 else None,
            tag=tally.tag.name,
            start_us=reset.start_us,
            end_us=reset.end_us,
            energy_J=touched_J(tally, seconds),
            numbers={"missing_s": seconds},
            words={"kind": "fell" if reset.fell else "rose too fast"},
        )


def _conflict_findings(tally: Tally, book: CellBook) -> Iterator[Finding]:
    """Give one finding for each stretch of conflicting values."""
    parts: Sequence[Conflicts] = tally.conflicts
    if not parts:
        return
    instants = np.concatenate([part.instants_us for part in parts])
    effect = np.concatenate([part.effect for part in parts])
    lost_file = np.concatenate([part.lost_file for part in parts])
    lost_line = np.concatenate([part.lost_line for part in parts])
    kept_file = np.concatenate([part.kept_file for part in parts])
    apart_us = max(tally.sums.hold_us, FEW_TICKS * tally.grid.tick_s * MICROSECONDS)
    edges = np.flatnonzero(np.diff(instants) > apart_us) + 1
    for chosen in np.split(np.arange(instants.size), edges):
        first, last = int(chosen[0]), int(chosen[-1])
        total = float(effect[chosen[np.argmax(np.abs(effect[chosen]))]])
        if tally.tag.between != "counter":
            total = float(effect[chosen].sum())
        kept = book.file_name(int(kept_file[first]))
        yield Finding(
            code=FindingCode.CONFLICT,
            export=tally.tag.export,
            file=book.file_name(int(lost_file[first])),
            line=int(lost_line[first]),
            tag=tally.tag.name,
            start_us=int(instants[first]),
            end_us=int(instants[last]) + 1,
            energy_J=abs(total) if tally.tag.si_unit in ("W", "J") else None,
            numbers={"count": chosen.size, "effect_SI_s": total},
            words={} if kept is None else {"kept": kept},
        )


def _inside(entry: Distrust, grid: Grid) -> bool:
    return entry.start_us < grid.period.end_us and entry.end_us > grid.period.start_us


def _distrust_finding(entry: Distrust, tallies: Mapping[str, Tally], grid: Grid) -> Finding:
    tally = tallies[entry.tag]
    start_us = max(entry.start_us, grid.period.start_us)
    end_us = min(entry.end_us, grid.period.end_us)
    seconds = (end_us - start_us) / MICROSECONDS
    return Finding(
        code=FindingCode.DISTRUSTED,
        export=tally.tag.export,
        tag=entry.tag,
        start_us=start_us,
        end_us=end_us,
        energy_J=touched_J(tally, seconds),
        numbers={"distrusted_s": seconds},
        words={"reason": entry.reason},
    )


def few(findings: Iterable[Finding]) -> list[Finding]:
    """Keep the longest of many like findings, and sum up the rest in one."""
    given = list(findings)
    if len(given) <= MOST_ALIKE:
        return given
    length = [(finding.end_us or 0) - (finding.start_us or 0) for finding in given]
    order = sorted(range(len(given)), key=lambda index: (-length[index], index))
    kept = sorted(order[: MOST_ALIKE - 1])
    rest = sorted(order[MOST_ALIKE - 1 :])
    others = [given[index] for index in rest]
    names = sorted({key for finding in others for key in finding.numbers if key != "tags"})
    energies = [finding.energy_J for finding in others if finding.energy_J is not None]
    numbers = {name: float(sum(finding.numbers.get(name, 0.0) for finding in others)) for name in names}
    numbers["findings"] = len(others)
    summed = Finding(
        code=others[0].code,
        export=others[0].export,
        tag=others[0].tag if len({finding.tag for finding in others}) == 1 else None,
        start_us=min(finding.start_us or 0 for finding in others),
        end_us=max(finding.end_us or 0 for finding in others),
        energy_J=sum(energies) if energies else None,
        numbers=numbers,
        words={"kind": "many"},
    )
    return [given[index] for index in kept] + [summed]
