"""Lines, shapes and labels that a drawing consists of."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Label:
    """One line of text."""

    x: float
    y: float
    text: str
    anchor: str = "start"
    """``start``, ``middle`` or ``end``."""
    style: str = ""
    """Class of the style sheet: ``strong``, ``faint`` or empty."""


@dataclass(frozen=True)
class Shape:
    """One path with a class of the style sheet."""

    path: str
    style: str


@dataclass(frozen=True)
class Drawing:
    """A drawing on a canvas of its own; its labels are plain text, not yet escaped."""

    width: int
    height: int
    description: str
    """What a person who cannot see it should be told."""
    shapes: tuple[Shape, ...]
    labels: tuple[Label, ...]


def shortened(text: str, most: int) -> str:
    """Cut a label that would run out of its place; its full text stands in the table beside."""
    return text if len(text) <= most else f"{text[: most - 1].rstrip()}…"


def spread(wanted: list[float], least_gap: float) -> list[float]:
    """Move label positions apart so that neighbours are at least ``least_gap`` from each other.

    The order is kept; the whole column is shifted so that its mean stays where it wanted to be.

    Examples
    --------
    >>> spread([0.0, 10.0, 100.0], 25.0)
    [-5.0, 20.0, 95.0]
    """
    placed: list[float] = []
    for y in wanted:
        placed.append(y if not placed else max(y, placed[-1] + least_gap))
    if not placed:
        return []
    shift = sum(wanted) / len(wanted) - sum(placed) / len(placed)
    return [y + shift for y in placed]
