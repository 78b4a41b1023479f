"""Pieces of a file that stand for the whole: head, tail and a piece every few megabytes."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass
from typing import IO

from auditor.log_reading.encoding import (
    Encoding,
    as_ascii_like,
    codec_of_stream,
    find_encoding,
    to_utf8,
)
from auditor.log_reading.listing import StoredFile, open_stored

WHOLE = 1 << 20
"""Up to this size a file is its own sample."""
_HEAD, _MIDDLE, _TAIL, _STRIDE = 1 << 17, 1 << 15, 1 << 16, 1 << 22


@dataclass(frozen=True)
class Sample:
    """Whole lines from one place of a file."""

    offset: int
    """Bytes between the start of the text and the first of these lines."""
    data: bytes
    """In UTF-8, every line ended by a line feed (or the pair)."""

    def lines(self, most: int) -> list[str]:
        """Return the first lines as texts."""
        place = -1
        for _ in range(most):
            place = self.data.find(b"\n", place + 1)
            if place < 0:
                break
        lines = split_lines(self.data[: place if place >= 0 else len(self.data)].decode("utf-8", "replace"))
        return lines if place >= 0 or lines[-1] else lines[:-1]


@dataclass(frozen=True)
class Sampled:
    """A file's encoding and its samples, the head first."""

    encoding: Encoding
    samples: tuple[Sample, ...]
    is_whole: bool
    """The samples are the whole file."""


def take_samples(stored: StoredFile, declared_encoding: str | None) -> Sampled:
    """Look into a file at its head, its tail and in between."""
    with open_stored(stored) as stream:
        head = stream.read(_HEAD)
    if stored.is_plain and stored.bytes > WHOLE:
        raw = _raw_pieces(stored)
        encoding = find_encoding(tuple(piece for _, piece in raw), declared_encoding)
        if encoding.is_ascii_like:
            return Sampled(encoding, _cut(raw, encoding, stored.bytes), False)
    encoding = find_encoding((head,), declared_encoding)
    with open_stored(stored) as stream:
        pieces, size = _pieces_of_stream(as_ascii_like(stream, encoding))
    if encoding.is_ascii_like:
        seen = tuple(piece for _, piece in pieces)
        looked = find_encoding((head, *seen), declared_encoding)
        encoding = looked if looked.is_ascii_like else encoding
    marked = [(offset + encoding.mark, piece) for offset, piece in pieces]
    return Sampled(encoding, _cut(marked, encoding, size + encoding.mark), size <= WHOLE)


def line_at(stored: StoredFile, encoding: Encoding, offset: int) -> int:
    """Return the number of the line that begins at an offset of the text (for messages only)."""
    lines = 1
    with open_stored(stored) as stream:
        text = as_ascii_like(stream, encoding)
        while offset > 0 and (block := text.read(min(offset, WHOLE))):
            lines += count_lines(block)
            offset -= len(block)
    return lines


def count_lines(data: bytes) -> int:
    """Count line ends, whichever way lines end."""
    if b"\r" not in data:
        return data.count(b"\n")
    return data.count(b"\n") + data.count(b"\r") - data.count(b"\r\n")


def split_lines(text: str) -> list[str]:
    """Split at line feeds and carriage returns only (not at form feeds and their kin)."""
    return text.replace("\r\n", "\n").replace("\r", "\n").split("\n")


def line_feeds(data: bytes) -> bytes:
    """Turn carriage returns that stand alone into line feeds, so that only feeds and pairs are met."""
    if b"\r" not in data or data.count(b"\r") == data.count(b"\r\n"):
        return data
    return data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")


def _raw_pieces(stored: StoredFile) -> list[tuple[int, bytes]]:
    places = [(0, _HEAD)]
    places += [(offset, _MIDDLE) for offset in range(_STRIDE, stored.bytes - _TAIL, _STRIDE)]
    places.append((stored.bytes - _TAIL, _TAIL))
    pieces = []
    with open_stored(stored) as stream:
        for offset, length in places:
            stream.seek(offset)
            pieces.append((offset, stream.read(length)))
    return pieces


def _pieces_of_stream(stream: IO[bytes]) -> tuple[list[tuple[int, bytes]], int]:
    """Sample a stream that can only be read forwards, offsets behind the byte order mark."""
    kept: list[tuple[int, bytes]] = []
    tail: deque[tuple[int, bytes]] = deque(maxlen=2)
    size, due = 0, 0
    for block in _blocks(stream):
        if size == 0:
            first = block
            kept.append((0, block[:_HEAD]))
            due = _STRIDE
        elif size + len(block) > due:
            start = due - size
            kept.append((due, block[start : start + _MIDDLE]))
            due += _STRIDE
        tail.append((size, block))
        size += len(block)
    if size <= WHOLE:
        return [(0, first)] if size else [(0, b"")], size
    end = b"".join(block for _, block in tail)[-_TAIL:]
    return [*kept, (size - len(end), end)], size


def _blocks(stream: IO[bytes]) -> Iterator[bytes]:
    while block := stream.read(WHOLE):
        while len(block) < WHOLE and (more := stream.read(WHOLE - len(block))):
            block += more
        yield block


def _cut(pieces: list[tuple[int, bytes]], encoding: Encoding, size: int) -> tuple[Sample, ...]:
    """Keep the whole lines of each piece. Offsets of pieces count the byte order mark, those given do not."""
    codec = codec_of_stream(encoding)
    samples = []
    for offset, raw in pieces:
        piece, start = raw, offset
        if offset > encoding.mark:
            ends = [at for at in (piece.find(b"\n"), piece.find(b"\r")) if at >= 0]
            skipped = min(ends) + 1 if ends else len(piece)
            piece, start = piece[skipped:], offset + skipped
        elif offset == 0:
            piece, start = piece[encoding.mark :], encoding.mark
        if offset + len(raw) < size:
            piece = piece[: max(piece.rfind(b"\n"), piece.rfind(b"\r")) + 1]
        data = line_feeds(to_utf8(piece, codec)[0])
        if data and not data.endswith(b"\n"):
            data += b"\n"
        samples.append(Sample(start - encoding.mark, data))
    return tuple(samples)
