"""Text encodings: which one a file has and why, and its bytes as something ASCII-like to cut and count."""

from __future__ import annotations

import codecs
import io
from dataclasses import dataclass
from typing import IO

import numpy as np
import pyarrow as pa

_BOMS = (
    (codecs.BOM_UTF8, "utf-8", "a UTF-8 byte order mark"),
    (codecs.BOM_UTF16_LE, "utf-16-le", "a UTF-16 byte order mark"),
    (codecs.BOM_UTF16_BE, "utf-16-be", "a UTF-16 byte order mark"),
)
_UTF8 = ("utf-8", "ascii")
_SHOWN = {"utf-8": "UTF-8", "utf-16-le": "UTF-16", "utf-16-be": "UTF-16", "cp1252": "Windows-1252"}
# A byte that has no meaning in its place comes out of the decoder as U+DC80...U+DCFF; loggers that do
# this write Windows-1252, whose five unused codes stay control characters.
_STRAY = {0xDC00 + code: bytes([code]).decode("cp1252", "ignore") or chr(code) for code in range(0x80, 0x100)}
_BLOCK = 1 << 20


@dataclass(frozen=True)
class Encoding:
    """How the bytes of a file become text."""

    codec: str
    """Name of Python's codec."""
    mark: int
    """Length of the byte order mark."""
    evidence: str

    @property
    def shown(self) -> str:
        """The name printed in reports."""
        return _SHOWN.get(self.codec, self.codec)

    @property
    def is_ascii_like(self) -> bool:
        """Whether line ends, delimiters and digits are the same bytes as in ASCII."""
        return self.codec in _UTF8 or self.codec.startswith(("cp125", "iso8859", "koi8"))


def find_encoding(samples: tuple[bytes, ...], declared: str | None) -> Encoding:
    """Decide the encoding of a file from pieces of its raw bytes, the first from its start."""
    head = samples[0]
    for mark, codec, words in _BOMS:
        if head.startswith(mark):
            return Encoding(codec, len(mark), f"it begins with {words}")
    if declared is not None:
        return Encoding(codecs.lookup(declared).name, 0, "declared in the plant file")
    wide = _without_mark(head)
    if wide is not None:
        return Encoding(wide, 0, "every second byte is zero, as in UTF-16")
    if all(sample.isascii() for sample in samples):
        return Encoding("utf-8", 0, "only plain ASCII in the pieces looked at")
    valid, strays = 0, []
    for sample in samples:
        text = _trimmed(sample).decode("utf-8", "surrogateescape")
        marks = [letter for letter in text if letter > "\x7f"]
        strays += [letter for letter in marks if ord(letter) in _STRAY]
        valid += len(marks)
    valid -= len(strays)
    if not strays:
        return Encoding("utf-8", 0, "all letters beyond ASCII are valid UTF-8")
    if valid > len(strays):
        return Encoding(
            "utf-8", 0, f"{valid} letters beyond ASCII are valid UTF-8, {len(strays)} bytes are not"
        )
    return Encoding("cp1252", 0, f"byte 0x{ord(strays[0]) - 0xDC00:02X} cannot stand there in UTF-8")


def to_utf8(data: bytes, codec: str) -> tuple[bytes, int]:
    """Return the same text as valid UTF-8 bytes.

    Returns
    -------
    data, strays
        And how many bytes had no meaning in their place: they are taken as Windows-1252.
    """
    if data.isascii() or (codec in _UTF8 and _is_utf8(data)):
        return data, 0
    try:
        text = data.decode(codec)
    except UnicodeDecodeError:
        escaped = data.decode(codec, "surrogateescape")
        strays = sum(escaped.count(chr(mark)) for mark in _STRAY)
        return escaped.translate(_STRAY).encode("utf-8", "replace"), strays
    return text.encode("utf-8", "replace"), 0


def _is_utf8(data: bytes) -> bool:
    """Tell by the validation of Arrow, which needs a tenth of the time of decoding and lets threads run."""
    ends = pa.py_buffer(np.array([0, len(data)], np.int32))
    try:
        pa.Array.from_buffers(pa.utf8(), 1, [None, ends, pa.py_buffer(data)]).validate(full=True)
    except pa.ArrowInvalid:
        return False
    return True


class Recoded(io.RawIOBase):
    """A stream in an encoding unlike ASCII, read as UTF-8."""

    def __init__(self, stream: IO[bytes], codec: str) -> None:
        self._stream = stream
        self._decoder = codecs.getincrementaldecoder(codec)("replace")
        self._ready = b""
        self._ended = False

    def readable(self) -> bool:
        """Say that it can be read."""
        return True

    def readinto(self, buffer: memoryview) -> int:  # type: ignore[override]
        """Fill a buffer with the next UTF-8 bytes."""
        while not self._ready and not self._ended:
            block = self._stream.read(_BLOCK)
            self._ended = not block
            self._ready = self._decoder.decode(block, final=self._ended).encode("utf-8", "replace")
        part, self._ready = self._ready[: len(buffer)], self._ready[len(buffer) :]
        buffer[: len(part)] = part
        return len(part)


def as_ascii_like(stream: IO[bytes], encoding: Encoding) -> IO[bytes]:
    """Return a stream behind the byte order mark in which lines and digits are ASCII bytes."""
    stream.read(encoding.mark)
    if encoding.is_ascii_like:
        return stream
    return io.BufferedReader(Recoded(stream, encoding.codec), _BLOCK)


def codec_of_stream(encoding: Encoding) -> str:
    """Codec of the bytes that :func:`as_ascii_like` gives."""
    return encoding.codec if encoding.is_ascii_like else "utf-8"


def _without_mark(head: bytes) -> str | None:
    even, odd = head[0:4096:2], head[1:4096:2]
    if len(odd) < 8:
        return None
    if odd.count(0) > 0.7 * len(odd) and even.count(0) < 0.1 * len(even):
        return "utf-16-le"
    if even.count(0) > 0.7 * len(even) and odd.count(0) < 0.1 * len(odd):
        return "utf-16-be"
    return None


def _trimmed(sample: bytes) -> bytes:
    """Cut off a letter that the edges of a sample may have torn."""
    start = 0
    while start < min(3, len(sample)) and sample[start] & 0xC0 == 0x80:
        start += 1
    for back in range(1, min(4, len(sample)) + 1):
        byte = sample[-back]
        if byte < 0x80:
            break
        if byte >= 0xC0:
            return sample[start:-back]
    return sample[start:]
