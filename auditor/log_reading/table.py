"""Lines of a chunk to columns: numbers as numbers, everything else as the text that stands there.

The parser takes numbers only. A text in a number column stops it; the text is then learnt as a "word",
and the chunk is parsed again with the words as missing values. Only the rows that held a word are read
a second time as text, so that words can be named and counted.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import pyarrow as pa
import pyarrow.csv as pacsv
from numpy.typing import NDArray

from auditor.log_reading.listing import UnreadableError
from auditor.log_reading.stamps import Texts

_BLOCK = 1 << 20
"""Block of the parser: it must fit the processor's second-level cache."""
_PIECE = 1 << 18
_NOT_A_NUMBER = re.compile(
    r"In CSV column #(\d+): .*?CSV conversion error to double: invalid value '(.*)'$", re.S
)
_MOST_WORDS_PER_CHUNK = 24
_MOST_WORDS = 64
_MOST_LIKE_NUMBERS = 2
_LIKE_A_NUMBER = re.compile(r"\s*[+-]?\d")


@dataclass(frozen=True)
class Shape:
    """What to cut out of each line."""

    delimiter: str
    decimal: str
    fields: int
    headings: int
    """Fields that have a heading; further ones are idle separators."""
    texts: tuple[int, ...]
    """Columns wanted as text."""
    numbers: tuple[int, ...]
    """Columns wanted as numbers."""
    is_pairs: bool = False
    """Lines may end behind any whole pair of columns."""


@dataclass(frozen=True)
class Learnt:
    """What parsing taught about the cells that are no numbers."""

    words: frozenset[str] = frozenset()
    """Texts that stand in number columns."""
    wordy: frozenset[int] = frozenset()
    """Number columns with too many different texts: they are read as text throughout."""

    def joined(self, other: Learnt) -> Learnt:
        """Return what both know."""
        return Learnt(self.words | other.words, self.wordy | other.wordy)


@dataclass(frozen=True)
class Ragged:
    """A line with the wrong number of fields."""

    line: int
    """From 0, within the chunk."""
    text: str


@dataclass(frozen=True)
class Columns:
    """The wanted columns of the lines that have the right number of fields."""

    data: bytes
    line: NDArray[np.int64]
    """Line of each row, from 0 within the chunk, shape (n,)."""
    texts: tuple[pa.Array, ...]
    values: NDArray[np.float64]
    """Shape (len(shape.numbers), n); NaN where the cell is no number."""
    words: tuple[tuple[NDArray[np.int64], pa.Array | None], ...]
    """Per number column: the rows without a number and the texts that stand there."""
    ragged: tuple[Ragged, ...]
    lines: int
    learnt: Learnt
    """What is known after this chunk."""


def read_columns(data: bytes, shape: Shape, learnt: Learnt) -> Columns:
    """Read the wanted columns of a chunk.

    Parameters
    ----------
    data : bytes
        Whole lines in UTF-8, each ended by a line feed or by carriage return and line feed.
    shape : Shape
        What to cut out.
    learnt : Learnt
        What earlier chunks of the file taught.

    Returns
    -------
    Columns
        Rows and ragged lines together are all lines of the chunk.
    """
    lines = count_feeds(data)
    if lines == 0:
        nothing = np.zeros(0, np.int64)
        none = tuple((nothing, None) for _ in shape.numbers)
        empty = pa.Array.from_buffers(pa.binary(), 0, [None, pa.py_buffer(bytes(4)), pa.py_buffer(b"")])
        texts = (empty,) * len(shape.texts)
        return Columns(data, nothing, texts, np.zeros((len(shape.numbers), 0)), none, (), 0, learnt)
    body, is_quoted = _with_sound_quotes(data, shape.delimiter)
    table, ragged, after = _numbers(body, shape, learnt, is_quoted)
    if table.num_rows + len(ragged) != lines:
        # A quote that opens in the middle of a line has swallowed its end: take quotes as blanks.
        body = body.replace(b'"', b" ")
        table, ragged, after = _numbers(body, shape, learnt, False)
    assert table.num_rows + len(ragged) == lines, "lines of a chunk are not accounted for"
    mended = _mended(ragged, shape)
    if mended:
        pieces = body.split(b"\n")
        for number, text in mended:
            pieces[number] = text
        body = b"\n".join(pieces)
        table, ragged, after = _numbers(body, shape, after, b'"' in body)
        assert table.num_rows + len(ragged) == lines, "lines of a chunk are not accounted for"
    line = np.arange(lines)
    if ragged:
        line = np.delete(line, [bad.line for bad in ragged])
    texts = tuple(table.column(f"c{place}").combine_chunks() for place in shape.texts)
    values, missing = _matrix(table, shape)
    # It holds the numbers once more.
    del table
    cells = texts_of_rows(body, shape, line, missing)
    return Columns(body, line, texts, values, cells, tuple(ragged), lines, after)


