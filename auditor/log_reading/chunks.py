"""A file as chunks of whole lines."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import IO

from auditor.log_reading.encoding import to_utf8
from auditor.log_reading.listing import UnreadableError
from auditor.log_reading.samples import line_feeds

CHUNK = 8 << 20
"""Bytes of a chunk: large against the cost of a call, small against memory."""
_LONGEST_LINE = 32 << 20


@dataclass(frozen=True)
class Chunk:
    """Whole lines of a file as they stand there, the last of all perhaps without an end."""

    data: bytes
    is_first: bool
    is_last: bool

    def text(self, codec: str) -> tuple[bytes, int]:
        """Return the lines in UTF-8, each ended by a line feed or the pair, and the number of stray bytes.

        Carriage returns that stand alone are turned into line feeds, so that whoever reads a chunk meets
        line feeds or pairs only. Stray bytes are those without a meaning in the encoding.
        """
        text, strays = to_utf8(self.data, codec)
        return line_feeds(text), strays


def read_chunks(stream: IO[bytes], size: int | None = None, head_lines: int = 0) -> Iterator[Chunk]:
    """Cut a stream at line ends, by default into pieces of ``CHUNK`` bytes.

    Line feed, carriage return and the pair end a line. The first piece grows until it holds the lines
    above the data, ``head_lines`` of them.
    """
    held: bytes | None = None
    is_first, rest = True, b""
    size = size or CHUNK
    while True:
        block = stream.read(size)
        if not block:
            break
        end = _last_line_end(block)
        if end == 0:
            rest += block
            if len(rest) > _LONGEST_LINE:
                raise UnreadableError("no line ends: this is not text")
            continue
        whole, rest = b"".join((rest, memoryview(block)[:end])), block[end:]
        if held is not None and len(block) < size // 4:
            # The file ends here: its last chunk must be long enough to hold a whole footer.
            held += whole
            continue
        if held is not None and is_first and _lines_of(held) < head_lines:
            held += whole
            continue
        if held is not None:
            yield Chunk(held, is_first, False)
            is_first = False
        held = whole
    yield Chunk((held or b"") + rest, is_first, True)


def _lines_of(data: bytes) -> int:
    return data.count(b"\n") + data.count(b"\r") - data.count(b"\r\n")


def _last_line_end(data: bytes) -> int:
    feed = data.rfind(b"\n") + 1
    # A carriage return at the very end may be the first half of a pair.
    return feed or data.rfind(b"\r", 0, len(data) - 1) + 1
