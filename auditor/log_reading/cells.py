"""Cells that are not plain numbers: what a text in a value column means and where it ends."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from auditor.log_reading.numbers_text import NumberStyle, is_short_of_digits, ungrouped
from auditor.records.plant import Export, Tag, Thousands
from auditor.records.samples import Disposition

_NUMBER = {
    ".": re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"),
    ",": re.compile(r"[+-]?(?:\d+,?\d*|,\d+)(?:[eE][+-]?\d+)?"),
}
_NUMBER_LIKE = re.compile(r"[<>=~+\-\u2212]*\s*[.,]?\d")


def read_number(text: str, decimal: Literal[".", ","], thousands: Thousands | None = None) -> float | None:
    """Return the finite number that a stripped text is, or None.

    Examples
    --------
    >>> read_number("+1,5e2", ","), read_number("1.5", ","), read_number("1e400", ".")
    (150.0, None, None)
    """
    if thousands is not None:
        text = ungrouped(text, NumberStyle(decimal, thousands))
    if not text.isascii() or _NUMBER[decimal].fullmatch(text) is None:
        return None
    value = float(text.replace(",", "."))
    return value if math.isfinite(value) else None


@dataclass(frozen=True)
class Meaning:
    """What one text means in one column: a number, a state, or no value and why."""

    number: float = math.nan
    """Raw number."""
    state: float = math.nan
    """Index of a state."""
    disposition: Disposition = Disposition.USED


@dataclass(frozen=True)
class CellReader:
    """What texts of one tag mean."""

    decimal: Literal[".", ","]
    status_words: Mapping[str, float]
    states: Mapping[str, int]
    """Raw texts of a state tag to their index; empty for numbers."""
    style: NumberStyle
    counter_step: float | None = None
    """Of a counter: smallest step of the raw number that every reading must show."""

    def meaning(self, text: str) -> Meaning:
        """Decide about a text that the number parser did not take."""
        word = text.strip()
        if not word:
            return Meaning(disposition=Disposition.EMPTY)
        if word in self.states:
            return Meaning(state=float(self.states[word]))
        if word in self.status_words:
            return Meaning(number=self.status_words[word])
        number = read_number(word, self.decimal, self.style.thousands)
        if number is not None:
            if self.hides_digits(word):
                return Meaning(disposition=Disposition.UNPARSEABLE)
            return Meaning(number=number)
        if _NUMBER_LIKE.match(word):
            return Meaning(disposition=Disposition.UNPARSEABLE)
        return Meaning(disposition=Disposition.STATUS_WORD)

    def hides_digits(self, word: str) -> bool:
        """Whether a reading of a counter is written with too few digits."""
        return self.counter_step is not None and is_short_of_digits(word, self.counter_step)

    def state_numbers(self) -> dict[float, int]:
        """States whose raw text is a number, by that number (``1`` and ``1.0`` are the same state)."""
        numbers = ((read_number(text, self.decimal), index) for text, index in self.states.items())
        return {number: index for number, index in numbers if number is not None}


def cell_reader(export: Export, tag: Tag) -> CellReader:
    """Return the reader of one tag's cells."""
    texts = [text.strip() for text in tag.states or ()]
    states = {text: index for index, text in enumerate(dict.fromkeys(texts))}
    style = NumberStyle(export.decimal, None if states else export.thousands, tag.unit)
    step = None
    if tag.between == "counter":
        # Without a declared resolution a counter shows at least its whole units: common practice.
        step = 1.0 if tag.resolution is None else tag.resolution / abs(tag.scale)
    return CellReader(export.decimal, export.status_words, states, style, step)


def shortest(number: float) -> str:
    """Write a number in its shortest exact form.

    Examples
    --------
    >>> shortest(-9999.0), shortest(888.8)
    ('-9999', '888.8')
    """
    return repr(int(number)) if number.is_integer() and abs(number) < 1e15 else repr(number)
