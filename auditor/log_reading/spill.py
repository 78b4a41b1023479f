"""Rows of a large file that is not in order: put aside day by day, taken up again in order of time."""

from __future__ import annotations

import pickle
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import cast

import numpy as np

from auditor.log_reading.pieces import Piece, join_rejects
from auditor.records.samples import ReadingNote

_DAY_US = 86_400_000_000
_NO_DAY = "undated"


def in_order(pieces: Iterator[Piece | ReadingNote]) -> Iterator[Piece | ReadingNote]:
    """Give the rows of a file in order of time, one UTC day after the other, then its note.

    Memory is that of one chunk or of one day, whichever is larger. The rows lie in a folder for
    temporary files of the system in the meantime, never in the site's folder; it is removed at the
    end, also when the reading is given up.
    """
    notes: list[ReadingNote] = []
    with tempfile.TemporaryDirectory(prefix="auditor-") as name:
        folder = Path(name)
        for piece in pieces:
            if isinstance(piece, ReadingNote):
                notes.append(piece)
            else:
                _put_aside(piece, folder)
        if (folder / _NO_DAY).exists():
            yield _take_up(folder / _NO_DAY)
        for day in sorted(int(path.name) for path in folder.iterdir() if path.name != _NO_DAY):
            yield _take_up(folder / str(day))
    yield from notes


def _put_aside(piece: Piece, folder: Path) -> None:
    """Append the rows of a piece to the files of their days, each with the rejects of its lines."""
    rest = piece
    while rest.instants_us.size:
        day = int(rest.instants_us[0]) // _DAY_US
        first, rest = rest.split(int(np.searchsorted(rest.instants_us, (day + 1) * _DAY_US)))
        _append(first, folder / str(day))
    if rest is piece:
        _append(piece, folder / _NO_DAY)


def _append(piece: Piece, path: Path) -> None:
    with path.open("ab") as stream:
        pickle.dump(piece, stream, pickle.HIGHEST_PROTOCOL)


def _take_up(path: Path) -> Piece:
    parts: list[Piece] = []
    size = path.stat().st_size
    with path.open("rb") as stream:
        while stream.tell() < size:
            parts.append(cast("Piece", pickle.load(stream)))
    path.unlink()
    if len(parts) == 1:
        return parts[0]
    instants_us = np.concatenate([part.instants_us for part in parts])
    line = np.concatenate([part.line for part in parts])
    order = np.lexsort((line, instants_us))
    return Piece(
        instants_us[order],
        line[order],
        np.concatenate([part.values for part in parts], axis=1)[:, order],
        np.sum([part.rejected for part in parts], axis=0),
        join_rejects([part.rejects for part in parts], [0] * len(parts)),
    )
