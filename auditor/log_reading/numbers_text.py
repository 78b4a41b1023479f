"""Numbers written otherwise than the parser takes them: grouped digits, the unit behind the number."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from auditor.log_reading.table import as_texts, distinct, take
from auditor.records.plant import Thousands
from auditor.units import same_unit

_BYTES = {
    "space": r"(?: |\xC2\xA0|\xE2\x80\xAF|\xE2\x80\x89)",
    "'": r"(?:'|\xE2\x80\x99)",
    ".": r"\.",
    ",": ",",
}
"""Marks between groups as bytes of UTF-8: four kinds of blank, two of apostrophe."""
_LITERALS = {"space": (" ", "\u00a0", "\u202f", "\u2009"), "'": ("'", "\u2019"), ".": (".",), ",": (",",)}
_LETTERS = {"space": "[ \u00a0\u202f\u2009]", "'": "['\u2019]", ".": r"\.", ",": ","}
_MARKS: tuple[Thousands, ...] = ("space", "'", ".", ",")


@dataclass(frozen=True)
class NumberStyle:
    """How the numbers of a tag are written."""

    decimal: str
    thousands: Thousands | None = None
    unit: str = ""
    """Declared unit, which may stand behind the number."""

    @property
    def is_plain(self) -> bool:
        """Whether nothing can be written otherwise."""
        return self.thousands is None and not self.unit


def grouped_by(text: str, decimal: str) -> Thousands | None:
    """Return the mark that groups the digits of a number by threes; None for any other text.

    Examples
    --------
    >>> grouped_by("1.234", ","), grouped_by("12 345,6", ","), grouped_by("12.34", ",")
    ('.', 'space', None)
    """
    for mark in _MARKS:
        if mark != decimal and re.fullmatch(_pattern(_LETTERS[mark], decimal), text):
            return mark
    return None


def ungrouped(text: str, style: NumberStyle) -> str:
    """Take the declared marks out of a number whose digits they group by threes."""
    if style.thousands is None:
        return text
    mark = _LETTERS[style.thousands]
    if re.fullmatch(_pattern(mark, style.decimal), text) is None:
        return text
    return re.sub(mark, "", text)


def settle_numbers(
    values: NDArray[np.float64], rows: NDArray[np.int64], texts: pa.Array, style: NumberStyle
) -> tuple[NDArray[np.int64], pa.Array]:
    """Turn texts that are numbers in the declared style into numbers, in place.

    Digits are grouped by threes or not at all: ``12,5`` with a comma between groups is no number. A
    unit behind the number must be the declared one.

    Parameters
    ----------
    values : ndarray
        Cells of one tag.
    rows, texts
        The cells that are no plain numbers, and what stands there.

    Returns
    -------
    rows, texts
        Those that are left.
    """
    if style.is_plain or not len(texts):
        return rows, texts
    encoded = texts.dictionary_encode()
    numbers = _numbers_of(encoded.dictionary, style)
    index = np.frombuffer(encoded.indices.buffers()[1], np.int32, len(texts), encoded.indices.offset * 4)
    is_number = np.isfinite(numbers)[index]
    values[rows[is_number]] = numbers[index[is_number]]
    left = np.flatnonzero(~is_number)
    return rows[left], take(texts, left)


def _numbers_of(words: pa.Array, style: NumberStyle) -> NDArray[np.float64]:
    """Read distinct texts as numbers in a style; NaN where one is none."""
    digits = r"\d+" if style.thousands is None else rf"\d{{1,3}}(?:{_BYTES[style.thousands]}\d{{3}})+|\d+"
    point = re.escape(style.decimal)
    number = rf"[+-]?(?:(?:{digits})(?:{point}\d*)?|{point}\d+)"
    out = np.full(len(words), np.nan)
    # Most are bare numbers; to look for one without taking it apart is many times faster.
    is_bare = _bits(pc.match_substring_regex(words, f"^{number}$"))
    bare, rest = np.flatnonzero(is_bare), np.flatnonzero(~is_bare)
    out[bare] = _converted(take(words, bare), style)
    if not rest.size:
        return out
    found = pc.extract_regex(take(words, rest), rf"^\s*(?P<number>{number})\s*(?P<unit>[^\d\s+-].*?)?\s*$")
    codes, units = distinct(found.field("unit"))
    is_own = [not unit or (bool(style.unit) and same_unit(unit, style.unit)) for unit in units]
    texts = as_texts(found.field("number"))
    taken = np.flatnonzero((texts.ends > texts.starts) & np.array(is_own or [True])[codes])
    out[rest[taken]] = _converted(take(found.field("number"), taken), style)
    return out


def _converted(numbers: pa.Array, style: NumberStyle) -> NDArray[np.float64]:
    """Numbers of texts that are in the style."""
    for mark in _LITERALS[style.thousands] if style.thousands is not None else ():
        numbers = pc.replace_substring(numbers, mark, "")
    if style.decimal != ".":
        numbers = pc.replace_substring(numbers, style.decimal, ".")
    read = pc.cast(pc.cast(numbers, pa.string()), pa.float64())
    return np.frombuffer(read.buffers()[1], np.float64, len(read), read.offset * 8)


def _bits(flags: pa.Array) -> NDArray[np.bool_]:
    packed = np.frombuffer(flags.buffers()[1], np.uint8)
    bits = np.unpackbits(packed, bitorder="little", count=len(flags) + flags.offset)[flags.offset :]
    return bits.view(np.bool_)


def is_short_of_digits(text: str, step: float) -> bool:
    """Whether a number with an exponent leaves digits unwritten that a counter's step needs.

    Parameters
    ----------
    text : str
        Such as ``1.23457E+06``, whose last digit counts tens.
    step : float
        Smallest step of the counter.

    Examples
    --------
    >>> is_short_of_digits("1.23457E+06", 1.0), is_short_of_digits("1.234567E+06", 1.0)
    (True, False)
    """
    found = re.fullmatch(r"[+-]?\d*(?:[.,](?P<places>\d*))?[eE](?P<power>[+-]?\d{1,4})", text)
    if found is None:
        return False
    last_digit = int(found["power"]) - len(found["places"] or "")
    return last_digit > math.log10(step) + 1e-9


def _pattern(mark: str, decimal: str) -> str:
    return rf"[+-]?\d{{1,3}}(?:{mark}\d{{3}})+(?:{re.escape(decimal)}\d*)?"
