"""The files of one export to blocks of samples in order of time."""

from __future__ import annotations

from collections.abc import Iterator

from auditor.log_reading.ahead import one_ahead, usable_threads
from auditor.log_reading.aliases import Folding, by_tag, with_joins
from auditor.log_reading.file_reading import FileReader
from auditor.log_reading.merge import ALWAYS, NEVER, Source, merge
from auditor.log_reading.notes import unread_note, with_late_rows
from auditor.log_reading.pairs_reading import PairsReader
from auditor.log_reading.pieces import Piece
from auditor.log_reading.recognition import RecognisedFile, Recognition
from auditor.log_reading.spill import in_order
from auditor.records.samples import ReadingNote, SampleBlock

_SLACK_US = 3 * 3_600_000_000
"""How far stamps may fall back inside a large file of which samples are in order."""


def read_export(
    recognition: Recognition, export_name: str, window_us: tuple[int, int], threads: int | None = None
) -> Iterator[SampleBlock | ReadingNote]:
    """Read the files of one export that meet a stretch of time.

    Parameters
    ----------
    recognition : Recognition
        What :func:`~auditor.log_reading.recognition.recognise` gave.
    export_name : str
        Name of the export.
    window_us : tuple of int
        Half-open stretch, UTC microseconds. Rows outside are counted, not handed on.
    threads : int, optional
        Threads that read ahead while the caller works on a block; 1: none. Without it, one for each core.
        What is read is the same for any number.

    Yields
    ------
    SampleBlock or ReadingNote
        Blocks in order of time, each no earlier than the one before; the note of a file when its last
        line has been read (rows of it may still be waiting to be merged with those of other files).

    Notes
    -----
    Memory is that of a few chunks, plus the stretch over which files overlap. A large file whose rows
    are not in order is put aside day by day in the system's folder for temporary files.
    """
    threads = usable_threads() if threads is None else threads
    yield from one_ahead(_read(recognition, export_name, window_us, threads), threads)


def _read(
    recognition: Recognition, export_name: str, window_us: tuple[int, int], threads: int
) -> Iterator[SampleBlock | ReadingNote]:
    export = recognition.exports[export_name]
    folding = Folding(export, recognition.tags)
    sources = []
    for file in recognition.files[export_name]:
        if file.lies_outside(window_us):
            yield unread_note(file, export_name)
        else:
            sources.append(_source(file, recognition, folding, window_us, threads))
    merged = merge(sources, by_tag(export), with_late_rows)
    yield from with_joins(merged, folding) if folding.is_needed else merged


def _source(
    file: RecognisedFile, recognition: Recognition, folding: Folding, window_us: tuple[int, int], threads: int
) -> Source:
    def read() -> Iterator[Piece | ReadingNote]:
        reader = PairsReader if file.dialect.pair_stamps else FileReader
        pieces = reader(file, folding.export, recognition.tags, window_us).read(threads)
        return folding.fold(pieces) if folding.is_needed else pieces

    if not file.is_ordered and not file.is_whole:
        return Source(file.path, file.claim.pattern, ALWAYS, 0, lambda: in_order(read()))
    margin_us = 0 if file.is_whole else _SLACK_US
    slack_us = margin_us if file.is_ordered else NEVER
    floor_us = file.first_us - margin_us if file.has_stamps else ALWAYS
    return Source(file.path, file.claim.pattern, floor_us, slack_us, read)
