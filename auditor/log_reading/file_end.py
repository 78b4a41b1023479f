"""The end of a file: a footer is no data, and a line torn off while it was written is held back."""

from __future__ import annotations

import re
from dataclasses import dataclass

from auditor.log_reading.cells import read_number
from auditor.log_reading.dialect import Dialect, split_fields
from auditor.log_reading.stamps import read_stamps, style_of, texts_of
from auditor.records.plant import Export

_LONGEST_FOOTER = 20


@dataclass(frozen=True)
class FileEnd:
    """The last lines of a file, told apart."""

    body: bytes
    """What is left to be read, whole lines."""
    footer: str
    """First text below the data; empty without one."""
    footer_lines: int
    torn: str | None
    """The incomplete last line, if there is one."""


def cut_end(data: bytes, dialect: Dialect, export: Export) -> FileEnd:
    """Take the footer and a torn last line off the last chunk of a file."""
    torn = None
    if data and not data.endswith(b"\n"):
        place = data.rfind(b"\n") + 1
        text = data[place:].decode("utf-8", "replace")
        if _is_blank(text) or _is_footer(text, dialect) or _is_complete(text, dialect, export, data):
            data += b"\n"
        else:
            data, torn = data[:place], text
    end, cut, footer = len(data), len(data), ""
    for _ in range(_LONGEST_FOOTER):
        if end == 0:
            break
        start = data.rfind(b"\n", 0, end - 1) + 1
        text = data[start : end - 1].decode("utf-8", "replace").rstrip("\r")
        if _is_footer(text, dialect):
            cut, footer = start, text.strip()
        elif not _is_blank(text):
            break
        end = start
    return FileEnd(data[:cut], footer, data[cut:].count(b"\n"), torn)


def _is_blank(text: str) -> bool:
    return not text.strip("\x1a \t\r")


def _is_footer(text: str, dialect: Dialect) -> bool:
    """Whether a line's stamp cell is a remark: no digits, or letters and at most one number."""
    if _is_blank(text) or text.strip() in dialect.known_lines:
        return False
    fields = split_fields(text, dialect.delimiter)
    stamp = fields[dialect.stamp[0]].strip() if dialect.stamp[0] < len(fields) else ""
    others = [fields[place] for place in dialect.pair_stamps[1:] if place < len(fields)]
    if any(len(re.findall(r"\d+", text)) > 1 for text in others):
        return False
    numbers = re.findall(r"\d+", stamp)
    has_letters = re.search(r"[^\W\d_]", stamp) is not None
    return bool(stamp) and "\0" not in stamp and (not numbers or (has_letters and len(numbers) < 2))


def _is_complete(text: str, dialect: Dialect, export: Export, data: bytes) -> bool:
    """Whether a line without an end has all its fields, and a last cell that can stand as it is."""
    fields = [field.strip() for field in split_fields(text, dialect.delimiter)]
    if len(fields) < dialect.fields or any(fields[dialect.fields :]):
        return False
    stamp = [texts_of([fields[place]]) for place in dialect.stamp]
    if not read_stamps(stamp, style_of(export)).good.all():
        return False
    last = fields[dialect.fields - 1]
    if not last or last in export.status_words or read_number(last, export.decimal) is not None:
        return True
    # A word may be torn too, unless another line ends with it.
    ending = (dialect.delimiter + last).encode("utf-8", "replace")
    return ending + b"\n" in data or ending + b"\r\n" in data
