"""The result of one audit: all that the report, the tables and a caller of the library need."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.balances import MachineBalance
    from auditor.records.errors import Exit
    from auditor.records.findings import Finding
    from auditor.records.period import Period
    from auditor.records.plant import Plant
    from auditor.records.powers import PowerTable
    from auditor.records.samples import ReadingNote
    from auditor.records.ticks import TickTable


@dataclass(frozen=True)
class MachineJudgement:
    """Verdicts of one machine."""

    machine: str
    verdict: NDArray[np.int8]
    """A :class:`~auditor.records.verdicts.Verdict` per interval, shape (I,)."""
    reasons: tuple[tuple[str, ...], ...]
    """Per interval the reasons (values of ``Reason``), also those an earlier word hid; length I."""
    impossible_period: bool
    """The period's own coherent verdict is impossible."""
    hours: Mapping[str, float]
    """Hours by verdict word, every word of the list."""
    energy_share: Mapping[str, float]
    """Share of the machine's known input energy by verdict word [1]."""


@dataclass(frozen=True)
class WorkedInterval:
    """The interval whose arithmetic the report prints, and why it was chosen."""

    machine: str
    index: int
    why: str
    """A code: ``median efficiency``, ``impossible``."""


@dataclass(frozen=True)
class AuditResult:
    """One audit of one site over one period."""

    version: str
    plant: Plant
    plant_sha256: str
    period: Period
    period_said: str
    """How the period was chosen, in plain words; empty when the user named it."""
    notes: tuple[ReadingNote, ...]
    """Every file below ``logs/``, claimed or not, in order of path."""
    ticks: TickTable
    powers: PowerTable
    balances: Mapping[str, MachineBalance]
    judgements: Mapping[str, MachineJudgement]
    findings: tuple[Finding, ...]
    """Most important first."""
    worked: WorkedInterval | None
    status: Exit
    """``FIRM``, ``PROVISIONAL`` or ``LOOK``."""


@dataclass(frozen=True)
class CheckResult:
    """What reading alone recognised: nothing is computed."""

    plant: Plant
    notes: tuple[ReadingNote, ...]
    """Every file below ``logs/``, claimed or not, in order of path."""
    findings: tuple[Finding, ...]
