"""What the cells of a column look like: a counter, a state, a level, nothing at all."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from auditor.drafting.gathering import Column
from auditor.drafting.proposals import Appearance
from auditor.log_reading.cells import read_number, shortest

_MOST_STATES = 6
_ENOUGH = 20
"""Fewer cells say nothing about what a column is."""
_COUNTER_FALLS = 0.003
"""Share of steps in which a counter may fall: resets, exchanges and single bad readings."""
_NEAR_ZERO = 0.02
_WORDS_SHOWN = 4
_LONGEST_STATE = 30
_STRAYS = 0.01
"""Share of single odd numbers, as torn lines leave them, beside which a constant is still one."""
_SENTINEL_TIMES = 3
_SENTINEL_REACH = 3.0
"""A sentinel lies further from all other numbers than so many times their range."""


@dataclass(frozen=True)
class Look:
    """What was seen in one column."""

    appearance: Appearance
    because: str
    texts: tuple[str, ...]
    """Of a state: its raw texts."""


def look_at_column(column: Column, decimal: Literal[".", ","] | None) -> Look | None:
    """Say what a column looks like; None when all of its cells are empty.

    Parameters
    ----------
    column : Column
        Its cells.
    decimal : str or None
        Decimal mark of the export; None where it is not known, and a point is tried.

    Examples
    --------
    >>> look_at_column(Column(tuple(str(n * n) for n in range(40)), (0,) * 40), ".").appearance
    <Appearance.COUNTER: 'a counter'>
    >>> look_at_column(Column(("0", "1", "1") * 20, (0,) * 60), ".").appearance
    <Appearance.STATE: 'a state'>
    """
    filled = [(text, piece) for text, piece in zip(column.texts, column.pieces, strict=True) if text]
    if not filled:
        return None
    read = [read_number(text, decimal or ".") for text, _ in filled]
    is_number = np.array([number is not None for number in read])
    texts = Counter(text for text, _ in filled)
    if not is_number.any():
        return _of_words(texts)
    numbers = np.array([number for number in read if number is not None], dtype=float)
    pieces = np.array([piece for _, piece in filled])[is_number]
    words = Counter(text for (text, _), number in zip(filled, read, strict=True) if number is None)
    sentinels = find_sentinels(numbers)
    kept = ~np.isin(numbers, [value for value, _ in sentinels])
    look = _of_numbers(numbers[kept], pieces[kept], texts)
    said = [look.because]
    if sentinels:
        many = " and ".join(f"{shortest(value)} ({count} times)" for value, count in sentinels)
        said.append(f"{many} far from all others: a sentinel?")
    if words:
        said.append("words among the numbers: " + _counted(words))
    return Look(look.appearance, "; ".join(said), look.texts)


def find_sentinels(numbers: NDArray[np.float64]) -> list[tuple[float, int]]:
    """Find numbers that come again and again far from all others; they often stand for a missing value."""
    found: list[tuple[float, int]] = []
    values, counts = np.unique(numbers, return_counts=True)
    for _ in range(2):
        if values.size < 4:
            break
        low, high = values[1] - values[0], values[-1] - values[-2]
        at = 0 if low > high else values.size - 1
        rest = np.delete(values, at)
        reach = _SENTINEL_REACH * float(rest[-1] - rest[0])
        if counts[at] < _SENTINEL_TIMES or max(low, high) <= max(reach, 10.0):
            break
        found.append((float(values[at]), int(counts[at])))
        values, counts = rest, np.delete(counts, at)
    return found


def _of_words(texts: Counter[str]) -> Look:
    if len(texts) == 1:
        return Look(Appearance.CONSTANT, f'"{next(iter(texts))}" in every row looked at', tuple(texts))
    if len(texts) <= _MOST_STATES and all(_is_state(text) for text in texts):
        return Look(
            Appearance.STATE, f"{len(texts)} distinct words: " + _counted(texts), tuple(sorted(texts))
        )
    return Look(Appearance.WORDS, f"{len(texts)} distinct words, no numbers: " + _counted(texts), ())


def _of_numbers(numbers: NDArray[np.float64], pieces: NDArray[np.int64], texts: Counter[str]) -> Look:
    values = np.unique(numbers)
    if values.size == 1:
        because = f"{shortest(float(values[0]))} in all {numbers.size} numbers looked at"
        return Look(Appearance.CONSTANT, because, tuple(texts))
    stray = _stray(numbers)
    if stray:
        return Look(Appearance.CONSTANT, stray, ())
    span = (
        f"{values.size} distinct numbers from {shortest(float(values[0]))} to {shortest(float(values[-1]))}"
    )
    if numbers.size >= _ENOUGH and values.size <= _MOST_STATES and (values == np.round(values)).all():
        are_texts = len(texts) <= _MOST_STATES and all(_is_state(text) for text in texts)
        states = tuple(sorted(texts)) if are_texts else ()
        return Look(Appearance.STATE, span, states)
    counter = _counter(numbers, pieces)
    if counter:
        return Look(Appearance.COUNTER, f"{span}; {counter}", ())
    return Look(Appearance.LEVEL, f"{span}; they rise and fall", ())


def _stray(numbers: NDArray[np.float64]) -> str:
    """Say that all numbers but single ones are the same; empty where they are not."""
    values, counts = np.unique(numbers, return_counts=True)
    usual = int(np.argmax(counts))
    others = np.delete(counts, usual)
    if others.max() > 1 or others.sum() > _STRAYS * numbers.size:
        return ""
    shown = ", ".join(shortest(float(value)) for value in np.delete(values, usual)[:_WORDS_SHOWN])
    return f"{shortest(float(values[usual]))} in all but {others.sum()} of {numbers.size} numbers ({shown})"


def _is_state(text: str) -> bool:
    return text.isprintable() and len(text) <= _LONGEST_STATE


def _counter(numbers: NDArray[np.float64], pieces: NDArray[np.int64]) -> str:
    """Say why numbers look like a counter; empty where they do not."""
    steps = np.where(np.diff(pieces) == 0, np.diff(numbers), 0.0)
    falls = np.flatnonzero(steps < 0)
    rises = int((steps > 0).sum())
    if numbers.size < _ENOUGH or numbers[0] < 0 or rises < 5 or falls.size > 1 + _COUNTER_FALLS * steps.size:
        return ""
    if falls.size == 0:
        return "they never fall"
    after, before = numbers[falls + 1], numbers[falls]
    if not (after <= _NEAR_ZERO * before).all():
        return ""
    return f"they fall only to near zero ({shortest(float(before[0]))} to {shortest(float(after[0]))})"


def _counted(texts: Counter[str]) -> str:
    ordered = sorted(texts.items(), key=lambda item: (-item[1], item[0]))
    shown = ", ".join(f'"{text[:40]}" ({count})' for text, count in ordered[:_WORDS_SHOWN])
    return shown + (f" and {len(ordered) - _WORDS_SHOWN} more" if len(ordered) > _WORDS_SHOWN else "")
