"""Pieces of several files, or of one that is not in order, to blocks in order of time."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from auditor.log_reading.pieces import Piece, join_rejects
from auditor.records.plant import Export
from auditor.records.samples import ReadingNote, SampleBlock

NEVER = np.iinfo(np.int64).max
ALWAYS = np.iinfo(np.int64).min


@dataclass(frozen=True)
class Source:
    """One file to be merged, in its place of precedence."""

    path: str
    pattern: int
    floor_us: int
    """No stamp of the file is earlier, as far as was looked."""
    slack_us: int
    """How far a stamp may fall behind those before it; ``NEVER`` for a file that is not in order."""
    read: Callable[[], Iterator[Piece | ReadingNote]]
    """Opens the file: its pieces, and its note at the end."""


@dataclass
class _Cursor:
    """Where the reading of one source stands."""

    source: Source
    rank: int
    floor_us: int
    """No row that is still to come is earlier."""
    pieces: Iterator[Piece | ReadingNote] | None = None
    pending: list[Piece] = field(default_factory=list)
    late: int = 0
    """Rows that came too late to be put in order."""
    latest_us: int = 0
    """How late they came at most."""


def merge(
    sources: Sequence[Source], export: Export, amend: Callable[[ReadingNote, int, int], ReadingNote]
) -> Iterator[SampleBlock | ReadingNote]:
    """Merge files into blocks in order of time; of equal stamps the earlier source stands first.

    A file in order is handed on piece by piece. Where files overlap their rows are sorted together,
    in memory, no further than the overlap reaches. A file that is out of order is held whole.

    Parameters
    ----------
    sources : sequence of Source
        In order of precedence.
    export : Export
        Whose files they are.
    amend : callable
        Called with a file's note, the number of its rows that came too late to be put in order, and
        how late [us]; returns the note with these as rejected.
    """
    cursors = [_Cursor(source, rank, source.floor_us) for rank, source in enumerate(sources)]
    emitted_us = ALWAYS
    while any(cursor.floor_us < NEVER for cursor in cursors):
        cursor = min(cursors, key=lambda each: (each.floor_us, each.rank))
        note = _advance(cursor, emitted_us)
        if note is not None:
            yield amend(note, cursor.late, cursor.latest_us) if cursor.late else note
        watermark_us = min(each.floor_us for each in cursors)
        for block in _ready(cursors, watermark_us, export):
            if block.instants_us.size:
                emitted_us = int(block.instants_us[-1])
            if block.instants_us.size or block.rejected.any():
                yield block


def _advance(cursor: _Cursor, emitted_us: int) -> ReadingNote | None:
    """Take the next piece of a file; its note at its end."""
    if cursor.pieces is None:
        cursor.pieces = cursor.source.read()
    piece = next(cursor.pieces)
    if isinstance(piece, ReadingNote):
        cursor.floor_us = NEVER
        return piece
    late = int(np.searchsorted(piece.instants_us, emitted_us))
    if late:
        cursor.late += late
        cursor.latest_us = max(cursor.latest_us, emitted_us - int(piece.instants_us[0]))
        piece = piece.without_first(late)
    cursor.pending.append(piece)
    if piece.instants_us.size and cursor.source.slack_us < NEVER:
        cursor.floor_us = max(cursor.floor_us, int(piece.instants_us[-1]) - cursor.source.slack_us)
    return None


def _ready(cursors: list[_Cursor], watermark_us: int, export: Export) -> Iterator[SampleBlock]:
    """Hand on all rows before the watermark, cluster by cluster of overlapping pieces."""
    waiting = sorted(
        ((piece, cursor) for cursor in cursors for piece in cursor.pending),
        key=lambda pair: (_span(pair[0])[0], pair[1].rank),
    )
    for cursor in cursors:
        cursor.pending = []
    place = 0
    while place < len(waiting):
        cluster, end_us = [waiting[place]], _span(waiting[place][0])[1]
        place += 1
        while place < len(waiting) and _touches(waiting[place], cluster, end_us):
            cluster.append(waiting[place])
            end_us = max(end_us, _span(waiting[place][0])[1])
            place += 1
        if end_us < watermark_us:
            yield _block(cluster, export)
            continue
        if len(cluster) > 1 and _span(cluster[0][0])[0] < watermark_us:
            before = [_keep_rest(piece, cursor, watermark_us) for piece, cursor in cluster]
            yield _block([pair for pair in before if pair is not None], export)
            continue
        for piece, cursor in cluster:
            cursor.pending.append(piece)


def _touches(pair: tuple[Piece, _Cursor], cluster: list[tuple[Piece, _Cursor]], end_us: int) -> bool:
    """Whether rows of a piece must be sorted in among those of a cluster that ends at ``end_us``."""
    start_us = _span(pair[0])[0]
    # A stamp that goes on in the next chunk of the same file is in order already.
    is_next = len(cluster) == 1 and cluster[0][1] is pair[1]
    return start_us < end_us or (start_us == end_us and not (is_next and _below(pair[0], cluster[0][0])))


def _below(piece: Piece, other: Piece) -> bool:
    """Whether all rows of a piece stand below those of another one of the same file."""
    return piece.line.size == 0 or other.line.size == 0 or bool(other.line.max() < piece.line.min())


def _span(piece: Piece) -> tuple[int, int]:
    if piece.instants_us.size == 0:
        return ALWAYS, ALWAYS
    return int(piece.instants_us[0]), int(piece.instants_us[-1])


def _keep_rest(piece: Piece, cursor: _Cursor, watermark_us: int) -> tuple[Piece, _Cursor] | None:
    at = int(np.searchsorted(piece.instants_us, watermark_us))
    if at == piece.instants_us.size:
        return piece, cursor
    if at == 0:
        cursor.pending.append(piece)
        return None
    first, rest = piece.split(at)
    cursor.pending.append(rest)
    return first, cursor


def _block(cluster: list[tuple[Piece, _Cursor]], export: Export) -> SampleBlock:
    """Sort the rows of overlapping pieces into one block; a lone piece is handed on as it is."""
    cluster = sorted(cluster, key=lambda pair: pair[1].rank)
    owners = list(dict.fromkeys(cursor.rank for _, cursor in cluster))
    source_of = [owners.index(cursor.rank) for _, cursor in cluster]
    files = {cursor.rank: cursor.source for _, cursor in cluster}
    pieces = [piece for piece, _ in cluster]
    if len(pieces) == 1:
        instants_us, line, values = pieces[0].instants_us, pieces[0].line, pieces[0].values
        source = np.zeros(instants_us.size, np.int16)
    else:
        instants_us = np.concatenate([piece.instants_us for piece in pieces])
        line = np.concatenate([piece.line for piece in pieces])
        source = np.concatenate(
            [np.full(piece.line.size, at, np.int16) for piece, at in zip(pieces, source_of, strict=True)]
        )
        values = np.concatenate([piece.values for piece in pieces], axis=1)
        order = np.lexsort((line, source, instants_us))
        instants_us, line, source, values = instants_us[order], line[order], source[order], values[:, order]
    return SampleBlock(
        export=export.name,
        files=tuple(files[rank].path for rank in owners),
        pattern=tuple(files[rank].pattern for rank in owners),
        instants_us=instants_us,
        source=source,
        line=line,
        tags=export.tags,
        values=values,
        rejected=np.sum([piece.rejected for piece in pieces], axis=0),
        rejects=join_rejects([piece.rejects for piece in pieces], source_of),
    )
