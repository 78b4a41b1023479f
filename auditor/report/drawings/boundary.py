"""The boundary drawing: a machine as a box, and every stream that crosses its edge."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from auditor.report.drawings.geometry import Drawing, Label, Shape, shortened

_WIDTH = 720
_BOX = (270, 450)
"""Left and right edge of the machine's box."""
_STEP = 58
"""Height of one stream."""
_TOP = 34


@dataclass(frozen=True)
class Crossing:
    """One stream as it is drawn."""

    name: str
    role: str
    detail: str
    """Its way and its size, one line."""
    standing: str
    """``measured``, ``computed`` or ``assumed``."""
    inward: bool


def boundary(title: str, crossings: Sequence[Crossing]) -> Drawing:
    """Draw the box with streams in on its left and out on its right.

    A full line is a measured stream, a dashed one is computed from several readings, a dotted one is
    assumed; the word stands beside it as well.
    """
    sides = {True: [c for c in crossings if c.inward], False: [c for c in crossings if not c.inward]}
    rows = max(1, *(len(side) for side in sides.values()))
    height = _TOP + rows * _STEP + 26
    shapes = [Shape(f"M{_BOX[0]} {_TOP - 14}H{_BOX[1]}V{height - 14}H{_BOX[0]}Z", "box")]
    labels = [
        Label(sum(_BOX) / 2, _TOP - 20, "balance boundary", "middle", "faint"),
        *_title(title, (_TOP - 14 + height - 14) / 2),
    ]
    for inward, side in sides.items():
        offset = (rows - len(side)) * _STEP / 2
        for index, crossing in enumerate(side):
            y = _TOP + offset + index * _STEP + 30
            shapes += _arrow(y, crossing)
            labels += _words(y, crossing, inward)
    described = "; ".join(
        f"{'in' if c.inward else 'out'}: {c.name} ({c.role}, {c.standing})" for c in crossings
    )
    return Drawing(_WIDTH, round(height), f"{title}. {described}.", tuple(shapes), tuple(labels))


def _title(title: str, y: float) -> list[Label]:
    """Break the machine's title into at most three short lines."""
    lines: list[str] = []
    for word in title.split():
        if lines and len(lines[-1]) + len(word) < 20:
            lines[-1] += f" {word}"
        else:
            lines.append(word)
    lines = [shortened(line, 20) for line in lines[:3]]
    first = y - (len(lines) - 1) * 10
    return [Label(sum(_BOX) / 2, first + 20 * i, line, "middle", "strong") for i, line in enumerate(lines)]


def _arrow(y: float, crossing: Crossing) -> list[Shape]:
    start, end = (8, _BOX[0] - 2) if crossing.inward else (_BOX[1] + 2, _WIDTH - 8)
    tip = end
    return [
        Shape(f"M{start} {y}H{tip - 7}", f"line {crossing.standing}"),
        Shape(f"M{tip} {y}l-9 -5v10Z", "tip"),
    ]


def _words(y: float, crossing: Crossing, inward: bool) -> list[Label]:
    x = 8 if inward else _BOX[1] + 10
    return [
        Label(x, y - 8, shortened(f"{crossing.name} · {crossing.role}", 36), "start", "strong"),
        Label(x, y + 16, shortened(f"{crossing.standing} · {crossing.detail}", 40), "start", "faint"),
    ]
