"""One file from its first line to its last: pieces of rows, and a note that accounts for every line."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping
from typing import IO, cast

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import cell_reader
from auditor.log_reading.chunks import Chunk, read_chunks
from auditor.log_reading.clocks import clock_of, second_passes
from auditor.log_reading.decide import Cells, decide_long, decide_wide
from auditor.log_reading.dialect import heading_key, split_fields
from auditor.log_reading.doubts import Doubts
from auditor.log_reading.encoding import as_ascii_like, codec_of_stream
from auditor.log_reading.exponents import keep_exponents
from auditor.log_reading.file_end import cut_end
from auditor.log_reading.listing import READ_ERRORS, hash_file, open_stored, reason_of
from auditor.log_reading.look import number_columns, row_shape, to_instants, without_lines
from auditor.log_reading.notes import Tally
from auditor.log_reading.pieces import Fate, Piece, make_piece
from auditor.log_reading.quality import reject_by_quality
from auditor.log_reading.recognition import RecognisedFile
from auditor.log_reading.stamps import Stamps, Texts, read_stamps, style_of
from auditor.log_reading.table import Columns, Learnt, as_texts, read_columns
from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Export, LongLayout, Tag
from auditor.records.samples import Disposition, ReadingNote

_NO_TAG = -1
_SIDE_BY_SIDE_CHUNK = 1 << 17
"""Bytes of a chunk where as many files as there are tags are read side by side."""


class FileReader:
    """Reads one file of an export once."""

    def __init__(
        self, file: RecognisedFile, export: Export, tags: Mapping[str, Tag], window_us: tuple[int, int]
    ) -> None:
        self._file, self._export, self._window_us = file, export, window_us
        self._tags = [tags[name] for name in export.tags]
        self._readers = [cell_reader(export, tag) for tag in self._tags]
        numbers = number_columns(file.dialect)
        self._shape = row_shape(file.dialect, export, numbers)
        columns = file.dialect.columns
        self._place = [numbers.index(columns[name]) if name in columns else None for name in export.tags]
        is_counter = [tag.between == "counter" for tag in self._tags]
        own = {place for place, counts in zip(self._place, is_counter, strict=True) if counts}
        own |= {0} if file.dialect.is_long and any(is_counter) else set()
        self._counters = {place for place in own if place is not None}
        """Number columns that hold counters."""
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

    def read(self) -> Iterator[Piece | ReadingNote]:
        """Give the rows of the file chunk by chunk, then its note."""
        stored, encoding = self._file.claim.stored, self._file.encoding
        digest = ""
        size = _SIDE_BY_SIDE_CHUNK if self._file.point else None
        try:
            with open_stored(stored) as opened:
                stream = _Hashing(opened) if stored.is_plain else opened
                text = as_ascii_like(cast("IO[bytes]", stream), encoding)
                for chunk in read_chunks(text, codec_of_stream(encoding), size):
                    yield from self._chunk(chunk)
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

    def _chunk(self, chunk: Chunk) -> Iterator[Piece]:
        tally, dialect = self._tally, self._file.dialect
        tally.strays += chunk.strays
        data = self._carried + chunk.data
        self._carried = b""
        if chunk.first_line < dialect.first_data_line:
            data = self._pass_over_head(data, dialect.first_data_line - chunk.first_line)
        if chunk.is_last:
            end = cut_end(data, dialect, self._export)
            data = end.body
        columns, stamps, texts = self._parse(data)
        if not chunk.is_last and not self._is_closed:
            at = self._open_hour(stamps, columns)
            if at is not None:
                self._carried = without_lines(data, at)
                data = data[: len(data) - len(self._carried)]
                columns, stamps, texts = self._parse(data)
        first_line = tally.lines + 1
        tally.lines += columns.lines
        if self._is_closed:
            tally.reject_line(first_line, "", columns.lines)
        elif columns.lines:
            yield from self._rows(columns, stamps, texts, first_line)
        if chunk.is_last:
            tally.footer = end.footer
            tally.skipped += end.footer_lines
            tally.lines += end.footer_lines
            if end.torn is not None:
                self._hold_back(end.torn)

    def _pass_over_head(self, data: bytes, count: int) -> bytes:
        """Take off the lines down to the heading; rows above it (the file was sorted) are rejected."""
        tally = self._tally
        below = without_lines(data, min(count, data.count(b"\n")))
        head = data[: len(data) - len(below)]
        columns = read_columns(head, self._shape, Learnt())
        texts = [as_texts(column) for column in columns.texts[: len(self._file.dialect.stamp)]]
        stamps = read_stamps(texts, style_of(self._export))
        lost = columns.line[stamps.good & np.isfinite(columns.values).any(axis=0)]
        if lost.size:
            tally.reject_line(tally.lines + int(lost[0]) + 1, _line_texts(head, lost[:1])[0], lost.size)
        tally.skipped += head.count(b"\n") - lost.size
        tally.lines += head.count(b"\n")
        return below

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

    def _columns(self, data: bytes) -> Columns:
        columns = read_columns(data, self._shape, self._learnt)
        self._learnt = columns.learnt
        return keep_exponents(columns, self._shape, self._counters)

    def _parse(self, data: bytes) -> tuple[Columns, Stamps, list[Texts]]:
        columns = self._columns(data)
        texts = [as_texts(column) for column in columns.texts[: len(self._file.dialect.stamp)]]
        return columns, read_stamps(texts, style_of(self._export)), texts

    def _open_hour(self, stamps: Stamps, columns: Columns) -> int | None:
        """First line of a repeated hour that reaches the end of the chunk: its passes may go on."""
        if self._export.repeated_hour == "drop" or not stamps.good.any():
            return None
        _, second_us, _ = to_instants(stamps, self._clock)
        inside = stamps.good & (second_us > 0)
        others = np.flatnonzero(stamps.good & ~inside)
        tail = int(others[-1]) + 1 if others.size else 0
        hours = np.flatnonzero(inside[tail:])
        return int(columns.line[tail + hours[0]]) if hours.size else None

    def _rows(self, columns: Columns, stamps: Stamps, texts: list[Texts], first_line: int) -> Iterator[Piece]:
        tally, dialect = self._tally, self._file.dialect
        cells = self._decide(columns)
        line = first_line + columns.line
        instants_us, fate = self._instants(stamps, cells, line)
        closed_at = self._look_at_odd_lines(columns, stamps, fate, first_line)
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
        if piece.instants_us.size or piece.rejected.any():
            yield piece

    def _count_lost_digits(self, cells: Cells, line: NDArray[np.int64], dated: NDArray[np.bool_]) -> None:
        """Note readings of counters whose exponent hides digits."""
        for tag, reader in enumerate(self._readers):
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

    def _decide(self, columns: Columns) -> Cells:
        sentinels = self._export.sentinels
        if not self._file.dialect.is_long:
            return decide_wide(columns, self._place, self._readers, sentinels)
        cells, unknown = decide_long(columns, [tag.column for tag in self._tags], self._readers, sentinels)
        for name, count in unknown.items():
            self._tally.unclaimed[name] = self._tally.unclaimed.get(name, 0) + count
        quality = self._export.layout.quality if isinstance(self._export.layout, LongLayout) else None
        return cells if quality is None else reject_by_quality(cells, columns.texts[-2], quality)

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

    def _look_at_odd_lines(
        self, columns: Columns, stamps: Stamps, fate: NDArray[np.int8], first_line: int
    ) -> int | None:
        """Pass over blank lines and headings that come again; give the line of a different heading."""
        tally, dialect = self._tally, self._file.dialect
        odd = np.flatnonzero(~stamps.good)
        texts = _line_texts(columns.data, columns.line[odd])
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
        groups = [(_NO_TAG, dated)]
        if cells.tag_of_row is not None:
            groups = [(tag, dated & (cells.tag_of_row == tag)) for tag in range(len(self._tags))]
        for tag, chosen in groups:
            rows = np.flatnonzero(chosen)
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


def _line_texts(data: bytes, wanted: NDArray[np.int64]) -> list[str]:
    if not wanted.size:
        return []
    ends = np.flatnonzero(np.frombuffer(data, np.uint8) == 10)
    starts = np.concatenate([[0], ends[:-1] + 1])
    spans = zip(starts[wanted].tolist(), ends[wanted].tolist(), strict=True)
    return [data[start:end].decode("utf-8", "replace") for start, end in spans]