def as_texts(column: pa.Array) -> Texts:
    """View a text column of the parser without copying it."""
    if len(column) == 0:
        return Texts(np.zeros(1, np.uint8), np.zeros(0, np.int64), np.zeros(0, np.int64))
    _, ends, data = column.buffers()
    offsets = np.frombuffer(ends, np.int32, len(column) + 1, column.offset * 4).astype(np.int64)
    letters = np.frombuffer(data, np.uint8) if data is not None and data.size else np.zeros(1, np.uint8)
    return Texts(letters, offsets[:-1], offsets[1:])


def distinct(column: pa.Array) -> tuple[NDArray[np.int64], list[str]]:
    """Distinct texts of a column, and for each row the index of its text."""
    if len(column) == 0:
        return np.zeros(0, np.int64), []
    encoded = column.dictionary_encode()
    index = np.frombuffer(encoded.indices.buffers()[1], np.int32, len(column), encoded.indices.offset * 4)
    words = [bytes(word).decode("utf-8", "replace") for word in encoded.dictionary.to_pylist()]
    return index.astype(np.int64), words


def _numbers(
    data: bytes, shape: Shape, learnt: Learnt, is_quoted: bool
) -> tuple[pa.Table, list[Ragged], Learnt]:
    """Parse with the known words as missing; learn the unknown ones; give a wordy column up as text."""
    known = {word for word in learnt.words if word.encode() in data}
    words, wordy = set(learnt.words), set(learnt.wordy)
    text_now = {place for place in shape.numbers if place in wordy}
    tries = 0
    like_numbers = dict.fromkeys(shape.numbers, 0)
    while True:
        ragged: list[Ragged] = []
        try:
            table = _parse(data, shape, (known, text_now), ragged, is_quoted)
        except pa.ArrowInvalid as error:
            found = _NOT_A_NUMBER.search(str(error))
            if found is None:
                raise UnreadableError(str(error)) from error
            tries += 1
            column, word = int(found[1]), found[2]
            # A padded word is reported without its blanks and would not match: its column is read
            # as text in this chunk. One with a new word in every cell is never tried again.
            # Numbers written otherwise (grouped, or with their unit) differ from cell to cell.
            like_numbers[column] += _LIKE_A_NUMBER.match(word) is not None
            if tries > _MOST_WORDS_PER_CHUNK or like_numbers[column] > _MOST_LIKE_NUMBERS:
                text_now.add(column)
                wordy.add(column)
            elif word in known or not word:
                text_now.add(column)
            else:
                known.add(word)
                words |= {word} if len(words) < _MOST_WORDS else set()
        else:
            return table, ragged, Learnt(frozenset(words), frozenset(wordy))


def _parse(
    data: bytes,
    shape: Shape,
    known_and_text: tuple[set[str], set[int]],
    ragged: list[Ragged],
    is_quoted: bool,
) -> pa.Table:
    known, as_text = known_and_text

    def note(row: pacsv.InvalidRow) -> str:
        ragged.append(Ragged(row.number - 1, row.text))
        return "skip"

    types = {f"c{place}": pa.binary() if place in as_text else pa.float64() for place in shape.numbers}
    types |= {f"c{place}": pa.binary() for place in shape.texts}
    # A line that is longer than a block (garbage without line ends) would stop the parser.
    block = len(data) + 1 if _has_long_line(data) else _BLOCK
    return pacsv.read_csv(
        pa.BufferReader(data),
        pacsv.ReadOptions(
            use_threads=False, block_size=block, column_names=[f"c{place}" for place in range(shape.fields)]
        ),
        pacsv.ParseOptions(
            delimiter=shape.delimiter,
            quote_char='"' if is_quoted else False,
            ignore_empty_lines=False,
            invalid_row_handler=note,
        ),
        pacsv.ConvertOptions(
            check_utf8=False,
            column_types=types,
            null_values=["", *sorted(known)],
            strings_can_be_null=False,
            decimal_point=shape.decimal,
            include_columns=list(types),
        ),
    )


def _has_long_line(data: bytes) -> bool:
    """Whether a line may be longer than half a block."""
    step = _BLOCK // 4
    return any(data.find(b"\n", place, place + step) < 0 for place in range(0, len(data) - step, step))


def _matrix(table: pa.Table, shape: Shape) -> tuple[NDArray[np.float64], list[NDArray[np.int64]]]:
    """Copy the number columns into one array; give the rows of each that hold no finite number."""
    values = np.empty((len(shape.numbers), table.num_rows))
    missing: list[NDArray[np.int64]] = []
    for row, place in zip(values, shape.numbers, strict=True):
        if table.schema.field(f"c{place}").type != pa.float64():
            row[:] = np.nan
            missing.append(np.arange(table.num_rows))
            continue
        start = 0
        for piece in table.column(f"c{place}").chunks:
            end = start + len(piece)
            row[start:end] = np.frombuffer(piece.buffers()[1], np.float64, len(piece), piece.offset * 8)
            if piece.null_count:
                row[start:end][_nulls(piece)] = np.nan
            start = end
        finite = np.isfinite(row)
        if finite.all():
            missing.append(np.zeros(0, np.int64))
        else:
            missing.append(np.flatnonzero(~finite))
            row[~finite] = np.nan
    return values, missing


