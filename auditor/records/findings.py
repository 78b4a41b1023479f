"""Findings: what the program noticed by itself. Codes and numbers only; wording is the report's."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum
from types import MappingProxyType


class FindingCode(StrEnum):
    """Kinds of finding. Each has its paragraph in the report's wording and in the documentation."""

    GAP = "gap"
    FROZEN = "frozen"
    OUT_OF_RANGE = "out of range"
    STATUS_WORDS = "status words"
    COUNTER_RESET = "counter reset"
    CONFLICT = "conflicting values"
    DISTRUSTED = "distrusted by declaration"
    CLOCK_STEP = "clock step"
    CLOCK_OFFSET = "clock offset"
    REPEATED_HOUR = "repeated hour"
    UNCLAIMED_FILE = "unclaimed file"
    UNCLAIMED_COLUMN = "unclaimed column"
    RENAMED_COLUMN = "renamed column"
    UNREADABLE_FILE = "unreadable file"
    INCOMPLETE_LINE = "incomplete line"
    REJECTED_LINES = "rejected lines"
    LOST_DIGITS = "lost digits"
    MISSING_EXPORT = "missing export"
    OPEN_BALANCE = "open balance"
    IMPOSSIBLE_CLUSTER = "impossible cluster"
    UNIT_SUSPECTED = "unit suspected"
    STEP_IN_FIGURE = "step in a figure"
    HEATING_VALUE_CHANGED = "heating value changed"
    CREEP_AT_STANDSTILL = "creep at standstill"
    WITHHELD_FIGURE = "figure withheld"
    SPIKES = "spikes"
    CHANGED_TOO_FAST = "changed too fast"
    ZERO_WHILE_RUNNING = "zero while running"
    AT_RANGE_END = "at the end of its range"
    STOOD_LONG = "stood still for unusually long"
    COARSE_STEPS = "coarse counter steps"
    SWAPPED_PAIR = "pair perhaps swapped"


_NO_NUMBERS: Mapping[str, float] = MappingProxyType({})
_NO_WORDS: Mapping[str, str] = MappingProxyType({})


@dataclass(frozen=True)
class Finding:
    """One thing noticed, with time, place and size."""

    code: FindingCode
    export: str | None = None
    file: str | None = None
    line: int | None = None
    tag: str | None = None
    machine: str | None = None
    stream: str | None = None
    start_us: int | None = None
    end_us: int | None = None
    """Half-open, UTC microseconds."""
    energy_J: float | None = None
    """How much energy is touched (not lost): the measure by which findings are ranked."""
    numbers: Mapping[str, float] = field(default_factory=lambda: _NO_NUMBERS)
    """SI numbers by name with unit suffix, e.g. ``{"gap_s": 18000.0, "count": 12}``."""
    words: Mapping[str, str] = field(default_factory=lambda: _NO_WORDS)
    """Verbatim pieces of files or names, e.g. ``{"word": "Sensorfehler"}``."""
    suspects: tuple[str, ...] = ()
    """Tags most likely at fault, most likely first, where data path or units show it; else empty."""
