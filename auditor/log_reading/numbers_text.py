"""Numbers written otherwise than the parser takes them: grouped digits, the unit behind the number."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from auditor.log_reading.stamps import Texts
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
    plain = r"\d+" if style.thousands is None else rf"\d{{1,3}}(?:{_BYTES[style.thousands]}\d{{3}})+|\d+"
    point = re.escape(style.decimal)
    pattern = rf"^\s*(?P<number>[+-]?(?:(?:{plain})(?:{point}\d*)?|{point}\d+))\s*(?P<unit>[^\d\s+-].*?)?\s*$"
    encoded = texts.dictionary_encode()
    found = pc.extract_regex(encoded.dictionary, pattern)
    number, unit = found.field("number"), found.field("unit")
    codes, units = distinct(unit)
    is_own = np.array([not word or (bool(style.unit) and same_unit(word, style.unit)) for word in units])
    taken = _filled(as_texts(number)) & is_own[codes]
    if not taken.any():
        return rows, texts
    some = take(number, np.flatnonzero(taken))
    if style.thousands is not None:
        some = pc.replace_substring_regex(some, _BYTES[style.thousands], "")
    if style.decimal != ".":
        some = pc.replace_substring(some, style.decimal, ".")
    read = pc.cast(pc.cast(some, pa.string()), pa.float64())
    numbers = np.full(taken.size, np.nan)
    numbers[taken] = np.frombuffer(read.buffers()[1], np.float64, len(read), read.offset * 8)
    index = np.frombuffer(encoded.indices.buffers()[1], np.int32, len(texts), encoded.indices.offset * 4)
    is_number = np.isfinite(numbers)[index]
    values[rows[is_number]] = numbers[index[is_number]]
    left = np.flatnonzero(~is_number)
    return rows[left], take(texts, left)


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


def _filled(texts: Texts) -> NDArray[np.bool_]:
    filled: NDArray[np.bool_] = texts.ends > texts.starts
    return filled
