"""Findings of the value tests: spikes, fast changes, impossible zeros, ends of ranges, long stands."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.coarse_steps import coarse_steps
from auditor.cleaning.long_stands import long_stands
from auditor.cleaning.notices import cell_finding, count_of, few, touched_J
from auditor.records.findings import Finding, FindingCode
from auditor.records.period import MICROSECONDS
from auditor.records.samples import Disposition

if TYPE_CHECKING:
    from auditor.cleaning.cells import CellBook
    from auditor.cleaning.coarse_steps import CoarseSteps
    from auditor.cleaning.impossible_zeros import ZeroStretch
    from auditor.cleaning.long_stands import LongStand
    from auditor.cleaning.settings import CleaningSettings
    from auditor.cleaning.tally import Tally


def value_findings(
    tallies: Mapping[str, Tally],
    settings: CleaningSettings,
    book: CellBook,
    zeros: Sequence[ZeroStretch],
) -> tuple[Finding, ...]:
    """Return what the value tests noticed, by kind, then in the order of the plant file, then of time."""
    found: list[Finding] = []
    for code, kind in (
        (FindingCode.SPIKES, Disposition.SPIKE),
        (FindingCode.CHANGED_TOO_FAST, Disposition.CHANGED_TOO_FAST),
    ):
        found += (
            cell_finding(code, kind, tally, book) for tally in tallies.values() if count_of(tally, kind, book)
        )
    for name, tally in tallies.items():
        found += few(_zero_finding(stretch, tally) for stretch in zeros if stretch.tag == name)
    for tally in tallies.values():
        found += _range_end_findings(tally)
    found += (_stand_finding(stand, tallies[stand.tag], settings) for stand in long_stands(tallies, settings))
    found += (_step_finding(steps, tallies[steps.tag]) for steps in coarse_steps(tallies, settings))
    return tuple(found)


def _zero_finding(stretch: ZeroStretch, tally: Tally) -> Finding:
    rule = tally.tag.not_zero_while
    seconds = (stretch.end_us - stretch.start_us) / MICROSECONDS
    return Finding(
        code=FindingCode.ZERO_WHILE_RUNNING,
        export=tally.tag.export,
        file=None if stretch.first is None else stretch.first.file,
        line=None if stretch.first is None else stretch.first.line,
        tag=stretch.tag,
        start_us=stretch.start_us,
        end_us=stretch.end_us,
        energy_J=touched_J(tally, seconds),
        numbers={
            "zero_s": seconds,
            "covered_s": stretch.covered_us / MICROSECONDS,
            "count": stretch.cells,
        },
        words={} if rule is None else {"evidence": rule.tag, "state": rule.state or ""},
    )


def _range_end_findings(tally: Tally) -> Iterator[Finding]:
    """Tell how much of a tag's time and sum is only bounded by what the instrument could show."""
    marks, sums = tally.range_ends, tally.sums
    if marks is None:
        return
    reached = marks.ticks() & (sums.covered_us > 0)
    if not reached.any():
        return
    ticks = np.flatnonzero(reached)
    tick_us, start_us = tally.grid.tick_s * MICROSECONDS, tally.grid.period.start_us
    covered_us = int(sums.covered_us[reached].sum())
    amount, total = float(np.abs(sums.integral[0][reached]).sum()), float(np.abs(sums.integral[0]).sum())
    examples = marks.examples(reached)
    yield Finding(
        code=FindingCode.AT_RANGE_END,
        export=tally.tag.export,
        file=examples[0].file if examples else None,
        line=examples[0].line if examples else None,
        tag=tally.tag.name,
        start_us=start_us + int(ticks[0]) * tick_us,
        end_us=start_us + (int(ticks[-1]) + 1) * tick_us,
        energy_J=amount / MICROSECONDS if tally.tag.si_unit == "W" else None,
        numbers={
            "count": int(marks.samples.sum()),
            "at_end_s": covered_us / MICROSECONDS,
            "share_of_time": covered_us / int(sums.covered_us.sum()),
            "share_of_amount": amount / total if total else 0.0,
        },
    )


def _stand_finding(stand: LongStand, tally: Tally, settings: CleaningSettings) -> Finding:
    users = settings.users[stand.tag]
    seconds = (stand.end_us - stand.start_us) / MICROSECONDS
    return Finding(
        code=FindingCode.STOOD_LONG,
        export=tally.tag.export,
        tag=stand.tag,
        machine=users[0] if len(users) == 1 else None,
        start_us=stand.start_us,
        end_us=stand.end_us,
        energy_J=touched_J(tally, seconds),
        numbers={"stood_s": seconds, "usual_s": stand.usual_s, "value_SI": stand.value},
    )


def _step_finding(steps: CoarseSteps, tally: Tally) -> Finding:
    return Finding(
        code=FindingCode.COARSE_STEPS,
        export=tally.tag.export,
        tag=steps.tag,
        start_us=tally.grid.period.start_us,
        end_us=tally.grid.period.end_us,
        numbers={
            "step_SI": steps.step,
            "rate_SI": steps.usual_rate,
            "interval_s": steps.interval_s,
            "share": steps.share,
            "smallest_interval_s": steps.smallest_interval_s,
        },
    )