def _nulls(piece: pa.Array) -> NDArray[np.bool_]:
    bits = np.frombuffer(piece.buffers()[0], np.uint8)
    is_valid = np.unpackbits(bits, bitorder="little", count=len(piece) + piece.offset)[piece.offset :]
    return ~is_valid.view(np.bool_)


def texts_of_rows(
    data: bytes, shape: Shape, line: NDArray[np.int64], missing: list[NDArray[np.int64]]
) -> tuple[tuple[NDArray[np.int64], pa.Array | None], ...]:
    """Read the cells without a number as text: only their rows, only their columns."""
    wanted = [place for place, rows in zip(shape.numbers, missing, strict=True) if rows.size]
    if not wanted:
        return tuple((rows, None) for rows in missing)
    touched = np.zeros(line.size, np.bool_)
    for rows in missing:
        touched[rows] = True
    kept = np.flatnonzero(touched)
    part = data if kept.size == line.size == count_feeds(data) else _lines(data, line[kept])
    ragged: list[Ragged] = []
    narrow = replace(shape, texts=tuple(wanted), numbers=())
    table = _parse(part, narrow, (set(), set()), ragged, b'"' in part)
    if table.num_rows != kept.size:
        raise AssertionError("rows read again do not match")
    place_of = np.cumsum(touched) - 1
    out = []
    for place, rows in zip(shape.numbers, missing, strict=True):
        if not rows.size:
            out.append((rows, None))
            continue
        column = table.column(f"c{place}").combine_chunks()
        some = place_of[rows]
        picked = column if some.size == kept.size else take(column, some)
        out.append((rows, picked))
    return tuple(out)


def take(column: pa.Array, rows: NDArray[np.int64]) -> pa.Array:
    """Pick some cells of a column of the parser."""
    # pa.array() would import pandas, a third of a second.
    indices = pa.Array.from_buffers(pa.int64(), rows.size, [None, pa.py_buffer(np.ascontiguousarray(rows))])
    return column.take(indices)


def _lines(data: bytes, wanted: NDArray[np.int64]) -> bytes:
    """Put the wanted lines, rising, one behind the other; neighbours are copied together."""
    ends = np.append(0, line_ends(data))
    heads = np.flatnonzero(np.diff(wanted, prepend=-2) != 1)
    first, last = wanted[heads], wanted[np.append(heads[1:], wanted.size) - 1]
    view = memoryview(data)
    spans = zip(ends[first].tolist(), ends[last + 1].tolist(), strict=True)
    return b"".join([view[start:end] for start, end in spans])


def line_ends(data: bytes) -> NDArray[np.int64]:
    """Return the place behind each line feed; looked for piece by piece, within the processor's cache."""
    letters = np.frombuffer(data, np.uint8)
    places = range(0, len(data), _PIECE)
    found = [np.flatnonzero(letters[at : at + _PIECE] == 10) + (at + 1) for at in places]
    return np.concatenate(found) if found else np.zeros(0, np.int64)


def count_feeds(data: bytes) -> int:
    """Count line feeds, many times faster than ``bytes.count`` where lines are short."""
    letters = np.frombuffer(data, np.uint8)
    return sum(int(np.count_nonzero(letters[at : at + _PIECE] == 10)) for at in range(0, len(data), _PIECE))


def _with_sound_quotes(data: bytes, delimiter: str) -> tuple[bytes, bool]:
    """Blank out the quotes of lines that leave one open; say whether any are left."""
    if b'"' not in data:
        return data, False
    letters = np.frombuffer(data, np.uint8)
    quotes = np.flatnonzero(letters == 34)
    ends = np.flatnonzero(letters == 10)
    line_of = np.searchsorted(ends, quotes)
    odd = np.flatnonzero(np.bincount(line_of, minlength=ends.size) % 2)
    if odd.size:
        repaired = letters.copy()
        repaired[quotes[np.isin(line_of, odd)]] = 32
        data = repaired.tobytes()
    return data, b'"' in data


def _mended(ragged: Sequence[Ragged], shape: Shape) -> list[tuple[int, bytes]]:
    """Lines that differ from the others by idle separators, or pairs without end, made alike."""
    mended = []
    for bad in ragged:
        fields = _cut(bad.text, shape.delimiter)
        surplus = fields[shape.headings :]
        is_short = shape.is_pairs and 1 < len(fields) < shape.headings
        is_short &= (shape.headings - len(fields)) % 2 == 0
        is_long = len(fields) >= shape.headings > 1 and not any(field.strip() for field in surplus)
        if is_short or is_long:
            fields += [""] * (shape.headings - len(fields))
            padded = fields[: shape.headings] + [""] * (shape.fields - shape.headings)
            quoted = (f'"{field}"' if shape.delimiter in field else field for field in padded)
            mended.append((bad.line, shape.delimiter.join(quoted).encode("utf-8", "replace")))
    return mended


def _cut(text: str, delimiter: str) -> list[str]:
    if '"' not in text:
        return text.split(delimiter)
    try:
        return next(iter(csv.reader([text], delimiter=delimiter, strict=True)), [""])
    except csv.Error:
        return text.split(delimiter)
