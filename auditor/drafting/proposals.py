"""What a draft proposes and what it leaves blank, before it is written down."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum
from typing import Literal

from auditor.records.plant import DateOrder


class Appearance(Enum):
    """What the numbers of a column look like; a hint for a person, never a declaration."""

    COUNTER = "a counter"
    STATE = "a state"
    CONSTANT = "a constant"
    LEVEL = "a level or a rate"
    WORDS = "words"


@dataclass(frozen=True)
class UnitFound:
    """A unit as the export writes it, and as the plant file would."""

    written: str
    """Empty where the export names none."""
    unit: str
    """Empty where it is left blank."""
    quantity: str
    """Kind of quantity; empty with the unit."""
    because: str
    """Where it stands, or why it is left blank."""


@dataclass(frozen=True)
class TagProposal:
    """One column that may become a tag."""

    name: str
    column: str
    unit: UnitFound
    appearance: Appearance
    because: str
    """What was seen in its cells."""
    texts: tuple[str, ...]
    """Of a state: every raw text seen, in order."""


@dataclass(frozen=True)
class StampEvidence:
    """What the stamps of an export show."""

    order: DateOrder | None
    because: str
    first: str
    last: str
    clock: tuple[str, ...]
    """What speaks for or against a clock, one sentence each."""
    step_s: float
    """Usual time between two rows [s]; NaN when it is unknown."""


@dataclass(frozen=True)
class ExportProposal:
    """One kind of export file."""

    name: str
    files: tuple[str, ...]
    count: int
    delimiter: str
    decimal: Literal[".", ","] | None
    decimal_because: str
    layout: tuple[str, str, str] | None
    """Headings of stamp, tag and value of a long export."""
    stamp: tuple[str, ...]
    """Headings of the stamp; empty where it is the first column."""
    stamps: StampEvidence
    tags: tuple[TagProposal, ...]
    remarks: tuple[str, ...] = field(default=())
    """What else a person should know of these files."""


@dataclass(frozen=True)
class Draft:
    """Everything that a folder of exports lets one propose."""

    exports: tuple[ExportProposal, ...]
    skipped: tuple[tuple[str, str], ...]
    """Files that are no exports, with the reason."""
