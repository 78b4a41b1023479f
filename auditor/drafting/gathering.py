"""Lines of the files of one export: whole small files, and pieces of the larger ones."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

from auditor.drafting.first_look import HEAD_BYTES, Sighting, Table
from auditor.log_reading.dialect import split_fields
from auditor.log_reading.listing import READ_ERRORS
from auditor.log_reading.samples import split_lines, take_samples

_FILES_SAMPLED = 8
_LINES = 40_000
"""About so many lines of an export have their stamps looked at."""
_ROWS = 2_000
"""About so many rows of an export have their cells looked at."""
_COMPARED_LINES = 3_000
"""So many lines of each piece are held beside those of another export."""
_PACKED_MOST = 8 << 20
"""A larger packed file is looked at in its head only: its end is found by unpacking all of it."""


@dataclass(frozen=True)
class Piece:
    """Lines of data that follow one another in one file."""

    table: Table
    lines: tuple[str, ...]

    def stamps(self) -> list[list[str]]:
        """Texts of the stamp, one list for each of its columns."""
        last = max(self.table.stamp)
        cut = [
            split_fields(line, self.table.delimiter)
            if '"' in line
            else line.split(self.table.delimiter, last + 1)
            for line in self.lines
        ]
        return [[row[at] if at < len(row) else "" for row in cut] for at in self.table.stamp]

    def rows(self, every: int = 1, most: int | None = None) -> list[list[str]]:
        """Fields of each n-th of the first lines."""
        return [split_fields(line, self.table.delimiter) for line in self.lines[:most:every]]


@dataclass(frozen=True)
class Column:
    """Cells of one column in the order of files and lines, blanks around them gone."""

    texts: tuple[str, ...]
    pieces: tuple[int, ...]
    """Which piece each cell is from: between two pieces a number may leap either way."""


@dataclass(frozen=True)
class Gathered:
    """What was taken from the files of one export."""

    pieces: tuple[Piece, ...]
    """Pieces of the files looked into."""
    heads: tuple[Piece, ...]
    """First lines of every file."""

    def columns(self) -> dict[str, Column]:
        """Return the columns by heading, thinned to some thousand rows."""
        total = sum(len(piece.lines) for piece in self.pieces)
        every = max(1, total // _ROWS)
        texts: dict[str, list[str]] = {}
        pieces: dict[str, list[int]] = {}
        for number, piece in enumerate(self.pieces):
            rows = _even(piece.rows(every), len(piece.table.headings))
            for place, heading in enumerate(piece.table.headings):
                texts.setdefault(heading, []).extend(row[place].strip() for row in rows)
                pieces.setdefault(heading, []).extend([number] * len(rows))
        return {heading: Column(tuple(texts[heading]), tuple(pieces[heading])) for heading in texts}

    @cached_property
    def records(self) -> dict[str, dict[str, str]]:
        """Some rows by the text of their stamp, cells by heading; of one stamp the first."""
        found: dict[str, dict[str, str]] = {}
        for piece in self.pieces:
            headings = piece.table.headings
            for row in piece.rows(most=_COMPARED_LINES):
                if len(row) >= len(headings):
                    stamp = " ".join(row[at].strip() for at in piece.table.stamp)
                    found.setdefault(stamp, dict(zip(headings, row, strict=False)))
        return found


def _even(rows: list[list[str]], least: int) -> list[list[str]]:
    """Keep rows of the usual number of fields: in a torn line, columns may be shifted."""
    widths = Counter(len(row) for row in rows if len(row) >= least)
    usual = min(widths, key=lambda width: (-widths[width], width), default=least)
    return [row for row in rows if len(row) == usual]


def gather(files: Sequence[Sighting]) -> Gathered:
    """Take lines from the files of one export: more from some files, the first lines from all."""
    chosen = _spread(files, _FILES_SAMPLED)
    pieces: list[Piece] = []
    for sighting in chosen:
        pieces += _pieces(sighting, _LINES // len(chosen))
    return Gathered(tuple(pieces), tuple(Piece(file.table, file.lines) for file in files))


def _spread(files: Sequence[Sighting], most: int) -> list[Sighting]:
    if len(files) <= most:
        return list(files)
    return [files[round(at * (len(files) - 1) / (most - 1))] for at in range(most)]


def _pieces(sighting: Sighting, most: int) -> list[Piece]:
    stored = sighting.stored
    try:
        is_packed = not stored.is_plain
        if is_packed and max(stored.real.stat().st_size, stored.bytes) > _PACKED_MOST:
            return [Piece(sighting.table, sighting.lines)]
        samples = take_samples(stored, None).samples
    except READ_ERRORS:  # its head could be read: what is known of it stands
        return [Piece(sighting.table, sighting.lines)]
    share = max(HEAD_BYTES // 512, most // len(samples))
    pieces = []
    for sample in samples:
        lines = split_lines(sample.data.decode("utf-8", "replace"))
        kept = [line for line in lines if line.strip() and line.strip() not in sighting.known]
        # A file that is looked at whole is thinned at its end, so that its last stamps stay in sight.
        pieces.append(Piece(sighting.table, tuple(kept[:share])))
        if len(kept) > 2 * share:
            pieces.append(Piece(sighting.table, tuple(kept[-share:])))
        elif len(kept) > share:
            pieces[-1] = Piece(sighting.table, tuple(kept))
    return pieces
