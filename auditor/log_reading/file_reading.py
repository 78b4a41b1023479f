"""One file from its first line to its last: pieces of rows, and a note that accounts for every line."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator, Mapping
from functools import partial
from typing import IO, cast

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.ahead import in_order
from auditor.log_reading.chunk_parsing import ChunkParser, Head, ParsedChunk, line_texts
from auditor.log_reading.chunks import Chunk, read_chunks
from auditor.log_reading.clocks import clock_of, second_passes
from auditor.log_reading.decide import Cells
from auditor.log_reading.dialect import heading_key, split_fields
from auditor.log_reading.doubts import Doubts
from auditor.log_reading.encoding import as_ascii_like
from auditor.log_reading.listing import READ_ERRORS, hash_file, open_stored, reason_of
from auditor.log_reading.long_layout import rows_by_tag
from auditor.log_reading.look import to_instants, without_lines
from auditor.log_reading.notes import Tally
from auditor.log_reading.pieces import Fate, Piece, make_piece
from auditor.log_reading.recognition import RecognisedFile
from auditor.log_reading.stamps import Stamps
from auditor.log_reading.table import Columns, Learnt
from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Export, Tag
from auditor.records.samples import Disposition, ReadingNote

_NO_TAG = -1
_SIDE_BY_SIDE_CHUNK = 1 << 17
"""Bytes of a chunk where as many files as there are tags are read side by side."""


class FileReader:
    """Reads one file of an export once."""

    _parser_type: type[ChunkParser] = ChunkParser

    def __init__(
        self, file: RecognisedFile, export: Export, tags: Mapping[str, Tag], window_us: tuple[int, int]
    ) -> None:
        self._file, self._export, self._window_us = file, export, window_us
        self._tags = [tags[name] for name in export.tags]
        self._parser = self._parser_type.of(file, export, self._tags)
        self._doubts = Doubts(file.path, export, self._tags, file.proof)
        self._clock = clock_of(export.clock)
        self._learnt = Learnt()
        self._tally = Tally(file)
        self._tally.unclaimed.update({file.dialect.headings[place]: 0 for place in file.dialect.unclaimed})
        self._before: dict[int, tuple[int, int]] = {}
        """Line and stamp of the last good row (long: of each tag)."""
        self._carried = b""
        """Lines of a repeated hour that the next chunk may go on with."""
        self._is_closed = False
        """A different heading row came up: what follows cannot be bound."""

    def read(self, threads: int) -> Iterator[Piece | ReadingNote]:
        """Give the rows of the file chunk by chunk, then its note; ``threads`` parse ahead."""
        stored, encoding = self._file.claim.stored, self._file.encoding
        digest = ""
        # As many files as there are tags: each with small chunks, and none ahead.
        size = _SIDE_BY_SIDE_CHUNK if self._file.point else None
        try:
            with open_stored(stored) as opened:
                stream = _Hashing(opened) if stored.is_plain else opened
                text = as_ascii_like(cast("IO[bytes]", stream), encoding)
                head_lines = self._file.dialect.first_data_line - 1
                jobs = self._jobs(read_chunks(text, size, head_lines))
                for parsed in (job() for job in jobs) if self._file.point else in_order(jobs, threads):
                    self._learnt = self._learnt.joined(parsed.columns.learnt)
                    piece = self._chunk(parsed)
                    # Its lines must not lie in memory until the rows have been worked on.
                    del parsed
                    if piece is not None:
                        yield piece
                if isinstance(stream, _Hashing):
                    digest = stream.sha256.hexdigest()
        except READ_ERRORS as error:
            self._stop(reason_of(error))
        yield self._tally.note(self._export.name, digest or _digest(self._file))

    def _stop(self, reason: str) -> None:
        tally = self._tally
        if self._carried:
            lines = self._carried.count(b"\n")
            tally.reject_line(tally.lines + 1, "", lines)
            tally.lines += lines
        words = {"reason": reason}
        export, path = self._export.name, self._file.path
        finding = Finding(
            FindingCode.UNREADABLE_FILE, export=export, file=path, line=tally.lines + 1, words=words
        )
        tally.findings.append(finding)

    def _jobs(self, chunks: Iterator[Chunk]) -> Iterator[Callable[[], ParsedChunk]]:
        for chunk in chunks:
            yield partial(self._parser.parse, chunk, self._learnt)

    def _chunk(self, parsed: ParsedChunk) -> Piece | None:
        tally = self._tally
        tally.strays += parsed.strays
        if self._carried:
            text = self._carried + parsed.text
            parsed = self._parser.parse_text(parsed.chunk, text, 0, self._learnt)
            self._carried = b""
        if parsed.head is not None:
            self._pass_over(parsed.head)
        if parsed.end is None and not self._is_closed:
            at = self._open_hour(parsed.stamps, parsed.columns)
            if at is not None:
                self._carried = without_lines(parsed.data, at)
                parsed = self._parser.without_tail(parsed, self._carried, self._learnt)
        piece, first_line, lines = None, tally.lines + 1, parsed.columns.lines
        tally.lines += lines
        if self._is_closed:
            tally.reject_line(first_line, "", lines)
        elif lines:
            piece = self._rows(parsed, first_line)
        end = parsed.end
        if end is not None:
            tally.footer = end.footer
            tally.skipped += end.footer_lines
            tally.lines += end.footer_lines
            if end.torn is not None:
                self._hold_back(end.torn)
        return piece

    def _pass_over(self, head: Head) -> None:
        """Count the lines down to the heading; rows above it (the file was sorted) are rejected."""
        tally = self._tally
        if head.rows:
            tally.reject_line(tally.lines + head.first_row + 1, head.first_text, head.rows)
        tally.skipped += head.lines - head.rows
        tally.lines += head.lines

    def _hold_back(self, text: str) -> None:
        tally = self._tally
        tally.lines += 1
        tally.rejected += 1
        tally.torn += 1
        tally.findings.append(
            Finding(
                FindingCode.INCOMPLETE_LINE,
                export=self._export.name,
                file=self._file.path,
                line=tally.lines,
                words={"text": text[:200]},
            )
        )

    def _open_hour(self, stamps: Stamps, columns: Columns) -> int | None:
        """First line of a repeated hour that reaches the end of the chunk: its passes may go on."""
        never_repeats = self._clock.low_us.size == 0
        if never_repeats or self._export.repeated_hour == "drop" or not stamps.good.any():
            return None
        _, second_us, _ = to_instants(stamps, self._clock)
        inside = stamps.good & (second_us > 0)
        others = np.flatnonzero(stamps.good & ~inside)
        tail = int(others[-1]) + 1 if others.size else 0
        hours = np.flatnonzero(inside[tail:])
        return int(columns.line[tail + hours[0]]) if hours.size else None

    def _rows(self, parsed: ParsedChunk, first_line: int) -> Piece | None:
        tally, dialect = self._tally, self._file.dialect
        columns, stamps, texts, cells = parsed.columns, parsed.stamps, parsed.texts, parsed.cells
        for name, count in parsed.unknown.items():
            tally.unclaimed[name] = tally.unclaimed.get(name, 0) + count
        line = first_line + columns.line
        instants_us, fate = self._instants(stamps, cells, line)
        closed_at = self._look_at_odd_lines(parsed, fate, first_line)
        kept = columns.lines if closed_at is None else closed_at
        fate[columns.line >= kept] = Fate.NO_DATA
        dated = (fate == Fate.GOOD) | (fate == Fate.OUTSIDE)
        self._doubts.about_numbers(cells, line, dated)
        self._count_lost_digits(cells, line, dated)
        self._see(instants_us, line, dated, cells)
        bad = np.flatnonzero(fate == Fate.BAD_STAMP)
        self._doubts.about_dates(stamps, texts, line, bad[~stamps.good[bad]])
        bad_stamps = [" ".join(column.at(row) for column in texts) for row in bad.tolist()]
        first_rows, fate_of_lines = self._fate_of_lines(columns, fate)
        lost = first_rows[fate_of_lines == Fate.BAD_STAMP]
        unreadable = lost[~stamps.good[lost]]
        if unreadable.size:
            text = " ".join(column.at(int(unreadable[0])) for column in texts)
            tally.reject_line(int(line[unreadable[0]]), text, unreadable.size)
        tally.rejected += lost.size - unreadable.size
        data = int(((fate_of_lines == Fate.GOOD) | (fate_of_lines == Fate.OUTSIDE)).sum())
        tally.data += data
        tally.outside += int((fate == Fate.OUTSIDE).sum())
        passed_over = first_rows[fate_of_lines == Fate.NO_DATA]
        tally.skipped += int((columns.line[passed_over] < kept).sum())
        if closed_at is not None:
            tally.reject_line(first_line + kept, "", columns.lines - kept)
        for place in dialect.unclaimed:
            tally.unclaimed[dialect.headings[place]] += data + lost.size
        piece = make_piece(cells, instants_us, line, fate, bad_stamps, len(self._tags))
        return piece if piece.instants_us.size or piece.rejected.any() else None

    def _count_lost_digits(self, cells: Cells, line: NDArray[np.int64], dated: NDArray[np.bool_]) -> None:
        """Note readings of counters whose exponent hides digits."""
        for tag, reader in enumerate(self._parser.readers):
            if reader.counter_step is None:
                continue
            own = (cells.tag == tag) & (cells.disposition == Disposition.UNPARSEABLE) & dated[cells.row]
            words = np.unique(cells.word[own])
            short = [word for word in words.tolist() if reader.hides_digits(cells.words[word].strip())]
            hit = np.flatnonzero(own & np.isin(cells.word, short))
            if hit.size:
                first = int(hit[np.argmin(line[cells.row[hit]])])
                place = (int(line[cells.row[first]]), cells.words[cells.word[first]].strip())
                self._tally.lose_digits(self._tags[tag].name, place, hit.size)

    def _fate_of_lines(
        self, columns: Columns, fate: NDArray[np.int8]
    ) -> tuple[NDArray[np.int64], NDArray[np.int8]]:
        """First row of each line, and the fate of the line: here every row is a line."""
        return np.arange(fate.size), fate

    def _instants(
        self, stamps: Stamps, cells: Cells, line: NDArray[np.int64]
    ) -> tuple[NDArray[np.int64], NDArray[np.int8]]:
        """UTC of each row, and its fate as far as the stamp decides it."""
        tally, export = self._tally, self._export
        instants_us, second_us, in_gap = to_instants(stamps, self._clock)
        in_gap &= stamps.good
        is_good = stamps.good & ~in_gap
        if in_gap.any():
            tally.skipped_hour_line = tally.skipped_hour_line or int(line[np.argmax(in_gap)])
            tally.skipped_hour += int(in_gap.sum())
        low_us, high_us = self._file.believed_us
        reset = is_good & ((instants_us < low_us) | (instants_us >= high_us))
        if reset.any():
            is_good &= ~reset
            tally.see_reset(instants_us, line, reset, is_good)
        hour = np.flatnonzero(stamps.good & ~reset & (second_us > 0))
        if hour.size:
            known = np.zeros(hour.size, np.bool_)
            if export.repeated_hour == "by order":
                tag = (
                    cells.tag_of_row[hour] if cells.tag_of_row is not None else np.zeros(hour.size, np.int64)
                )
                day = stamps.local_us[hour] // 86_400_000_000
                second, known = second_passes(
                    stamps.local_us[hour], day * 100_000 + tag, self._file.is_descending
                )
                instants_us = instants_us.copy()
                instants_us[hour[second]] += second_us[hour[second]]
            lost = hour[~known]
            is_good[lost] = False
            tally.repeated += int(known.sum())
            if lost.size:
                tally.dropped += lost.size
                start, end = int(instants_us[lost].min()), int((instants_us + second_us)[lost].max())
                tally.dropped_us = (
                    (start, end) if tally.dropped == lost.size else (min(start, tally.dropped_us[0]), end)
                )
        fate = np.where(is_good, Fate.GOOD, Fate.BAD_STAMP).astype(np.int8)
        start_us, end_us = self._window_us
        fate[is_good & ((instants_us < start_us) | (instants_us >= end_us))] = Fate.OUTSIDE
        return instants_us, fate

    def _look_at_odd_lines(self, parsed: ParsedChunk, fate: NDArray[np.int8], first_line: int) -> int | None:
        """Pass over blank lines and headings that come again; give the line of a different heading."""
        tally, dialect = self._tally, self._file.dialect
        columns = parsed.columns
        odd = np.flatnonzero(~parsed.stamps.good)
        texts = line_texts(columns.data, columns.line[odd])
        whole = list(zip(columns.line[odd].tolist(), texts, odd.tolist(), strict=True))
        ragged = [(bad.line, bad.text, None) for bad in columns.ragged]
        idle = " \t\r\x1a" + dialect.delimiter
        for line, text, row in sorted([*whole, *ragged], key=lambda found: found[0]):
            is_idle = not text.strip(idle) or text.strip() in dialect.known_lines
            if not is_idle and self._is_other_heading(text):
                self._close(first_line + line)
                return int(line)
            if row is not None:
                fate[row] = Fate.NO_DATA if is_idle else fate[row]
            elif is_idle:
                tally.skipped += 1
            else:
                tally.reject_line(first_line + line, text)
        return None

    def _is_other_heading(self, text: str) -> bool:
        dialect = self._file.dialect
        stamp = dialect.headings[dialect.stamp[0]]
        if not stamp or stamp not in heading_key(text):
            return False
        keys = {heading_key(field) for field in split_fields(text, dialect.delimiter)}
        return stamp in keys and len(keys & set(dialect.headings)) > 1

    def _close(self, line: int) -> None:
        self._is_closed = True
        words = {"reason": "a different heading row"}
        export, path = self._export.name, self._file.path
        finding = Finding(FindingCode.UNREADABLE_FILE, export=export, file=path, line=line, words=words)
        self._tally.findings.append(finding)

    def _see(
        self, instants_us: NDArray[np.int64], line: NDArray[np.int64], dated: NDArray[np.bool_], cells: Cells
    ) -> None:
        """Show the good stamps to the account, those of a long export tag by tag."""
        groups = [(_NO_TAG, np.flatnonzero(dated))]
        if cells.tag_of_row is not None:
            of_tag = rows_by_tag(cells.tag_of_row, len(self._tags))
            groups = [(tag, rows[dated[rows]]) for tag, rows in enumerate(of_tag)]
        for tag, rows in groups:
            if rows.size:
                self._tally.see(instants_us[rows], line[rows], self._before.get(tag))
                self._before[tag] = (int(line[rows[-1]]), int(instants_us[rows[-1]]))


class _Hashing:
    """A stream that digests what is read from it."""

    def __init__(self, stream: IO[bytes]) -> None:
        self._stream = stream
        self.sha256 = hashlib.sha256()

    def read(self, size: int = -1) -> bytes:
        """Read and digest."""
        data = self._stream.read(size)
        self.sha256.update(data)
        return data


def _digest(file: RecognisedFile) -> str:
    try:
        return hash_file(file.claim.stored.real)
    except OSError:
        return ""
