"""What reading gives: blocks of samples with their lines, and a note on every file."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import IntEnum
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from auditor.records.findings import Finding


class Disposition(IntEnum):
    """Where a raw cell ended. Every cell of a bound tag ends in exactly one of these."""

    USED = 0
    EMPTY = 1
    STATUS_WORD = 2
    SENTINEL = 3
    OUT_OF_RANGE = 4
    SPIKE = 5
    FROZEN = 6
    DUPLICATE = 7
    CONFLICT_LOST = 8
    UNPARSEABLE = 9
    BAD_STAMP = 10
    DISTRUSTED = 11
    OUTSIDE_PERIOD = 12
    CARRIED_IN = 13
    CHANGED_TOO_FAST = 14
    ZERO_WHILE_RUNNING = 15

    @property
    def word(self) -> str:
        """The word printed in ledgers."""
        return self.name.lower().replace("_", " ")


@dataclass(frozen=True)
class Rejects:
    """Cells that reading itself rejected, one entry per cell, in file order (struct of arrays)."""

    tag: NDArray[np.int16]
    """Index into the block's ``tags``."""
    disposition: NDArray[np.int8]
    source: NDArray[np.int16]
    """Index into the block's ``files``."""
    line: NDArray[np.int64]
    """Line of that file, from 1."""
    word: NDArray[np.int32]
    """Index into ``words``."""
    words: tuple[str, ...]
    """The raw texts, verbatim and distinct."""


@dataclass(frozen=True)
class SampleBlock:
    """A piece of one export in time order: one chunk of one file, or of several that overlap.

    Over one export the blocks come in order of time: no stamp of a block is earlier than the last stamp
    of the block before it. Rows of equal stamps stand in order of precedence: the file of the
    earlier pattern first, then order of files and lines.
    """

    export: str
    files: tuple[str, ...]
    """Paths below ``logs/`` with ``/``; a member of an archive as ``gas/october.zip!index.csv``."""
    pattern: tuple[int, ...]
    """For each of ``files`` the index of the export's pattern that matched it."""
    instants_us: NDArray[np.int64]
    """UTC, shape (n,), not falling."""
    source: NDArray[np.int16]
    """Index into ``files`` for each row, shape (n,)."""
    line: NDArray[np.int64]
    """Line in its file for each row, from 1, shape (n,)."""
    tags: tuple[str, ...]
    """Names of the bound tags, k of them."""
    values: NDArray[np.float64]
    """Raw numbers (not yet SI), shape (k, n); NaN = no number here. A state is its index among the
    tag's distinct ``states`` raw texts, in the order of the plant file."""
    rejected: NDArray[np.int64]
    """Cells per tag and disposition that never became a number, shape (k, len(Disposition)).

    ``rejected.sum(axis=1) + isfinite(values).sum(axis=1)`` is the number of raw cells per tag.
    """
    rejects: Rejects


@dataclass(frozen=True)
class ReadingNote:
    """What was recognised in one file, with the evidence, and what became of its lines."""

    export: str | None
    """None for a file that no pattern claims."""
    file: str
    pattern: int | None
    bytes: int
    sha256: str
    encoding: str
    delimiter: str
    """``,`` ``;`` or a tab; empty when unreadable."""
    layout: str
    """``wide``, ``long``, ``pairs`` or ``one file per tag``."""
    heading_line: int
    unit_line: int | None
    columns: tuple[str, ...]
    unclaimed_columns: tuple[str, ...]
    """Headings that no tag binds, stamp column left out."""
    unclaimed_cells: Mapping[str, int]
    """Number of data cells in each unclaimed column."""
    stamp_format: str
    """In plain words: ``day.month.year hour:minute:second``."""
    evidence: tuple[str, ...]
    """Why it was recognised so, one plain sentence each."""
    lines: int
    """All lines of the file."""
    lines_data: int
    """Lines that gave a row of samples."""
    lines_skipped: int
    """Preamble, headings, unit rows, blank lines, footers."""
    lines_rejected: int
    """Data lines with a bad stamp or the wrong number of fields. The three add up to ``lines``."""
    first_us: int | None
    last_us: int | None
    backward_steps: int
    """How often the stamp fell from one line to the next (beyond a repeated autumn hour)."""
    findings: tuple[Finding, ...]
