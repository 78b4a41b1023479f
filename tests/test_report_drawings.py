"""Drawings: widths tell energies, nothing is hidden, and labels do not run into one another."""

from __future__ import annotations

import itertools
import re

import pytest

from auditor.report.drawings.bands import Flow, energy_bands
from auditor.report.drawings.boundary import Crossing, boundary
from auditor.report.drawings.geometry import Drawing, spread


def _width(drawing: Drawing, style: str) -> float:
    """Height of the vertical edge of a band in pixels."""
    shape = next(shape for shape in drawing.shapes if shape.style == f"band {style}")
    match = re.search(r"v([0-9.]+)C", shape.path)
    assert match is not None
    return float(match.group(1))


def test_band_width_is_proportional_to_energy() -> None:
    """Twice the energy is twice the width, residual included."""
    drawing = energy_bands(
        "Engine",
        [Flow("fuel", "100 MWh", 100.0, "fuel")],
        [
            Flow("work", "40 MWh", 40.0, "work"),
            Flow("heat", "50 MWh", 50.0, "useful"),
            Flow("residual", "10 MWh", 10.0, "residual"),
        ],
    )
    fuel = _width(drawing, "fuel")
    assert _width(drawing, "work") == pytest.approx(0.4 * fuel, abs=0.1)
    assert _width(drawing, "useful") == pytest.approx(0.5 * fuel, abs=0.1)
    assert _width(drawing, "residual") == pytest.approx(0.1 * fuel, abs=0.1)


def test_even_a_tiny_residual_is_drawn_and_named() -> None:
    """A residual is never hidden because it is small."""
    drawing = energy_bands(
        "Engine",
        [Flow("fuel", "100 MWh", 100.0, "fuel")],
        [Flow("work", "100 MWh", 100.0, "work"), Flow("residual", "0 MWh", 0.0, "residual")],
    )
    assert _width(drawing, "residual") >= 1.0
    assert any(label.text == "residual" for label in drawing.labels)
    assert "out: residual 0 MWh" in drawing.description


def test_labels_keep_their_distance_and_order() -> None:
    """Labels of thin neighbouring bands do not overlap."""
    placed = spread([0.0, 1.0, 2.0, 200.0], 30.0)
    assert all(b - a >= 30.0 - 1e-9 for a, b in itertools.pairwise(placed))


def test_all_labels_lie_on_the_canvas() -> None:
    """Nothing is drawn outside the picture, however many streams there are."""
    flows = [Flow(f"stream {n}", "1 MWh", 1.0, "loss") for n in range(12)]
    drawing = energy_bands("Engine", [Flow("fuel", "12 MWh", 12.0, "fuel")], flows)
    assert all(8.0 <= label.y <= drawing.height for label in drawing.labels)


def test_boundary_marks_each_stream_as_measured_computed_or_assumed() -> None:
    """Line style and word say the same."""
    crossings = [
        Crossing("gas", "fuel in", "mean 2 430 kW", "computed", True),
        Crossing("power", "work out", "mean 1 020 kW", "measured", False),
        Crossing("casing", "loss", "mean 63 kW", "assumed", False),
    ]
    drawing = boundary("Gas engine", crossings)
    styles = [shape.style for shape in drawing.shapes if shape.style.startswith("line")]
    assert styles == ["line computed", "line measured", "line assumed"]
    assert "in: gas (fuel in, computed)" in drawing.description
