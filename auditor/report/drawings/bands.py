"""The energy-flow drawing: bands whose width is their energy, the residual a band of its own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from auditor.report.drawings.geometry import Drawing, Label, Shape, shortened, spread

_WIDTH = 720
_BAND_X = (196, 344, 376, 524)
"""Outer end of bands in, left and right edge of the machine, outer end of bands out."""
_THICKNESS = 190.0
"""Pixels of the larger side's total energy."""
_GAP = 14.0
_LABEL_STEP = 38.0
_MARGIN = 30.0


@dataclass(frozen=True)
class Flow:
    """One band."""

    name: str
    size: str
    """Its energy in words."""
    energy_J: float
    """Never negative; decides the width."""
    style: str
    """Class of the style sheet: ``fuel``, ``work``, ``residual``..."""


def energy_bands(title: str, flows_in: Sequence[Flow], flows_out: Sequence[Flow]) -> Drawing:
    """Draw bands in on the left and out on the right of a bar, all on one scale.

    The two sides are equally thick when the residual is among the flows: a residual below zero
    (more out than in) belongs to ``flows_in``.
    """
    totals = [sum(flow.energy_J for flow in side) for side in (flows_in, flows_out)]
    scale = _THICKNESS / max(*totals, 1e-9)
    sides = [_Side(flows, scale, left) for flows, left in ((flows_in, True), (flows_out, False))]
    top = _MARGIN + max(side.overhang for side in sides)
    height = top + max(side.depth for side in sides) + _MARGIN
    middle = top + max(side.thickness for side in sides) / 2
    core = max(side.thickness for side in sides)
    shapes: list[Shape] = []
    labels: list[Label] = []
    for side in sides:
        drawn, written = side.drawn(middle)
        shapes += drawn
        labels += written
    shapes.append(
        Shape(
            f"M{_BAND_X[1]} {middle - core / 2:.1f}H{_BAND_X[2]}V{middle + core / 2:.1f}H{_BAND_X[1]}Z",
            "core",
        )
    )
    told = "; ".join(
        f"{way} {flow.name} {flow.size}"
        for way, flows in (("in:", flows_in), ("out:", flows_out))
        for flow in flows
    )
    return Drawing(_WIDTH, round(height), f"{title}. {told}.", tuple(shapes), tuple(labels))


class _Side:
    """Placing of the bands of one side around the middle line."""

    def __init__(self, flows: Sequence[Flow], scale: float, left: bool) -> None:
        self._flows, self._left = flows, left
        self._widths = [max(flow.energy_J * scale, 0.0) for flow in flows]
        self.thickness = sum(self._widths)
        outer = self.thickness + _GAP * max(len(flows) - 1, 0)
        centres, y = [], -outer / 2
        for width in self._widths:
            centres.append(y + width / 2)
            y += width + _GAP
        self._outer = centres
        self._labels = spread(centres, _LABEL_STEP)
        lowest = max([outer / 2, *(label + 20 for label in self._labels)])
        highest = min([-outer / 2, *(label - 20 for label in self._labels)])
        self.overhang = max(0.0, -highest - self.thickness / 2)
        self.depth = lowest + self.thickness / 2

    def drawn(self, middle: float) -> tuple[list[Shape], list[Label]]:
        """Paths and labels of this side, ``middle`` being the height of the middle line."""
        shapes: list[Shape] = []
        labels: list[Label] = []
        inner_y = middle - self.thickness / 2
        outer_x, inner_x = (_BAND_X[0], _BAND_X[1]) if self._left else (_BAND_X[3], _BAND_X[2])
        bend = (outer_x + inner_x) / 2
        text_x = outer_x - 12 if self._left else outer_x + 12
        anchor = "end" if self._left else "start"
        for flow, width, centre, label in zip(
            self._flows, self._widths, self._outer, self._labels, strict=True
        ):
            top_out, top_in = middle + centre - width / 2, inner_y
            thick = max(width, 1.2)  # a thin band stays visible; its number stands beside it
            shapes.append(
                Shape(
                    f"M{outer_x} {top_out:.1f}C{bend} {top_out:.1f} {bend} {top_in:.1f} {inner_x} "
                    f"{top_in:.1f}v{thick:.1f}C{bend} {top_in + thick:.1f} {bend} {top_out + thick:.1f} "
                    f"{outer_x} {top_out + thick:.1f}Z",
                    f"band {flow.style}",
                )
            )
            tick = outer_x - 8 if self._left else outer_x + 8
            shapes.append(Shape(f"M{outer_x} {middle + centre:.1f}L{tick} {middle + label:.1f}", "leader"))
            labels.append(Label(text_x, middle + label - 3, shortened(flow.name, 27), anchor, "strong"))
            labels.append(Label(text_x, middle + label + 13, shortened(flow.size, 30), anchor, "faint"))
            inner_y += width
        return shapes, labels
