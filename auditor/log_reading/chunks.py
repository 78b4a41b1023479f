"""A file as chunks of whole lines, in UTF-8, with the number of the first line of each."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import IO

from auditor.log_reading.encoding import to_utf8
from auditor.log_reading.listing import UnreadableError
from auditor.log_reading.samples import count_lines, line_feeds

CHUNK = 8 << 20
"""Bytes of a chunk: large against the cost of a call, small against memory."""
_LONGEST_LINE = 32 << 20


@dataclass(frozen=True)
class Chunk:
    """Whole lines of a file, each ended by a line feed (the last perhaps by nothing)."""

    data: bytes
    first_line: int
    is_last: bool
    strays: int = 0
    """Bytes that had no meaning in the encoding."""


def read_chunks(stream: IO[bytes], codec: str, size: int | None = None) -> Iterator[Chunk]:
    """Cut a stream at line ends, by default into pieces of ``CHUNK`` bytes.

    Line feed, carriage return and the pair end a line; where carriage returns stand alone they are
    turned into line feeds, so that whoever reads a chunk meets line feeds or pairs only.
    """
    held: bytes | None = None
    line, rest = 1, b""
    size = size or CHUNK
    while True:
        block = stream.read(size)
        if not block:
            break
        data = rest + block if rest else block
        end = _last_line_end(data)
        if end == 0:
            if len(data) > _LONGEST_LINE:
                raise UnreadableError("no line ends: this is not text")
            rest = data
            continue
        whole, rest = data[:end], data[end:]
        if held is not None and len(block) < size // 4:
            # The file ends here: its last chunk must be long enough to hold a whole footer.
            held += whole
            continue
        if held is not None:
            text, strays = to_utf8(held, codec)
            yield Chunk(line_feeds(text), line, False, strays)
            line += count_lines(held)
        held = whole
    text, strays = to_utf8((held or b"") + rest, codec)
    yield Chunk(line_feeds(text), line, True, strays)


def _last_line_end(data: bytes) -> int:
    feed = data.rfind(b"\n") + 1
    # A carriage return at the very end may be the first half of a pair.
    return feed or data.rfind(b"\r", 0, len(data) - 1) + 1
